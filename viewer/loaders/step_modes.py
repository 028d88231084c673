"""Steps of a series as modes: which of its arrays are the shape, and what its times mean.

A series in ``.xdmf`` or ``.vtkhdf`` holds one mode a step. Its shape is the one vector array on points; where there
are several, the one whose name holds a word for it (``mode``, ``shape``, ``disp``, ``eigen``). ``NAME_rot`` holds
rotations, ``NAME_re`` and ``NAME_im`` the parts of a complex shape. The frequency of a step is its value
``freq_hz``, else its time; times that merely count the steps (0, 1, 2 … or 1, 2, 3 …) are no frequencies. Steps are
told apart by their place, never by their time, so that equal frequencies stay separate modes.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from viewer.errors import LoadError
from viewer.model.arrays import Array

_PARTS = re.compile(r"(?P<base>.+?)(?P<turned>_rot)?(?P<part>_re|_im)?")
_WORDS = re.compile(r"mode|shape|disp|eigen", re.I)


class ShapeNames(NamedTuple):
    """Array names of one mode: translations and perhaps rotations; one name each, or real and imaginary."""

    moved: tuple[str, ...]
    turned: tuple[str, ...]


def shape_names(vectors: Sequence[str], path: object) -> ShapeNames:
    """The arrays of the shape among the names of all vector arrays on points. Raises ``LoadError``."""
    found: dict[str, dict[tuple[bool, str], str]] = {}
    for name in vectors:
        match = _PARTS.fullmatch(name)
        if match:
            found.setdefault(match["base"], {})[bool(match["turned"]), match["part"] or ""] = name
    bases = list(found) if len(found) == 1 else [base for base in found if _WORDS.search(base)]
    if len(bases) != 1:
        raise LoadError(
            "no vector array on points is clearly the mode shape" if found else "holds no vector array on points",
            file=path,
            found=", ".join(vectors)[:200] or "none",
            expected="one vector array a step, or one whose name holds mode, shape, disp or eigen",
        )
    names = found[bases[0]]
    parts = ("",) if (False, "") in names else ("_re", "_im")
    moved = tuple(names[False, part] for part in parts if (False, part) in names)
    turned = tuple(names[True, part] for part in parts if (True, part) in names)
    if len(moved) != len(parts) or len(turned) not in (0, len(parts)) or len(names) != len(moved) + len(turned):
        raise LoadError(
            "the arrays of the shape do not belong together",
            file=path,
            found=", ".join(names.values())[:200],
            expected="NAME, or NAME_re and NAME_im; NAME_rot with the same ends or none",
        )
    return ShapeNames(moved, turned)


def step_frequencies(times: Array | None) -> Array | None:
    """The times as frequencies in Hz; None when there are none or they only count the steps."""
    if times is None or any(np.array_equal(times, np.arange(len(times)) + first) for first in (0, 1)):
        return None
    return times
