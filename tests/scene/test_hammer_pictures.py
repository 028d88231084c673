"""Tests in pictures: where points are and how they move, phases, words, figures at the points."""

from dataclasses import replace

import numpy as np
import pytest

from tests.scene.hammered import AT, analysis, hammered, placed, plate, rows
from tests.scene.sheets import frame_of
from viewer.errors import InputError, RefusedError
from viewer.export.frames import source_frames
from viewer.model.cycle import cycle_peaks
from viewer.model.modes import ArrayShapes
from viewer.model.testset import Correction
from viewer.scene.channel_picture import KINDS, channel_picture, faults_picture
from viewer.scene.hammer_picture import (
    FOLLOWING,
    MEASURED_ONLY,
    alone_picture,
    beside_picture,
    expanded_picture,
    over_picture,
)
from viewer.scene.motion import displacement
from viewer.scene.note_layout import note_height
from viewer.scene.placed_test import place
from viewer.scene.primitives import Disc, Line, Polygon, Text, overlap
from viewer.scene.sheet import plan_sheet
from viewer.scene.strip_sheet import strip_layout
from viewer.scene.tokens import THEMES
from viewer.scene.trace_marks import bead_radii
from viewer.workspace.study import study

COMAC = np.linspace(1.0, 0.3, 17)  # one figure a channel


def over(mode=1, test=None, **changes):
    return over_picture(plate(), mode, test or placed(), mode, analysis(mode), **changes)


def beside(mode=1, test=None, **changes):
    return beside_picture(plate(), mode, test or placed(), mode, analysis(mode), **changes)


def trace(picture):
    (mark,) = picture.bodies[0].traces
    return mark


def drawn(mark, body, phase=0.0):
    return displacement(mark.motion, body.factor, phase)


def texts(sheet):
    return [item for item in sheet.fixed if isinstance(item, Text)]


PICTURES = {
    "over": lambda **look: over(mac=0.97, labels="all", **look),
    "beside": lambda **look: beside(mac=0.97, **look),
    "alone": lambda **look: alone_picture(placed(30), 2, labels="all", **look),
    "expanded": lambda **look: expanded_picture(plate(), 1, placed(), "expanded from 17 channels", **look),
    "figures": lambda **look: channel_picture(plate(), placed(), COMAC, "comac", **look),
    "faults": lambda **look: faults_picture(plate(), placed(), PROPOSED, **look),
}
PROPOSED = (
    (Correction("flip", "3", "z"), ("MAC 0.71 → 0.98 on average",)),
    (Correction("move", "5", other="9"), ("MAC 0.90 → 0.97 on average",)),
)


# ---- place and motion


def test_points_lie_where_they_were_measured():
    assert placed().points == pytest.approx(plate().design.mesh.points[list(rows())], abs=1e-12)
    assert trace(over()).points == pytest.approx(placed().points)


@pytest.mark.parametrize("mode", [1, 2, 3])
def test_a_test_that_agrees_moves_with_the_body_it_is_drawn_on(mode):
    # the measured shapes are 0.4·exp(2.1i) times those of the plate, turned: that must be seen through
    picture = over(mode)
    body = picture.bodies[0]
    mark = trace(picture)
    assert drawn(mark, body) == pytest.approx(body.factor * body.shape[list(rows())], abs=1e-9)
    assert body.standing
    assert "drawn in phase: phase scatter below 0.1° left out" in picture.note.drawing


def test_a_channel_with_the_wrong_sign_leaves_the_body():
    test = placed()
    row = test.row("12")
    flipped = test.test.shapes.copy()
    flipped[:, test.test.channels_of(row)] *= -1
    picture = over(1, replace(test, test=test.test.with_(shapes=flipped)))
    body = picture.bodies[0]
    away = drawn(trace(picture), body) - body.factor * body.shape[list(rows())]
    assert np.argmax(np.linalg.norm(away, axis=1)) == row
    # the opposite of the body's motion along z, at a size that the one wrong channel lowers
    assert np.sign(drawn(trace(picture), body)[row, 2]) == -np.sign(body.shape[rows()[row], 2])


