"""MAC, its counterparts by coordinate, and products weighted by mass, against the reference rows of topic 5."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.linalg

from tests.checks.reference import row
from viewer.insight.correlate import auto_mac, comac, cross_orthogonality, ecomac, mac, modal_scale_factor

A, B = np.array([1.0, 2, 3]), np.array([1.0, 2, 2])  # inputs of row M01


def value(id_: str) -> float:
    """The decimal that follows the fraction in the row's value: "121/126=0.9603175"."""
    return float(row(id_).text.partition("=")[2])


def test_mac_m01():
    assert mac(A, B)[0, 0] == pytest.approx(value("M01"), rel=row("M01").tolerances[0])


def test_mac_m02_complex():
    assert mac(np.array([1, 1j]), np.array([1, 1]))[0, 0] == pytest.approx(row("M02").values[0], abs=1e-12)


def test_mac_m04_does_not_see_a_complex_factor():
    assert row("M04").text == "unchanged"
    assert mac(A, (2 - 3j) * B)[0, 0] == pytest.approx(mac(A, B)[0, 0], rel=row("M04").tolerances[0])


def test_modal_scale_factor_m05():
    assert modal_scale_factor(A, B) == pytest.approx(value("M05"), rel=row("M05").tolerances[0])


def test_comac_m06():
    found = comac([[1, 2, 3], [1, 0, -1]], [[1, 1, 3], [1, 1, -1]])
    assert found == pytest.approx(row("M06").values, abs=row("M06").tolerances[0])


def test_a_coordinate_that_does_not_move_and_a_shape_of_zeros_agree_with_nothing():
    assert comac([[0, 1]], [[1, 1]]).tolist() == [0, 1]
    assert mac([[0.0, 0.0]], [[1.0, 1.0]]).tolist() == [[0]]


def test_cross_orthogonality_m17():
    """(1, 1) and (1, −1) have MAC 0 and share mass; (1, 1) and (1, −2) share none and have MAC 0.1."""
    assert row("M17").text == "1/3 (MAC 0) | 0 (MAC 0.1)"
    mass, one, others = np.diag([2.0, 1.0]), np.array([1.0, 1.0]), np.array([[1.0, -1.0], [1.0, -2.0]])
    assert cross_orthogonality(one, mass, others)[0] == pytest.approx([1 / 3, 0], abs=row("M17").tolerances[0])
    assert mac(one, others)[0] == pytest.approx([0, 0.1], abs=row("M17").tolerances[0])


def test_two_masses_m18_have_modes_orthogonal_in_the_mass_only():
    mass, stiffness = np.diag([3.0, 2.0]), np.array([[30.0, -20.0], [-20.0, 35.0]])
    values, vectors = scipy.linalg.eigh(stiffness, mass)
    assert values == pytest.approx(row("M18").values, rel=row("M18").tolerances[0])
    assert cross_orthogonality(vectors.T, mass, vectors.T) == pytest.approx(np.eye(2), abs=1e-12)
    assert auto_mac(vectors.T)[0, 1] > 0.02


def test_complex_factors_turn_cross_orthogonality_and_leave_its_size():
    mass = np.array([[2.0, 0.3], [0.3, 1.0]])
    a, b = np.array([1.0, 2.0]), np.array([0.5, -1.0])
    plain, turned = cross_orthogonality(a, mass, b), cross_orthogonality(1j * a, mass, (2 - 3j) * b)
    assert abs(turned) == pytest.approx(abs(plain), rel=1e-12)
    assert cross_orthogonality(0 * a, mass, b).tolist() == [[0]]


def test_a_flipped_coordinate_is_seen_by_the_enhanced_criterion_alone():
    """COMAC takes the absolute value of each product and cannot see a sign. The scaling of the enhanced criterion,
    (a, −a) → 1 at the largest component, is ours; the definition is from memory."""
    random = np.random.default_rng(4)
    shapes = random.normal(size=(6, 30))
    flipped = shapes.copy()
    flipped[:, 7] *= -1
    assert comac(shapes, flipped) == pytest.approx(np.ones(30), abs=1e-12)
    found = ecomac(shapes, flipped * 2.5j)
    assert int(np.argmax(found)) == 7 and found[7] > 5 * np.delete(found, 7).max()
    assert ecomac(shapes, shapes * (1 - 2j)) == pytest.approx(np.zeros(30), abs=1e-12)
    assert ecomac([[0.0, 0.0]], [[1.0, 1.0]]).tolist() == [0, 0]


@pytest.mark.parametrize("seed", range(5))
def test_complex_scaling_and_the_order_of_channels_and_modes_change_nothing(seed):
    random = np.random.default_rng(seed)
    a, b = (random.normal(size=(4, 9)) + 1j * random.normal(size=(4, 9)) for _ in range(2))
    factors = random.normal(size=(4, 1)) + 1j * random.normal(size=(4, 1))
    channels, modes = random.permutation(9), random.permutation(4)
    assert mac(a * factors, b[:, :]) == pytest.approx(mac(a, b), rel=1e-12)
    assert mac(a[:, channels], b[:, channels]) == pytest.approx(mac(a, b), rel=1e-12)
    assert mac(a[modes], b) == pytest.approx(mac(a, b)[modes], rel=1e-12)
    for by_coordinate in (comac, ecomac):
        assert by_coordinate(a[:, channels], b[:, channels]) == pytest.approx(by_coordinate(a, b)[channels])
        assert by_coordinate(a[modes], b[modes]) == pytest.approx(by_coordinate(a, b))
    assert ecomac(a * factors, b) == pytest.approx(ecomac(a, b))
