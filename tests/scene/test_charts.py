"""The flat charts of pairing and lineage: figures that are drawn, places of lines, words that stay on the sheet."""

from __future__ import annotations

import numpy as np
import pytest

from viewer.insight.common_support import CommonSupport
from viewer.insight.lineage import follow
from viewer.insight.pairing import ModePair, Pairing
from viewer.model.variation import Unit
from viewer.scene.chart import apart, blend, contrast, fitted, readable_on, ticks
from viewer.scene.ladder_chart import RAILS, ladder_chart
from viewer.scene.lineage_chart import FOOT, LEFT, RIGHT, TOP, dash_of, lineage_chart, marker
from viewer.scene.mac_chart import mac_chart
from viewer.scene.primitives import Line, Polygon, Ring, Text
from viewer.scene.tokens import THEMES
from viewer.scene.typeface import text_width

NAMES = ("nods at the cable window and sways a little beside it, which is a long name", "sways", "")


def pairing(count: int = 3) -> Pairing:
    """Modes 1 and 2 change places, the third is gone, another one is new."""
    matrix = np.full((count, count), 0.01)
    matrix[0, 1], matrix[1, 0], matrix[2, 2] = 0.97, 0.62, 0.04
    pairs = [
        ModePair("paired", 1, 2, 10.0, 21.0, 0.97),
        ModePair("paired", 2, 1, 20.0, 15.0, 0.62),
        ModePair("vanished", 3, None, 30.0, None, 0.04),
        ModePair("new", None, 3, None, 50.0, 0.04),
    ]
    for k in range(3, count):
        matrix[k, k] = 0.9
        pairs.append(ModePair("paired", k + 1, k + 1, 60.0 + k, 60.5 + k, 0.9))
    support = CommonSupport(None, None, np.ones(7), (), np.zeros(7), ())  # type: ignore[arg-type]
    return Pairing("old", "new", support, matrix, tuple(pairs))


def lineage(values=(0.001, 0.002, 0.003, 0.004), unit=Unit("mm", 1e-3), **more):
    """Two modes that cross half-way, and one that is there at the first two steps only."""
    freq_hz = [np.array([10.0, 13, 16]), np.array([11.0, 12.5, 17]), np.array([12.0, 12.3]), np.array([11.5, 13])]
    same, swap = np.eye(3), np.eye(2)[::-1]
    return follow(
        values, freq_hz, [same, np.vstack([swap, np.zeros(2)]), np.eye(2)], unit=unit, parameter="sheet", **more
    )


def texts(sheet) -> list[str]:
    return [item.words for item in sheet.items if isinstance(item, Text)]


def charts(theme="light", count=3):
    labels = ["a", "b with a very long name", "c", "d"]
    return {
        "ladder": ladder_chart(pairing(count), NAMES, NAMES, theme),
        "field": mac_chart(pairing(count), NAMES, NAMES, theme),
        "lineage": lineage_chart(lineage(names=[{1: NAMES[0]}]), theme=theme),
        "designs": lineage_chart(lineage((1, 2, 3, 4), None, labels=labels), theme=theme),
    }


@pytest.mark.parametrize("theme", ["light", "dark"])
@pytest.mark.parametrize("count", [3, 12])
@pytest.mark.parametrize("chart", ["ladder", "field", "lineage", "designs"])
def test_every_word_is_on_the_sheet(chart, count, theme):
    sheet = charts(theme, count)[chart]
    for item in sheet.items:
        if isinstance(item, Text):
            wide = text_width(item.words, item.size, item.bold)
            left = item.x - {"left": 0, "middle": wide / 2, "right": wide}[item.anchor]
            assert left >= -0.5 and left + wide <= sheet.width + 0.5, item.words
            assert 0 < item.y < sheet.height, item.words


def test_the_field_says_values_and_frames_pairs():
    said = texts(charts()["field"])
    assert {"0.97", "0.62"} <= set(said) and "0.04" not in said  # below 0.05 nothing is written
    frames = [i for i in charts()["field"].items if isinstance(i, Line) and i.colour == THEMES["light"].accent]
    assert len(frames) == 2
    assert any("2 paired, 1 without counterpart, 1 new" in words for words in said)


