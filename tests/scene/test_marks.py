"""Marks: pegs outside along held edges, beads that move as rigid bodies, functional points along their direction."""

import numpy as np
import pytest
from scipy.spatial import Delaunay

from tests.meshes import box_mesh, plate_mesh
from tests.scene.sheets import known, marked
from viewer.model.mesh import CellBlock, Mesh
from viewer.scene.forms import sphere
from viewer.scene.marks import BEAD, RING, bead_radius, facing_marks, mark_pieces, standing_marks
from viewer.scene.pegs import PEG, PEG_BITE, PEG_STEP, peg_places, spread
from viewer.scene.picture import Body, MassMark, PointMark

EYE = np.array([-0.55, -0.75, 0.42]) / np.linalg.norm([-0.55, -0.75, 0.42])


def plain(mesh, shape=None, **marks) -> Body:
    shape = np.zeros((mesh.n_nodes, 3)) if shape is None else shape
    return Body("part", mesh, shape, 1.0, 10.0, **marks)


# ---- pegs


def test_pegs_of_a_clamped_end_stand_outside_it_and_bite():
    mesh = box_mesh("hex8", (12, 4, 3), (0.3, 0.1, 0.07))
    places = peg_places(mesh, mesh.node_groups["x0"], mesh.diagonal)
    size = PEG * mesh.diagonal
    for centre, outward in places:
        assert outward == pytest.approx([-1, 0, 0], abs=0.05)
        assert -size < centre[0] - size / 2 < centre[0] + size / 2 == pytest.approx(PEG_BITE * size, rel=0.1)


@pytest.mark.parametrize("count", [6, 24, 60])
def test_pegs_are_spread_evenly_however_fine_the_mesh(count):
    mesh = plate_mesh("quad4", (count, count), (0.2, 0.2))
    places = peg_places(mesh, mesh.node_groups["x0"], mesh.diagonal)
    at = np.array([centre for centre, _ in places])
    gaps = np.diff(np.sort(at[:, 1]))
    assert gaps.min() >= 1.05 * PEG * mesh.diagonal  # they never merge
    assert gaps.max() <= 2 * PEG_STEP * mesh.diagonal + 0.2 / count
    assert np.ptp(at[:, 1]) > 0.2 - PEG * mesh.diagonal  # both ends have theirs
    assert np.all(at[:, 0] < 0)  # on the side where the plate is not
    assert at[:, 2] == pytest.approx(np.zeros(len(at)), abs=1e-12)


def test_a_plate_held_all_around_has_pegs_all_around():
    mesh = plate_mesh("quad4", (20, 20), (0.2, 0.2))
    rows = np.unique(np.concatenate([mesh.node_groups[name] for name in ("x0", "x1", "y0", "y1")]))
    at = np.array([centre for centre, _ in peg_places(mesh, rows, mesh.diagonal)])
    outside = (at < 0) | (at > 0.2)
    assert outside[:, :2].any(axis=1).all()
    for k in (0, 1):
        assert (at[:, k] < 0).sum() >= 5
        assert (at[:, k] > 0.2).sum() >= 5


def test_of_a_held_area_only_the_outline_is_marked():
    mesh = box_mesh("hex8", (24, 12, 12), (0.2, 0.1, 0.1))
    at = np.array([centre for centre, _ in peg_places(mesh, mesh.node_groups["x0"], mesh.diagonal)])
    depth = np.min([at[:, 1], 0.1 - at[:, 1], at[:, 2], 0.1 - at[:, 2]], axis=0)
    assert depth.max() < PEG_STEP * mesh.diagonal
    assert len(at) >= 16


def test_pegs_on_irregular_tetrahedra_keep_to_the_outline_and_stand_square():
    size = np.array([0.3, 0.1, 0.1])
    grid = box_mesh("hex8", (12, 5, 5), size).points
    rng = np.random.default_rng(3)
    free = (grid > 1e-9) & (grid < size - 1e-9)  # a coordinate on the box's surface stays on it
    points = grid + np.where(free, rng.uniform(-0.4, 0.4, grid.shape) * size / (12, 5, 5), 0.0)
    cells = Delaunay(points).simplices
    corners = points[cells]
    volume = np.linalg.det(corners[:, 1:] - corners[:, :1])
    cells[volume < 0] = cells[volume < 0][:, [0, 2, 1, 3]]
    cells = cells[np.abs(volume) > 1e-9 * np.prod(size)]
    mesh = Mesh(points, (CellBlock("tet4", cells, np.arange(len(cells))),), np.arange(len(points)))
    places = peg_places(mesh, np.nonzero(points[:, 0] < 1e-12)[0], mesh.diagonal)
    edge = PEG * mesh.diagonal
    for centre, outward in places:
        assert outward == pytest.approx([-1, 0, 0], abs=1e-9)
        assert min(*centre[1:], *(size[1:] - centre[1:])) < 0.5 * edge
    assert len(places) >= 12
    for corner in ((0, 0), (0, 0.1), (0.1, 0), (0.1, 0.1)):
        assert min(np.linalg.norm(centre[1:] - corner) for centre, _ in places) < 0.5 * edge


