"""Quadratic forms by cell: energies of many vectors from element matrices that are computed once."""

from __future__ import annotations

import numpy as np

from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import Layout
from viewer.model.arrays import Array


def cell_energies(layout: Layout, vectors: Array, what: str, progress: Progress = SILENT) -> Array:
    """(k, n_cells) ½ vᴴ A_e v of the vectors (k, n_dof), real or complex, by cell row; A_e the element "stiffness"
    or "mass". Cells that belong to no group are 0. Springs and lumped masses are not included."""
    parts = real_parts(vectors)
    columns = np.ascontiguousarray(parts.reshape(-1, layout.n_dof).T)  # (n_dof, p·k): a cell's values lie together
    out = np.zeros((layout.design.mesh.n_cells, len(vectors)))
    done, total = 0, sum(len(group) for group in layout.blocks)
    for group in layout.blocks:
        for part in group.chunks():
            progress.tick(f"energies: {what}", done, total)
            matrices = getattr(group, what)(layout.points, part)
            moved = columns[group.dofs[part]]
            moved = moved.reshape(len(moved), matrices.shape[1], -1)  # scalar mass: the 3 directions join the columns
            halves = 0.5 * np.einsum("enk,enk->ek", moved, matrices @ moved)
            out[group.cells[part]] = halves.reshape(len(halves), -1, len(vectors)).sum(axis=1)
            done += part.stop - part.start
    return out.T


def real_parts(vectors: Array) -> Array:
    """(p, …) the vectors as real ones whose energies add up: p = 1, or 2 (real, imaginary) for complex ones."""
    return np.stack([vectors.real, vectors.imag]) if np.iscomplexobj(vectors) else np.asarray(vectors)[None]


def cell_volumes(layout: Layout) -> Array:
    """(n_cells,) m³ of the cells that carry stiffness, 0 for the others."""
    out = np.zeros(layout.design.mesh.n_cells)
    for group in layout.blocks:
        out[group.cells] = group.volumes(layout.points)
    return out
