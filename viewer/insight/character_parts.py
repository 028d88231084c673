"""Pieces of a mode's character that need no matrices: energy by group, concentration, sheets, points that matter."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.sparse as sp
from scipy.sparse.csgraph import connected_components

from viewer.cells import KINDS
from viewer.insight.moving_mass import Moving
from viewer.insight.scale import carried_points
from viewer.model.arrays import Array
from viewer.model.cycle import cycle_peaks, steadiest_turn
from viewer.model.design import Design, FunctionalPoint
from viewer.model.mesh import Mesh

_WHOLE = 0.95  # share of the cells above which a group is the whole body
_CLEAR, _SPECK = 0.02, 0.005  # of the largest lift, of the nodes: less is no field
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


@dataclass(frozen=True)
class SheetMotion:
    """out_of_plane: share of the sheets' Σ m|u|² along their normals; flat: all form one flat sheet; fields: in how
    many fields that one bends, parted by lines that stand still, None when it does not."""

    out_of_plane: float
    flat: bool
    fields: int | None


def group_shares(mesh: Mesh, moving: Moving) -> tuple[GroupShare, ...]:
    """Of the cell groups that are not the whole body, most kinetic energy first."""
    total = moving.masses.sum() + moving.lumped.sum()
    found = [
        GroupShare(
            name,
            float(moving.kinetic[rows].sum()),
            None if moving.strain is None else float(moving.strain[rows].sum()),
            float(moving.masses[rows].sum() / total),
        )
        for name, rows in mesh.cell_groups.items()
        if 0 < len(rows) < _WHOLE * mesh.n_cells and moving.masses[rows].any()
    ]
    return tuple(sorted(found, key=lambda group: -group.kinetic))


def concentration(moving: Moving) -> Concentration:
    """By cells and lumped masses."""
    masses = np.concatenate([moving.masses, moving.lumped])
    kinetic = np.maximum(np.concatenate([moving.kinetic, moving.lumped_kinetic]), 0)[masses > 0]
    masses = masses[masses > 0]
    order = np.argsort(-kinetic / masses)
    energy, mass = np.cumsum(kinetic[order]) / kinetic.sum(), np.cumsum(masses[order]) / masses.sum()
    half = float(np.interp(0.5, np.append(0, energy), np.append(0, mass)))
    return Concentration(half, float(kinetic.sum() ** 2 / (masses.sum() * (kinetic**2 / masses).sum())))


def sheet_motion(mesh: Mesh, shape: Array, masses: Array) -> SheetMotion | None:
    """None when less than half the mass is in sheets. Motion of a cell: the mean of its nodes'."""
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
    flat = bool((np.abs(normal @ axes[:, -1]) >= _FLAT)[weight > 0].all())
    return SheetMotion(share, flat, _fields(mesh, shape @ axes[:, -1]) if flat and share >= 0.5 else None)


def _fields(mesh: Mesh, lift: Array) -> int:
    """Number of connected fields that lift together, parted by lines that stand still."""
    swing = (lift * steadiest_turn(lift)).real
    ends = mesh.skin.outline
    clear = np.abs(swing) > _CLEAR * np.abs(swing).max()
    same = ends[(swing[ends[:, 0]] * swing[ends[:, 1]] > 0) & clear[ends].all(axis=1)]
    graph = sp.coo_array((np.ones(len(same), bool), same.T), shape=(mesh.n_nodes, mesh.n_nodes))
    _, label = connected_components(graph, directed=False)
    return int((np.bincount(label[clear]) >= max(_SPECK * mesh.n_nodes, 1)).sum())


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
