"""Frequency against the parameter of a sweep, each lineage a line; crossings, veerings and open questions marked."""

from __future__ import annotations

import numpy as np

from viewer.insight.encounters import Encounter
from viewer.insight.lineage import LineageFinding
from viewer.scene.chart import HEIGHT, apart, chart_sheet, corners, fitted, ticks
from viewer.scene.figures import hertz
from viewer.scene.primitives import Disc, Line, Polygon, Primitive, Ring, Sheet, Spot, Text, bounds
from viewer.scene.tokens import BAND_HEIGHT, BASE_WIDTH, MARGIN, TEXT_SMALL, THEMES, Tokens

LEFT, RIGHT, TOP, FOOT = 84.0, BASE_WIDTH - 236.0, 56.0, HEIGHT - BAND_HEIGHT - 58
DASHES: tuple[tuple[float, ...], ...] = ((), (11.0, 5.0), (4.0, 4.0), (14.0, 4.0, 3.0, 4.0))
MARKERS = 20  # most markers of one line
SIZE = 4.4  # of a marker, px from its middle
# corners of markers, in sizes; none: a disc, the middle alone: a ring
_FORMS: tuple[tuple[tuple[float, float], ...], ...] = (
    (),
    ((-0.9, -0.9), (0.9, -0.9), (0.9, 0.9), (-0.9, 0.9)),
    ((0.0, -1.1), (0.95, 0.7), (-0.95, 0.7)),
    ((0.0, 0.0),),
    ((0.0, -1.2), (1.2, 0.0), (0.0, 1.2), (-1.2, 0.0)),
    ((0.0, 1.1), (0.95, -0.7), (-0.95, -0.7)),
)


def lineage_chart(finding: LineageFinding, title: str = "", theme: str = "light") -> Sheet:
    """The chart of a finding; designs without a common parameter stand at 1, 2, 3 … with their names."""
    tokens = THEMES[theme]
    x, y = _axes(finding)
    items: list[Primitive] = [*_grid(finding, x, y, tokens)]
    for order, line in enumerate(finding.lines):
        items += _line(finding, line.freq_hz, x, y, order, tokens)
    items += [mark for e in finding.encounters for mark in _mark(e, finding, x, y, tokens)]
    items += _names(finding, x, y, tokens)
    kinds = {e.kind for e in finding.encounters}
    legend = [
        words
        for kind, words in (
            ("crossing", "× cross: shapes pass unchanged"),
            ("veering", "○ veer: frequencies turn away, shapes are traded"),
            ("unresolved", "? steps too coarse to tell"),
            ("swapped", "× change places from one design to the next"),
        )
        if kind in kinds
    ]
    notes = (" · ".join(legend) or "no two modes meet", finding.sentence.removesuffix("."))
    against = f"natural frequencies against {finding.parameter}" if finding.unit else "natural frequencies by design"
    return chart_sheet(tokens, title or against, notes, items, spots=_spots(finding, x, y))


def _spots(finding: LineageFinding, x, y) -> list[Spot]:
    """Around each mode of each step; they stand for (step from 0, number of the mode)."""
    found = []
    for line in finding.lines:
        for step, (number, hz) in enumerate(zip(line.modes, line.freq_hz, strict=True)):
            if number:
                box = bounds(((float(x(finding.values[step])), float(y(hz))),), 10.0)
                found.append(Spot(corners(box), (step, number), f"mode {number} of {finding.labels[step]}"))
    return found


def _axes(finding: LineageFinding):
    low, high = float(finding.values[0]), float(finding.values[-1])
    hz = np.concatenate([line.freq_hz[np.isfinite(line.freq_hz)] for line in finding.lines])
    least, most = float(hz.min(initial=np.inf)), float(hz.max(initial=0.0))
    room = 0.05 * (most - least or most or 1.0)
    least, most = max(0.0, least - room), most + room
    x = lambda value: LEFT + (value - low) / (high - low or 1.0) * (RIGHT - LEFT)  # noqa: E731
    y = lambda value: FOOT - (value - least) / (most - least) * (FOOT - TOP)  # noqa: E731
    y.low, y.high = least, most  # type: ignore[attr-defined]
    return x, y


