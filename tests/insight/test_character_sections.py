"""Bending, twisting, stretching and warping of long bodies whose motion is written down here."""

from __future__ import annotations

import numpy as np
import pytest

from tests.mechanics.models import CLAMP, design
from tests.meshes import box_mesh, line_mesh
from viewer.insight.twisting import long_axis
from viewer.mechanics.eigen import solve

LENGTH, WIDTH, HEIGHT = 2.0, 0.2, 0.1


def body():
    """Points of a bar along x with equal masses."""
    grid = np.meshgrid(np.linspace(0, LENGTH, 81), [-0.1, -0.05, 0, 0.05, 0.1], [-0.05, 0, 0.05], indexing="ij")
    points = np.stack([axis.ravel() for axis in grid], axis=1)
    return points, np.ones(len(points))


def turned_about_x(points, angle):
    return np.column_stack([np.zeros(len(points)), -angle * points[:, 2], angle * points[:, 1]])


POINTS, MASSES = body()
ALONG = POINTS[:, 0] / LENGTH


def test_pure_twist_bending_and_stretch():
    twist = long_axis(POINTS, MASSES, turned_about_x(POINTS, ALONG))
    assert twist.axis == pytest.approx([1, 0, 0], abs=1e-9)
    assert (twist.length, twist.width) == pytest.approx((LENGTH, WIDTH))
    assert twist.twisting == pytest.approx(1, abs=2e-3)  # within a slice the angle still grows
    sway = long_axis(POINTS, MASSES, np.outer(ALONG**2, [0, 1, 0]))
    assert sway.bending == pytest.approx(1, abs=2e-3)
    assert sway.across == pytest.approx([0, 1, 0], abs=1e-9)
    assert sway.straight == pytest.approx(1)
    stretch = long_axis(POINTS, MASSES, np.outer(ALONG, [1, 0, 0]))
    assert stretch.stretching == pytest.approx(1, abs=2e-3)


def test_shares_of_a_mixture_are_those_written():
    """Sway a, twist b about the centre, a breathing of the section c: Σ m|u|² of each over their sum."""
    a, b, c = np.outer(ALONG, [0, 1, 0]), 6 * turned_about_x(POINTS, ALONG), np.zeros_like(POINTS)
    c[:, 1] = 4 * POINTS[:, 1] * ALONG  # the section widens on both sides
    found = long_axis(POINTS, MASSES, a + b + c)
    parts = np.array([(part**2).sum() for part in (a, b, c)])
    shares = parts / parts.sum()
    assert (found.bending, found.twisting, found.warping) == pytest.approx(tuple(shares), abs=5e-3)
    assert found.bending + found.twisting + found.stretching + found.warping == pytest.approx(1)


def test_turning_about_an_axis_far_off_is_mostly_bending():
    """A section that swings about a point ten widths away sways; one that turns about its own corner twists."""
    far = long_axis(POINTS, MASSES, turned_about_x(POINTS - [0, 0, 2.0], ALONG))
    near = long_axis(POINTS, MASSES, turned_about_x(POINTS - [0, 0, 0.05], ALONG))
    assert far.bending > 0.99
    assert near.twisting > 0.6


def test_still_sections():
    """sin 2πs stands still in the middle; a cantilever's second bending at 0.7834 of its length (B06, by beam)."""
    wave = long_axis(POINTS, MASSES, np.outer(np.sin(2 * np.pi * ALONG), [0, 0, 1]))
    assert wave.nodes == pytest.approx([0.5], abs=0.01)
    bar = design(box_mesh("hex20", (20, 1, 1), (LENGTH, WIDTH, 0.02)), supports=(CLAMP,))
    modes = solve(bar, 2)
    second = long_axis(bar.mesh.points, np.ones(bar.mesh.n_nodes), modes.shape(1))
    assert second.bending > 0.98
    assert second.nodes == pytest.approx([0.7834], abs=0.01)


def test_a_body_askew_and_complex_shapes():
    """Shares do not depend on where the body points (points on the edge of a slice may change), nor on phase."""
    turn, _ = np.linalg.qr(np.random.default_rng(1).normal(size=(3, 3)))
    shape = np.outer(ALONG**2, [0, 1, 0]) + 5 * turned_about_x(POINTS, ALONG)
    plain = long_axis(POINTS, MASSES, shape)
    for askew in (long_axis(POINTS @ turn.T, MASSES, shape @ turn.T), long_axis(POINTS, MASSES, shape * np.exp(1j))):
        assert (askew.bending, askew.twisting) == pytest.approx((plain.bending, plain.twisting), abs=1e-3)


def test_stocky_bodies_have_no_long_axis():
    points = np.random.default_rng(0).random((200, 3))
    assert long_axis(points, np.ones(200), points) is None
    few = line_mesh(np.outer(np.linspace(0, 1, 5), [1, 0, 0])).points
    assert long_axis(few, np.ones(5), few) is None
    assert long_axis(POINTS, np.zeros(len(POINTS)), POINTS) is None


def test_a_point_mass_takes_part():
    """A heavy body hung below draws the slice's centre of mass to it: turning about it is twist."""
    points, masses = np.vstack([POINTS, [[1.5, 0, -0.3]]]), np.append(MASSES, 1e5)
    about = turned_about_x(points - [0, 0, -0.3], 1.0 * (points[:, 0] / LENGTH))
    heavy, light = long_axis(points, masses, about), long_axis(POINTS, MASSES, about[:-1])
    assert light.bending > 0.9
    assert heavy.twisting > light.twisting
