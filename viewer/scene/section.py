"""A plane cut through a body: what lies on one side is taken away, and solids show the cut face.

The undeformed mesh is cut once. Every new point lies on a straight line between two nodes and keeps its share of the
way, so that shape and place follow theirs at any phase. Skin triangles are clipped; the face that the cut opens is
made cell by cell from where the plane crosses the outlines of the cell's faces, which neighbours share, so that the
cut face is closed and its triangles belong to the cells they cut.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from viewer.cells import KINDS, Skin
from viewer.errors import InputError
from viewer.model.arrays import Array
from viewer.scene.figures import digits, length

_SNAP = 1e-7  # share of the diagonal within which a node counts as lying in the plane
_MINUS = str.maketrans("-", "−")


@dataclass(frozen=True, eq=False)
class Plane:
    """The points r with ``normal``·r = ``offset`` (m); the normal is made a unit vector."""

    normal: tuple[float, ...]
    offset: float

    def __post_init__(self) -> None:
        normal = np.asarray(self.normal, float)
        size = float(np.linalg.norm(normal)) if normal.shape == (3,) else 0.0
        if not (np.isfinite(size) and size > 0 and np.isfinite(self.offset)):
            raise InputError(
                "this is no plane",
                found=f"normal {self.normal}, offset {self.offset}",
                expected="a normal of three numbers that is not zero, and an offset in metres",
            )
        x, y, z = (float(c) for c in normal / size)
        object.__setattr__(self, "normal", (x, y, z))
        object.__setattr__(self, "offset", float(self.offset))

    @property
    def words(self) -> str:
        """ "cut at x = 120 mm" """
        normal = np.array(self.normal)
        axis = int(np.argmax(np.abs(normal)))
        offset = self.offset if abs(self.offset) > 1e-12 else 0.0  # rounding is no place
        if abs(abs(normal[axis]) - 1) < 1e-12:
            at = length(offset * np.sign(normal[axis]), 6, trim=True)
            return f"cut at {'xyz'[axis]} = {at}".translate(_MINUS)
        listed = ", ".join(digits(c, 2, trim=True) for c in self.normal)
        return f"cut across ({listed}) at {length(offset, 6, trim=True)}".translate(_MINUS)

    def heights(self, points: Array, toward_eye: Array) -> Array:
        """(n,) signed distance in m of points (n, 3), positive on the side nearer to the eye, which is taken away."""
        normal = np.array(self.normal)
        away = points @ normal - self.offset
        return away if normal @ np.asarray(toward_eye, float) >= 0 else -away


@dataclass(frozen=True, eq=False)
class Section:
    """What a cut leaves.

    skin   over the node rows, and beyond them over the new points
    ends   (k, 2) node rows between which each new point lies; share (k,) of the way from the first
    """

    skin: Skin
    ends: Array
    share: Array

    def extended(self, values: Array) -> Array:
        """A field by node row (n, …) with the new points' values after it."""
        a, b = values[self.ends[:, 0]], values[self.ends[:, 1]]
        share = self.share.reshape(-1, *[1] * (values.ndim - 1))
        return np.concatenate([values, a + share * (b - a)])


def snapped(heights: Array, diagonal: float) -> Array:
    """Heights in which nodes as good as in the plane lie in it, so that no slivers arise."""
    return np.where(np.abs(heights) <= _SNAP * diagonal, 0.0, heights)


def cut(skin: Skin, cells: Sequence[tuple[str, Array, Array]], heights: Array) -> Section:
    """Cut a body open.

    skin     of the cells that are shown
    cells    these, by blocks of (kind, nodes (n, nodes per cell), cell rows (n,))
    heights  (n_nodes,) m above the plane; what lies above is taken away
    """
    below = heights < 0
    points = _NewPoints(heights)
    whole, one, two = _clipped(skin.faces, below, points)
    rim = [_segments(kind, nodes, rows, below, points) for kind, nodes, rows in cells if KINDS[kind].dim == 3]
    sides, lines = (_shortened(pairs, below, points) for pairs in (skin.outline, skin.edges))
    ids = points.number()

    faces, parts = [skin.faces[whole]], [whole]
    a, ab, ac = one.corners[0], ids[one.new[0]], ids[one.new[1]]
    faces.append(np.stack([a, ab, ac], axis=1))
    (a, b), bc, ac = two.corners, ids[two.new[0]], ids[two.new[1]]
    faces += [np.stack([a, b, bc], axis=1), np.stack([a, bc, ac], axis=1)]
    parts += [one.rows, two.rows, two.rows]
    kept = np.concatenate(parts)
    cap, cap_cell, edges = _caps([(cell, ids[start], ids[end]) for cell, start, end in rim])
    outline = np.concatenate([_joined(skin.outline, sides, ids), np.unique(np.sort(edges, axis=1), axis=0)])
    cut_skin = Skin(
        np.concatenate([*faces, cap]),
        np.concatenate([skin.cell[kept], cap_cell]),
        np.concatenate([skin.face[kept], skin.n_faces + np.unique(cap_cell, return_inverse=True)[1]]),
        outline[outline[:, 0] != outline[:, 1]],
        _joined(skin.edges, lines, ids),
        np.concatenate([skin.edge_cell[lines.whole], skin.edge_cell[lines.rows]]),
    )
    return Section(cut_skin, *points.found)


