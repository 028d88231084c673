"""Marks in three dimensions: support pegs, lumped-mass beads with their legs, functional points.

Each mark is a :class:`Piece`: triangles and lines in metres at rest, and how every one of its points moves. Sizes
are shares of the body's diagonal, so that marks look alike on a 2 mm spring and on a 20 m frame.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy.spatial import cKDTree

from viewer.model.arrays import Array
from viewer.model.mesh import Mesh
from viewer.scene.motion import displacement
from viewer.scene.picture import Body, MassMark, Picture, PointMark

PEG = 0.018  # edge of a peg's cube
PEG_STEP = 0.028  # least distance between pegs
PEG_BITE = 0.2  # share of a peg's edge that lies in the body
BEAD = 0.036  # radius of the heaviest bead of a picture
LEAST_BEAD = 0.008
_PROUD = 1.006  # circles stand this much proud of the bead
LEGS = 5  # most legs of a bead
LEG_DASH, LEG_GAP = 0.008, 0.006
RING, RING_TUBE = 0.0145, 0.0024
ARROW, ARROW_SHAFT = 0.058, 0.0027  # half length tip to tip, radius
HEAD, HEAD_RADIUS = 0.022, 0.0095
LONGEST_ARROW = 2.0  # an arrow seen at a slant is drawn longer, at most so much
END_ON = 0.3  # share of its length at which an arrow, seen almost end-on, is drawn as ring and dot

_INNER = 0.2  # "corner" measure below which a held point may be inside a held area
_ONE_SIDED = 0.6  # share in which the cells around held nodes agree on the side where the body is
_FEW = 4  # neighbours that a point inside an area has at least
_MANY = 4000  # held nodes above which one in each cube of a grid is enough
_GRAIN = 0.25  # edge of these cubes, in peg steps
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

    @property
    def moves(self) -> bool:
        return bool(np.any(self.move))

    def at(self, phase: float) -> Array:
        """(n, 3) positions in metres at a phase."""
        return self.points + displacement(self.move, 1.0, phase)


def mark_pieces(picture: Picture, toward_eye: Array | None = None) -> tuple[tuple[Piece, ...], ...]:
    """The marks of each body of a picture; sizes are common to compared bodies.

    toward_eye  (3,) where the camera is, when it is not where ``picture.view`` has it
    """
    both = zip(standing_pieces(picture), facing_pieces(picture, toward_eye), strict=True)
    return tuple(standing + facing for standing, facing in both)


def standing_pieces(picture: Picture) -> tuple[tuple[Piece, ...], ...]:
    """By body the marks that are the same from any side: pegs, beads and legs."""
    diagonal, heaviest = _common(picture)
    return tuple(standing_marks(body, diagonal, heaviest) for body in picture.bodies)


def facing_pieces(picture: Picture, toward_eye: Array | None = None) -> tuple[tuple[Piece, ...], ...]:
    """By body the marks that face the eye: rims of beads, functional points."""
    diagonal, heaviest = _common(picture)
    eye = np.asarray(picture.view.toward_eye if toward_eye is None else toward_eye, float)
    eye = eye / np.linalg.norm(eye)
    return tuple(facing_marks(body, diagonal, heaviest, eye) for body in picture.bodies)


def _common(picture: Picture) -> tuple[float, float]:
    diagonal = max(body.mesh.diagonal for body in picture.bodies)
    return diagonal, max((mark.mass for body in picture.bodies for mark in body.masses), default=0.0)


def standing_marks(body: Body, diagonal: float, heaviest: float) -> tuple[Piece, ...]:
    """Pegs as one piece, then beads with their legs.

    diagonal  m, by which marks are sized
    heaviest  kg, the mass whose bead has the full radius
    """
    pieces: list[Piece] = []
    pegs = [place for mark in body.supports for place in peg_places(body.mesh, mark.rows, diagonal)]
    if pegs:
        pieces.append(_pegs(pegs, PEG * diagonal))
    for mass in body.masses:
        pieces += _bead(body, mass, bead_radius(mass.mass, heaviest, diagonal), diagonal)
    return tuple(pieces)


def facing_marks(body: Body, diagonal: float, heaviest: float, toward_eye: Array) -> tuple[Piece, ...]:
    """Rims of beads, then functional points; they face the unit vector ``toward_eye``."""
    pieces: list[Piece] = []
    for mass in body.masses:
        pieces += _rims(body, mass, bead_radius(mass.mass, heaviest, diagonal), toward_eye)
    return (*pieces, *(_point(body, mark, diagonal, toward_eye) for mark in body.points))


def bead_radius(mass: float, heaviest: float, diagonal: float) -> float:
    """Radius in metres, as the cube root of the mass; never too small to be seen."""
    share = np.cbrt(mass / heaviest) if heaviest > 0 and mass > 0 else 0.0
    return float(max(BEAD * share, LEAST_BEAD) * diagonal)


# ---- supports


def peg_places(mesh: Mesh, rows: Array, diagonal: float) -> list[tuple[Array, Array]]:
    """(centre, outward unit vector) of each peg along held nodes, spread by at least ``PEG_STEP``.

    Of a held area only the outline gets pegs. Held nodes are thinned by farthest-point selection, so that corners
    and ends of an edge get their peg first and the rest fall evenly between. A peg sits on the side of the held
    nodes where no cell is, found from the cells around; a line held within a sheet has none, and its pegs all sit
    on the sheet's lower side.
    """
    rows = np.unique(np.asarray(rows, np.int64))
    if len(rows) > _MANY:
        grid = np.floor(mesh.points[rows] / (_GRAIN * PEG_STEP * diagonal)).astype(np.int64)
        rows = rows[np.sort(np.unique(grid, axis=0, return_index=True)[1])]
    size, held = PEG * diagonal, mesh.points[rows]
    corner, inner = _surroundings(held, PEG_STEP * diagonal)
    inward, count = _inward(mesh, rows)
    centres: list[Array] = []
    found = []
    edge = np.nonzero(~inner)[0]
    for k in edge[spread(held[edge], PEG_STEP * diagonal, favour=corner[edge])]:
        near = np.linalg.norm(held - held[k], axis=1) <= 1.2 * size
        at = _middle_of_thickness(held, k, 0.5 * size)
        outward = -inward[near].sum(axis=0)
        if np.linalg.norm(outward) < _ONE_SIDED * max(float(count[near].sum()), 1e-300):
            outward = _lower_side(mesh, rows[near])
        outward = outward / np.linalg.norm(outward)
        centre = at + (0.5 - PEG_BITE) * size * outward
        if all(np.linalg.norm(centre - other) >= 1.05 * size for other in centres):
            centres.append(centre)
            found.append((centre, outward))
    return found


def spread(points: Array, step: float, most: int = 160, favour: Array | None = None) -> list[int]:
    """Rows of ``points`` chosen one by one, each the farthest from those before, until all lie within ``step``.

    The first is the farthest from the centroid; ties go to the lower row (differences below 1e-9 of the extent
    count as ties, so that rounding does not choose). Distances are stretched by 1 + ``favour`` (n,) when given."""
    if len(points) == 0:
        return []
    grain = 1e-9 * max(float(np.ptp(points, axis=0).max()), 1e-300)
    stretch = np.ones(len(points)) if favour is None else 1 + favour
    distance = np.linalg.norm(points - points.mean(axis=0), axis=1)
    chosen = [int(np.argmax(np.round(distance * stretch / grain)))]
    distance = np.linalg.norm(points - points[chosen[0]], axis=1)
    while len(chosen) < most and distance.max() >= step:
        chosen.append(int(np.argmax(np.round(distance * stretch / grain) * (distance >= step))))
        distance = np.minimum(distance, np.linalg.norm(points - points[chosen[-1]], axis=1))
    return chosen


def _surroundings(points: Array, reach: float) -> tuple[Array, Array]:
    """How held points lie among those within ``reach``, or further where they are few.

    corner  (n,) distance from the middle of those around, in ``reach``: 0 along a straight line, about ⅓ at a right
            angle, ½ at an end
    inner   (n,) bool: others lie all around in two directions, so that the point is inside a held area, not on its
            outline; never all of them
    """
    n = len(points)
    tree = cKDTree(points)
    if n > _FEW:
        reach = max(reach, 1.5 * float(np.median(tree.query(points, [_FEW + 1])[0])))
    pairs = tree.query_pairs(reach, output_type="ndarray")
    a, b = np.concatenate([pairs, pairs[:, ::-1]]).T
    away = points[b] - points[a]
    count = 1 + np.bincount(a, minlength=n)  # the point itself is one of those around
    total = np.stack([np.bincount(a, part, n) for part in away.T], axis=1)
    corner = np.linalg.norm(total / count[:, None], axis=1) / reach
    spreads = np.empty((n, 3, 3))
    for i in range(3):
        for j in range(3):
            spreads[:, i, j] = np.bincount(a, away[:, i] * away[:, j], n)
    widths = np.sqrt(np.maximum(np.linalg.eigvalsh(spreads), 0.0))  # ascending
    inner = (corner < _INNER) & (count > _FEW) & (widths[:, 1] > 0.5 * widths[:, 2])
    return corner, inner if not inner.all() else ~inner


def _inward(mesh: Mesh, rows: Array) -> tuple[Array, Array]:
    """By held node: the sum of vectors from the held nodes of each cell around to that cell's middle, and the sum of
    their lengths. Cells whose nodes are all held say nothing about the side where the body is."""
    place = np.full(mesh.n_nodes, -1, np.int64)
    place[rows] = np.arange(len(rows))
    total, lengths = np.zeros((len(rows), 3)), np.zeros(len(rows))
    for block in mesh.blocks:
        at = place[block.nodes]
        some = (at >= 0).any(axis=1) & (at < 0).any(axis=1)
        at, xyz = at[some], mesh.points[block.nodes[some]]
        held = at >= 0
        middle = (xyz * held[..., None]).sum(axis=1) / held.sum(axis=1, keepdims=True)
        vector = xyz.mean(axis=1) - middle
        cell, corner = np.nonzero(held)
        np.add.at(total, at[cell, corner], vector[cell])
        np.add.at(lengths, at[cell, corner], np.linalg.norm(vector, axis=1)[cell])
    return total, lengths


def _middle_of_thickness(held: Array, k: int, reach: float) -> Array:
    """Mean of the held nodes around node ``k``: the middle of a wall several nodes thick."""
    return held[np.linalg.norm(held - held[k], axis=1) <= reach].mean(axis=0)


def _lower_side(mesh: Mesh, rows: Array) -> Array:
    """Unit normal of the sheet around ``rows`` that points down (or, for an upright sheet, to lower x, y)."""
    around = [b.nodes[np.isin(b.nodes, rows).any(axis=1)].ravel() for b in mesh.blocks]
    points = mesh.points[np.unique(np.concatenate([*around, rows]))]
    _, spreads, axes = np.linalg.svd(points - points.mean(axis=0), full_matrices=True)
    normal = axes[2] if len(points) > 2 and spreads[1] > 1e-9 * max(spreads[0], 1e-300) else -_WORLD[2]
    weight = normal @ np.array([1e-6, 1e-3, 1.0])
    return -normal if weight > 0 else normal


def _pegs(places: Sequence[tuple[Array, Array]], size: float) -> Piece:
    corners = np.array([[x, y, z] for z in (-1, 1) for y in (-1, 1) for x in (-1, 1)]) * (size / 2)
    faces = np.array([[0, 2, 3, 1], [4, 5, 7, 6], [0, 1, 5, 4], [2, 6, 7, 3], [0, 4, 6, 2], [1, 3, 7, 5]])
    edges = np.array([[0, 1], [2, 3], [4, 5], [6, 7], [0, 2], [1, 3], [4, 6], [5, 7], [0, 4], [1, 5], [2, 6], [3, 7]])
    triangles = np.concatenate([faces[:, [0, 1, 2]], faces[:, [0, 2, 3]]])
    points = np.concatenate([centre + corners @ _axes(outward) for centre, outward in places])
    shift = 8 * np.arange(len(places))[:, None, None]
    return Piece(
        points,
        np.zeros_like(points),
        (triangles + shift).reshape(-1, 3),
        (edges + shift).reshape(-1, 2),
        "mass",
        "body_edge",
        1.0,
    )


def _axes(first: Array) -> Array:
    """Orthonormal rows: ``first``, then the world axes as nearly as they can be kept."""
    helper = _WORLD[np.argmin(np.round(np.abs(first), 6))]
    second = helper - (helper @ first) * first
    second /= np.linalg.norm(second)
    return np.array([first, second, np.cross(first, second)])


# ---- masses


def _bead(body: Body, mark: MassMark, radius: float, diagonal: float) -> list[Piece]:
    """The bead with its great circles, and its legs."""
    centre = np.asarray(mark.position, float)
    motion = body.factor * np.asarray(mark.motion)
    unit, triangles = sphere(40, 20)
    ball = centre + radius * unit
    flat, around = _circle()
    rings = centre + _PROUD * radius * np.concatenate([np.roll(flat, k, axis=1) for k in range(3)])
    lines = np.concatenate([around + len(flat) * k for k in range(3)]) + len(ball)
    points = np.concatenate([ball, rings])
    bead = Piece(
        points,
        _carried(points, centre, motion),
        triangles,
        lines,
        "mass",
        "body_edge",
        1.3,
        normals=np.concatenate([unit, (rings - centre) / (_PROUD * radius)]),
    )
    legs = _legs(body, mark, centre, motion, radius, diagonal)
    return [bead] if legs is None else [bead, legs]


def _rims(body: Body, mark: MassMark, radius: float, toward_eye: Array) -> list[Piece]:
    """The bead's rim, and the rim again in dashes that stay visible when the bead is inside the body."""
    flat, around = _circle()
    circle = np.asarray(mark.position, float) + _PROUD * radius * (flat @ _axes(toward_eye)[[1, 2, 0]])
    moved = np.broadcast_to(body.factor * np.asarray(mark.motion)[:3], circle.shape)
    none = np.empty((0, 3), np.int64)
    rim = Piece(circle, moved, none, around, "mass", "body_edge", 1.3)
    return [rim, Piece(circle, moved, none, around[np.arange(64) % 4 < 2], "mass", "body_edge", 1.3, on_top=True)]


