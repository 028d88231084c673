"""Facing surfaces: found as by trying every triangle, and their motion as written down here."""

from __future__ import annotations

import numpy as np
import pytest

from tests.meshes import box_mesh, plate_mesh
from viewer.insight.facing import facing_surfaces
from viewer.model.mesh import CellBlock, Mesh

GAP = 0.2


def joined(*parts: Mesh, groups=()) -> Mesh:
    """Meshes side by side in one, a cell group for each named part."""
    points = np.concatenate([part.points for part in parts])
    starts = np.cumsum([0, *(part.n_nodes for part in parts)])
    blocks = [
        CellBlock(block.kind, block.nodes + start, block.ids)
        for part, start in zip(parts, starts[:-1], strict=True)
        for block in part.blocks
    ]
    ends = np.cumsum([0, *(part.n_cells for part in parts)])
    named = {name: np.arange(ends[i], ends[i + 1]) for i, name in enumerate(groups)}
    return Mesh(points, tuple(blocks), np.arange(1, len(points) + 1), {}, named)


def moved(mesh: Mesh, by) -> Mesh:
    return mesh.with_(points=mesh.points + np.asarray(by))


def plates(turn_over=False) -> Mesh:
    """Two sheets 1 m × 0.5 m, one above the other."""
    upper = moved(plate_mesh("quad4", (12, 7), (1.0, 0.5)), [0, 0, GAP])
    if turn_over:
        block = upper.blocks[0]
        upper = upper.with_(blocks=(CellBlock("quad4", block.nodes[:, ::-1], block.ids),))
    return joined(plate_mesh("quad4", (10, 6), (1.0, 0.5)), upper, groups=("lower", "upper"))


def blocks() -> Mesh:
    """The same of solids 0.1 m thick."""
    size = (1.0, 0.5, 0.1)
    lower, upper = box_mesh("hex8", (8, 4, 1), size), moved(box_mesh("tet10", (3, 2, 1), size), [0, 0, 0.1 + GAP])
    return joined(lower, upper, groups=("lower", "upper"))


MESHES = {"sheets": plates(), "sheets, one turned over": plates(True), "solids": blocks()}


@pytest.mark.parametrize("name", MESHES)
def test_two_parallel_surfaces(name):
    mesh = MESHES[name]
    (pair,) = facing_surfaces(mesh).pair_motions(np.broadcast_to([1.0, 0, 0], mesh.points.shape))
    assert set(pair.names) == {"lower", "upper"}
    assert pair.area == pytest.approx(0.5, rel=0.05)
    assert (pair.gap, pair.gap_least) == pytest.approx((GAP, GAP))
    assert np.abs(pair.direction) == pytest.approx([0, 0, 1])
    assert (pair.straight, pair.together, pair.motion) == pytest.approx((1, 1, 1))
    assert pair.apart


@pytest.mark.parametrize("name", MESHES)
@pytest.mark.parametrize("phase", [1.0, np.exp(0.4j)])
def test_shares_of_a_mixture(name, phase):
    """Spread 3, slide 2 and common motion 1 along three directions: shares 9, 4 and 1 of 14."""
    mesh = MESHES[name]
    above = np.where(mesh.points[:, 2] > 0.5 * GAP + 0.05, 1.0, -1.0)
    shape = phase * (np.outer(above, [2, 0, 3]) + np.array([0, 1, 0]))
    (pair,) = facing_surfaces(mesh).pair_motions(shape)
    assert (pair.opens, pair.slides, pair.together) == pytest.approx((9 / 14, 4 / 14, 1 / 14), abs=1e-9)
    assert np.abs(pair.slide_direction) == pytest.approx([1, 0, 0], abs=1e-9)
    assert pair.opening == pytest.approx(6.0)
    assert pair.one_way == pytest.approx(1.0)
    assert pair.motion == pytest.approx(1.0)


def test_turning_as_one_piece_opens_nothing():
    """Any small rigid motion leaves every gap as it is."""
    mesh = MESHES["solids"]
    turn = np.cross([0.3, -0.5, 0.8], mesh.points - [3.0, 1.0, -2.0])
    (pair,) = facing_surfaces(mesh).pair_motions(turn)
    assert pair.opens < 1e-12


def test_a_gap_that_opens_here_and_closes_there():
    mesh = MESHES["sheets"]
    lift = np.where(mesh.points[:, 2] > 0.1, 1, 0) * (mesh.points[:, 0] - 0.5)
    (pair,) = facing_surfaces(mesh).pair_motions(np.outer(lift, [0, 0, 1]))
    assert pair.one_way < 0.05
    assert pair.opens == pytest.approx(0.5)  # half of it moves both sheets in common


