"""How the two sides of a band turn: next to its edges, away from them, and from place to place along it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from viewer.insight.hinges.field import Field
from viewer.insight.hinges.frame import Frame
from viewer.model.arrays import Array

_SEGMENTS = 9
_FAR = 4.0  # windows over which a side's variation is taken


@dataclass(frozen=True, eq=False)
class Side:
    """One side of a band.

    edge, slope  (3,) rotation next to the band and its growth per m away from it
    variation    rad, root mean square of the rotation about its mean, over the surroundings
    cells        rows of the cells next to the band; ``ground``: there are none, the clamp is at the edge
    """

    edge: Array
    slope: Array
    variation: float
    cells: Array
    ground: bool = False


GROUND = Side(np.zeros(3), np.zeros(3), 0.0, np.empty(0, np.int64), True)


def side_of(field: Field, frame: Frame, rows: Array, away: Array, window: float) -> Side | None:
    """The side made of the cells ``rows`` (flags), ``away`` m from the edge: a straight line through the rotations
    within ``window``. None when there is nothing."""
    close = rows & (away <= window)
    w = field.volume[frame.near[close]]
    if w.sum() <= 0:
        return None
    x, turn = away[close], field.turn[frame.near[close]]
    mean, centre = w @ turn / w.sum(), w @ x / w.sum()
    # Rotation grows along the line, too (twist): both slopes are fitted, or cells of a skew mesh mix them up.
    places = np.stack([x - centre, frame.along[close] - w @ frame.along[close] / w.sum()], axis=1)
    square = np.einsum("n,ni,nj->ij", w, places, places)
    slope = np.zeros(3)
    if square[0, 0] > 1e-3 * w.sum() * window**2:
        slopes = np.linalg.pinv(square, rcond=1e-6, hermitian=True) @ ((w[:, None] * places).T @ (turn - mean))
        slope = slopes[0]
    far = rows & (away <= _FAR * window)
    wide, turns = field.volume[frame.near[far]], field.turn[frame.near[far]]
    spread = wide @ ((turns - wide @ turns / wide.sum()) ** 2).sum(axis=1) / wide.sum()
    return Side(mean - slope * centre, slope, float(np.sqrt(spread)), frame.near[close])


def local_turns(
    field: Field, frame: Frame, ends: tuple[float, float], edges: tuple[float, float], sides, window: float
) -> Array:
    """(k,) turn from place to place along the line, extrapolated to the edges by the slope of each side."""
    count, long = _SEGMENTS, ends[1] - ends[0]
    if frame.blob or long < 2 * (edges[1] - edges[0]):
        count, long = 1, max(long, 1e-9 * field.size)
    index = np.clip(np.floor((frame.along - ends[0]) / long * count), -1, count).astype(int)
    if count == 1:
        slack = 1e-9 * field.size
        index = np.where((frame.along_high > ends[0] - slack) & (frame.along_low < ends[1] + slack), 0, -1)
    good = np.ones(count, bool)
    values = []
    for sign, edge, side in ((-1, edges[0], sides[0]), (1, edges[1], sides[1])):
        if side.ground:
            values.append(np.zeros(count))
            continue
        away = sign * (frame.across - edge)
        rows = (away > 0) & (away <= window) & (index >= 0) & (index < count)
        slope = np.einsum("ni,i->n", frame.about[rows], side.slope)
        w = field.volume[frame.near[rows]]
        amount = np.bincount(index[rows], w, minlength=count)
        total = np.bincount(index[rows], w * (frame.spin[rows] - slope * away[rows]), minlength=count)
        good &= amount > 0
        values.append(np.divide(total, amount, out=np.zeros(count), where=amount > 0))
    theta = (values[1] - values[0])[good]
    return theta if len(theta) else np.zeros(1)
