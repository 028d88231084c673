"""Colour ramps and the energy scale."""

import numpy as np
import pytest

from viewer.scene import palette
from viewer.scene.chart import contrast
from viewer.scene.tokens import THEMES, rgb

# Full-strength simulation in linear RGB: G. M. Machado, M. M. Oliveira, L. A. F. Fernandes, "A physiologically-based
# model for simulation of color vision deficiency", IEEE TVCG 15 (2009), severity 1.0 (values from memory; each row
# must keep grey, asserted below).
DEFICIENCIES = {
    "protan": [[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.099216], [-0.003882, -0.048116, 1.051998]],
    "deutan": [[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413], [-0.011820, 0.042940, 0.968881]],
    "tritan": [[1.255528, -0.076749, -0.178779], [-0.078411, 0.930809, 0.147602], [0.004733, 0.691367, 0.303900]],
}


def linear(colours):
    return np.where(colours <= 0.04045, colours / 12.92, ((colours + 0.055) / 1.055) ** 2.4)


def encoded(values):
    values = np.clip(values, 0, 1)
    return np.where(values <= 0.0031308, 12.92 * values, 1.055 * values ** (1 / 2.4) - 0.055)


def test_oklab_of_known_colours():
    # White is L = 1 without hue by definition; red as in the worked examples of CSS Color Module 4 (from memory).
    lab = palette.to_oklab([[1, 1, 1], [1, 0, 0], [0, 0, 0]])
    assert lab[0] == pytest.approx([1, 0, 0], abs=1e-6)
    assert lab[1] == pytest.approx([0.62796, 0.22486, 0.12585], abs=2e-5)
    assert lab[2] == pytest.approx([0, 0, 0], abs=1e-9)


def test_oklab_there_and_back():
    colours = np.random.default_rng(1).random((500, 3))
    assert palette.from_oklab(palette.to_oklab(colours)) == pytest.approx(colours, abs=1e-6)


@pytest.mark.parametrize("theme", THEMES)
@pytest.mark.parametrize("which", ["energy", "gain"])
def test_ramp_passes_through_its_stops(theme, which):
    stops = getattr(THEMES[theme], which)
    ramp = palette.ramp(stops, 257)  # 257 entries: every stop falls on one
    assert [f"#{r:02X}{g:02X}{b:02X}" for r, g, b in ramp[::32]] == list(stops)


@pytest.mark.parametrize("theme", THEMES)
def test_zero_is_the_body(theme):
    base = tuple(round(255 * c) for c in rgb(THEMES[theme].body))
    assert tuple(palette.energy_ramp(theme)[0]) == base
    assert len(palette.energy_ramp(theme)) == 256
    assert np.abs(palette.gain_ramp(theme)[127:129].astype(int) - base).max() <= 3
    assert palette.gain_share(np.array([0.0]), 5.0) == 0.5


@pytest.mark.parametrize("theme", THEMES)
@pytest.mark.parametrize("eye", ["colour", "grey", *DEFICIENCIES])
def test_lightness_is_monotone_for_every_eye(theme, eye):
    colours = palette.energy_ramp(theme) / 255
    if eye == "grey":
        # relative luminance: ITU-R BT.709
        colours = np.repeat(encoded(linear(colours) @ [0.2126, 0.7152, 0.0722])[:, None], 3, axis=1)
    elif eye != "colour":
        matrix = np.array(DEFICIENCIES[eye])
        assert matrix.sum(axis=1) == pytest.approx(np.ones(3), abs=1e-5)
        colours = encoded(linear(colours) @ matrix.T)
    lightness = palette.to_oklab(colours)[:, 0]
    step = np.diff(lightness) * (-1 if theme == "light" else 1)
    one_byte = np.diff(palette.to_oklab(np.array([[64, 64, 64], [65, 65, 65]]) / 255)[:, 0])[0]
    assert step.min() > -one_byte, "neighbouring entries may wobble by rounding to bytes, not more"
    assert np.all((lightness[8:] - lightness[:-8]) * (-1 if theme == "light" else 1) > 0)


@pytest.mark.parametrize("theme", THEMES)
def test_the_colour_of_a_test_is_told_from_all_others_by_every_eye(theme):
    tokens = THEMES[theme]
    assert contrast(tokens.test, tokens.body) >= 3  # of a mark: WCAG 2.2, 1.4.11
    assert contrast(tokens.test, tokens.background) >= 4.5  # of words: WCAG 2.2, 1.4.3
    others = [tokens.accent, tokens.point, tokens.baseline, tokens.modified, tokens.ink, tokens.ghost, tokens.body]
    colours = np.array([rgb(colour) for colour in (tokens.test, *others)])
    for matrix in (np.eye(3), *map(np.array, DEFICIENCIES.values())):
        lab = palette.to_oklab(encoded(linear(colours) @ matrix.T))
        # the other marks are 0.06 apart at least for these eyes; energy, a warm ramp, never carries test marks alone
        assert np.linalg.norm(lab[1:] - lab[0], axis=1).min() > 0.06


def test_top_is_an_area_weighted_percentile_rounded_to_a_square():
    density = np.array([1.0, 5.0, 80.0])
    assert palette.energy_top([density], [np.array([90.0, 9.9, 0.1])]) == 9.0  # 80 holds 0.1 % of the area
    assert palette.energy_top([density], [np.array([90.0, 9.0, 1.0])]) == 81.0  # 80 holds 1 %
    assert palette.energy_top([np.array([4.0])], [np.ones(1)]) == 4.0  # a square stays


def test_top_covers_all_compared_designs_and_only_what_is_drawn():
    assert palette.energy_top([np.ones(10), np.full(10, 20.0)], [np.ones(10), np.ones(10)]) == 25.0
    assert palette.energy_top([np.array([1.0, 50.0])], [np.array([1.0, 0.0])]) == 1.0
    assert palette.energy_top([np.array([np.nan, 2.0])], [np.ones(2)]) == 4.0
    assert palette.energy_top([np.zeros(0)], [np.zeros(0)]) == 1.0


def test_square_root_scale():
    assert palette.energy_share(np.array([0, 1, 4, 9, 16, 25.0]), 25) == pytest.approx(np.arange(6) / 5)
    assert palette.energy_share(np.array([np.nan, -1e-15, 50.0]), 25) == pytest.approx([0, 0, np.sqrt(2)])
    assert palette.gain_share(np.array([-4, -1, 0, 1, 4.0]), 4) == pytest.approx([0, 0.25, 0.5, 0.75, 1])


def test_mix():
    assert palette.mix("#000000", "#FFFFFF", 0.2) == "#333333"
    assert palette.mix("#123456", "#FFFFFF", 0.0) == "#123456"
