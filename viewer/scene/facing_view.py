"""Which side of a body shows a place: a view, or that of its mirror images from which enough of the place is seen."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from viewer.model.arrays import Array
from viewer.scene.picture import Body, View
from viewer.scene.surface import cross_of
from viewer.scene.view import axes

ENOUGH = 0.6  # of what the best side shows: a view that shows so much is good enough
_MIRRORS = ((1, 1, 1), (1, -1, 1), (-1, 1, 1), (-1, -1, 1), (1, 1, -1), (1, -1, -1), (-1, 1, -1), (-1, -1, -1))
_GRAIN = 160  # cells of the map of depths along the longer side of the body on the screen
_NEAR = 0.01  # of the diagonal: what lies so little behind something else is seen


def facing_view(body: Body, cells: Array, view: View) -> View:
    """The first of ``view`` and its mirror images about the axes that shows enough of ``cells``: looked at from the
    same height before from below."""
    views = [replace(view, toward_eye=tuple(np.multiply(turn, view.toward_eye).tolist())) for turn in _MIRRORS]
    normals = 0.5 * cross_of(body.mesh.points, body.drawn.faces[np.isin(body.drawn.cell, cells)])
    most = max(float(np.abs(normals @ axes(candidate)[2]).sum()) for candidate in views)  # were nothing in the way
    if seen_area(body, cells, view) >= ENOUGH * most:
        return view
    shown = np.array([seen_area(body, cells, candidate) for candidate in views])
    return views[int(np.argmax(shown >= ENOUGH * shown.max()))]


def seen_area(body: Body, cells: Array, view: View) -> float:
    """Area of the drawn triangles of ``cells`` that the undeformed body leaves uncovered, as projected, m²."""
    points, faces = body.mesh.points, body.drawn.faces
    mine = np.isin(body.drawn.cell, cells)
    if not mine.any():
        return 0.0
    right, up, eye = axes(view)
    seen = points @ np.stack([right, up, eye], axis=1)
    low, high = seen[body.drawn.nodes].min(axis=0), seen[body.drawn.nodes].max(axis=0)
    step = max(float((high - low)[:2].max()) / _GRAIN, 1e-300)
    place = (seen - low) / np.array([step, step, 1.0])
    depth = np.full((_GRAIN + 2, _GRAIN + 2), -np.inf)
    _cover(depth, place[faces])
    middle = place[faces[mine]].mean(axis=1)
    x, y = middle[:, :2].astype(np.int64).T
    free = middle[:, 2] >= depth[x, y] - _NEAR * body.mesh.diagonal - _slope(place[faces[mine]])
    return float((0.5 * np.abs(cross_of(points, faces[mine]) @ eye))[free].sum())


def _slope(corners: Array) -> Array:
    """(t,) by how much depth changes over one cell of the map along triangles (t, 3, 3); at most over all of each."""
    size = np.ptp(corners, axis=1)
    return size[:, 2] / np.maximum(size[:, :2].max(axis=1), 1.0)


def _cover(depth: Array, corners: Array) -> None:
    """Raise ``depth`` to that of triangles (t, 3, 3) of cells across, cells up and metres toward the eye; each is cut
    into four until it is smaller than a cell."""
    for _ in range(10):
        for point in corners.transpose(1, 0, 2):
            x, y = point[:, :2].astype(np.int64).T
            np.maximum.at(depth.reshape(-1), x * depth.shape[1] + y, point[:, 2])  # flat: many times faster
        large = (np.ptp(corners[:, :, :2], axis=1) > 1.0).any(axis=1)
        if not large.any():
            return
        a, b, c = corners[large].transpose(1, 0, 2)
        ab, bc, ca = (a + b) / 2, (b + c) / 2, (c + a) / 2
        parts = ((a, ab, ca), (ab, b, bc), (ca, bc, c), (ab, bc, ca))
        corners = np.concatenate([np.stack(part, axis=1) for part in parts])
