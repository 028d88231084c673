"""Phase collinearity and mean phase deviation against the reference rows of topic 5."""

from __future__ import annotations

import numpy as np
import pytest

from tests.checks.reference import row
from viewer.insight.phase import collinearity, phase_deviation_deg, phase_of, turned_real


def two_points(id_: str) -> np.ndarray:
    """(1, e^{iδ}) for the angles of the row's inputs: "d=30,45,60 deg"."""
    degrees = np.array([float(d) for d in row(id_).inputs.removesuffix(" deg").partition("=")[2].split(",")])
    return np.stack([np.ones(len(degrees)), np.exp(1j * np.radians(degrees))], axis=1)


def test_collinearity_m08():
    assert collinearity(two_points("M08")) == pytest.approx(row("M08").values, abs=row("M08").tolerances[0])


def test_mean_phase_deviation_m10():
    assert phase_deviation_deg(two_points("M10")) == pytest.approx(row("M10").values, abs=row("M10").tolerances[0])


def by_singular_vectors(shape: np.ndarray) -> float:
    """The definition as published, with the line from a singular value decomposition (Reynders et al. 2012)."""
    v = np.linalg.svd(np.stack([shape.real, shape.imag], axis=1))[2].T
    cosine = np.abs(shape.real * v[1, 1] - shape.imag * v[0, 1]) / (np.hypot(v[0, 1], v[1, 1]) * np.abs(shape))
    away = np.arccos(np.clip(cosine, 0, 1))
    return float(np.degrees(np.average(away, weights=np.abs(shape))))


def by_covariance(shape: np.ndarray) -> float:
    """Phase collinearity by the sums of real and imaginary parts, as published (Pappa et al. 1993)."""
    xx, yy, xy = shape.real @ shape.real, shape.imag @ shape.imag, shape.real @ shape.imag
    return ((xx - yy) ** 2 + 4 * xy**2) / (xx + yy) ** 2


@pytest.mark.parametrize("seed", range(8))
def test_the_published_forms_give_the_same(seed):
    random = np.random.default_rng(seed)
    shape = random.normal(size=12) * np.exp(1j * random.normal(0, 0.1 + 0.2 * seed, 12))
    assert phase_deviation_deg(shape)[0] == pytest.approx(by_singular_vectors(shape), abs=1e-5)  # arccos near 1
    assert collinearity(shape)[0] == pytest.approx(by_covariance(shape), rel=1e-9)


def test_a_real_shape_is_collinear_at_any_phase():
    shape = np.array([1.0, -2.0, 0.5])
    for phase in (0.0, 0.4, 1.6, -2.9):
        turned = 3 * np.exp(1j * phase) * shape
        assert collinearity(turned)[0] == pytest.approx(1, abs=1e-12)
        assert phase_deviation_deg(turned)[0] == pytest.approx(0, abs=1e-6)
        assert np.tan(phase_of(turned)[0]) == pytest.approx(np.tan(phase), rel=1e-9)
        assert turned_real(turned)[0] == pytest.approx(-3 * shape, abs=1e-12)
    assert turned_real(shape)[0].tolist() == [-1, 2, -0.5]


def test_no_phase_is_preferred_by_a_travelling_wave():
    wave = np.exp(1j * np.linspace(0, 2 * np.pi, 9)[:-1])
    assert collinearity(wave)[0] == pytest.approx(0, abs=1e-12)
    assert collinearity(np.zeros(3))[0] == 1 and phase_deviation_deg(np.zeros(3))[0] == 0


def test_figures_do_not_depend_on_a_complex_factor_or_on_the_order_of_points():
    random = np.random.default_rng(9)
    shape = random.normal(size=20) + 0.3j * random.normal(size=20)
    other = ((0.2 - 3j) * shape)[random.permutation(20)]
    assert collinearity(other) == pytest.approx(collinearity(shape))
    assert phase_deviation_deg(other) == pytest.approx(phase_deviation_deg(shape))
