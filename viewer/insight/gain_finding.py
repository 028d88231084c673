"""What a gain map answers: derivatives by cell, the best places, their figures and one sentence.

Every figure of a sentence is one of ``to_dict()``, rounded. What the derivatives mean: ``gain.py``.
"""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import Any

import numpy as np

from viewer.insight.gain_words import callout_words, sentence_of
from viewer.model.arrays import Array, frozen

TENTH = 0.1  # the change of thickness, section, fill, spring or mass that is quoted
PERCENT = 0.01
_MADE_OF = {1: "beams", 2: "sheet", 3: "solid"}


def _freeze(finding: Any) -> None:
    for item in fields(finding):
        value = getattr(finding, item.name)
        if isinstance(value, np.ndarray):
            object.__setattr__(finding, item.name, frozen(value))


@dataclass(frozen=True, eq=False)
class Place:
    """A group or patch of cells and what changing it alone does.

    name, cells, position (3,) m
    mass         kg of its cells; mass_share: share of the mass of all cells
    stiffness, mass_gain, growth  (m,) ∂ln λ by stiffness, mass and growth of the whole place, ascending; one value
                 for a mode of its own, one for each mode of equal frequency otherwise
    thickness    the same by the thickness of its sheets, None without any
    """

    name: str
    cells: Array
    position: Array
    mass: float
    mass_share: float
    stiffness: Array
    mass_gain: Array
    growth: Array
    thickness: Array | None

    def __post_init__(self) -> None:
        _freeze(self)


@dataclass(frozen=True, eq=False)
class SpringGain:
    """A spring's share of the strain energy, ∂ln λ by its stiffness."""

    name: str
    share: float


@dataclass(frozen=True, eq=False)
class MassGain:
    """A lumped mass: kg; its share of the kinetic energy with its inertia, −∂ln λ by its mass; ``per_mass``
    ∂ln λ per kg added at its centre without inertia."""

    name: str
    mass: float
    share: float
    per_mass: float


