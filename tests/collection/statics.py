"""Rotational stiffness of a band by a static solution of its own, apart from any mode.

The band is cut out with a margin of its surroundings; the face before it is held, the face behind it moves as a rigid
body, free to shift, and carries a unit moment about the line. The turn between the band's true edges under this load
is read off as it is in a mode (:func:`tests.collection.truth.fold`), so that k = moment / turn.

The truth is no property of a mesh: the solution is repeated with every cell halved in every direction, through the
thickness of solids too, until two in a row agree within ``SETTLED``; the last one counts. Where they do not agree
before the mesh grows too large, there is no truth and the stiffness is not judged.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp

from tests.collection import truth
from tests.collection.sheets import Band, Built, Sheet, build, inside
from viewer.cells import KINDS
from viewer.mechanics.assembly import assemble
from viewer.mechanics.factor import factorise
from viewer.mechanics.patch import rigid_fields
from viewer.model.arrays import Array
from viewer.model.mesh import CellBlock

SETTLED = 0.05
HALVINGS, LARGEST = 3, {2: 60_000, 3: 12_000}  # at most so often, and so many cells of the whole part


@dataclass(frozen=True)
class Settled:
    """What a band's stiffness settles to, N·m/rad (NaN: it does not); what share of it the last halving changed."""

    value: float
    change: float


def settled(name: str, sheet: Sheet, kind: str) -> list[Settled]:
    """The true stiffness of every band of a sheet."""
    ladders: list[list[float]] = [[] for _ in sheet.bands]
    for halving in range(HALVINGS + 1):
        left = [
            (band, ladder)
            for band, ladder in zip(sheet.bands, ladders, strict=True)
            if band.cut is not None and not agree(ladder)
        ]
        if not left:
            break
        built = build(name, sheet, kind, 2**halving, 2**halving)
        if halving > 1 and built.mesh.n_cells > LARGEST[KINDS[kind].dim]:
            break
        for band, ladder in left:
            ladder.append(stiffness(built, band))
    nan = float("nan")
    return [
        Settled(ladder[-1] if agree(ladder) else nan, ladder[-1] / ladder[-2] - 1) if ladder else Settled(nan, nan)
        for ladder in ladders
    ]


def agree(ladder: list[float]) -> bool:
    """Whether the last two of a row are near enough for the last to count."""
    return len(ladder) > 1 and abs(ladder[-1] / ladder[-2] - 1) <= SETTLED


def stiffness(built: Built, band: Band) -> float:
    """N·m/rad on the mesh that is given; NaN for bands without a cut."""
    if band.cut is None:
        return float("nan")
    system, rows = _cut_out(built, band)
    points = built.mesh.points[rows]
    where = built.where[rows, band.across]
    line = built.line(band)
    centre, axis = line.mean(axis=0), line[-1] - line[0]
    start = 0.0 if band.root else where.min()
    first, last = np.isclose(where, start, atol=1e-9), np.isclose(where, where.max(), atol=1e-9)
    held = np.unique(system.dof[first])
    moving = system.dof[last].ravel()
    rigid = np.concatenate([rigid_fields(points[last], centre), _spins(int(last.sum()))], axis=1).reshape(-1, 6)
    there = moving >= 0
    free = np.setdiff1d(np.arange(system.n_dof), np.concatenate([held, moving[there]]))
    # All degrees of freedom from the free ones and the six motions of the moving face.
    carry = sp.csr_array(
        sp.hstack(
            [
                sp.coo_array((np.ones(len(free)), (free, np.arange(len(free)))), shape=(system.n_dof, len(free))),
                _rows(moving[there], rigid[there], system.n_dof),
            ]
        )
    )
    reduced = sp.csr_array(carry.T @ system.K @ carry)
    reduced = sp.csr_array((reduced + reduced.T) / 2)
    reduced.sort_indices()
    load = np.zeros(reduced.shape[0])
    load[-3:] = axis / np.linalg.norm(axis)
    solved = carry @ factorise(reduced, definite=True).solve(load)
    moved, turned = system.spread(solved[None])
    full = np.zeros((2, built.mesh.n_nodes, 3))
    full[0, rows] = moved[0]
    if turned is not None:
        full[1, rows] = turned[0]
    turn, _, _ = truth.fold(built, band, full[0], full[1])
    return 1.0 / float(turn @ load[-3:])


def _cells(built: Built, band: Band) -> Array:
    assert band.cut is not None
    s, t = built.middle.T
    return inside(s, t, band.cut) & ~built.rib


def _cut_out(built: Built, band: Band):
    """Matrices of the cells inside the cut, unsupported, and the rows of their nodes in the whole mesh."""
    mesh, picked = built.mesh, _cells(built, band)
    (block,) = mesh.blocks
    rows, nodes = np.unique(block.nodes[picked], return_inverse=True)
    number = np.cumsum(picked) - 1
    groups = {name: number[cells[picked[cells]]] for name, cells in mesh.cell_groups.items()}
    part = mesh.with_(
        points=mesh.points[rows],
        blocks=(CellBlock(block.kind, nodes.reshape(-1, block.nodes.shape[1]), block.ids[picked]),),
        node_ids=mesh.node_ids[rows],
        node_groups={},
        cell_groups={name: cells for name, cells in groups.items() if len(cells)},
    )
    physics = built.design.physics
    kept = tuple(a for a in physics.assignments if a.target == "*" or a.target in part.cell_groups)
    design = built.design.with_(mesh=part, physics=type(physics)(physics.materials, kept))
    return assemble(design), rows


def _spins(count: int) -> Array:
    """(count, 3, 6) rotations of nodes under the six motions of the body they belong to."""
    return np.tile(np.hstack([np.zeros((3, 3)), np.eye(3)]), (count, 1, 1))


def _rows(rows: Array, values: Array, size: int) -> sp.coo_array:
    n = values.shape[1]
    return sp.coo_array((values.ravel(), (np.repeat(rows, n), np.tile(np.arange(n), len(rows)))), shape=(size, n))
