"""A hammer test in the window: on the stage, in charts, in words, put right and taken back."""

from __future__ import annotations

from collections import Counter

import numpy as np
import pytest

from tests.integration.tested_dossier import FLIPPED, write_tested
from tests.session_parts import answer_all
from viewer.errors import RefusedError
from viewer.insight.scale import DRAWN_PEAK
from viewer.scene.primitives import Sheet
from viewer.session import State, actions
from viewer.session.charts import chart_of, put_spot, shown_spot
from viewer.session.hammer_changes import accepted, correct
from viewer.session.loading import open_project
from viewer.session.model_words import ACCEPT, TAKE_BACK
from viewer.session.pictures import has_test_shape, picture_of, require_size, scale_of, waiting
from viewer.session.questions import Question, find, learn, learn_why_not, next_question
from viewer.session.words import entries


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    return write_tested(tmp_path_factory.mktemp("tested")).parent


@pytest.fixture(scope="module")
def known(folder):
    return answer_all(open_project(folder), State(design="channel"))


@pytest.fixture
def project(known):
    return known[0]


@pytest.fixture
def state():
    return State(design="channel")


def said(project, state):
    return next(e for e in entries(project, state) if e.subject == "model")


def test_each_is_asked_once(known):
    asked = Counter(known[1])
    assert asked["test"] == asked["faults"] == 1


def test_the_test_is_asked_first_while_it_is_on_the_stage(folder, state):
    project = open_project(folder)
    project = learn(project, study := Question("study", "channel"), find(project, study))
    over = actions.compare(state, "test over")
    assert next_question(project, over, frozenset()).kind == "test" and waiting(project, over)
    assert next_question(project, state, frozenset()).kind == "explain" and not waiting(project, state)


@pytest.mark.parametrize("layout", ["test over", "test beside"])
def test_the_test_moves_with_the_analysis(project, state, layout):
    """Drawn by the modal scale factor: a channel of the test that agrees moves as the analysis does there."""
    shown = actions.compare(state, layout)
    picture = picture_of(project, shown)
    tested = project.tested("hammer")
    body = picture.bodies[-1]
    mark = next(trace for b in picture.bodies for trace in b.traces)
    assert mark.freq_hz == pytest.approx(0.97 * body.freq_hz, rel=1e-5)  # universal files keep six digits
    sign = np.sign(body.shape.ravel() @ project.studies["channel"].modes.shape(0).ravel())
    seen = sign * tested.found.analysis[0].reshape(-1, 3) @ tested.found.registration.placement.rotation.T
    right = [row for row, label in enumerate(mark.labels) if label != FLIPPED]
    assert np.abs(mark.motion[right] - seen[right]).max() < 0.05 * np.abs(seen).max()
    assert [call.lines[0] for call in mark.calls] == [FLIPPED], "what seems wrong is named on the stage"
    small = picture_of(project, actions.enlarge(shown, 0.25))
    assert small.bodies[-1].factor == pytest.approx(body.factor / 4)


def test_a_test_alone_has_no_size(project, state):
    alone = actions.compare(state, "test alone")
    assert picture_of(project, alone).magnification is None
    scale = scale_of(project, alone)
    assert scale.magnification is None and scale.drawn_percent == pytest.approx(100 * DRAWN_PEAK)
    with pytest.raises(RefusedError, match="no size"):
        require_size(project, alone)
    factor = picture_of(project, alone).bodies[0].factor
    assert picture_of(project, actions.enlarge(alone, 0.5)).bodies[0].factor == pytest.approx(factor / 2)


@pytest.mark.parametrize("page", ["test pairing", "test ladder"])
def test_a_spot_puts_the_pair_on_the_stage(project, state, page):
    shown = actions.turn_page(state, page)
    sheet = chart_of(project, shown)
    assert isinstance(sheet, Sheet)
    assert all((spot.what[1] or 0) <= 4 for spot in sheet.spots), "modes that the window lacks lead nowhere"
    after = put_spot(shown, project, next(s for s in sheet.spots if s.what == (2, 2)))
    assert (after.mode, after.test_mode, after.layout, after.page) == (2, 2, "test over", "stage")
    again = actions.turn_page(after, page)
    assert sheet.spots[shown_spot(project, again, sheet)].what == (2, 2)
    assert actions.put_test_pair(again, 3, None).layout == "test alone"
    assert actions.put_test_pair(after, None, 3).layout == "single"


def test_layouts_follow_one_another(state):
    seen = [state.layout]
    for _ in range(4):
        state = actions.next_test_layout(state)
        seen.append(state.layout)
    assert seen == ["single", "test over", "test beside", "test alone", "single"]
    assert actions.next_layout(actions.next_test_layout(state)).layout == "side", "from the test to the designs"


def test_the_sentence_lights_the_test(project, state):
    lit = actions.light(state, "model", 0, has_test_shape(project, state))
    assert lit.layout == "test over" and actions.light(lit, "model", 0, True).layout == "single"
    assert actions.light(state, "model", 0, False).layout == "single"
    beyond = actions.choose_mode(state, 9)
    assert not has_test_shape(project, beyond)


def test_a_test_that_cannot_be_laid_is_told(project, state):
    question = Question("test", "channel", other="hammer")
    refused = learn_why_not(project.with_test("hammer", ""), question, RefusedError("the points fit nowhere"))
    assert not said(refused, state).known and "the points fit nowhere" in said(refused, state).sentence
    assert "the points fit nowhere" in chart_of(refused, actions.turn_page(state, "test ladder"))
    assert not has_test_shape(refused, state)
    with pytest.raises(RefusedError):
        picture_of(refused, actions.compare(state, "test over"))


def test_what_is_wrong_is_put_right_in_the_dossier_and_taken_back(tmp_path, state):
    """The flipped channel is named, accepted, written; the agreement rises; taking it back restores the file."""
    path = write_tested(tmp_path)
    before = path.read_text(encoding="utf-8")
    project, _ = answer_all(open_project(path), state)
    entry = said(project, state)
    assert entry.known and f"point {FLIPPED}, " in entry.sentence and "sign flipped" in entry.sentence
    assert entry.offer == ACCEPT
    poor = project.tested("hammer").correlation.matrix[0, 0]
    right, asked = answer_all(correct(project, "hammer", accepted(project, "hammer")), state)
    assert asked == ["test", "faults"], "what is known of the designs stays"
    assert right.tested("hammer").correlation.matrix[0, 0] > max(poor, 0.99)
    entry = said(right, state)
    assert "Put right in the test" in entry.sentence and "Seems wrong" not in entry.sentence
    assert entry.offer == TAKE_BACK and 'kind = "flip"' in path.read_text(encoding="utf-8")
    with pytest.raises(RefusedError):
        accepted(right, "hammer")
    back, _ = answer_all(correct(right, "hammer", ()), state)
    assert path.read_text(encoding="utf-8") == before
    assert back.tested("hammer").correlation.matrix[0, 0] == pytest.approx(poor)
