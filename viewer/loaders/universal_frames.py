"""Coordinate systems of universal files: data sets 18 and 2420."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from viewer.loaders.universal_text import Records
from viewer.model.arrays import Array, frozen

KINDS_OF_FRAME = ("cartesian", "cylindrical", "spherical")
_STRAIGHT = 1e-3  # six digits are written of the numbers that give the axes


@dataclass(frozen=True, eq=False)
class Frame:
    """A coordinate system: ``origin`` (3,) and ``axes`` (3, 3), rows the unit vectors x, y, z, in the part's system.

    Curvilinear coordinates are r, θ, z and r, θ, φ (θ from the x axis about z, φ from the z axis), angles in degrees:
    from memory, the data set's description does not say.
    """

    label: int
    kind: str
    name: str
    origin: Array
    axes: Array

    def __post_init__(self) -> None:
        object.__setattr__(self, "origin", frozen(self.origin, float, shape=(3,)))
        object.__setattr__(self, "axes", frozen(self.axes, float, shape=(3, 3)))

    def to_part(self, coordinates: Array) -> Array:
        """(n, 3) points in the part's system of ``coordinates`` (n, 3) in this one."""
        return self.origin + self._straight(np.asarray(coordinates, float)) @ self.axes

    def directions(self, points: Array) -> Array:
        """(n, 3, 3) unit vectors, one a row, in which the first, second and third coordinate grow at ``points``
        (n, 3): all in the part's system."""
        if self.kind == "cartesian":
            return np.broadcast_to(self.axes, (len(points), 3, 3))
        local = (np.asarray(points, float) - self.origin) @ self.axes.T
        flat = np.hypot(local[:, 0], local[:, 1])
        turn, tilt = np.arctan2(local[:, 1], local[:, 0]), np.arctan2(flat, local[:, 2])
        zero, one = np.zeros(len(points)), np.ones(len(points))
        out = np.stack([np.cos(turn), np.sin(turn), zero], axis=-1)
        around = np.stack([-np.sin(turn), np.cos(turn), zero], axis=-1)
        up = np.stack([zero, zero, one], axis=-1)
        if self.kind == "cylindrical":
            return np.stack([out, around, up], axis=1) @ self.axes
        sine, cosine = np.sin(tilt)[:, None], np.cos(tilt)[:, None]
        return np.stack([sine * out + cosine * up, around, cosine * out - sine * up], axis=1) @ self.axes

    def _straight(self, given: Array) -> Array:
        if self.kind == "cartesian":
            return given
        r, turn, third = given[:, 0], np.radians(given[:, 1]), given[:, 2]
        if self.kind == "cylindrical":
            return np.column_stack([r * np.cos(turn), r * np.sin(turn), third])
        tilt = np.radians(third)
        return np.column_stack([r * np.sin(tilt) * np.cos(turn), r * np.sin(tilt) * np.sin(turn), r * np.cos(tilt)])


PART = Frame(0, "cartesian", "part", np.zeros(3), np.eye(3))


def frames_18(records: Records, known: Mapping[int, Frame]) -> list[Frame]:
    """Data set 18: origin, a point on the x axis and one on the xz plane, given in a reference system."""
    found: dict[int, Frame] = {}
    while records:
        label, kind, reference, _, method = records.whole((10,) * 5, "a coordinate system")
        row = records.at - 1
        if method not in (0, 1):
            raise records.error(
                f"coordinate system {label} is defined in a way that is not understood",
                row,
                found=f"method {method}",
                expected="1, by origin, x axis and xz plane",
            )
        name = records.text("a coordinate system")
        points = np.reshape(records.reals(9, "a coordinate system"), (3, 3))
        if reference == 0:
            base = PART
        elif reference in found or reference in known:
            base = found.get(reference) or known[reference]
        elif reference == 1:
            base = PART
        else:
            raise records.error(
                f"coordinate system {label} refers to system {reference}, which stands nowhere before it",
                row,
                do="export all coordinate systems",
            )
        origin, on_x, on_xz = base.to_part(points)
        found[label] = Frame(label, _kind(records, kind, row), name, origin, _axes(records, origin, on_x, on_xz, row))
    return list(found.values())


def frames_2420(records: Records) -> list[Frame]:
    """Data set 2420: rows 1 to 3 of the matrix are the axes, row 4 the origin (a row [x y z 1] times the matrix is
    the point in the part's system; common practice, the description does not say)."""
    records.take(2, "the name of the part")
    found = []
    while records:
        label, kind, _ = records.whole((10,) * 3, "a coordinate system")
        row = records.at - 1
        name = records.text("a coordinate system")
        matrix = records.numbers(records.take(4, "a coordinate system"), (25,) * 3)
        axes = matrix[:3]
        if not np.isfinite(matrix).all() or np.abs(axes @ axes.T - np.eye(3)).max() > _STRAIGHT:
            raise records.error(
                f"the axes of coordinate system {label} are not of unit length and at right angles",
                row + 2,
                found=str(np.round(axes, 4).tolist()),
            )
        found.append(Frame(label, _kind(records, kind, row), name, matrix[3], axes))
    return found


def _kind(records: Records, number: int, row: int) -> str:
    if not 0 <= number < len(KINDS_OF_FRAME):
        raise records.error(
            "unknown kind of coordinate system",
            row,
            found=str(number),
            expected="0 cartesian, 1 cylindrical, 2 spherical",
        )
    return KINDS_OF_FRAME[number]


def _axes(records: Records, origin: Array, on_x: Array, on_xz: Array, row: int) -> Array:
    x, to_xz = on_x - origin, on_xz - origin
    y = np.cross(to_xz, x)
    if not np.linalg.norm(y) > 1e-9 * np.linalg.norm(x) * np.linalg.norm(to_xz) > 0:
        raise records.error(
            "the points of a coordinate system lie on one line",
            row,
            found=str([origin.tolist(), on_x.tolist(), on_xz.tolist()]),
        )
    x, y = x / np.linalg.norm(x), y / np.linalg.norm(y)
    return np.array([x, y, np.cross(x, y)])
