"""Which edges are drawn as contour: features always, and silhouettes seen from the eye."""

from __future__ import annotations

import numpy as np

from viewer.model.arrays import Array
from viewer.scene.surface import Edges


def silhouettes(edges: Edges, face_normals: Array, toward_eye: Array) -> Array:
    """(e,) bool: edges between a triangle that faces the eye and one that looks away (parallel projection)."""
    front = face_normals @ np.asarray(toward_eye, face_normals.dtype) > 0
    a, b = edges.faces.T
    return (front[a] != front[b]) & (b >= 0)


def drawn(edges: Edges, face_normals: Array, toward_eye: Array) -> Array:
    """(e,) bool: all contour edges at this shape and camera."""
    return edges.feature | silhouettes(edges, face_normals, toward_eye)


def contour(edges: Edges, face_normals: Array, toward_eye: Array) -> Array:
    """(k, 2) skin nodes of all contour edges at this shape and camera."""
    return edges.nodes[drawn(edges, face_normals, toward_eye)]


def median_length(points: Array, pairs: Array) -> float:
    """Median length of the edges ``pairs`` (m, 2) at ``points``, m: mesh lines too dense to read are not drawn."""
    if len(pairs) == 0:
        return 0.0
    return float(np.median(np.linalg.norm(points[pairs[:, 0]] - points[pairs[:, 1]], axis=1)))