def test_directions_that_nobody_measured_follow_the_body_and_the_note_says_so():
    picture = over(2)
    assert FOLLOWING in picture.note.drawing
    assert not np.any(placed().motion(2)[1, [0, 1]])  # point 2 has a channel along z only
    body = picture.bodies[0]
    assert trace(picture).motion[1] == pytest.approx(body.shape[rows()[1]], abs=1e-12)


def test_beside_the_analysis_points_move_as_measured_alone():
    picture = beside(2)
    left, right = picture.bodies
    assert (left.form, right.form, right.traces) == ("ghost", "solid", ())
    assert left.factor == right.factor and left.mesh is right.mesh and not np.any(left.shape)
    assert MEASURED_ONLY in picture.note.drawing
    along = placed().directions
    wanted = right.shape[np.array(rows())[placed().test.sensor]]
    mine = trace(picture).motion[placed().test.sensor]
    assert np.vecdot(mine, along) == pytest.approx(np.vecdot(wanted, along), abs=1e-9)
    frame = frame_of(picture)
    at = [frame.project(left.mesh.points[[5]], k)[0] for k in (0, 1)]
    assert at[1] - at[0] == pytest.approx(
        [frame.boxes[1][0] - frame.boxes[0][0], frame.boxes[1][1] - frame.boxes[0][1]], abs=1e-9
    )


def test_alone_the_largest_motion_is_eight_percent_of_the_diagonal():
    picture = alone_picture(placed(), 1)
    (body,) = picture.bodies
    size = np.linalg.norm(np.ptp(placed().points, axis=0))
    assert cycle_peaks(body.factor * trace(picture).motion).max() == pytest.approx(0.08 * size)
    assert trace(picture).stems and trace(picture).at_rest
    assert picture.note.title == "Test mode 1"


def test_an_expanded_shape_is_drawn_with_what_was_measured_on_it():
    mesh, modes = plate().design.mesh, plate().modes
    measured = modes.with_(
        shapes=ArrayShapes(0.4 * np.exp(2.1j) * np.array([modes.shape(k) for k in range(4)])), origin="measured"
    )
    expanded = study(plate().design, measured)
    picture = expanded_picture(expanded, 2, placed(), "expanded from 17 channels on 4 analysis modes", name="twists")
    (body,) = picture.bodies
    assert body.mesh is mesh and body.standing
    assert drawn(trace(picture), body) == pytest.approx(body.factor * body.shape[list(rows())], abs=1e-9)
    assert picture.note.title == "Test mode 2 · twists"
    assert picture.note.drawing[0] == "expanded from 17 channels on 4 analysis modes"
    kept = expanded_picture(expanded, 2, placed(), keep_phases=True).bodies[0]
    assert np.iscomplexobj(kept.shape)


# ---- phases


@pytest.mark.parametrize(("degrees", "kept"), [(0, False), (6, False), (12, True), (25, True)])
def test_phases_are_kept_where_they_are_seen_and_told(degrees, kept):
    # channels of like size by turns ahead and behind: the best common line lies between them
    test = hammered()
    signs = np.where(np.arange(test.n_channels) % 2 == 0, 1, -1)
    shapes = np.tile(np.exp(1j * np.radians(degrees) * signs), (4, 1)) * np.exp(0.7j)
    even = placed(shapes=shapes).test.only(np.arange(test.n_channels - test.n_channels % 2))
    shown = place(even, placed().placement)
    assert shown.phase_scatter_deg(1) == pytest.approx(degrees, abs=1e-6)
    picture = alone_picture(shown, 1)
    assert picture.bodies[0].standing is not kept
    assert len(set(source_frames(picture))) == (40 if kept else 21)
    said = f"measured phases kept: phase scatter up to {degrees}°"
    assert (said in picture.note.drawing) is kept


def test_a_real_test_has_no_phases_to_speak_of():
    test = placed(shapes=hammered().shapes.real)
    assert test.phase_scatter_deg(1) == 0
    for picture in (over(1, test), alone_picture(test, 1)):
        assert picture.bodies[0].standing
        assert not any("phase" in words and "scatter" in words for words in picture.note.drawing)


