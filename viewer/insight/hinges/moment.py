"""The moment that passes through a band: a free-body cut through the mesh.

The cells of the band put nodal forces on whatever hangs on them. Those on the nodes that the band shares with one
side, taken about its line, are the moment it passes on to that side. Nodal forces are in equilibrium cell by cell
(Bathe, Finite Element Procedures, 1996, section 4.2.1), so that no stress is interpolated and nothing depends on how
the energy is spread: 2U/θ² of the band's cells leaves out what gives way in the corners beside a groove, and takes in
what bends at the ends of ligaments without turning the sides; it was up to 68 % low on generated parts.
"""

from __future__ import annotations

from collections.abc import Collection

import numpy as np

from viewer.cells import KINDS
from viewer.insight.hinges.band import Draft
from viewer.insight.hinges.curve import Line
from viewer.mechanics.formulations import FORMULATIONS, formulation_for
from viewer.model.arrays import Array
from viewer.model.design import Design

_BALANCE = 0.1  # of the moment: both edges pass it on but for the band's own inertia, else the forces are noise
_AT_ONCE = 1000  # element matrices


def moment_through(
    design: Design, draft: Draft, moved: Array, turned: Array | None, formulations: Collection[str]
) -> float | None:
    """N·m per unit of the shape about the band's line, without sign: the mean of both edges.

    moved, turned  (n_nodes, 3) translations and rotations, real
    formulations   names of those the energies were formed with
    None where it cannot be told: sheets whose rotations are unknown, or edges that are not in balance.
    """
    frame, mesh = draft.frame, design.mesh
    own = mesh.nodes_of_cells(draft.cells)
    seams = []
    for sign, edge, side in zip((-1, 1), draft.edges, draft.sides, strict=True):
        if not side.ground:
            beyond = np.setdiff1d(frame.near[sign * (frame.across - edge) > 0], draft.cells)
            seams.append((sign, np.intersect1d(own, mesh.nodes_of_cells(beyond), assume_unique=True)))
    wanted = np.unique(np.concatenate([nodes for _, nodes in seams]))
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
    moments = [sign * float(each[np.searchsorted(wanted, nodes)].sum()) for sign, nodes in seams]
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
