"""Charts of a test against an analysis: what is framed and said, and the phases of a measured mode."""

from dataclasses import replace

import numpy as np
import pytest

from tests.scene.hammered import analysis, hammered, plate
from viewer.insight.correlate import auto_mac
from viewer.insight.hammer_pairing import ALIKE, correlate_test
from viewer.insight.phase import collinearity, phase_deviation_deg, turned_real
from viewer.scene.correlation_charts import correlation_field, correlation_ladder, own_field
from viewer.scene.ladder_chart import RAILS
from viewer.scene.phase_chart import CENTRE, RADIUS, WEDGE, phase_chart
from viewer.scene.primitives import Disc, Line, Polygon, Ring, Text, overlap
from viewer.scene.tokens import THEMES

NAMES = ("bends", "twists and nods with a name that is far too long for its place beside the field", "", "")


def correlation(**changes):
    modes = np.array([analysis(mode) for mode in range(1, 5)])
    found = correlate_test(hammered(), modes, plate().modes.freq_hz, design="plate", names=NAMES)
    return replace(found, **changes)


def texts(sheet):
    return [item.words for item in sheet.items if isinstance(item, Text)]


def phases(values, told=5, theme="light"):
    values = np.asarray(values, complex)
    known = values[np.isfinite(values)][None]
    turned = np.full(len(values), np.nan, complex)
    turned[np.isfinite(values)] = turned_real(known)[0]
    names = [f"point {k + 1}, +Z" for k in range(len(values))]
    figures = float(collinearity(known)[0]), float(phase_deviation_deg(known)[0])
    return phase_chart(turned, names, *figures, title="Test mode 1 · phases", told=told, theme=theme)


SHEETS = {
    "field": lambda theme: correlation_field(correlation(), NAMES, theme),
    "own": lambda theme: own_field(correlation(), "analysis", NAMES, theme),
    "measured": lambda theme: own_field(correlation(), "test", theme=theme),
    "ladder": lambda theme: correlation_ladder(correlation(), NAMES, theme),
    "phases": lambda theme: phases(np.exp(1j * np.linspace(0, 3.0, 12)), theme=theme),
}


@pytest.mark.parametrize("theme", THEMES)
@pytest.mark.parametrize("which", SHEETS)
def test_every_word_is_on_the_sheet(which, theme):
    sheet = SHEETS[which](theme)
    for item in sheet.items:
        if isinstance(item, Text):
            left, top, right, foot = item.box
            assert left >= -0.5 and right <= sheet.width + 0.5 and top >= 0 and foot <= sheet.height, item.words


def test_the_field_frames_the_pairs():
    sheet = correlation_field(correlation(), NAMES)
    frames = [item for item in sheet.items if isinstance(item, Line) and item.colour == THEMES["light"].accent]
    assert len(frames) == 4
    assert any("4 of 4 test modes paired · compared at 17 channels" in words for words in texts(sheet))
    colours = {item.words: item.colour for item in sheet.items if isinstance(item, Text)}
    assert colours["test: hammer"] == THEMES["light"].test
    assert colours["analysis: plate"] == THEMES["light"].ink


def test_modes_that_the_points_cannot_tell_apart_are_framed_and_said():
    assert any("tell all modes apart" in words for words in texts(own_field(correlation())))
    shapes = np.array([analysis(mode) for mode in (1, 2, 3, 4)])
    shapes[2] = shapes[0] + 0.05 * shapes[2]
    auto = auto_mac(shapes)
    assert auto[0, 2] > ALIKE > auto[0, 1]
    sheet = own_field(correlation(analysis_auto=auto))
    assert any("cannot tell apart: modes 1 and 3" in words for words in texts(sheet))
    frames = [item for item in sheet.items if isinstance(item, Line) and item.colour == THEMES["light"].accent]
    assert len(frames) == 2


def test_the_ladder_joins_what_is_paired():
    found = correlation()
    parted = {"kind": "unpaired", "scale": 0j}
    rest = []
    for pair in found.pairs:
        alone = [
            replace(pair, analysis=None, analysis_hz=None, **parted),
            replace(pair, test=None, test_hz=None, **parted),
        ]
        rest += alone if pair.test == 3 else [pair]
    sheet = correlation_ladder(replace(found, pairs=tuple(rest)), NAMES)
    ribbons = [i for i in sheet.items if isinstance(i, Polygon) and {x for x, _ in i.points} == set(RAILS)]
    assert len(ribbons) == 3
    ends = [i.colour for i in sheet.items if isinstance(i, Line) and i.dash]
    assert ends == [THEMES["light"].test, THEMES["light"].ink]
    assert sum("2.0" in words and "%" in words for words in texts(sheet)) >= 3  # the test was made 2 % high


# ---- phases


def test_beads_stand_where_the_values_are():
    values = np.array([1.0, -0.5, 0.25j, np.nan])
    values = values * np.exp(0.6j)
    sheet = phases(values)
    beads = [item for item in sheet.items if isinstance(item, Disc) and item.colour == THEMES["light"].test]
    assert len(beads) == 3  # the unused channel has none
    line = turned_real(values[None, :3])[0]
    wanted = [(CENTRE[0] + RADIUS * v.real, CENTRE[1] - RADIUS * v.imag) for v in line]
    assert np.array(sorted((b.x, b.y) for b in beads)) == pytest.approx(np.array(sorted(wanted)), abs=1e-6)


def test_channels_off_the_line_are_ringed_named_and_counted():
    angles = np.zeros(12)
    angles[[2, 7]] = np.radians([40, -25])
    angles[9] = np.radians(80)
    sizes = np.ones(12)
    sizes[9] = 0.02  # too small for its phase to mean anything
    sheet = phases(sizes * np.exp(1j * angles))
    said = texts(sheet)
    assert {"point 3, +Z", "point 8, +Z"} <= set(said) and "point 10, +Z" not in said
    rings = [i for i in sheet.items if isinstance(i, Ring) and i.colour == THEMES["light"].ink]
    assert len(rings) == 2
    assert any(f"2 of 12 channels are more than {WEDGE:g}° off the common line, ringed and named" in w for w in said)


def test_only_so_many_are_named():
    rng = np.random.default_rng(4)
    values = rng.uniform(0.4, 1, 30) * np.exp(1j * rng.uniform(-1.2, 1.2, 30))
    sheet = phases(values, told=3)
    assert sum(words.startswith("point ") for words in texts(sheet)) == 3
    assert any("the 3 farthest from it named" in words for words in texts(sheet))


@pytest.mark.parametrize("seed", range(6))
def test_names_of_channels_keep_off_each_other_and_off_all_other_words(seed):
    rng = np.random.default_rng(seed)
    sheet = phases(rng.uniform(0.3, 1, 20) * rng.choice([-1, 1], 20) * np.exp(1j * rng.normal(0, 0.4, 20)))
    top = 620 - 96
    boxes = [item.box for item in sheet.items if isinstance(item, Text) and item.y < top]
    assert not any(overlap(a, b) for k, a in enumerate(boxes) for b in boxes[:k])


def test_a_mode_in_phase_names_no_channel():
    sheet = phases([1.0, -0.4, 0.7])
    assert not any(words.startswith("point ") for words in texts(sheet))
    assert any("collinearity 1.00" in words for words in texts(sheet))


def test_a_mode_without_motion_is_drawn_all_the_same():
    sheet = phases(np.zeros(4))
    assert len([item for item in sheet.items if isinstance(item, Disc)]) == 8
