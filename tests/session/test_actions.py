"""Actions are pure; history steps back and forth; settings come back as they were left."""

from __future__ import annotations

import ast
import json
import sys
from pathlib import Path

import numpy as np
import pytest

import viewer.session
from viewer.scene.picture import View
from viewer.scene.view import Camera, axes
from viewer.session import Band, History, Session, State, actions
from viewer.session.camera import orbit, pan, view_of, zoom
from viewer.session.history import DEPTH
from viewer.session.settings import Settings, read_settings, write_settings
from viewer.session.state import Picked


@pytest.fixture
def state():
    return State(design="a", other="b")


def test_actions_leave_the_state_that_they_get(state):
    before = dict(vars(state))
    for action, given in (
        (actions.choose_mode, (3,)),
        (actions.compare, ("side",)),
        (actions.light, ("folds", 2)),
        (actions.pick, (5,)),
        (actions.rename, ("a", 1, "x")),
        (actions.set_band, (Band(low=3.0),)),
        (actions.look_from, ("top",)),
        (actions.stand_at, (1.0,)),
    ):
        after = action(state, *given)
        assert after is not state and dict(vars(state)) == before
    with pytest.raises(TypeError):
        state.named["a", 1] = "y"


def test_travelling_stops_at_the_ends_and_skips_what_is_filtered(state):
    assert actions.step_mode(state, 1, (1, 4, 6)).mode == 4
    assert actions.step_mode(state.with_(mode=6), 1, (1, 4, 6)).mode == 6
    assert actions.step_mode(state.with_(mode=4), -100, (1, 4, 6)).mode == 1
    assert actions.step_mode(state.with_(mode=3), 1, (1, 4, 6)).mode == 1, "from a mode that is not shown: the first"
    assert actions.step_mode(state, 1, ()) is state


def test_lighting_goes_through_the_hinges_then_out(state):
    one = actions.light(state, "folds", 2)
    two = actions.light(one, "folds", 2)
    assert (one.subject, one.hinge, two.hinge) == ("folds", 1, 2)
    assert actions.light(two, "folds", 2).subject == ""
    assert actions.light(actions.light(state, "does"), "does").subject == ""
    beside = actions.light(state, "redesign")
    assert beside.layout == "side" and actions.unlight(beside).layout == "single"
    assert actions.light(state, "no such thing") is state


def test_another_mode_forgets_hinge_and_pair(state):
    lit = actions.light(state, "folds", 3).with_(other_mode=5)
    moved = actions.choose_mode(lit, 2)
    assert (moved.hinge, moved.other_mode) == (0, None)


def test_sizes_have_bounds(state):
    assert actions.enlarge(state, 1e9).enlarge == actions.MOST_ENLARGED
    assert actions.enlarge(state, 0.0).enlarge > 0
    assert actions.drawn_scale(actions.true_scale(state)).enlarge == 1.0


def test_undo_and_redo(state):
    session = Session(state)
    for mode in (2, 3, 4):
        session.do(actions.choose_mode, mode)
    session.undo()
    session.undo()
    assert session.state.mode == 2
    session.redo()
    assert session.state.mode == 3
    session.do(actions.choose_mode, 6)
    assert not session.can_redo
    session.undo()
    assert session.state.mode == 3


def test_one_drag_is_one_step(state):
    session = Session(state)
    for factor in (0.9, 0.8, 0.7):
        session.do(actions.enlarge, factor, join="drag")
    session.end_step()
    session.do(actions.enlarge, 0.1, join="drag")
    session.undo()
    assert session.state.enlarge == 0.7
    session.undo()
    assert session.state.enlarge == 1.0 and not session.can_undo


def test_looks_in_passing_are_not_undone(state):
    session = Session(state)
    session.do(actions.choose_mode, 2)
    session.do(actions.toggle_theme)
    session.do(actions.look_from, "top")
    session.undo()
    assert (session.state.mode, session.state.theme, session.state.view) == (1, "dark", actions.VIEWS["top"])


