"""Pins through the axes of hinges, balls at joints, and the fan that shows how far a hinge folds as drawn.

Sizes are shares of the body's diagonal (LOOK.md). A pin lies over the body, cased in the halo colour, so that it is
seen from any side; its points move as the hinge's axis does.
"""

from __future__ import annotations

import numpy as np

from viewer.model.arrays import Array
from viewer.scene.forms import Piece, axes, sphere, tube
from viewer.scene.picture import Body, HingeMark
from viewer.scene.tokens import FAN_OPACITY, PIN_RADIUS

HEAD = 2.5  # radius of a pin's heads, in radii of the pin; their length
HEAD_LENGTH = 1.1
LEAST_RADIUS = 0.62  # of the full one: joints, unsure hinges, short hinges, which a full pin would hide …
SLIM = 0.032  # … namely those whose axis is shorter than a full radius over this
CASING = 0.7  # the casing stands so far out, in radii: 1.7 radii in all
ROD = 0.3  # most radius of the rod between the heads, of the band's width, so that the band's glow is seen …
LEAST_ROD = 0.4  # … but never thinner than this, of a full radius
OVERHANG = 0.15  # of the axis, at each end …
MOST_OVERHANG = 0.045  # … and of the diagonal
BALL = 2.7  # radius of a joint's ball, in radii of a full pin
JOINT_PIN = 0.04  # half length of the pin through a joint, of the diagonal
FAN = 0.19  # length of the fan, of the diagonal, where the folding side reaches so far
LEAST_FAN = 0.085
LEAST_ANGLE = np.radians(1.5)  # as drawn, below which a fan would be a mere line
FAN_LINE = 1.4
_STEPS = 12  # of the fan
_NO_LINES = np.empty((0, 2), np.int64)


def pins(body: Body, diagonal: float) -> list[Piece]:
    """The pin of each hinge with its casing; a joint's with a ball. They are the same from any side."""
    found: list[Piece] = []
    for mark in body.hinges:
        path, move = _spindle(mark, body.factor, diagonal)
        radius = pin_radius(mark, diagonal)
        rod = min(radius, max(ROD * mark.width, LEAST_ROD * PIN_RADIUS * diagonal))
        for grown in (CASING * rod, 0.0):
            found.append(_pin(mark, path, move, radius, rod, grown))
            if len(mark.axis) == 1:
                found.append(_ball(mark, body.factor, BALL * PIN_RADIUS * diagonal, grown))
    return found


def fans(body: Body, diagonal: float, toward_eye: Array) -> list[Piece]:
    """The fan of each hinge that visibly folds, at the head nearer to the eye: from the undeformed arm to the arm as
    drawn."""
    return [_fan(mark, body.factor, diagonal, toward_eye) for mark in body.hinges if _folds(mark, body.factor)]


def _folds(mark: HingeMark, factor: float) -> bool:
    turn = np.linalg.norm(np.abs(factor * np.cross(np.asarray(mark.fold), np.asarray(mark.arm, float))))
    return mark.reach > 0 and bool(turn >= LEAST_ANGLE)


def near_head(mark: HingeMark, factor: float, diagonal: float, toward_eye: Array) -> tuple[Array, Array]:
    """Place (3,) m at rest and drawn amplitude (3,) m of the head that is nearer to the eye."""
    path, move = _spindle(mark, factor, diagonal)
    end = -1 if (path[-1] - path[0]) @ toward_eye > 0 else 0
    return path[end], move[end]


def pin_radius(mark: HingeMark, diagonal: float) -> float:
    """Radius of a hinge's pin, m."""
    full = PIN_RADIUS * diagonal
    if len(mark.axis) == 1 or not mark.sure:
        return LEAST_RADIUS * full
    long = float(np.linalg.norm(np.diff(mark.axis, axis=0), axis=1).sum())
    return float(np.clip(SLIM * long, LEAST_RADIUS * full, full))


def head_radius(mark: HingeMark, diagonal: float) -> float:
    """Radius of a pin's heads with their casing, m."""
    return (HEAD + CASING) * pin_radius(mark, diagonal)


def middle_line(mark: HingeMark, diagonal: float) -> Array:
    """(k, 3) m, the pin's middle line at rest without its ends, which labels belong to."""
    path, _ = _spindle(mark, 0.0, diagonal)
    inner = path.copy()
    for end, next_ in ((0, 1), (-1, -2)):
        inner[end] += 0.1 * (path[next_] - path[end])
    return inner


def _colour(mark: HingeMark) -> str:
    return "accent" if mark.chosen else "ink" if mark.sure else "soft"


