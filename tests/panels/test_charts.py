"""Chart pages: painted as exports are, and by mouse and keys the way to a pair on the stage."""

from __future__ import annotations

import sys

import numpy as np
import pytest

from tests.integration.tested_dossier import write_tested
from tests.panels.looks import difference
from tests.panels.told import Told
from tests.session_parts import write_strip
from viewer.export.charts import sheet_image

MEAN, FAR_SHARE = 2.0, 0.01  # grey levels of 255; share of places farther off than 48: letters are hinted otherwise


@pytest.fixture
def told(make_window, until, settled, tmp_path):
    hands = Told(make_window(write_strip(tmp_path / "strip")), until, settled)
    hands.settled(hands.window)
    return hands


def opened(told, key, modifier=None) -> None:
    """A page by its key, all known."""
    told.key(key, modifier)
    told.until(lambda: told.window.chart.sheet is not None, "the chart is there")
    assert told.window.pages.currentWidget() is told.window.chart and told.window.chart.hasFocus()


def spot(told, what: tuple) -> int:
    return next(i for i, s in enumerate(told.window.chart.sheet.spots) if s.what == what)


def press(told, key) -> None:
    """A key to what has the keyboard, where real ones go: it may keep them from being commands."""
    from PySide6.QtTest import QTest

    QTest.keyClick(told.window.focusWidget(), key)


def pair_on_stage(told) -> tuple:
    told.until(lambda: told.window.pages.currentWidget() is told.window.canvas, "back on the stage")
    told.drawn()
    return told.state.mode, told.state.other_mode


def test_a_click_on_a_cell(told):
    from PySide6.QtCore import Qt

    opened(told, Qt.Key.Key_P)
    place = told.window.chart.place_of(spot(told, (2, 3)))
    told.click(told.window.chart, (place.x(), place.y()))
    assert pair_on_stage(told) == (2, 3)
    told.until(lambda: told.picture.layout == "side", "drawn")
    hz = [body.freq_hz for body in told.picture.bodies]
    studies = [told.window.session.project.study(name) for name in ("thin", "thick")]
    assert hz == pytest.approx([studies[0].modes.freq_hz[1], studies[1].modes.freq_hz[2]])
    opened(told, Qt.Key.Key_P)
    assert told.window.chart.sheet.spots[told.window.chart.spot].what == (2, 3), "it is shown where one came from"
    told.key(Qt.Key.Key_P)
    assert told.state.page == "stage", "the same key goes back"


def test_a_click_on_a_ribbon(told):
    from PySide6.QtCore import Qt

    opened(told, Qt.Key.Key_B)
    partner = told.window.session.project.partner("thin", 3, "thick")
    place = told.window.chart.place_of(spot(told, (3, partner)))
    told.click(told.window.chart, (place.x(), place.y()))
    assert pair_on_stage(told) == (3, partner)


def test_a_click_on_a_lineage(told):
    from PySide6.QtCore import Qt

    opened(told, Qt.Key.Key_K)
    place = told.window.chart.place_of(spot(told, (1, 4)))
    told.click(told.window.chart, (place.x(), place.y()))
    assert pair_on_stage(told) == (4, None)
    assert (told.state.design, told.state.layout) == ("thick", "single")


def test_keys_alone(told):
    """Arrows travel, Enter takes, Escape goes back; what is chosen is spoken."""
    from PySide6.QtCore import Qt

    opened(told, Qt.Key.Key_P)
    chart = told.window.chart
    told_spot = lambda: chart.sheet.spots[chart.spot].what  # noqa: E731
    assert told_spot() == (1, told.window.session.project.partner("thin", 1, "thick"))
    press(told, Qt.Key.Key_Down)
    press(told, Qt.Key.Key_Right)
    assert told_spot() == (2, 2) and told.state.mode == 1, "modes are not stepped meanwhile"
    assert chart.accessibleDescription() == chart.sheet.spots[chart.spot].words != ""
    press(told, Qt.Key.Key_Return)
    assert pair_on_stage(told) == (2, 2)
    opened(told, Qt.Key.Key_B)
    told.key(Qt.Key.Key_Escape)
    assert told.state.page == "stage" and told.window.canvas.hasFocus()
    told.key(Qt.Key.Key_Right)
    assert told.state.mode == 3, "on the stage arrows step the modes"
    told.key(Qt.Key.Key_Z, Qt.KeyboardModifier.ControlModifier)
    assert told.state.mode == 2


