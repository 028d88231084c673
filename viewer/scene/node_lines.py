"""Node lines: where a standing mode does not move, across a sheet or along the direction in which it mostly moves.

All three components of a displacement vanish together hardly anywhere, so a node line is always that of one
direction of motion; the picture says which.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.sparse import csr_matrix
from scipy.sparse.csgraph import connected_components

from viewer.cells import KINDS
from viewer.model.arrays import Array
from viewer.scene.figures import digits
from viewer.scene.motion import is_standing
from viewer.scene.picture import Body, NodeLines
from viewer.scene.surface import Surface, cross_of

ACROSS = 0.05  # a sheet that moves less across itself than this share of its motion moves in its plane
SNAP_DEGREES = 15.0  # a dominant direction this close to an axis is taken along it
LEAST_SWING = 0.05  # share of the peak that motion reaches on either side of a line: between regions that
# hardly move, signs are those of side effects and of rounding
STEEPNESS = 0.02  # where motion grows more slowly away from the line than this share of peak ÷ diagonal,
# nobody could tell where the line is


@dataclass(frozen=True, eq=False)
class Crossings:
    """Segments on the surface: each end lies between two skin nodes. ``nodes`` (m, 2, 2), ``share`` (m, 2) of the way
    from the first to the second."""

    nodes: Array
    share: Array

    def segments(self, points: Array) -> Array:
        """(m, 2, 3) ends at skin-node positions (s, 3)."""
        a, b = points[self.nodes[:, :, 0]], points[self.nodes[:, :, 1]]
        return a + self.share[:, :, None].astype(points.dtype) * (b - a)


def lines_of(body: Body) -> NodeLines | None:
    """What the node lines of a body are lines of: of the motion across a sheet; of the motion along its dominant
    direction for a solid, and for a sheet that moves in its own plane. None for a travelling mode, whose lines move,
    and for a body that is all lines."""
    faces, shape = body.mesh.skin.faces, body.shape
    if not is_standing(shape) or not len(faces) or not np.any(shape):
        return None
    normals = cross_of(body.mesh.points, faces)
    areas = np.linalg.norm(normals, axis=1)
    moved = np.real(shape)[faces].mean(axis=1)
    if all(KINDS[block.kind].dim < 3 for block in body.mesh.blocks):
        across = np.einsum("ij,ij->i", moved, normals) / np.maximum(areas, 1e-300)
        if np.abs(across).max() >= ACROSS * np.linalg.norm(moved, axis=1).max():
            return NodeLines(None)
    direction = np.linalg.eigh((moved * areas[:, None]).T @ moved)[1][:, -1]
    axis = int(np.argmax(np.abs(direction)))
    if abs(direction[axis]) >= np.cos(np.radians(SNAP_DEGREES)):
        return NodeLines(np.eye(3)[axis])
    return NodeLines(direction * np.sign(direction[axis]))


def words(lines: NodeLines | None) -> str:
    """What the scale note says: "node lines, if any: no motion along z"."""
    if lines is None:
        return "no node lines: the mode travels"
    if lines.direction is None:
        return "node lines, if any: no motion normal to the surface"
    axis = int(np.argmax(np.abs(lines.direction)))
    if abs(lines.direction[axis]) == 1:
        return f"node lines, if any: no motion along {'xyz'[axis]}"
    listed = ", ".join(digits(c, 2, trim=True) for c in lines.direction)
    return f"node lines, if any: no motion along ({listed})".replace("-", "−")


def crossings(body: Body, surface: Surface) -> Crossings:
    """The node lines of a body on its surface, from the undeformed shape."""
    none = Crossings(np.empty((0, 2, 2), np.int64), np.empty((0, 2)))
    if body.node_lines is None or not len(surface.triangles):
        return none
    points, shape = body.mesh.points[surface.nodes], np.real(body.shape[surface.nodes])
    if body.node_lines.direction is None:
        along = surface.vertex_normals(surface.face_normals(points))
    else:
        along = np.broadcast_to(body.node_lines.direction, (surface.n_vertices, 3))
    value = np.einsum("ij,ij->i", shape[surface.vertex], along)
    peak = float(np.abs(value).max())
    if peak == 0:
        return none
    corners = surface.triangles
    value = _signed(value, corners, peak)
    corner_value, above = value[corners], value[corners] > 0
    mixed = above.any(axis=1) & ~above.all(axis=1)
    # along one direction motion does not jump at a crease; along the normal each smooth patch has its own
    place = surface.vertex if body.node_lines.direction is not None else np.arange(surface.n_vertices)
    swinging = _region_peaks(value, place, corners)[place[corners]].min(axis=1) >= LEAST_SWING * peak
    least = STEEPNESS * peak / body.mesh.diagonal * np.sqrt(2 * surface.areas)
    rows = np.flatnonzero(mixed & swinging & (np.ptp(corner_value, axis=1) >= least))
    corners, corner_value, above = corners[rows], corner_value[rows], above[rows]
    lone = np.argmax(above == (above.sum(axis=1) == 1)[:, None], axis=1)  # the corner on a side of its own
    order = (lone[:, None] + np.arange(3)) % 3
    corners, corner_value = np.take_along_axis(corners, order, 1), np.take_along_axis(corner_value, order, 1)
    share = corner_value[:, :1] / (corner_value[:, :1] - corner_value[:, 1:])
    nodes = surface.vertex[np.stack([corners[:, [0, 0]], corners[:, 1:]], axis=2)]
    # head to tail, what moves up always on one side: a renderer leaves out the last pixel of each segment
    back = corner_value[:, 0] > 0
    nodes[back], share[back] = nodes[back][:, ::-1], share[back][:, ::-1]
    return Crossings(nodes, share)


def _region_peaks(value: Array, place: Array, corners: Array) -> Array:
    """By place (v → place): the largest motion within its region, which is connected and moves one way."""
    pairs = corners[:, [0, 1, 1, 2, 2, 0]].reshape(-1, 2)
    a, b = place[pairs[(value[pairs] > 0).sum(axis=1) != 1]].T
    n = int(place.max()) + 1
    _, region = connected_components(csr_matrix((np.ones(len(a), np.int8), (a, b)), (n, n)), directed=False)
    largest = np.zeros(n)
    np.maximum.at(largest, region[place], np.abs(value))
    return largest[region]


def _signed(value: Array, corners: Array, peak: float) -> Array:
    """Values none of which is zero: a vertex that does not move takes the sign of its neighbours' mean, so that a
    line runs through it only where they move both ways (not along a clamped edge)."""
    still = np.abs(value) <= 1e-9 * peak
    if not still.any():
        return value
    around = value[corners].sum(axis=1)
    mean = np.bincount(corners.ravel(), np.repeat(around, 3), minlength=len(value))
    return np.where(still, np.where(mean < 0, -1e-9, 1e-9) * peak, value)
