"""Node lines against shapes whose lines are known."""

import numpy as np
import pytest
from scipy.special import jn_zeros, jv

from tests.meshes import box_mesh, plate_mesh
from viewer.model.mesh import CellBlock, Mesh
from viewer.scene.node_lines import crossings, lines_of, words
from viewer.scene.picture import Body
from viewer.scene.surface import surface_of


def drawn(mesh, shape):
    body = Body("b", mesh, shape, 1.0, 1.0)
    body = Body("b", mesh, shape, 1.0, 1.0, node_lines=lines_of(body))
    surface = surface_of(mesh)
    return body.node_lines, crossings(body, surface).segments(mesh.points[surface.nodes])


def upward(mesh, value):
    return np.stack([0 * value, 0 * value, value], axis=1)


@pytest.mark.parametrize("counts", [(41, 31), (42, 32)])  # lines between nodes, and through them
def test_a_simply_supported_plate(counts):
    # sin(2πx/a) sin(πy/b), Timoshenko & Woinowsky-Krieger: one line at a/2; the supported edges are none
    mesh = plate_mesh("quad4", counts, (2.0, 1.0))
    x, y, _ = mesh.points.T
    lines, ends = drawn(mesh, upward(mesh, np.sin(np.pi * x) * np.sin(np.pi * y)))
    assert words(lines) == "node lines, if any: no motion normal to the surface"
    # between nodes the shape is straight; toward the supported edges, where it vanishes, the line strays by a cell
    assert ends[:, :, 0] == pytest.approx(1.0, abs=2.0 / 41 + 1e-9)
    inner = ends[(np.abs(ends[:, :, 1] - 0.5) < 0.35).all(axis=1)]
    assert inner[:, :, 0] == pytest.approx(1.0, abs=3e-3)
    assert np.linalg.norm(ends[:, 1] - ends[:, 0], axis=1).sum() == pytest.approx(1.0, abs=0.1)


def test_a_clamped_beam_has_no_line_at_its_root():
    # second bending mode of a cantilever: node at 0.7834 of its length (Blevins, Formulas for Natural Frequency and
    # Mode Shape, table 8-1)
    mesh = box_mesh("hex8", (120, 3, 3), (1.0, 0.05, 0.05))
    x = mesh.points[:, 0]
    k = 4.69409113297
    sigma = (np.cosh(k) + np.cos(k)) / (np.sinh(k) + np.sin(k))
    lines, ends = drawn(mesh, upward(mesh, np.cosh(k * x) - np.cos(k * x) - sigma * (np.sinh(k * x) - np.sin(k * x))))
    assert words(lines) == "node lines, if any: no motion along z"
    assert ends[:, :, 0] == pytest.approx(0.7834, abs=2e-4)
    assert np.linalg.norm(ends[:, 1] - ends[:, 0], axis=1).sum() == pytest.approx(4 * 0.05)


def test_a_circular_membrane_has_a_node_circle():
    # J0(j02 r): node circle at r = j01/j02 (Rayleigh, Theory of Sound, section 201)
    mesh = plate_mesh("tri3", (80, 80), (2.0, 2.0))
    centre = mesh.points - [1.0, 1.0, 0.0]
    r = np.linalg.norm(centre, axis=1)
    keep = (r[mesh.blocks[0].nodes] < 1.0).all(axis=1)
    mesh = Mesh(centre, (CellBlock("tri3", mesh.blocks[0].nodes[keep], np.arange(keep.sum())),), np.arange(len(r)))
    first, second = jn_zeros(0, 2)
    _, ends = drawn(mesh, upward(mesh, jv(0, second * r)))
    assert np.linalg.norm(ends, axis=2) == pytest.approx(first / second, abs=2e-3)
    length = np.linalg.norm(ends[:, 1] - ends[:, 0], axis=1).sum()
    assert length == pytest.approx(2 * np.pi * first / second, rel=5e-3)


