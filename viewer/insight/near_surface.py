"""The place of a mesh's outside nearest to points, fast and for thousands of points at a time.

The triangles and segments of the skin are found through a tree of places strewn over them, and then met exactly. For
the element a point lies in, see ``viewer.cells.locate``.
"""

from __future__ import annotations

import numpy as np
from scipy.spatial import cKDTree

from viewer.model.arrays import Array
from viewer.model.mesh import Mesh

COARSE, FINE = 2_000, 20_000  # places strewn over the outside
_TRIED = 4  # places asked for their triangle


class NearSurface:
    """The outside of ``mesh``: closest places, directions away from it, normals. Lengths in m."""

    def __init__(self, mesh: Mesh) -> None:
        skin = mesh.skin
        edges = skin.edges[:, [0, 1, 1]]  # a segment is a triangle without width
        self.corners: Array = (
            mesh.points[np.concatenate([skin.faces, edges])] if len(skin.faces) else mesh.points[edges]
        )
        sides = self.corners[:, 1:] - self.corners[:, :1]
        cross = np.cross(sides[:, 0], sides[:, 1])
        doubled = np.linalg.norm(cross, axis=1)
        # lines weigh as if a hundredth of the body wide, so that they are strewn with places too
        length = np.linalg.norm(sides[:, 0], axis=1) * (np.arange(len(cross)) >= len(skin.faces))
        self.weights: Array = doubled / 2 + 0.01 * mesh.diagonal * length
        self.normals: Array = np.divide(cross, doubled[:, None], out=np.zeros_like(cross), where=doubled[:, None] > 0)
        self._trees: dict[bool, tuple[cKDTree, Array]] = {}

    def strewn(self, count: int) -> tuple[Array, Array]:
        """Places (count, 3) evenly over the outside, and the triangle (count,) of each; always the same."""
        along = np.cumsum(self.weights)
        at = (np.arange(count) + 0.5) / count * along[-1]
        triangle = np.minimum(np.searchsorted(along, at), len(along) - 1)
        # two irrational steps fill the triangles evenly: Weyl's sequence, reflected into the triangle
        u, v = (np.arange(count) * 0.754877666 % 1, np.arange(count) * 0.569840296 % 1)
        folded = u + v > 1
        u, v = np.where(folded, 1 - u, u), np.where(folded, 1 - v, v)
        corners = self.corners[triangle]
        return corners[:, 0] + u[:, None] * (corners[:, 1] - corners[:, 0]) + v[:, None] * (
            corners[:, 2] - corners[:, 0]
        ), triangle

    def closest(self, queries: Array, *, fine: bool = True) -> tuple[Array, Array, Array]:
        """Distance (q,), unit direction (q, 3) from the surface to the query (the normal where it lies on it), and
        triangle (q,) of the nearest place; ``fine`` False: nearly the nearest."""
        tree, owner = self._tree(fine)
        tried = min(_TRIED if fine else 1, len(owner))
        _, found = tree.query(queries, k=tried)
        triangle = owner[np.asarray(found).reshape(len(queries), tried)]
        miss = queries[:, None] - _on_triangles(self.corners[triangle], queries[:, None])
        distance = np.linalg.norm(miss, axis=2)
        rows, best = np.arange(len(queries)), distance.argmin(axis=1)
        triangle, miss, distance = triangle[rows, best], miss[rows, best], distance[rows, best]
        on = distance < 1e-12
        direction = np.where(on[:, None], self.normals[triangle], miss / np.where(on, 1.0, distance)[:, None])
        return distance, direction, triangle

    def _tree(self, fine: bool) -> tuple[cKDTree, Array]:
        if fine not in self._trees:
            places, owner = self.strewn(FINE if fine else COARSE)
            if fine:  # the middle of every triangle too: none is overlooked for being small
                places = np.concatenate([places, self.corners.mean(axis=1)])
                owner = np.concatenate([owner, np.arange(len(self.corners))])
            self._trees[fine] = (cKDTree(places), owner)
        return self._trees[fine]


def _on_triangles(corners: Array, queries: Array) -> Array:
    """The places of triangles (..., 3, 3) nearest to ``queries`` (..., 3): on the plane where the foot lies inside,
    else on the nearest side."""
    a, b, c = corners[..., 0, :], corners[..., 1, :], corners[..., 2, :]
    best, shortest = None, None
    for start, end in ((a, b), (b, c), (c, a)):
        along = end - start
        size = np.maximum(np.sum(along**2, axis=-1), 1e-300)
        place = start + np.clip(np.sum((queries - start) * along, axis=-1) / size, 0, 1)[..., None] * along
        gap = np.sum((queries - place) ** 2, axis=-1)
        if best is None or shortest is None:
            best, shortest = place, gap
        else:
            best = np.where((gap < shortest)[..., None], place, best)
            shortest = np.minimum(gap, shortest)
    u, v, w = b - a, c - a, queries - a
    uu, uv, vv, wu, wv = (np.sum(p * q, axis=-1) for p, q in ((u, u), (u, v), (v, v), (w, u), (w, v)))
    area = uu * vv - uv**2
    flat = area > 1e-12 * uu * vv
    safe = np.where(flat, area, 1.0)
    s, t = (vv * wu - uv * wv) / safe, (uu * wv - uv * wu) / safe
    inside = flat & (s >= 0) & (t >= 0) & (s + t <= 1)
    assert best is not None
    return np.where(inside[..., None], a + s[..., None] * u + t[..., None] * v, best)
