"""Positions at a phase, and the exact largest displacement over a cycle."""

import numpy as np
import pytest

from viewer.model.cycle import cycle_peaks
from viewer.scene.motion import displacement, is_standing, positions, swing

PHASES = np.linspace(0, 2 * np.pi, 3601)


@pytest.fixture
def shape():
    random = np.random.default_rng(3)
    return random.normal(size=(40, 3)) + 1j * random.normal(size=(40, 3))


def test_displacement_follows_the_contract_of_a_picture(shape):
    for phase in (0.0, 0.7, 3.0):
        assert displacement(shape, 2.5, phase) == pytest.approx(2.5 * np.real(shape * np.exp(1j * phase)), abs=1e-12)
        assert displacement(shape.real, 2.5, phase) == pytest.approx(2.5 * shape.real * np.cos(phase), abs=1e-12)


def test_positions_add_to_the_rest(shape):
    points = np.ones((40, 3))
    assert positions(points, shape, 1.0, 0.0) == pytest.approx(1 + shape.real)


def test_float32_stays_float32(shape):
    assert displacement(shape.astype(np.complex64), 0.1, 0.3).dtype == np.float32
    assert displacement(shape.real.astype(np.float32), 0.1, 0.3).dtype == np.float32


def test_peak_equals_the_largest_of_many_phases(shape):
    sampled = np.max([np.linalg.norm(displacement(shape, 1.0, p), axis=1) for p in PHASES], axis=0)
    exact = cycle_peaks(shape)
    assert np.all(sampled <= exact * (1 + 1e-12))
    assert sampled == pytest.approx(exact, rel=1e-6)  # 0.1° steps miss the peak by at most 1 − cos 0.05°
    assert np.any(exact < np.linalg.norm(np.abs(shape), axis=1) * 0.95), "axes out of phase do not add up"


def test_swing_is_exact_along_a_direction(shape):
    direction = np.array([0.6, 0.0, 0.8])
    sampled = np.max([np.abs(displacement(shape, 1.0, p) @ direction) for p in PHASES], axis=0)
    assert sampled == pytest.approx(swing(shape, direction), rel=1e-6)


def test_circular_motion_has_its_radius_as_peak():
    assert cycle_peaks(np.array([[1.0, 1j, 0.0]])) == pytest.approx([1.0])


def test_standing():
    assert is_standing(np.ones((2, 3)))
    assert is_standing(np.ones((2, 3)) + 0j)
    assert not is_standing(np.ones((2, 3)) * 1j)
