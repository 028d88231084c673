"""Coordinates along and across a candidate, and rotation about it, of the cells around it."""

from __future__ import annotations

from dataclasses import dataclass, fields, replace

import numpy as np

from viewer.insight.hinges.curve import Arc, Line, fit_arc, principal
from viewer.insight.hinges.field import Field
from viewer.model.arrays import Array

BENT = 0.02  # of the size: a centre line that misses its chord by more is a curve
# Elongation from which the shape of a candidate may tell the direction of its line, and from which it must: energy
# crowds along a short neck as well as across it.
MAY_TELL, MUST_TELL = 1.5, 6.0
_OWN_WAY = 20.0  # degrees: a side that leaves the band askew by more goes round a fold of the sheet


@dataclass(frozen=True, eq=False)
class Frame:
    """The centre line of a candidate and where the cells ``near`` it lie.

    near      (n,) cell rows; along, across (n,) m, across negative on side A and positive on side B
    low, high, along_low, along_high   (n,) m, extents of the cells
    outward   (n, 3) unit vectors in which ``across`` is counted
    spin      (n,) rotation about ``about`` (n, 3), the line or, for a blob, the axis its surroundings turn about
    off       (n,) m away from the surface that runs along the line and across it
    blob      the candidate is no longer than wide: its line is a guess
    """

    curve: Line | Arc
    near: Array
    along: Array
    across: Array
    low: Array
    high: Array
    along_low: Array
    along_high: Array
    outward: Array
    about: Array
    spin: Array
    off: Array
    blob: bool


def frame_of(field: Field, cells: Array, blob: bool) -> Frame | None:
    """The frame of the candidate ``cells``, taken for a line or for a ``blob``; None when it cannot be that."""
    weight, points = field.strain[cells], field.middle[cells]
    centre, _, directions = principal(points, weight)
    corners = field.points[field.corners[cells]].reshape(-1, 3)
    spans = np.array([np.ptp((corners - centre) @ d) for d in directions])
    order = np.argsort(-spans)
    spans, directions = spans[order], directions[order]
    beams = bool((field.dim[cells] == 1).all())  # which have no width to fold along
    if (beams or spans[0] < MAY_TELL * spans[1]) if not blob else (spans[0] > MUST_TELL * spans[1] and not beams):
        return None
    grain = field.largest_cell(cells)
    near = surroundings(field, cells, corners, float(max(0.5 * spans[0], 2.0 * spans[1], 4 * grain)))
    if len(near) < 4:
        return None
    slack = float(1.5 * spans[1])
    arc = None if blob else _arc(field, points, weight, spans)
    if arc is not None:
        return _kept(_frame(field, arc, near, None, None, False), slack)
    close = float(max(spans[1], 2 * grain))
    if not blob:
        line = Line(centre, directions[0])
        arm = field.middle[near] - centre
        arm = arm - (arm @ line.axis)[:, None] * line.axis
        out = _sides(field, near, arm, line.axis, close)
        return _kept(_frame(field, line, near, out, line.axis, False), slack)
    arm = field.middle[near] - centre
    about, out = _gradient(field, near, arm, float(max(spans[0], 2 * grain)))
    flat = (corners - centre) - ((corners - centre) @ out)[:, None] * out
    axis = principal(flat, np.ones(len(flat)))[2][0]
    if abs(about @ axis) > 0.8:  # it folds about its line, whose direction the rotation knows better
        axis = about - (about @ out) * out
        axis = axis / np.linalg.norm(axis)
    return _kept(_frame(field, Line(centre, axis), near, np.tile(out, (len(near), 1)), about, True), slack)


def surroundings(field: Field, cells: Array, corners: Array, reach: float) -> Array:
    """Rows of cells within ``reach`` of the ``corners`` of a candidate that hang together with it."""
    low, high = corners.min(axis=0) - reach, corners.max(axis=0) + reach
    rows = np.nonzero(((field.middle >= low) & (field.middle <= high)).all(axis=1) & (field.volume > 0))[0]
    piece = field.pieces(rows)
    member = np.zeros(piece.max(initial=0) + 1, bool)
    member[piece[np.searchsorted(rows, cells[field.volume[cells] > 0])]] = True
    return rows[member[piece]]


def _arc(field: Field, points: Array, weight: Array, spans: Array) -> Arc | None:
    """The arc through a candidate that misses its chord by enough and is clearly nearer than a straight line."""
    if len(points) <= 8 or spans[0] < 3 * BENT * field.size:
        return None
    arc = fit_arc(points, weight)
    if arc is None:
        return None
    along = arc.along(points)
    rest = float(np.sqrt(weight @ ((points - arc.foot(along)) ** 2).sum(axis=1) / weight.sum()))
    straight = float(np.linalg.norm(principal(points, weight)[1][1:]))
    ends = arc.foot(np.array([along.min(), (along.min() + along.max()) / 2, along.max()]))
    chord = ends[2] - ends[0]
    sag = np.linalg.norm(np.cross(ends[1] - ends[0], chord)) / max(float(np.linalg.norm(chord)), 1e-300)
    bow = 0.3 * sag  # root mean square of an arc about its chord
    nearer = straight**2 - rest**2 > 0.3 * bow**2
    return arc if sag > BENT * field.size and rest < 0.4 * sag and nearer else None


