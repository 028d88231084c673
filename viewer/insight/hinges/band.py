"""One candidate looked at closely: its edges and ends, and what the gates ask of it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from viewer.insight.hinges.curve import Line
from viewer.insight.hinges.field import Field
from viewer.insight.hinges.frame import Frame, frame_of
from viewer.insight.hinges.profile import Edges, edges_of, profile
from viewer.insight.hinges.sides import GROUND, Side, local_turns, side_of
from viewer.model.arrays import Array

_DENSER = 2.5  # times what lies beside it: as far the strip along the line belongs to the band
_OWN = 0.1  # of the band's own density, likewise
_FAINT = 0.15  # of the band's mean density: strips at its ends below that are none of it
_STRIPS = 24
_GAPS = 2  # strips that may be missing in between
_ONE_SENSE = 0.5  # share of the squared turn that is the mean turn: below, parts of a line fold in different senses
_PIECE = 0.2  # of a band's energy in a piece of it that is looked at alone
_BEYOND = 1.5  # cells next to a band, where they are larger than its own, that its surroundings reach over


@dataclass(frozen=True, eq=False)
class Draft:
    """A candidate measured.

    frame      coordinates; ends (2,) m along the line, edges (2,) m across it
    across     (3,) unit vector from side A to B at the middle
    cells      rows of the band
    fold       (3,) mean rotation of B relative to A, extrapolated to the edges
    bend       rad, the turn about the line, root mean square along it
    even       share of the squared turn that is the mean turn
    aligned    share of the fold that is about the line (or about the axis of a blob)
    steep      slope of the rotation in the band over the larger slope beside it
    turn_share fold over fold and variation of rotation on both sides
    contrast   energy density of the band over that of its surroundings
    step       the same over the denser of the two strips of the same width beside it
    jump       density just inside over just outside of an edge, the smaller of both
    filled     least density across the band over its mean
    rows       width over the size across the line of its own cells or of those beside it, whichever is larger
    strain, volume   shares of the whole
    """

    frame: Frame
    ends: tuple[float, float]
    edges: tuple[float, float]
    across: Array
    cells: Array
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
    step: float
    jump: float
    filled: float
    rows: float
    strain: float
    volume: float

    @property
    def length(self) -> float:
        return self.ends[1] - self.ends[0]

    @property
    def width(self) -> float:
        return self.edges[1] - self.edges[0]

    @property
    def grounded(self) -> bool:
        return any(side.ground for side in self.sides)


class Examiner:
    """Measures candidates of one field, no set of cells twice."""

    def __init__(self, field: Field) -> None:
        self._field = field
        self._known: dict[tuple[bytes, bool, bool], Draft | None] = {}

    def __call__(self, cells: Array) -> list[Draft]:
        """Measure the candidate ``cells`` as a line and as a blob, and once more what came out as the band; empty
        when it is no band between two sides. Pieces that do not touch and fold in different senses, tongues beside
        one another, are measured apart as well."""
        first = [draft for blob in (False, True) if (draft := self._once(cells, blob)) is not None]
        second = [self._once(d.cells, d.frame.blob) or self._once(d.cells, not d.frame.blob) for d in first]
        found = [draft for draft in second if draft is not None]
        for draft in found[:]:
            if draft.even < _ONE_SENSE and not draft.frame.blob:
                piece = self._field.pieces(draft.cells)
                each = [draft.cells[piece == i] for i in range(piece.max() + 1)] if piece.any() else []
                enough = _PIECE * draft.strain
                each = [part for part in each if self._field.strain[part].sum() >= enough]
                found += [alone for part in each if (alone := self._once(part, False, False)) is not None]
        return found

    def _once(self, cells: Array, blob: bool, stretch: bool = True) -> Draft | None:
        key = cells.tobytes(), blob, stretch
        if key not in self._known:
            field = self._field
            frame = frame_of(field, cells, blob) if field.strain[cells].sum() > 0 else None
            self._known[key] = None if frame is None else _measured(field, cells, frame, stretch)
        return self._known[key]


def _measured(field: Field, cells: Array, frame: Frame, stretch: bool) -> Draft | None:
    flags = np.zeros(len(field.strain), bool)
    flags[cells] = True
    mine = flags[frame.near]
    if not mine.any():
        return None
    grain = float(np.median(frame.high[mine] - frame.low[mine]))
    ends = float(frame.along_low[mine].min()), float(frame.along_high[mine].max())
    found = _edges(field, frame, mine, ends, grain)
    if found is None:
        return None
    edges = found.low, found.high
    inside = (frame.across > edges[0]) & (frame.across < edges[1])
    if not frame.blob or abs(frame.about[0] @ frame.curve.tangent(np.zeros(1))[0]) > 0.8:
        ends = _trimmed(field, frame, inside, ends)
        ends = _stretched(field, frame, inside, edges, ends, grain) if stretch else ends
    band = inside & _within(frame, ends)
    if not band.any():
        return None
    ends = float(frame.along_low[band].min()), float(frame.along_high[band].max())
    within = _within(frame, ends)
    beside = _beside(frame, within, edges, grain)
    window = max(edges[1] - edges[0], 3 * grain, _BEYOND * beside)
    sides = []
    for sign, edge in ((-1, edges[0]), (1, edges[1])):
        away = sign * (frame.across - edge)
        side = side_of(field, frame, within & (away > 0), away, window)
        if side is None:
            if not field.clamped[frame.near[band]].any():
                return None
            side = GROUND
        sides.append(side)
    if all(side.ground for side in sides):
        return None
    own = float(np.median((frame.high - frame.low)[band]))
    return _draft(field, frame, band, ends, found, (sides[0], sides[1]), window, max(own, beside))


def _beside(frame: Frame, within: Array, edges: tuple[float, float], grain: float) -> float:
    """Size of the cells next to the edges, across the line: where the mesh grades, larger than the band's own."""
    start = np.maximum(edges[0] - frame.high, frame.low - edges[1])
    outside = within & ((frame.across < edges[0]) | (frame.across > edges[1]))
    touching = outside & (start <= 0.5 * grain)
    return float(np.median((frame.high - frame.low)[touching])) if touching.any() else 0.0


