"""MAC and modal scale factor against the reference rows of topic 5."""

from __future__ import annotations

import numpy as np
import pytest

from tests.meshes import plate_mesh
from viewer.errors import RefusedError
from viewer.insight.correlate import mac, modal_scale_factor, shared_turn

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


def test_shared_turn_finds_the_sign_between_different_meshes():
    one, two = plate_mesh("quad4", (20, 8), (1.0, 0.3)), plate_mesh("tri3", (31, 9), (1.0, 0.3))
    bend = lambda mesh: np.stack([0 * mesh.points[:, 0], 0 * mesh.points[:, 0], mesh.points[:, 0] ** 2], axis=1)  # noqa: E731
    assert shared_turn(one, bend(one), two, -3 * bend(two)) == pytest.approx(-1.0)
    assert shared_turn(one, bend(one), two, np.exp(0.4j) * bend(two)) == pytest.approx(np.exp(-0.4j))


def test_no_common_support_is_refused():
    one = plate_mesh("quad4", (4, 4), (1.0, 1.0))
    with pytest.raises(RefusedError, match="common support"):
        shared_turn(one, one.points, one.with_(points=one.points + 100.0), one.points)