def test_a_small_channel_does_not_set_the_phase_scatter():
    shapes = np.ones((4, hammered().n_channels), complex)
    shapes[:, 0] = 0.02j
    assert placed(shapes=shapes).phase_scatter_deg(1) < 1.0
    shapes[:, 0] = 0.2j
    assert placed(shapes=shapes).phase_scatter_deg(1) > 80.0


# ---- words


@pytest.mark.parametrize("theme", THEMES)
@pytest.mark.parametrize("width", [960, 640])
@pytest.mark.parametrize("which", PICTURES)
def test_words_are_on_the_sheet_legible_and_apart(which, width, theme):
    picture = PICTURES[which](theme=theme, width=width)
    frame = frame_of(picture)
    plan = plan_sheet(picture, frame)
    assert picture.height % 16 == 0
    top = frame.height - note_height(picture)
    found = texts(plan.at(0.0))
    for item in found:
        left, above, right, foot = item.box
        assert item.size >= 14, item.words  # 9.3 px on a frame 640 wide, as LOOK has it
        assert left >= 0 and right <= frame.width and above >= 0 and foot <= frame.height, item.words
        assert not above < top < foot, item.words
    boxes = [placed_label.box for placed_label in plan.labels]
    assert not any(overlap(a, b) for k, a in enumerate(boxes) for b in boxes[:k])
    words = [item.words for item in found]
    assert all(any(call.lines[0] in word for word in words) for call in trace(picture).calls)


@pytest.mark.parametrize("make", [over, beside])
def test_the_keys_name_both_sides_with_their_frequencies(make):
    picture = make(mac=0.9961)
    sheet = plan_sheet(picture, frame_of(picture)).at(0.0)
    words = " ".join(item.words for item in texts(sheet))
    test_hz, own_hz = 1.02 * plate().modes.freq_hz[0], plate().modes.freq_hz[0]
    for said in (
        "test: hammer",
        f"analysis: {plate().design.name}",
        f"{test_hz:.1f}",
        f"{own_hz:.1f}",
        "−2.0",
        "MAC 0.996",
    ):
        assert said in words
    key = next(item for item in texts(sheet) if item.words.startswith("test: hammer"))
    assert key.colour == THEMES["light"].test
    beads = [item for item in sheet.fixed if isinstance(item, Disc) and item.colour == key.colour]
    assert len(beads) >= 2 and all(abs(bead.y - key.y) < 10 for bead in beads)


def test_corrections_are_noted_in_every_picture():
    corrected = placed(corrections=(Correction("flip", "3", "z"),))
    said = "1 corrected: point 3, +Z: sign flipped"
    makers = (
        lambda: over(1, corrected),
        lambda: beside(1, corrected),
        lambda: alone_picture(corrected, 1),
        lambda: expanded_picture(plate(), 1, corrected),
        lambda: channel_picture(plate(), corrected, COMAC, "comac"),
        lambda: faults_picture(plate(), corrected, ()),
    )
    for make in makers:
        assert said in make().note.condition


def test_what_is_not_there_is_said():
    with pytest.raises(InputError, match="no mode 9"):
        alone_picture(placed(), 9)
    with pytest.raises(InputError, match="no mode 9"):
        over_picture(plate(), 9, placed(), 1, analysis(1))
    with pytest.raises(InputError, match="no point '99'"):
        over(labels=("99",))
    still = placed(shapes=np.zeros((4, hammered().n_channels)))
    for draw in (lambda: over(1, still), lambda: alone_picture(still, 1)):
        with pytest.raises(RefusedError, match="cannot be drawn"):
            draw()


# ---- figures at the points


def test_beads_grow_with_the_figure_and_the_worst_are_told():
    picture = channel_picture(plate(), placed(), COMAC, "comac", told=2)
    mark, test = trace(picture), placed().test
    worst = [COMAC[test.channels_of(point)].min() for point in range(len(AT))]
    radii = bead_radii(mark, picture.bodies[0].mesh.diagonal)
    assert np.argsort(radii).tolist() == np.argsort(-np.array(worst), kind="stable").tolist()
    areas = radii**2  # even steps of the figure are even steps of area
    slope = np.polyfit(worst, areas, 1)
    assert areas == pytest.approx(np.polyval(slope, worst), rel=1e-9)
    order = np.argsort(worst)
    named = [f"point {test.labels[p]}" for p in order[:2]]
    assert [call.lines[0].rsplit(" ", 1)[0] for call in mark.calls] == named
    assert [call.lines[1] for call in mark.calls] == [f"{worst[p]:.2f}" for p in order[:2]]
    assert picture.bodies[0].factor == 0 and "drawn at rest" in picture.note.condition


