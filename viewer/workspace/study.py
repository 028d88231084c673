"""One design with its modes, energies and stated sizes: everything a picture or a table is made from."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any, cast

import numpy as np

from viewer.errors import ModelError, RefusedError
from viewer.insight.character import Character, describe, masses_of
from viewer.insight.common_support import CommonSupport, common_support
from viewer.insight.correlate import modal_scale_factor
from viewer.insight.facing import facing_surfaces
from viewer.insight.gain import gain_maps
from viewer.insight.gain_finding import GainMap
from viewer.insight.hinges import HingeFinding, find_hinges
from viewer.insight.scale import CarriedPoint, Scale, carried_points, scale_mode
from viewer.jobs import SILENT, Progress
from viewer.mechanics.energy import RELATIVE, Energies, energies
from viewer.mechanics.given_matrices import NO_CELLS, Totals, totals
from viewer.mechanics.relative import relative_energies, states_no_material
from viewer.model.arrays import Array
from viewer.model.design import Design
from viewer.model.dossier import StatedAmplitude
from viewer.model.modes import ModeSet
from viewer.workspace.explanation import Answer, Explanation, asked

_WANTED = "add materials and assign them for closure, trust and absolute energies"


@dataclass(frozen=True, eq=False)
class Study:
    """A design, its mode set, the element energies of every mode, and the stated amplitudes by mode number.

    energies    relative ones when the design states no materials; None when it has no (usable) physics either,
                ``no_energies`` then says why
    totals      energies as wholes, when stiffness and mass were given as matrices
    condition   words that stand in every scale note ("clamped root, camera 1.2 kg")
    """

    design: Design
    modes: ModeSet
    energies: Energies | None
    no_energies: str = ""
    amplitudes: Mapping[int, StatedAmplitude] = field(default_factory=dict)
    condition: str = ""
    totals: Totals | None = None
    _scales: dict[tuple[int, bool, float | None], Scale] = field(default_factory=dict, init=False, repr=False)
    _found: dict[tuple[str, int], Any] = field(default_factory=dict, init=False, repr=False)

    @property
    def count(self) -> int:
        return self.modes.count

    @cached_property
    def carried(self) -> tuple[CarriedPoint, ...]:
        return carried_points(self.design)

    @property
    def cautions(self) -> tuple[str, ...]:
        """What a reader of any figure of this study must know."""
        words = [self.no_energies, *self.modes.cautions] if self.energies is None else list(self.energies.cautions)
        if self.relative:
            words.insert(0, f"energies are {RELATIVE}; {_WANTED}")
        figures = self.figures
        if figures is not None:
            elastic = np.isfinite(figures.closure)
            doubtful = [i + 1 for i in range(self.count) if elastic[i] and not figures.trusted[i]]
            if doubtful:
                listed = ", ".join(str(n) for n in doubtful)
                why = "the shapes are not whole" if self.modes.caution else "see closure and residual"
                words.append(f"energies of mode {listed} are not trusted: {why}")
        return tuple(f"{self.design.name}: {w}" for w in words)

    @property
    def relative(self) -> bool:
        """Whether energies are shares under one assumed material, without closure and trust."""
        return self.energies is not None and self.energies.relative

    @property
    def figures(self) -> Energies | Totals | None:
        """Where closure, residual and trust stand, whether energies are known by element or as wholes."""
        return self.totals if self.energies is None or self.relative else self.energies

    def index_of(self, number: int) -> int:
        """Index of mode ``number`` (from 1); ``InputError`` for a mode that is not there."""
        return self.modes.index_of(number, self.design.name)

    def has_strain(self, index: int) -> bool:
        """Whether mode ``index`` has strain energy to show: it has physics and is no rigid-body mode."""
        if self.energies is None:
            return False
        if self.relative:
            return bool(self.energies.total_strain[index] > 0)
        return bool(np.isfinite(self.energies.closure[index]))

    def modal_mass(self, index: int) -> float | None:
        """φᵀMφ of the shape as given, kg·(shape unit)²; None when neither masses nor normalisation are known."""
        if self.modes.normalisation == "mass":
            return 1.0
        if self.totals is not None:
            return float(self.totals.modal_mass[index])
        if self.energies is None or self.relative or not self.modes.freq_hz[index] > 0:
            return None
        return 2 * float(self.energies.total_kinetic[index]) / self.modes.omega(index) ** 2

    @property
    def names(self) -> tuple[str, ...]:
        """The user's names by mode, empty where there is none."""
        return tuple(self.name(index) for index in range(self.count))

    def name(self, index: int) -> str:
        """The user's name of mode ``index`` (from 0), or empty."""
        return self.design.mode_names.get(index + 1, "")

    def scale(self, index: int, *, true_scale: bool = False, peak_percent: float | None = None) -> Scale:
        """How mode ``index`` (from 0) is drawn; found once."""
        key = (index, true_scale, peak_percent)
        if key not in self._scales:
            self._scales[key] = scale_mode(
                self.design,
                self.modes.shape(index),
                index + 1,
                self.amplitudes.get(index + 1),
                true_scale=true_scale,
                peak_percent=peak_percent,
            )
        return self._scales[key]

    def explain(self, index: int, progress: Progress = SILENT) -> Explanation:
        """All that is found about mode ``index`` (from 0)."""
        refused: list[str] = []
        return Explanation(
            index + 1,
            asked(lambda: self.character(index, progress), refused),
            asked(lambda: self.hinges(index, progress), refused),
            asked(lambda: self.gain(index, progress), refused),
            tuple(dict.fromkeys(refused)),
        )

    def hinges(self, index: int, progress: Progress = SILENT) -> HingeFinding:
        """Where mode ``index`` (from 0) folds and what flaps, its angles at the mode's own scale; found once."""
        find = lambda: find_hinges(self.design, self.modes, index + 1, self.energies, progress)  # noqa: E731
        return self._once("hinges", index, lambda: find().with_scale(self.scale(index)))

    def hinges_if_known(self, index: int) -> HingeFinding | None:
        """The same when it can be had, else None."""
        return asked(lambda: self.hinges(index), [])

    def character(self, index: int, progress: Progress = SILENT) -> Character:
        """What mode ``index`` does; found once."""
        masses = self._once("masses", 0, lambda: masses_of(self.design, self.modes, progress))
        facing = self._once("facing", 0, lambda: facing_surfaces(self.design.mesh, progress))
        return self._once(
            "character",
            index,
            lambda: describe(
                self.design,
                self.modes,
                index + 1,
                self.energies,
                self.scale(index),
                progress,
                effective=masses,
                facing=facing,
            ),
        )

    def gain(self, index: int, progress: Progress = SILENT) -> GainMap:
        """Where stiffness and weight move mode ``index``; found once, for all modes together: the passes over the
        cells of sheets cost what they do for one."""
        find = lambda: gain_maps(self.design, self.modes, None, self.energies, progress)  # noqa: E731
        return self._once("gain", 0, find)[index]

    def support_with(self, other: Study, progress: Progress = SILENT) -> CommonSupport:
        """The places that this design and ``other``'s share; found once."""
        find = lambda: (other, common_support(self.design, other.design, progress))  # noqa: E731
        return self._once("support", id(other), find)[1]  # ``other`` is kept, so that its id stays its own

    def turn_of(self, index: int, other: Study, theirs: int) -> complex:
        """Unit complex factor that brings mode ``theirs`` of ``other`` into sign and phase with mode ``index``."""
        support = self.support_with(other)
        mine = support.values_of_first(self.modes.shape(index))
        factor = modal_scale_factor(mine, support.values_of_second(other.modes.shape(theirs)))
        return factor / abs(factor) if abs(factor) > 0 else 1.0 + 0.0j

    def _once(self, question: str, index: int, find: Callable[[], Answer]) -> Answer:
        if (question, index) not in self._found:
            self._found[question, index] = find()
        return cast(Answer, self._found[question, index])

    def turned_shape(self, index: int, turn: complex) -> Array:
        """The shape times a unit complex factor; a real shape stays real (its factor is a sign)."""
        shape = self.modes.shape(index)
        if np.iscomplexobj(shape):
            return shape * turn
        return -shape if turn.real < 0 else shape


def study(
    design: Design,
    modes: ModeSet,
    amplitudes: Mapping[int, StatedAmplitude] | None = None,
    condition: str = "",
    progress: Progress = SILENT,
    *,
    energy: bool = True,
) -> Study:
    """Form the energies of all modes; a design without materials is still studied, with relative energies where its
    mesh allows them. ``energy`` False forms none: for a large mesh most of the time goes into them. What the shapes
    come with as a caution (expanded ones do) stands in every scale note beside the condition."""
    condition = "; ".join(words for words in (condition, modes.caution) if words)
    found, whole, why = None, None, ""
    if not energy:
        why = "energies were not asked for"
    elif design.physics.matrices is not None:
        whole, why = totals(design, modes, progress=progress), f"design '{design.name}': {NO_CELLS}"
    elif states_no_material(design):
        try:
            found = relative_energies(design, modes, progress)
        except (ModelError, RefusedError) as error:
            why = f"no energies: {error}"
    else:
        try:
            found = energies(design, modes, progress=progress)
        except ModelError as error:
            if modes.origin == "computed":
                raise  # it was solved a moment ago: this would be our own fault
            why = str(error)
    return Study(design, modes, found, why, amplitudes or {}, condition, whole)
