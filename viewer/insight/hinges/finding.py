"""What a search for hinge lines and flaps answers: frozen findings, their figures and one sentence each.

Every figure of a sentence is one of ``to_dict()``, rounded.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from viewer.insight.hinges.gates import CALIBRATION
from viewer.insight.scale import Scale
from viewer.model.arrays import Array, frozen


@dataclass(frozen=True, eq=False)
class Hinge:
    """A narrow band about which two nearly rigid regions turn relative to one another; a joint has no length.

    number        from 1, the strongest first
    kind          "line" (straight), "curve", "joint" (without length: a square neck, a point)
    axis          (k, 3) m, the axis at rest as a polyline through the band, end to end; k = 2 for a straight one
    motion        (k, 3) translation of these points in units of the shape
    position      (3,) m, energy-weighted centroid of the band
    direction     (3,) unit, along the relative rotation
    length, width m, of the band along the axis and across it
    fold          (3,) rad per unit of the shape: rotation of region B relative to region A at the band's edges
    stiffness     N·m/rad, moment that passes through the band over the mean turn of its edges (2U/θ² of its cells
                  where rotations are unknown or the turn changes its sense); None without absolute energies
    strain_share  share of the strain energy of the whole (springs included) in the band, NaN without energies
    volume_share  share of the volume in the band
    contrast      energy density of the band ÷ that of the rest of both regions, NaN without energies
    turn_share    η: fold ÷ (fold + variation of rotation within both regions)
    cells         cell rows of the band; sides: cell rows of regions A and B (A holds the support or is the larger)
    arm           (3,) unit, from the axis into region B, square to the direction
    score         smallest gate value ÷ its threshold; gate: the name of that weakest gate
    confidence    0 … 1, chance that this is a hinge line (``CALIBRATION`` in ``gates.py`` says how it was found)
    label         "strong", "weak", or "undecided" (``gates.label``)
    place         words: the group or groups in which it lies, else a position
    """

    number: int
    kind: str
    axis: Array
    motion: Array
    position: Array
    direction: Array
    length: float
    width: float
    fold: Array
    stiffness: float | None
    strain_share: float
    volume_share: float
    contrast: float
    turn_share: float
    cells: Array
    sides: tuple[Array, Array]
    arm: Array
    score: float
    gate: str
    confidence: float
    label: str
    place: str = ""

    def __post_init__(self) -> None:
        for name in ("axis", "motion", "position", "direction", "fold", "cells", "arm"):
            object.__setattr__(self, name, frozen(getattr(self, name)))
        object.__setattr__(self, "sides", tuple(frozen(side) for side in self.sides))

    @property
    def fold_angle(self) -> float:
        """Rad per unit of the shape, largest over the cycle."""
        return float(np.linalg.norm(np.abs(self.fold)))


@dataclass(frozen=True, eq=False)
class Flap:
    """A nearly rigid region that carries much kinetic and little strain energy and hangs on hinges.

    number         from 1; hinges: numbers of the hinges it hangs on
    cells          cell rows; kinetic_share, strain_share: of the whole; rigid_fit: share of its motion that is rigid
    size           m, largest extent of the region; place: words for where it is
    """

    number: int
    hinges: tuple[int, ...]
    cells: Array
    kinetic_share: float
    strain_share: float
    rigid_fit: float
    size: float
    place: str = ""

    def __post_init__(self) -> None:
        object.__setattr__(self, "cells", frozen(self.cells, np.int64))


@dataclass(frozen=True, eq=False)
class HingeFinding:
    """Where one mode folds and what flaps.

    mode       number from 1; freq_hz as given
    verdict    "hinges", "bending is spread" (a full answer), "rigid-body mode", "does not bend", "undecided": no line
               passes every gate, but one comes near
    doubtful   the lines that come near, when no other does; never among ``hinges``
    basis      "energies", or "smoothed" when noise was taken out of the shape by the model before looking
    noise      estimated share of noise in the shape (0 for a clean one)
    cautions   what a reader of the figures must know
    scale      how the mode is drawn and how large it really is, when known: gives fold angles as drawn and real
    """

    mode: int
    freq_hz: float
    verdict: str
    hinges: tuple[Hinge, ...] = ()
    flaps: tuple[Flap, ...] = ()
    doubtful: tuple[Hinge, ...] = ()
    basis: str = "energies"
    noise: float = 0.0
    cautions: tuple[str, ...] = ()
    scale: Scale | None = None

    def with_scale(self, scale: Scale | None) -> HingeFinding:
        """The same finding, its angles at another scale."""
        return replace(self, scale=scale)

    @property
    def sentence(self) -> str:
        return sentence_of(self.to_dict())

    def to_dict(self) -> dict[str, Any]:
        return {
            "mode": self.mode,
            "frequency_hz": self.freq_hz,
            "verdict": self.verdict,
            "basis": self.basis,
            "noise": self.noise,
            "hinges": [self._hinge(h) for h in self.hinges],
            "flaps": [_flap(f) for f in self.flaps],
            "doubtful": [self._hinge(h) for h in self.doubtful],
            "confidence_basis": CALIBRATION if self.hinges or self.doubtful else None,
            "cautions": list(self.cautions),
        }

    def _hinge(self, hinge: Hinge) -> dict[str, Any]:
        per_shape = self.scale.real_per_shape if self.scale is not None else None
        angle = np.degrees(hinge.fold_angle)
        number = lambda value: None if value is None or np.isnan(value) else float(value)  # noqa: E731
        return {
            "number": hinge.number,
            "kind": hinge.kind,
            "place": hinge.place or None,
            "label": hinge.label,
            "confidence": hinge.confidence,
            "weakest_gate": hinge.gate,
            "score": hinge.score,
            "position_m": hinge.position.tolist(),
            "direction": hinge.direction.tolist(),
            "axis_m": hinge.axis.tolist(),
            "length_m": hinge.length,
            "width_m": hinge.width,
            "fold_rad_per_shape_unit": hinge.fold_angle,
            "fold_drawn_deg": None if self.scale is None else float(angle * self.scale.factor),
            "fold_real_deg": None if per_shape is None else float(angle * per_shape),
            "rotational_stiffness_nm_per_rad": number(hinge.stiffness),
            "strain_share": number(hinge.strain_share),
            "volume_share": hinge.volume_share,
            "contrast": number(hinge.contrast),
            "turn_share": hinge.turn_share,
            "cells_in_band": len(hinge.cells),
            "cells_in_regions": [len(side) for side in hinge.sides],
        }


def _flap(flap: Flap) -> dict[str, Any]:
    return {
        "number": flap.number,
        "place": flap.place or None,
        "hinges": list(flap.hinges),
        "kinetic_share": flap.kinetic_share,
        "strain_share": flap.strain_share,
        "rigid_fit": flap.rigid_fit,
        "size_m": flap.size,
        "cells": len(flap.cells),
    }


def sentence_of(facts: dict[str, Any]) -> str:
    """The plain sentence made of the figures of ``HingeFinding.to_dict``."""
    head = f"Mode {facts['mode']}"
    if facts["doubtful"]:
        best = facts["doubtful"][0]
        doubt = f"but that is not certain: of lines like it in generated parts {best['confidence']:.0%} were hinges"
        return f"{head} may fold at {_hinge_words(best)}, {doubt}."
    if facts["verdict"] != "hinges":
        words = {
            "bending is spread": "has no hinge line: bending is spread",
            "rigid-body mode": "is a rigid-body mode: nothing folds",
            "does not bend": "has no strain energy in the elements: nothing folds",
        }
        return f"{head} {words.get(facts['verdict'], 'may fold, but no line is certain enough to name')}."
    parts = [_hinge_words(hinge) for hinge in facts["hinges"]]
    parts += [_flap_words(flap) for flap in facts["flaps"]]
    return f"{head} folds at {'; '.join(parts)}."


def _hinge_words(facts: dict[str, Any]) -> str:
    what = "joint" if facts["kind"] == "joint" else "curved hinge" if facts["kind"] == "curve" else "hinge"
    words = f"{what} {facts['number']}"
    if facts["place"]:
        words += f" ({facts['place']})"
    if facts["kind"] != "joint":
        words += f", {1000 * facts['length_m']:.3g} mm long"
    if facts["strain_share"] is not None:
        words += (
            f", with {facts['strain_share']:.0%} of the energy in {100 * facts['volume_share']:.2g}% of the material"
        )
    if facts["fold_real_deg"] is not None:
        words += f", by {facts['fold_real_deg']:.2g}° real"
    return words + (f" ({facts['label']})" if facts["label"] == "weak" else "")


def _flap_words(facts: dict[str, Any]) -> str:
    hinges = " and ".join(str(n) for n in facts["hinges"])
    place = f" ({facts['place']})" if facts["place"] else ""
    return (
        f"flap {facts['number']}{place} beyond hinge {hinges} carries {facts['kinetic_share']:.0%} of the kinetic "
        f"energy and turns as one piece"
    )
