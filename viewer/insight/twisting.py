"""Bending, twisting, stretching or warping of a long body: how its sections move along its long axis.

The body is cut into slices along the axis of largest extent of its mass. Each slice's motion is split into its best
rigid motion and the rest (least squares, weighted by mass; the rest is a change of the section's shape), and the
rigid motion about the slice's centre of mass into turning about the long axis (twist), motion along it (stretch), and
what is left (bending: motion across, and the tilt that goes with it). The shares of Σ m |u|² add up to one.

A body of open section sways and twists at once, since its shear centre is not its centre of mass; the larger share
then says which.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np

from viewer.mechanics.patch import rigid_fields
from viewer.model.arrays import Array
from viewer.model.cycle import steadiest_turn

SLENDER = 1.8  # length ÷ width from which a body has a long axis (common practice, no source)
_SLICES = 24
_LEAST = 6  # points in a slice
_LEADS = 0.5  # share of bending or twist from which it is asked where it stands still
_STILL = 0.05  # of the largest: smaller values do not count as a change of sign


@dataclass(frozen=True, eq=False)
class LongAxis:
    """How the sections of a long body move in one mode. Shares are of Σ m |u|².

    axis       (3,) unit; length, width m, extents along it and the larger one across
    bending, twisting, stretching, warping   shares; warping: sections lose their shape
    across     (3,) unit, the direction in which the sections mostly move across the axis
    straight   share of the motion across that goes along ``across``
    nodes      where along the axis (0 … 1) sections stand still, when most of the motion is bending or is twisting
    """

    axis: Array
    length: float
    width: float
    bending: float
    twisting: float
    stretching: float
    warping: float
    across: Array
    straight: float
    nodes: tuple[float, ...]

    def to_dict(self) -> dict[str, Any]:
        return {
            "axis": self.axis.tolist(),
            "length_m": self.length,
            "width_m": self.width,
            "bending_share": self.bending,
            "twisting_share": self.twisting,
            "stretching_share": self.stretching,
            "warping_share": self.warping,
            "across": self.across.tolist(),
            "across_straight": self.straight,
            "still_sections": len(self.nodes),
            "still_at": list(self.nodes),
        }


def long_axis(points: Array, masses: Array, shape: Array) -> LongAxis | None:
    """From points (n, 3), their masses (n,) and motion (n, 3), real or complex. None when the body is not long."""
    used = masses > 0
    points, masses, shape = points[used], masses[used], shape[used]
    if len(points) < 2 * _LEAST:
        return None
    frame = _frame(points, masses)
    along = points @ frame[0]
    extents = np.ptp(points @ frame.T, axis=0)
    if extents[0] < SLENDER * extents[1:].max() or extents[0] <= 0:
        return None
    slices = _slices(along)
    motions = [_motion(points[rows], masses[rows], shape[rows], frame[0]) for rows in slices]
    energy = np.array([m.energy for m in motions])
    total = energy.sum()
    if not total > 0:
        return None
    weight = np.array([m.mass for m in motions])
    moved = np.stack([m.moved for m in motions])
    turned = np.array([m.turned for m in motions])
    sideways = moved - np.outer(moved @ frame[0], frame[0])
    spread = ((weight[:, None] * sideways).T @ sideways.conj()).real
    strength, axes = np.linalg.eigh(spread)
    across = axes[:, -1] * np.sign(axes[np.argmax(np.abs(axes[:, -1])), -1])
    parts = np.array([m.parts for m in motions]).sum(axis=0) / total
    place = np.array([masses[rows] @ along[rows] / masses[rows].sum() for rows in slices])
    place = (place - along.min()) / extents[0]
    leading = turned if parts[1] > parts[0] else sideways @ across
    return LongAxis(
        axis=frame[0],
        length=float(extents[0]),
        width=float(extents[1:].max()),
        bending=float(parts[0]),
        twisting=float(parts[1]),
        stretching=float(parts[2]),
        warping=float(1 - parts.sum()),
        across=across,
        straight=float(strength[-1] / max(strength.sum(), 1e-300)),
        nodes=_still(place, leading) if max(parts[:2]) >= _LEADS else (),
    )


@dataclass(frozen=True, eq=False)
class _Motion:
    """Of a slice: mass, Σ m|u|², translation (3,), turn about the axis, energies of bending, twist and stretch."""

    mass: float
    energy: float
    moved: Array
    turned: complex
    parts: tuple[float, float, float]


def _frame(points: Array, masses: Array) -> Array:
    """(3, 3) rows: the axis of the largest extent of mass, and two across; nearly a coordinate axis: that axis."""
    arms = points - masses @ points / masses.sum()
    _, axes = np.linalg.eigh((masses[:, None] * arms).T @ arms)
    axis = axes[:, -1] * np.sign(axes[np.argmax(np.abs(axes[:, -1])), -1])
    nearest = int(np.argmax(np.abs(axis)))
    if axis[nearest] > np.cos(np.radians(3)):
        axis = np.eye(3)[nearest]
    second = axes[:, 1] - axis * (axis @ axes[:, 1])
    second /= np.linalg.norm(second)
    return np.stack([axis, second, np.cross(axis, second)])


def _slices(along: Array) -> list[Array]:
    """Rows of the points of each slice; a slice with too few points joins the one before."""
    edges = np.linspace(along.min(), along.max(), _SLICES + 1)
    number = np.clip(np.searchsorted(edges, along, side="right") - 1, 0, _SLICES - 1)
    found: list[Array] = []
    for k in range(_SLICES):
        rows = np.nonzero(number == k)[0]
        if len(rows) == 0:
            continue
        if found and (len(rows) < _LEAST or len(found[-1]) < _LEAST):
            found[-1] = np.concatenate([found[-1], rows])
        else:
            found.append(rows)
    return found


def _motion(points: Array, masses: Array, shape: Array, axis: Array) -> _Motion:
    centre = masses @ points / masses.sum()
    fields = rigid_fields(points, centre)
    root = np.sqrt(masses)[:, None]
    sides = np.concatenate([(root * shape.real).reshape(-1, 1), (root * shape.imag).reshape(-1, 1)], axis=1)
    fit, *_ = np.linalg.lstsq((root[:, :, None] * fields).reshape(-1, 6), sides, rcond=1e-9)
    motion = fit[:, 0] + 1j * fit[:, 1] if np.iscomplexobj(shape) else fit[:, 0]
    moved, turned = motion[:3], motion[3:]
    energy = float(masses @ (np.abs(shape) ** 2).sum(axis=1))
    rigid = float(masses @ (np.abs(fields @ motion) ** 2).sum(axis=1))
    spin = axis @ turned
    # The slice's turning energy is split between twist and tilt by leaving the twist out.
    tilt = fields @ np.concatenate([moved, turned - spin * axis])
    twist = rigid - float(masses @ (np.abs(tilt) ** 2).sum(axis=1))
    stretch = masses.sum() * float(np.abs(moved @ axis) ** 2)
    twist = min(max(twist, 0.0), rigid)
    return _Motion(float(masses.sum()), energy, moved, spin, (rigid - twist - stretch, twist, stretch))


def _still(place: Array, values: Array) -> tuple[float, ...]:
    """Where the values change sign along the axis, by straight lines between sections."""
    swing = (values * steadiest_turn(values)).real
    size = np.abs(swing).max()
    rows = np.nonzero(np.abs(swing) > _STILL * size)[0]
    found = []
    for a, b in pairwise(rows):
        if swing[a] * swing[b] < 0:
            found.append(float(place[a] + (place[b] - place[a]) * swing[a] / (swing[a] - swing[b])))
    return tuple(found)
