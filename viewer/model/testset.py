"""Test sets: what a hammer test measured, where and in which direction; and what was corrected in it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field, replace

import numpy as np

from viewer.model.arrays import Array, frozen

CORRECTIONS = ("flip", "swap axes", "move", "leave out")


@dataclass(frozen=True)
class Correction:
    """One thing that was wrong in a test, for all its modes. Points by their labels.

    kind   "flip": the channel of ``point`` along ``axis`` has the wrong sign
           "swap axes": the channels of ``point`` along ``axis`` and ``other_axis`` were exchanged
           "move": what is recorded at ``point`` was measured at ``other``, and the other way round where both were
                   measured; with ``other`` empty at the place ``position`` (m, in the test's own axes)
           "leave out": the channel of ``point`` along ``axis`` (all of them when empty) measured nothing usable
    axis   "x", "y", "z": the nearest axis of the test's system; "" for all channels of the point
    """

    kind: str
    point: str
    axis: str = ""
    other_axis: str = ""
    other: str = ""
    position: tuple[float, float, float] | None = None

    def __post_init__(self) -> None:
        if self.kind not in CORRECTIONS:
            raise ValueError(f"correction '{self.kind}', expected one of {CORRECTIONS}")


@dataclass(frozen=True, eq=False)
class Placement:
    """Where the test's axes lie in the mesh: x_mesh = scale · rotation · x_test + shift. Never a mirror image."""

    rotation: Array  # (3, 3), determinant +1
    shift: Array  # (3,) m
    scale: float = 1.0

    def __post_init__(self) -> None:
        object.__setattr__(self, "rotation", frozen(self.rotation, float, shape=(3, 3)))
        object.__setattr__(self, "shift", frozen(self.shift, float, shape=(3,)))

    def points(self, points: Array) -> Array:
        """(p, 3) positions in the mesh of points of the test."""
        return self.scale * (np.asarray(points, float) @ self.rotation.T) + self.shift

    def directions(self, directions: Array) -> Array:
        """(c, 3) directions in the mesh of directions of the test."""
        return np.asarray(directions, float) @ self.rotation.T


@dataclass(frozen=True, eq=False)
class TestSet:
    """Measured shapes at sensor points, in the test's own axes, SI.

    labels       names of the p points, unique ("12", "tip left")
    points       (p, 3) m
    lines        (l, 2) rows of points that a trace line joins
    sensor       (c,) row of the point that each channel sits on
    directions   (c, 3) unit vectors in which the channels measure, the test's global axes (local ones are applied)
    freq_hz      (m,) Hz, ascending
    shapes       (m, c) float64, or complex128 when any mode is complex: motion along ``directions``, of no size
    damping      (m,) damping ratios, NaN where unknown, or None
    corrections  what was already put right in the arrays above
    remarks      what reading noticed: runs merged and how, units assumed by declaration, points without a channel
    """

    name: str
    labels: tuple[str, ...]
    points: Array
    lines: Array
    sensor: Array
    directions: Array
    freq_hz: Array
    shapes: Array
    damping: Array | None = None
    source: str = ""
    corrections: tuple[Correction, ...] = ()
    remarks: tuple[str, ...] = field(default=())

    __test__ = False  # not a test case of pytest's

    def __post_init__(self) -> None:
        count, channels = len(self.freq_hz), len(self.sensor)
        dtype = np.complex128 if np.iscomplexobj(self.shapes) else np.float64
        object.__setattr__(self, "labels", tuple(self.labels))
        object.__setattr__(self, "points", frozen(self.points, float, shape=(len(self.labels), 3)))
        lines = np.asarray(self.lines, np.int64).reshape(-1, 2)
        object.__setattr__(self, "lines", frozen(lines, np.int64, shape=(None, 2)))
        object.__setattr__(self, "sensor", frozen(self.sensor, np.int64, shape=(None,)))
        object.__setattr__(self, "directions", frozen(self.directions, float, shape=(channels, 3)))
        object.__setattr__(self, "freq_hz", frozen(self.freq_hz, float, shape=(None,)))
        object.__setattr__(self, "shapes", frozen(self.shapes, dtype, shape=(count, channels)))
        if self.damping is not None:
            object.__setattr__(self, "damping", frozen(self.damping, float, shape=(count,)))
        if len(set(self.labels)) != len(self.labels):
            raise ValueError("labels of points repeat")

    @property
    def count(self) -> int:
        """Number of modes."""
        return len(self.freq_hz)

    @property
    def n_channels(self) -> int:
        return len(self.sensor)

    @property
    def is_complex(self) -> bool:
        return np.iscomplexobj(self.shapes)

    @property
    def size(self) -> float:
        """Diagonal of the box around the points, m."""
        return float(np.linalg.norm(np.ptp(self.points, axis=0)))

    def row(self, label: str) -> int:
        """Row of the point ``label``; ``KeyError`` when there is none."""
        try:
            return self.labels.index(label)
        except ValueError:
            raise KeyError(label) from None

    def channels_of(self, point: int) -> Array:
        """Rows of the channels on the point in row ``point``."""
        return np.flatnonzero(self.sensor == point)

    def channel_words(self, channel: int) -> str:
        """What a channel is called: "point 12, +X", "point 12, (0.71 0.71 0)"."""
        return f"point {self.labels[self.sensor[channel]]}, {direction_words(self.directions[channel])}"

    def motion(self, index: int) -> Array:
        """(p, 3) the measured motion of mode ``index`` (from 0) as vectors at the points, for drawing: the shortest
        vector that has the measured values along the point's channels; 0 at points without a channel."""
        out = np.zeros((len(self.points), 3), self.shapes.dtype)
        for point in np.unique(self.sensor):
            rows = self.channels_of(point)
            out[point] = np.linalg.pinv(self.directions[rows]) @ self.shapes[index, rows]
        return out

    def only(self, channels: Sequence[int] | Array) -> TestSet:
        """The set with these channels alone; points stay."""
        rows = np.asarray(channels)
        return self.with_(sensor=self.sensor[rows], directions=self.directions[rows], shapes=self.shapes[:, rows])

    def with_(self, **changes) -> TestSet:
        """A copy with some fields replaced."""
        return replace(self, **changes)


def direction_words(direction: Array) -> str:
    """ "+X", "−Z" along an axis, else the vector with two digits."""
    axis = int(np.abs(direction).argmax())
    if abs(direction[axis]) > 1 - 1e-6:
        return ("+" if direction[axis] > 0 else "−") + "XYZ"[axis]
    return "(" + " ".join(f"{v:.2g}" for v in direction) + ")"
