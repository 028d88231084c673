"""Where two designs have material in common, and how shapes of one are carried to places of the other.

The nodes of the mesh with fewer nodes are looked up in the cells of the other one, whose shape functions carry its
shapes there (DESIGN §6 "Lineage"). Each place weighs what the mass around it weighs, so that products of shapes do
not depend on how finely a region is meshed.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.sparse as sp
from scipy.sparse.csgraph import connected_components
from scipy.spatial import cKDTree

from viewer.cells import measures
from viewer.cells.locate import interpolation, nearest
from viewer.errors import ModelError, RefusedError
from viewer.insight.scale import CarriedPoint, carried_points
from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import lay_out
from viewer.mechanics.sums import cell_volumes
from viewer.model.arrays import Array
from viewer.model.design import Design, LumpedMass
from viewer.model.mesh import Mesh
from viewer.model.written import GAP, digits

NEAR = 0.01  # a place farther from the other design than this share of the smaller diagonal is not in it
_ROUNDING = 1e-9  # of the diagonal: what the search for a place leaves


@dataclass(frozen=True, eq=False)
class OneSided:
    """A region that only one of the designs has: cell rows, share of that design's mass, where it is. Pieces that lie
    in one group count as one region."""

    design: str
    cells: Array
    mass_share: float
    place: str


@dataclass(frozen=True, eq=False)
class CommonSupport:
    """n places that two designs share.

    first, second  (n, nodes of that mesh) sparse: carry nodal values to the places
    weights        (n,) kg (m³ where no masses are known) around each place
    masses         pairs of lumped masses of the same name in both designs
    distances      (n,) m between a place and the other design
    regions        what only one of the two has
    """

    first: sp.csr_array
    second: sp.csr_array
    weights: Array
    masses: tuple[tuple[CarriedPoint, CarriedPoint], ...]
    distances: Array
    regions: tuple[OneSided, ...]

    def values_of_first(self, shape: Array) -> Array:
        """(3 n + 3 masses,) motion of ``shape`` (nodes, 3) at the places, times the root of the weights: products of
        such vectors are weighted by mass."""
        return self._values(self.first, shape, 0)

    def values_of_second(self, shape: Array) -> Array:
        """The same for a shape of the second design."""
        return self._values(self.second, shape, 1)

    def _values(self, operator: sp.csr_array, shape: Array, which: int) -> Array:
        moved = (operator @ shape) * np.sqrt(self.weights)[:, None]
        carried = [
            pair[which].motion(shape)[:3] * np.sqrt(_mass(pair[0]) / 2 + _mass(pair[1]) / 2) for pair in self.masses
        ]
        return np.concatenate([moved.ravel(), *carried])

    @property
    def sentence(self) -> str:
        facts = self.to_dict()
        words = f"Shapes are compared at {facts['places']} places "
        if facts["largest_distance_m"]:
            words += f"at most {digits(1000 * facts['largest_distance_m'])}{GAP}mm from the other design's mesh"
        else:
            words += "that both designs share"
        for region in facts["regions"]:
            words += f"; {region['place']} is in {region['design']} only ({region['mass_share']:.1%} of its mass)"
        return words + "."

    def to_dict(self) -> dict[str, Any]:
        return {
            "places": len(self.weights),
            "largest_distance_m": float(self.distances.max()),
            "mean_distance_m": float(self.distances.mean()),
            "shared_lumped_masses": [one.name for one, _ in self.masses],
            "regions": [
                {"design": r.design, "place": r.place, "mass_share": r.mass_share, "cells": len(r.cells)}
                for r in self.regions
            ],
        }


def common_support(first: Design, second: Design, progress: Progress = SILENT) -> CommonSupport:
    """The places that two designs share; designs on the same cells (one swept from the other) share every node.

    ``RefusedError`` when fewer than three places are shared: the meshes do not lie at the same place.
    """
    if _same_cells(first.mesh, second.mesh):
        return _every_node(first, second)
    swap = len(_places(first.mesh)) > len(_places(second.mesh))
    fine, coarse = (first, second) if swap else (second, first)
    near = NEAR * min(first.mesh.diagonal, second.mesh.diagonal)
    rows = _places(coarse.mesh)
    progress.tick("common support", 0, 3)
    carried, distances = _looked_up(fine.mesh, coarse.mesh.points[rows], near)
    distances[distances < _ROUNDING * fine.mesh.diagonal] = 0
    shared = distances <= near
    if shared.sum() < 3:
        raise RefusedError(
            "the two designs share no common support: their meshes do not lie at the same place",
            do="give both meshes in the same coordinate system and the right unit of length",
        )
    progress.tick("common support", 1, 3)
    away = np.full(coarse.mesh.n_nodes, np.inf)
    away[rows] = distances
    regions = _regions(coarse, away > near)
    progress.tick("common support", 2, 3)
    regions = [*_regions(fine, _far_nodes(fine.mesh, coarse.mesh, near)), *regions]
    weights = _nodal_masses(coarse)[rows][shared]
    own = sp.csr_array(
        (np.ones(shared.sum()), (np.arange(shared.sum()), rows[shared])), (shared.sum(), coarse.mesh.n_nodes)
    )
    other = carried[np.nonzero(shared)[0]]
    return CommonSupport(
        other if swap else own,
        own if swap else other,
        weights,
        _shared_masses(first, second),
        distances[shared],
        tuple(sorted(regions, key=lambda region: (region.design != first.name, -region.mass_share))),
    )


def carried_over(first: Mesh, second: Mesh) -> tuple[sp.csr_array, Array]:
    """What carries nodal values of ``first`` to the nodes of ``second``: an operator (nodes of second, nodes of
    first), and which nodes (nodes of second,) bool lie in ``first``; rows of others mean nothing."""
    if _same_cells(first, second):
        return sp.eye_array(first.n_nodes, format="csr"), np.ones(first.n_nodes, bool)
    near = NEAR * min(first.diagonal, second.diagonal)
    operator, distance = _looked_up(first, second.points, near)
    return operator, distance <= near


def _same_cells(first: Mesh, second: Mesh) -> bool:
    return (
        first.n_nodes == second.n_nodes
        and [b.kind for b in first.blocks] == [b.kind for b in second.blocks]
        and all(np.array_equal(one.nodes, two.nodes) for one, two in zip(first.blocks, second.blocks, strict=True))
    )


def _every_node(first: Design, second: Design) -> CommonSupport:
    rows = _places(first.mesh)
    pick = sp.csr_array((np.ones(len(rows)), (np.arange(len(rows)), rows)), shape=(len(rows), first.mesh.n_nodes))
    weights = (_nodal_masses(first)[rows] + _nodal_masses(second)[rows]) / 2
    return CommonSupport(pick, pick, weights, _shared_masses(first, second), np.zeros(len(rows)), ())


def _places(mesh: Mesh) -> Array:
    """Rows of the nodes that count: those of cells, or all points where there is no cell, as of a test."""
    return mesh.used_nodes if mesh.n_cells else np.arange(mesh.n_nodes)


def _looked_up(mesh: Mesh, queries: Array, near: float) -> tuple[sp.csr_array, Array]:
    """The operator (q, n_nodes) that carries nodal values of ``mesh`` to the nearest places, and distances (q,);
    rows of queries farther than ``near`` may be empty, their distance infinite."""
    blocks = [(block.kind, block.nodes) for block in mesh.blocks]
    if not mesh.n_cells:  # points alone, as of a test
        distance, row_of = cKDTree(mesh.points).query(queries)
        ones = np.ones(len(queries))
        return sp.csr_array((ones, (np.arange(len(queries)), row_of)), shape=(len(queries), mesh.n_nodes)), distance
    places = nearest(blocks, mesh.points, queries, near)
    data, row, column = [np.empty(0)], [np.empty(0, int)], [np.empty(0, int)]
    for mine, nodes, weights in interpolation(blocks, places):
        data.append(weights.ravel())
        row.append(np.repeat(mine, nodes.shape[1]))
        column.append(nodes.ravel())
    parts = (np.concatenate(data), (np.concatenate(row), np.concatenate(column)))
    return sp.csr_array(parts, shape=(len(queries), mesh.n_nodes)), places.distance


def _far_nodes(mesh: Mesh, other: Mesh, near: float) -> Array:
    """(n_nodes,) bool: used nodes farther than ``near`` from the other mesh. Only nodes without a close node of the
    other mesh are looked up in its cells."""
    rows = _places(mesh)
    distance, _ = cKDTree(other.points[_places(other)]).query(mesh.points[rows])
    far = np.zeros(mesh.n_nodes, bool)
    open_rows = rows[distance > near]
    if len(open_rows):
        far[open_rows] = _looked_up(other, mesh.points[open_rows], near)[1] > near
    return far


def cell_masses(design: Design) -> Array:
    """(n_cells,) kg; the cells' own measures where the design assigns no material anywhere."""
    mesh = design.mesh
    try:
        properties, which = design.properties
        volumes = cell_volumes(lay_out(design))
    except ModelError:
        return np.concatenate([np.abs(measures(b.kind, mesh.points[b.nodes])) for b in mesh.blocks] or [np.empty(0)])
    return volumes * np.array([*(p.material.density for p in properties), 0.0])[which]