def _circle() -> tuple[Array, Array]:
    """A unit circle in x and y: points (64, 3) and the lines around."""
    angle = np.linspace(0, 2 * np.pi, 65)[:-1]
    return np.stack([np.cos(angle), np.sin(angle), 0 * angle], axis=1), np.stack(
        [np.arange(64), (np.arange(64) + 1) % 64], axis=1
    )


def _legs(body: Body, mark: MassMark, centre: Array, motion: Array, radius: float, diagonal: float) -> Piece | None:
    """Dashes between the bead and a few far-apart nodes of its footprint; each end follows its own motion."""
    rows = np.asarray(mark.footprint, np.int64)
    starts, moves = [], []
    for row in rows[spread(body.mesh.points[rows], 1.2 * radius, LEGS)]:
        foot, foot_move = body.mesh.points[row], body.factor * body.shape[row]
        reach = float(np.linalg.norm(foot - centre))
        if reach <= 1.05 * radius:
            continue
        top = centre + (foot - centre) * (radius / reach)
        top_move = _carried(top[None], centre, motion)[0]
        long = reach - radius
        begin = np.arange(0.0, long, (LEG_DASH + LEG_GAP) * diagonal)
        ends = np.stack([begin, np.minimum(begin + LEG_DASH * diagonal, long)], axis=1).ravel() / long
        starts.append(top + ends[:, None] * (foot - top))
        moves.append(top_move + ends[:, None] * (foot_move - top_move))
    if not starts:
        return None
    points, move = np.concatenate(starts), np.concatenate(moves)
    lines = np.arange(len(points)).reshape(-1, 2)
    return Piece(points, move, np.empty((0, 3), np.int64), lines, "mass", "body_edge", 1.3)


