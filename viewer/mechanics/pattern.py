"""The sparsity that stiffness and mass share, and the sum of element matrices into it."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import scipy.sparse as sp

from viewer.errors import ModelError
from viewer.jobs import Progress
from viewer.model.arrays import Array

if TYPE_CHECKING:
    from viewer.mechanics.assembly import ElementGroup, Layout

_SLAB = 2**25  # entries gathered before they are added to the matrix, 256 MB


def joined_triples(layout: Layout) -> sp.csr_array:
    """(triples, triples) bool: True where an element joins the two, and on the diagonal."""
    size = layout.n_dof // 3
    triples = [group.dofs[:, ::3] // 3 for group in layout.blocks]
    columns = np.concatenate([t.ravel() for t in triples] + [np.arange(size)])
    lengths = np.concatenate([np.full(len(t), t.shape[1]) for t in triples] + [np.ones(size, np.int64)])
    ends = np.append(0, np.cumsum(lengths)).astype(np.int32)
    membership = sp.csr_array(
        (np.ones(len(columns), bool), columns.astype(np.int32), ends), shape=(len(lengths), size)
    )
    return sp.csr_array(membership.T @ membership)


class Pattern:
    """The sparsity of triples that share an element, and where each entry of an element matrix goes.

    Row a of the block (i, j) of an element matrix holds three values that stay neighbours in the CSR data; their
    place, counted in threes, is 3·start(i) + a·length(i) + rank of j in row i.
    """

    def __init__(self, layout: Layout) -> None:
        self.size = layout.n_dof // 3
        graph = joined_triples(layout)
        graph.sort_indices()
        if 9 * graph.nnz >= 2**31:
            raise ModelError(
                "the model is too large for the solver",
                found=f"{9 * graph.nnz:.2g} matrix entries",
                expected="below 2.1e9",
                do="use a coarser mesh",
            )
        self.start, self.columns = graph.indptr, graph.indices
        self.length = np.diff(graph.indptr)
        rank = np.arange(graph.nnz, dtype=np.int32) - np.repeat(self.start[:-1], self.length)
        self._rank = sp.csr_array((rank, graph.indices, graph.indptr), shape=graph.shape)
        self._rank.has_canonical_format = True

    def matrix(self, layout: Layout, what: str, progress: Progress) -> sp.csr_array:
        """The sum of the element matrices ``what`` ("stiffness" or "mass") of all groups."""
        scalar = what == "mass" and all(group.formulation.scalar_mass for group in layout.blocks)
        data = np.zeros((self.columns.size * (1 if scalar else 3), 1 if scalar else 3))
        done, total = 0, sum(len(group) for group in layout.blocks)
        for group in layout.blocks:
            compute = getattr(group, what)
            for slab in group.chunks(_SLAB):
                entries = []
                for part in group.chunks():
                    part = slice(slab.start + part.start, min(slab.start + part.stop, slab.stop))
                    if part.start >= slab.stop:
                        break
                    progress.tick(what, done, total)
                    entries.append(compute(layout.points, part))
                    done += part.stop - part.start
                self._add(data, group, slab, np.concatenate(entries), scalar)
        return self._scalar(data.ravel()) if scalar else self._full(data.ravel())

    def _add(self, data: Array, group: ElementGroup, slab: slice, entries: Array, scalar: bool) -> None:
        triples = (group.dofs[slab, ::3] // 3).astype(np.int32)
        count = triples.shape[1]
        rows, columns = np.repeat(triples, count, axis=1), np.tile(triples, (1, count))
        rank = np.asarray(self._rank[rows.ravel(), columns.ravel()]).reshape(-1, count, count)
        start, length = self.start[triples], self.length[triples]
        if scalar:
            place = start[:, :, None] + rank
        else:
            if entries.shape[1] == count:  # a scalar mass among full ones
                entries = np.einsum("eij,ab->eiajb", entries, np.eye(3))
            first = 3 * start[:, :, None] + np.arange(3) * length[:, :, None]  # (e, i, a)
            place = first[..., None] + rank[:, :, None, :]
        gather = sp.csc_array(
            (np.ones(place.size), place.ravel().astype(np.int32), np.arange(place.size + 1, dtype=np.int32)),
            shape=(len(data), place.size),
        )
        data += gather @ entries.reshape(-1, data.shape[1])

    def _rows(self) -> tuple[Array, Array, Array]:
        """Of the blocks of every scalar row: their place in the pattern, the row's direction, and the row ends."""
        lengths = np.repeat(self.length, 3)
        ends = np.append(0, np.cumsum(lengths))
        source = np.repeat(np.repeat(self.start[:-1], 3) - ends[:-1], lengths) + np.arange(ends[-1])
        return source, np.repeat(np.tile(np.arange(3), self.size), lengths), ends

    def _full(self, data: Array) -> sp.csr_array:
        source, _, ends = self._rows()
        return _canonical(data, (3 * self.columns[source][:, None] + np.arange(3)).ravel(), 3 * ends, 3 * self.size)

    def _scalar(self, data: Array) -> sp.csr_array:
        """The scalar matrix times the 3 × 3 unit matrix."""
        source, direction, ends = self._rows()
        return _canonical(data[source], 3 * self.columns[source] + direction, ends, 3 * self.size)


def _canonical(data: Array, indices: Array, indptr: Array, size: int) -> sp.csr_array:
    matrix = sp.csr_array((data, indices.astype(np.int32), indptr.astype(np.int32)), shape=(size, size))
    matrix.has_canonical_format = True
    return matrix
