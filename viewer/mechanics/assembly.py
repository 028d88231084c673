"""Degrees of freedom, element groups, and the stiffness and mass matrices.

Degrees of freedom come in triples: the translations of a node, then its rotations where a shell or beam needs
them. Every element matrix is therefore made of 3 × 3 blocks, the sparsity pattern is that of the triples, and the
place of a block's row in the data of the CSR matrix follows from the pattern alone: stiffness and mass share it.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
import scipy.sparse as sp

from viewer.cells import measures
from viewer.cells.kinds import KINDS
from viewer.errors import ModelError
from viewer.jobs import SILENT, Progress
from viewer.mechanics.cell_parts import cautions_of, check_shapes, element_parts
from viewer.mechanics.constraints import (
    Attachment,
    held_dofs,
    mass_attachment,
    spring_attachment,
    spring_nodes,
    turns,
)
from viewer.mechanics.followers import (
    Rules,
    add_link,
    add_tie,
    check_supports,
    follow_matrix,
    hold_loose_spins,
    link_nodes,
)
from viewer.mechanics.formulations import Formulation
from viewer.mechanics.pattern import Pattern
from viewer.mechanics.sections import constants
from viewer.mechanics.struts import strut_attachments
from viewer.model.arrays import Array, frozen
from viewer.model.design import DIRECTIONS, Design, Property, Strut

_CHUNK = 2**21  # entries of element matrices at a time, 16 MB: kernels stay in reach of the cache


@dataclass(frozen=True, eq=False)
class ElementGroup:
    """Cells of one block that share formulation and property.

    cells (b,) cell rows; nodes (b, n) node rows; dofs (b, nd) degrees of freedom in the order of the
    formulation's matrices.
    """

    formulation: Formulation
    prop: Property
    cells: Array
    nodes: Array
    dofs: Array

    @property
    def kind(self) -> str:
        return self.formulation.kind

    def __len__(self) -> int:
        return len(self.cells)

    def chunks(self, limit: int = _CHUNK) -> Iterator[slice]:
        """Slices of rows whose element matrices have at most ``limit`` entries."""
        size = max(1, limit // self.dofs.shape[1] ** 2)
        for start in range(0, len(self), size):
            yield slice(start, min(start + size, len(self)))

    def volumes(self, points: Array) -> Array:
        """(b,) m³; area times thickness for shells, length times area of the section for beams."""
        size, dim = measures(self.kind, points[self.nodes]), KINDS[self.kind].dim
        if dim == 1 and self.prop.section is not None:
            return size * constants(self.prop.section, self.prop.material.poisson).area
        return size if dim == 3 else size * (self.prop.thickness or 0.0)

    def stiffness(self, points: Array, part: slice) -> Array:
        """(c, nd, nd) of the cells in ``part``."""
        return self.formulation.stiffness(points[self.nodes[part]], self.prop)

    def mass(self, points: Array, part: slice) -> Array:
        """(c, n, n) when the formulation's mass is scalar, else (c, nd, nd)."""
        return self.formulation.mass(points[self.nodes[part]], self.prop)


