"""A thousand random commands, clicks, drags and turns of the wheel, seeded: nothing breaks, nothing grows."""

from __future__ import annotations

import gc
import sys
from pathlib import Path

import numpy as np
import pytest

from tests.session_parts import write_strip

ACTIONS, WARM, EVERY = 1000, 300, 100
GROWTH = 0.10
SIZE = (900, 600)  # the least: drawing without a GPU takes most of the time
LEFT_OUT = {"open_file", "export", "close_window", "show_menu", "save_names"}  # ask the user, or end the test


def _resident() -> int:
    """Bytes of this process in memory."""
    pages = int(Path("/proc/self/statm").read_text().split()[1])
    return 4096 * pages


@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="memory is read from /proc")
def test_a_thousand_actions(make_window, until, settled, app, monkeypatch, tmp_path):
    from PySide6.QtCore import QPoint, QPointF, Qt
    from PySide6.QtGui import QWheelEvent
    from PySide6.QtTest import QTest

    errors: list[object] = []
    monkeypatch.setattr(sys, "excepthook", lambda *found: errors.append(found))
    monkeypatch.setattr(sys, "unraisablehook", lambda found: errors.append(found))
    window = make_window(write_strip(tmp_path / "strip"), size=SIZE)
    settled(window)
    draw = np.random.default_rng(7)
    commands = [a for a in window.actions() if a.data() is not None and a.data().name not in LEFT_OUT]
    places = [window.canvas, window.rail, window.gallery.viewport(), window.words]

    def click(widget) -> None:
        at = QPoint(int(draw.integers(widget.width())), int(draw.integers(widget.height())))
        QTest.mouseClick(widget, Qt.MouseButton.LeftButton, Qt.KeyboardModifier.NoModifier, at)

    def drag(widget) -> None:
        ends = [QPoint(int(draw.integers(widget.width())), int(draw.integers(widget.height()))) for _ in range(2)]
        button = Qt.MouseButton.MiddleButton if draw.random() < 0.3 else Qt.MouseButton.LeftButton
        QTest.mousePress(widget, button, Qt.KeyboardModifier.NoModifier, ends[0])
        QTest.mouseMove(widget, (ends[0] + ends[1]) / 2)
        QTest.mouseMove(widget, ends[1])
        QTest.mouseRelease(widget, button, Qt.KeyboardModifier.NoModifier, ends[1])

    def wheel(widget) -> None:
        at = QPointF(widget.width() / 2, widget.height() / 2)
        turn = QPoint(0, int(draw.choice([-120, 120])))
        event = QWheelEvent(
            at,
            widget.mapToGlobal(at),
            QPoint(),
            turn,
            Qt.MouseButton.NoButton,
            Qt.KeyboardModifier.NoModifier,
            Qt.ScrollPhase.NoScrollPhase,
            False,
        )
        app.sendEvent(widget, event)

    def letter() -> None:
        QTest.keyClick(window, Qt.Key(int(draw.integers(Qt.Key.Key_A.value, Qt.Key.Key_Z.value + 1))))

    resident = []
    for number in range(ACTIONS):
        kind = draw.random()
        if kind < 0.65:
            commands[int(draw.integers(len(commands)))].trigger()
        elif kind < 0.75:
            click(places[int(draw.integers(len(places)))])
        elif kind < 0.85:
            drag(places[int(draw.integers(2))])
        elif kind < 0.9:
            wheel(window.canvas)
        elif kind < 0.95:
            letter()
        else:
            window.resize(*(int(draw.integers(least, least + 60)) for least in SIZE))
        app.processEvents()
        if number % EVERY == EVERY - 1:
            settled(window)
            gc.collect()
            resident.append(_resident())
        assert not errors, (number, errors)
    settled(window)
    assert window.conductor.alive, "a worker died"
    warm = resident[WARM // EVERY - 1 :]
    assert max(warm) <= (1 + GROWTH) * warm[0], resident
    # it still does what it is asked
    window.session.do(lambda state: state.with_(mode=1, layout="single", page="stage", true_scale=False))
    settled(window)
    assert window.canvas.picture.layout == "single"