def _carried(points: Array, centre: Array, motion: Array) -> Array:
    """Displacement of points that move with a rigid body: translation plus (small) rotation about ``centre``."""
    return motion[:3] + np.cross(np.broadcast_to(motion[3:], points.shape), points - centre)


# ---- functional points


def _point(body: Body, mark: PointMark, diagonal: float, toward_eye: Array) -> Piece:
    """A ring that faces the eye and a double arrow along the sensitive direction, left free inside the ring.

    Seen almost end-on, a dot in the ring stands for the arrow: the usual sign of a vector toward the reader.
    """
    centre, direction = np.asarray(mark.position, float), np.asarray(mark.direction, float)
    direction = direction / np.linalg.norm(direction)
    foreshortened = float(np.linalg.norm(direction - (direction @ toward_eye) * toward_eye))
    long = min(1 / max(foreshortened, 1e-9), LONGEST_ARROW)
    ring = _ring(RING, RING_TUBE, toward_eye)
    arms = []
    if foreshortened <= END_ON:
        arms.append(_revolved(RING * toward_eye, [(0.0, 0.45 * RING), (0.1, 0.0)]))
    for axis in () if arms else (direction, -direction):
        arms.append(_revolved(long * axis, [(RING / long, ARROW_SHAFT), (ARROW - HEAD, ARROW_SHAFT)]))
        arms.append(_revolved(long * axis, [(ARROW - HEAD, 0.0), (ARROW - HEAD, HEAD_RADIUS), (ARROW, 0.0)]))
    points: list[Array] = []
    triangles: list[Array] = []
    for part, faces in (ring, *arms):
        triangles.append(faces + sum(len(p) for p in points))
        points.append(centre + diagonal * part)
    joined = np.concatenate(points)
    move = np.broadcast_to(body.factor * np.asarray(mark.motion)[:3], joined.shape)
    no_lines = np.empty((0, 2), np.int64)
    return Piece(joined, move, np.concatenate(triangles), no_lines, "point", "point", on_top=True, shaded=False)


