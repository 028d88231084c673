"""Placements in words: how one differs from another, what to write into the dossier, which units were mixed up."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.spatial.transform import Rotation

from viewer.model.arrays import Array
from viewer.model.testset import Placement
from viewer.model.written import GAP, digits

UNITS = {"m": 1.0, "cm": 0.01, "mm": 0.001, "in": 0.0254, "ft": 0.3048}
_WORDS = {"m": "metres", "cm": "centimetres", "mm": "millimetres", "in": "inches", "ft": "feet"}
_ALONG = np.cos(np.radians(8.0))  # an axis this close to another has its name
_SLENDER = 1.3  # the longest axis of a part is at least so much longer than the next


@dataclass(frozen=True)
class UnitSlip:
    """Points times ``factor`` have the part's size: lengths in ``meant`` were read as if in ``read_as``."""

    factor: float
    meant: str
    read_as: str

    @property
    def words(self) -> str:
        return f"{_WORDS[self.meant]} read as {_WORDS[self.read_as]}"

    def unit(self, declared: float) -> str | None:
        """Name of the unit that the points are in, when they were read as so many metres a unit."""
        right = declared * self.factor
        return next((name for name, size in UNITS.items() if abs(right / size - 1) < 1e-6), None)

    def to_dict(self) -> dict[str, Any]:
        return {"factor": self.factor, "times_too_large": 1 / self.factor, "words": self.words}


def unit_slips() -> list[UnitSlip]:
    """Every way to take one unit for another."""
    pairs = [(a, b) for a in UNITS for b in UNITS if a != b]
    return [UnitSlip(UNITS[meant] / UNITS[read], meant, read) for meant, read in pairs]


@dataclass(frozen=True, eq=False)
class Axes:
    """The body's own directions: ``rows`` (3, 3) principal axes, ``sizes`` (3,) spread along them, largest first."""

    rows: Array
    sizes: Array

    @classmethod
    def of(cls, places: Array) -> Axes:
        _, sizes, rows = np.linalg.svd(places - places.mean(axis=0), full_matrices=False)
        return cls(rows, sizes)

    def name(self, axis: Array) -> str:
        """What an axis along ``axis`` (3,) is called."""
        own = ""
        if self.sizes[0] > _SLENDER * self.sizes[1] and abs(self.rows[0] @ axis) > _ALONG:
            own = "the part's long axis"
        elif self.sizes[1] > _SLENDER * self.sizes[2] and abs(self.rows[2] @ axis) > _ALONG:
            own = "the part's thinnest direction"
        k = int(np.abs(axis).argmax())
        if abs(axis[k]) > _ALONG:
            return f"{own} ({'xyz'[k]})" if own else "xyz"[k]
        written = "(" + ", ".join(f"{v:.2f}".replace("-", "−") for v in axis) + ")"
        return own or f"an axis along {written}"


def difference(first: Placement, second: Placement, points: Array, axes: Axes, size: float) -> dict[str, Any]:
    """How ``second`` differs from ``first`` in the mesh's axes, with ``words``; ``points`` (p, 3) m of the test."""
    turn = second.rotation @ first.rotation.T
    vector = Rotation.from_matrix(turn).as_rotvec()
    angle = float(np.degrees(np.linalg.norm(vector)))
    gap = second.points(points) - first.points(points)
    moved = float(np.sqrt(np.mean(np.sum(gap**2, axis=1))))
    facts: dict[str, Any] = {"turn_deg": angle, "axis": None, "along_axis_m": None, "points_moved_m": moved}
    if angle < 3.0:
        way = gap.mean(axis=0) / max(float(np.linalg.norm(gap.mean(axis=0))), 1e-300)
        facts["words"] = f"moved by about {digits(1000 * moved)}{GAP}mm along {axes.name(way)}"
        return facts
    axis = vector / np.linalg.norm(vector)
    axis = axis if axis[np.abs(axis).argmax()] > 0 or angle > 179.0 else -axis
    if axis[np.abs(axis).argmax()] < 0:
        axis = -axis
    slide = float(gap.mean(axis=0) @ axis)
    facts |= {"axis": axis.tolist(), "along_axis_m": slide}
    facts["words"] = f"turned {angle:.0f}° about {axes.name(axis)}"
    if abs(slide) > 0.05 * size:
        facts["words"] += f" and moved {digits(1000 * abs(slide))}{GAP}mm along it"
    return facts


def freedom(motion: Array, arm: float, axes: Axes) -> str:
    """Words for a small motion (6,): turns times the mean radius ``arm``, and shifts."""
    turn, shift = motion[:3], motion[3:]
    if np.linalg.norm(turn) > np.linalg.norm(shift):
        return f"turned about {axes.name(turn / np.linalg.norm(turn))}"
    return f"moved along {axes.name(shift / np.linalg.norm(shift))}"


def placement_line(placement: Placement, length_unit: float = 1.0) -> str:
    """The line of the dossier that states ``placement``, its shift in units of ``length_unit`` m."""
    rows = ", ".join("[" + ", ".join(_figure(v, 9) for v in row) + "]" for row in placement.rotation)
    shift = ", ".join(_figure(v, 7) for v in placement.shift / length_unit)
    return f"placement = {{rotation = [{rows}], shift = [{shift}], scale = {_figure(placement.scale, 9)}}}"


def _figure(value: float, places: int) -> str:
    return f"{round(float(value), places) + 0.0:.{places}g}" if abs(value) >= 1e-4 else f"{round(float(value), 9):g}"
