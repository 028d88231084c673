"""What must not happen: a bad file that closes the window, a window that cannot come again, a command without key."""

from __future__ import annotations

import gc
import subprocess
import sys
import threading

import pytest

from tests.session_parts import write_strip

TWENTY = 20


@pytest.fixture
def strip(tmp_path):
    return write_strip(tmp_path / "strip")


def test_twenty_windows_one_after_the_other(make_window, until, strip, app):
    """Opened, playing, closed: nothing is left running."""
    from PySide6.QtCore import QEvent

    before = threading.active_count()
    for number in range(TWENTY):
        window = make_window(strip)
        drawn = window.playback.drawn
        until(lambda w=window, d=drawn: w.playback.drawn > d, f"window {number} plays")
        window.close()
        assert not window.conductor.alive
        window.deleteLater()
        make_window.made.clear()
        del window
        app.sendPostedEvents(None, QEvent.Type.DeferredDelete)
        app.processEvents()
        gc.collect()
    assert threading.active_count() == before


def test_a_bad_file_is_told_and_changes_nothing(make_window, until, strip, tmp_path, settled):
    window = make_window(strip)
    settled(window)
    shown = window.canvas.picture
    bad = tmp_path / "dossier.toml"
    bad.write_text("title = 3\n[[designs]]\n", encoding="utf-8")
    for path in (bad, tmp_path / "nowhere.vtu", tmp_path):
        (tmp_path / "dossier.toml").write_text("[[[", encoding="utf-8")
        window.open(path)
        until(lambda: window.notice.kind == "error", f"{path} is told")
        assert path.name in window.notice.words or "dossier" in window.notice.words
        assert window.isVisible() and window.canvas.picture is shown
        window.deeds.dismiss()
        assert window.notice.kind == ""
    assert window.session.project.title == "Strip (invented)"


def test_a_bad_mesh_of_a_design_is_told(make_window, until, strip):
    (strip.parent / "strip.npz").write_bytes(b"not a mesh")
    window = make_window(strip)
    until(lambda: window.notice.kind == "error", "told")
    assert "strip.npz" in window.notice.words and window.isVisible()


def test_the_other_design_may_be_bad(make_window, until, strip, settled):
    """The first plays; comparing says what is wrong."""
    from PySide6.QtCore import Qt
    from PySide6.QtTest import QTest

    text = strip.read_text(encoding="utf-8").replace(
        'name = "thick"\nmesh = "strip.npz"', 'name = "thick"\nmesh = "no.npz"'
    )
    strip.write_text(text, encoding="utf-8")
    (strip.parent / "no.npz").write_bytes(b"not a mesh")
    window = make_window(strip)
    settled(window)
    until(lambda: window.canvas.image is not None, "the first plays")
    assert window.notice.kind == "", "nobody asked for the other yet"
    QTest.keyClick(window, Qt.Key.Key_C)
    until(lambda: window.notice.kind == "error", "told")
    assert "no.npz" in window.notice.words


def test_dropped_files_are_opened(make_window, until, strip, app):
    from PySide6.QtCore import QMimeData, QPoint, QPointF, Qt, QUrl
    from PySide6.QtGui import QDragEnterEvent, QDropEvent

    window = make_window()
    dragged = QMimeData()
    dragged.setUrls([QUrl.fromLocalFile(str(strip))])
    buttons, keys = Qt.MouseButton.LeftButton, Qt.KeyboardModifier.NoModifier
    enter = QDragEnterEvent(QPoint(300, 300), Qt.DropAction.CopyAction, dragged, buttons, keys)
    app.sendEvent(window, enter)
    assert enter.isAccepted()
    app.sendEvent(window, QDropEvent(QPointF(300, 300), Qt.DropAction.CopyAction, dragged, buttons, keys))
    until(lambda: window.canvas.image is not None, "opened")
    assert window.settings.recent[0] == str(strip.resolve())
    recent = [action for action in window.menu.actions() if action.data() == str(strip.resolve())]
    assert len(recent) == 1
    recent[0].trigger()
    until(lambda: not window.conductor.busy, "opened again")
    assert window.session.project.title == "Strip (invented)"


