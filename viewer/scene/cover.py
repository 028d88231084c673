"""What bodies and marks sweep over in a cycle, as a map of the picture: labels keep off it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from viewer.model.arrays import Array
from viewer.scene import marks
from viewer.scene.motion import positions
from viewer.scene.picture import Body, Picture
from viewer.scene.primitives import Frame
from viewer.scene.surface import Surface, surface_of

CELL = 6  # px, grain of the map


@dataclass(frozen=True, eq=False)
class Cover:
    """How much of any box the bodies and marks sweep over, from running sums over a grid of ``CELL`` px."""

    sums: Array

    def cells(self, boxes: Array) -> Array:
        """(n,) covered cells in boxes (n, 4) of left, top, right, bottom px."""
        rows, columns = self.sums.shape
        low = np.floor(boxes[:, :2] / CELL).astype(int)
        high = np.ceil(boxes[:, 2:] / CELL).astype(int)
        x0, x1 = (np.clip(v, 0, columns - 1) for v in (low[:, 0], high[:, 0]))
        y0, y1 = (np.clip(v, 0, rows - 1) for v in (low[:, 1], high[:, 1]))
        s = self.sums
        return s[y1, x1] - s[y0, x1] - s[y1, x0] + s[y0, x0]

    @property
    def map(self) -> Array:
        """(rows, columns) bool of covered cells."""
        return np.diff(np.diff(self.sums, axis=0), axis=1) > 0


def cover(picture: Picture, frame: Frame, surfaces: Sequence[Surface] | None = None) -> Cover:
    """Everything that bodies and marks sweep over in a cycle. ``surfaces`` of the bodies, when already known."""
    rows, columns = int(np.ceil(frame.height / CELL)), int(np.ceil(frame.width / CELL))
    grid = np.zeros((rows, columns), bool)
    for index, (body, pieces) in enumerate(zip(picture.bodies, marks.mark_pieces(picture), strict=True)):
        surface = surface_of(body.mesh, body.skin) if surfaces is None else surfaces[index]
        rest, shape = body.mesh.points[surface.nodes], body.shape[surface.nodes]
        for phase in cycle_phases(body):
            at = frame.project(positions(rest, shape, body.factor, phase), index)
            _fill(grid, at, surface.node_triangles)
            _fill(grid, at, surface.lines[:, [0, 1, 1]])
            for piece in pieces:
                seen = frame.project(piece.at(phase), index)
                _fill(grid, seen, piece.triangles)
                _fill(grid, seen, piece.lines[:, [0, 1, 1]])
    return Cover(np.pad(np.cumsum(np.cumsum(grid, axis=0), axis=1), ((1, 0), (1, 0))))


def cycle_phases(body: Body) -> tuple[float, ...]:
    """Rest and the extremes of a standing mode; four quarters of a travelling one."""
    if body.standing:
        return 0.0, np.pi / 2, np.pi
    return 0.0, np.pi / 2, np.pi, 3 * np.pi / 2


def _fill(grid: Array, points: Array, triangles: Array) -> None:
    """Mark the cells that points (n, 2) px and triangles (t, 3) of them lie on: each triangle is cut into four until
    it is smaller than a cell; corners stand for the rest."""
    limit = np.array(grid.shape[::-1]) * CELL
    _stamp(grid, points)
    a, b, c = (points[triangles[:, k]] for k in range(3))
    for _ in range(10):
        low, high = np.minimum(np.minimum(a, b), c), np.maximum(np.maximum(a, b), c)
        split = ((high - low > CELL).any(axis=1)) & (high >= 0).all(axis=1) & (low < limit).all(axis=1)
        if not split.any():
            return
        a, b, c = a[split], b[split], c[split]
        ab, bc, ca = (a + b) / 2, (b + c) / 2, (c + a) / 2
        for middle in (ab, bc, ca):
            _stamp(grid, middle)
        a, b, c = np.concatenate([a, ab, ca, ab]), np.concatenate([ab, b, bc, bc]), np.concatenate([ca, bc, c, ca])


def _stamp(grid: Array, points: Array) -> None:
    points = points[np.isfinite(points).all(axis=1)]
    column, row = np.floor(points / CELL).astype(int).T
    good = (row >= 0) & (row < grid.shape[0]) & (column >= 0) & (column < grid.shape[1])
    grid[row[good], column[good]] = True