def _nodal_masses(design: Design) -> Array:
    """(n_nodes,) each cell's mass shared equally by its nodes; 1 everywhere for points without cells."""
    mesh, out = design.mesh, np.zeros(design.mesh.n_nodes)
    if not mesh.n_cells:
        return np.ones(mesh.n_nodes)
    masses = cell_masses(design)
    for block, start in zip(mesh.blocks, mesh.block_starts[:-1], strict=True):
        share = masses[start : start + len(block)] / block.nodes.shape[1]
        np.add.at(out, block.nodes, share[:, None])
    return out


def _shared_masses(first: Design, second: Design) -> tuple[tuple[CarriedPoint, CarriedPoint], ...]:
    theirs = {c.name: c for c in carried_points(second) if isinstance(c.item, LumpedMass)}
    return tuple(
        (c, theirs[c.name]) for c in carried_points(first) if isinstance(c.item, LumpedMass) and c.name in theirs
    )


def _mass(point: CarriedPoint) -> float:
    assert isinstance(point.item, LumpedMass)
    return point.item.mass


def _regions(design: Design, far: Array) -> list[OneSided]:
    """Connected regions of the cells with at least half of their nodes ``far`` (n_nodes,) from the other design."""
    mesh = design.mesh
    missing = np.concatenate([far[b.nodes].mean(axis=1) >= 0.5 for b in mesh.blocks] or [np.empty(0, bool)])
    cells = np.nonzero(missing)[0]
    if not len(cells):
        return []
    rows, nodes = [], []
    for block, start in zip(mesh.blocks, mesh.block_starts[:-1], strict=True):
        mine = np.nonzero(missing[start : start + len(block)])[0]
        rows.append(np.repeat(mine + start, block.nodes.shape[1]))
        nodes.append(block.nodes[mine].ravel())
    row = np.searchsorted(cells, np.concatenate(rows))
    touch = sp.csr_array((np.ones(len(row)), (row, np.concatenate(nodes))), shape=(len(cells), mesh.n_nodes))
    _, label = connected_components(touch @ touch.T, directed=False)
    masses = cell_masses(design)
    total = max(float(masses.sum()), 1e-300)
    named: dict[str, list[Array]] = {}
    for k in range(label.max() + 1):
        part = cells[label == k]
        named.setdefault(_place(mesh, part), []).append(part)
    regions = {place: np.concatenate(parts) for place, parts in named.items()}
    return [OneSided(design.name, r, float(masses[r].sum()) / total, place) for place, r in regions.items()]


def _place(mesh: Mesh, cells: Array) -> str:
    """A cell group that the region fills or lies in, else coordinates."""
    inside = {n: len(np.intersect1d(cells, rows)) for n, rows in mesh.cell_groups.items() if len(rows) < mesh.n_cells}
    named = {n: len(mesh.cell_groups[n]) for n, both in inside.items() if both >= 0.9 * len(cells)}
    if named:
        return min(named, key=lambda n: named[n])
    x, y, z = (round(1000 * c) for c in mesh.points[mesh.nodes_of_cells(cells)].mean(axis=0).tolist())
    return f"a region about ({x}, {y}, {z}) mm"
