"""One candidate looked at closely: its centre line, edges, and how the two sides turn."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from viewer.insight.hinges.curve import Arc, Line, fit_arc, principal
from viewer.insight.hinges.field import Field
from viewer.insight.hinges.profile import edges_of, profile
from viewer.model.arrays import Array

BENT = 0.02  # of the size: a centre line that misses its chord by more is a curve
JOINT = 1.6  # elongation below which a band has no line
_SEGMENTS = 9


@dataclass(frozen=True, eq=False)
class Side:
    """One side next to the band: rotation (3,) extrapolated to the edge, slope (3,) rad/m away from it, variation
    (rad, root mean square), cells near; ``ground``: there is none, the clamp is at the edge."""

    edge: Array
    slope: Array
    variation: float
    cells: Array
    ground: bool = False


@dataclass(frozen=True, eq=False)
class Draft:
    """A candidate measured.

    curve; ends (2,) m along it; edges (2,) m across; across (3,) unit vector from side A to B at the middle
    cells      rows of the band; near: rows of the surroundings looked at
    fold       (3,) mean rotation of B relative to A at the edges; bend: root mean square of it along the line
    even       share of the squared turn that is the mean turn; aligned: |fold along the line| / |fold|
    steep      q: slope of the rotation in the band over the larger slope beside it
    step       density of the band over that of the denser of the two strips of the same width beside it
    """

    curve: Line | Arc
    ends: tuple[float, float]
    edges: tuple[float, float]
    across: Array
    cells: Array
    near: Array
    sides: tuple[Side, Side]
    position: Array
    direction: Array
    fold: Array
    bend: float
    even: float
    aligned: float
    steep: float
    turn_share: float
    contrast: float
    strain: float
    volume: float
    filled: float
    step: float

    @property
    def length(self) -> float:
        return self.ends[1] - self.ends[0]

    @property
    def width(self) -> float:
        return self.edges[1] - self.edges[0]


def examine(field: Field, cells: Array, rounds: int = 2) -> Draft | None:
    """Measure the candidate ``cells``; None when it is no band between two sides."""
    draft = None
    for _ in range(rounds):
        draft = _examined(field, cells)
        if draft is None or np.array_equal(draft.cells, cells):
            break
        cells = draft.cells
    return draft


def _examined(field: Field, cells: Array) -> Draft | None:
    weight = field.strain[cells]
    if len(cells) == 0 or weight.sum() <= 0:
        return None
    centre, _, directions = principal(field.middle[cells], weight)
    corners = field.points[field.corners[cells]].reshape(-1, 3)
    spans = [np.ptp((corners - centre) @ d) for d in directions]
    grain = field.largest_cell(cells)
    reach = max(0.5 * spans[0], 2.0 * spans[1], 4 * grain)
    near = _surroundings(field, cells, corners, reach)
    curve, axis = _centre_line(field, cells, near, centre, directions, spans, grain)
    frame = _Frame(field, curve, near, max(spans[1], 2 * grain) if isinstance(curve, Line) else 3 * grain, axis)
    return _measured(field, cells, near, frame, grain)


def _surroundings(field: Field, cells: Array, corners: Array, reach: float) -> Array:
    """Rows of cells within ``reach`` that hang together with the candidate."""
    low, high = corners.min(axis=0) - reach, corners.max(axis=0) + reach
    rows = np.nonzero(((field.middle >= low) & (field.middle <= high)).all(axis=1) & (field.volume > 0))[0]
    piece = field.pieces(rows)
    member = np.zeros(piece.max(initial=0) + 1, bool)
    member[piece[np.searchsorted(rows, cells[field.volume[cells] > 0])]] = True
    return rows[member[piece]]


def _centre_line(field, cells, near, centre, directions, spans, grain):
    """The curve through the candidate and the direction about which its surroundings turn most."""
    weight = field.strain[cells]
    points = field.middle[cells]
    close = near[
        np.linalg.norm(np.cross(field.middle[near] - centre, directions[0]), axis=1) <= max(spans[1], 3 * grain)
    ]
    _, _, turning = principal(field.turn[close], field.volume[close])
    axis = turning[0]
    elongated = spans[0] > 2.5 * spans[1]
    arc = fit_arc(points, weight) if len(cells) > 8 and spans[0] > 0.06 * field.size else None
    if arc is not None:
        along = arc.along(points)
        rest = np.average(((points - arc.foot(along)) ** 2).sum(axis=1), weights=weight) ** 0.5
        line_rest = principal(points, weight)[1][1]
        ends = arc.foot(np.array([along.min(), along.mean(), along.max()]))
        chord = ends[2] - ends[0]
        sag = np.linalg.norm(np.cross(ends[1] - ends[0], chord)) / max(np.linalg.norm(chord), 1e-300)
        if sag > BENT * field.size and rest < 0.4 * line_rest:
            return arc, axis
    if elongated:
        return Line(centre, directions[0]), axis
    return Line(centre, axis), axis


class _Frame:
    """Coordinates along and across the centre line, and rotation about it, of the cells ``near``."""

    def __init__(self, field: Field, curve: Line | Arc, near: Array, close: float, axis: Array) -> None:
        self.curve = curve
        middle = field.middle[near]
        self.along = curve.along(middle)
        self.tangent = curve.tangent(self.along)
        self.spin = np.einsum("ni,ni->n", field.turn[near], self.tangent)
        self.arm = self._arms(middle)
        volume = field.volume[near]
        if isinstance(curve, Arc):
            self.outward = self._spokes(self.along)
        else:
            self.outward = self._split(volume, close)
        corners = field.points[field.corners[near]]
        flat = corners.reshape(-1, 3)
        arms = self._arms(flat).reshape(corners.shape)
        out = (
            self.outward[:, None]
            if isinstance(curve, Line)
            else self._spokes(curve.along(flat)).reshape(corners.shape)
        )
        self.corner_across = (arms * out).sum(axis=2)
        self.low, self.high = self.corner_across.min(axis=1), self.corner_across.max(axis=1)
        self.across = np.einsum("ni,ni->n", self.arm, self.outward)
        corner_along = curve.along(flat).reshape(corners.shape[:2])
        self.along_low, self.along_high = corner_along.min(axis=1), corner_along.max(axis=1)

    def _arms(self, points: Array) -> Array:
        along = self.curve.along(points)
        arm = points - self.curve.foot(along)
        tangent = self.curve.tangent(along)
        return arm - np.einsum("ni,ni->n", arm, tangent)[:, None] * tangent

    def _spokes(self, along: Array) -> Array:
        assert isinstance(self.curve, Arc)
        angle = np.asarray(along) / self.curve.mean
        return np.cos(angle)[:, None] * self.curve.first + np.sin(angle)[:, None] * self.curve.second

    def _split(self, volume: Array, close: float) -> Array:
        """(n, 3) unit vectors across the band in the direction in which the rotation grows; at a fold of the sheet
        each side has its own."""
        inside = np.linalg.norm(self.arm, axis=1) <= 2 * close
        if inside.sum() < 4:
            inside[:] = True
        w, s, r = volume[inside], self.spin[inside], self.arm[inside]
        s = s - w @ s / w.sum()
        p = (w * s) @ (r - w @ r / w.sum())
        if np.linalg.norm(p) < 1e-12 * np.sqrt((w @ s**2) * (w @ (r**2).sum(axis=1))):
            p = principal(r, w)[2][0]
        p = p / np.linalg.norm(p)
        out = np.tile(p, (len(self.arm), 1))
        positive = self.arm @ p > 0
        for side, sign in ((positive, 1.0), (~positive, -1.0)):
            rows = side & (np.abs(self.arm @ p) > 0) & (np.linalg.norm(self.arm, axis=1) <= 4 * close)
            if rows.sum() < 6:
                continue
            along = (volume[rows] * np.linalg.norm(self.arm[rows], axis=1)) @ self.arm[rows]
            along = along / np.linalg.norm(along)
            if along @ p * sign < np.cos(np.radians(20)):  # a fold: the side goes its own way
                out[side] = sign * along
        return out


def _measured(field: Field, cells: Array, near: Array, frame: _Frame, grain: float) -> Draft | None:
    strain, volume = field.strain[near], field.volume[near]
    mine = np.isin(near, cells)
    if not mine.any():
        return None
    lo, hi = float(frame.along_low[mine].min()), float(frame.along_high[mine].max())
    w0 = float(np.ptp(np.concatenate([frame.low[mine], frame.high[mine]])))
    found = None
    within = _within(frame, lo, hi)
    middle = float(np.average(frame.across[mine], weights=strain[mine] + 1e-300))
    for width in (w0, None):
        if width is None:
            width = found[1] - found[0]
            middle = (found[0] + found[1]) / 2
        half = max(2.0 * width, 5 * grain)
        span = (middle - half, middle + half)
        use = within & (frame.high > span[0]) & (frame.low < span[1])
        shape = profile(frame.low[use], frame.high[use], strain[use], volume[use], span)
        found = edges_of(shape)
        if found is None:
            return None
    d1, d2, filled = found
    width = d2 - d1
    inside = (frame.across > d1) & (frame.across < d2)
    lo, hi = _stretched(frame, strain, volume, inside, (d1, d2), (lo, hi), grain)
    within = _within(frame, lo, hi)
    band = inside & within
    if not band.any():
        return None
    window = max(1.5 * width, 3 * grain)
    sides = []
    for sign, edge in ((-1, d1), (1, d2)):
        away = sign * (frame.across - edge)
        side = _side(field, near, frame, within & (away > 0), away, window)
        if side is None:
            touches = field.clamped[near[band]].any()
            if not touches:
                return None
            side = Side(np.zeros(3), np.zeros(3), 0.0, np.empty(0, np.int64), True)
        sides.append(side)
    return _draft(field, near, frame, band, (lo, hi), (d1, d2), tuple(sides), window, filled)


def _within(frame: _Frame, low: float, high: float) -> Array:
    """Which cells lie between two places along the line, ends included: a joint may have no length."""
    slack = 1e-9 * (high - low) + 1e-12
    return (frame.along > low - slack) & (frame.along < high + slack)


def _stretched(frame, strain, volume, inside, edges, ends, grain):
    """The band's ends moved outwards along the line as long as the strip stays denser than what is beside it."""
    step = max(2 * grain, 0.03 * (ends[1] - ends[0]))
    width = edges[1] - edges[0]
    beside = ~inside & (frame.across > edges[0] - 1.5 * width - 2 * grain)
    beside &= frame.across < edges[1] + 1.5 * width + 2 * grain
    out = []
    for sign, end in ((-1, ends[0]), (1, ends[1])):
        away = sign * (frame.along - end)
        index = np.floor(away / step).astype(int)
        count = int(index.max(initial=0)) + 1
        pick = (away > 0) & inside
        other = (away > 0) & beside
        parts = [
            np.bincount(index[rows], values[rows], minlength=count)
            for rows in (pick, other)
            for values in (strain, volume)
        ]
        tall, low = (e / np.maximum(v, 1e-300) for e, v in (parts[:2], parts[2:]))
        dense = (tall > 2.5 * low) & (np.bincount(index[pick], minlength=count) > 0)
        stop, gap = 0, 0
        for i in range(count):
            if dense[i]:
                stop, gap = i + 1, 0
            elif (gap := gap + 1) > 2:
                break
        rows = pick & (index < stop)
        reach = frame.along_high[rows].max() if sign > 0 and rows.any() else end
        reach = frame.along_low[rows].min() if sign < 0 and rows.any() else reach
        out.append(float(reach))
    return out[0], out[1]