@dataclass(frozen=True, eq=False)
class GainMap:
    """What stiffening, lightening and thickening every cell does to a mode.

    mode, freq_hz   number from 1, Hz; of modes taken together the mean. modes: numbers of those
    stiffness       (n_cells,) ∂ln λ/∂ln k ≥ 0; mass: ∂ln λ/∂ln m ≤ 0; 0 for cells without a part in the mode
    thickness       (n_cells,) ∂ln λ/∂ln t of sheets, NaN elsewhere
    growth          (n_cells,) ∂ln λ by growth, see above
    cell_mass       (n_cells,) kg, 0 for cells that carry no stiffness
    per_kg          (n_cells,) Hz per kg added as more of the same material there; NaN where there is none, and all
                    NaN when ``absolute`` is False
    split           (n_cells, m) Hz per kg of each of m modes taken together for growth of that cell alone, ascending;
                    None for a mode of its own
    dimension       (n_cells,) 1 beams, 2 sheets, 3 solids, 0 no stiffness
    springs, masses in the design's order; groups: the mesh's cell groups that have mass
    stiffen, lighten  places where adding, or removing, material raises the frequency most, best first
    absolute        False: energies are relative or not trusted, shares are all that is known
    rigid           a rigid-body mode: nothing changes its frequency, all derivatives are 0
    """

    mode: int
    freq_hz: float
    modes: tuple[int, ...]
    stiffness: Array
    mass: Array
    thickness: Array
    growth: Array
    cell_mass: Array
    per_kg: Array
    split: Array | None
    dimension: Array
    springs: tuple[SpringGain, ...]
    masses: tuple[MassGain, ...]
    groups: tuple[Place, ...]
    stiffen: tuple[Place, ...]
    lighten: tuple[Place, ...]
    absolute: bool
    rigid: bool
    cautions: tuple[str, ...]

    def __post_init__(self) -> None:
        _freeze(self)

    @property
    def stiffness_total(self) -> float:
        """∂ln λ when everything, springs included, is made stiffer alike: 1, or 0 for a rigid-body mode."""
        return float(self.stiffness.sum() + sum(spring.share for spring in self.springs))

    @property
    def mass_total(self) -> float:
        """∂ln λ when everything, lumped masses included, is made heavier alike: −1, or 0 for a rigid-body mode."""
        return float(self.mass.sum() - sum(mass.share for mass in self.masses))

    @property
    def callouts(self) -> tuple[tuple[str, Array, Array], ...]:
        """(words, position (3,) m, cell rows) at each extreme: where adding, then where removing raises most."""
        facts = self.to_dict()
        out = []
        for verb, places, listed in (("add", self.stiffen, "stiffen"), ("remove", self.lighten, "lighten")):
            if places and self.absolute:
                out.append((callout_words(verb, facts[listed][0]), places[0].position, places[0].cells))
        return tuple(out)

    @property
    def sentence(self) -> str:
        return sentence_of(self.to_dict())

    def hz(self, derivative: float) -> float | None:
        """Hz by which the frequency rises per unit of the relative change, None without absolute energies."""
        return 0.5 * self.freq_hz * float(derivative) if self.absolute and not self.rigid else None

    def to_dict(self) -> dict[str, Any]:
        """Every figure as plain numbers; Hz are None without absolute energies."""
        return {
            "mode": self.mode,
            "frequency_hz": self.freq_hz,
            "modes_of_equal_frequency": list(self.modes) if len(self.modes) > 1 else [],
            "rigid_body": self.rigid,
            "absolute": self.absolute,
            "change": TENTH,
            "stiffness_total": self.stiffness_total,
            "mass_total": self.mass_total,
            "cell_stiffness_share": float(self.stiffness.sum()),
            "cell_mass_share": -float(self.mass.sum()),
            "springs": [self._spring(spring) for spring in self.springs],
            "masses": [self._mass(mass) for mass in self.masses],
            "groups": [self._place(place) for place in self.groups],
            "stiffen": [self._place(place) for place in self.stiffen],
            "lighten": [self._place(place) for place in self.lighten],
            "cautions": list(self.cautions),
        }

    def _spring(self, spring: SpringGain) -> dict[str, Any]:
        return {
            "name": spring.name,
            "strain_share": spring.share,
            "hz_for_tenth_more": self.hz(TENTH * spring.share),
        }

    def _mass(self, mass: MassGain) -> dict[str, Any]:
        return {
            "name": mass.name,
            "mass_kg": mass.mass,
            "kinetic_share": mass.share,
            "tenth_kg": TENTH * mass.mass,
            "hz_for_tenth_less": self.hz(TENTH * mass.share),
            "hz_per_kg": self.hz(mass.per_mass),
        }

    def _place(self, place: Place) -> dict[str, Any]:
        percent = lambda values: None if values is None else self.hz(PERCENT * values.mean())  # noqa: E731
        per_kg = None if not place.mass > 0 else self.hz(place.growth.mean() / place.mass)
        several = len(self.modes) > 1 and self.hz(1.0) is not None and place.mass > 0
        return {
            "name": place.name,
            "cells": len(place.cells),
            "position_m": place.position.tolist(),
            "made_of": _made_of(self.dimension[place.cells]),
            "mass_kg": place.mass if self.absolute else None,
            "mass_share": place.mass_share,
            "strain_share": float(place.stiffness.mean()),
            "kinetic_share": -float(place.mass_gain.mean()),
            "hz_per_percent_stiffness": percent(place.stiffness),
            "hz_per_percent_mass": percent(place.mass_gain),
            "hz_per_percent_thickness": percent(place.thickness),
            "tenth_kg": TENTH * place.mass if self.absolute else None,
            "hz_for_tenth_more": self.hz(TENTH * place.growth.mean()),
            "hz_for_tenth_less": self.hz(-TENTH * place.growth.mean()),
            "hz_per_kg": per_kg,
            "hz_per_kg_split": [self.hz(value / place.mass) for value in place.growth] if several else [],
        }


def _made_of(dimension: Array) -> str:
    kinds = np.unique(dimension[dimension > 0])
    return _MADE_OF[int(kinds[0])] if len(kinds) == 1 else "several kinds"