def test_a_line_held_within_a_plate_is_pegged_from_below():
    mesh = plate_mesh("quad4", (20, 20), (0.2, 0.2))
    rows = np.nonzero(np.abs(mesh.points[:, 0] - 0.1) < 1e-9)[0]
    inner = rows[(mesh.points[rows, 1] > 0.03) & (mesh.points[rows, 1] < 0.17)]
    for _, outward in peg_places(mesh, inner, mesh.diagonal):
        assert outward == pytest.approx([0, 0, -1], abs=1e-9)


def test_a_single_held_node_has_one_peg():
    mesh = plate_mesh("quad4", (4, 4), (0.2, 0.2))
    places = peg_places(mesh, np.array([0]), mesh.diagonal)
    assert len(places) == 1
    assert np.all(places[0][1][:2] < 0)  # out of the corner at the origin


def test_spread_takes_ends_first_and_does_not_depend_on_rounding():
    line = np.stack([np.linspace(0, 1, 101), np.zeros(101), np.zeros(101)], axis=1)
    chosen = spread(line, 0.1)
    assert set(chosen[:2]) == {0, 100}
    assert np.diff(np.sort(line[chosen, 0])).min() >= 0.1
    assert spread(line + 1e3, 0.1) == chosen


# ---- beads


def test_radius_grows_with_the_cube_root_of_the_mass():
    assert bead_radius(8.0, 8.0, 1.0) == BEAD
    assert bead_radius(8.0, 8.0, 1.0) / bead_radius(1.0, 8.0, 1.0) == pytest.approx(2.0)


def test_the_sphere_is_round_closed_and_wound_outward():
    points, triangles = sphere(40, 20)
    a, b, c = points[triangles].transpose(1, 0, 2)
    volume = np.einsum("ij,ij->i", a, np.cross(b, c)).sum() / 6  # divergence theorem: positive if outward
    assert volume == pytest.approx(4 / 3 * np.pi, rel=0.02)
    assert np.linalg.norm(points, axis=1) == pytest.approx(np.ones(len(points)))


def test_a_bead_moves_as_a_rigid_body():
    mesh = box_mesh("hex8", (4, 2, 2), (0.3, 0.1, 0.1))
    turn = np.array([0.02, -0.01, 0.03])
    centre = np.array([0.2, 0.05, 0.2])
    motion = np.concatenate([[0.01, 0.02, -0.005], turn])
    body = plain(mesh, masses=(MassMark("m", 2.0, centre, np.arange(4), motion),))
    bead = standing_marks(body, mesh.diagonal, 2.0)[0]
    moved = bead.at(0.0)
    # small rotation, theorem of Euler and the velocity field of a rigid body: u = t + ω × r
    assert moved - bead.points == pytest.approx(motion[:3] + np.cross(turn, bead.points - centre), abs=1e-12)
    before = np.linalg.norm(bead.points[::7] - bead.points[3], axis=1)
    after = np.linalg.norm(moved[::7] - moved[3], axis=1)
    assert after == pytest.approx(before, rel=turn @ turn)  # lengths change in second order only
    assert bead.at(np.pi) + moved == pytest.approx(2 * bead.points, abs=1e-12)


def test_a_travelling_bead_is_a_quarter_late():
    mesh = box_mesh("hex8", (4, 2, 2), (0.3, 0.1, 0.1))
    motion = np.array([0.01, 0.02j, 0, 0, 0, 0])
    mass = MassMark("m", 2.0, np.ones(3), np.arange(4), motion)
    body = plain(mesh, np.zeros((mesh.n_nodes, 3), complex), masses=(mass,))
    bead = standing_marks(body, mesh.diagonal, 2.0)[0]
    assert bead.at(0.0)[0] - bead.points[0] == pytest.approx([0.01, 0, 0])
    assert bead.at(-np.pi / 2)[0] - bead.points[0] == pytest.approx([0, 0.02, 0])