def test_beside_a_spot_nothing_happens(told):
    from PySide6.QtCore import Qt

    opened(told, Qt.Key.Key_P)
    told.click(told.window.chart, (4, 4))
    assert told.state.page == "pairing"


@pytest.mark.parametrize("key", ["P", "B", "K"])
def test_painted_as_exported(told, key):
    """Qt paints what the export writes, in light and in dark, but for the edges of letters."""
    from PIL import Image
    from PySide6.QtCore import Qt
    from PySide6.QtGui import QImage, QPainter

    from viewer.panels.sheet_painter import paint_sheet

    opened(told, getattr(Qt.Key, f"Key_{key}"))
    for _ in range(2):
        sheet = told.window.chart.sheet
        image = QImage(round(sheet.width), round(sheet.height), QImage.Format.Format_RGB888)
        image.fill(Qt.GlobalColor.white)
        with QPainter(image) as painter:
            paint_sheet(painter, sheet)
        raw = np.frombuffer(image.constBits(), np.uint8).reshape(image.height(), image.bytesPerLine())
        mine = raw[:, : 3 * image.width()].reshape(image.height(), image.width(), 3)
        theirs = sheet_image(sheet)
        small = [np.asarray(Image.fromarray(np.ascontiguousarray(a)).reduce(2)) for a in (mine, theirs)]
        mean, share = difference(*small)
        assert mean <= MEAN and share <= FAR_SHARE, (mean, share)
        blank = np.full_like(small[1], small[1][2, 2])
        assert difference(blank, small[1])[0] > 2 * mean, "an empty chart would not pass for it"
        told.key(Qt.Key.Key_L)


def test_of_a_test(make_window, until, settled, tmp_path):
    """The same charts of a hammer test, and their pairs on the stage."""
    from PySide6.QtCore import Qt

    told = Told(make_window(write_tested(tmp_path / "tested")), until, settled)
    told.settled(told.window)
    opened(told, Qt.Key.Key_P, Qt.KeyboardModifier.ShiftModifier)
    place = told.window.chart.place_of(spot(told, (2, 2)))
    told.click(told.window.chart, (place.x(), place.y()))
    told.until(lambda: told.window.pages.currentWidget() is told.window.canvas, "back on the stage")
    told.drawn()
    assert (told.state.mode, told.state.test_mode, told.state.layout) == (2, 2, "test over")
    assert told.picture.note.title.startswith("Test mode 2 · analysis mode 2")
    told.key(Qt.Key.Key_X)
    told.drawn()
    assert told.picture.layout == "side" and told.picture.bodies[0].traces
    # what is wrong is put right by the button under the sentence
    entry = told.entry("model")
    assert "sign flipped" in entry.entry.sentence
    told.click(entry.offer)
    told.until(lambda: told.window.notice.kind == "message", "written")
    told.settled(told.window)
    assert "Put right in the test" in told.entry("model").entry.sentence
    assert any("corrected" in words for words in told.picture.note.condition)


def test_painting_keeps_the_books_of_references(told):
    """PySide6 6.12.0 with Python 3.11 gives back None once too often at every overridden method, and ends the
    process after some thousand repaints."""
    count = 500
    for widget in (told.window.rail, told.window.words, told.window.chart):
        widget.repaint()
        before = sys.getrefcount(None)
        for _ in range(count):
            widget.repaint()
        assert sys.getrefcount(None) > before - count / 2, type(widget).__name__
