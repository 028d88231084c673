"""What the window knows and says, without a window: questions, pictures, words, rail, gallery, picking, names."""

from __future__ import annotations

from math import pi

import numpy as np
import pytest

from tests.session_parts import write_strip
from viewer.errors import InputError, RefusedError
from viewer.scene.compose import single_picture
from viewer.session import Project, State, actions
from viewer.session.gallery import items, passing
from viewer.session.loading import open_project, read_study, sample
from viewer.session.picking import nearest_node, read_off
from viewer.session.pictures import fitted_by, picture_of, wanted
from viewer.session.questions import next_question
from viewer.session.rail import rail_of
from viewer.session.saving import save_names
from viewer.session.state import Band, Picked
from viewer.session.words import as_text, entries
from viewer.stage import Stage


def test_what_is_seen_is_asked_first(known):
    """The chosen design, then the chosen mode, then the comparison, then the rest, each once."""
    _, asked = known
    assert asked[:4] == ["study", "explain", "study", "pair"]
    assert asked.count("study") == 2 and asked.count("explain") == 8 and asked.count("compare") == 1


def test_a_question_asked_in_vain_is_not_asked_again(folder):
    project, state = open_project(folder), State(design="thin")
    first = next_question(project, state, frozenset())
    assert first is not None and first.kind == "study"
    assert next_question(project, state, frozenset({first})) is None


def test_the_stage_draws_what_the_command_line_draws(project, state):
    """Nothing of the window gets between a study and its picture."""
    mine = picture_of(project, state)
    theirs = single_picture(project.studies["thin"], 1, finding=project.told["thin", 1].hinges)
    assert mine.note == theirs.note and (mine.width, mine.height) == (theirs.width, theirs.height)
    with Stage(mine) as one, Stage(theirs) as two:
        assert (one.image(0.4) == two.image(0.4)).all()


def test_true_scale_and_enlarging(project, state):
    drawn = picture_of(project, state)
    assert picture_of(project, actions.true_scale(state)).magnification == 1.0
    half = picture_of(project, actions.enlarge(state, 0.5))
    assert half.magnification == pytest.approx(drawn.magnification / 2)
    unknown = actions.choose_mode(actions.true_scale(state), 2, project)
    assert picture_of(project, unknown).magnification is None, "a mode without size is drawn as it is without wish"


def test_pairs(project, state):
    side = picture_of(project, actions.compare(state, "side"))
    assert [body.name for body in side.bodies] == ["thin", "thick"] and side.layout == "side"
    over = picture_of(project, actions.compare(state, "overlay"))
    assert over.layout == "overlay"
    apart = picture_of(project, actions.compare(state, "difference"))
    assert len(apart.bodies) == 1
    assert wanted(open_project(project.opened.dossier.path), actions.compare(state, "side")) == ("thin", "thick")


def test_one_design_alone_is_not_compared(project, state):
    alone = Project(project.opened, studies=project.studies)
    with pytest.raises(RefusedError):
        picture_of(alone, actions.compare(state, "side").with_(other_mode=None, mode=9))


def test_the_camera_stays_while_only_the_look_changes(state):
    for action, what in ((actions.switch, "ghost"), (actions.switch, "energy"), (actions.enlarge, 0.3)):
        assert fitted_by(action(state, what)) == fitted_by(state)
    assert fitted_by(actions.true_scale(state)) == fitted_by(state)
    assert fitted_by(actions.look_from(state, "top")) != fitted_by(state)
    assert fitted_by(actions.choose_mode(state, 2)) != fitted_by(state)


def test_words_in_order(project, state):
    said = entries(project, state)
    assert [e.subject for e in said] == ["does", "folds", "size", "matters", "model", "redesign", "change"]
    by = {e.subject: e for e in said}
    assert "12\u00a0µm" in by["size"].sentence and "fan at 20 Hz" in by["size"].sentence
    assert not by["model"].known and "[[tests]]" in by["model"].sentence
    assert by["redesign"].sentence.startswith("Mode 1 of thin")
    assert not by["does"].sentence.startswith("Mode 1"), "the mode stands above the sentences"
    text = as_text(project, state)
    assert text.splitlines()[0] == "Strip (invented)" and all(e.sentence in text for e in said)


def test_words_say_what_would_answer(project, state):
    by = {e.subject: e for e in entries(project, actions.choose_mode(state, 2, project))}
    assert not by["size"].known and "[[amplitudes]]" in by["size"].sentence