def _grid(finding: LineageFinding, x, y, tokens: Tokens) -> list[Primitive]:
    items: list[Primitive] = [Text(LEFT - 12, 34, "Hz", tokens.soft, TEXT_SMALL, False, "right")]
    for value in ticks(y.low, y.high, 7):
        items.append(Line(((LEFT, y(value)), (RIGHT, y(value))), tokens.rule, 1.0))
        items.append(Text(LEFT - 12, y(value) + 5, f"{value:g}", tokens.soft, TEXT_SMALL, False, "right"))
    si, below = (finding.unit.si, finding.parameter) if finding.unit else (1.0, "")
    places = list(zip(finding.values, finding.labels, strict=True))
    if finding.unit:
        low, high = finding.values[0] / si, finding.values[-1] / si
        places = [(si * value, f"{value:g}") for value in ticks(float(low), float(high), 6)]
        below += f", {finding.unit.name}" if finding.unit.name else ""
    for value, words in places:
        items.append(Line(((x(value), FOOT), (x(value), FOOT + 6)), tokens.soft, 1.0))
        items.append(Text(x(value), FOOT + 24, fitted(words, 150), tokens.soft, TEXT_SMALL, False, "middle"))
    items.append(Text((LEFT + RIGHT) / 2, FOOT + 46, below, tokens.ink, TEXT_SMALL, False, "middle"))
    return items


def _line(finding: LineageFinding, hz, x, y, order: int, tokens: Tokens) -> list[Primitive]:
    """One lineage in its own dash, with its own marker at every step, or at every few of very many."""
    known = np.isfinite(hz)
    points = tuple((float(x(v)), float(y(f))) for v, f in zip(finding.values[known], hz[known], strict=True))
    every = max(round(len(points) / MARKERS), 1)
    dots = [part for p in points[::every] for part in marker(*p, order, tokens)]
    return [Line(points, tokens.baseline, 2.4, dash_of(order)), *dots] if len(points) > 1 else dots


def dash_of(order: int) -> tuple[float, ...]:
    """The dash of the lineage in place ``order`` (from 0): it and the marker tell 24 lineages apart."""
    return DASHES[(order + order // len(_FORMS)) % len(DASHES)]


def marker(x: float, y: float, order: int, tokens: Tokens) -> list[Primitive]:
    """The marker of the lineage in place ``order`` (from 0), cased in the background."""
    form = _FORMS[order % len(_FORMS)]
    colour = tokens.baseline
    if len(form) < 3:
        inner = Ring(x, y, SIZE - 0.8, colour, 1.8) if form else Disc(x, y, SIZE, colour)
        return [Disc(x, y, SIZE + 1.4, tokens.background), inner]
    sized = [tuple((x + size * u, y + size * v) for u, v in form) for size in (SIZE + 2.4, SIZE + 0.6)]
    return [Polygon(sized[0], tokens.background), Polygon(sized[1], colour)]


def _mark(e: Encounter, finding: LineageFinding, x, y, tokens: Tokens) -> list[Primitive]:
    lines = {line.number: line.freq_hz for line in finding.lines}
    at = [float(np.interp(e.at, finding.values, lines[n])) for n in (e.first, e.second)]
    cx, cy = float(x(e.at)), float(y(sum(at) / 2))
    if e.kind in ("crossing", "swapped"):
        arms = [((cx - 7, cy - 7), (cx + 7, cy + 7)), ((cx - 7, cy + 7), (cx + 7, cy - 7))]
        return [Line(arm, tokens.accent, 2.4) for arm in arms]
    ring = Ring(cx, cy, 11.0, tokens.accent, 2.4)
    return [ring, Text(cx, cy - 18, "?", tokens.accent, TEXT_SMALL, True, "middle")] if e.step else [ring]


def _names(finding: LineageFinding, x, y, tokens: Tokens) -> list[Primitive]:
    """Frequency and name of each lineage at its end: beside the chart, kept apart, or where it ends before that."""
    ends, items = [], list[Primitive]()
    for order, line in enumerate(finding.lines):
        last = int(np.nonzero(np.isfinite(line.freq_hz))[0][-1])
        at = float(y(line.freq_hz[last]))
        if last == len(line.freq_hz) - 1:
            ends.append((at, order, line))
        else:
            place = float(x(finding.values[last]))
            items += marker(place + 12, at - 11, order, tokens)
            items.append(Text(place + 22, at - 6, fitted(finding.called(line), 136), tokens.soft, TEXT_SMALL))
    ends.sort(key=lambda end: end[0])
    for (wished, order, line), at in zip(ends, apart([e[0] for e in ends], 19.0, TOP, FOOT), strict=True):
        items.append(Line(((RIGHT + 4, wished), (RIGHT + 18, float(at))), tokens.soft, 1.0))
        items += marker(RIGHT + 22, float(at), order, tokens)
        text = f"{hertz(float(line.freq_hz[-1]))} {finding.called(line)}"
        items.append(Text(RIGHT + 33, float(at) + 5, fitted(text, 236 - 33 - MARGIN / 2), tokens.ink, TEXT_SMALL))
    return items
