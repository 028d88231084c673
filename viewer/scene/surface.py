"""The drawn surface of a mesh: skin triangles, split at creases for shading, with edge adjacency made once.

Everything runs over *skin nodes*: the ascending mesh rows that some drawn triangle or line uses. A *vertex* is a
skin node within one smooth patch: a node on a crease has one vertex for each side, so that neither light nor
colour bleeds over the crease.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from scipy.sparse import csr_matrix
from scipy.sparse.csgraph import connected_components

from viewer.cells import KINDS, Skin
from viewer.model.arrays import Array
from viewer.model.mesh import Mesh
from viewer.scene.tokens import CREASE_DEGREES


@dataclass(frozen=True, eq=False)
class Edges:
    """Edges between skin triangles.

    nodes    (e, 2) skin nodes
    faces    (e, 2) the two triangles; the second is −1 at a boundary
    feature  (e,) bool: always drawn (boundary, crease, or three and more triangles meeting)
    """

    nodes: Array
    faces: Array
    feature: Array


@dataclass(frozen=True, eq=False)
class Surface:
    """What is drawn of one mesh. Float arrays at a phase are (skin nodes, 3).

    nodes      (s,) mesh rows of the skin nodes, ascending
    triangles  (t, 3) vertices, consistently wound where the surface allows
    vertex     (v,) skin node of each vertex
    cells      (t,) cell row of each triangle
    areas      (t,) m², undeformed
    outline    (m, 2) skin nodes: the mesh lines of the drawn cell faces
    between    for mid-side, then for mid-face vertices of quadratic faces: (h, 2) such a vertex and one of those,
               corners or mid-side, half-way between which it lies
    lines      (l, 2) skin nodes of line cells; ``line_cells`` (l,) their cell rows
    """

    nodes: Array
    triangles: Array
    vertex: Array
    cells: Array
    areas: Array
    edges: Edges
    outline: Array
    between: tuple[Array, ...]
    lines: Array
    line_cells: Array

    @property
    def n_vertices(self) -> int:
        return len(self.vertex)

    @cached_property
    def node_triangles(self) -> Array:
        """(t, 3) skin nodes of the triangles."""
        return self.vertex[self.triangles]

    @cached_property
    def _spread(self) -> csr_matrix:
        """(v, t) float32 ones: a sum over each vertex's triangles."""
        t = len(self.triangles)
        columns = np.repeat(np.arange(t, dtype=np.int32), 3)
        ones = np.ones(3 * t, np.float32)
        return csr_matrix((ones, (self.triangles.ravel(), columns)), shape=(self.n_vertices, t))

    def face_normals(self, points: Array) -> Array:
        """(t, 3) normals of length twice the area at ``points`` (s, 3)."""
        return cross_of(points, self.node_triangles)

    def vertex_normals(self, face_normals: Array) -> Array:
        """(v, 3) unit normals: area-weighted mean over each smooth patch."""
        normals = self._spread @ face_normals
        length = np.sqrt(np.einsum("ij,ij->i", normals, normals))
        length[length == 0] = 1
        normals /= length[:, None]
        return normals

    def vertex_values(self, values: Array) -> Array:
        """(v,) area-weighted mean over each vertex's smooth patch of a value by cell row; unknown counts as 0.

        Mid-side and mid-face vertices take the mean of the corners they lie between: their own would take in fewer
        cells than the corners' and draw a pattern that is the mesh's, not the energy's.
        """
        weight = self.areas + 1e-12 * (self.areas.max(initial=0.0) or 1.0)  # zero-area slivers still carry a value
        value = np.nan_to_num(np.asarray(values, float))[self.cells] * weight
        total = self._spread @ np.stack([value, weight], axis=1)
        mean = total[:, 0] / total[:, 1]
        for finer, coarser in (pairs.T for pairs in self.between):
            count = np.bincount(finer, minlength=len(mean))
            inner = np.bincount(finer, mean[coarser], minlength=len(mean))
            mean = np.where(count > 0, inner / np.maximum(count, 1), mean)
        return mean


