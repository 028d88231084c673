"""The seams of a band: the nodes it shares with either side, how they turn, and the moment that passes through them.

The cells of the band put nodal forces on whatever hangs on them. Those on a seam, taken about the band's line, are
the moment it passes on to that side: a free-body cut through the mesh. Nodal forces are in equilibrium cell by cell
(Bathe, Finite Element Procedures, 1996, section 4.2.1), so that no stress is interpolated and nothing depends on how
the energy is spread: 2U/θ² of the band's cells leaves out what gives way in the corners beside a groove, and takes in
what bends at the ends of ligaments without turning the sides; it was up to 68 % low on generated parts.
"""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass

import numpy as np

from viewer.cells import KINDS
from viewer.insight.hinges.band import Draft
from viewer.insight.hinges.curve import Line
from viewer.mechanics.formulations import FORMULATIONS, formulation_for
from viewer.model.arrays import Array
from viewer.model.design import Design
from viewer.model.mesh import Mesh

_BALANCE = 0.1  # of the moment: both seams pass it on but for the band's own inertia, else the forces are noise
_AT_ONCE = 1000  # element matrices
_FLAT = 1e6  # condition of the inertia of a seam's nodes from which they lie on one line


@dataclass(frozen=True, eq=False)
class Seam:
    """sign −1 on side A, 1 on side B; nodes (k,) ascending rows, none where the clamp is at the edge."""

    sign: int
    nodes: Array
    ground: bool


def seams_of(mesh: Mesh, draft: Draft) -> tuple[Seam, Seam]:
    """Seams of sides A and B."""
    frame, own = draft.frame, mesh.nodes_of_cells(draft.cells)
    out = []
    for sign, edge, side in zip((-1, 1), draft.edges, draft.sides, strict=True):
        beyond = np.setdiff1d(frame.near[sign * (frame.across - edge) > 0], draft.cells)
        nodes = np.intersect1d(own, mesh.nodes_of_cells(beyond), assume_unique=True)
        out.append(Seam(sign, nodes[:0] if side.ground else nodes, side.ground))
    return out[0], out[1]


def turn_between(
    mesh: Mesh, seams: tuple[Seam, Seam], solid: bool, moved: Array, turned: Array | None
) -> Array | None:
    """(3,) rotation of seam B less that of seam A: that of the best rigid motion of the nodes of a ``solid``
    band, else the mean of the nodes' own. None when the nodes of a seam cannot tell: too few, on one line."""
    turns = []
    for seam in seams:
        nodes = seam.nodes
        if seam.ground:
            turns.append(np.zeros(3))
        elif len(nodes) == 0:
            return None
        elif not solid:
            if turned is None:
                return None
            turns.append(turned[nodes].mean(axis=0))
        else:
            arm, move = (values[nodes] - values[nodes].mean(axis=0) for values in (mesh.points, moved))
            inertia = np.sum(arm**2) * np.eye(3) - arm.T @ arm
            if np.linalg.cond(inertia) > _FLAT:
                return None
            turns.append(np.linalg.solve(inertia, np.cross(arm, move).sum(axis=0)))
    return turns[1] - turns[0]


def moment_through(
    design: Design,
    draft: Draft,
    seams: tuple[Seam, Seam],
    moved: Array,
    turned: Array | None,
    formulations: Collection[str],
) -> float | None:
    """N·m per unit of the shape about the band's line, without sign: the mean of both seams.

    moved, turned  (n_nodes, 3) translations and rotations, real
    formulations   names of those the energies were formed with
    None where it cannot be told: sheets whose rotations are unknown, or seams that are not in balance.
    """
    frame, mesh = draft.frame, design.mesh
    wanted = np.union1d(seams[0].nodes, seams[1].nodes)
    found = _forces(design, draft.cells, wanted, moved, turned, formulations)
    if found is None or not len(wanted):
        return None
    points = mesh.points[wanted]
    if isinstance(frame.curve, Line):
        foot, about = draft.position, np.broadcast_to(frame.about[0], points.shape)
    else:
        along = frame.curve.along(points)
        foot, about = frame.curve.foot(along), frame.curve.tangent(along)
    force, spin = found
    each = np.einsum("ni,ni->n", np.cross(points - foot, force) + spin, about)
    moments = [s.sign * float(each[np.searchsorted(wanted, s.nodes)].sum()) for s in seams if not s.ground]
    moment = float(np.mean(moments))
    return None if np.ptp(moments) > _BALANCE * abs(moment) else abs(moment)


def _forces(
    design: Design, cells: Array, wanted: Array, moved: Array, turned: Array | None, formulations: Collection[str]
) -> tuple[Array, Array] | None:
    """Forces and moments (k, 3) that the ``cells`` put on the nodes ``wanted`` (k,), ascending rows."""
    mesh = design.mesh
    properties, index = design.properties
    force, spin = np.zeros((2, len(wanted) + 1, 3))  # the last row takes what goes to other nodes
    place = np.full(mesh.n_nodes, len(wanted))
    place[wanted] = np.arange(len(wanted))
    for block, start in zip(mesh.blocks, mesh.block_starts[:-1], strict=True):
        rows = cells[(cells >= start) & (cells < start + len(block))]
        rows = rows[(place[block.nodes[rows - start]] < len(wanted)).any(axis=1)]
        names = [f.name for f in FORMULATIONS.get(block.kind, ()) if f.name in formulations]
        for which in np.unique(index[rows]):
            if which < 0 or (turned is None and KINDS[block.kind].dim < 3):
                return None
            form = formulation_for(block.kind, names[0] if names else properties[which].formulation)
            values = moved if turned is None or not form.rotations else np.concatenate([moved, turned], axis=1)
            picked = rows[index[rows] == which] - start
            for corners in np.array_split(block.nodes[picked], -(-len(picked) // _AT_ONCE)):
                matrices = form.stiffness(mesh.points[corners], properties[which])
                out = np.einsum("eij,ej->ei", matrices, values[corners].reshape(len(corners), -1))
                out = out.reshape(*corners.shape, -1)
                np.add.at(force, place[corners], out[..., :3])
                if form.rotations:
                    np.add.at(spin, place[corners], out[..., 3:])
    return force[:-1], spin[:-1]