def test_a_bell_has_lines_of_its_radial_motion():
    # a tube in its two-lobed mode, radial cos 2θ: four lines at odd multiples of 45°
    angle, z = np.meshgrid(np.linspace(0, 2 * np.pi, 81)[:-1] + 0.01, np.linspace(0, 1, 11), indexing="ij")
    angle, z = angle.ravel(), z.ravel()
    i, j = np.meshgrid(np.arange(80), np.arange(10), indexing="ij")
    at = lambda a, b: ((i + a) % 80 * 11 + j + b).ravel()  # noqa: E731
    quads = np.stack([at(0, 0), at(1, 0), at(1, 1), at(0, 1)], axis=1)
    out = np.stack([np.cos(angle), np.sin(angle), 0 * angle], axis=1)
    mesh = Mesh(out + z[:, None] * [0, 0, 1.0], (CellBlock("quad4", quads, np.arange(800)),), np.arange(880))
    around = np.stack([-np.sin(angle), np.cos(angle), 0 * angle], axis=1)
    shape = np.cos(2 * angle)[:, None] * out - 0.5 * np.sin(2 * angle)[:, None] * around
    lines, ends = drawn(mesh, shape)
    assert lines.direction is None
    found = np.degrees(np.arctan2(ends[:, :, 1], ends[:, :, 0])) % 90
    assert found == pytest.approx(45, abs=0.2)
    assert np.linalg.norm(ends[:, 1] - ends[:, 0], axis=1).sum() == pytest.approx(4.0, rel=1e-3)


def test_a_sheet_that_moves_in_its_plane_has_lines_of_that_motion():
    mesh = plate_mesh("quad4", (20, 4), (2.0, 0.4))
    shape = np.zeros((mesh.n_nodes, 3))
    shape[:, 0] = np.cos(np.pi * mesh.points[:, 0] / 2)  # free-free rod
    lines, ends = drawn(mesh, shape)
    assert words(lines) == "node lines, if any: no motion along x"
    assert ends[:, :, 0] == pytest.approx(1.0, abs=1e-6)


def test_side_effects_of_a_hundredth_draw_no_lines():
    mesh = plate_mesh("quad4", (40, 20), (2.0, 1.0))
    x = mesh.points[:, 0]
    ripple = np.where(x < 1, 0.01 * np.sin(8 * np.pi * x), np.sin(np.pi * (x - 1)))
    _, ends = drawn(mesh, upward(mesh, ripple))
    assert len(ends) == 0


def test_lines_ride_with_the_body():
    mesh = plate_mesh("quad4", (11, 4), (2.0, 1.0))
    shape = upward(mesh, mesh.points[:, 0] - 0.9)
    body = Body("b", mesh, shape, 1.0, 1.0, node_lines=lines_of(Body("b", mesh, shape, 1.0, 1.0)))
    surface = surface_of(mesh)
    found = crossings(body, surface)
    still, moved = (found.segments((mesh.points + c * shape)[surface.nodes]) for c in (0.0, 0.5))
    assert moved == pytest.approx(still, abs=1e-12)  # that is what a node line is


def test_a_travelling_mode_has_none():
    mesh = plate_mesh("quad4", (4, 4), (1.0, 1.0))
    shape = upward(mesh, mesh.points[:, 0] - 0.5) * (1 + 0j) + 1j * upward(mesh, mesh.points[:, 1] - 0.5)
    assert lines_of(Body("b", mesh, shape, 1.0, 1.0)) is None
    assert words(None) == "no node lines: the mode travels"


def test_a_rigid_turn_about_a_slanted_axis():
    mesh = box_mesh("hex8", (8, 8, 2), (1.0, 1.0, 0.2))
    direction = np.array([0.0, 0.6, 0.8])
    shape = (mesh.points[:, :1] - 0.37) * direction
    lines, ends = drawn(mesh, shape)
    assert lines.direction == pytest.approx(direction)
    assert words(lines) == "node lines, if any: no motion along (0, 0.6, 0.8)"
    assert ends[:, :, 0] == pytest.approx(0.37, abs=1e-12)