@dataclass(frozen=True, eq=False)
class Layout:
    """A design ready for matrices.

    dof       (n_nodes, 6) number of ux uy uz rx ry rz, −1 where the node has none
    held      (n_dof,) True where a support holds
    blocks    element groups
    springs, masses   one attachment per entry of the design's physics, in its order; struts come after the springs,
              their masses after the masses
    follow    (n_dof, n_dof) every degree of freedom from the independent ones, None when nothing follows anything
    dependent (n_dof,) True for those that follow others through a link or tie
    cautions  what a reader of the results must know
    statements  what links and ties join, in words
    """

    design: Design
    dof: Array
    n_dof: int
    held: Array
    blocks: tuple[ElementGroup, ...]
    springs: tuple[Attachment, ...]
    masses: tuple[Attachment, ...]
    follow: sp.csr_array | None
    dependent: Array
    cautions: tuple[str, ...]
    statements: tuple[str, ...]

    @cached_property
    def free(self) -> Array:
        """Ascending degrees of freedom that are neither held nor follow others: the unknowns of a solution."""
        return frozen(np.nonzero(~(self.held | self.dependent))[0])

    @cached_property
    def _carrier(self) -> sp.csr_array | None:
        return None if self.follow is None else sp.csr_array(self.follow[:, self.free])

    def restrict(self, matrix: sp.csr_array) -> sp.csr_array:
        """Fᵀ A F on the free degrees of freedom of a symmetric matrix (n_dof, n_dof)."""
        if self._carrier is not None:
            reduced = sp.csr_array(self._carrier.T @ matrix @ self._carrier)
            reduced = sp.csr_array(0.5 * (reduced + reduced.T))
            reduced.sort_indices()
            return reduced
        return matrix if len(self.free) == self.n_dof else sp.csr_array(matrix[self.free][:, self.free])

    def force(self, vectors: Array) -> Array:
        """(k, n_free) forces on the free degrees of freedom from forces (k, n_dof) on all: Fᵀ f."""
        return vectors[:, self.free] if self._carrier is None else (self._carrier.T @ vectors.T).T

    def extend(self, vectors: Array) -> Array:
        """(k, n_dof) from values (k, n_free) of the free ones: 0 where held, followers as they follow."""
        if self._carrier is not None:
            return np.ascontiguousarray((self._carrier @ vectors.T).T)
        full = np.zeros((len(vectors), self.n_dof), vectors.dtype)
        full[:, self.free] = vectors
        return full

    @property
    def points(self) -> Array:
        return self.design.mesh.points

    @property
    def has_rotations(self) -> bool:
        return bool((self.dof[:, 3:] >= 0).any())

    @cached_property
    def _plain(self) -> bool:
        """Whether vectors are the nodes' translations in order, as in most solids: nothing to gather."""
        first = self.dof[:, :3].ravel()
        return len(first) == self.n_dof and np.array_equal(first, np.arange(self.n_dof))

    def gather(self, moved: Array, turned: Array | None = None) -> Array:
        """(…, n_dof) from nodal translations and rotations (…, n_nodes, 3); rotations None: zero."""
        moved = np.asarray(moved)
        if self._plain:
            return moved.reshape(*moved.shape[:-2], self.n_dof).astype(np.result_type(moved, float), copy=False)
        out = np.zeros((*moved.shape[:-2], self.n_dof), np.result_type(moved, float))
        for values, numbers in ((moved, self.dof[:, :3]), (turned, self.dof[:, 3:])):
            if values is not None:
                there = numbers >= 0
                out[..., numbers[there]] = np.asarray(values)[..., there]
        return out

    def spread(self, vectors: Array) -> tuple[Array, Array | None]:
        """Nodal translations and rotations (…, n_nodes, 3) of the vectors (…, n_dof); zero where a node has no
        such degree of freedom, rotations None when no node has any."""
        padded = np.concatenate([vectors, np.zeros((*vectors.shape[:-1], 1), vectors.dtype)], axis=-1)
        turned = padded[..., self.dof[:, 3:]] if self.has_rotations else None
        return padded[..., self.dof[:, :3]], turned


@dataclass(frozen=True, eq=False)
class System(Layout):
    """A layout with its matrices over all degrees of freedom, held ones too: K N/m and M kg (CSR, symmetric)."""

    K: sp.csr_array
    M: sp.csr_array


