"""Where a redesign moves otherwise: figures of known motions, and the picture of them."""

from __future__ import annotations

import numpy as np
import pytest

from tests.integration.models import kept
from tests.mechanics.models import CLAMP, design
from tests.meshes import plate_mesh
from viewer.insight.difference import difference_by_cell
from viewer.mechanics.eigen import solve
from viewer.scene.difference_picture import TITLE, difference_picture
from viewer.workspace.study import study


def linear(points):
    return points @ np.array([[1.0, 2, 0.5], [-1, 0.3, 4], [2, 1, 1]])


def sheet(kind, counts, thickness=0.002):
    mesh = plate_mesh(kind, counts, (0.3, 0.1))
    part = design(mesh, thickness=thickness, supports=(CLAMP,)).with_(name=kind)
    return study(part, solve(part, 2))


def test_motions_that_are_alike_do_not_differ_whatever_the_mesh():
    one, two = plate_mesh("quad4", (7, 4), (0.4, 0.2)), plate_mesh("tri6", (5, 3), (0.4, 0.2))
    apart = difference_by_cell(one, two, linear(one.points), linear(two.points))
    assert apart == pytest.approx(np.zeros(two.n_cells), abs=1e-9)


def test_a_known_difference_real_and_complex():
    one, two = plate_mesh("quad4", (7, 4), (0.4, 0.2)), plate_mesh("tri3", (9, 5), (0.4, 0.2))
    more = np.array([3e-3, 0, 4e-3])
    assert difference_by_cell(one, two, linear(one.points), linear(two.points) + more) == pytest.approx(0.005)
    ahead = difference_by_cell(one, two, linear(one.points), linear(two.points) + 1j * more)
    assert ahead == pytest.approx(0.005)  # a quarter of the cycle later, but as far


def test_what_the_first_does_not_have_is_not_known():
    one = kept(plate_mesh("quad4", (8, 4), (0.4, 0.2)), lambda x, y, z: x < 0.2)
    two = plate_mesh("quad4", (10, 5), (0.4, 0.2))
    apart = difference_by_cell(one, two, linear(one.points), linear(two.points))
    x = two.points[two.blocks[0].nodes].mean(axis=1)[:, 0]
    assert np.isnan(apart[x > 0.22]).all() and not np.isnan(apart[x < 0.2]).any()


def test_the_same_design_on_another_mesh_hardly_differs_and_the_sign_is_that_of_the_other():
    picture = difference_picture(sheet("quad4", (12, 4)), 1, sheet("tri3", (18, 6)), 1)
    (body,) = picture.bodies
    assert np.nanmax(body.density) < 2  # percent; turned about, it would be 200
    assert picture.energy_words == TITLE and "sign and phase by the modal scale factor" in " ".join(
        picture.note.drawing
    )
    assert picture.note.title == "Mode 1: tri3 less quad4"


def test_another_shape_differs_by_as_much_as_it_moves():
    first = sheet("quad4", (12, 4))
    picture = difference_picture(first, 1, sheet("tri3", (18, 6)), 2)
    assert np.nanmax(picture.bodies[0].density) > 60
    assert picture.energy_top >= 64
    assert picture.note.title == "Modes 1 and 2: tri3 less quad4"
