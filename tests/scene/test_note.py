"""The scale note: sentences as LOOK.md writes them, and a band that grows instead of shrinking its type."""

import numpy as np
import pytest

from tests.scene.sheets import DRIVE, HELD, NAME, frame_of, known, of_unknown_size, scale, true, unknown
from viewer.scene import figures
from viewer.scene.note_layout import EXAGGERATED, mode_title, note_height, note_items, note_knob, scale_note
from viewer.scene.sheet import Polygon, Text

PLAIN = str.maketrans({figures.THIN: " ", figures.GAP: " "})


def said(*args, **words) -> list[str]:
    """Drawing statements with ordinary spaces."""
    return [text.translate(PLAIN) for text in scale_note(*args, **words).drawing]


# ---- sentences: the quoted words are LOOK.md's ("Scale note")


def test_known_size():
    note = scale_note(1, NAME, 84.6, scale(), HELD)
    assert note.title == "Mode 1 · boom nods at the cable window"
    assert note.frequency.translate(PLAIN) == "84.6 Hz"
    assert " · ".join(note.drawing[:2]).translate(PLAIN) == (
        "drawn 8 300× larger than real · largest real motion 3.9 µm, camera lens, down"
    )
    assert note.drawing[2:] == (EXAGGERATED,)
    assert note.condition == (DRIVE, *HELD.split(" · "))


def test_thousands_are_set_apart_by_a_space_that_does_not_break():
    assert "8\u202f300×" in scale_note(1, "", 1.0, scale()).drawing[0]  # LOOK.md: "U+202F (thousands space)"


def test_unknown_size():
    assert " · ".join(said(1, NAME, 84.6, unknown())[:2]) == (
        "size arbitrary, peak (camera lens) drawn at 8 % of the diagonal"
        " · real size needs a measured point or a service condition"
    )
    assert said(1, NAME, 84.6, unknown(drawn_percent=5.62))[0].startswith(
        "size arbitrary, peak (camera lens) drawn at 5.6 % of"
    )
    assert EXAGGERATED in said(1, NAME, 84.6, unknown())


def test_true_scale_is_not_called_exaggerated():
    assert said(1, NAME, 84.6, scale(magnification=1.0)) == [
        "true scale, ×1",
        "largest real motion 3.9 µm, camera lens, down",
    ]


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"statistic": "rms"}, "largest real motion 3.9 µm rms, camera lens, down"),
        ({"statistic": "3 sigma"}, "largest real motion 3.9 µm 3σ, camera lens, down"),
        ({"relative": True}, "largest real motion 3.9 µm relative to the base, camera lens, down"),
        ({"largest_real": 2.5e-3, "largest_word": ""}, "largest real motion 2.5 mm, camera lens"),
        ({"largest_real": 9.96e-7}, "largest real motion 1.0 µm, camera lens, down"),
    ],
)
def test_real_motion_says_its_statistic(changes, words):
    assert said(1, NAME, 84.6, scale(**changes))[1] == words


def test_motion_drawn_smaller_than_real_says_so():
    drawn = said(1, NAME, 84.6, scale(magnification=0.2, largest_real=0.3))
    assert drawn[0] == "drawn 5.0× smaller than real"
    assert EXAGGERATED not in drawn


def test_compared_at_one_magnification():
    pair = scale(), scale(largest_real=2.4e-6)
    assert said(1, NAME, None, pair, one_colour_scale=True)[:2] == [
        "both drawn 8 300× larger than real, same phase, same camera, one colour scale",
        "largest real motion 3.9 µm (baseline), 2.4 µm (modified), camera lens, down",
    ]
    assert said(1, NAME, None, pair)[0] == "both drawn 8 300× larger than real, same phase, same camera"


def test_compared_at_different_magnifications_shouts():
    drawn = said(1, NAME, None, (scale(), scale(magnification=12000.0)))
    assert drawn[0] == "DIFFERENT magnifications: baseline 8 300×, modified 12 000×"
    near = said(1, NAME, None, (scale(), scale(magnification=8349.0)), names=("old", "new"))
    assert near[0] == "DIFFERENT magnifications: old 8 340×, new 8 350×"  # never the same figure twice
    one = said(1, NAME, None, (scale(), unknown()))
    assert one[0] == "DIFFERENT magnifications: baseline 8 300×, modified size arbitrary"


def test_compared_with_both_sizes_unknown():
    assert said(1, NAME, None, (unknown(), unknown()))[0] == (
        "size arbitrary, both drawn at equal modal mass, sign and phase by the modal scale factor, same camera"
    )


def test_one_colour_scale_is_a_statement_of_its_own():
    assert said(1, NAME, None, (unknown(), unknown()), one_colour_scale=True)[1:] == ["one colour scale", EXAGGERATED]


def test_compared_places_that_differ_are_both_named():
    drawn = said(1, NAME, None, (scale(), scale(largest_place="cover", largest_word="up", largest_real=2e-6)))
    assert "largest real motion of baseline 3.9 µm, camera lens, down" in drawn
    assert "largest real motion of modified 2.0 µm, cover, up" in drawn