def drawn_areas(mesh: Mesh) -> Array:
    """(n_cells,) area in m² that is drawn of each cell, zero inside solids; in a mesh of lines alone, m of length."""
    found = mesh.skin
    if len(found.faces) == 0:
        a, b = mesh.points[found.edges].transpose(1, 0, 2)
        return np.bincount(found.edge_cell, np.linalg.norm(b - a, axis=1), minlength=mesh.n_cells)
    areas = 0.5 * np.linalg.norm(cross_of(mesh.points, found.faces), axis=1)
    return np.bincount(found.cell, areas, minlength=mesh.n_cells)


def surface_of(mesh: Mesh, found: Skin | None = None) -> Surface:
    """The drawn surface of ``mesh``; creases are those of the undeformed shape. ``found``: the part of its skin to
    draw, over rows of its points."""
    rank = np.zeros(mesh.n_nodes, np.int8)
    for block in mesh.blocks:
        kind = KINDS[block.kind]
        rank[block.nodes[:, kind.n_corners :]] = 2
        for _, _, *middle in kind.edges:
            rank[block.nodes[:, middle]] = 1
    return build(mesh.points, mesh.skin if found is None else found, rank)


def build(points: Array, found: Skin, rank: Array) -> Surface:
    """A surface from a skin over the rows of ``points`` (n, 3), m; ``rank`` (n,) is 0 for corner nodes of cells,
    1 for mid-side nodes, 2 for those in the middle of faces."""
    nodes = found.nodes
    compact = np.full(len(points), -1, np.int64)
    compact[nodes] = np.arange(len(nodes))
    tri, lines = compact[found.faces], compact[found.edges]
    real = (tri[:, 0] != tri[:, 1]) & (tri[:, 1] != tri[:, 2]) & (tri[:, 2] != tri[:, 0])
    tri, cells = tri[real], found.cell[real]

    pairs, beside, direction, count = _adjacency(tri, len(nodes))
    two = np.nonzero(count == 2)[0]
    flip = _flips(beside[two], direction[two, 0] == direction[two, 1], len(tri))
    tri[flip] = tri[flip][:, ::-1]

    normals = cross_of(points[nodes], tri)
    length = np.linalg.norm(normals, axis=1)
    feature = count != 2
    a, b = beside[two].T
    turn = np.einsum("ij,ij->i", normals[a], normals[b])
    product = length[a] * length[b]
    feature[two] = (turn < np.cos(np.radians(CREASE_DEGREES)) * product) & (product > 0)
    torn = (direction[two, 0] == direction[two, 1]) ^ flip[a] ^ flip[b]  # one-sided surfaces cannot be wound
    feature[two[torn]] = True

    corners, vertex = _patches(tri, pairs[~feature], beside[~feature])
    edges = Edges(pairs.astype(np.int32), beside.astype(np.int32), feature)
    outline = compact[found.outline].astype(np.int32)
    sides = _among(pairs, outline, len(nodes))
    between = tuple(
        _between(tri, corners, pairs[allowed], beside[allowed], rank[nodes], level)
        for level, allowed in ((1, sides), (2, ~sides))
    )
    return Surface(
        nodes, corners, vertex, cells, 0.5 * length, edges, outline, between, lines.astype(np.int32), found.edge_cell
    )


def cross_of(points: Array, triangles: Array) -> Array:
    """(t, 3) cross products of two sides: normals of length twice the area. Column-wise: fast."""
    x, y, z = np.ascontiguousarray(points.T)
    i, j, k = triangles.T
    ux, uy, uz = x[j] - x[i], y[j] - y[i], z[j] - z[i]
    vx, vy, vz = x[k] - x[i], y[k] - y[i], z[k] - z[i]
    normals = np.empty((len(triangles), 3), points.dtype)
    normals[:, 0] = uy * vz - uz * vy
    normals[:, 1] = uz * vx - ux * vz
    normals[:, 2] = ux * vy - uy * vx
    return normals