def test_a_ribbon_for_each_pair_as_wide_as_the_shapes_agree():
    items = charts()["ladder"].items
    ribbons = [i for i in items if isinstance(i, Polygon) and {x for x, _ in i.points} == set(RAILS)]
    widths = [abs(r.points[0][1] - r.points[3][1]) for r in ribbons]
    assert len(ribbons) == 2 and widths[0] > widths[1]
    assert ribbons[0].points[0][1] > ribbons[1].points[0][1]  # 10 Hz lies below 20 Hz
    assert ribbons[0].points[1][1] < ribbons[1].points[1][1]  # and 21 Hz above 15 Hz
    said = texts(charts()["ladder"])
    assert "+110\u00a0%" in said and "−25\u00a0%" in said


def test_lines_of_a_lineage_stand_at_their_values_in_the_users_unit():
    sheet = charts()["lineage"]
    said = texts(sheet)
    assert {"1", "2", "3", "4", "sheet, mm"} <= set(said) and any("sheet 2." in words for words in said)
    tokens = THEMES["light"]
    lines = [i for i in sheet.items if isinstance(i, Line) and i.colour == tokens.baseline]
    assert sorted(len(line.points) for line in lines) == [2, 4, 4]
    for line in lines:
        assert line.points[0][0] == LEFT and all(TOP <= y <= FOOT for _, y in line.points)
    assert max(line.points[-1][0] for line in lines) == RIGHT
    marks = [i for i in sheet.items if isinstance(i, Line | Ring) and i.colour == tokens.accent]
    assert len(marks) == 2  # the two arms of a cross
    middle = np.mean([np.mean(mark.points, axis=0) for mark in marks], axis=0)
    assert LEFT + (RIGHT - LEFT) / 3 < middle[0] < LEFT + 2 * (RIGHT - LEFT) / 3


def test_designs_stand_by_name():
    said = texts(charts()["designs"])
    assert {"a", "c", "d"} <= set(said) and "natural frequencies by design" in said


# --- what charts share ---


def test_labels_keep_apart_and_within():
    placed = apart([10.0, 11.0, 12.0, 90.0, 99.0], 5.0, 0.0, 100.0)
    assert (np.diff(placed) >= 5 - 1e-9).all() and placed.min() >= 0 and placed.max() <= 100
    assert placed[:3].mean() == pytest.approx(11.0)
    assert np.diff(apart(np.zeros(50), 5.0, 0.0, 100.0)) == pytest.approx(np.full(49, 100 / 49))  # no room: evenly
    assert len(apart([], 5.0, 0.0, 100.0)) == 0


def test_ticks_are_round_and_within():
    assert ticks(0.0, 10.0, 5) == [0, 2, 4, 6, 8, 10]
    assert ticks(1.56, 1.71, 6) == pytest.approx([1.575, 1.6, 1.625, 1.65, 1.675, 1.7])


def test_colours():
    assert blend("#000000", "#FFFFFF", 0.5) == "#808080"
    assert contrast("#000000", "#FFFFFF") == pytest.approx(21)  # WCAG 2.2, definition of contrast ratio
    tokens = THEMES["light"]
    assert (
        readable_on(tokens.ink, tokens) == tokens.background and readable_on(tokens.background, tokens) == tokens.ink
    )


def test_words_are_cut_to_fit():
    assert fitted("short", 200) == "short"
    cut = fitted(NAMES[0], 100)
    assert cut.endswith("…") and text_width(cut, 14) <= 115 and NAMES[0].startswith(cut[:-1])


def test_lineages_are_told_apart_without_colour():
    looks = []
    for order in range(24):
        drawn = [
            (type(part).__name__, tuple(np.round(getattr(part, "points", ()), 3).ravel()))
            for part in marker(0.0, 0.0, order, THEMES["light"])
        ]
        looks.append((dash_of(order), tuple(drawn)))
    assert len(set(looks)) == 24
    assert all(len({looks[k][0], looks[k + 1][0]}) == 2 for k in range(23))  # neighbours differ in both
    assert all(looks[k][1] != looks[k + 1][1] for k in range(23))


def test_each_lineage_has_its_dash_and_its_marker_beside_its_name():
    sheet, tokens = charts()["lineage"], THEMES["light"]
    lines = [i for i in sheet.items if isinstance(i, Line) and i.colour == tokens.baseline]
    assert len({line.dash for line in lines}) == 3
    squares = [
        i for i in sheet.items if isinstance(i, Polygon) and i.colour == tokens.baseline and len(i.points) == 4
    ]
    level = next(i.y for i in sheet.items if isinstance(i, Text) and "mode 2" in i.words and i.x > RIGHT)
    assert any(box.box[0] > RIGHT and abs((box.box[1] + box.box[3]) / 2 - level) < 8 for box in squares)
    assert len(squares) == 5  # at each of the four steps, and beside the name
