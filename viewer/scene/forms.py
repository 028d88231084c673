"""Forms of marks in three dimensions: the piece that a stage draws, and the surfaces that pieces are made of."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from viewer.model.arrays import Array
from viewer.scene.motion import displacement

_WORLD = np.eye(3)


@dataclass(frozen=True, eq=False)
class Piece:
    """Part of a mark, drawn with one fill and one line colour (names of fields of ``Tokens``).

    points     (n, 3) m, at rest
    move       (n, 3) drawn displacement as a complex or real amplitude, m
    triangles  (t, 3) rows of points
    lines      (l, 2) rows of points
    normals    (n, 3) for smooth shading, or None for flat faces
    on_top     drawn over the body even where the body is nearer
    opacity    of the triangles; lines are never see-through
    strength   share of the fill laid over the body's own colour, 1: the fill as it is
    inside_out only triangles that look away from the eye are drawn: a hull around another piece that rims it
    """

    points: Array
    move: Array
    triangles: Array
    lines: Array
    fill: str
    edge: str
    line_width: float = 1.0
    normals: Array | None = None
    on_top: bool = False
    shaded: bool = True
    opacity: float = 1.0
    inside_out: bool = False
    strength: float = 1.0

    @property
    def moves(self) -> bool:
        return bool(np.any(self.move))

    def at(self, phase: float) -> Array:
        """(n, 3) positions in metres at a phase."""
        return self.points + displacement(self.move, 1.0, phase)


def axes(first: Array) -> Array:
    """Orthonormal rows: ``first``, then the world axes as nearly as they can be kept."""
    helper = _WORLD[np.argmin(np.round(np.abs(first), 6))]
    second = helper - (helper @ first) * first
    second /= np.linalg.norm(second)
    return np.array([first, second, np.cross(first, second)])


def circle() -> tuple[Array, Array]:
    """A unit circle in x and y: points (64, 3) and the lines around."""
    angle = np.linspace(0, 2 * np.pi, 65)[:-1]
    return np.stack([np.cos(angle), np.sin(angle), 0 * angle], axis=1), np.stack(
        [np.arange(64), (np.arange(64) + 1) % 64], axis=1
    )


def ring(radius: float, tube: float, normal: Array) -> tuple[Array, Array]:
    _, u, v = axes(normal)
    a, b = np.meshgrid(np.linspace(0, 2 * np.pi, 49)[:-1], np.linspace(0, 2 * np.pi, 9)[:-1], indexing="ij")
    out = np.cos(a)[..., None] * u + np.sin(a)[..., None] * v
    points = (radius + tube * np.cos(b))[..., None] * out + (tube * np.sin(b))[..., None] * normal
    return points.reshape(-1, 3), grid_triangles(48, 8, True, True)


def revolved(axis: Array, profile: Sequence[tuple[float, float]]) -> tuple[Array, Array]:
    """A surface of revolution about ``axis``: profile of (distance along in lengths of the axis, radius)."""
    _, u, v = axes(axis / np.linalg.norm(axis))
    angle = np.linspace(0, 2 * np.pi, 17)[:-1]
    around = np.cos(angle)[:, None] * u + np.sin(angle)[:, None] * v
    points = np.concatenate([along * axis + radius * around for along, radius in profile])
    return points, grid_triangles(len(profile), 16, False, True)


def sphere(around: int, down: int) -> tuple[Array, Array]:
    """A unit sphere: points (n, 3), equal to its normals, and triangles."""
    polar = np.linspace(0, np.pi, down + 1)
    turn = np.linspace(0, 2 * np.pi, around + 1)[:-1]
    p, t = np.meshgrid(polar, turn, indexing="ij")
    points = np.stack([np.sin(p) * np.cos(t), np.sin(p) * np.sin(t), np.cos(p)], axis=-1).reshape(-1, 3)
    return points, grid_triangles(down + 1, around, False, True)


def grid_triangles(rows: int, columns: int, wrap_rows: bool, wrap_columns: bool) -> Array:
    """Two triangles for each cell of a grid of points, closed on itself where asked."""
    down, across = rows if wrap_rows else rows - 1, columns if wrap_columns else columns - 1
    i, j = (index.ravel() for index in np.indices((down, across)))
    a, b, c, d = (((i + p) % rows) * columns + (j + q) % columns for p, q in ((0, 0), (1, 0), (1, 1), (0, 1)))
    return np.concatenate([np.stack([a, b, c], axis=1), np.stack([a, c, d], axis=1)])


def tube(path: Array, profile: Sequence[tuple[float, float]], sides: int = 20) -> tuple[Array, Array, Array]:
    """A surface of revolution bent along a polyline ``path`` (k, 3), k ≥ 2, with distinct neighbours.

    profile  (distance along the path, radius), ascending; before the start and past the end the path goes straight on

    Returns points (n, 3), triangles that look outward, and the distance along the path of each point (n,).
    """
    lengths = np.linalg.norm(np.diff(path, axis=0), axis=1)
    knots = np.concatenate([[0.0], np.cumsum(lengths)])
    inner = [(float(s), _radius(profile, s)) for s in knots[1:-1] if profile[0][0] < s < profile[-1][0]]
    stations = sorted([*profile, *inner], key=lambda station: station[0])
    tangents = np.diff(path, axis=0) / lengths[:, None]
    rings, along = [], []
    u = axes(tangents[0])[1]
    for s, radius in stations:
        k = int(np.clip(np.searchsorted(knots, s, "right") - 1, 0, len(lengths) - 1))
        at_knot = k > 0 and abs(s - knots[k]) < 1e-9 * knots[-1]
        tangent = tangents[k - 1] + tangents[k] if at_knot else tangents[k]
        tangent = tangent / max(float(np.linalg.norm(tangent)), 1e-12)
        u = u - (u @ tangent) * tangent  # carried along without turning about the path
        u = u / np.linalg.norm(u)
        angle = np.linspace(0, 2 * np.pi, sides + 1)[:-1, None]
        centre = path[k] + (s - knots[k]) * tangents[k]
        rings.append(centre + radius * (np.cos(angle) * u + np.sin(angle) * np.cross(tangent, u)))
        along.append(np.full(sides, s))
    triangles = grid_triangles(len(stations), sides, False, True)[:, ::-1]
    return np.concatenate(rings), triangles, np.concatenate(along)


def _radius(profile: Sequence[tuple[float, float]], s: float) -> float:
    places, radii = np.array(profile).T
    return float(np.interp(s, places, radii))
