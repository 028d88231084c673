"""Rigid motions known by their shapes, and how far they lie below the first elastic mode."""

from __future__ import annotations

import numpy as np
import pytest

from tests.sentences import unfounded
from viewer.insight.soft_support import SoftSupport, soft_support
from viewer.model.testset import TestSet

RANDOM = np.random.default_rng(7)
POINTS = RANDOM.normal(size=(16, 3)) * [0.6, 0.2, 0.1]


def hung(freq_hz, rigid, channels="all", noise=0.02, count=16) -> TestSet:
    """``rigid`` motions of a body first, then waves along its length, which no rigid motion has."""
    points = POINTS[:count]
    random = np.random.default_rng(3)
    moved = []
    for _ in range(rigid):
        moved.append(random.normal(size=3) + np.cross(random.normal(size=3), points / 0.4))
    for i in range(len(freq_hz) - rigid):
        x = points[:, 0] / 0.6
        moved.append(np.outer(np.cos((3 + i) * x + i), [0, 0, 1.0]) + np.outer(np.sin((4 + i) * x), [0, 0.5, 0]))
    moved = np.array(moved)
    sensor, directions = np.repeat(np.arange(count), 3), np.tile(np.eye(3), (count, 1))
    if channels == "z":
        sensor, directions = np.arange(count), np.tile([0.0, 0, 1], (count, 1))
    shapes = np.einsum("mca,ca->mc", moved[:, sensor], directions)
    shapes = shapes + noise * np.std(shapes, axis=1, keepdims=True) * random.normal(size=shapes.shape)
    labels = tuple(str(i + 1) for i in range(count))
    return TestSet("hammer", labels, points, np.zeros((0, 2)), sensor, directions, freq_hz, shapes)


def told(test: TestSet, **more) -> SoftSupport:
    found = soft_support(test, **more)
    assert not unfounded(found.sentence, found.to_dict()), found.sentence
    return found


SIX = [1.1, 1.9, 2.5, 4.2, 5.7, 8.0]


def test_a_soft_support():
    found = told(hung([*SIX, 122.0, 168.0], 6))
    assert found.rigid == (1, 2, 3, 4, 5, 6) and found.elastic == 7 and found.seen == 6
    assert found.ratio == pytest.approx(8 / 122) and found.soft
    assert found.sentence.startswith("The support of hammer was soft enough")
    assert "8.00\u00a0Hz, 6.6% of the first elastic mode at 122.0\u00a0Hz" in found.sentence


def test_a_support_that_is_too_stiff():
    found = told(hung([*SIX[:5], 20.0, 122.0, 168.0], 6))
    assert found.soft is False and "too stiff" in found.sentence


def test_channels_along_one_axis_see_three_of_the_six():
    found = told(hung([*SIX[:3], 122.0, 168.0], 3, "z"))
    assert found.seen == 3 and found.rigid == (1, 2, 3) and found.soft


def test_complex_shapes_are_known_as_well():
    test = hung([*SIX, 122.0], 6)
    found = told(test.with_(shapes=test.shapes * np.exp(1j * np.arange(7))[:, None]))
    assert found.rigid == (1, 2, 3, 4, 5, 6)
    assert found.rigid_share == pytest.approx(soft_support(test).rigid_share)


@pytest.mark.parametrize(
    ("test", "more", "reason"),
    [
        (hung([*SIX, 122.0], 6), {"free": False}, "the part is held"),
        (hung([*SIX, 122.0], 6, count=3), {}, "too few channels"),
        (hung([*SIX, 122.0], 6), {"used": np.arange(48) < 7}, "too few channels"),
        (hung([110.0, 122.0], 0), {}, "none of the lowest measured modes"),
        (hung(SIX, 6), {}, "no elastic mode was measured"),
        (hung([*SIX, 9.0, 122.0], 7), {}, "more than there can be"),
        (hung([*SIX, 122.0], 6), {"used": np.zeros(48, bool)}, "too few channels"),
    ],
)
def test_why_it_cannot_be_told(test, more, reason):
    found = told(test, **more)
    assert found.ratio is None and found.soft is None
    assert reason in found.reason and reason in found.sentence
