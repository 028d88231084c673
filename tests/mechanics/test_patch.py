"""The rigid fit of a footprint: exact for rigid motions, least squares otherwise, unseen rotations named."""

import numpy as np
import pytest

from viewer.mechanics.patch import RigidPatch, rigid_fields

MOTION = np.array([0.3, -0.2, 0.7, 0.01, -0.03, 0.02])
CLOUD = np.random.default_rng(3).normal(size=(9, 3)) * [1.0, 0.1, 0.02] + [5.0, -2.0, 1.0]


def moved(points, about):
    """u = t + ω × arm, the definition of a small rigid motion."""
    return MOTION[:3] + np.cross(MOTION[3:], points - about)


def test_rigid_motion_comes_back():
    about = np.array([1.0, 2.0, 3.0])
    patch = RigidPatch(CLOUD, about)
    assert patch.rank == 6
    assert patch.unseen == ""
    np.testing.assert_allclose(patch.motion(moved(CLOUD, about)), MOTION, atol=1e-12)
    np.testing.assert_allclose(rigid_fields(CLOUD, about) @ MOTION, moved(CLOUD, about), atol=1e-14)


def test_is_the_least_squares_fit():
    shape = np.random.default_rng(5).normal(size=CLOUD.shape)
    fields = rigid_fields(CLOUD, CLOUD.mean(axis=0)).reshape(-1, 6)
    expected = np.linalg.lstsq(fields, shape.ravel(), rcond=None)[0]
    np.testing.assert_allclose(RigidPatch(CLOUD).motion(shape), expected, rtol=1e-9)


def test_points_in_a_line_do_not_show_the_spin():
    axis = np.array([1.0, 2.0, 2.0]) / 3
    points = np.outer([0.0, 1.0, 2.5, 4.0], axis) + np.array([1.0, 0.0, 0.0])
    about = points.mean(axis=0)
    patch = RigidPatch(points)
    assert patch.rank == 5
    assert "line" in patch.unseen
    found = patch.motion(moved(points, about))
    seen = MOTION[3:] - axis * (axis @ MOTION[3:])
    np.testing.assert_allclose(found, [*MOTION[:3], *seen], atol=1e-12)
    with_spin = patch.motion(moved(points, about), np.tile(MOTION[3:], (4, 1)))
    np.testing.assert_allclose(with_spin, MOTION, atol=1e-12)


def test_single_node_uses_its_own_rotation():
    point, about = np.array([[1.0, 0.0, 0.0]]), np.array([1.0, 0.5, 0.0])
    patch = RigidPatch(point, about)
    assert patch.rank == 3
    assert "single" in patch.unseen
    np.testing.assert_allclose(patch.motion(moved(point, about)), [*moved(point, about)[0], 0, 0, 0])
    np.testing.assert_allclose(patch.motion(moved(point, about), MOTION[None, 3:]), MOTION, atol=1e-14)


def test_complex_shapes_and_several_at_once():
    stack = np.stack([moved(CLOUD, CLOUD.mean(axis=0)), 1j * moved(CLOUD, CLOUD.mean(axis=0))])
    np.testing.assert_allclose(RigidPatch(CLOUD).motion(stack), [MOTION, 1j * MOTION], atol=1e-12)


def test_empty_footprint_is_refused():
    with pytest.raises(ValueError, match="at least one"):
        RigidPatch(np.empty((0, 3)))
