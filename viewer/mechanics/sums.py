"""Quadratic forms by cell: energies of many vectors from the element matrices of assembly, or the strains they are
made of, in one pass over the cells."""

from __future__ import annotations

import numpy as np

from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import ElementGroup, Layout
from viewer.mechanics.solid import SolidFormulation
from viewer.model.arrays import Array

_CHUNK = 2**17  # entries of element matrices at a time, 1 MB: they are used once, while the cache holds them


def cell_energies(layout: Layout, vectors: Array, what: str, progress: Progress = SILENT) -> Array:
    """(k, n_cells) ½ vᴴ A_e v of the vectors (k, n_dof), real or complex, by cell row; A_e the element "stiffness"
    or "mass". Cells that belong to no group are 0. Springs and lumped masses are not included."""
    return _forms(layout, vectors, (what,), progress)[0]


def strain_and_kinetic(layout: Layout, vectors: Array, progress: Progress = SILENT) -> tuple[Array, Array]:
    """``cell_energies`` of stiffness and of mass, in one pass over the cells; the latter at 1 rad/s."""
    strain, kinetic = _forms(layout, vectors, ("stiffness", "mass"), progress)
    return strain, kinetic


def _forms(layout: Layout, vectors: Array, names: tuple[str, ...], progress: Progress) -> list[Array]:
    columns = real_parts(vectors).reshape(-1, layout.n_dof).T
    triples = np.ascontiguousarray(columns).reshape(layout.n_dof // 3, -1)  # a node's values lie together
    out = [np.zeros((layout.design.mesh.n_cells, len(vectors))) for _ in names]
    done, total = 0, sum(len(group) for group in layout.blocks)
    for group in layout.blocks:
        for part in group.chunks(_CHUNK):
            progress.tick("energies", done, total)
            moved = triples[group.dofs[part, ::3] // 3]
            for form, name in zip(out, names, strict=True):
                each = _halves(layout, group, part, moved, name)
                form[group.cells[part]] = each.reshape(len(each), -1, len(vectors)).sum(axis=1)
            done += part.stop - part.start
    return [form.T for form in out]


def _halves(layout: Layout, group: ElementGroup, part: slice, moved: Array, name: str) -> Array:
    """(c, …) ½ vᵀ A_e v for the nodal values ``moved`` (c, triples, columns)."""
    formulation = group.formulation
    if name == "stiffness" and isinstance(formulation, SolidFormulation) and not formulation.incompatible:
        xyz = layout.points[group.nodes[part]]
        return formulation.strain_energy(xyz, group.prop, moved.reshape(len(xyz), 3 * xyz.shape[1], -1))
    matrices = getattr(group, name)(layout.points, part)
    moved = moved.reshape(*matrices.shape[:2], -1)  # scalar mass: the 3 directions join the columns
    return 0.5 * np.einsum("enk,enk->ek", moved, matrices @ moved)


def real_parts(vectors: Array) -> Array:
    """(p, …) the vectors as real ones whose energies add up: p = 1, or 2 (real, imaginary) for complex ones."""
    return np.stack([vectors.real, vectors.imag]) if np.iscomplexobj(vectors) else np.asarray(vectors)[None]


def cell_volumes(layout: Layout) -> Array:
    """(n_cells,) m³ of the cells that carry stiffness, 0 for the others."""
    out = np.zeros(layout.design.mesh.n_cells)
    for group in layout.blocks:
        out[group.cells] = group.volumes(layout.points)
    return out