def test_every_command_has_a_key_of_its_own_and_a_deed(make_window):
    from viewer.panels.commands import COMMANDS

    window = make_window()
    keys = [key for command in COMMANDS for key in command.keys]
    assert all(command.keys for command in COMMANDS) and len(keys) == len(set(keys))
    assert all(callable(getattr(window.deeds, command.name)) for command in COMMANDS)
    in_menu = {action.text() for action in window.menu.actions()}
    assert {command.words for command in COMMANDS} <= in_menu
    assert all(action.menu() is None for action in window.menu.actions()), "no menu more than one level deep"


def test_the_sheet_of_keys_names_them_all(make_window):
    from PySide6.QtCore import Qt
    from PySide6.QtTest import QTest
    from PySide6.QtWidgets import QLabel

    from viewer.panels.commands import COMMANDS
    from viewer.panels.key_sheet import KeySheet

    window = make_window()
    QTest.keyClick(window, Qt.Key.Key_F1)
    (sheet,) = window.findChildren(KeySheet)
    assert sheet.isVisible()
    text = " ".join(label.text() for label in sheet.findChildren(QLabel))
    assert all(command.words in text for command in COMMANDS)
    QTest.keyClick(sheet, Qt.Key.Key_Escape)
    assert not sheet.isVisible()


def test_what_takes_the_keyboard_has_a_name(make_window, strip, settled):
    from PySide6.QtCore import Qt
    from PySide6.QtWidgets import QAbstractButton, QLabel, QWidget

    window = make_window(strip)
    settled(window)
    nameless = []
    for widget in window.findChildren(QWidget):
        if widget.focusPolicy() == Qt.FocusPolicy.NoFocus or isinstance(widget, QLabel) or not widget.isVisible():
            continue
        words = widget.accessibleName() or (widget.text() if isinstance(widget, QAbstractButton) else "")
        if not words:
            nameless.append((type(widget).__name__, widget.objectName()))
    assert nameless == []


def test_tab_reaches_every_panel(make_window, strip, settled, app):
    from PySide6.QtCore import Qt
    from PySide6.QtTest import QTest

    window = make_window(strip)
    settled(window)
    window.canvas.setFocus()
    reached = set()
    for _ in range(60):
        widget = app.focusWidget()
        reached.add(widget)
        QTest.keyClick(widget, Qt.Key.Key_Tab)
    wanted = {window.canvas, window.rail, window.gallery, window.header.more, *window.words.entries}
    assert wanted <= reached, [type(w).__name__ for w in wanted - reached]


def test_none_is_not_lost(make_window, strip, settled, app):
    """A Qt binding that lets go of None once too often at each overridden method ends the process after hours."""
    window = make_window(strip)
    settled(window)
    window.rail.repaint()
    before = sys.getrefcount(None)
    for _ in range(500):
        window.rail.repaint()
    assert abs(sys.getrefcount(None) - before) < 250 or sys.version_info >= (3, 12)


def test_without_the_extra_the_rest_works_and_show_says_what_to_install():
    code = """
import sys
class Blocked:
    def find_spec(self, name, path=None, target=None):
        if name.split(".")[0] in ("PySide6", "shiboken6"):
            raise ModuleNotFoundError(name)
sys.meta_path.insert(0, Blocked())
from typer.testing import CliRunner
import viewer, viewer.cli
import viewer.session, viewer.export, viewer.stage
ran = CliRunner().invoke(viewer.cli.app, ["show"])
print(ran.exit_code, ran.stderr)
"""
    ran = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert ran.stdout.startswith("1 ") and 'pip install "hingelight[window]"' in ran.stdout, ran.stdout


def test_scaled_displays(screen, strip):
    """At twice the pixels the stage is drawn with twice as many, and laid out as before."""
    code = f"""
import sys, time
from pathlib import Path
from PySide6.QtWidgets import QApplication
from viewer.panels.window import Window
app = QApplication([])
window = Window(Path({str(strip.parent / "window.json")!r}))
window.resize(900, 600)
window.show()
window.open(Path({str(strip)!r}))
end = time.monotonic() + 300
done = lambda: window.canvas.image is not None and window.canvas.picture.width == 2 * window.canvas.width()
while time.monotonic() < end and not done():
    app.processEvents()
print(window.canvas.picture.width, window.canvas.width(), window.words.width(), window.canvas.image.width())
window.close()
"""
    import os

    ran = subprocess.run(
        [sys.executable, "-c", code],
        capture_output=True,
        text=True,
        check=True,
        env={**os.environ, "QT_SCALE_FACTOR": "2"},
    )
    picture, canvas, words, image = (int(n) for n in ran.stdout.split())
    assert picture == image == 2 * canvas and words == 380