def _frame(field: Field, curve, near: Array, outward: Array | None, about: Array | None, blob: bool) -> Frame:
    corners = field.points[field.corners[near]]
    flat = corners.reshape(-1, 3)
    along, corner_along = curve.along(field.middle[near]), curve.along(flat)
    if isinstance(curve, Arc):
        outward, corner_out = curve.spoke(along), curve.spoke(corner_along)
        about_each = curve.tangent(along)
    else:
        assert outward is not None and about is not None
        corner_out = np.repeat(outward, corners.shape[1], axis=0)
        about_each = np.broadcast_to(about, (len(near), 3))
    corner_across = np.einsum("ni,ni->n", flat - curve.foot(corner_along), corner_out).reshape(corners.shape[:2])
    arm = field.middle[near] - curve.foot(along)
    arm = arm - np.einsum("ni,ni->n", arm, outward)[:, None] * outward
    off = np.linalg.norm(
        arm - np.einsum("ni,ni->n", arm, curve.tangent(along))[:, None] * curve.tangent(along), axis=1
    )
    corner_along = corner_along.reshape(corners.shape[:2])
    low, high = corner_across.min(axis=1), corner_across.max(axis=1)
    return Frame(
        curve,
        near,
        along,
        # A rigid motion fitted to a triangle belongs to the row it lies in, not to its centroid.
        np.where(
            field.own[near], np.einsum("ni,ni->n", field.middle[near] - curve.foot(along), outward), (low + high) / 2
        ),
        low,
        high,
        corner_along.min(axis=1),
        corner_along.max(axis=1),
        outward,
        about_each,
        np.einsum("ni,ni->n", field.turn[near], about_each),
        off,
        blob,
    )


def _kept(frame: Frame, slack: float) -> Frame:
    """Without cells that lie above or below the strip: other walls of the part, other legs of a fold."""
    keep = frame.off <= slack + np.abs(frame.across)
    return (
        frame
        if keep.all()
        else replace(
            frame, **{f.name: getattr(frame, f.name)[keep] for f in fields(frame) if f.name not in ("curve", "blob")}
        )
    )


def _gradient(field: Field, near: Array, arm: Array, close: float) -> tuple[Array, Array]:
    """The axis about which the surroundings turn most, and the direction in which this turn grows: leading singular
    vectors of the gradient of rotation over a ball of radius ``close``."""
    inside = np.linalg.norm(arm, axis=1) <= 1.5 * close
    if inside.sum() < 4:
        inside[:] = True
    w, turn, r = field.volume[near[inside]], field.turn[near[inside]], arm[inside]
    turn, r = turn - w @ turn / w.sum(), r - w @ r / w.sum()
    square = np.einsum("n,ni,nj->ij", w, r, r)
    square += 0.05 * np.trace(square) * np.eye(3)  # nothing is known across a thin sheet
    left, _, right = np.linalg.svd(np.einsum("n,ni,nj->ij", w, turn, r) @ np.linalg.inv(square))
    return left[:, 0], right[0]


def _sides(field: Field, near: Array, arm: Array, axis: Array, close: float) -> Array:
    """(n, 3) unit vectors across a straight line, in the direction in which the rotation about it grows; at a fold of
    the sheet each side has its own."""
    distance = np.linalg.norm(arm, axis=1)
    inside = distance <= 2 * close
    if inside.sum() < 4:
        inside[:] = True
    volume = field.volume[near]
    w, s, r = volume[inside], field.turn[near[inside]] @ axis, arm[inside]
    s = s - w @ s / w.sum()
    p = (w * s) @ (r - w @ r / w.sum())
    if np.linalg.norm(p) < 1e-12 * np.sqrt((w @ s**2) * (w @ (r**2).sum(axis=1))):
        p = principal(r, w)[2][0]
    p = p / np.linalg.norm(p)
    out = np.tile(p, (len(arm), 1))
    for side, sign in ((arm @ p > 0, 1.0), (arm @ p < 0, -1.0)):
        rows = side & (distance <= 4 * close)
        if rows.sum() < 6:
            continue
        away = (volume[rows] * distance[rows]) @ arm[rows]
        away = away / np.linalg.norm(away)
        if sign * (away @ p) < np.cos(np.radians(_OWN_WAY)):
            out[side] = sign * away
    return out
