"""What was wrong in a test, put right: pure, for all modes at once, and recorded in the test."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
from scipy.optimize import linear_sum_assignment

from viewer.errors import InputError
from viewer.model.arrays import Array
from viewer.model.testset import Correction, TestSet, direction_words

_DONE = {"flip": "sign flipped", "swap axes": "axes exchanged", "move": "in the wrong place", "leave out": "left out"}


def apply_corrections(test: TestSet, corrections: Iterable[Correction]) -> TestSet:
    """The test with the corrections made in their order and noted in ``test.corrections``.

    A flip turns the sign of readings; "swap axes" exchanges the readings of two channels of one point; "move" with
    ``other`` exchanges the readings of two points (:func:`exchanged`), with ``position`` it moves the point; what is
    left out loses its channels, the point stays. Raises ``InputError`` for points and axes that the test has not.
    """
    made = tuple(corrections)
    for correction in made:
        test = _MAKE[correction.kind](test, correction)
    return test.with_(corrections=(*test.corrections, *made))


def correction_words(correction: Correction, test: TestSet | None = None) -> str:
    """ "point 12, +X: sign flipped"; without the test the axis is named without its sign."""
    who = f"point {correction.point}"
    named = [axis for axis in (correction.axis, correction.other_axis) if axis]
    if correction.kind != "move" and named:
        who += ", " + " and ".join(_axis_words(correction.point, axis, test) for axis in named)
    what = _DONE[correction.kind]
    if correction.kind == "move" and correction.other:
        return f"points {correction.point} and {correction.other}: readings exchanged"
    return f"{who}: {what}"


def fault_words(correction: Correction, test: TestSet | None = None) -> str:
    """What is wrong, where a correction is proposed: as :func:`correction_words`, but "reads nothing" for what is to
    be left out."""
    return correction_words(correction, test).replace(_DONE["leave out"], "reads nothing")


def exchanged(test: TestSet, one: int, two: int) -> tuple[Array, Array]:
    """(n,) and (n,) channels of the points in rows ``one`` and ``two`` that answer to one another, by the least angle
    between their directions: these exchange readings when the points do. The rest of the longer list has no
    counterpart and goes to the other point with its direction."""
    first, second = test.channels_of(one), test.channels_of(two)
    cosine = np.abs(test.directions[first] @ test.directions[second].T)
    rows, columns = linear_sum_assignment(-cosine)
    return first[rows], second[columns]


def axis_of(test: TestSet, channel: int) -> str:
    """ "x", "y" or "z": the axis of the test's system nearest to a channel's direction."""
    return "xyz"[int(np.abs(test.directions[channel]).argmax())]


def _axis_words(point: str, axis: str, test: TestSet | None) -> str:
    if test is None:
        return axis.upper()
    return " and ".join(direction_words(test.directions[c]) for c in _channels(test, point, axis))


def _flip(test: TestSet, correction: Correction) -> TestSet:
    rows = _channels(test, correction.point, correction.axis)
    shapes = test.shapes.copy()
    shapes[:, rows] *= -1
    return test.with_(shapes=shapes)


def _swap_axes(test: TestSet, correction: Correction) -> TestSet:
    rows = [_only(test, correction.point, axis) for axis in (correction.axis, correction.other_axis)]
    if rows[0] == rows[1]:
        raise InputError(
            f"point {correction.point}: an axis cannot be exchanged with itself",
            place=f"test '{test.name}'",
            found=f"'{correction.axis}' and '{correction.other_axis}'",
            expected="two different axes",
        )
    shapes = test.shapes.copy()
    shapes[:, rows] = test.shapes[:, rows[::-1]]
    return test.with_(shapes=shapes)


def _move(test: TestSet, correction: Correction) -> TestSet:
    row = _point(test, correction.point)
    if not correction.other:
        place = np.asarray(correction.position if correction.position is not None else (), float)
        if place.shape != (3,) or not np.isfinite(place).all():
            raise InputError(
                f"point {correction.point}: it is not said where its readings were measured",
                place=f"test '{test.name}'",
                found=f"position {correction.position}",
                expected="another point, or a position of three numbers",
            )
        points = test.points.copy()
        points[row] = place
        return test.with_(points=points)
    other = _point(test, correction.other)
    if other == row:
        raise InputError(
            f"point {correction.point} cannot be exchanged with itself",
            place=f"test '{test.name}'",
            do="name two different points",
        )
    first, second = exchanged(test, row, other)
    shapes, sensor = test.shapes.copy(), test.sensor.copy()
    shapes[:, first], shapes[:, second] = test.shapes[:, second], test.shapes[:, first]
    sensor[np.setdiff1d(test.channels_of(row), first)] = other
    sensor[np.setdiff1d(test.channels_of(other), second)] = row
    return test.with_(shapes=shapes, sensor=sensor)


def _leave_out(test: TestSet, correction: Correction) -> TestSet:
    rows = _channels(test, correction.point, correction.axis)
    return test.only(np.setdiff1d(np.arange(test.n_channels), rows))


_MAKE = {"flip": _flip, "swap axes": _swap_axes, "move": _move, "leave out": _leave_out}


def _point(test: TestSet, label: str) -> int:
    try:
        return test.row(label)
    except KeyError:
        some = ", ".join(test.labels[:12]) + (", …" if len(test.labels) > 12 else "")
        raise InputError(
            f"a correction names point {label or '(none)'}, which the test has not",
            place=f"test '{test.name}'",
            expected=f"one of: {some}",
            do="correct the point's name in the dossier",
        ) from None


def _channels(test: TestSet, label: str, axis: str) -> Array:
    """Rows of the channels of a point along an axis, all of them for ""; never none."""
    rows = test.channels_of(_point(test, label))
    there = [axis_of(test, c) for c in rows]
    if axis:
        rows = rows[[a == axis for a in there]]
    if not len(rows):
        raise InputError(
            f"a correction names point {label}" + (f" along '{axis}'" if axis else "") + ", which was not measured",
            place=f"test '{test.name}'",
            found=f"channels along {', '.join(there)}" if there else "no channel on this point",
            expected="x, y or z as measured, or no axis for all channels of the point",
            do="correct the axis in the dossier",
        )
    return rows


def _only(test: TestSet, label: str, axis: str) -> int:
    """The one channel of a point along an axis."""
    rows = _channels(test, label, axis)
    if len(rows) > 1:
        raise InputError(
            f"point {label} has {len(rows)} channels along '{axis or 'every axis'}'",
            place=f"test '{test.name}'",
            expected="one channel along each of the two axes to be exchanged",
            do="name both axes, or correct the test's file",
        )
    return int(rows[0])


__all__ = ["apply_corrections", "axis_of", "correction_words", "exchanged", "fault_words"]
