"""The magnifier disc of a true-scale picture: one place's motion along its own line, with figure and scale."""

from __future__ import annotations

from dataclasses import dataclass
from math import cos

import numpy as np

from viewer.scene.cover import Cover
from viewer.scene.figures import GAP, length
from viewer.scene.labels import LEADING, SIZE, Wish, choose_place, leader
from viewer.scene.picture import Picture
from viewer.scene.primitives import Box, Disc, Frame, Line, Point, Primitive, Ring, Text
from viewer.scene.tokens import THEMES
from viewer.scene.typeface import text_width

RADIUS = 74.0
_SWING = 51.0  # px that the amplitude takes in the disc
_BESIDE = 14.0  # between the disc and its words
_NEAR = 230.0
_TICKS = 8
_BOLD = 16.0


@dataclass(frozen=True, eq=False)
class Magnifier:
    """The disc with its place on the sheet: ``centre`` px; ``left`` tells on which side its words stand."""

    picture: Picture
    centre: Point
    left: bool
    target: Point
    along: int  # 0: the motion is drawn level, 1: upright
    sign: float  # +1 when the motion at phase 0 is toward larger x or y on the sheet

    def items(self) -> list[Primitive]:
        """All but the dot."""
        tokens, shown = THEMES[self.picture.theme], self.picture.magnified
        assert shown is not None
        x, y = self.centre
        line = leader(self.target, self.centre, RADIUS, tokens.soft, 1.2)
        items: list[Primitive] = [
            *([line] if line is not None else []),
            Disc(*self.target, 4.0, tokens.ink),
            Disc(x, y, RADIUS, tokens.band),
            Ring(x, y, RADIUS, tokens.ink, 1.6),
        ]
        items += [self._line(points, tokens.soft, 1.0) for points in _scale()]
        items += [self._line(points, tokens.ink, 1.6) for points in _swing()]
        value, unit = length(shown.amplitude).split(GAP)
        at = (x + 15, y - 8) if self.along == 1 else (x, y + 34)
        if self.along == 1:
            items += [
                Text(*at, f"±{value}", tokens.ink, SIZE, True),
                Text(at[0], y + 14, unit, tokens.ink, SIZE),
            ]
        else:
            items.append(Text(*at, f"±{value}{GAP}{unit}", tokens.ink, SIZE, True, "middle"))
        side, anchor = (x - RADIUS - _BESIDE, "right") if self.left else (x + RADIUS + _BESIDE, "left")
        return [
            *items,
            Text(side, y - 9, "magnified", tokens.ink, SIZE, True, anchor),
            Text(side, y - 9 + LEADING, shown.place, tokens.ink, SIZE, anchor=anchor),
        ]

    def dot(self, phase: float) -> Disc:
        """Where the place is at a phase."""
        x, y = self._at(0.0, self.sign * _SWING * cos(phase))
        return Disc(x, y, 6.5, THEMES[self.picture.theme].ink)

    def _at(self, across: float, along: float) -> Point:
        x, y = self.centre
        return (x - 7 + across, y + along) if self.along == 1 else (x + along, y - 8 + across)

    def _line(self, points: tuple[Point, ...], colour: str, width: float) -> Line:
        return Line(tuple(self._at(*point) for point in points), colour, width)


def _swing() -> list[tuple[Point, ...]]:
    """The line of motion with its two ends, as (across, along) px."""
    return [((0, -_SWING), (0, _SWING)), ((-11, -_SWING), (11, -_SWING)), ((-11, _SWING), (11, _SWING))]


def _scale() -> list[tuple[Point, ...]]:
    """The scale beside it, rest marked on both sides."""
    ticks = []
    for k in range(_TICKS + 1):
        along = _SWING * (2 * k / _TICKS - 1)
        long = 7.0 if k in (0, _TICKS // 2, _TICKS) else 4.0
        ticks.append(((-19.0 - long, along), (-19.0, along)))
    return [((-19.0, -_SWING), (-19.0, _SWING)), *ticks, ((-15.0, 0.0), (-5.0, 0.0)), ((5.0, 0.0), (15.0, 0.0))]


def place_magnifier(
    picture: Picture, frame: Frame, region: Box, covered: Cover, taken: list[Box], leaders: list[Line]
) -> Magnifier | None:
    """The disc where it covers least, with its words on the side away from the place it shows."""
    shown = picture.magnified
    if shown is None:
        return None
    ends = frame.project(
        np.array([shown.position, np.asarray(shown.position) + _unit(shown.direction) * 40 * frame.metres_per_pixel]),
        0,
    )
    target = (float(ends[0, 0]), float(ends[0, 1]))
    step = ends[1] - ends[0]
    along = int(abs(step[1]) >= 0.7 * abs(step[0]))
    words = max(text_width("magnified", SIZE, True), text_width(shown.place, SIZE))
    size = (2 * RADIUS + _BESIDE + words, 2 * RADIUS)
    best: tuple[float, bool, Box] | None = None
    for left in (True, False):
        hub_x = (RADIUS if not left else size[0] - RADIUS) / size[0]
        box = choose_place(Wish(size, target, 0.0, _NEAR, (hub_x, 0.5)), region, covered, taken, leaders)
        away = abs(box[0] + hub_x * size[0] - target[0])
        cost = 3.0 * float(covered.cells(np.array([box]))[0]) + away * 0.01 + (left != (box[0] < target[0])) * 5
        if best is None or cost < best[0]:
            best = (cost, left, box)
    assert best is not None
    _, left, box = best
    centre = (box[2] - RADIUS if left else box[0] + RADIUS, box[1] + RADIUS)
    found = Magnifier(picture, centre, left, target, along, 1.0 if step[along] >= 0 else -1.0)
    taken.append(box)
    line = leader(target, centre, RADIUS, "#000000")
    if line is not None:
        leaders.append(line)
    return found


def _unit(direction: np.ndarray) -> np.ndarray:
    return np.asarray(direction, float) / np.linalg.norm(direction)
