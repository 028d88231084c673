"""Drawn magnification and real size: definitions of DESIGN sections 6 and 7, checked on shapes with known answers."""

from __future__ import annotations

import numpy as np
import pytest

from tests.meshes import plate_mesh
from viewer.errors import RefusedError
from viewer.insight.scale import common_scale, direction_word, scale_mode
from viewer.model.cycle import cycle_peaks, steadiest_turn
from viewer.model.design import Design, FunctionalPoint, Selector
from viewer.model.dossier import StatedAmplitude

LENGTH, WIDTH = 2.0, 0.5


@pytest.fixture()
def design() -> Design:
    mesh = plate_mesh("quad4", (40, 10), (LENGTH, WIDTH))
    tip = FunctionalPoint("tip", Selector(group="x1"), np.array([0.0, 0, 1]))
    return Design("plate", mesh, points=(tip,))


def parabola(design: Design) -> np.ndarray:
    shape = np.zeros((design.mesh.n_nodes, 3))
    shape[:, 2] = -3.0 * (design.mesh.points[:, 0] / LENGTH) ** 2
    return shape


def test_unknown_size_is_drawn_at_8_percent_of_the_diagonal(design):
    scale = scale_mode(design, parabola(design), 1)
    assert scale.magnification is None and scale.largest_real is None
    assert scale.factor * 3.0 == pytest.approx(0.08 * np.hypot(LENGTH, WIDTH))
    assert scale.drawn_percent == pytest.approx(8.0)
    assert scale.limited_by == "peak"
    assert "measured point" in scale.sentence


def test_stated_amplitude_gives_size_sign_and_place(design):
    stated = StatedAmplitude("plate", 1, 2e-6, np.array([0, 0, 1.0]), point="tip")
    scale = scale_mode(design, parabola(design), 1, stated)
    assert scale.largest_real == pytest.approx(2e-6)
    assert scale.largest_place == "tip"
    assert scale.largest_word == "up"  # turned so that the stated direction comes first
    assert scale.turn == pytest.approx(-1.0)
    assert scale.magnification == pytest.approx(0.08 * np.hypot(LENGTH, WIDTH) / 2e-6)
    assert scale.to_dict()["largest_real_m"] == scale.largest_real


def test_stated_half_way_scales_the_peak(design):
    # the parabola has a quarter of its tip motion half way along
    where = Selector(near=np.array([LENGTH / 2, WIDTH / 2, 0]))
    stated = StatedAmplitude("plate", 1, 1e-6, np.array([0, 0, 1.0]), where=where, statistic="rms")
    scale = scale_mode(design, parabola(design), 1, stated)
    assert scale.largest_real == pytest.approx(4e-6)
    assert scale.statistic == "rms"


def test_true_scale_draws_at_one_and_is_refused_without_a_size(design):
    stated = StatedAmplitude("plate", 1, 2e-6, np.array([0, 0, 1.0]), point="tip")
    assert scale_mode(design, parabola(design), 1, stated, true_scale=True).magnification == pytest.approx(1.0)
    with pytest.raises(RefusedError, match="amplitude"):
        scale_mode(design, parabola(design), 1, true_scale=True)


def test_a_point_that_hardly_moves_gives_no_size(design):
    where = Selector(near=np.array([0.2 * LENGTH, 0, 0]))  # 4 % of the peak there
    stated = StatedAmplitude("plate", 1, 1e-6, np.array([0, 0, 1.0]), where=where)
    with pytest.raises(RefusedError, match="hardly moves"):
        scale_mode(design, parabola(design), 1, stated)


def test_a_short_flap_is_limited_by_its_turn(design):
    shape = np.zeros((design.mesh.n_nodes, 3))
    flap = 0.1
    shape[:, 2] = np.maximum(design.mesh.points[:, 0] - (LENGTH - flap), 0)  # turns by 1 rad per unit
    scale = scale_mode(design, shape, 1)
    assert scale.limited_by == "turn"
    assert np.degrees(scale.factor) == pytest.approx(12.0, rel=1e-6)
    assert scale.drawn_percent < 8


def test_common_scale_known_takes_one_magnification(design):
    a = scale_mode(design, parabola(design), 1, StatedAmplitude("a", 1, 2e-6, np.array([0, 0, 1.0]), point="tip"))
    b = scale_mode(design, 5 * parabola(design), 1, StatedAmplitude("b", 1, 1e-6, np.array([0, 0, 1.0]), point="tip"))
    first, second = common_scale([a, b])
    assert first.magnification == second.magnification == min(a.magnification, b.magnification)
    assert first.factor * 3 / (second.factor * 15) == pytest.approx(2.0)  # drawn sizes keep the real ratio


def test_common_scale_unknown_takes_equal_modal_mass(design):
    a, b = scale_mode(design, parabola(design), 1), scale_mode(design, 5 * parabola(design), 1)
    first, second = common_scale([a, b], [4.0, 100.0], [1, -1])
    assert first.magnification is None
    assert first.factor**2 * 4.0 == pytest.approx(second.factor**2 * 100.0)
    assert max(first.drawn_percent, second.drawn_percent) <= 8.0 + 1e-9
    assert second.turn == pytest.approx(-first.turn)


def test_a_group_of_the_whole_body_is_no_place(design):
    mesh = design.mesh.with_(cell_groups={"plate": np.arange(design.mesh.n_cells)}, node_groups={})
    scale = scale_mode(design.with_(mesh=mesh, points=()), parabola(design), 1)
    assert scale.largest_place == f"node {mesh.node_ids[scale.largest_row]}"


def test_cycle_peak_of_a_complex_shape_against_sampling():
    rng = np.random.default_rng(3)
    shape = rng.normal(size=(50, 3)) + 1j * rng.normal(size=(50, 3))
    phases = np.exp(1j * np.linspace(0, 2 * np.pi, 20001))
    sampled = np.max([np.linalg.norm((shape * p).real, axis=1) for p in phases[::10]], axis=0)
    assert cycle_peaks(shape) == pytest.approx(sampled, rel=1e-5)


def test_steadiest_turn_makes_a_turned_real_shape_real_again():
    real = np.random.default_rng(5).normal(size=(20, 3))
    turned = real * np.exp(0.7j)
    assert np.abs((turned * steadiest_turn(turned)).imag).max() < 1e-12


@pytest.mark.parametrize(
    ("vector", "word"),
    [((0, 0, -2), "down"), ((0.1, 0, 1), "up"), ((1, 0, 0), "along +x"), ((0, -3, 0.2), "along −y")],
)
def test_direction_words(vector, word):
    assert direction_word(np.array(vector, float)) == word


def test_oblique_direction_gives_components():
    assert direction_word(np.array([1.0, 0, -1.0])) == "along (0.7, 0.0, −0.7)"
