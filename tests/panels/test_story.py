"""The whole story, told by keys and mouse: open, play, travel, true scale, hinge, pick, compare, rename, close."""

from __future__ import annotations

import gc
import shutil
import weakref

import numpy as np
import pytest

from tests.panels.conftest import SAMPLES
from tests.panels.looks import check_look, difference
from tests.panels.told import Told


@pytest.fixture
def boom(tmp_path):
    """A copy of the sample boom: the tests write names into it."""
    return shutil.copytree(SAMPLES / "boom", tmp_path / "boom")


@pytest.fixture
def told(make_window, boom, until, settled):
    return Told(make_window(boom), until, settled)


def test_the_story(told, boom, tmp_path):
    from PySide6.QtCore import Qt
    from PySide6.QtTest import QTest
    from PySide6.QtWidgets import QLineEdit, QPushButton

    window = told.window
    # it plays by itself, and pauses
    before = window.playback.drawn
    told.until(lambda: window.playback.drawn > before + 3, "it plays")
    told.key(Qt.Key.Key_Space)
    assert not told.state.playing and not window.playback.playing
    told.still()
    assert len(window.gallery.items.frames) == 6
    check_look(window, "light", tmp_path)
    # travel: keys, then the mouse
    told.key(Qt.Key.Key_Right)
    assert told.state.mode == 2
    told.key(Qt.Key.Key_End)
    assert told.state.mode == 6
    row = window.gallery.visualRect(window.gallery.items.index(3))
    told.click(window.gallery.viewport(), (row.center().x(), row.center().y()))
    assert told.state.mode == 4
    told.drawn()
    assert told.picture.note.title == "Mode 4 · flap flaps"
    # a hinge sentence lights up its hinge
    assert not any(h.chosen for h in told.picture.bodies[0].hinges)
    told.click(told.entry("folds"))
    told.drawn()
    assert [h.chosen for h in told.picture.bodies[0].hinges][:1] == [True]
    assert told.entry("folds").property("lit") is True
    told.still()
    check_look(window, "hinge", tmp_path)
    # no size is known: true scale is refused with what to give, and the window lives
    told.key(Qt.Key.Key_T)
    assert not told.state.true_scale
    assert "a mode shape has no size of its own" in told.text() and "[[amplitudes]]" in told.text()
    check_look(window, "refused", tmp_path)
    told.key(Qt.Key.Key_Escape)
    assert window.notice.kind == ""
    # true scale where it is known
    told.key(Qt.Key.Key_Home)
    told.key(Qt.Key.Key_T)
    told.drawn()
    assert told.picture.magnification == 1.0
    assert "true scale" in window.rail.accessibleName()
    told.still()
    check_look(window, "true_scale", tmp_path)
    told.key(Qt.Key.Key_D)
    told.drawn()
    assert told.picture.magnification > 1000
    # pick a place
    told.key(Qt.Key.Key_Escape)
    told.click(window.canvas, _place_of_tip(window))
    assert told.state.picked is not None and told.state.picked.row >= 0
    reading = window.canvas._reading
    assert any("real" in line for line in reading.lines)
    told.key(Qt.Key.Key_Escape)
    assert told.state.picked is None
    # compare
    button = next(b for b in window.header.findChildren(QPushButton) if b.text() == "side by side")
    told.click(button)
    told.until(lambda: told.picture.layout == "side", "side by side")
    told.drawn()
    assert [body.name for body in told.picture.bodies] == ["baseline", "modified"]
    assert "same phase, same camera" in " ".join(told.picture.note.drawing)
    told.still()
    check_look(window, "side", tmp_path)
    told.key(Qt.Key.Key_C)
    told.until(lambda: told.picture.layout == "overlay", "overlay")
    told.key(Qt.Key.Key_C)
    told.key(Qt.Key.Key_C)
    assert told.state.layout == "single"
    # dark
    told.key(Qt.Key.Key_L)
    told.drawn()
    assert told.picture.theme == "dark"
    told.still()
    check_look(window, "dark", tmp_path)
    # a name, saved into the dossier, whose comments stay
    told.key(Qt.Key.Key_F2)
    editor = window.gallery.findChild(QLineEdit)
    editor.selectAll()
    QTest.keyClicks(editor, "boom bows")
    QTest.keyClick(editor, Qt.Key.Key_Return)
    told.until(lambda: told.state.named == {("baseline", 1): "boom bows"}, "renamed")
    told.drawn()
    assert told.picture.note.title == "Mode 1 · boom bows"
    told.key(Qt.Key.Key_S, Qt.KeyboardModifier.ControlModifier)
    text = (boom / "dossier.toml").read_text(encoding="utf-8")
    assert '1 = "boom bows"' in text and "# where motion matters" in text
    # copy as text
    told.key(Qt.Key.Key_C, Qt.KeyboardModifier.ControlModifier)
    from PySide6.QtWidgets import QApplication

    said = QApplication.clipboard().text()
    assert "What it does:" in said and "Where it folds:" in said
    told.key(Qt.Key.Key_Q, Qt.KeyboardModifier.ControlModifier)
    assert not window.isVisible() and not window.conductor.alive