def _edges(field: Field, frame: Frame, mine: Array, ends: tuple[float, float], grain: float) -> Edges | None:
    """Edges of the step in density across the line, looked for twice: around the candidate and around what was
    found."""
    strain, volume = field.strain[frame.near], field.volume[frame.near]
    low, high = float(frame.low[mine].min()), float(frame.high[mine].max())
    middle = float(np.average(frame.across[mine], weights=strain[mine]))
    within = _within(frame, ends)
    width, found = high - low, None
    for _ in range(2):
        half = max(2.0 * width, 5 * grain)
        span = (middle - half, middle + half)
        use = within & (frame.high > span[0]) & (frame.low < span[1])
        found = edges_of(profile(frame.low[use], frame.high[use], strain[use], volume[use], span))
        if found is None:
            return None
        width, middle = found.high - found.low, (found.low + found.high) / 2
    return found


def _within(frame: Frame, ends: tuple[float, float]) -> Array:
    """Which cells lie between two places along the line; a joint may have no length, then those it passes."""
    if frame.blob and ends[1] - ends[0] < 1e-6 * (frame.high.max() - frame.low.min()):
        return np.ones(len(frame.near), bool)
    slack = 1e-9 * (ends[1] - ends[0])
    return (frame.along > ends[0] - slack) & (frame.along < ends[1] + slack)


def _trimmed(field: Field, frame: Frame, inside: Array, ends: tuple[float, float]) -> tuple[float, float]:
    """Ends without cells that hold next to nothing: what a candidate took in beyond the end of a slit."""
    core = np.nonzero(inside & _within(frame, ends))[0]
    if len(core) == 0:
        return ends
    index = np.minimum(((frame.along[core] - ends[0]) / (ends[1] - ends[0]) * _STRIPS).astype(int), _STRIPS - 1)
    strain, volume = (
        np.bincount(index, values[frame.near[core]], minlength=_STRIPS) for values in (field.strain, field.volume)
    )
    full = np.nonzero((strain > _FAINT * volume * strain.sum() / volume.sum()) & (volume > 0))[0]
    kept = core[(index >= full.min()) & (index <= full.max())]
    return float(frame.along_low[kept].min()), float(frame.along_high[kept].max())


