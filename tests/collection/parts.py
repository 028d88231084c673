"""Parts: a sheet, a kind of cell and a name each, made by families from one seed."""

from __future__ import annotations

import zlib
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from tests.collection.sheets import Band, Sheet

SEED = 20_240_611
VERSION = 3  # of the generator: raise it when the same seed gives other parts

Box = tuple[float, float, float, float]
Maker = Callable[[np.random.Generator, int], Sheet]


@dataclass(frozen=True, eq=False)
class Part:
    """name  "family-kind-number"; modes: how many elastic ones are looked at"""

    name: str
    family: str
    kind: str
    sheet: Sheet
    modes: int = 8

    @property
    def free(self) -> bool:
        return not self.sheet.clamp

    def twin(self, kind: str) -> Part:
        """The same sheet in another kind of cell."""
        return Part(f"{self.name}>{kind}", self.family, kind, self.sheet, self.modes)


def family(make: Maker, kinds: Sequence[str], modes: int = 8) -> list[Part]:
    """One part of random dimensions per entry of ``kinds``; the maker is told the entry's number."""
    name = make.__name__
    return [
        Part(
            f"{name}-{i}-{kind}",
            name,
            kind,
            make(np.random.default_rng([SEED, zlib.crc32(name.encode()), i]), i),
            modes,
        )
        for i, kind in enumerate(kinds)
    ]


def plate(rng: np.random.Generator, slender: tuple[float, float] = (1.3, 2.2)) -> tuple[float, float, float]:
    """Length, width and thickness, m, of a sheet of ordinary proportions."""
    length = rng.uniform(0.15, 0.4)
    width = length / rng.uniform(*slender)
    return length, width, width / rng.uniform(30, 60)


def line_across(
    size: tuple[float, float],
    at: float,
    width: float,
    margin: float,
    ends: tuple[float, float] | None = None,
    **given,
) -> Band:
    """A band across s = ``at``, cut out with ``margin`` before and behind."""
    span = (0.0, size[1]) if ends is None else ends
    cut = (max(0.0, at - width / 2 - margin), min(size[0], at + width / 2 + margin), *span)
    return Band((at - width / 2, at + width / 2, *span), given.pop("cut", cut), **given)


def root(size: tuple[float, float]) -> tuple[Box]:
    """The edge s = 0 held."""
    return ((0.0, 0.0, 0.0, size[1]),)


def around(size: tuple[float, float]) -> tuple[Box, ...]:
    """All four edges held."""
    s, t = size
    return ((0, 0, 0, t), (s, s, 0, t), (0, s, 0, 0), (0, s, t, t))


def folded(corners: Sequence[tuple[float, float]]):
    """A sheet folded along lines of constant s: its cross-section is the polyline ``corners`` in x and z.

    Returns its length along the polyline, the values of s at the folds, and how to place (t along y). The middle of
    the sheet lies on the polyline, its faces are mitred.
    """
    line = np.array(corners, float)
    step = np.diff(line, axis=0)
    long = np.linalg.norm(step, axis=1)
    marks = np.concatenate([[0], np.cumsum(long)])
    normal = np.stack([-step[:, 1], step[:, 0]], axis=1) / long[:, None]
    mitre = np.vstack([normal[:1], normal[:-1] + normal[1:], normal[-1:]])
    mitre[1:-1] /= (1 + np.einsum("ij,ij->i", normal[:-1], normal[1:]))[:, None]

    def place(s, t, n):
        at = [np.interp(s, marks, line[:, i]) + n * np.interp(s, marks, mitre[:, i]) for i in (0, 1)]
        return np.stack([at[0], t, at[1]], axis=-1)

    return float(marks[-1]), tuple(float(m) for m in marks[1:-1]), place


def rolled(radius: float):
    """How to place a sheet as part of a cylinder: s runs around, t along y."""

    def place(s, t, n):
        return np.stack([(radius + n) * np.sin(s / radius), t, (radius + n) * np.cos(s / radius) - radius], axis=-1)

    return place


def slanted(size: tuple[float, float], at: float, slope: float):
    """How to place a flat sheet so that the line s = ``at`` runs askew: x grows by ``slope`` per t there, and the
    edges s = 0 and s = length stay square."""

    def place(s, t, n):
        share = np.where(s < at, s / at, (size[0] - s) / (size[0] - at))
        return np.stack([s + slope * (t - size[1] / 2) * share, t, n], axis=-1)

    return place


def fan(inner: float, angle: float, width: float):
    """How to place a sheet as a sector of a ring: s is the radius beyond ``inner``, t runs round ``angle`` rad."""

    def place(s, t, n):
        turn = (t / width - 0.5) * angle
        return np.stack([(inner + s) * np.cos(turn), (inner + s) * np.sin(turn), n], axis=-1)

    return place