def test_titles_and_conditions():
    assert mode_title(3) == "Mode 3"
    assert mode_title((1, 2), "nods") == "Modes 1 and 2 · nods"
    assert mode_title((2, 2), "nods") == "Mode 2 · nods"
    note = scale_note(1, "", 84.6, scale(), [HELD, f"{HELD} · {DRIVE}", ""])
    assert note.condition == (DRIVE, HELD)  # each statement once


# ---- figures


@pytest.mark.parametrize(
    ("value", "text"),
    [(8342, "8 300"), (12000, "12 000"), (0.000612, "0.00061"), (5, "5.0"), (99.6, "100"), (0, "0")],
)
def test_two_significant_digits(value, text):
    assert figures.digits(value).translate(PLAIN) == text


@pytest.mark.parametrize(
    ("metres", "text"),
    [
        (3.94e-6, "3.9 µm"),
        (440e-6, "440 µm"),
        (9.99e-4, "1.0 mm"),
        (0.04, "40 mm"),
        (2.0, "2.0 m"),
        (7.1e-10, "710 pm"),
    ],
)
def test_lengths_take_the_unit_that_leaves_one_to_three_digits(metres, text):
    assert figures.length(metres).translate(PLAIN) == text


@pytest.mark.parametrize("value", np.geomspace(1e-9, 1e3, 37))
def test_lengths_read_back(value):
    number, unit = figures.length(value).split(figures.GAP)
    back = float(number.replace(figures.THIN, "")) * {"m": 1, "mm": 1e-3, "µm": 1e-6, "nm": 1e-9, "pm": 1e-12}[unit]
    assert back == pytest.approx(value, rel=0.051)  # two digits: at most 5 % off, at 1.0


def test_frequencies_and_changes():
    assert figures.hertz(1243.3).translate(PLAIN) == "1 243 Hz"
    assert figures.hertz(3.456).translate(PLAIN) == "3.46 Hz"
    assert figures.hertz(2e-4).translate(PLAIN) == "below 0.01 Hz"
    assert figures.change(104.1, 84.6).translate(PLAIN) == "+23 %"  # 104.1 ÷ 84.6 = 1.2305
    assert figures.change(80.0, 84.6).translate(PLAIN) == "−5.4 %"
    assert figures.change(84.6, 84.6).translate(PLAIN) == "±0 %"
    assert figures.change(1.0, 0.0) == ""


# ---- layout


def texts(picture):
    return [item for item in note_items(picture, frame_of(picture)) if isinstance(item, Text)]


def test_the_common_note_is_96_high_in_three_lines():
    picture = known()
    assert note_height(picture) == 96
    found = texts(picture)
    assert [(t.size, t.bold) for t in found] == [(21, True), (21, True), (16, False), (16, False)]
    foot = frame_of(picture).height
    edges = [t.box[3] - (foot - 96) for t in found]  # lower edges: LOOK.md's 36, 36, 60, 83
    assert edges == pytest.approx([36, 36, 60, 83], abs=0.5)


def test_overflow_adds_lines_and_never_shrinks():
    picture = known()
    long = picture.note.drawing + ("a statement about something else that has to be said",) * 2
    grown = known(note=type(picture.note)("Mode 1 · " + "word " * 40, "84.6 Hz", long, picture.note.condition))
    extra = (note_height(grown) - 96) / 24
    assert extra == int(extra) > 2
    found = texts(grown)
    assert {t.size for t in found} == {16, 21}
    assert len(found) == 1 + 3 + extra
    assert max(t.box[2] for t in found) <= 960 - 15


def test_lines_break_between_statements_first():
    lines = [t.words for t in texts(of_unknown_size()) if t.size == 16]
    statements = of_unknown_size().note.drawing
    shown = " · ".join(lines)
    assert shown.startswith(" · ".join(statements))  # in order, none cut
    assert all(any(statement in line for line in lines) for statement in statements)  # each whole on one line


def test_true_scale_below_a_pixel_says_so_from_the_camera():
    small, large = true(), true(width=1920, height=1440)
    for picture in (small, large):
        frame = frame_of(picture)
        pixel = frame.metres_per_pixel * 960 / picture.width  # a real pixel, not a sheet pixel
        words = " ".join(t.words for t in texts(picture))
        assert f"one pixel here is {figures.length(pixel)}: the motion cannot show" in words
    assert "one pixel" not in " ".join(t.words for t in texts(known()))


def test_true_scale_that_shows_does_not_claim_otherwise():
    picture = true()
    shown = picture.bodies[0]
    big = type(shown)(shown.name, shown.mesh, shown.shape, 1e4 * shown.factor, shown.freq_hz)
    assert "one pixel" not in " ".join(t.words for t in texts(picture.with_(bodies=(big,), magnified=None)))


def test_the_band_reaches_the_foot_and_the_whole_width():
    picture = known(height=540)
    frame = frame_of(picture)
    band = next(item for item in note_items(picture, frame) if isinstance(item, Polygon))
    assert band.box == (0, 540 - 96, 960, 540)


def test_the_knob_swings_with_the_phase():
    picture = known()
    frame = frame_of(picture)
    places = [note_knob(picture, frame, phase) for phase in (0, np.pi / 2, np.pi)]
    assert [p.x for p in places] == pytest.approx([938, 883, 828])  # positions in look/1_energy_light.png
    assert {p.y for p in places} == {720 - 26}
