"""Flat primitives as coloured triangles, so that line widths, dashes and circles look the same on every driver."""

from __future__ import annotations

from collections.abc import Iterable
from itertools import pairwise

import numpy as np

from viewer.model.arrays import Array
from viewer.scene.primitives import Disc, GradientBar, Line, Polygon, Primitive, Ring
from viewer.scene.tokens import rgb

_SIDES = 64  # of a circle


def triangulate(items: Iterable[Primitive], least_width: float = 0.0) -> tuple[Array, Array, Array]:
    """Points (n, 2), triangles (t, 3) and their colours (t, 3) uint8 of everything but texts, in drawing order.

    least_width  no line is drawn thinner, sheet px: one real pixel, where nothing smooths edges
    """
    points: list[Array] = []
    triangles: list[Array] = []
    colours: list[Array] = []
    count = 0
    for item in items:
        for outline, colour in _shapes(item, least_width):
            fan = np.arange(1, len(outline) - 1)
            triangles.append(count + np.stack([np.zeros_like(fan), fan, fan + 1], axis=1))
            colours.append(np.broadcast_to(colour, (len(fan), 3)))
            points.append(outline)
            count += len(outline)
    if not points:
        return np.empty((0, 2)), np.empty((0, 3), np.int64), np.empty((0, 3), np.uint8)
    return np.concatenate(points), np.concatenate(triangles), np.concatenate(colours)


def _shapes(item: Primitive, least_width: float) -> Iterable[tuple[Array, Array]]:
    """Convex outlines (n, 2) with their colours."""
    if isinstance(item, Polygon):
        yield np.asarray(item.points, float), _colour(item.colour)
    elif isinstance(item, Disc):
        yield _circle(item.x, item.y, item.radius), _colour(item.colour)
    elif isinstance(item, Ring):
        width = max(item.width, least_width)
        outer = _circle(item.x, item.y, item.radius + width / 2)
        inner = _circle(item.x, item.y, item.radius - width / 2)
        for a, b in zip(range(_SIDES), (*range(1, _SIDES), 0), strict=True):
            yield np.array([outer[a], outer[b], inner[b], inner[a]]), _colour(item.colour)
    elif isinstance(item, Line):
        for quad in line_quads(item, least_width):
            yield quad, _colour(item.colour)
    elif isinstance(item, GradientBar):
        edges = item.x + np.linspace(0, item.width, len(item.colours) + 1)
        top, foot = item.y, item.y + item.height
        for left, right, colour in zip(edges[:-1], edges[1:], item.colours, strict=True):
            yield np.array([[left, top], [right, top], [right, foot], [left, foot]]), colour


def line_quads(line: Line, least_width: float = 0.0) -> list[Array]:
    """The rectangles (4, 2) of a line: one for each segment, or for each part of a segment that a dash covers.
    Solid segments reach half a width over inner corners, so that corners are closed."""
    half = max(line.width, least_width) / 2
    corners = np.asarray(line.points, float)
    closed = len(corners) > 2 and np.allclose(corners[0], corners[-1])
    quads = []
    run = 0.0  # length along the line so far
    for k, (a, b) in enumerate(pairwise(corners)):
        long = float(np.hypot(*(b - a)))
        if long == 0:
            continue
        along = (b - a) / long
        across = half * np.array([-along[1], along[0]])
        first, last = k == 0 and not closed, k == len(corners) - 2 and not closed
        solid = [(0.0 if first else -half, long if last else long + half)]
        parts = _dashes(line, run, long) if line.dash else solid
        for begin, end in parts:
            p, q = a + begin * along, a + end * along
            quads.append(np.array([p + across, q + across, q - across, p - across]))
        run += long
    return quads


def _dashes(line: Line, run: float, long: float) -> list[tuple[float, float]]:
    """Covered parts of a segment of length ``long`` that begins ``run`` px along the line."""
    pattern = np.asarray(line.dash * (2 if len(line.dash) % 2 else 1), float)
    period = float(pattern.sum())
    stops = np.concatenate([[0.0], np.cumsum(pattern)])
    parts = []
    for turn in range(int(run // period), int((run + long) // period) + 1):
        for begin, end in zip(stops[:-1:2], stops[1::2], strict=True):
            low, high = max(turn * period + begin - run, 0.0), min(turn * period + end - run, long)
            if high - low > 1e-9:
                parts.append((low, high))
    return parts


def _circle(x: float, y: float, radius: float) -> Array:
    angle = np.linspace(0, 2 * np.pi, _SIDES + 1)[:-1]
    return np.stack([x + radius * np.cos(angle), y + radius * np.sin(angle)], axis=1)


def _colour(colour: str) -> Array:
    return np.round(np.array(rgb(colour)) * 255).astype(np.uint8)