def _ring(radius: float, tube: float, normal: Array) -> tuple[Array, Array]:
    _, u, v = _axes(normal)
    a, b = np.meshgrid(np.linspace(0, 2 * np.pi, 49)[:-1], np.linspace(0, 2 * np.pi, 9)[:-1], indexing="ij")
    out = np.cos(a)[..., None] * u + np.sin(a)[..., None] * v
    points = (radius + tube * np.cos(b))[..., None] * out + (tube * np.sin(b))[..., None] * normal
    return points.reshape(-1, 3), _grid_triangles(48, 8, True, True)


def _revolved(axis: Array, profile: Sequence[tuple[float, float]]) -> tuple[Array, Array]:
    """A surface of revolution about ``axis``: profile of (distance along in lengths of the axis, radius)."""
    _, u, v = _axes(axis / np.linalg.norm(axis))
    angle = np.linspace(0, 2 * np.pi, 17)[:-1]
    around = np.cos(angle)[:, None] * u + np.sin(angle)[:, None] * v
    points = np.concatenate([along * axis + radius * around for along, radius in profile])
    return points, _grid_triangles(len(profile), 16, False, True)


def sphere(around: int, down: int) -> tuple[Array, Array]:
    """A unit sphere: points (n, 3), equal to its normals, and triangles."""
    polar = np.linspace(0, np.pi, down + 1)
    turn = np.linspace(0, 2 * np.pi, around + 1)[:-1]
    p, t = np.meshgrid(polar, turn, indexing="ij")
    points = np.stack([np.sin(p) * np.cos(t), np.sin(p) * np.sin(t), np.cos(p)], axis=-1).reshape(-1, 3)
    return points, _grid_triangles(down + 1, around, False, True)


def _grid_triangles(rows: int, columns: int, wrap_rows: bool, wrap_columns: bool) -> Array:
    """Two triangles for each cell of a grid of points, closed on itself where asked."""
    down, across = rows if wrap_rows else rows - 1, columns if wrap_columns else columns - 1
    i, j = (index.ravel() for index in np.indices((down, across)))
    a, b, c, d = (((i + p) % rows) * columns + (j + q) % columns for p, q in ((0, 0), (1, 0), (1, 1), (0, 1)))
    return np.concatenate([np.stack([a, b, c], axis=1), np.stack([a, c, d], axis=1)])