def _side(field, near, frame, rows, away, window) -> Side | None:
    """Rotation next to an edge: a straight line through the cells within ``window``."""
    close = rows & (away <= window)
    if close.sum() == 0 or field.volume[near[close]].sum() == 0:
        return None
    w, x, turn = field.volume[near[close]], away[close], field.turn[near[close]]
    mean, centre = w @ turn / w.sum(), w @ x / w.sum()
    square = w @ (x - centre) ** 2
    slope = (w * (x - centre)) @ (turn - mean) / square if square > 1e-12 * w.sum() * window**2 else np.zeros(3)
    edge = mean - slope * centre
    far = rows & (away <= 4 * window)
    wide, all_turn = field.volume[near[far]], field.turn[near[far]]
    typical = wide @ all_turn / wide.sum()
    variation = float(np.sqrt(wide @ ((all_turn - typical) ** 2).sum(axis=1) / wide.sum()))
    return Side(edge, slope, variation, near[close])


def _draft(field, near, frame, band, ends, edges, sides, window, filled) -> Draft | None:
    cells = near[band]
    width = edges[1] - edges[0]
    fold = sides[1].edge - sides[0].edge
    weight = field.strain[cells]
    strain, volume = float(weight.sum()), float(field.volume[cells].sum())
    if strain <= 0 or width <= 0:
        return None
    theta = _local_turns(field, near, frame, ends, edges, sides, window)
    bend = float(np.sqrt(np.mean(theta**2)))
    if bend <= 0:
        return None
    even = float(np.mean(theta) ** 2 / max(np.mean(theta**2), 1e-300))
    position = weight @ field.middle[cells] / strain
    if isinstance(frame.curve, Line):
        tangent = frame.curve.axis
    else:
        tangent = frame.curve.tangent(np.array([sum(ends) / 2]))[0]
    aligned = float(abs(fold @ tangent) / max(np.linalg.norm(fold), 1e-300))
    middle = np.argmin(np.abs(frame.along - sum(ends) / 2) + np.abs(frame.across - edges[1]))
    slopes = [abs(float(side.slope @ tangent)) for side in sides]
    rest = np.setdiff1d(near, cells)
    beside = field.strain[rest].sum() / max(field.volume[rest].sum(), 1e-300)
    return Draft(
        curve=frame.curve,
        ends=ends,
        edges=edges,
        across=frame.outward[middle],
        cells=cells,
        near=near,
        sides=sides,
        position=position,
        direction=tangent,
        fold=fold,
        bend=bend,
        even=even,
        aligned=aligned,
        steep=bend / width / max(*slopes, 1e-12 * bend / width),
        turn_share=bend / (bend + sides[0].variation + sides[1].variation),
        contrast=strain / volume / max(beside, 1e-300),
        strain=strain,
        volume=volume / field.volume.sum(),
        filled=filled,
        step=strain / volume / max(*(_strip(field, near, frame, ends, edges, sign) for sign in (-1, 1)), 1e-300),
    )


