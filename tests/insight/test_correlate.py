"""MAC, COMAC and modal scale factor against the reference rows of topic 5."""

from __future__ import annotations

import numpy as np
import pytest

from tests.checks.reference import row
from viewer.insight.correlate import comac, mac, modal_scale_factor

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