def _adjacency(tri: Array, n: int) -> tuple[Array, Array, Array, Array]:
    """Edges (e, 2), their first two triangles (e, 2, −1 if none), whether these run low→high, their number."""
    start, end = tri.ravel(), tri[:, [1, 2, 0]].ravel()
    key = np.minimum(start, end).astype(np.int64) * n + np.maximum(start, end)
    order = np.argsort(key, kind="stable")
    first = np.nonzero(np.diff(key[order], prepend=-1))[0]
    count = np.diff(first, append=len(key))
    low_high = start < end
    beside = np.full((len(first), 2), -1, np.int64)
    direction = np.zeros((len(first), 2), bool)
    for side in (0, 1):
        has = count > side
        half = order[first[has] + side]
        beside[has, side] = half // 3
        direction[has, side] = low_high[half]
    edge_key = key[order[first]] if len(first) else key
    return np.stack([edge_key // n, edge_key % n], axis=1), beside, direction, count


def _among(pairs: Array, others: Array, n: int) -> Array:
    """(e,) bool: which undirected ``pairs`` (e, 2) of n nodes are among ``others`` (m, 2)."""
    if not len(others):
        return np.zeros(len(pairs), bool)
    key = np.sort(others.min(axis=1).astype(np.int64) * n + others.max(axis=1))
    wanted = pairs[:, 0] * n + pairs[:, 1]  # lower node first, as adjacency gives them
    return key[np.minimum(np.searchsorted(key, wanted), len(key) - 1)] == wanted


def _flips(beside: Array, same: Array, n_faces: int) -> Array:
    """(t,) bool: triangles to turn over so that neighbours are wound alike.

    Each triangle has an upright and a turned copy; an edge run in the ``same`` sense by both neighbours joins
    unlike copies. Of the two mirror images of a connected piece, the one that leaves its first triangle is taken.
    """
    if not same.any():
        return np.zeros(n_faces, bool)
    a, b = beside.T
    other = np.where(same, n_faces, 0)
    rows, columns = np.concatenate([a, a + n_faces]), np.concatenate([b + other, b + n_faces - other])
    n = 2 * n_faces
    _, mark = connected_components(csr_matrix((np.ones(len(rows), np.int8), (rows, columns)), (n, n)), directed=False)
    pieces, piece = connected_components(
        csr_matrix((np.ones(len(a), np.int8), (a, b)), (n_faces, n_faces)), directed=False
    )
    first = np.full(pieces, n_faces)
    np.minimum.at(first, piece, np.arange(n_faces))
    return mark[:n_faces] != mark[first[piece]]


def _patches(tri: Array, pairs: Array, beside: Array) -> tuple[Array, Array]:
    """Vertices of corners (t, 3) and skin node of each vertex: corners joined over smooth edges share one."""
    t = len(tri)
    if t == 0:
        return np.empty((0, 3), np.int32), np.empty(0, np.int32)
    joins = []
    for column in (0, 1):
        node = pairs[:, column]
        joins.append([3 * face + _corner(tri[face], node) for face in beside.T])
    rows, columns = (np.concatenate([join[side] for join in joins]) for side in (0, 1))
    graph = csr_matrix((np.ones(len(rows), np.int8), (rows, columns)), (3 * t, 3 * t))
    count, label = connected_components(graph, directed=False)
    node_of = np.empty(count, np.int64)
    node_of[label] = tri.ravel()
    order = np.argsort(node_of, kind="stable")  # vertices ordered by node: memory is read in order
    rank = np.empty(count, np.int64)
    rank[order] = np.arange(count)
    return rank[label].reshape(t, 3).astype(np.int32), node_of[order].astype(np.int32)


def _between(tri: Array, corners: Array, pairs: Array, beside: Array, rank: Array, level: int) -> Array:
    """(h, 2) vertices at the ends of edges that join rank ``level`` to the rank below, on each side of the edge."""
    ranks = rank[pairs]
    joined = (ranks.max(axis=1, initial=0) == level) & (ranks.min(axis=1, initial=level) == level - 1)
    pairs, beside, ranks = pairs[joined], beside[joined], ranks[joined]
    upward = ranks[:, 0] == level
    finer, coarser = np.where(upward, pairs.T, pairs.T[::-1])
    found = []
    for face in beside.T:
        has = face >= 0
        row = face[has]
        found.append([corners[row, _corner(tri[row], node[has])] for node in (finer, coarser)])
    return np.unique(np.concatenate(found, axis=1).T, axis=0)


def _corner(triangles: Array, node: Array) -> Array:
    """(k,) which corner of each triangle (k, 3) is the given node."""
    return np.argmax(triangles == node[:, None], axis=1)