class _NewPoints:
    """Crossings of the plane with segments from a node below to one that is not: asked for first, numbered once."""

    def __init__(self, heights: Array) -> None:
        self._heights = heights
        self._asked: list[tuple[Array, Array]] = []
        self._count = 0

    def ask(self, low: Array, high: Array) -> slice:
        """Where in the result of :meth:`number` the crossings between rows ``low`` (below) and ``high`` will be."""
        self._asked.append((low, high))
        self._count += len(low)
        return slice(self._count - len(low), self._count)

    def number(self) -> Array:
        """The rows of all crossings asked for; one in a node of the plane is that node."""
        low, high = (np.concatenate([pair[side] for pair in self._asked]).astype(np.int64) for side in (0, 1))
        n = len(self._heights)
        ids = high.copy()
        free = self._heights[high] > 0
        key, place = np.unique(low[free] * n + high[free], return_inverse=True)
        ids[free] = n + place
        ends = np.stack([key // n, key % n], axis=1)
        a, b = self._heights[ends].T
        self.found = ends, a / (a - b)
        return ids


@dataclass(frozen=True, eq=False)
class _Part:
    """Triangles (rows of the skin's) with their corners below and the slices of their crossings."""

    rows: Array
    corners: tuple[Array, ...]
    new: tuple[slice, slice]


def _clipped(faces: Array, below: Array, points: _NewPoints) -> tuple[Array, _Part, _Part]:
    """Rows of triangles that stay whole, and those with one and with two corners below."""
    low = below[faces]
    count = low.sum(axis=1)
    rows = np.flatnonzero(count == 1)
    a, b, c = _turned(faces[rows], np.argmax(low[rows], axis=1))
    one = _Part(rows, (a,), (points.ask(a, b), points.ask(a, c)))
    rows = np.flatnonzero(count == 2)
    c, a, b = _turned(faces[rows], np.argmin(low[rows], axis=1))
    two = _Part(rows, (a, b), (points.ask(b, c), points.ask(a, c)))
    return np.flatnonzero(count == 3), one, two


def _turned(triangles: Array, first: Array) -> Array:
    """(3, t) corners of triangles, beginning with corner ``first`` (t,), in the same sense."""
    return np.take_along_axis(triangles, (first[:, None] + np.arange(3)) % 3, axis=1).T


@dataclass(frozen=True, eq=False)
class _Shortened:
    whole: Array
    rows: Array
    low: Array
    new: slice


def _shortened(pairs: Array, below: Array, points: _NewPoints) -> _Shortened:
    low = below[pairs]
    rows = np.flatnonzero(low[:, 0] != low[:, 1])
    first = low[rows, 0]
    inner, outer = np.where(first, pairs[rows].T, pairs[rows].T[::-1])
    return _Shortened(np.flatnonzero(low.all(axis=1)), rows, inner, points.ask(inner, outer))


def _joined(pairs: Array, part: _Shortened, ids: Array) -> Array:
    return np.concatenate([pairs[part.whole], np.stack([part.low, ids[part.new]], axis=1)])


def _segments(kind: str, nodes: Array, rows: Array, below: Array, points: _NewPoints) -> tuple[Array, slice, slice]:
    """Where the plane crosses the outlines of the faces of solid cells: cell row of each piece, its start and end,
    with the cut face on its left as seen from above the plane."""
    low = below[nodes]
    crossed = low.any(axis=1) & ~low.all(axis=1)
    nodes, rows = nodes[crossed], rows[crossed]
    cells, up, down = [np.empty(0, np.int64)], [np.empty((0, 2), np.int64)], [np.empty((0, 2), np.int64)]
    for face_kind, local in KINDS[kind].faces:
        loop = nodes[:, [local[k] for a, _, *middle in KINDS[face_kind].edges for k in (a, *middle)]]
        low = below[loop]
        after = np.roll(low, -1, axis=1)
        rises, falls = low & ~after, ~low & after
        cell, i = np.nonzero(rises)
        j, sought, size = i.copy(), np.ones(len(i), bool), loop.shape[1]
        for _ in range(size - 1):
            j[sought] = (j[sought] + 1) % size
            sought &= ~falls[cell, j]
        cells.append(rows[cell])
        up.append(np.stack([loop[cell, i], loop[cell, (i + 1) % size]], axis=1))
        down.append(np.stack([loop[cell, (j + 1) % size], loop[cell, j]], axis=1))
    ends, starts = np.concatenate(up), np.concatenate(down)
    return np.concatenate(cells), points.ask(*starts.T), points.ask(*ends.T)


def _caps(rim: Sequence[tuple[Array, Array, Array]]) -> tuple[Array, Array, Array]:
    """Triangles (t, 3) of the cut face, the cell of each, and the outlines (e, 2) of the cut cells: fans from one
    corner of each cell's outline, which is convex as long as the cell is."""
    none = np.empty(0, np.int64)
    cell, start, end = (np.concatenate([none, *parts]) for parts in (zip(*rim, strict=True) if rim else ((),) * 3))
    long = start != end  # not where a face only touches the plane
    order = np.argsort(cell[long], kind="stable")
    cell, start, end = cell[long][order], start[long][order], end[long][order]
    first = np.flatnonzero(np.diff(cell, prepend=-1))
    apex = np.repeat(start[first], np.diff(first, append=len(cell)))
    fan = (apex != start) & (apex != end)
    return np.stack([apex, start, end], axis=1)[fan], cell[fan], np.stack([start, end], axis=1)
