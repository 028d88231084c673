"""Marks in three dimensions: what stands on, hangs on or goes through the bodies of a picture.

Each mark is a :class:`Piece`: triangles and lines in metres at rest, and how every one of its points moves. Sizes
are shares of the body's diagonal, so that marks look alike on a 2 mm spring and on a 20 m frame.
"""

from __future__ import annotations

import numpy as np

from viewer.model.arrays import Array
from viewer.scene.forms import Piece, axes, circle, revolved, ring, sphere
from viewer.scene.hinge_marks import fans, pins
from viewer.scene.pegs import PEG, peg_places, pegs, spread
from viewer.scene.picture import Body, MassMark, Picture, PointMark
from viewer.scene.strut_marks import bars
from viewer.scene.trace_marks import traces

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


def mark_pieces(picture: Picture, toward_eye: Array | None = None) -> tuple[tuple[Piece, ...], ...]:
    """The marks of each body of a picture; sizes are common to compared bodies.

    toward_eye  (3,) where the camera is, when it is not where ``picture.view`` has it
    """
    both = zip(standing_pieces(picture), facing_pieces(picture, toward_eye), strict=True)
    return tuple(standing + facing for standing, facing in both)


def standing_pieces(picture: Picture) -> tuple[tuple[Piece, ...], ...]:
    """By body the marks that are the same from any side: pegs, beads and legs, pins of hinges, struts."""
    diagonal, heaviest = _common(picture)
    return tuple(standing_marks(body, diagonal, heaviest) for body in picture.bodies)


def facing_pieces(picture: Picture, toward_eye: Array | None = None) -> tuple[tuple[Piece, ...], ...]:
    """By body the marks that face the eye: rims of beads, fans of hinges, functional points, tests."""
    diagonal, heaviest = _common(picture)
    eye = np.asarray(picture.view.toward_eye if toward_eye is None else toward_eye, float)
    eye = eye / np.linalg.norm(eye)
    return tuple(facing_marks(body, diagonal, heaviest, eye) for body in picture.bodies)


def _common(picture: Picture) -> tuple[float, float]:
    diagonal = max(body.mesh.diagonal for body in picture.bodies)
    return diagonal, max((mark.mass for body in picture.bodies for mark in body.masses), default=0.0)


def standing_marks(body: Body, diagonal: float, heaviest: float) -> tuple[Piece, ...]:
    """Pegs as one piece, then beads with their legs, pins of hinges, struts.

    diagonal  m, by which marks are sized
    heaviest  kg, the mass whose bead has the full radius
    """
    pieces: list[Piece] = []
    places = [place for mark in body.supports for place in peg_places(body.mesh, mark.rows, diagonal)]
    if places:
        pieces.append(pegs(places, PEG * diagonal))
    for mass in body.masses:
        pieces += _bead(body, mass, bead_radius(mass.mass, heaviest, diagonal), diagonal)
    return (*pieces, *pins(body, diagonal), *bars(body, diagonal))


def facing_marks(body: Body, diagonal: float, heaviest: float, toward_eye: Array) -> tuple[Piece, ...]:
    """Rims of beads, fans of hinges, functional points, then tests; they face the unit vector ``toward_eye``."""
    pieces: list[Piece] = []
    for mass in body.masses:
        pieces += _rims(body, mass, bead_radius(mass.mass, heaviest, diagonal), toward_eye)
    pieces += fans(body, diagonal, toward_eye)
    pieces += [_point(body, mark, diagonal, toward_eye) for mark in body.points]
    return (*pieces, *traces(body, diagonal, toward_eye))


def bead_radius(mass: float, heaviest: float, diagonal: float) -> float:
    """Radius in metres, as the cube root of the mass; never too small to be seen."""
    share = np.cbrt(mass / heaviest) if heaviest > 0 and mass > 0 else 0.0
    return float(max(BEAD * share, LEAST_BEAD) * diagonal)


# ---- masses


def _bead(body: Body, mark: MassMark, radius: float, diagonal: float) -> list[Piece]:
    """The bead with its great circles, and its legs."""
    centre = np.asarray(mark.position, float)
    motion = body.factor * np.asarray(mark.motion)
    unit, triangles = sphere(40, 20)
    ball = centre + radius * unit
    flat, around = circle()
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
    flat, around = circle()
    rim_at = np.asarray(mark.position, float) + _PROUD * radius * (flat @ axes(toward_eye)[[1, 2, 0]])
    moved = np.broadcast_to(body.factor * np.asarray(mark.motion)[:3], rim_at.shape)
    none = np.empty((0, 3), np.int64)
    rim = Piece(rim_at, moved, none, around, "mass", "body_edge", 1.3)
    return [rim, Piece(rim_at, moved, none, around[np.arange(64) % 4 < 2], "mass", "body_edge", 1.3, on_top=True)]


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
    around = ring(RING, RING_TUBE, toward_eye)
    arms = []
    if foreshortened <= END_ON:
        arms.append(revolved(RING * toward_eye, [(0.0, 0.45 * RING), (0.1, 0.0)]))
    for axis in () if arms else (direction, -direction):
        arms.append(revolved(long * axis, [(RING / long, ARROW_SHAFT), (ARROW - HEAD, ARROW_SHAFT)]))
        arms.append(revolved(long * axis, [(ARROW - HEAD, 0.0), (ARROW - HEAD, HEAD_RADIUS), (ARROW, 0.0)]))
    points: list[Array] = []
    triangles: list[Array] = []
    for part, faces in (around, *arms):
        triangles.append(faces + sum(len(p) for p in points))
        points.append(centre + diagonal * part)
    joined = np.concatenate(points)
    move = np.broadcast_to(body.factor * np.asarray(mark.motion)[:3], joined.shape)
    no_lines = np.empty((0, 2), np.int64)
    return Piece(joined, move, np.concatenate(triangles), no_lines, "point", "point", on_top=True, shaded=False)
