"""What is fixed to the cells: supports, springs and lumped masses, in terms of degrees of freedom.

Springs and masses are both an :class:`Attachment`: a small operator that picks a motion from the degrees of freedom
and a core (stiffness or inertia) that acts on it, so that matrix and energy come from one place.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.sparse as sp

from viewer.errors import ModelError
from viewer.mechanics.patch import RigidPatch
from viewer.model.arrays import Array
from viewer.model.design import DIRECTIONS, Design, LumpedMass, Selector, Spring, Support
from viewer.model.mesh import Mesh

MAX_FOOTPRINT = 1500  # nodes; a footprint fills its square of the mass matrix: 20 million entries at this size


@dataclass(frozen=True, eq=False)
class Attachment:
    """A spring or a lumped mass.

    name, dofs (d,); operator (r, d) sparse; core (r, r) N/m and N·m/rad, or kg and kg·m². Its matrix on the
    degrees of freedom ``dofs`` is operatorᵀ core operator.
    """

    name: str
    dofs: Array
    operator: Any
    core: Any

    def matrix(self) -> sp.coo_array:
        return sp.coo_array(self.operator.T @ self.core @ self.operator)

    def energy(self, vectors: Array) -> Array:
        """(k,) ½ vᴴ (matrix) v of the vectors (k, n_dof), real or complex."""
        motion = self.operator @ vectors[:, self.dofs].T
        return 0.5 * np.real(np.sum(np.conj(motion) * (self.core @ motion), axis=0))


def some_ids(ids: Array, limit: int = 5) -> str:
    """ "3, 4, 5 and 12 more" for messages."""
    shown = ", ".join(str(int(i)) for i in ids[:limit])
    return shown + (f" and {len(ids) - limit} more" if len(ids) > limit else "")


def footprint(where: Selector, what: str, mesh: Mesh, dof: Array, bare: str) -> Array:
    """The nodes (rows) of ``where`` that have motion in ``dof``; ``ModelError``, in which ``what`` is told to be as
    ``bare`` says, when none has, or when they are too many for one rigid patch."""
    rows = where.rows(mesh, what)
    attached = rows[dof[rows, 0] >= 0]
    if len(attached) == 0:
        raise ModelError(
            f"{what} {bare}",
            found=f"nodes {some_ids(mesh.node_ids[rows])}",
            do="select nodes of the structure",
        )
    if len(attached) > MAX_FOOTPRINT:
        raise ModelError(
            f"{what} has too large a footprint",
            found=f"{len(attached)} nodes",
            expected=f"up to {MAX_FOOTPRINT}",
            do="select fewer nodes, spread over the same area",
        )
    return attached


def spring_nodes(spring: Spring, mesh: Mesh) -> tuple[Array, Array | None]:
    """Node rows at the two ends; the second is None for a spring to ground."""
    what = f"spring '{spring.name}'"
    first = spring.where.rows(mesh, what)
    if spring.other is None:
        return first, None
    second = spring.other.rows(mesh, what)
    if len(first) != 1 or len(second) != 1:
        raise ModelError(
            f"{what} between two places needs one node at each end",
            found=f"{len(first)} and {len(second)} nodes",
            do="select single nodes (near, or one id)",
        )
    if first[0] == second[0]:
        raise ModelError(f"{what} has both ends at node {mesh.node_ids[first[0]]}", do="select two different nodes")
    return first, second


def turns(spring: Spring) -> bool:
    """Whether the spring resists rotations."""
    return spring.axis is None and bool(spring.stiffness[3:].any())


def _check_stiffness(spring: Spring) -> None:
    values = np.append(spring.stiffness, spring.axial)
    if not (np.isfinite(values).all() and (values >= 0).all()):
        raise ModelError(
            f"spring '{spring.name}' has a stiffness that is negative or not a number",
            found=f"{values.min():g}",
            expected="values ≥ 0 in N/m (N·m/rad about axes)",
        )
    if not (spring.axial if spring.axis is not None else spring.stiffness.any()):
        raise ModelError(
            f"spring '{spring.name}' has no stiffness",
            do="give six values in 'stiffness', or 'axis' together with 'axial'",
        )


def spring_attachment(spring: Spring, design: Design, dof: Array) -> tuple[Attachment, str]:
    """The spring and a caution ("" when there is none). ``dof`` (n_nodes, 6), −1 where absent."""
    _check_stiffness(spring)
    mesh = design.mesh
    first, second = spring_nodes(spring, mesh)
    if spring.axis is not None:
        used, pick, values = np.arange(3), spring.axis[None, :], np.array([spring.axial])
    else:
        used = np.nonzero(spring.stiffness)[0]
        pick, values = np.eye(len(used)), spring.stiffness[used]
    ends = first if second is None else np.concatenate([first, second])
    dofs = dof[np.ix_(ends, used)]
    if (dofs < 0).any():
        lacking = ends[(dofs < 0).any(axis=1)]
        raise ModelError(
            f"spring '{spring.name}' resists rotations of nodes that have none",
            found=f"nodes {some_ids(mesh.node_ids[lacking])}, on solids only",
            do="use translational springs at several nodes instead",
        )
    if second is None:
        operator = sp.csr_array(sp.kron(sp.eye_array(len(first)), pick))
        core = sp.diags_array(np.tile(values, len(first)))
        return Attachment(spring.name, dofs.ravel(), operator, core), ""
    operator = sp.csr_array(np.hstack([-pick, pick]))
    return Attachment(spring.name, dofs.ravel(), operator, sp.diags_array(values)), _leverage(spring, mesh, ends)


def _leverage(spring: Spring, mesh: Mesh, ends: Array) -> str:
    """A spring that acts across the line between its ends answers a rigid rotation with a force: say so."""
    gap = mesh.points[ends[1]] - mesh.points[ends[0]]
    length = float(np.linalg.norm(gap))
    if length <= 1e-6 * mesh.diagonal:
        return ""
    push = np.diag(spring.stiffness[:3]) if spring.axis is None else spring.axial * np.outer(spring.axis, spring.axis)
    turning = np.linalg.norm(push - push @ np.outer(gap, gap) / length**2)
    if turning <= 1e-6 * max(float(np.linalg.norm(push)), 1e-300):
        return ""
    return (
        f"spring '{spring.name}' acts across the line between its ends, which are {length:.3g} m apart: "
        "it resists rigid rotation; give it an axis along the line, or ends in one place"
    )


def mass_attachment(mass: LumpedMass, design: Design, dof: Array) -> tuple[Attachment, str]:
    """The rigid body as carried by its footprint, and a caution ("" when there is none)."""
    mesh, what = design.mesh, f"lumped mass '{mass.name}'"
    inertia = mass.inertia
    if not (np.isfinite(mass.mass) and mass.mass >= 0):
        raise ModelError(f"{what} has a mass that is negative or not a number", found=f"{mass.mass:g} kg")
    symmetric = np.allclose(inertia, inertia.T, rtol=1e-9)
    if not (symmetric and np.linalg.eigvalsh(inertia).min() >= -1e-9 * np.abs(inertia).max()):
        raise ModelError(
            f"{what} has an impossible inertia",
            found=f"{inertia.tolist()} kg·m²",
            expected="a symmetric matrix without negative principal moments",
        )
    attached = footprint(
        mass.where, what, mesh, dof, "sits on nodes that belong to no cell with a material and to no spring"
    )
    patch = RigidPatch(mesh.points[attached], mass.position)
    rotating = bool((dof[attached] >= 0).all())
    if patch.rank < 6 and rotating:
        operator, dofs = patch.operator_with_rotations, dof[attached]
    else:
        operator, dofs = patch.operator, dof[attached, :3]
    core = np.zeros((6, 6))
    core[:3, :3] = mass.mass * np.eye(3)
    core[3:, 3:] = inertia
    offset = np.linalg.norm(patch.position - patch.points.mean(axis=0)) > 1e-9 * mesh.diagonal
    caution = ""
    if patch.rank < 6 and not rotating and (offset or inertia.any()):
        caution = f"{what}: {patch.unseen}; that part of its inertia does not take part"
    return Attachment(mass.name, dofs.ravel(), sp.csr_array(operator), core), caution


def held_dofs(supports: tuple[Support, ...], design: Design, dof: Array, n_dof: int) -> Array:
    """(n_dof,) which degrees of freedom the supports hold."""
    held = np.zeros(n_dof, bool)
    for support in supports:
        what = f"support '{support.name}'"
        unknown = [word for word in support.held if word not in DIRECTIONS]
        if unknown:
            raise ModelError(
                f"{what} holds unknown directions", found=", ".join(unknown), expected=" ".join(DIRECTIONS)
            )
        rows = support.where.rows(design.mesh, what)
        found = dof[np.ix_(rows, np.array([DIRECTIONS.index(word) for word in support.held]))]
        if not (found >= 0).any():
            raise ModelError(
                f"{what} holds nothing: its nodes have none of the directions {' '.join(support.held)}",
                found=f"nodes {some_ids(design.mesh.node_ids[rows])}",
                do="select nodes of cells with a material; nodes of solids have no rotations",
            )
        held[found[found >= 0]] = True
    return held
