"""The gain map as a picture: its scale on both sides of zero, its words, what it refuses."""

from itertools import pairwise

import numpy as np
import pytest

from tests.mechanics.models import CLAMP, design
from tests.meshes import plate_mesh
from tests.scene.sheets import frame_of
from viewer.errors import RefusedError
from viewer.insight.gain import gain_map
from viewer.mechanics.eigen import solve
from viewer.scene.colour_bar import BAR_WIDTH, ENDS, GAIN_WIDTH, gain_scale, picture_bar
from viewer.scene.gain_picture import ESTIMATE, TITLE, gain_picture
from viewer.scene.note_layout import note_height
from viewer.scene.palette import gain_ramp, gain_top, to_oklab
from viewer.scene.primitives import Text, overlap
from viewer.scene.sheet import plan_sheet
from viewer.scene.tokens import BAR_TICK, THEMES
from viewer.scene.typeface import text_width
from viewer.workspace.study import study


@pytest.fixture(scope="module")
def bent():
    part = design(plate_mesh("quad4", (16, 6), (0.3, 0.1)), thickness=0.002, supports=(CLAMP,))
    return study(part, solve(part, 2))


@pytest.fixture(scope="module")
def gain(bent):
    return gain_map(bent.design, bent.modes, 1, bent.energies)


@pytest.mark.parametrize("high", [*np.geomspace(3e-7, 8e5, 60), 1.0, 4.0, 9.0, 10.0, 16.0, 160.0])
def test_the_end_of_the_scale_holds_the_values_and_wastes_little(high):
    top = gain_top(np.array([-high, 0.3 * high, np.nan]), np.ones(3))
    assert high <= top * (1 + 1e-9)
    assert top <= 4 * high * (1 + 1e-9)
    bar = gain_scale(top, "light")
    shares = np.array([share for share, _ in bar.ticks])
    assert shares + shares[::-1] == pytest.approx(np.ones(len(shares)))
    assert np.diff(shares) == pytest.approx(np.full(len(shares) - 1, shares[1] - shares[0]))  # even on a root scale
    worded = [(share, words) for share, words in bar.ticks if words]
    assert worded[0][0] == pytest.approx(0)
    assert worded[-1][0] == pytest.approx(1)
    assert len(worded) >= (5 if 0.1 < high < 300 else 3)  # long figures leave room for both ends and zero only
    for share, words in worded:  # the words say the value of their place
        value = float(words.replace("−", "-").replace("\u202f", ""))
        assert value == pytest.approx(np.sign(share - 0.5) * (2 * share - 1) ** 2 * top, rel=1e-3, abs=1e-12)
    halves = [text_width(words, BAR_TICK) / 2 for _, words in worded]
    ends = [(s * GAIN_WIDTH - half, s * GAIN_WIDTH + half) for (s, _), half in zip(worded, halves, strict=True)]
    assert all(before[1] < after[0] for before, after in pairwise(ends))


def test_nothing_to_gain_has_no_scale():
    assert gain_top(np.full(3, np.nan), np.ones(3)) == 0
    assert gain_top(np.zeros(3), np.ones(3)) == 0


@pytest.mark.parametrize("theme", THEMES)
def test_both_ends_are_equally_grey_so_that_words_and_signs_must_tell_them(theme):
    light = to_oklab(gain_ramp(theme)[[0, -1]] / 255.0)[:, 0]
    assert abs(light[0] - light[1]) < 0.06
    assert gain_scale(4.0, theme).ends == ENDS == ("lighten", "stiffen")


@pytest.mark.parametrize("theme", THEMES)
def test_the_picture_says_what_to_do_where_and_that_it_is_an_estimate(bent, gain, theme):
    picture = gain_picture(bent, 1, gain, theme=theme)
    assert picture.note.drawing == (ESTIMATE,)
    assert "first-order estimate" in ESTIMATE
    assert "Hz per kg" in TITLE
    plan = plan_sheet(picture, frame_of(picture))
    texts = [item for item in plan.fixed if isinstance(item, Text)]
    for words, _, _ in gain.callouts:
        for part in words.split(": "):
            assert sum(text.words == part for text in texts) == 1
    assert [call.sign for call in picture.bodies[0].call_outs] == [1, -1]  # clamped root stiffens, free tip lightens
    root, tip = (call.position[0] for call in picture.bodies[0].call_outs)
    assert root < 0.1
    assert tip > 0.2
    for k, text in enumerate(texts):
        assert not any(overlap(text.box, other.box) for other in texts[:k])


def test_the_picture_is_at_rest_and_scaled_by_the_map(bent, gain):
    picture = gain_picture(bent, 1, gain)
    (body,) = picture.bodies
    assert body.factor == 0
    assert body.density is None
    assert np.array_equal(body.gain, gain.per_kg, equal_nan=True)
    assert picture.gain_top >= np.nanpercentile(np.abs(gain.per_kg), 99)
    assert picture.magnification is None
    assert not picture.ghost


def test_the_bar_is_wider_and_keeps_to_the_top(bent, gain):
    picture = gain_picture(bent, 1, gain)
    frame = frame_of(picture)
    items = picture_bar(picture, frame, frame.height - note_height(picture))
    boxes = np.array([item.box for item in items])
    assert boxes[:, 2].max() <= frame.width
    assert boxes[:, 3].max() < 110
    assert GAIN_WIDTH > BAR_WIDTH


def test_no_map_in_hertz_no_picture():
    free = design(plate_mesh("quad4", (4, 4), (0.1, 0.1)), thickness=0.002)
    floating = study(free, solve(free, 7))
    found = gain_map(floating.design, floating.modes, 1, floating.energies)
    with pytest.raises(RefusedError, match="rigid-body mode"):
        gain_picture(floating, 1, found)
