"""A strut on trial: a dashed bar with a flat foot at each end, over the body."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from viewer.model.arrays import Array
from viewer.scene.forms import Piece, tube
from viewer.scene.picture import Body, StrutMark

RADIUS = 0.0036  # of the bar, as a share of the diagonal
FOOT, FOOT_LENGTH = 2.8, 1.0  # radius and length of a foot, in radii of the bar
CASING = 0.7
DASH, GAP = 0.026, 0.014  # about, of the diagonal
COLOUR = "modified"
Strut = tuple[Array, Array, Sequence[str]]  # start (3,) and end (3,) m at rest, lines of its label, the first a title
_NO_LINES = np.empty((0, 2), np.int64)


def strut_marks(body: Body, struts: Sequence[Strut]) -> tuple[StrutMark, ...]:
    """Marks of struts whose ends go where the nearest drawn nodes of ``body`` go."""
    rows = body.drawn.nodes
    found = []
    for start, end, (title, *lines) in struts:
        ends = np.array([start, end], float)
        near = [rows[np.argmin(np.linalg.norm(body.mesh.points[rows] - place, axis=1))] for place in ends]
        found.append(StrutMark(title, tuple(lines), ends, body.shape[near]))
    return tuple(found)


def bars(body: Body, diagonal: float) -> list[Piece]:
    """The dashes and feet of each strut, cased."""
    found: list[Piece] = []
    for mark in body.struts:
        ends, move = np.asarray(mark.ends, float), body.factor * np.asarray(mark.motion)
        long = float(np.linalg.norm(ends[1] - ends[0]))
        if long == 0:
            continue
        parts = _parts(long, diagonal)
        for grown in (CASING * RADIUS * diagonal, 0.0):
            for start, end, radius in parts:
                profile = [(start - grown, 0.0), (start - grown, radius + grown)]
                profile += [(end + grown, radius + grown), (end + grown, 0.0)]
                points, triangles, along = tube(ends, profile)
                share = np.clip(along / long, 0.0, 1.0)[:, None]
                moved = (1 - share) * move[0] + share * move[1]
                colour = "halo" if grown else COLOUR
                found.append(
                    Piece(
                        points,
                        moved,
                        triangles,
                        _NO_LINES,
                        colour,
                        colour,
                        on_top=True,
                        shaded=False,
                        inside_out=grown > 0,
                    )
                )
    return found


def _parts(long: float, diagonal: float) -> list[tuple[float, float, float]]:
    """(start, end, radius) along the bar, m: a foot at each end, whole dashes between."""
    radius = RADIUS * diagonal
    foot = min(FOOT_LENGTH * radius, long / 4)
    dash, gap = DASH * diagonal, GAP * diagonal
    count = max(round((long + gap) / (dash + gap)), 1)
    stretch = long / (count * dash + (count - 1) * gap)
    step = stretch * (dash + gap)
    found = [(k * step, k * step + stretch * dash, radius) for k in range(count)]
    return [*found, (0.0, foot, FOOT * radius), (long - foot, long, FOOT * radius)]
