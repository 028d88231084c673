"""The sheet's primitives: flat drawing over a picture, as data that a test can measure.

All lengths are *sheet pixels*: the picture is 960 of them wide whatever its real size, x runs to the right and
y down from the top edge. Colours are ``#RRGGBB``.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from viewer.model.arrays import Array
from viewer.scene.tokens import BASE_WIDTH
from viewer.scene.typeface import ascent, descent, text_width

Point = tuple[float, float]
Box = tuple[float, float, float, float]  # left, top, right, bottom


@dataclass(frozen=True)
class Text:
    """One line of words; ``y`` is the baseline, ``x`` the point that ``anchor`` names: "left", "middle", "right"."""

    x: float
    y: float
    words: str
    colour: str
    size: float = 16.0
    bold: bool = False
    anchor: str = "left"

    @property
    def box(self) -> Box:
        """What the line occupies, ascenders and descenders of the face included."""
        width = text_width(self.words, self.size, self.bold)
        left = self.x - {"left": 0.0, "middle": 0.5, "right": 1.0}[self.anchor] * width
        return left, self.y - ascent(self.size), left + width, self.y + descent(self.size)


@dataclass(frozen=True)
class Line:
    """A polyline with butt ends. ``dash``: lengths drawn and left out by turns along the line; () is solid."""

    points: tuple[Point, ...]
    colour: str
    width: float = 1.0
    dash: tuple[float, ...] = ()

    @property
    def box(self) -> Box:
        left, top, right, foot = bounds(self.points)
        if len(self.points) > 2:  # corners may reach over on any side
            return grown((left, top, right, foot), self.width / 2)
        long = max(np.hypot(right - left, foot - top), 1e-300)
        x, y = self.width / 2 * (foot - top) / long, self.width / 2 * (right - left) / long
        return float(left - x), float(top - y), float(right + x), float(foot + y)


@dataclass(frozen=True)
class Polygon:
    """A filled convex polygon."""

    points: tuple[Point, ...]
    colour: str

    @property
    def box(self) -> Box:
        return bounds(self.points)


@dataclass(frozen=True)
class Disc:
    """A filled circle."""

    x: float
    y: float
    radius: float
    colour: str

    @property
    def box(self) -> Box:
        return bounds(((self.x, self.y),), self.radius)


@dataclass(frozen=True)
class Ring:
    """A circle's outline."""

    x: float
    y: float
    radius: float
    colour: str
    width: float = 1.0

    @property
    def box(self) -> Box:
        return bounds(((self.x, self.y),), self.radius + self.width / 2)


@dataclass(frozen=True, eq=False)
class GradientBar:
    """A horizontal bar filled from left to right with ``colours`` (n, 3) uint8."""

    x: float
    y: float
    width: float
    height: float
    colours: Array

    @property
    def box(self) -> Box:
        return self.x, self.y, self.x + self.width, self.y + self.height


Primitive = Text | Line | Polygon | Disc | Ring | GradientBar


@dataclass(frozen=True, eq=False)
class Frame:
    """Where the stage has put the bodies: what a sheet must know about cameras.

    width, height     sheet pixels of the whole picture: 960 and 960 · height ÷ width
    boxes             one viewport (left, top, right, bottom) per body; the same box twice in an overlay
    metres_per_pixel  of a sheet pixel; cameras are parallel and compared bodies share it
    project           ``(points (n, 3) in metres, body index) -> (n, 2)`` sheet pixels in the whole picture
    toward_eye        (3,) unit vector from the bodies to the eye
    """

    width: float
    height: float
    boxes: tuple[Box, ...]
    metres_per_pixel: float
    project: Callable[[Array, int], Array]
    toward_eye: Array


@dataclass(frozen=True)
class Spot:
    """A place of a sheet that stands for something: a convex outline, what it stands for (its numbers and names, as
    the chart says), and that in words."""

    outline: tuple[Point, ...]
    what: tuple[object, ...]
    words: str

    @property
    def box(self) -> Box:
        return bounds(self.outline)


@dataclass(frozen=True, eq=False)
class Sheet:
    """What is drawn over one frame: ``fixed`` is the same object at every phase, ``moving`` follows the phase;
    ``spots`` are the places that stand for something."""

    width: float
    height: float
    fixed: tuple[Primitive, ...]
    moving: tuple[Primitive, ...] = ()
    spots: tuple[Spot, ...] = ()

    @property
    def items(self) -> tuple[Primitive, ...]:
        return self.fixed + self.moving


def sheet_size(width: int, height: int) -> tuple[float, float]:
    """Size in sheet pixels of a picture of ``width`` × ``height`` real pixels."""
    return float(BASE_WIDTH), BASE_WIDTH * height / width


def bounds(points: tuple[Point, ...] | Array, margin: float = 0.0) -> Box:
    """The box around points, grown by ``margin`` on each side."""
    p = np.asarray(points, float)
    (left, top), (right, bottom) = p.min(axis=0) - margin, p.max(axis=0) + margin
    return float(left), float(top), float(right), float(bottom)


def overlap(a: Box, b: Box) -> bool:
    """Whether two boxes share an area."""
    return a[0] < b[2] and b[0] < a[2] and a[1] < b[3] and b[1] < a[3]


def grown(box: Box, margin: float) -> Box:
    """A box grown by ``margin`` on each side."""
    return box[0] - margin, box[1] - margin, box[2] + margin, box[3] + margin