def _place_of_tip(window) -> tuple[float, float]:
    """Where the middle of the drawn body is, logical px."""
    canvas, stage = window.canvas, window.canvas._stage
    body = canvas.picture.bodies[0]
    from viewer.scene.motion import displacement

    nodes = body.mesh.nodes_of_cells(body.mesh.cell_groups["nose"])
    moved = body.mesh.points[nodes] + displacement(body.shape[nodes], body.factor, canvas._phase)
    x, y = stage.camera().project(moved.mean(axis=0)[None], stage.boxes[0])[0]
    return x * canvas.width() / 960, y * canvas.width() / 960


def test_rail_and_eye(told):
    """Dragging the handle is one step back; dragging the stage turns the eye and rebuilds nothing."""
    from PySide6.QtCore import Qt

    window = told.window
    told.key(Qt.Key.Key_Space)
    told.drawn()
    own = told.picture.magnification
    middle = (window.rail.width() // 2, window.rail.height() // 2)
    told.drag(window.rail, (middle[0] + 100, middle[1]), (middle[0] - 100, middle[1]))
    told.drawn()
    assert told.picture.magnification < own / 10
    told.key(Qt.Key.Key_Z, Qt.KeyboardModifier.ControlModifier)
    told.drawn()
    assert told.picture.magnification == pytest.approx(own)
    told.drag(window.rail, middle, (20, middle[1]))
    assert told.state.true_scale, "the end of the rail is true scale"
    told.key(Qt.Key.Key_D)
    told.drawn()
    shown, actor = told.picture, window.canvas._stage._bodies[0]
    before = window.canvas._stage.camera()
    told.drag(window.canvas, (500, 300), (620, 260))
    after = window.canvas._stage.camera()
    assert np.degrees(np.arccos(before.toward_eye @ after.toward_eye)) > 20
    told.drawn()
    assert window.canvas._stage._bodies[0] is actor and told.picture is shown
    assert after.same_as(window.canvas._stage.camera())
    told.key(Qt.Key.Key_G)
    told.drawn()
    assert not told.picture.ghost
    assert after.same_as(window.canvas._stage.camera()), "a look changes nothing about the eye"
    told.key(Qt.Key.Key_U)
    told.drawn()
    assert not after.same_as(window.canvas._stage.camera())


def test_nothing_stays_behind(make_window, boom, until, app):
    """After closing, neither widgets nor VTK objects live on."""
    from PySide6.QtCore import QEvent

    window = make_window(boom)
    parts = (window, window.canvas, window.conductor, window.deeds, window.session, window.words, window.gallery)
    drawn = (window.canvas._stage, window.canvas._plotter, window.canvas._plotter.render_window)
    held = [weakref.ref(part) for part in (*parts, *drawn)]
    names = [type(part).__name__ for part in (*parts, *drawn)]
    window.close()
    window.deleteLater()
    make_window.made.clear()
    del window, parts, drawn
    app.sendPostedEvents(None, QEvent.Type.DeferredDelete)
    app.processEvents()
    gc.collect()
    assert [name for name, ref in zip(names, held, strict=True) if ref() is not None] == []


def test_the_measure_tells_pictures_apart():
    """A picture without its body, or in other colours, is not taken for the accepted one."""
    from PIL import Image

    from tests.panels.looks import ACCEPTED, FAR_SHARE, MEAN

    accepted = {path.stem: np.asarray(Image.open(path).convert("RGB")) for path in ACCEPTED.glob("*.png")}
    for name, other in (("light", "dark"), ("light", "side"), ("light", "hinge"), ("light", "true_scale")):
        mean, share = difference(accepted[name], accepted[other])
        assert mean > MEAN or share > FAR_SHARE, (name, other, mean, share)