def test_legs_run_from_the_bead_to_the_footprint_and_follow_both():
    body = marked()
    mark = body.masses[0]
    pieces = standing_marks(body, body.mesh.diagonal, mark.mass)
    legs = next(p for p in pieces if len(p.triangles) == 0 and p.moves)
    radius = bead_radius(mark.mass, mark.mass, body.mesh.diagonal)
    reach = np.linalg.norm(legs.points - mark.position, axis=1)
    assert reach.min() == pytest.approx(radius)
    feet = body.mesh.points[mark.footprint]
    ends = np.linalg.norm(legs.points[:, None] - feet[None], axis=2)
    assert ends.min(axis=1).min() < 0.015 * body.mesh.diagonal  # the last dash (nearly) reaches the foot
    nearest = mark.footprint[np.unravel_index(np.argmin(ends), ends.shape)[1]]
    k = np.unravel_index(np.argmin(ends), ends.shape)[0]
    assert legs.move[k] == pytest.approx(body.factor * body.shape[nearest], rel=0.15, abs=1e-4)
    assert 1 <= len(np.unique(np.round(legs.points[::2][reach[::2] < radius * 1.001], 9), axis=0)) <= 5


def test_a_bead_inside_its_footprint_has_no_legs():
    mesh = box_mesh("hex8", (4, 2, 2), (0.3, 0.1, 0.1))
    body = plain(mesh, masses=(MassMark("m", 2.0, mesh.points[5], np.array([5]), np.zeros(6)),))
    assert len(standing_marks(body, mesh.diagonal, 2.0)) == 1
    assert len(facing_marks(body, mesh.diagonal, 2.0, EYE)) == 2  # rim, hidden rim


# ---- functional points


@pytest.mark.parametrize("direction", [(0, 1, 0), (0, 0, -1), (1, 2, 0.5)])
def test_the_arrow_lies_along_the_direction_and_stays_on_top(direction):
    direction = np.array(direction, float) / np.linalg.norm(direction)
    mesh = box_mesh("hex8", (4, 2, 2), (0.3, 0.1, 0.1))
    motion = np.array([0.01, 0, 0, 5.0, 5.0, 5.0])
    body = plain(mesh, points=(PointMark("focus", np.ones(3), direction, motion),))
    (piece,) = facing_marks(body, mesh.diagonal, 1.0, EYE)
    assert piece.on_top
    away = piece.points - np.ones(3)
    tips = away[np.abs(away @ direction) > 0.99 * np.abs(away @ direction).max()]
    assert np.abs(tips @ direction) == pytest.approx(np.linalg.norm(tips, axis=1), rel=1e-9)
    assert (tips @ direction).min() < 0 < (tips @ direction).max()  # both ways
    ring = away[: 48 * 8]
    assert np.linalg.norm(ring, axis=1).mean() == pytest.approx(RING * mesh.diagonal, rel=0.05)
    assert np.abs(ring @ EYE).max() < 0.2 * RING * mesh.diagonal  # it faces the eye
    assert piece.at(0.0) - piece.points == pytest.approx(np.tile([0.01, 0, 0], (len(away), 1)))  # it does not turn


def test_an_arrow_seen_end_on_is_a_dot_in_the_ring():
    mesh = box_mesh("hex8", (4, 2, 2), (0.3, 0.1, 0.1))
    body = plain(mesh, points=(PointMark("focus", np.ones(3), EYE, np.zeros(6)),))
    (piece,) = facing_marks(body, mesh.diagonal, 1.0, EYE)
    away = piece.points - np.ones(3)
    across = np.linalg.norm(away - np.outer(away @ EYE, EYE), axis=1)
    assert across.max() < 1.2 * RING * mesh.diagonal  # nothing beyond the ring
    assert across[48 * 8 :].max() == pytest.approx(0.45 * RING * mesh.diagonal)


def test_sizes_are_shared_and_scale_with_the_body():
    picture = known()
    pieces = mark_pieces(picture)
    assert len(pieces) == 1
    small = picture.bodies[0].mesh.with_(points=0.001 * picture.bodies[0].mesh.points)
    body = Body("s", small, picture.bodies[0].shape, 1.0, 1.0, supports=picture.bodies[0].supports)
    shrunk = standing_marks(body, small.diagonal, 1.0)
    assert len(shrunk[0].points) == len(pieces[0][0].points)
    assert 1000 * shrunk[0].points == pytest.approx(pieces[0][0].points, abs=1e-9)
