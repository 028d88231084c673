"""Frequencies of two designs as two ladders, with a ribbon from each mode to what became of it."""

from __future__ import annotations

from collections.abc import Sequence

from viewer.insight.pairing import ModePair, Pairing
from viewer.model.arrays import Array
from viewer.scene.chart import HEIGHT, apart, blend, chart_sheet, fitted, ticks
from viewer.scene.figures import change, hertz
from viewer.scene.primitives import Line, Polygon, Primitive, Sheet, Text
from viewer.scene.tokens import BAND_HEIGHT, BASE_WIDTH, MARGIN, TEXT, TEXT_SMALL, THEMES, Tokens

RAILS = (352.0, 608.0)  # x of the two ladders
TOP, FOOT = 84.0, HEIGHT - BAND_HEIGHT - 24  # of the scale
RUNG = 22.0
APART = 36.0  # px between labels


def ladder_chart(
    pairing: Pairing, first_names: Sequence[str] = (), second_names: Sequence[str] = (), theme: str = "light"
) -> Sheet:
    """Both ladders on one linear scale; ribbons are as wide as the shapes agree, with the change in frequency."""
    tokens = THEMES[theme]
    first = [p for p in pairing.pairs if p.first is not None]
    second = sorted((p for p in pairing.pairs if p.second is not None), key=lambda p: p.second or 0)
    values = [p.first_hz or 0.0 for p in first] + [p.second_hz or 0.0 for p in second]
    low, high = _range(values)
    y = lambda hz: FOOT - (hz - low) / (high - low) * (FOOT - TOP)  # noqa: E731
    items: list[Primitive] = [
        *_ribbons(pairing, y, tokens),
        *_scale(low, high, y, tokens),
        *_rail(RAILS[0], [y(p.first_hz) for p in first], tokens.baseline, -1),
        *_rail(RAILS[1], [y(p.second_hz) for p in second], tokens.modified, 1),
        Text(RAILS[0], 50, fitted(pairing.first, 300, TEXT, True), tokens.baseline, TEXT, True, "right"),
        Text(RAILS[1], 50, fitted(pairing.second, 300, TEXT, True), tokens.modified, TEXT, True),
        *_labels(first, [p.first for p in first], [y(p.first_hz) for p in first], first_names, tokens, -1),
        *_labels(second, [p.second for p in second], [y(p.second_hz) for p in second], second_names, tokens, 1),
        *_changes(pairing, y, tokens),
    ]
    notes = (
        "a ribbon joins a mode to what became of it, the wider the more alike the shapes; dashed end: no counterpart",
        pairing.sentence.removesuffix("."),
    )
    return chart_sheet(tokens, f"{pairing.first} to {pairing.second}: which mode became which", notes, items)


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
        items.append(Text(middle, y(value) + 5, f"{value:g}", tokens.soft, TEXT_SMALL, False, "middle"))
        items.append(Line(((RAILS[0], y(value)), (RAILS[0] + 8, y(value))), tokens.soft, 1.0))
        items.append(Line(((RAILS[1] - 8, y(value)), (RAILS[1], y(value))), tokens.soft, 1.0))
    return [*items, Text(middle, 50, "Hz", tokens.soft, TEXT_SMALL, False, "middle")]


def _ribbons(pairing: Pairing, y, tokens: Tokens) -> list[Primitive]:
    items: list[Primitive] = []
    colour = blend(tokens.background, tokens.modified, 0.22)
    for p in pairing.pairs:
        if p.kind == "paired":
            half = 2 + 7 * p.agreement
            one, two = y(p.first_hz), y(p.second_hz)
            corners = ((RAILS[0], one - half), (RAILS[1], two - half), (RAILS[1], two + half), (RAILS[0], one + half))
            items.append(Polygon(corners, colour))
        elif p.first_hz is not None:
            end = RAILS[0] + 46
            target = y(p.first_hz)
            items.append(Line(((RAILS[0], target), (end, target)), tokens.baseline, 2.4, (6.0, 5.0)))
        else:
            target = y(p.second_hz)
            items.append(Line(((RAILS[1] - 46, target), (RAILS[1], target)), tokens.modified, 2.4, (6.0, 5.0)))
    return items


def _labels(
    pairs: Sequence[ModePair],
    numbers: Sequence[int | None],
    at: Sequence[float],
    names: Sequence[str],
    tokens: Tokens,
    side: int,
) -> list[Primitive]:
    """Number, frequency and name beside each rung; leaders where they had to move apart."""
    colour = tokens.baseline if side < 0 else tokens.modified
    rail = RAILS[0] if side < 0 else RAILS[1]
    anchor = "right" if side < 0 else "left"
    order = sorted(range(len(at)), key=lambda k: at[k])
    placed: Array = apart([at[k] for k in order], APART, TOP - 4, FOOT)
    items: list[Primitive] = []
    x, room = rail + side * (RUNG + 26), (RAILS[0] if side < 0 else BASE_WIDTH - RAILS[1]) - RUNG - 26 - MARGIN
    for k, y in zip(order, placed, strict=True):
        number = numbers[k] or 0
        hz = pairs[k].first_hz if side < 0 else pairs[k].second_hz
        name = names[number - 1] if number <= len(names) else ""
        items.append(Line(((rail + side * RUNG, at[k]), (x - side * 5, float(y))), tokens.soft, 1.0))
        items.append(Text(x, float(y) + 1, f"{number} · {hertz(hz or 0.0)}", colour, TEXT_SMALL, True, anchor))
        if name:
            items.append(Text(x, float(y) + 17, fitted(name, room), tokens.soft, TEXT_SMALL, False, anchor))
    return items


def _changes(pairing: Pairing, y, tokens: Tokens) -> list[Primitive]:
    """The change in frequency of each pair, at a third of its ribbon, kept apart."""
    paired = [p for p in pairing.pairs if p.kind == "paired" and change(p.second_hz or 0.0, p.first_hz or 0.0)]
    x = RAILS[1] - 62
    share = (x - RAILS[0]) / (RAILS[1] - RAILS[0])
    wished = [(1 - share) * y(p.first_hz) + share * y(p.second_hz) for p in paired]
    order = sorted(range(len(paired)), key=lambda k: wished[k])
    placed = apart([wished[k] for k in order], 19.0, TOP, FOOT)
    return [
        Text(
            x,
            float(at) + 5,
            change(paired[k].second_hz or 0.0, paired[k].first_hz or 0.0),
            tokens.ink,
            TEXT_SMALL,
            True,
            "middle",
        )
        for k, at in zip(order, placed, strict=True)
    ]
