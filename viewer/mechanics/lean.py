"""Stiffness and mass of large models in the room they need at least: every pair of triples once, by direction.

An entry of a symmetric matrix stands twice in it, and the nine entries of a 3 × 3 block share their place. Here the
blocks above the diagonal are nine sparse matrices of triples by triples that share one pattern (one for a scalar
mass), those on the diagonal plain arrays: about 1.1 GB for stiffness and mass of a million hexahedra of 8 nodes,
where a sparse matrix of either over all directions takes 3 GB. Rows cannot be picked out of them and nothing can
factorise them; they multiply.
"""

from __future__ import annotations

import numpy as np
import scipy.sparse as sp

from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import Layout
from viewer.mechanics.constraints import Attachment
from viewer.mechanics.pattern import joined_triples
from viewer.model.arrays import Array

_CHUNK = 2**19  # entries of element matrices at a time, 4 MB
_PAIR_BYTES = 80  # nine entries of stiffness, one of mass


def room(layout: Layout) -> int:
    """Bytes that :class:`LeanMatrices` takes, roughly: in solids a pair of nodes belongs to two cells on average."""
    pairs = sum(len(group) * (group.dofs.shape[1] // 3) ** 2 / 2 for group in layout.blocks)
    scalar = all(group.formulation.scalar_mass for group in layout.blocks)
    return int(pairs / 2 * _PAIR_BYTES * (1.0 if scalar else 1.8))


class LeanMatrices:
    """K and M of a layout over all its directions, springs and lumped masses included, for products only."""

    def __init__(self, layout: Layout, progress: Progress = SILENT) -> None:
        progress.tick("pattern of the matrices")
        graph = sp.triu(joined_triples(layout), 1, format="csr")
        graph.sort_indices()
        self._ends, self._others, self.n_pairs = graph.indptr, graph.indices, graph.nnz
        place = sp.csr_array((np.arange(graph.nnz, dtype=np.int32), graph.indices, graph.indptr), graph.shape)
        place.has_canonical_format = True
        del graph
        self._stiffness = _summed(layout, place, "stiffness", 9, progress)
        scalar = all(group.formulation.scalar_mass for group in layout.blocks)
        self._mass = _summed(layout, place, "mass", 1 if scalar else 9, progress)

    def stiffness(self, columns: Array) -> Array:
        """K x of real columns (n_dof, k)."""
        return self._stiffness.add(columns, np.zeros(columns.shape))

    def mass(self, columns: Array) -> Array:
        """M x of real columns (n_dof, k)."""
        return self._mass.add(columns, np.zeros(columns.shape))

    def shifted(self, columns: Array, alpha: float) -> Array:
        """(K + αM) x of real columns (n_dof, k)."""
        return self._stiffness.add(columns, self._mass.add(columns, np.zeros(columns.shape), alpha))

    def onto(self, basis: sp.csr_array) -> tuple[sp.csr_array, sp.csr_array]:
        """BᵀKB and BᵀMB of a sparse basis (n_dof, c)."""
        return self._stiffness.onto(basis), self._mass.onto(basis)

    def blocks(self) -> tuple[Array, Array]:
        """(n_dof / 3, 3, 3) the blocks on the diagonal of K and of M."""
        return self._stiffness.blocks(), self._mass.blocks()

    def parts(self, label: Array) -> Array:
        """Labels (n_dof / 3,) from 0 for the connected parts of sets of triples of one ``label``."""
        rows = np.repeat(np.arange(len(label), dtype=np.int32), np.diff(self._ends))
        kept = label[rows] == label[self._others]
        count = np.append(0, np.cumsum(np.bincount(rows[kept], minlength=len(label)))).astype(np.int32)
        del rows
        # real numbers: SciPy would copy any other kind
        graph = sp.csr_array((np.ones(int(count[-1])), self._others[kept], count), shape=(len(label),) * 2)
        return sp.csgraph.connected_components(graph, directed=False)[1]


def _summed(layout: Layout, place: sp.csr_array, what: str, count: int, progress: Progress) -> _Half:
    upper, diagonal = np.zeros((count, place.nnz)), np.zeros((count, place.shape[0]))
    done, total = 0, sum(len(group) for group in layout.blocks)
    for group in layout.blocks:
        for part in group.chunks(_CHUNK):
            progress.tick(what, done, total)
            _add(upper, diagonal, place, group.dofs[part, ::3] // 3, getattr(group, what)(layout.points, part))
            done += part.stop - part.start
    return _Half(place, upper, diagonal, layout.springs if what == "stiffness" else layout.masses)


def _add(upper: Array, diagonal: Array, place: sp.csr_array, triples: Array, matrices: Array) -> None:
    cells, nodes = triples.shape
    if len(upper) == 9 and matrices.shape[1] == nodes:  # a scalar mass among full ones
        matrices = np.einsum("eij,ab->eiajb", matrices, np.eye(3))
    size = 3 if len(upper) == 9 else 1
    blocks = matrices.reshape(cells, nodes, size, nodes, size).transpose(2, 4, 0, 1, 3)
    blocks = blocks.reshape(len(upper), cells, nodes, nodes)
    rows, columns = np.broadcast_arrays(triples[:, :, None], triples[:, None, :])
    same, above = rows == columns, rows < columns  # a collapsed cell names a node twice
    where, middle = np.asarray(place[rows[above], columns[above]]).astype(np.intp), rows[same].astype(np.intp)
    for values, whole, block in zip(upper, diagonal, blocks, strict=True):
        np.add.at(values, where, block[above])
        np.add.at(whole, middle, block[same])


class _Half:
    """One symmetric matrix: blocks above the diagonal by direction, blocks on it, and what is attached to it."""

    def __init__(self, place: sp.csr_array, upper: Array, diagonal: Array, attached: tuple[Attachment, ...]) -> None:
        pattern = place.indices, place.indptr
        each = [sp.csr_array((values, *pattern), shape=place.shape, copy=False) for values in upper]
        #: by row and column direction, None where the matrix is zero
        self._upper = [[each[3 * a + b] if len(each) == 9 else None for b in range(3)] for a in range(3)]
        self._middle = [[diagonal[3 * a + b] if len(each) == 9 else None for b in range(3)] for a in range(3)]
        if len(each) == 1:
            for a in range(3):
                self._upper[a][a], self._middle[a][a] = each[0], diagonal[0]
        size = 3 * place.shape[0]
        self._attached = sp.csr_array((size, size))
        for item in attached:
            piece = item.matrix()
            ends = item.dofs[piece.row], item.dofs[piece.col]
            self._attached += sp.coo_array((piece.data, ends), shape=(size, size)).tocsr()

    def add(self, columns: Array, out: Array, factor: float = 1.0) -> Array:
        """``out`` with factor · A x added, of columns x (n, k)."""
        out += factor * (self._attached @ columns)
        for b in range(3):
            given = factor * columns[b::3]
            for a in range(3):
                above, below, middle = self._upper[a][b], self._upper[b][a], self._middle[a][b]
                if above is not None and below is not None and middle is not None:
                    out[a::3] += above @ given
                    out[a::3] += below.T @ given
                    out[a::3] += middle[:, None] * given
        return out

    def onto(self, basis: sp.csr_array) -> sp.csr_array:
        given = [sp.csr_array(basis[a::3]) for a in range(3)]
        total, middle = sp.csr_array((basis.shape[1],) * 2), basis.T @ (self._attached @ basis)
        for a in range(3):
            for b in range(3):
                if self._upper[a][b] is not None:
                    total += given[a].T @ (self._upper[a][b] @ given[b])
                    middle += given[a].T @ (sp.diags_array(self._middle[a][b]) @ given[b])
        return sp.csr_array(total + total.T + 0.5 * (middle + middle.T))

    def blocks(self) -> Array:
        out = np.zeros((self._attached.shape[0] // 3, 3, 3))
        for a in range(3):
            for b in range(3):
                if self._middle[a][b] is not None:
                    out[:, a, b] = self._middle[a][b]
        extra = self._attached.tocoo()
        inside = extra.row // 3 == extra.col // 3
        np.add.at(out, (extra.row[inside] // 3, extra.row[inside] % 3, extra.col[inside] % 3), extra.data[inside])
        return out
