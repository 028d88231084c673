"""Skin triangles split at creases: normals, winding, energy by vertex."""

import numpy as np
import pytest

from tests.meshes import box_mesh, plate_mesh
from viewer.model.mesh import CellBlock, Mesh
from viewer.scene.surface import cross_of, drawn_areas, surface_of

SIZE = np.array([3.0, 2.0, 1.0])


def tube(around: int, along: int = 4) -> Mesh:
    """An open cylinder of radius 1 and length 2 of quad4."""
    angle = 2 * np.pi * np.arange(around) / around
    points = np.array([[np.cos(a), np.sin(a), z] for z in np.linspace(0, 2, along + 1) for a in angle])
    k, i = np.meshgrid(np.arange(along), np.arange(around), indexing="ij")
    j = (i + 1) % around
    quads = np.stack([k * around + i, k * around + j, (k + 1) * around + j, (k + 1) * around + i], -1).reshape(-1, 4)
    return Mesh(points, (CellBlock("quad4", quads, np.arange(len(quads))),), np.arange(len(points)))


@pytest.mark.parametrize("kind", ["hex8", "hex20", "hex27", "wedge6", "wedge15", "tet4", "tet10", "pyramid5"])
def test_box_is_closed_outward_and_split_at_its_twelve_edges(kind):
    mesh = box_mesh(kind, (3, 2, 2), SIZE)
    surface = surface_of(mesh)
    points = mesh.points[surface.nodes]
    assert surface.areas.sum() == pytest.approx(2 * (6 + 3 + 2))
    corners = points[surface.node_triangles]
    volume = np.einsum("ij,ij->i", corners[:, 0], np.cross(corners[:, 1], corners[:, 2])).sum() / 6
    assert volume == pytest.approx(6.0)  # divergence theorem: positive only with outward triangles
    feature = surface.edges.nodes[surface.edges.feature]
    length = np.linalg.norm(points[feature[:, 0]] - points[feature[:, 1]], axis=1)
    assert length.sum() == pytest.approx(4 * SIZE.sum())
    normals = surface.vertex_normals(surface.face_normals(points))
    assert np.sort(np.abs(normals), axis=1) == pytest.approx(np.tile([0, 0, 1.0], (len(normals), 1)), abs=1e-6)
    at_corner = np.all((points[surface.vertex] == 0) | (points[surface.vertex] == SIZE), axis=1)
    assert at_corner.sum() == 8 * 3


@pytest.mark.parametrize(("around", "creases"), [(36, 0), (12, 0), (11, 11), (8, 8)])
def test_creases_are_over_32_degrees(around, creases):
    surface = surface_of(tube(around))
    open_ends = 2 * around
    assert surface.edges.feature.sum() == open_ends + 4 * creases
    assert surface.n_vertices == 5 * around * (2 if creases else 1)


def test_smooth_normals_of_a_tube_are_radial():
    mesh = tube(36)
    surface = surface_of(mesh)
    points = mesh.points[surface.nodes]
    normals = surface.vertex_normals(surface.face_normals(points))
    radial = points[surface.vertex] * [1, 1, 0]
    # triangles cut each quadrilateral one way, so that ends lean by a third of a facet at most
    assert np.abs(np.einsum("ij,ij->i", normals, radial)).min() > np.cos(np.radians(10 / 3))


def test_normals_turn_with_the_body():
    mesh = box_mesh("hex8", (2, 2, 2), SIZE)
    surface = surface_of(mesh)
    turn, _ = np.linalg.qr(np.random.default_rng(0).normal(size=(3, 3)))
    turn *= np.sign(np.linalg.det(turn))
    points = mesh.points[surface.nodes]
    before = surface.vertex_normals(surface.face_normals(points))
    after = surface.vertex_normals(surface.face_normals(points @ turn.T))
    assert after == pytest.approx(before @ turn.T, abs=1e-6)


def test_mixed_winding_is_made_alike():
    plate = plate_mesh("quad4", (8, 6), (2.0, 1.0))
    nodes = plate.blocks[0].nodes.copy()
    turned = np.random.default_rng(5).random(len(nodes)) < 0.5
    nodes[turned] = nodes[turned][:, ::-1]
    mesh = plate.with_(blocks=(CellBlock("quad4", nodes, plate.blocks[0].ids),))
    surface = surface_of(mesh)
    normals = surface.face_normals(mesh.points[surface.nodes])
    assert np.all(normals[:, 2] > 0) or np.all(normals[:, 2] < 0)
    assert surface.edges.feature.sum() == 2 * (8 + 6)


def test_one_sided_band_is_torn_at_one_place():
    around = 40  # a band with half a turn (Möbius)
    angle = 2 * np.pi * np.arange(around) / around

    def rim(side):
        radius = 1 + side * 0.2 * np.cos(angle / 2)
        return np.stack([radius * np.cos(angle), radius * np.sin(angle), side * 0.2 * np.sin(angle / 2)], 1)

    points = np.concatenate([rim(-1), rim(1)])
    quads = [[i, i + 1, around + i + 1, around + i] for i in range(around - 1)]
    quads.append([around - 1, around, 0, 2 * around - 1])
    mesh = Mesh(points, (CellBlock("quad4", np.array(quads), np.arange(around)),), np.arange(2 * around))
    edges = surface_of(mesh).edges
    inner_features = edges.feature & (edges.faces[:, 1] >= 0)
    assert inner_features.sum() == 1


