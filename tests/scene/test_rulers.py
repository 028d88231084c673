"""The twin ruler and the colour bar: what they say is what they measure."""

import re
from dataclasses import replace

import numpy as np
import pytest

from tests.scene.sheets import frame_of, known, of_unknown_size, side, true
from viewer.scene.colour_bar import colour_bar_items, energy_scale, picture_bar, squares
from viewer.scene.palette import energy_ramp, energy_share
from viewer.scene.rulers import LEFT, LONGEST, round_length, ruler_items
from viewer.scene.sheet import GradientBar, Line, Polygon, Text

UNITS = {"m": 1.0, "mm": 1e-3, "µm": 1e-6, "nm": 1e-9}


def read(words: str) -> float:
    number, unit = re.match(r"([\d.\u202f]+)\u00a0(\w+) of", words).groups()
    return float(number.replace("\u202f", "")) * UNITS[unit]


@pytest.mark.parametrize("longest", [*np.geomspace(1e-6, 1e3, 41), 1.0, 2.0, 5.0, 10.0, 0.2])
def test_round_lengths_are_1_2_5(longest):
    found = round_length(longest)
    assert f"{found:.6e}"[0] in "125"
    assert f"{found:.6e}"[1:8] == ".000000"
    assert found <= longest * (1 + 1e-9) < 2.5 * found * (1 + 1e-9)  # never shorter than 40 % of the room


@pytest.mark.parametrize("zoom", [0.11, 1.0, 3.7, 52.0])
def test_the_ruler_measures_what_it_says(zoom):
    picture = known()
    frame = frame_of(picture)
    frame = replace(frame, metres_per_pixel=zoom * frame.metres_per_pixel)
    items = ruler_items(picture, frame)
    bar = next(item for item in items if isinstance(item, Polygon)).box
    body, motion = (t.words for t in items if isinstance(t, Text))
    assert bar[0] == LEFT
    assert bar[2] - bar[0] <= LONGEST + 1e-6
    assert read(body) == pytest.approx((bar[2] - bar[0]) * frame.metres_per_pixel)
    assert read(motion) == pytest.approx(read(body) / picture.magnification, rel=0.05)  # two digits


def test_second_line_only_when_the_size_is_known():
    assert sum(isinstance(i, Text) for i in ruler_items(of_unknown_size(), frame_of(of_unknown_size()))) == 1
    body, motion = (i.words for i in ruler_items(true(), frame_of(true())) if isinstance(i, Text))
    assert body.replace("body", "motion") == motion  # look/5_true_scale.png: 40 mm, 40 mm


def test_ticks_are_perfect_squares_up_to_the_top():
    assert squares(25) == [0, 1, 4, 9, 16, 25]  # LOOK.md: "ticks 0 1 4 9 16 25"
    for root in range(1, 40):
        ticks = squares(float(root**2))
        roots = np.sqrt(ticks)
        assert roots == pytest.approx(np.round(roots))
        assert (ticks[0], ticks[-1]) == (0, root**2)
        assert len(ticks) <= 8
        assert np.all(np.diff(roots) > 0)


def test_ticks_fall_where_their_colour_is():
    items = colour_bar_items("title", energy_scale(25.0, "light"), "", "light", 936.0, 14.0, 230.0)
    bar = next(item for item in items if isinstance(item, GradientBar))
    assert (bar.width, bar.height) == (230, 13)  # LOOK.md: "230×13"
    assert np.array_equal(bar.colours, energy_ramp("light"))
    labels = [t for t in items if isinstance(t, Text) and t.size == 14]
    for label in labels:
        assert (label.x - bar.x) / bar.width == pytest.approx(energy_share(float(label.words), 25.0))
    ticks = [line for line in items if isinstance(line, Line) and len(line.points) == 2]
    assert [line.points[0][0] for line in ticks] == pytest.approx([label.x for label in labels])


def test_no_bar_without_energies_and_a_caution_when_not_trusted():
    picture = known()
    assert picture_bar(picture.with_(energy_top=None), frame_of(picture), 624) == []
    words = [t.words for t in picture_bar(of_unknown_size(), frame_of(picture), 624) if isinstance(t, Text)]
    assert "energies not trusted" in words


def test_when_comparing_the_bar_stands_at_the_foot_of_the_last_viewport():
    picture = side()
    frame = frame_of(picture)
    items = picture_bar(picture, frame, frame.boxes[1][3])
    assert min(item.box[0] for item in items) > frame.boxes[1][0]
    assert max(item.box[3] for item in items) < frame.boxes[1][3]
