"""Pieces of a mode's character that need no matrices: energy by group, concentration, sheets, points that matter."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from viewer.cells import KINDS
from viewer.insight.scale import carried_points
from viewer.mechanics.energy import Energies
from viewer.model.arrays import Array
from viewer.model.cycle import cycle_peaks
from viewer.model.design import Design, FunctionalPoint
from viewer.model.mesh import Mesh

_WHOLE = 0.95  # share of the cells above which a group is the whole body
_FLAT = np.cos(np.radians(10))  # to the common normal: sheets within it are one flat sheet


@dataclass(frozen=True)
class GroupShare:
    """Shares of the whole, springs and lumped masses included: 0 … 1, None when not known. Groups may overlap."""

    name: str
    kinetic: float
    strain: float | None
    mass: float

    def to_dict(self) -> dict[str, Any]:
        return {
            "name": self.name,
            "kinetic_share": self.kinetic,
            "strain_share": self.strain,
            "mass_share": self.mass,
        }


@dataclass(frozen=True)
class Concentration:
    """How local a mode is. half_in: least share of the mass that holds half of the kinetic energy (a cantilever's
    first bending: 0.16). participation: (Σmv²)²/(Σm Σmv⁴), 1 when all moves alike."""

    half_in: float
    participation: float


@dataclass(frozen=True)
class PointMotion:
    """A functional point in one mode. along, whole: largest motion over the cycle in its sensitive direction and in
    any, per unit of the shape; to_largest: ``along`` ÷ the body's largest motion."""

    name: str
    effect: str
    direction: tuple[float, float, float]
    direction_word: str
    along: float
    whole: float
    to_largest: float

    def to_dict(self, per_shape: float | None) -> dict[str, Any]:
        return {
            "point": self.name,
            "effect": self.effect or None,
            "direction": list(self.direction),
            "direction_word": self.direction_word or None,
            "share_of_its_motion": (self.along / self.whole) ** 2 if self.whole > 0 else None,
            "ratio_to_largest": self.to_largest,
            "along_per_shape_unit": self.along,
            "along_real_m": None if per_shape is None else self.along * per_shape,
        }


def group_shares(design: Design, energies: Energies, j: int, masses: Array, lumped: Array) -> tuple[GroupShare, ...]:
    """Of the cell groups that are not the whole body, most kinetic energy first; masses (n_cells,), lumped (m,)."""
    mesh = design.mesh
    kinetic, strain = energies.total_kinetic[j], energies.total_strain[j]
    total = masses.sum() + lumped.sum()
    found = []
    for name, rows in mesh.cell_groups.items():
        if not 0 < len(rows) < _WHOLE * mesh.n_cells or not masses[rows].any():
            continue
        share = float(energies.kinetic[j, rows].sum() / kinetic) if kinetic > 0 else 0.0
        held = float(energies.strain[j, rows].sum() / strain) if strain > 0 else None
        found.append(GroupShare(name, share, held, float(masses[rows].sum() / total)))
    return tuple(sorted(found, key=lambda group: -group.kinetic))


def concentration(kinetic: Array, masses: Array) -> Concentration:
    """From the kinetic energies and masses of all cells and lumped masses."""
    there = masses > 0
    kinetic, masses = np.maximum(kinetic[there], 0), masses[there]
    density = kinetic / masses
    order = np.argsort(-density)
    energy, mass = np.cumsum(kinetic[order]) / kinetic.sum(), np.cumsum(masses[order]) / masses.sum()
    half = float(np.interp(0.5, np.append(0, energy), np.append(0, mass)))
    return Concentration(half, float(kinetic.sum() ** 2 / (masses.sum() * (kinetic**2 / masses).sum())))


def out_of_plane(mesh: Mesh, shape: Array, masses: Array) -> tuple[float, bool] | None:
    """Share of Σ m|u|² of the sheets that goes along their normals, and whether they form one flat sheet.

    None when less than half the mass is in sheets. Motion of a cell: the mean of its nodes'.
    """
    normals, motions, weights = [], [], []
    for block, start in zip(mesh.blocks, mesh.block_starts[:-1], strict=True):
        if KINDS[block.kind].dim != 2:
            continue
        corners = mesh.points[block.nodes[:, : KINDS[block.kind].n_corners]]
        last = 3 if corners.shape[1] == 4 else 0
        normal = np.cross(corners[:, 2] - corners[:, 0], corners[:, last] - corners[:, 1])
        normals.append(normal / np.maximum(np.linalg.norm(normal, axis=1), 1e-300)[:, None])
        motions.append(shape[block.nodes].mean(axis=1))
        weights.append(masses[start : start + len(block)])
    if not weights or sum(w.sum() for w in weights) < 0.5 * masses.sum():
        return None
    normal, motion, weight = np.concatenate(normals), np.concatenate(motions), np.concatenate(weights)
    whole = float(weight @ (np.abs(motion) ** 2).sum(axis=1))
    if not whole > 0:
        return None
    share = float(weight @ np.abs(np.einsum("ci,ci->c", motion, normal)) ** 2) / whole
    _, axes = np.linalg.eigh((weight[:, None] * normal).T @ normal)
    return share, bool((np.abs(normal @ axes[:, -1]) >= _FLAT)[weight > 0].all())


def point_motions(design: Design, shape: Array) -> tuple[PointMotion, ...]:
    """Of every functional point; the largest motion is that of all nodes and of all named points."""
    carried = carried_points(design)
    moving = design.mesh.used_nodes if len(design.mesh.used_nodes) else slice(None)
    moves = [shape[moving], *(point.motion(shape)[None, :3] for point in carried)]
    largest = float(cycle_peaks(np.concatenate(moves)).max(initial=0))
    found = []
    for point in carried:
        if not isinstance(point.item, FunctionalPoint):
            continue
        motion = point.motion(shape)[:3]
        along = float(np.abs(motion @ point.item.direction))
        x, y, z = point.item.direction.tolist()
        found.append(
            PointMotion(
                point.name,
                point.item.effect,
                (x, y, z),
                point.item.direction_word,
                along,
                float(cycle_peaks(motion[None])[0]),
                along / largest if largest > 0 else 0.0,
            )
        )
    return tuple(found)