def _spindle(mark: HingeMark, factor: float, diagonal: float) -> tuple[Array, Array]:
    """The pin's middle line (k, 3), m, overhang included, and its drawn amplitude."""
    axis, move = np.asarray(mark.axis, float), factor * np.asarray(mark.motion)
    if len(axis) == 1:
        along = JOINT_PIN * diagonal * _joint_axis(mark)
        return axis + np.array([[-1.0], [1.0]]) * along, np.repeat(move, 2, axis=0)
    steps = np.linalg.norm(np.diff(axis, axis=0), axis=1)
    kept = np.concatenate([[True], steps > 1e-9 * diagonal])
    axis, move, steps = axis[kept], move[kept], steps[kept[1:]]
    over = min(OVERHANG * float(steps.sum()), MOST_OVERHANG * diagonal)
    straight = len(axis) == 2
    ends, moves = [], []
    for end, inner in ((0, 1), (-1, -2)):
        share = over / np.linalg.norm(axis[end] - axis[inner])
        ends.append(axis[end] + share * (axis[end] - axis[inner]))
        moves.append(move[end] + (share if straight else 0.0) * (move[end] - move[inner]))
    if straight:
        return np.array(ends), np.array(moves)
    return np.array([ends[0], *axis, ends[1]]), np.array([moves[0], *move, moves[1]])


def _joint_axis(mark: HingeMark) -> Array:
    turn = np.asarray(mark.fold)
    real = np.real(turn) if np.linalg.norm(np.real(turn)) >= np.linalg.norm(np.imag(turn)) else np.imag(turn)
    long = np.linalg.norm(real)
    return real / long if long > 0 else axes(np.asarray(mark.arm, float))[1]


def _pin(mark: HingeMark, path: Array, move: Array, radius: float, rod: float, grown: float) -> Piece:
    """The rod with its two flat heads, ``grown`` m larger all around for the casing."""
    lengths = np.concatenate([[0.0], np.cumsum(np.linalg.norm(np.diff(path, axis=0), axis=1))])
    long, thin, wide = float(lengths[-1]), rod + grown, HEAD * radius + grown
    head = min(HEAD_LENGTH * radius, 0.3 * long) + grown
    first = [(-grown, 0.0), (-grown, wide), (head, wide), (head, thin)]
    profile = first + [(long - place, size) for place, size in reversed(first)]
    points, triangles, along = tube(path, profile)
    moved = np.stack([_interpolated(along, lengths, move[:, k]) for k in range(3)], axis=1)
    return _piece(points, moved, triangles, mark, grown > 0)


def _interpolated(at: Array, places: Array, values: Array) -> Array:
    if np.iscomplexobj(values):
        return np.interp(at, places, values.real) + 1j * np.interp(at, places, values.imag)
    return np.interp(at, places, values)


def _ball(mark: HingeMark, factor: float, radius: float, grown: float) -> Piece:
    unit, triangles = sphere(28, 14)
    points = np.asarray(mark.axis, float) + (radius + grown) * unit
    moved = np.broadcast_to(factor * np.asarray(mark.motion)[0], points.shape)
    return _piece(points, moved, triangles, mark, grown > 0)


def _piece(points: Array, move: Array, triangles: Array, mark: HingeMark, casing: bool) -> Piece:
    colour = "halo" if casing else _colour(mark)
    return Piece(points, move, triangles, _NO_LINES, colour, colour, on_top=True, shaded=False, inside_out=casing)


def _fan(mark: HingeMark, factor: float, diagonal: float, toward_eye: Array) -> Piece:
    place, move = near_head(mark, factor, diagonal, toward_eye)
    arm = np.asarray(mark.arm, float) * float(np.clip(mark.reach, LEAST_FAN * diagonal, FAN * diagonal))
    turned = factor * np.cross(np.asarray(mark.fold), arm)
    share = np.linspace(0.0, 1.0, _STEPS + 1)[:, None]
    points = np.concatenate([[place], np.repeat([place + arm], _STEPS + 1, axis=0)])
    moved = np.concatenate([[move], move + share * turned])
    k = np.arange(1, _STEPS + 1)
    triangles = np.stack([0 * k, k, k + 1], axis=1)
    lines = np.concatenate([[[0, 1], [0, _STEPS + 1]], np.stack([k, k + 1], axis=1)])  # both arms and the arc
    colour = _colour(mark)
    return Piece(
        points, moved, triangles, lines, colour, colour, FAN_LINE, on_top=True, shaded=False, opacity=FAN_OPACITY
    )
