"""The drawable outside of a mesh, as triangles and segments: outer faces of solids, surface cells, line cells."""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from viewer.cells.kinds import KINDS

Array = NDArray[Any]


@dataclass(frozen=True, eq=False)
class Skin:
    """Triangles and segments over node rows; a cell row counts through all blocks in order.

    faces      (t, 3) triangles, outward on solids, using the mid-side nodes of quadratic cells
    cell       (t,) cell row each triangle belongs to
    face       (t,) number of the cell face each triangle was cut from, 0 … n_faces − 1
    outline    (m, 2) the sides of those faces, once each: the mesh lines to draw (mid-side nodes kept)
    edges      (s, 2) segments of line cells
    edge_cell  (s,) cell row of each segment
    """

    faces: Array
    cell: Array
    face: Array
    outline: Array
    edges: Array
    edge_cell: Array

    @cached_property
    def nodes(self) -> Array:
        """(s,) ascending rows of the nodes that triangles and segments use."""
        used = np.zeros(1 + max(self.faces.max(initial=-1), self.edges.max(initial=-1)), bool)
        used[self.faces.ravel()] = True
        used[self.edges.ravel()] = True
        return np.flatnonzero(used)

    @property
    def n_faces(self) -> int:
        """Number of cell faces in the skin (a quadrilateral counts once)."""
        return int(self.face.max()) + 1 if len(self.face) else 0


def skin(blocks: Sequence[tuple[str, Array]]) -> Skin:
    """The skin of blocks ``(kind, nodes (n, nodes per cell))``.

    A face of a solid is exterior when no other solid cell has the same corner nodes, whatever its kind or degree.
    """
    starts = np.cumsum([0, *(len(nodes) for _, nodes in blocks)])
    surfaces = outer_faces(blocks)
    segments, segment_cells = [np.empty((0, 2), np.int64)], [np.empty(0, np.int64)]
    for (kind, nodes), start in zip(blocks, starts[:-1], strict=True):
        cell, rows = KINDS[kind], np.arange(start, start + len(nodes))
        if cell.dim == 1:
            pieces = [(0, 1)] if cell.n_nodes == 2 else [(0, 2), (2, 1)]
            segments += [nodes[:, list(p)] for p in pieces]
            segment_cells += [rows] * len(pieces)

    triangles, cells, faces = [np.empty((0, 3), np.int64)], [np.empty(0, np.int64)], [np.empty(0, np.int64)]
    sides, count = [np.empty((0, 2), np.int64)], 0
    for kind, nodes, rows in surfaces:
        split = np.array(KINDS[kind].triangles)
        triangles.append(nodes[:, split].reshape(-1, 3))
        cells.append(np.repeat(rows, len(split)))
        faces.append(np.repeat(np.arange(count, count + len(rows)), len(split)))
        count += len(rows)
        for a, b, *mid in KINDS[kind].edges:
            chain = (a, *mid, b)
            sides += [nodes[:, list(pair)] for pair in itertools.pairwise(chain)]
    return Skin(
        np.concatenate(triangles),
        np.concatenate(cells),
        np.concatenate(faces),
        _once(np.concatenate(sides)),
        np.concatenate(segments),
        np.concatenate(segment_cells),
    )


def outer_faces(blocks: Sequence[tuple[str, Array]]) -> list[tuple[str, Array, Array]]:
    """Surface cells and the exterior faces of solids of blocks as in :func:`skin`, grouped: (kind, nodes (n, nodes
    per face), cell rows (n,))."""
    starts = np.cumsum([0, *(len(nodes) for _, nodes in blocks)])
    surfaces = [
        (kind, np.asarray(nodes), np.arange(start, start + len(nodes)))
        for (kind, nodes), start in zip(blocks, starts[:-1], strict=True)
        if KINDS[kind].dim == 2
    ]
    return surfaces + _exterior(blocks, starts)


def _exterior(blocks: Sequence[tuple[str, Array]], starts: Array) -> list[tuple[str, Array, Array]]:
    """Exterior faces of the solid blocks, grouped: (face kind, nodes, cell rows)."""
    slots: dict[int, list[tuple[int, int]]] = {3: [], 4: []}  # corners → (block, face)
    for number, (kind, _) in enumerate(blocks):
        for index, (face_kind, _) in enumerate(KINDS[kind].faces):
            slots[KINDS[face_kind].n_corners].append((number, index))
    found = []
    for n_corners, group in slots.items():
        if not group:
            continue
        corners = np.concatenate(
            [blocks[b][1][:, list(KINDS[blocks[b][0]].faces[f][1][:n_corners])] for b, f in group]
        )
        single = _single(corners)
        end = 0
        for b, f in group:
            kind, nodes = blocks[b]
            begin, end = end, end + len(nodes)
            rows = np.nonzero(single[begin:end])[0]
            face_kind, local = KINDS[kind].faces[f]
            found.append((face_kind, nodes[rows][:, list(local)], starts[b] + rows))
    return found


def _single(corners: Array) -> Array:
    """(m,) True where no other row of ``corners`` (m, 3 or 4) has the same set of nodes."""
    if len(corners) == 0:
        return np.zeros(0, bool)
    size = np.int64(corners.max()) + 1
    corners = np.sort(corners, axis=1)
    first = corners[:, 0] * size + corners[:, 1]
    second = corners[:, 2] if corners.shape[1] == 3 else corners[:, 2] * size + corners[:, 3]
    order = np.lexsort((second, first))
    first, second = first[order], second[order]
    same = np.zeros(len(order) + 1, bool)
    same[1:-1] = (first[1:] == first[:-1]) & (second[1:] == second[:-1])
    single = np.empty(len(order), bool)
    single[order] = ~(same[1:] | same[:-1])
    return single


def _once(pairs: Array) -> Array:
    """Undirected pairs (m, 2), each once, ascending."""
    if len(pairs) == 0:
        return pairs
    size = np.int64(pairs.max()) + 1
    key = np.sort(pairs.min(axis=1) * size + pairs.max(axis=1))  # far faster than np.unique on millions
    key = key[np.diff(key, prepend=-1) > 0]
    return np.stack([key // size, key % size], axis=1)