def test_three_sheets_on_a_line_do_not_share_vertices():
    points = np.array([[0, 0, 0], [1, 0, 0], [0, 1, 0], [1, 1, 0], [0, -1, 0], [1, -1, 0], [0, 0, 1], [1, 0, 1.0]])
    quads = np.array([[0, 1, 3, 2], [0, 1, 5, 4], [0, 1, 7, 6]])
    surface = surface_of(Mesh(points, (CellBlock("quad4", quads, np.arange(3)),), np.arange(8)))
    joint = (surface.edges.nodes == [0, 1]).all(axis=1)
    assert surface.edges.feature[joint].all()
    assert surface.n_vertices == 12


def test_energy_does_not_bleed_over_creases():
    mesh = box_mesh("hex8", (4, 4, 4), (1.0, 1.0, 1.0))
    surface = surface_of(mesh)
    middle = np.concatenate([mesh.points[b.nodes].mean(axis=1) for b in mesh.blocks])
    values = np.where(middle[:, 2] > 0.75, 8.0, 0.0)  # the top layer is hot
    by_vertex = surface.vertex_values(values)
    points = mesh.points[surface.nodes]
    normals = surface.vertex_normals(surface.face_normals(points))
    top, bottom = normals[:, 2] > 0.9, normals[:, 2] < -0.9
    assert by_vertex[top] == pytest.approx(8.0)
    assert by_vertex[bottom] == pytest.approx(0.0)
    side = ~top & ~bottom & (points[surface.vertex][:, 2] == 0.75)
    assert by_vertex[side].min() > 2
    assert by_vertex[side].max() < 6  # smooth within a patch


def test_values_are_bounded_and_unknown_is_zero():
    mesh = box_mesh("tet4", (2, 2, 2), SIZE)
    surface = surface_of(mesh)
    values = np.random.default_rng(2).random(mesh.n_cells)
    out = surface.vertex_values(values)
    assert values.min() <= out.min()
    assert out.max() <= values.max()
    assert surface.vertex_values(np.full(mesh.n_cells, np.nan)) == pytest.approx(0.0)


def test_beams_only():
    points = np.array([[0, 0, 0], [1, 0, 0], [1, 1, 0.0]])
    mesh = Mesh(points, (CellBlock("line2", np.array([[0, 1], [1, 2]]), np.arange(2)),), np.arange(3))
    surface = surface_of(mesh)
    assert surface.lines.tolist() == [[0, 1], [1, 2]]
    assert surface.line_cells.tolist() == [0, 1]
    assert surface.n_vertices == 0
    assert surface.face_normals(mesh.points).shape == (0, 3)


def test_drawn_areas():
    mesh = box_mesh("hex8", (3, 3, 3), (3.0, 3.0, 3.0))
    areas = drawn_areas(mesh)
    assert np.sort(areas) == pytest.approx(np.repeat([0.0, 1, 2, 3], [1, 6, 12, 8]))  # inside, side, edge, corner
    assert drawn_areas(plate_mesh("tri6", (2, 2), (1.0, 1.0))) == pytest.approx(np.full(8, 0.125))
    points = np.array([[0, 0, 0], [1, 0, 0], [1, 2, 0.0]])
    beams = Mesh(points, (CellBlock("line2", np.array([[0, 1], [1, 2]]), np.arange(2)),), np.arange(3))
    assert drawn_areas(beams) == pytest.approx([1.0, 2.0])


def test_cross_products_match_numpy():
    random = np.random.default_rng(4)
    points, tri = random.random((30, 3)), random.integers(0, 30, (50, 3))
    a, b, c = points[tri].transpose(1, 0, 2)
    assert cross_of(points, tri) == pytest.approx(np.cross(b - a, c - a))


@pytest.mark.parametrize("kind", ["quad8", "quad9", "tri6"])
def test_mid_side_vertices_lie_between_their_corners(kind):
    # rows of high, low, high energy: along a row nothing may vary, whatever nodes the cells have
    plate = plate_mesh(kind, (8, 3), (8.0, 3.0))
    surface = surface_of(plate)
    middle = np.concatenate([plate.points[b.nodes].mean(axis=1) for b in plate.blocks])
    values = surface.vertex_values(np.where(np.abs(middle[:, 1] - 1.5) < 0.5, 1.0, 9.0))
    points = plate.points[surface.nodes][surface.vertex]
    along = (points[:, 0] >= 1) & (points[:, 0] <= 7)
    for (a, b), mid in (((0.0, 1.0), 0.5), ((1.0, 2.0), 1.5), ((2.0, 3.0), 2.5)):
        ends = [values[along & (points[:, 1] == y) & (points[:, 0] % 1 == 0)].mean() for y in (a, b)]
        inside = along & (points[:, 1] == mid)
        assert inside.sum() == {"quad8": 7, "quad9": 13, "tri6": 13}[kind]
        assert values[inside] == pytest.approx(np.mean(ends))


def test_mid_side_vertices_on_a_crease_keep_to_their_side():
    mesh = box_mesh("hex20", (2, 2, 2), (1.0, 1.0, 1.0))
    surface = surface_of(mesh)
    normals = surface.vertex_normals(surface.face_normals(mesh.points[surface.nodes]))
    mid, corner = surface.between[0].T
    assert normals[mid] == pytest.approx(normals[corner], abs=1e-6)
    assert len(np.unique(mid)) == 6 * 12
    assert len(surface.between[1]) == 0