def _stretched(field: Field, frame: Frame, inside: Array, edges, ends, grain: float) -> tuple[float, float]:
    """The band's ends moved outwards along the line as long as the strip stays denser than what is beside it."""
    long = float(np.median((frame.along_high - frame.along_low)[inside])) if inside.any() else grain
    step = max(1.5 * long, 0.03 * (ends[1] - ends[0]))
    margin = 1.5 * (edges[1] - edges[0]) + 2 * grain
    beside = ~inside & (frame.across > edges[0] - margin) & (frame.across < edges[1] + margin)
    strain, volume = field.strain[frame.near], field.volume[frame.near]
    core = inside & _within(frame, ends)
    own = strain[core].sum() / max(volume[core].sum(), 1e-300)
    out = []
    for sign, end in ((-1, ends[0]), (1, ends[1])):
        away = sign * (frame.along - end)
        index = np.floor(away / step).astype(int)
        count = int(index.max(initial=0)) + 1
        strip, other = (away > 0) & inside, (away > 0) & beside
        sums = [
            np.bincount(index[rows], values[rows], minlength=count)
            for rows in (strip, other)
            for values in (strain, volume)
        ]
        dense, thin = (e / np.maximum(v, 1e-300) for e, v in (sums[:2], sums[2:]))
        belongs = np.nonzero((dense > np.maximum(_DENSER * thin, _OWN * own)) & (sums[1] > 0))[0]
        breaks = np.nonzero(np.diff(belongs, prepend=-1) > _GAPS + 1)[0]
        belongs = belongs[: breaks[0]] if len(breaks) else belongs
        rows = strip & (index <= belongs.max(initial=-1))
        if rows.any():
            end = float(frame.along_high[rows].max() if sign > 0 else frame.along_low[rows].min())
        out.append(end)
    return out[0], out[1]


def _draft(
    field: Field,
    frame: Frame,
    band: Array,
    ends: tuple[float, float],
    found: Edges,
    sides: tuple[Side, Side],
    window: float,
    cell: float,
) -> Draft | None:
    cells, edges = frame.near[band], (found.low, found.high)
    width = edges[1] - edges[0]
    weight = field.strain[cells]
    strain, volume = float(weight.sum()), float(field.volume[cells].sum())
    theta = local_turns(field, frame, ends, edges, sides, window)
    bend = float(np.sqrt(np.mean(theta**2)))
    if strain <= 0 or width <= 0 or bend <= 0:
        return None
    even = float(np.mean(theta) ** 2 / np.mean(theta**2))
    fold = sides[1].edge - sides[0].edge
    middle = int(np.argmin(np.abs(frame.along - sum(ends) / 2) + np.abs(frame.across - edges[1])))
    about = frame.about[middle]
    slopes = [abs(float(side.slope @ about)) for side in sides]
    rest = frame.near[~band]
    density = strain / volume
    strips = [_strip(field, frame, ends, edges, sign) for sign in (-1, 1)]
    return Draft(
        frame=frame,
        ends=ends,
        edges=edges,
        across=frame.outward[middle],
        cells=cells,
        sides=sides,
        position=weight @ field.middle[cells] / strain,
        direction=frame.curve.axis if isinstance(frame.curve, Line) else about,
        fold=fold,
        bend=bend,
        even=even,
        aligned=float(abs(fold @ about) / max(np.linalg.norm(fold), 1e-300)),
        steep=bend / width / max(*slopes, 1e-12 * bend / width),
        turn_share=bend / (bend + sides[0].variation + sides[1].variation),
        contrast=density / max(field.strain[rest].sum() / max(field.volume[rest].sum(), 1e-300), 1e-300),
        step=density / max(*strips, 1e-300),
        jump=found.jump,
        filled=found.filled,
        rows=width / cell,
        strain=strain,
        volume=volume / field.volume.sum(),
    )


def _strip(field: Field, frame: Frame, ends, edges, sign: int) -> float:
    """Energy density of the strip next to an edge, as wide as the band."""
    edge, width = edges[(sign + 1) // 2], edges[1] - edges[0]
    away = sign * (frame.across - edge)
    start = np.minimum(sign * (frame.low - edge), sign * (frame.high - edge))
    rows = frame.near[_within(frame, ends) & (away > 0) & (start < width)]
    volume = field.volume[rows].sum()
    return float(field.strain[rows].sum() / volume) if volume > 0 else 0.0
