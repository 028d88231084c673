"""Inertia against rigid motion: what a moving base, or the body moving as one piece, has to do with its modes.

The supports move as one rigid base, grounded springs with them: u = r a + F y, with r the six rigid motions, a the
base's motion and F what the free degrees of freedom y carry (links and ties included). The base drives the free ones
through g = Fᵀ M r, which without links is M_ff r_f + M_fs r_s, and a mode φ = F y answers with (gᵀy)²/(φᵀMφ), its
effective mass. The sum over all modes is gᵀ M_ff⁻¹ g; what is missing from rᵀ M r rides on the supports. (Wijker J.,
Mechanical Vibrations in Spacecraft Design, 2004, ch. 9; from memory.)

Only the mass enters: no stiffness is formed.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.sparse as sp

from viewer.errors import ModelError
from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import Layout, lay_out
from viewer.mechanics.constraints import Attachment
from viewer.mechanics.given_matrices import given_system
from viewer.mechanics.patch import rigid_fields
from viewer.mechanics.pattern import Pattern
from viewer.mechanics.turning import cell_rotations
from viewer.model.arrays import Array
from viewer.model.design import Design
from viewer.model.modes import ModeSet

MOTIONS = ("x", "y", "z", "about x", "about y", "about z")
_CLOSE = 1e-11  # residual of M_ff⁻¹ g, relative
_STEPS = 2000
_LAYERS = 20  # cells from the supports beyond which they are not felt, to 1e-11


@dataclass(frozen=True, eq=False)
class Inertia:
    """The mass of a design. layout; cells (n_dof, n_dof) the mass of its cells alone, kg."""

    layout: Layout
    cells: sp.csr_array

    def times(self, vectors: Array) -> Array:
        """(k, n_dof) M v of the vectors (k, n_dof), lumped masses included."""
        out = self.cells @ vectors.T
        for item in self.layout.masses:
            out[item.dofs] += item.operator.T @ (item.core @ (item.operator @ vectors[:, item.dofs].T))
        return np.ascontiguousarray(out.T)

    @cached_property
    def centre(self) -> Array:
        """(3,) m, centre of mass. Raises ``ModelError`` when nothing has mass."""
        origin = self.layout.points.mean(axis=0)
        fields = self.rigid(origin)
        crossed = fields @ self.times(fields[:3]).T  # (6, 3): rows 3… hold the first moments
        mass = np.trace(crossed[:3]) / 3
        if not mass > 0:
            raise ModelError(f"design '{self.layout.design.name}' has no mass", do="give its materials a density")
        moments = crossed[3:]  # m (arm × …): entry (about y, x) is m z
        arm = np.array([moments[2, 1] - moments[1, 2], moments[0, 2] - moments[2, 0], moments[1, 0] - moments[0, 1]])
        return origin + arm / (2 * mass)

    def rigid(self, about: Array) -> Array:
        """(6, n_dof) the unit rigid motions ux uy uz rx ry rz about a point."""
        return rigid_vectors(self.layout, about)


@dataclass(frozen=True, eq=False)
class BaseMotion:
    """What a base that moves by the six unit motions about a point has to do with a body.

    about   (3,) m
    fields  (6, n_dof) the body following as one piece; forces (6, n_dof) M times these
    pull    (6, n_free) g on the free degrees of freedom
    whole   (6,) kg and kg·m²: rᵀ M r; free (6,): gᵀ M_ff⁻¹ g, what all modes together hold
    """

    about: Array
    fields: Array
    forces: Array
    pull: Array
    whole: Array
    free: Array


def weigh(design: Design, progress: Progress = SILENT) -> Inertia:
    """The mass of a design, from its materials and lumped masses or from the matrix it was given. ``ModelError``."""
    if design.physics.matrices is not None:
        system = given_system(design)
        return Inertia(system, system.M)
    layout = lay_out(design, progress)
    return Inertia(layout, Pattern(layout).matrix(layout, "mass", progress))


def rigid_vectors(layout: Layout, about: Array) -> Array:
    """(6, n_dof) the unit rigid motions ux uy uz rx ry rz about a point, rotations of nodes included."""
    moved = np.moveaxis(rigid_fields(layout.points, about), 2, 0)
    turned = np.zeros_like(moved)
    turned[3:] = np.eye(3)[:, None, :]
    return layout.gather(moved, turned)


def base_motion(inertia: Inertia, about: Array | None = None, progress: Progress = SILENT) -> BaseMotion:
    """The six motions of a rigid base about ``about`` (None: the centre of mass)."""
    layout = inertia.layout
    point = inertia.centre if about is None else np.asarray(about, float)
    fields = inertia.rigid(point)
    forces = inertia.times(fields)
    pull = layout.force(forces)

    start = fields[:, layout.free]
    left = pull - layout.force(inertia.times(layout.extend(start)))  # what the held ones alone pull: near them only
    near = _near_supports(layout)
    progress.tick("inertia of the supports")
    beyond = _conjugate_gradients(*_mass_of(inertia, near), left[:, near], pull[:, near], progress)
    return BaseMotion(
        point,
        fields,
        forces,
        pull,
        np.einsum("in,in->i", fields, forces),
        np.einsum("in,in->i", pull, start) + np.einsum("in,in->i", pull[:, near], beyond),
    )


def mode_vectors(layout: Layout, modes: ModeSet, picked: Array) -> tuple[Array, tuple[str, ...]]:
    """(k, n_dof) the shapes of the modes ``picked`` and cautions.

    Where nodes have rotations and the modes have none, a node turns as the cells around it do on average: good enough
    for inertia, in which rotations of sheets weigh little, not for strain.
    """
    moved = np.stack([modes.shape(int(i)) for i in picked])
    if not layout.has_rotations:
        return layout.gather(moved), ()
    given = [modes.rotations(int(i)) for i in picked]
    known = [values for values in given if values is not None]
    if len(known) == len(given):
        return layout.gather(moved, np.stack(known)), ()
    turned = np.stack([_nodal_turns(layout, shape) for shape in moved])
    words = "rotations missing from the shapes are taken from the cells around a node"
    turns = layout.dof[:, 3:][layout.dof[:, 3:] >= 0]
    spun = [item.name for item in layout.masses if np.isin(item.dofs, turns).any()]
    if spun:
        words += f"; how {', '.join(spun)} turns follows from them alone and is rough"
    return layout.gather(moved, turned), (words,)


def _nodal_turns(layout: Layout, shape: Array) -> Array:
    mesh = layout.design.mesh
    turns = cell_rotations(mesh, shape)
    total, count = np.zeros(shape.shape, shape.dtype), np.zeros(mesh.n_nodes)
    for block, start in zip(mesh.blocks, mesh.block_starts[:-1], strict=True):
        for nodes in block.nodes.T:
            np.add.at(total, nodes, turns[start : start + len(block)])
            count += np.bincount(nodes, minlength=mesh.n_nodes)
    return total / np.maximum(count, 1)[:, None]


def _near_supports(layout: Layout) -> Array:
    """(n,) numbers among the free degrees of freedom up to ``_LAYERS`` cells from what is held.

    M_ff⁻¹ M_fs r_s dies away from the supports by about 2 − √3 a cell (Demko, Moss and Smith, Math. Comp. 43 (1984)
    491: inverses of banded matrices decay exponentially; the factor is that of linear cells in a row).
    """
    if layout.follow is not None or not layout.blocks:
        return np.arange(len(layout.free))
    reached = np.zeros(layout.n_dof // 3, bool)
    reached[np.nonzero(layout.held)[0] // 3] = True
    joined = [group.dofs[:, ::3] // 3 for group in layout.blocks]
    for _ in range(_LAYERS):
        before = reached.copy()
        for triples in joined:
            reached[triples[before[triples].any(axis=1)]] = True
        for item in layout.masses:
            reached[item.dofs // 3] |= before[item.dofs // 3].any()
    return np.nonzero(reached[layout.free // 3])[0]


def _mass_of(inertia: Inertia, near: Array) -> tuple[Callable[[Array], Array], Array]:
    """The mass (k, n) → (k, n) of the free degrees of freedom ``near`` alone, and its diagonal (near enough to
    precondition with, 1 where there is no mass)."""
    layout = inertia.layout
    diagonal = np.abs(inertia.cells.diagonal())
    for item in layout.masses:
        diagonal += np.bincount(item.dofs, np.abs(_diagonal(item)), layout.n_dof)
    if layout.follow is not None:
        carrier = sp.csr_array(layout.follow[:, layout.free])
        diagonal = carrier.multiply(carrier).T @ diagonal
        return lambda values: layout.force(inertia.times(layout.extend(values))), np.where(
            diagonal > 0, diagonal, 1.0
        )
    rows = layout.free[near]
    place = np.full(layout.n_dof, -1)
    place[rows] = np.arange(len(rows))
    cells = sp.csr_array(inertia.cells[rows][:, rows])
    lumped = []
    for item in layout.masses:
        there = place[item.dofs] >= 0
        lumped.append((place[item.dofs[there]], sp.csr_array(item.operator)[:, np.nonzero(there)[0]], item.core))

    def times(values: Array) -> Array:
        out = cells @ values.T
        for at, operator, core in lumped:
            out[at] += operator.T @ (core @ (operator @ values[:, at].T))
        return out.T

    diagonal = diagonal[rows]
    return times, np.where(diagonal > 0, diagonal, 1.0)


def _diagonal(item: Attachment) -> Array:
    operator = sp.csr_array(item.operator).toarray()
    return np.einsum("id,id->d", operator, item.core @ operator)


def _conjugate_gradients(
    matrix: Callable[[Array], Array], diagonal: Array, right: Array, whole: Array, progress: Progress
) -> Array:
    """(k, n) x with matrix(x) = right, all rows at once, preconditioned by the diagonal (Hestenes and Stiefel 1952),
    until what is left is nothing beside ``whole`` (k, n).

    A mass matrix needs few steps, since its condition does not grow with the mesh (Wathen A.J., IMA J. Numer. Anal. 7
    (1987) 449; from memory). A matrix that leaves some directions without mass is met too, since ``right`` lies in
    its range.
    """
    found, left = np.zeros_like(right), right.copy()
    scaled = left / diagonal
    size = np.einsum("kn,kn->k", left, scaled)
    bound = _CLOSE**2 * np.einsum("kn,kn->k", whole, whole / diagonal)
    step = scaled.copy()
    for number in range(_STEPS):
        if (size <= bound).all():
            return found
        progress.tick("inertia of the supports", number)
        along = matrix(step)
        bend = np.einsum("kn,kn->k", step, along)
        length = np.divide(size, bend, out=np.zeros_like(size), where=(bend > 0) & (size > bound))
        found += length[:, None] * step
        left -= length[:, None] * along
        scaled = left / diagonal
        last, size = size, np.einsum("kn,kn->k", left, scaled)
        step = scaled + np.divide(size, last, out=np.zeros_like(size), where=last > 0)[:, None] * step
    raise ModelError(
        "the mass that rides on the supports could not be found: the mass matrix is too badly scaled",
        do="look for materials without density or with a density in another unit",
    )
