"""How alike the modes of two sets are: a field of MAC with its values, pairs framed."""

from __future__ import annotations

from collections.abc import Collection, Sequence

from viewer.insight.pairing import Pairing
from viewer.model.arrays import Array
from viewer.scene.chart import blend, chart_sheet, corners, fitted, readable_on, rectangle
from viewer.scene.chart_side import Side
from viewer.scene.figures import hertz
from viewer.scene.primitives import Line, Primitive, Sheet, Spot, Text
from viewer.scene.tokens import BAND_HEIGHT, BASE_WIDTH, MARGIN, TEXT, TEXT_SMALL, THEMES

LEFT, TOP = 330.0, 96.0  # px kept for names at the side and above
CELL = (34.0, 100.0)  # px, least and largest side of a cell
SAID = 0.05  # MAC from which on the value is written
SCALE = "1 = same shape, 0 = nothing in common (modal assurance criterion"


def mac_chart(
    pairing: Pairing, first_names: Sequence[str] = (), second_names: Sequence[str] = (), theme: str = "light"
) -> Sheet:
    """The MAC field of a pairing; names by mode of both designs, empty where there are none."""
    first_hz, second_hz = _frequencies(pairing)
    counts = pairing.to_dict()["counts"]
    alone = {"without counterpart": counts["vanished"] + counts["merged"], "new": counts["new"]}
    alone["near the end of the modes compared"] = counts["beyond"]
    said = "".join(f", {number} {words}" for words, number in alone.items() if number)
    notes = (
        f"{SCALE}, weighted by mass); framed: paired",
        f"{counts['paired']} paired{said} · shapes compared at {len(pairing.support.weights)} places",
    )
    framed = {(p.first - 1, p.second - 1) for p in pairing.pairs if p.kind == "paired" and p.first and p.second}
    first = Side(pairing.first, first_hz, first_names, "baseline")
    second = Side(pairing.second, second_hz, second_names, "modified")
    title = f"{pairing.first} against {pairing.second}"
    return field_chart(pairing.matrix, first, second, framed, notes, title, theme)


def field_chart(
    matrix: Array,
    rows: Side,
    columns: Side,
    framed: Collection[tuple[int, int]] = (),
    notes: Sequence[str] = (),
    title: str = "",
    theme: str = "light",
) -> Sheet:
    """A field of MAC, ``matrix`` (modes of rows, of columns), with the cells ``framed`` (row, column from 0). Spots
    stand for (mode of rows, mode of columns), numbers from 1."""
    tokens = THEMES[theme]
    down, across = matrix.shape
    side = min(CELL[1], max(CELL[0], min((BASE_WIDTH - LEFT - MARGIN) / max(across, 1), 500.0 / max(down, 1))))
    height = max(420.0, TOP + down * side + MARGIN + BAND_HEIGHT)
    own, other = rows.colour(tokens), columns.colour(tokens)
    beside = BASE_WIDTH - LEFT - MARGIN
    items: list[Primitive] = [
        Text(MARGIN, TOP - 58, fitted(rows.name, LEFT - MARGIN - 12, TEXT, True), own, TEXT, True),
        Text(LEFT, TOP - 58, fitted(columns.name, beside, TEXT, True), other, TEXT, True),
    ]
    for i in range(down):
        middle = TOP + (i + 0.5) * side
        name = rows.mode_name(i + 1)
        items.append(Text(MARGIN + 22, middle - 1, f"{i + 1}", own, TEXT, True, "right"))
        items.append(Text(MARGIN + 32, middle - 1, hertz(rows.hz[i]), tokens.ink, TEXT_SMALL))
        if name and side >= 38:
            items.append(Text(MARGIN + 32, middle + 16, fitted(name, LEFT - MARGIN - 44), tokens.soft, TEXT_SMALL))
    size = TEXT_SMALL if side >= 56 else 12.0
    for j in range(across):
        middle = LEFT + (j + 0.5) * side
        items.append(Text(middle, TOP - 28, f"{j + 1}", other, TEXT, True, "middle"))
        words = hertz(columns.hz[j]) if side >= 64 else f"{columns.hz[j]:.0f}"
        items.append(Text(middle, TOP - 9, words, tokens.ink, size, False, "middle"))
    for i in range(down):
        for j in range(across):
            items += _cell(float(matrix[i, j]), i, j, (i, j) in framed, side, size, theme)
    spots = [
        Spot(
            corners((LEFT + j * side, TOP + i * side, LEFT + (j + 1) * side, TOP + (i + 1) * side)),
            (i + 1, j + 1),
            f"mode {i + 1} of {rows.name} and mode {j + 1} of {columns.name}: {matrix[i, j]:.2f}",
        )
        for i in range(down)
        for j in range(across)
    ]
    return chart_sheet(tokens, title, notes, items, height, spots)


def _cell(value: float, i: int, j: int, framed: bool, side: float, size: float, theme: str) -> list[Primitive]:
    tokens = THEMES[theme]
    left, top = LEFT + j * side, TOP + i * side
    colour = blend(tokens.body, tokens.ink, 0.85 * value)
    items: list[Primitive] = [rectangle((left + 1, top + 1, left + side - 1, top + side - 1), colour)]
    if value >= SAID:
        middle = (left + side / 2, top + side / 2 + 0.36 * size)
        items.append(Text(*middle, f"{value:.2f}", readable_on(colour, tokens), size, value >= 0.5, "middle"))
    if framed:
        low, high = 2.5, side - 2.5
        around = (*corners((left + low, top + low, left + high, top + high)), (left + low, top + low))
        items.append(Line(around, tokens.accent, 3.0))
    return items


def _frequencies(pairing: Pairing) -> tuple[list[float], list[float]]:
    first = {p.first: p.first_hz or 0.0 for p in pairing.pairs if p.first}
    second = {p.second: p.second_hz or 0.0 for p in pairing.pairs if p.second}
    return [first[k + 1] for k in range(len(first))], [second[k + 1] for k in range(len(second))]
