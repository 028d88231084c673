"""A test on a body: flat beads at its points, trace lines between them, ticks along what they measure.

Beads and lines are cased in the halo colour and lifted toward the eye, so that they stand proud of the surface they
were measured on. What the body hides stays told: lines go on in dashes, beads as empty rings. On a ghost, and where
beads carry figures, nothing hides them.
"""

from __future__ import annotations

from functools import partial

import numpy as np

from viewer.model.arrays import Array
from viewer.scene import ghost, tokens
from viewer.scene.forms import Piece, axes, revolved
from viewer.scene.picture import Body, TraceMark
from viewer.scene.tokens import TEST_BEAD

HOLLOW = 0.62  # radius of a point without a figure or a channel, in beads
LEAST, MOST = 0.75, 2.9  # radius of beads of weight 0 and 1, in beads
CLASSES = 6  # of darkness
CASING = 0.32  # the casing stands so far out, in beads
RING_LINE = 2.0
TICK, TICK_LINE = 0.030, 2.0  # length of a tick from the point's middle, of the diagonal
HEAD, HEAD_RADIUS = 0.012, 0.0048
DASH, GAP = 0.007, 0.006  # of hidden trace lines
LIFT = (0.014, 0.0146, 0.018, 0.0186)  # toward the eye, of the diagonal: casing and core of lines, then of beads
OVER_LIFT = (0.40, 0.4006)  # of beads that nothing hides: no line of the test runs over them either
_SIDES = 24
_NONE3, _NONE2 = np.empty((0, 3), np.int64), np.empty((0, 2), np.int64)


def traces(body: Body, diagonal: float, toward_eye: Array) -> list[Piece]:
    """All pieces of the tests on a body; they face the eye. ``diagonal`` m, by which they are sized."""
    found: list[Piece] = []
    for mark in body.traces:
        over = body.form == "ghost" or mark.weights is not None
        move = body.factor * mark.motion
        found += _lines(mark, move, diagonal, toward_eye, over)
        found += _ticks(mark, move, diagonal, toward_eye, over)
        found += _beads(mark, move, diagonal, toward_eye, over)
        found += [
            _pointer(mark, move, call.row, call.target, diagonal) for call in mark.calls if call.target is not None
        ]
    return found


def bead_radii(mark: TraceMark, diagonal: float) -> Array:
    """(p,) radius of each bead, m."""
    unit = TEST_BEAD * diagonal
    if mark.weights is None:
        return np.where(hollow(mark), HOLLOW, 1.0) * unit
    share = np.clip(np.nan_to_num(mark.weights), 0.0, 1.0)
    return np.where(hollow(mark), HOLLOW, weighted_radius(share)) * unit


def weighted_radius(share: Array | float) -> Array:
    """Radius in beads of weights 0 … 1: their areas grow evenly."""
    return np.sqrt(LEAST**2 + np.asarray(share) * (MOST**2 - LEAST**2))


def strength(weight: float) -> float:
    """Share of the test's colour laid over the body's for a weight 0 … 1, in steps."""
    return float(np.round(np.clip(weight, 0.0, 1.0) * (CLASSES - 1)) / (CLASSES - 1))


def hollow(mark: TraceMark) -> Array:
    """(p,) bool: points without a channel, or without a figure."""
    if mark.weights is not None:
        return np.isnan(mark.weights)
    return (
        ~np.isin(np.arange(len(mark.labels)), mark.sensor) if len(mark.sensor) else np.zeros(len(mark.labels), bool)
    )


def _lines(mark: TraceMark, move: Array, diagonal: float, eye: Array, over: bool) -> list[Piece]:
    """Stems, then the trace lines: casing, core, and what the body hides of them in dashes."""
    found: list[Piece] = []
    whole = partial(Piece, triangles=_NONE3, on_top=over, shaded=False)
    if mark.stems and np.any(move):
        ends = np.concatenate([mark.points, mark.points]) + LIFT[0] * diagonal * eye
        rows = np.arange(len(mark.points))
        moved = np.concatenate([np.zeros_like(move), move])
        stems = np.stack([rows, rows + len(rows)], axis=1)
        found.append(whole(ends, moved, lines=stems, fill="test", edge="test", line_width=tokens.STEM))
    if not len(mark.lines):
        return found
    if mark.at_rest:
        rest = ghost.cut(mark.points, mark.lines, tokens.DASH * diagonal, tokens.DASH_GAP * diagonal)
        found.append(_dashes(rest, mark.points, np.zeros_like(move), "ghost", tokens.GHOST, over))
    for lift, colour, width in ((LIFT[0], "halo", tokens.TRACE_CASING), (LIFT[1], "test", tokens.TRACE)):
        points = mark.points + lift * diagonal * eye
        found.append(whole(points, move, lines=mark.lines, fill=colour, edge=colour, line_width=width))
    if not over:
        dashes = ghost.cut(mark.points, mark.lines, DASH * diagonal, GAP * diagonal)
        found.append(_dashes(dashes, mark.points, move, "test", tokens.TRACE, True))
    return found