def test_history_has_an_end(state):
    history = History(state)
    for mode in range(2, DEPTH + 50):
        history = history.then(history.present.with_(mode=mode))
    assert len(history.past) == DEPTH


def test_listeners_hear_before_and_after(state):
    session, heard = Session(state), []
    session.listen(lambda before, after: heard.append((before.mode, after.mode)))
    session.do(actions.choose_mode, 2)
    session.do(actions.choose_mode, 2)
    session.undo()
    assert heard == [(1, 2), (2, 1)]


def test_settings_come_back(tmp_path):
    path = tmp_path / "deep" / "window.json"
    kept = Settings("dark", (1200, 800)).with_recent(Path("/a")).with_recent(Path("/b")).with_recent(Path("/a"))
    write_settings(kept, path)
    assert read_settings(path) == kept and kept.recent == ("/a", "/b")


@pytest.mark.parametrize("text", ["", "{", "[]", '{"theme": 3}', '{"theme": "dark", "size": "big", "recent": 1}'])
def test_spoilt_settings_are_the_usual_ones(tmp_path, text):
    path = tmp_path / "window.json"
    path.write_text(text, encoding="utf-8")
    assert read_settings(path) == Settings()
    path.write_text(json.dumps({"theme": "x", "size": [1, 10**9], "recent": ["/a"]}), encoding="utf-8")
    assert read_settings(path).size == (800, 8000)


def test_a_folder_that_cannot_be_written_stops_nobody(tmp_path):
    (tmp_path / "file").write_text("", encoding="utf-8")
    write_settings(Settings(), tmp_path / "file" / "window.json")


def _camera() -> Camera:
    right, up, eye = axes(View())
    return Camera(np.array([1.0, 2.0, 3.0]), right, up, eye, 0.01)


def test_the_eye_turns_about_the_centre_and_stays_upright():
    camera, centre = _camera(), np.array([0.5, 0.5, 0.5])
    turned = orbit(camera, 0.7, 0.3, centre)
    frame = np.stack([turned.right, turned.up, turned.toward_eye])
    assert frame @ frame.T == pytest.approx(np.eye(3))
    assert turned.right[2] == pytest.approx(0.0, abs=1e-12), "no roll"
    box = (0.0, 0.0, 960.0, 600.0)
    assert turned.project(centre[None], box) == pytest.approx(camera.project(centre[None], box))
    for _ in range(40):
        turned = orbit(turned, 0.0, 0.2, centre)
    assert turned.up[2] >= -1e-9, "the body is not stood on its head"
    assert view_of(camera).toward_eye == pytest.approx(tuple(camera.toward_eye))


def test_what_is_under_the_pointer_stays_there():
    camera, box = _camera(), (0.0, 0.0, 960.0, 600.0)
    point = camera.focus + 0.8 * camera.right + 0.3 * camera.up
    x, y = camera.project(point[None], box)[0]
    nearer = zoom(camera, 2.0, x, y, box)
    assert nearer.metres_per_pixel == pytest.approx(camera.metres_per_pixel / 2)
    assert nearer.project(point[None], box)[0] == pytest.approx((x, y))
    moved = pan(camera, 30.0, -10.0)
    assert moved.project(point[None], box)[0] == pytest.approx((x + 30, y - 10))


def test_session_knows_no_qt():
    """Neither written nor drawn in by what it imports."""
    for path in Path(viewer.session.__file__).parent.glob("*.py"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            names = [a.name for a in node.names] if isinstance(node, ast.Import) else []
            names += [node.module or ""] if isinstance(node, ast.ImportFrom) else []
            assert not any(name.startswith(("PySide6", "viewer.panels")) for name in names), path
    code = (
        "import sys, viewer.session, viewer.session.words, viewer.session.pictures; print('PySide6' in sys.modules)"
    )
    import subprocess

    ran = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert ran.stdout.strip() == "False"


def test_picked_places():
    assert actions.pick(State(), 4).picked == Picked(4)
    assert actions.pick(State(), name="lens").picked == Picked(name="lens")
    assert actions.pick(State(picked=Picked(1))).picked is None