def test_the_scale_of_beads_is_as_large_as_the_beads():
    picture = channel_picture(plate(), placed(), np.full(len(COMAC), 0.5), "comac", told=0)
    frame = frame_of(picture)
    sheet = plan_sheet(picture, frame).at(0.0)
    radii = bead_radii(trace(picture), picture.bodies[0].mesh.diagonal) / frame.metres_per_pixel
    sample = next(item for item in texts(sheet) if item.words == "0.50")
    discs = [item for item in sheet.fixed if isinstance(item, Disc) and abs(item.y - sample.y) < 12]
    beside_it = min(discs, key=lambda disc: abs(sample.x - disc.x - disc.radius - 7))
    assert beside_it.radius == pytest.approx(radii[0])


def test_points_without_a_figure_are_hollow_and_the_scale_says_so():
    values = COMAC.copy()
    values[placed().test.channels_of(4)] = np.nan
    picture = channel_picture(plate(), placed(), values, "comac")
    assert np.isnan(trace(picture).weights[4])
    assert picture.bead_scale is not None and picture.bead_scale[1][-1][1] == "not used"


@pytest.mark.parametrize(("most", "end"), [(0.07, 0.08), (0.4, 0.4), (0.41, 0.6), (1.7, 2.0), (0.0, 1.0)])
def test_an_open_scale_ends_at_a_round_figure(most, end):
    values = np.zeros(len(COMAC))
    values[3] = most
    picture = channel_picture(plate(), placed(), values, "ecomac")
    assert np.nanmax(trace(picture).weights) == pytest.approx(most / end)


@pytest.mark.parametrize("kind", KINDS)
def test_no_channel_with_a_figure_at_all(kind):
    picture = channel_picture(plate(), placed(), np.full(len(COMAC), np.nan), kind)
    assert trace(picture).calls == () and np.isnan(trace(picture).weights).all()


def test_what_may_be_wrong_is_ringed_and_asked():
    picture = faults_picture(plate(), placed(), PROPOSED)
    first, second = trace(picture).calls
    assert first.ringed and first.lines[0] == "point 3, +Z: sign flipped?"
    assert second.lines[0] == "points 5 and 9: readings exchanged?"
    assert second.target == pytest.approx(placed().points[8])
    assert picture.note.title == "2 corrections proposed"
    assert any("not applied" in words for words in picture.note.drawing)
    moved = Correction("move", "2", position=tuple(placed().test.points[6]))
    (call,) = trace(faults_picture(plate(), placed(), [(moved, ())])).calls
    assert call.target == pytest.approx(placed().points[6])
    assert faults_picture(plate(), placed(), ()).note.title == "No channel seems wrong"


def test_other_pictures_have_no_keys_of_tests():
    picture = over()
    bare = picture.with_(bodies=(replace(picture.bodies[0], traces=()),))
    items = plan_sheet(bare, frame_of(bare)).at(0.0).fixed
    assert not any("test:" in item.words for item in items if isinstance(item, Text))
    assert sum(isinstance(item, Line | Polygon) for item in items) > 0


def test_the_strip_names_both_sides_too():
    strip = strip_layout(over())
    words = [item.words for item in strip.sheet.items if isinstance(item, Text)]
    hz = plate().modes.freq_hz[0]
    assert any(f"test: hammer  {1.02 * hz:.1f}" in said for said in words)
    assert any(f"{hz:.1f}" in said and said.startswith("analysis") for said in words)
    lowest = max(item.y for item in strip.sheet.items if isinstance(item, Text) and "hammer" in item.words)
    assert lowest < strip.cells[0][0][1]
