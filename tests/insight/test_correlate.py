"""MAC and modal scale factor against the reference rows of topic 5."""

from __future__ import annotations

import numpy as np
import pytest

from viewer.insight.correlate import mac, modal_scale_factor

# tests/data/checks.csv, rows M01, M02, M04, M05: Allemang R.J., Brown D.L., IMAC 1 (1982) 110


def test_mac_m01():
    assert mac([1, 2, 3], [1, 2, 2])[0, 0] == pytest.approx(0.9603175, rel=1e-7)


def test_mac_m02_complex():
    assert mac(np.array([1, 1j]), np.array([1, 1]))[0, 0] == pytest.approx(0.5, abs=1e-12)


def test_mac_m04_does_not_see_a_complex_factor():
    a, b = np.array([1.0, 2, 3]), np.array([1.0, 2, 2])
    assert mac(a, (2 - 3j) * b)[0, 0] == pytest.approx(mac(a, b)[0, 0], rel=1e-12)


def test_modal_scale_factor_m05():
    assert modal_scale_factor(np.array([1.0, 2, 3]), np.array([1.0, 2, 2])) == pytest.approx(1.2222222, rel=1e-7)
