"""Frequencies of two designs as two ladders, with a ribbon from each mode to what became of it."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

from viewer.insight.pairing import Pairing
from viewer.model.arrays import Array
from viewer.scene.chart import HEIGHT, apart, blend, chart_sheet, fitted, ticks
from viewer.scene.chart_side import Side
from viewer.scene.figures import change, hertz
from viewer.scene.primitives import Line, Polygon, Primitive, Sheet, Spot, Text
from viewer.scene.tokens import BAND_HEIGHT, BASE_WIDTH, MARGIN, TEXT, TEXT_SMALL, THEMES, Tokens

RAILS = (352.0, 608.0)  # x of the two ladders
TOP, FOOT = 84.0, HEIGHT - BAND_HEIGHT - 24  # of the scale
RUNG = 22.0
APART = 36.0  # px between labels
Place = Callable[[float], float]  # Hz → y


@dataclass(frozen=True)
class Rung:
    """What became of one mode: kind "paired" or another word, numbers from 1 and Hz on both sides, None where there
    is no partner; ``agreement`` 0 … 1 of a pair."""

    kind: str
    first: int | None
    second: int | None
    first_hz: float | None
    second_hz: float | None
    agreement: float


def ladder_chart(
    pairing: Pairing, first_names: Sequence[str] = (), second_names: Sequence[str] = (), theme: str = "light"
) -> Sheet:
    """The ladders of two designs; names by mode, empty where there are none."""
    rungs = [Rung(p.kind, p.first, p.second, p.first_hz, p.second_hz, p.agreement) for p in pairing.pairs]
    sides = (
        Side(pairing.first, (), first_names, "baseline"),
        Side(pairing.second, (), second_names, "modified"),
    )
    said = pairing.sentence.removesuffix(".")
    return ladders(rungs, *sides, said, f"{pairing.first} to {pairing.second}: which mode became which", theme)


def ladders(rungs: Sequence[Rung], one: Side, other: Side, said: str, title: str, theme: str = "light") -> Sheet:
    """Both ladders on one linear scale; ribbons are as wide as the shapes agree, with the change in frequency. Spots
    stand for (mode of one, mode of other), numbers from 1, None where there is no counterpart."""
    tokens = THEMES[theme]
    first = [p for p in rungs if p.first is not None]
    second = sorted((p for p in rungs if p.second is not None), key=lambda p: p.second or 0)
    values = [p.first_hz or 0.0 for p in first] + [p.second_hz or 0.0 for p in second]
    low, high = _range(values)
    y = lambda hz: FOOT - (hz - low) / (high - low) * (FOOT - TOP)  # noqa: E731
    own, others = one.colour(tokens), other.colour(tokens)
    items: list[Primitive] = [
        *_ribbons(rungs, y, own, others, tokens),
        *_scale(low, high, y, tokens),
        *_rail(RAILS[0], [y(p.first_hz or 0.0) for p in first], own, -1),
        *_rail(RAILS[1], [y(p.second_hz or 0.0) for p in second], others, 1),
        Text(RAILS[0], 50, fitted(one.name, 300, TEXT, True), own, TEXT, True, "right"),
        Text(RAILS[1], 50, fitted(other.name, 300, TEXT, True), others, TEXT, True),
        *_labels([(p.first or 0, p.first_hz or 0.0) for p in first], y, one, tokens, -1),
        *_labels([(p.second or 0, p.second_hz or 0.0) for p in second], y, other, tokens, 1),
        *_changes(rungs, y, tokens),
    ]
    legend = "a ribbon joins a mode to its counterpart, the wider the more alike the shapes; dashed end: none"
    return chart_sheet(tokens, title, (legend, said), items, spots=_spots(rungs, y, one.name, other.name))


def _range(values: Sequence[float]) -> tuple[float, float]:
    low, high = min(values, default=0.0), max(values, default=1.0)
    room = 0.06 * (high - low or high or 1.0)
    return (0.0 if low < 0.25 * high else low - room), high + room


def _rail(x: float, at: Sequence[float], colour: str, side: int) -> list[Primitive]:
    rail = Line(((x, TOP), (x, FOOT)), colour, 3.0)
    return [rail, *(Line(((x, y), (x + side * RUNG, y)), colour, 3.0) for y in at)]


def _scale(low: float, high: float, y, tokens: Tokens) -> list[Primitive]:
    middle = sum(RAILS) / 2
    items: list[Primitive] = []
    for value in ticks(low, high, 7):
        items.append(Text(middle, y(value) + 5, f"{value + 0.0:g}", tokens.soft, TEXT_SMALL, False, "middle"))
        items.append(Line(((RAILS[0], y(value)), (RAILS[0] + 8, y(value))), tokens.soft, 1.0))
        items.append(Line(((RAILS[1] - 8, y(value)), (RAILS[1], y(value))), tokens.soft, 1.0))
    return [*items, Text(middle, 50, "Hz", tokens.soft, TEXT_SMALL, False, "middle")]


def _ribbons(rungs: Sequence[Rung], y: Place, own: str, others: str, tokens: Tokens) -> list[Primitive]:
    items: list[Primitive] = []
    colour = blend(tokens.background, others if others != tokens.ink else tokens.body_edge, 0.22)
    for p in rungs:
        if p.kind == "paired":
            half = 2 + 7 * p.agreement
            one, two = y(p.first_hz or 0.0), y(p.second_hz or 0.0)
            corners = ((RAILS[0], one - half), (RAILS[1], two - half), (RAILS[1], two + half), (RAILS[0], one + half))
            items.append(Polygon(corners, colour))
        elif p.first_hz is not None:
            end = RAILS[0] + 46
            target = y(p.first_hz)
            items.append(Line(((RAILS[0], target), (end, target)), own, 2.4, (6.0, 5.0)))
        else:
            target = y(p.second_hz or 0.0)
            items.append(Line(((RAILS[1] - 46, target), (RAILS[1], target)), others, 2.4, (6.0, 5.0)))
    return items


def _spots(rungs: Sequence[Rung], y: Place, one: str, other: str) -> list[Spot]:
    """A strip from rung to rung, or at the rung that stands alone."""
    middle, half = sum(RAILS) / 2, 9.0
    found = []
    for p in rungs:
        left = RAILS[0] - RUNG if p.first is not None else middle
        right = RAILS[1] + RUNG if p.second is not None else middle
        at = [
            y(hz if hz is not None else alone or 0.0)
            for hz, alone in ((p.first_hz, p.second_hz), (p.second_hz, p.first_hz))
        ]
        outline = ((left, at[0] - half), (right, at[1] - half), (right, at[1] + half), (left, at[0] + half))
        sides = [f"mode {number} of {name}" for number, name in ((p.first, one), (p.second, other)) if number]
        found.append(Spot(outline, (p.first, p.second), " and ".join(sides)))
    return found


def _labels(modes: Sequence[tuple[int, float]], y: Place, which: Side, tokens: Tokens, side: int) -> list[Primitive]:
    """Number, frequency and name beside each rung of ``modes`` (number, Hz); leaders where they had to move apart."""
    colour = which.colour(tokens)
    rail = RAILS[0] if side < 0 else RAILS[1]
    anchor = "right" if side < 0 else "left"
    at = [y(hz) for _, hz in modes]
    order = sorted(range(len(at)), key=lambda k: at[k])
    placed: Array = apart([at[k] for k in order], APART, TOP - 4, FOOT)
    items: list[Primitive] = []
    x, room = rail + side * (RUNG + 26), (RAILS[0] if side < 0 else BASE_WIDTH - RAILS[1]) - RUNG - 26 - MARGIN
    for k, level in zip(order, placed, strict=True):
        number, hz = modes[k]
        name = which.mode_name(number)
        items.append(Line(((rail + side * RUNG, at[k]), (x - side * 5, float(level))), tokens.soft, 1.0))
        items.append(Text(x, float(level) + 1, f"{number} · {hertz(hz)}", colour, TEXT_SMALL, True, anchor))
        if name:
            items.append(Text(x, float(level) + 17, fitted(name, room), tokens.soft, TEXT_SMALL, False, anchor))
    return items


def _changes(rungs: Sequence[Rung], y: Place, tokens: Tokens) -> list[Primitive]:
    """The change in frequency of each pair, at a third of its ribbon, kept apart."""
    paired = [(p.first_hz or 0.0, p.second_hz or 0.0) for p in rungs if p.kind == "paired"]
    paired = [(one, two) for one, two in paired if change(two, one)]
    x = RAILS[1] - 62
    share = (x - RAILS[0]) / (RAILS[1] - RAILS[0])
    wished = [(1 - share) * y(one) + share * y(two) for one, two in paired]
    order = sorted(range(len(paired)), key=lambda k: wished[k])
    placed = apart([wished[k] for k in order], 19.0, TOP, FOOT)
    return [
        Text(x, float(at) + 5, change(paired[k][1], paired[k][0]), tokens.ink, TEXT_SMALL, True, "middle")
        for k, at in zip(order, placed, strict=True)
    ]
