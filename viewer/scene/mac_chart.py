"""How alike the modes of two designs are: a field of MAC with its values, pairs framed."""

from __future__ import annotations

from collections.abc import Sequence

from viewer.insight.pairing import Pairing
from viewer.scene.chart import blend, chart_sheet, fitted, readable_on, rectangle
from viewer.scene.figures import hertz
from viewer.scene.primitives import Line, Primitive, Sheet, Text
from viewer.scene.tokens import BAND_HEIGHT, BASE_WIDTH, MARGIN, TEXT, TEXT_SMALL, THEMES

LEFT, TOP = 330.0, 96.0  # px kept for names at the side and above
CELL = (34.0, 100.0)  # px, least and largest side of a cell
SAID = 0.05  # MAC from which on the value is written


def mac_chart(
    pairing: Pairing, first_names: Sequence[str] = (), second_names: Sequence[str] = (), theme: str = "light"
) -> Sheet:
    """The MAC field of a pairing; names by mode of both designs, empty where there are none."""
    tokens = THEMES[theme]
    rows, columns = pairing.matrix.shape
    side = min(CELL[1], max(CELL[0], min((BASE_WIDTH - LEFT - MARGIN) / max(columns, 1), 500.0 / max(rows, 1))))
    height = max(420.0, TOP + rows * side + MARGIN + BAND_HEIGHT)
    first_hz, second_hz = _frequencies(pairing)
    items: list[Primitive] = [
        Text(MARGIN, TOP - 58, fitted(pairing.first, LEFT - MARGIN - 12, TEXT, True), tokens.baseline, TEXT, True),
        Text(
            LEFT,
            TOP - 58,
            fitted(pairing.second, BASE_WIDTH - LEFT - MARGIN, TEXT, True),
            tokens.modified,
            TEXT,
            True,
        ),
    ]
    for i in range(rows):
        middle = TOP + (i + 0.5) * side
        name = first_names[i] if i < len(first_names) else ""
        items.append(Text(MARGIN + 22, middle - 1, f"{i + 1}", tokens.baseline, TEXT, True, "right"))
        items.append(Text(MARGIN + 32, middle - 1, hertz(first_hz[i]), tokens.ink, TEXT_SMALL))
        if name and side >= 38:
            items.append(Text(MARGIN + 32, middle + 16, fitted(name, LEFT - MARGIN - 44), tokens.soft, TEXT_SMALL))
    size = TEXT_SMALL if side >= 56 else 12.0
    for j in range(columns):
        middle = LEFT + (j + 0.5) * side
        items.append(Text(middle, TOP - 28, f"{j + 1}", tokens.modified, TEXT, True, "middle"))
        words = hertz(second_hz[j]) if side >= 64 else f"{second_hz[j]:.0f}"
        items.append(Text(middle, TOP - 9, words, tokens.ink, size, False, "middle"))
    for i in range(rows):
        for j in range(columns):
            items += _cell(pairing, i, j, side, size, theme)
    counts = pairing.to_dict()["counts"]
    alone = {"without counterpart": counts["vanished"] + counts["merged"], "new": counts["new"]}
    alone["near the end of the modes compared"] = counts["beyond"]
    said = "".join(f", {number} {words}" for words, number in alone.items() if number)
    notes = (
        "1 = same shape, 0 = nothing in common (modal assurance criterion, weighted by mass); framed: paired",
        f"{counts['paired']} paired{said} · shapes compared at {len(pairing.support.weights)} places",
    )
    return chart_sheet(tokens, f"{pairing.first} against {pairing.second}", notes, items, height)


def _cell(pairing: Pairing, i: int, j: int, side: float, size: float, theme: str) -> list[Primitive]:
    tokens, value = THEMES[theme], float(pairing.matrix[i, j])
    left, top = LEFT + j * side, TOP + i * side
    colour = blend(tokens.body, tokens.ink, 0.85 * value)
    items: list[Primitive] = [rectangle((left + 1, top + 1, left + side - 1, top + side - 1), colour)]
    if value >= SAID:
        middle = (left + side / 2, top + side / 2 + 0.36 * size)
        items.append(Text(*middle, f"{value:.2f}", readable_on(colour, tokens), size, value >= 0.5, "middle"))
    if pairing.partner(i + 1) == j + 1:
        low, high = 2.5, side - 2.5
        corners = ((low, low), (high, low), (high, high), (low, high), (low, low))
        items.append(Line(tuple((left + x, top + y) for x, y in corners), tokens.accent, 3.0))
    return items


def _frequencies(pairing: Pairing) -> tuple[list[float], list[float]]:
    first = {p.first: p.first_hz or 0.0 for p in pairing.pairs if p.first}
    second = {p.second: p.second_hz or 0.0 for p in pairing.pairs if p.second}
    return [first[k + 1] for k in range(len(first))], [second[k + 1] for k in range(len(second))]