def lay_out(design: Design, progress: Progress = SILENT, *, formulations: Mapping[str, str] | None = None) -> Layout:
    """Number the degrees of freedom and resolve groups, springs, masses, supports, links and ties.

    formulations  cell kind → name of the formulation to take instead of the design's own
    Raises ``ModelError`` that names the group or cells and what to put into the dossier.
    """
    progress.tick("numbering")
    mesh, physics = design.mesh, design.physics
    parts, cautions = element_parts(design, formulations or {})
    has = np.zeros((mesh.n_nodes, 2), bool)  # translations, rotations
    for formulation, _, _, nodes in parts:
        has[nodes, 0] = True
        if formulation.rotations:
            has[nodes, 1] = True
    cautions += cautions_of(parts, mesh, has[:, 1])
    for spring in physics.springs:
        for rows in spring_nodes(spring, mesh):
            if rows is not None:
                lone = rows[~has[rows, 0]]
                has[lone, 0] = True
                has[lone, 1] = turns(spring)
    turning = has[:, 1].copy()
    for link in physics.links:
        leader, followers = link_nodes(link, design)
        has[leader] = True
        has[followers[~has[followers, 0]]] = True
    number = np.where(has.ravel(), np.cumsum(has.ravel()) - 1, -1).reshape(-1, 2)
    dof = np.where(number[:, :, None] >= 0, 3 * number[:, :, None] + np.arange(3), -1).reshape(-1, 6)
    n_dof = 3 * int(has.sum())
    if n_dof == 0:
        raise ModelError(
            f"design '{design.name}' has no cell with a material and no spring",
            file=mesh.source or None,
            do="assign a material to the cells, for instance to '*'",
        )
    small = dof.astype(np.int32)  # half the room: every cell names all its directions
    blocks = tuple(
        ElementGroup(
            formulation,
            prop,
            frozen(cells),
            frozen(nodes),
            frozen(small[nodes, : 6 if formulation.rotations else 3].reshape(len(nodes), -1)),
        )
        for formulation, prop, cells, nodes in parts
    )
    progress.tick("checking cells")
    check_shapes(parts, mesh)
    springs, masses = [], []
    for spring in physics.springs:
        attachment, caution = spring_attachment(spring, design, dof)
        springs.append(attachment)
        cautions += [caution] if caution else []
    for mass in physics.masses:
        attachment, caution = mass_attachment(mass, design, dof)
        masses.append(attachment)
        cautions += [caution] if caution else []
    for strut in physics.struts:
        link_spring, ends, caution = strut_attachments(strut, design, dof)
        springs.append(link_spring)
        masses += ends
        cautions += [caution] if caution else []
    held = held_dofs(physics.supports, design, dof, n_dof)
    rules = Rules(dof)
    for link in physics.links:
        add_link(rules, link, design)
    for tie in physics.ties:
        progress.tick("tying")
        add_tie(rules, tie, design)
    hold_loose_spins(rules, design, turning)
    follow, dependent = follow_matrix(rules, design, n_dof)
    check_supports(follow, dependent, held, rules, design)
    return Layout(
        design,
        frozen(dof),
        n_dof,
        frozen(held),
        blocks,
        tuple(springs),
        tuple(masses),
        follow,
        frozen(dependent),
        tuple(dict.fromkeys([*cautions, *rules.cautions])),
        tuple(rules.statements),
    )


def assemble(design: Design, progress: Progress = SILENT) -> System:
    """Stiffness and mass of the design, springs and lumped masses included.

    Raises ``ModelError`` when the design lacks something or a free degree of freedom has neither stiffness nor
    mass. Memory: the two matrices and about half a gigabyte.
    """
    return assemble_layout(lay_out(design, progress), progress)


def assemble_layout(layout: Layout, progress: Progress = SILENT) -> System:
    """The matrices of a layout; see :func:`assemble`."""
    pattern = Pattern(layout)
    stiffness = pattern.matrix(layout, "stiffness", progress)
    mass = pattern.matrix(layout, "mass", progress)
    stiffness = _with_attachments(stiffness, layout.springs)
    mass = _with_attachments(mass, layout.masses)
    _check_attached(layout, stiffness, mass)
    fields = {name: getattr(layout, name) for name in Layout.__dataclass_fields__}
    return System(**fields, K=stiffness, M=mass)


def with_strut(system: System, strut: Strut) -> System:
    """The same system, its matrices given ones too, with one strut more. Raises ``ModelError``."""
    spring, ends, _ = strut_attachments(strut, system.design, system.dof)
    return replace(
        system,
        springs=(*system.springs, spring),
        masses=(*system.masses, *ends),
        K=_with_attachments(system.K, (spring,)),
        M=_with_attachments(system.M, tuple(ends)),
    )


def _with_attachments(matrix: sp.csr_array, attachments: tuple[Attachment, ...]) -> sp.csr_array:
    if not attachments:
        return matrix
    pieces = [(item.dofs, item.matrix()) for item in attachments]
    rows = np.concatenate([dofs[piece.row] for dofs, piece in pieces])
    columns = np.concatenate([dofs[piece.col] for dofs, piece in pieces])
    values = np.concatenate([piece.data for _, piece in pieces])
    total = sp.csr_array(matrix + sp.coo_array((values, (rows, columns)), shape=matrix.shape).tocsr())
    total.sort_indices()
    return total


def _check_attached(layout: Layout, stiffness: sp.csr_array, mass: sp.csr_array) -> None:
    """A free direction without stiffness and mass would make the eigen-problem meaningless."""
    idle = (layout.restrict(stiffness).diagonal() == 0) & (layout.restrict(mass).diagonal() == 0)
    if not idle.any():
        return
    node, direction = np.nonzero(np.isin(layout.dof, layout.free[idle]))
    raise ModelError(
        f"design '{layout.design.name}': {int(idle.sum())} free directions have neither stiffness nor mass",
        found=f"{DIRECTIONS[direction[0]]} of node {layout.design.mesh.node_ids[node[0]]}",
        do="hold them in a support, or attach the nodes to cells, springs or masses",
    )
