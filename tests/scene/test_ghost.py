"""Dashes along edges."""

from itertools import pairwise

import numpy as np
import pytest

from viewer.scene.ghost import chains, cut, once


def straight(n=50, length=1.0):
    points = np.zeros((n + 1, 3))
    points[:, 0] = np.linspace(0, length, n + 1)
    return points, np.stack([np.arange(n), np.arange(1, n + 1)], axis=1)


def drawn(dashes, points):
    ends = dashes.segments(points)
    return np.linalg.norm(ends[:, 1] - ends[:, 0], axis=1).sum()


def test_every_edge_is_in_one_chain_once():
    # two triangles that touch in node 2, and a tail on node 4
    pairs = np.array([[0, 1], [1, 2], [2, 0], [2, 3], [3, 4], [4, 2], [4, 5]])
    found = chains(pairs)
    steps = sorted(tuple(sorted(step)) for curve in found for step in pairwise(curve))
    assert steps == sorted(tuple(sorted(p)) for p in pairs.tolist())


def test_closed_loop_is_one_chain():
    ring = np.stack([np.arange(6), (np.arange(6) + 1) % 6], axis=1)
    assert chains(ring) == [[0, 1, 2, 3, 4, 5, 0]]


def test_shuffled_edges_give_the_same_curves():
    _, pairs = straight(20)
    shuffled = np.random.default_rng(0).permutation(pairs)
    assert chains(shuffled) == chains(pairs)


@pytest.mark.parametrize("n", [1, 7, 50, 400])
def test_pattern_does_not_depend_on_the_mesh(n):
    points, pairs = straight(n)
    dashes = cut(points, pairs, 0.017, 0.012)
    whole = round((1 + 0.012) / 0.029)
    stretch = 1 / (whole * 0.017 + (whole - 1) * 0.012)
    assert drawn(dashes, points) == pytest.approx(whole * 0.017 * stretch)
    ends = dashes.segments(points)[..., 0]
    assert ends.min() == pytest.approx(0.0)
    assert ends.max() == pytest.approx(1.0)
    start = np.sort(ends[:, 0])
    gaps = np.diff(start)[np.diff(start) > 0.018 * stretch]
    if n == 1:
        assert gaps == pytest.approx(np.full(whole - 1, 0.029 * stretch))


def test_gaps_stay_empty():
    points, pairs = straight(50)
    ends = cut(points, pairs, 0.1, 0.06).segments(points)[..., 0]
    whole = round(1.06 / 0.16)
    stretch = 1 / (whole * 0.1 + (whole - 1) * 0.06)
    middle_of_gaps = (np.arange(whole - 1) * 0.16 + 0.13) * stretch
    assert not np.any((ends[:, :1] < middle_of_gaps) & (middle_of_gaps < ends[:, 1:]))


def test_dashes_ride_with_the_body():
    points, pairs = straight(10)
    dashes = cut(points, pairs, 0.05, 0.05)
    moved = points + np.array([0, 0, 1.0])
    assert dashes.segments(moved) == pytest.approx(dashes.segments(points) + np.array([0, 0, 1.0]))


def test_short_pieces_are_drawn_whole_and_nothing_gives_nothing():
    points, pairs = straight(1, 0.004)
    assert drawn(cut(points, pairs, 0.017, 0.012), points) == pytest.approx(0.004)
    assert len(cut(points, np.empty((0, 2), int), 0.1, 0.1).segments(points)) == 0
    assert len(cut(np.zeros((2, 3)), np.array([[0, 1]]), 0.1, 0.1).nodes) == 0


def test_edges_on_one_another_are_dashed_once():
    """Two vertices at each place, as where a cut face meets the clipped skin; a far edge stays its own."""
    points = np.array([[0.0, 0, 0], [1, 0, 0], [0, 0, 0], [1, 0, 1e-9], [0, 1, 0]])
    kept = once(points, np.array([[0, 1], [3, 2], [2, 4], [0, 2]]), 1e-6)
    assert kept.tolist() == [[0, 1], [0, 4]]


def test_an_edge_that_two_shorter_ones_cover_is_left_out():
    points = np.array([[0.0, 0, 0], [1, 0, 0], [0.4, 0, 0], [0.5, 0.3, 0]])
    kept = once(points, np.array([[0, 1], [0, 2], [2, 1], [0, 3], [3, 1]]), 1e-6)
    assert kept.tolist() == [[0, 2], [0, 3], [1, 2], [1, 3]]
