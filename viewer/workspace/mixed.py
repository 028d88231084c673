"""Close modes of a design, mixed as a test shows them.

Modes of nearly equal frequency come out in any mixture, and a solver's mixture is not the test's: the counterpart of
a measured mode is then not one of them, but the combination that comes closest to it.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from viewer.model.arrays import Array, frozen
from viewer.model.modes import ShapeSource
from viewer.workspace.study import Study


@dataclass(frozen=True, eq=False)
class MixedShapes:
    """The shapes of ``source``; that of mode ``index`` is the sum of the ``parts`` (index, factor)."""

    source: ShapeSource
    index: int
    parts: tuple[tuple[int, float], ...]

    @property
    def count(self) -> int:
        return self.source.count

    @property
    def has_rotations(self) -> bool:
        return self.source.has_rotations

    @property
    def is_complex(self) -> bool:
        return self.source.is_complex

    def translations(self, index: int) -> Array:
        if index != self.index:
            return self.source.translations(index)
        return frozen(np.add.reduce([factor * self.source.translations(k) for k, factor in self.parts]))

    def rotations(self, index: int) -> Array | None:
        if index != self.index:
            return self.source.rotations(index)
        turned = [(factor, self.source.rotations(k)) for k, factor in self.parts]
        known = [factor * part for factor, part in turned if part is not None]
        return frozen(np.add.reduce(known)) if len(known) == len(turned) else None


def mixed(study: Study, number: int, mixture: Sequence[tuple[int, complex]], analysis: Array) -> tuple[Study, Array]:
    """The study with mode ``number`` (from 1) replaced by a mixture, and its motion along the channels of a test.

    mixture   numbers of modes and factors, as ``TestPair.mixture``; the phase that they have in common is taken off
    analysis  (k, c) motion of all modes along the channels

    A mode in no company is left as it is. The mixed mode has no stated size and no energies.
    """
    if len(mixture) < 2:
        return study, analysis[number - 1]
    largest = max((factor for _, factor in mixture), key=abs)
    parts = tuple((k - 1, float(np.real(factor / largest))) for k, factor in mixture)
    modes = study.modes.with_(shapes=MixedShapes(study.modes.shapes, number - 1, parts), normalisation="unknown")
    *most, last = (str(k) for k, _ in mixture)
    said = f"analysis modes {', '.join(most)} and {last} mixed as the test shows them"
    condition = " · ".join(part for part in (study.condition, said) if part)
    amplitudes = {k: stated for k, stated in study.amplitudes.items() if k != number}
    none = {"energies": None, "totals": None, "no_energies": "shapes are mixed"}
    found = replace(study, modes=modes, amplitudes=amplitudes, condition=condition, **none)  # type: ignore[arg-type]
    return found, np.add.reduce([factor * analysis[k] for k, factor in parts])
