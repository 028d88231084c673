"""What the search looks at: place, volume, energy and rotation of every cell in one mode, and which cells touch."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.sparse as sp
from scipy.sparse.csgraph import connected_components

from viewer.cells import KINDS
from viewer.mechanics.relative import states_no_material
from viewer.mechanics.turning import cell_rotations
from viewer.model.arrays import Array
from viewer.model.design import Design
from viewer.model.mesh import Mesh


@dataclass(frozen=True, eq=False)
class Field:
    """One mode by cell row; only cells that carry stiffness count, the others have no volume.

    size      m, diagonal of the part
    points    (n_nodes, 3) m; corners (n_cells, c) node rows, the first repeated to fill up
    middle    (n_cells, 3) m; dim (n_cells,) 1 beams, 2 sheets, 3 solids
    volume    (n_cells,) m³; strain, kinetic (n_cells,) shares of the whole
    mass      (n_cells,) share of the mass of the cells
    shift     (n_cells, 3) translation of the middle; turn (n_cells, 3) rotation, per unit of the shape
    own       (n_cells,) cells whose rotation is that of their nodes, and so belongs to their middle
    touch     (n_cells, n_cells) symmetric CSR pattern of cells with a common side
    clamped   (n_cells,) cells with nodes that are held in every way that matters there
    """

    size: float
    points: Array
    corners: Array
    middle: Array
    dim: Array
    volume: Array
    strain: Array
    kinetic: Array
    mass: Array
    shift: Array
    turn: Array
    own: Array
    touch: sp.csr_array
    clamped: Array

    @cached_property
    def density(self) -> Array:
        """(n_cells,) strain-energy density relative to the mean."""
        whole = self.strain.sum() / self.volume.sum()
        return np.divide(self.strain, self.volume * whole, out=np.zeros(len(self.strain)), where=self.volume > 0)

    @cached_property
    def turn_rms(self) -> float:
        """Root of the mean square rotation, by volume."""
        return float(np.sqrt(self.volume @ (self.turn**2).sum(axis=1) / self.volume.sum()))

    def pieces(self, cells: Array) -> Array:
        """(len(cells),) number of the connected piece of each of the ``cells`` (rows)."""
        part = self.touch[cells][:, cells]
        return connected_components(part, directed=False)[1]

    def largest_cell(self, cells: Array) -> float:
        """Median extent of the cells, m."""
        corners = self.points[self.corners[cells]]
        return float(np.median(np.linalg.norm(np.ptp(corners, axis=1), axis=1))) if len(cells) else 0.0


def make_field(
    design: Design, shape: Array, rotations: Array | None, strain: Array, kinetic: Array, volume: Array
) -> Field:
    """The field of a real ``shape`` (n_nodes, 3) with energies (n_cells,) as shares of the whole."""
    mesh = design.mesh
    corners = _corners(mesh)
    dim = np.concatenate([np.full(len(b), KINDS[b.kind].dim) for b in mesh.blocks])
    turn, own = cell_rotations(mesh, shape), np.zeros(mesh.n_cells, bool)
    if rotations is not None and (dim < 3).any():
        own = (dim == 1) | (dim == 2)
        turn[own] = _own_turns(mesh.points, corners[own], turn[own], rotations, dim[own])
    return Field(
        size=mesh.diagonal,
        points=mesh.points,
        corners=corners,
        middle=_means(mesh, mesh.points),
        dim=dim,
        volume=volume,
        strain=strain,
        kinetic=kinetic,
        mass=_masses(design, volume),
        shift=_means(mesh, shape),
        turn=turn,
        own=own,
        touch=touching(mesh),
        clamped=_clamped(design, dim),
    )


def _own_turns(points: Array, corners: Array, turn: Array, rotations: Array, dim: Array) -> Array:
    """Rotation of sheets and beams by their nodes' own rotations; about the normal of a sheet that of its best rigid
    motion is kept, since the nodes' rotation about it is hardly held by anything."""
    distinct = np.ones(corners.shape)
    distinct[:, 1:] = corners[:, 1:] != corners[:, :1]
    mean = np.einsum("nk,nki->ni", distinct, rotations[corners]) / distinct.sum(axis=1, keepdims=True)
    a, b, c = (points[corners[:, i % corners.shape[1]]] for i in range(3))
    normal = np.cross(b - a, c - a)
    size = np.linalg.norm(normal, axis=1, keepdims=True)
    normal = np.where((dim == 2)[:, None], normal / np.maximum(size, 1e-300), 0.0)
    return mean + np.einsum("ni,ni->n", turn - mean, normal)[:, None] * normal