def _strip(field, near, frame, ends, edges, sign) -> float:
    """Energy density of the strip next to an edge, as wide as the band."""
    edge, width = edges[(sign + 1) // 2], edges[1] - edges[0]
    away = sign * (frame.across - edge)
    away_low = np.minimum(sign * (frame.low - edge), sign * (frame.high - edge))
    rows = _within(frame, *ends) & (away > 0) & (away_low < width)
    volume = field.volume[near[rows]].sum()
    return float(field.strain[near[rows]].sum() / volume) if volume > 0 else 0.0


def _local_turns(field, near, frame, ends, edges, sides, window) -> Array:
    """(k,) turn about the line from place to place along it, extrapolated to the edges by the slope of each side."""
    count, long = _SEGMENTS, ends[1] - ends[0]
    if long < JOINT * (edges[1] - edges[0]):
        count, long = 1, max(long, 1e-12 * field.size)
    index = np.floor((frame.along - ends[0]) / long * count).astype(int)
    good = np.ones(count, bool)
    values = []
    for sign, edge, side in ((-1, edges[0], sides[0]), (1, edges[1], sides[1])):
        if side.ground:
            values.append(np.zeros(count))
            continue
        away = sign * (frame.across - edge)
        rows = (away > 0) & (away <= window) & (index >= 0) & (index < count)
        slope = np.einsum("ni,i->n", frame.tangent[rows], side.slope)
        w = field.volume[near[rows]]
        amount = np.bincount(index[rows], w, minlength=count)
        sum_ = np.bincount(index[rows], w * (frame.spin[rows] - slope * away[rows]), minlength=count)
        good &= amount > 0
        values.append(np.divide(sum_, amount, out=np.zeros(count), where=amount > 0))
    theta = (values[1] - values[0])[good]
    return theta if len(theta) else np.zeros(1)