def test_the_rail_goes_from_true_to_beyond_what_is_drawn(project, state):
    scale = project.studies["thin"].scale(0)
    rail = rail_of(scale, False, 1.0)
    assert rail.known and rail.at == rail.drawn < 1.0
    assert rail.ticks[0].words == "×1 true" and rail.ticks[0].at == 0.0
    assert rail.enlarged_at(rail.drawn) == pytest.approx(1.0)
    assert rail.enlarged_at(0.0) is None, "its end is true scale"
    assert rail_of(scale, True, 1.0).at == 0.0
    half = (rail.place(100.0) + rail.place(1.0)) / 2
    assert rail.enlarged_at(half) * scale.magnification == pytest.approx(10.0), "it is logarithmic"


def test_a_rail_without_size_says_what_to_give(project):
    rail = rail_of(project.studies["thin"].scale(1), False, 1.0)
    assert not rail.known and "[[amplitudes]]" in rail.hint and "diagonal" in rail.label
    assert all(0 <= tick.at <= 1 for tick in rail.ticks)
    assert rail.enlarged_at(rail.drawn) == pytest.approx(1.0)


def test_the_gallery_filters_by_what_matters(project, state):
    study = project.studies["thin"]
    hz = study.modes.freq_hz
    assert passing(study, Band()) == (1, 2, 3, 4)
    assert passing(study, Band(low=(hz[0] + hz[1]) / 2)) == (2, 3, 4)
    assert passing(study, Band(high=(hz[0] + hz[1]) / 2)) == (1,)
    tip = study.design.mesh.used_nodes[np.argmin(np.abs(study.design.mesh.points - [0.3, 0.03, 0]).sum(axis=1))]
    moving = {
        i + 1 for i in range(4) if abs(study.modes.shape(i)[tip, 2]) >= 0.05 * np.abs(study.modes.shape(i)).max()
    }
    assert set(passing(study, Band(moving="tip"))) == moving
    named = actions.rename(state, "thin", 2, "strip waves")
    assert items(project, named)[1].name == "strip waves"


def test_picking_hits_what_is_in_front(project, state):
    """The node whose drawn place is pointed at is found at any phase; beside the body nothing is."""
    picture = picture_of(project, state, (960, 600))
    with Stage(picture) as stage:
        body, camera, box = picture.bodies[0], stage.camera(), stage.boxes[0]
        for row, phase in ((0, 0.0), (60, 1.0), (104, pi)):
            moved = body.mesh.points[row] + body.factor * body.shape[row] * np.cos(phase)
            x, y = camera.project(moved[None], box)[0]
            inward = camera.project((0.98 * moved + 0.02 * body.mesh.points.mean(axis=0))[None], box)[0]
            assert nearest_node(body, camera, box, phase, *inward) == row, (x, y)
        assert nearest_node(body, camera, box, 0.0, 3.0, 3.0) == -1
    reading = read_off(project, picture, "thin", Picked(104))
    real = project.studies["thin"].scale(0).real_per_shape * np.linalg.norm(body.shape[104])
    assert f"{1e6 * real:.0f}" in reading.lines[1] and "real" in reading.lines[1]
    assert read_off(project, picture, "thin", Picked(10**6)) is None
    assert read_off(project, picture, "thin", Picked(name="tip")).title == "tip"


def test_names_are_saved_into_the_dossier(tmp_path, project):
    dossier = write_strip(tmp_path)
    own = open_project(dossier)
    save_names(own, actions.rename(State(design="thin"), "thin", 2, "waves"))
    text = dossier.read_text(encoding="utf-8")
    assert '2 = "waves"' in text and "# as it is" in text
    with pytest.raises(RefusedError):
        save_names(Project(own.opened, can_save=False), actions.rename(State(design="thin"), "thin", 2, "x"))


def test_a_bare_mesh_with_modes(tmp_path, project):
    from viewer.loaders import write_interchange

    study = project.studies["thin"]
    both = write_interchange(tmp_path / "both.vtu", study.design.mesh, study.modes)
    opened = open_project(both)
    assert not opened.can_save
    studied = opened.with_study("both", read_study(opened.opened, "both"))
    assert studied.count("both") == 4
    assert picture_of(studied, State(design="both")).bodies[0].name == "both"
    assert entries(studied, State(design="both"))


def test_a_bare_mesh_without_modes_says_what_to_give(folder):
    with pytest.raises(InputError) as caught:
        open_project(folder / "strip.npz")
    assert "hingelight check" in str(caught.value) and "strip.npz" in str(caught.value)


def test_the_sample_is_found():
    found = sample()
    assert found is not None and (found / "dossier.toml").is_file()
