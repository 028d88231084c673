"""From which side a place is seen."""

import numpy as np
import pytest

from tests.meshes import box_mesh
from tests.scene.findings import middles
from tests.stage.channel import WIDTH, body, channel
from viewer.scene.facing_view import facing_view, seen_area
from viewer.scene.picture import Body, View


def plain(mesh) -> Body:
    return Body("part", mesh, np.zeros((mesh.n_nodes, 3)), 0.0, 1.0)


@pytest.mark.parametrize("kind", ["hex8", "tet4"])
def test_of_a_box_the_sides_toward_the_eye_are_seen(kind):
    mesh = box_mesh(kind, (6, 4, 4), (0.3, 0.1, 0.1))
    view = View((0.3, 0.5, 0.8))
    eye = np.array(view.toward_eye) / np.linalg.norm(view.toward_eye)
    every = np.arange(mesh.n_cells)
    # projected area of a convex body: half the sum of projected areas of all its sides, here those that face the eye
    wanted = eye @ [0.1 * 0.1, 0.3 * 0.1, 0.3 * 0.1]
    assert seen_area(plain(mesh), every, view) == pytest.approx(wanted, rel=0.05)


@pytest.mark.parametrize(("y", "sign"), [(0.0, -1), (WIDTH, 1)])
def test_a_flange_is_looked_at_from_its_own_side(y, sign):
    shown = body(channel())
    at = middles(shown.mesh)
    cells = np.nonzero((np.abs(at[:, 1] - y) < 1e-9) & (at[:, 0] > 0.4))[0]
    found = facing_view(shown, cells, View())
    assert np.sign(found.toward_eye[1]) == sign
    assert found.toward_eye[2] == View().toward_eye[2]  # from the same height
    if sign < 0:
        assert found.toward_eye == View().toward_eye  # the usual view shows it


def test_what_is_seen_from_everywhere_keeps_the_usual_view():
    shown = body(channel())
    web = np.nonzero(middles(shown.mesh)[:, 2] > -1e-9)[0]
    assert facing_view(shown, web, View()).toward_eye == View().toward_eye


def test_the_underside_of_a_solid_is_looked_at_from_below():
    mesh = box_mesh("hex8", (6, 4, 4), (0.3, 0.1, 0.1))
    middle = middles(mesh)
    low = np.nonzero((middle[:, 2] < 0.03) & (np.abs(middle[:, :2] - [0.15, 0.05]) < [0.1, 0.04]).all(axis=1))[0]
    assert facing_view(plain(mesh), low, View()).toward_eye[2] < 0