def _dashes(dashes: ghost.Dashes, points: Array, move: Array, colour: str, width: float, over: bool) -> Piece:
    ends, moved = (dashes.segments(values).reshape(-1, 3) for values in (points, move))
    pairs = np.arange(len(ends)).reshape(-1, 2)
    return Piece(ends, moved, _NONE3, pairs, colour, colour, width, on_top=over, shaded=False)


def _beads(mark: TraceMark, move: Array, diagonal: float, eye: Array, over: bool) -> list[Piece]:
    found: list[Piece] = []
    radii, empty = bead_radii(mark, diagonal), hollow(mark)
    low, high = (OVER_LIFT if over else LIFT[2:]) * np.full(2, diagonal)
    discs = partial(_discs, mark.points, move, eye=eye, over=over)
    solid = np.flatnonzero(~empty)
    if len(solid):
        casing = radii + CASING * TEST_BEAD * diagonal
        found.append(discs(solid, casing, lift=low, fill="halo"))
        strengths = np.ones(len(radii)) if mark.weights is None else np.array([strength(w) for w in mark.weights])
        for value in np.unique(strengths[solid]):
            some = solid[strengths[solid] == value]
            found.append(discs(some, radii, lift=high, fill="test", strength=float(value)))
    found.append(_rings(mark.points + high * eye, move, radii, eye))
    return found


def _discs(
    points: Array, move: Array, rows: Array, radii: Array, *, eye: Array, over: bool, lift: float, fill: str, **look
) -> Piece:
    """Discs at the points ``rows`` that face the eye, as one piece."""
    rim = _rim(eye)
    size = radii[rows][:, None, None]
    at = points[rows][:, None] + lift * eye + size * np.concatenate([np.zeros((1, 3)), rim])
    k = np.arange(_SIDES)
    fan = np.stack([0 * k, 1 + k, 1 + (k + 1) % _SIDES], axis=1)
    triangles = (fan + (_SIDES + 1) * np.arange(len(rows))[:, None, None]).reshape(-1, 3)
    moved = np.repeat(move[rows], _SIDES + 1, axis=0)
    return Piece(at.reshape(-1, 3), moved, triangles, _NONE2, fill, fill, on_top=over, shaded=False, **look)


def _rings(points: Array, move: Array, radii: Array, eye: Array) -> Piece:
    """The rim of every bead, over everything: all that is seen of a bead behind the body."""
    at = points[:, None] + radii[:, None, None] * _rim(eye)
    k = np.arange(_SIDES)
    around = np.stack([k, (k + 1) % _SIDES], axis=1)
    lines = (around + _SIDES * np.arange(len(points))[:, None, None]).reshape(-1, 2)
    moved = np.repeat(move, _SIDES, axis=0)
    return Piece(at.reshape(-1, 3), moved, _NONE3, lines, "test", "test", RING_LINE, on_top=True, shaded=False)


def _rim(eye: Array) -> Array:
    angle = np.linspace(0.0, 2 * np.pi, _SIDES + 1)[:-1, None]
    _, u, v = axes(eye)
    return np.cos(angle) * u + np.sin(angle) * v


def _ticks(mark: TraceMark, move: Array, diagonal: float, eye: Array, over: bool) -> list[Piece]:
    """An arrow along each channel, the way it measures as plus."""
    if not len(mark.ticks):
        return []
    foot, carried = mark.points[mark.sensor] + LIFT[1] * diagonal * eye, move[mark.sensor]
    neck = foot + (TICK - HEAD) * diagonal * mark.ticks
    n = len(foot)
    shafts = np.stack([np.arange(n), np.arange(n) + n], axis=1)
    points, moved = np.concatenate([foot, neck]), np.concatenate([carried, carried])
    shaft = Piece(points, moved, _NONE3, shafts, "test", "test", TICK_LINE, on_top=over, shaded=False)
    cones: list[Array] = []
    motions: list[Array] = []
    faces: list[Array] = []
    for start, direction, motion in zip(neck, mark.ticks, carried, strict=True):
        cone, triangles = revolved(direction, [(0.0, 0.0), (0.0, HEAD_RADIUS), (HEAD, 0.0)])
        faces.append(triangles + sum(map(len, cones)))
        cones.append(start + diagonal * cone)
        motions.append(np.broadcast_to(motion, cone.shape))
    heads = Piece(
        np.concatenate(cones), np.concatenate(motions), np.concatenate(faces), _NONE2, "test", "test", on_top=over,
        shaded=False,
    )  # fmt: skip
    return [shaft, heads]


def _pointer(mark: TraceMark, move: Array, row: int, target: Array, diagonal: float) -> Piece:
    """Dashes from a point to another place that is spoken of."""
    ends = np.stack([mark.points[row], np.asarray(target, float)])
    dashes = ghost.cut(ends, np.array([[0, 1]]), 2 * DASH * diagonal, 2 * GAP * diagonal)
    moves = np.stack([move[row], np.zeros_like(move[row])])
    return _dashes(dashes, ends, moves, "ink", tokens.TRACE, True)