def _corners(mesh: Mesh) -> Array:
    most = max(KINDS[b.kind].n_corners for b in mesh.blocks)
    out = np.empty((mesh.n_cells, most), np.int64)
    for block, start in zip(mesh.blocks, mesh.block_starts[:-1], strict=True):
        count = KINDS[block.kind].n_corners
        rows = out[start : start + len(block)]
        rows[:, :count] = block.nodes[:, :count]
        rows[:, count:] = block.nodes[:, :1]
    return out


def _means(mesh: Mesh, values: Array) -> Array:
    return np.concatenate([values[b.nodes].mean(axis=1) for b in mesh.blocks])


def _masses(design: Design, volume: Array) -> Array:
    """Shares of the cells' mass; one density where the design states none."""
    if states_no_material(design):
        return volume / volume.sum()
    props, index = design.properties
    densities = np.array([*(p.material.density for p in props), 0.0], float)
    mass = volume * densities[index]
    return mass / mass.sum() if mass.sum() > 0 else volume / volume.sum()


def touching(mesh: Mesh) -> sp.csr_array:
    """(n_cells, n_cells) cells with a common side: a face of solids, an edge of sheets, an end of beams, and a node
    where cells of different dimension meet."""
    random = np.random.default_rng(11).integers(0, 2**63, mesh.n_nodes, dtype=np.uint64)
    keys: list[Array] = []
    cells: list[Array] = []
    dims = {KINDS[b.kind].dim for b in mesh.blocks}
    seen = np.zeros((mesh.n_nodes, 4), bool)
    for block, start in zip(mesh.blocks, mesh.block_starts[:-1], strict=True):
        kind, rows = KINDS[block.kind], np.arange(start, start + len(block))
        sides: list[tuple[int, ...]]
        if kind.dim == 3:
            sides = [face[: KINDS[name].n_corners] for name, face in kind.faces]
        elif kind.dim == 2:
            sides = [edge[:2] for edge in kind.edges]
        else:
            sides = [(i,) for i in range(min(2, kind.n_corners))]
        for side in sides:  # the sum of random numbers names a set of nodes in whatever order
            keys.append(random[block.nodes[:, list(side)]].sum(axis=1, dtype=np.uint64))
            cells.append(rows)
        seen[block.nodes.ravel(), kind.dim] = True
    if len(dims) > 1:
        shared = seen.sum(axis=1) > 1
        for block, start in zip(mesh.blocks, mesh.block_starts[:-1], strict=True):
            row, column = np.nonzero(shared[block.nodes[:, : KINDS[block.kind].n_corners]])
            keys.append(random[block.nodes[row, column]])
            cells.append(row + start)
    key, cell = np.concatenate(keys), np.concatenate(cells)
    order = np.argsort(key)
    key, cell = key[order], cell[order]
    same = np.nonzero(key[1:] == key[:-1])[0]
    one, other = cell[same], cell[same + 1]
    n = mesh.n_cells
    rows, columns = np.concatenate([one, other]), np.concatenate([other, one])
    return sp.csr_array((np.ones(len(rows), np.int8), (rows, columns)), shape=(n, n))


def _clamped(design: Design, dim: Array) -> Array:
    """Cells at nodes held in all three translations, and in all rotations where these belong to sheets and beams."""
    mesh = design.mesh
    held = np.zeros((mesh.n_nodes, 6), bool)
    for support in design.physics.supports:
        rows = support.where.rows(mesh)
        for name in support.held:
            held[rows, ("ux", "uy", "uz", "rx", "ry", "rz").index(name)] = True
    still, fixed = np.all(held[:, :3], axis=1), np.all(held, axis=1)
    out = np.zeros(mesh.n_cells, bool)
    for block, start in zip(mesh.blocks, mesh.block_starts[:-1], strict=True):
        flag: Array = np.asarray(still if KINDS[block.kind].dim == 3 else fixed)
        out[start : start + len(block)] = flag[block.nodes].sum(axis=1) >= min(3, KINDS[block.kind].dim)
    return out