def test_walls_of_a_box_are_no_arms_and_a_ring_faces_itself():
    """A square tube of sheets: two pairs of walls; a round one: its inside, in all directions."""
    corner = np.array([[0, 0], [1, 0], [1, 1], [0, 1]]) * 0.1
    square = np.concatenate([np.linspace(a, b, 5)[:-1] for a, b in zip(corner, np.roll(corner, -1, 0), strict=True)])
    angle = np.linspace(0, 2 * np.pi, 33)[:-1]
    (first, second) = facing_surfaces(tube(square)).pair_motions(np.ones((17 * 16, 3)))
    assert not first.apart
    assert not second.apart
    assert np.abs([first.direction, second.direction]).max(axis=0)[:2] == pytest.approx([1, 1])
    round_tube = tube(0.05 * np.column_stack([np.cos(angle), np.sin(angle)]))
    breathing = round_tube.points * [1, 1, 0]
    (inside,) = facing_surfaces(round_tube).pair_motions(breathing)
    assert inside.gap == pytest.approx(0.1, rel=0.02)
    assert inside.straight < 0.8
    assert inside.opens > 0.98
    assert inside.one_way > 0.99


def tube(outline) -> Mesh:
    """A sheet of 16 cells along z, 0.8 m, around a closed outline (n, 2)."""
    n = len(outline)
    points = np.concatenate([np.column_stack([outline, np.full(n, z)]) for z in np.linspace(0, 0.8, 17)])
    i, k = (grid.ravel() for grid in np.meshgrid(np.arange(n), np.arange(16)))
    nodes = np.column_stack([k * n + i, k * n + (i + 1) % n, (k + 1) * n + (i + 1) % n, (k + 1) * n + i])
    return Mesh(points, (CellBlock("quad4", nodes, np.arange(len(nodes))),), np.arange(len(points)))


def test_a_surface_between_hides_the_one_behind():
    mesh = joined(*(moved(plate_mesh("tri3", (6, 6), (1, 1)), [0, 0, z]) for z in (0, 0.1, 0.4)), groups="abc")
    pairs = facing_surfaces(mesh).pair_motions(np.ones((mesh.n_nodes, 3)))
    assert [set(pair.names) for pair in pairs] in ([{"a", "b"}, {"b", "c"}], [{"b", "c"}, {"a", "b"}])


@pytest.mark.parametrize("seed", range(3))
def test_rays_meet_what_every_triangle_tried_in_turn_says(seed):
    """Against plain linear algebra over all triangles, on a heap of sheets of sizes from 0.02 to 1."""
    random = np.random.default_rng(seed)
    parts = []
    for size in (1.0, 1.0, 0.3, 0.3, 0.1, 0.02):
        turn, _ = np.linalg.qr(random.normal(size=(3, 3)))
        sheet = plate_mesh("tri3", (random.integers(2, 9), random.integers(2, 9)), (size, size))
        parts.append(sheet.with_(points=sheet.points @ turn.T + random.random(3)))
    mesh = joined(*parts)
    found = facing_surfaces(mesh).places
    corners = mesh.points[mesh.skin.faces]
    a, one, two = corners[:, 0], corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]
    start = np.einsum("rk,rki->ri", found.from_weights, corners[found.first])
    for row in range(0, len(found.first), 7):
        matrix = np.stack([one, two, np.broadcast_to(-found.ray[row], one.shape)], axis=2)
        regular = np.abs(np.linalg.det(matrix)) > 1e-12
        u, v, t = np.linalg.solve(matrix[regular], (start[row] - a[regular])[..., None])[..., 0].T
        own = (mesh.skin.faces[regular][:, :, None] == mesh.skin.faces[found.first[row]]).any(axis=(1, 2))
        hit = (u >= 0) & (v >= 0) & (u + v <= 1) & (t > 1e-9) & ~own
        assert t[hit].min() == pytest.approx(found.gap[row], rel=1e-9)


def test_bodies_without_anything_that_faces():
    brick = box_mesh("hex8", (3, 2, 2), (1, 1, 1))
    assert facing_surfaces(brick).pair_motions(brick.points) == ()
    sheet = plate_mesh("quad4", (3, 3), (1, 1))
    assert facing_surfaces(sheet).pair_motions(sheet.points) == ()
    points = Mesh(np.eye(3), (), np.arange(3))
    assert facing_surfaces(points).pair_motions(points.points) == ()


def test_findings_do_not_depend_on_the_mesh():
    """Two sheets of 20 000 triangles each and of 100: the same figures."""
    figures = []
    for cells in (7, 100):
        sheet = plate_mesh("quad4", (cells, cells), (1.0, 1.0))
        mesh = joined(sheet, moved(sheet, [0, 0, GAP]))
        bulge = np.sin(np.pi * mesh.points[:, 0]) * np.sin(np.pi * mesh.points[:, 1])
        shape = np.outer(np.where(mesh.points[:, 2] > 0, 1.0, 0.2) * bulge, [0, 0, 1])
        (pair,) = facing_surfaces(mesh).pair_motions(shape)
        figures.append((pair.opens, pair.together, pair.motion))
    assert figures[0] == pytest.approx(figures[1], abs=0.01)
    assert figures[1][:2] == pytest.approx((0.5 * 0.64 / 1.04, 0.5 * 1.44 / 1.04), abs=1e-6)
