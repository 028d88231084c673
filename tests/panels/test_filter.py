"""The gallery's filter, by its keys."""

from __future__ import annotations

import pytest

from tests.panels.told import Told
from tests.session_parts import write_strip


@pytest.fixture
def told(make_window, until, settled, tmp_path):
    hands = Told(make_window(write_strip(tmp_path / "strip")), until, settled)
    hands.settled(hands.window)
    return hands


def shown(told) -> list[int]:
    return [item.mode for item in told.window.gallery.items.items]


def test_by_band_and_point(told):
    from PySide6.QtCore import Qt
    from PySide6.QtTest import QTest

    window, bar = told.window, told.window.filter_bar
    hz = window.session.project.study("thin").modes.freq_hz
    assert not bar.isVisible() and shown(told) == [1, 2, 3, 4]
    told.key(Qt.Key.Key_F, Qt.KeyboardModifier.ControlModifier)
    assert bar.isVisible() and bar.low.hasFocus()
    QTest.keyClicks(bar.low, f"{(hz[0] + hz[1]) / 2:.0f}")
    assert shown(told) == [2, 3, 4] and "3 of 4" in bar.count.text()
    QTest.keyClicks(bar.high, f"{(hz[2] + hz[3]) / 2:.0f}")
    assert shown(told) == [2, 3]
    # keys that are commands elsewhere are letters here, and letters are no figures
    QTest.keyClicks(bar.high, "t")
    assert not told.state.true_scale and shown(told) == [2, 3]
    # travel keeps to what is shown
    told.key(Qt.Key.Key_Escape)
    assert not bar.isVisible() and shown(told) == [1, 2, 3, 4] and told.state.band.open
    # what was typed into the bar is one step back
    told.key(Qt.Key.Key_Z, Qt.KeyboardModifier.ControlModifier)
    assert shown(told) == [2, 3] and bar.isVisible()
    assert bar.high.text() == f"{(hz[2] + hz[3]) / 2:.0f}"
    told.key(Qt.Key.Key_Z, Qt.KeyboardModifier.ControlModifier)
    assert shown(told) == [1, 2, 3, 4]


def test_by_what_moves(told):
    """Chosen by keyboard: the tip is asked about up and down, so modes that sway it sideways go."""
    from PySide6.QtCore import Qt
    from PySide6.QtTest import QTest

    bar, study = told.window.filter_bar, told.window.session.project.study("thin")
    told.key(Qt.Key.Key_F, Qt.KeyboardModifier.ControlModifier)
    bar.moving.setFocus()
    QTest.keyClick(bar.moving, Qt.Key.Key_Down)
    assert told.state.band.moving == "tip"
    tip = abs(study.design.mesh.points - [0.3, 0.03, 0.0]).sum(axis=1).argmin()
    moving = [
        m for m in range(1, 5) if abs(study.modes.shape(m - 1)[tip, 2]) >= 0.05 * abs(study.modes.shape(m - 1)).max()
    ]
    assert shown(told) == moving and len(moving) < 4, "and one mode at least does not move it"


def test_travel_keeps_to_what_is_shown(told):
    from PySide6.QtCore import Qt
    from PySide6.QtTest import QTest

    bar, hz = told.window.filter_bar, told.window.session.project.study("thin").modes.freq_hz
    told.key(Qt.Key.Key_F, Qt.KeyboardModifier.ControlModifier)
    QTest.keyClicks(bar.low, f"{(hz[1] + hz[2]) / 2:.0f}")
    told.window.canvas.setFocus()
    told.key(Qt.Key.Key_Right)
    assert told.state.mode == 3
    told.key(Qt.Key.Key_Left)
    assert told.state.mode == 3, "the first that is shown"


def test_a_comma_is_no_point_and_nonsense_filters_nothing(told):
    from PySide6.QtCore import Qt
    from PySide6.QtTest import QTest

    bar = told.window.filter_bar
    told.key(Qt.Key.Key_F, Qt.KeyboardModifier.ControlModifier)
    QTest.keyClicks(bar.low, "-5,x")
    assert told.state.band.low in (None, 5.0) and shown(told) == [1, 2, 3, 4]
    assert told.window.notice.kind == ""
