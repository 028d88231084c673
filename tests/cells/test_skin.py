"""The skin: closed and outward on solids, whole on surfaces, shared faces found across kinds and degrees."""

import numpy as np
import pytest
import pyvista

from tests.meshes import box_mesh, plate_mesh
from viewer.cells import KINDS, skin

SOLIDS = [k.name for k in KINDS.values() if k.dim == 3]
SURFACES = [k.name for k in KINDS.values() if k.dim == 2]


def uses(triangles):
    """How often each directed edge occurs, as {(a, b): count}."""
    pairs, counts = np.unique(triangles[:, [[0, 1], [1, 2], [2, 0]]].reshape(-1, 2), axis=0, return_counts=True)
    return {tuple(map(int, p)): int(c) for p, c in zip(pairs, counts, strict=True)}


def enclosed(points, triangles):
    a, b, c = (points[triangles[:, i]] for i in range(3))
    return np.einsum("ti,ti->", a, np.cross(b, c)) / 6


@pytest.mark.parametrize("kind", SOLIDS)
def test_solid_is_closed_and_outward(kind):
    mesh = box_mesh(kind, (3, 2, 2), (3.0, 1.0, 2.0), distort=0.2)
    found = skin([(kind, mesh.blocks[0].nodes)])
    directed = uses(found.faces)
    assert all(count == 1 and directed.get(pair[::-1]) == 1 for pair, count in directed.items())
    assert enclosed(mesh.points, found.faces) == pytest.approx(6.0, rel=1e-12)
    on_a_side = np.unique(np.concatenate([rows for rows in mesh.node_groups.values()]))
    np.testing.assert_array_equal(np.unique(found.faces), on_a_side)
    for triangle, cell in zip(found.faces, found.cell, strict=True):
        assert set(triangle) <= set(mesh.blocks[0].nodes[cell])
    # Euler: vertices − edges + faces = 2 for the polyhedron of triangles.
    assert len(on_a_side) - len(directed) // 2 + len(found.faces) == 2


@pytest.mark.parametrize("kind", SURFACES)
def test_surface_cells_are_all_there(kind):
    mesh = plate_mesh(kind, (3, 2), (3.0, 1.0), distort=0.2)
    found = skin([(kind, mesh.blocks[0].nodes)])
    corners = mesh.points[found.faces]
    area = np.linalg.norm(np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]), axis=1) / 2
    assert area.sum() == pytest.approx(3.0)
    assert found.n_faces == mesh.n_cells
    np.testing.assert_array_equal(np.unique(found.faces), np.arange(mesh.n_nodes))
    np.testing.assert_array_equal(np.unique(found.cell), np.arange(mesh.n_cells))


def test_outline_of_one_quadratic_brick():
    nodes = np.arange(20)[None]
    found = skin([("hex20", nodes)])
    assert len(found.outline) == 24  # 12 edges in two halves
    assert {frozenset(p) for p in found.outline.tolist()} == {
        frozenset(p) for a, b, mid in KINDS["hex20"].edges for p in ((a, mid), (mid, b))
    }


def test_line_cells_become_segments():
    lines, vertex, curved = np.array([[0, 1], [1, 2]]), np.array([[9]]), np.array([[3, 5, 4]])
    found = skin([("line2", lines), ("vertex1", vertex), ("line3", curved)])
    assert found.edges.tolist() == [[0, 1], [1, 2], [3, 4], [4, 5]]
    assert found.edge_cell.tolist() == [0, 1, 3, 3]
    assert len(found.faces) == len(found.outline) == found.n_faces == 0


def test_faces_shared_across_kinds_and_degrees():
    """A brick, a quadratic brick on its top, a wedge at its side and a pyramid below: one closed body."""
    cube = (KINDS["hex8"].reference + 1) / 2
    upper = (KINDS["hex20"].reference + 1) / 2 + [0, 0, 1]
    points = np.vstack([cube, upper, [[2, 0, 0], [2, 0, 1], [0.5, 0.5, -1]]])
    brick, wedge, apex = list(range(8)), 28, 30
    top = [4, 5, 6, 7, *range(12, 28)]  # shares its lower corners with the brick
    blocks = [
        ("hex8", np.array([brick])),
        ("hex20", np.array([top])),
        ("wedge6", np.array([[1, wedge, 2, 5, wedge + 1, 6]])),
        ("pyramid5", np.array([[0, 3, 2, 1, apex]])),
    ]
    found = skin(blocks)
    per_cell = [len(np.unique(found.face[found.cell == c])) for c in range(4)]
    assert per_cell == [3, 5, 4, 4]
    assert found.n_faces == 16
    assert enclosed(points, found.faces) == pytest.approx(1 + 1 + 1 / 2 + 1 / 3)


def test_a_shell_on_a_solid_keeps_both():
    mesh = box_mesh("hex8", (1, 1, 1), (1, 1, 1))
    found = skin([("hex8", mesh.blocks[0].nodes), ("quad4", mesh.blocks[0].nodes[:, [0, 1, 2, 3]])])
    assert found.n_faces == 7
    assert sorted(found.cell.tolist()) == [0] * 12 + [1] * 2


def test_real_mesh_agrees_with_vtk():
    """The 40-brick beam in pyvista's bundle: the same outer faces as VTK's surface filter."""
    grid = pyvista.read(pyvista.examples.hexbeamfile)
    nodes = grid.cells_dict[12]
    found = skin([("hex8", nodes)])
    surface = grid.extract_surface(algorithm="dataset_surface")
    assert found.n_faces == surface.n_cells
    assert enclosed(np.asarray(grid.points, float), found.faces) == pytest.approx(5.0, rel=1e-6)


def test_empty():
    assert skin([]).n_faces == 0
    assert skin([("hex8", np.empty((0, 8), np.int64))]).n_faces == 0
