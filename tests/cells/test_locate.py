"""The nearest place of cells of every kind."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import minimize

from tests.meshes import box_mesh, distorted_cells, plate_mesh
from viewer.cells import KINDS, interpolation, nearest
from viewer.cells.locate import closest, half_spaces

SOLIDS = [k.name for k in KINDS.values() if k.dim == 3]
SURFACES = [k.name for k in KINDS.values() if k.dim == 2]


def inner(kind: str, count: int, seed: int = 0):
    """Random reference coordinates inside a cell."""
    normals, offsets = half_spaces(kind)
    trial = np.random.default_rng(seed).uniform(-1, 1, (4000, KINDS[kind].dim))
    return trial[(trial @ normals.T < offsets - 0.02).all(axis=1)][:count]


@pytest.mark.parametrize("kind", SOLIDS)
def test_places_inside_distorted_solids_come_back(kind: str):
    xyz = distorted_cells(kind, 5, 0.1)
    xi = inner(kind, 20)
    at = np.einsum("qn,bni->bqi", KINDS[kind].shape(xi), xyz)
    for cell, places in zip(xyz, at, strict=True):
        found, position, distance = closest(kind, np.broadcast_to(cell, (len(xi), *cell.shape)), places)
        assert not distance.any()
        np.testing.assert_allclose(position, places, atol=1e-9)
        np.testing.assert_allclose(found, xi, atol=1e-6)


@pytest.mark.parametrize("kind", SURFACES)
def test_feet_of_normals_on_curved_surfaces(kind: str):
    """Points lifted off a curved cell along its normal, by less than its radius of curvature."""
    cell = KINDS[kind]
    x, y = (cell.reference * 0.5).T
    xyz = np.stack([x + 0.1 * y, y, 0.1 * x**2 - 0.06 * x * y], axis=1)
    xi = inner(kind, 20)
    tangents = np.einsum("qnd,ni->qdi", cell.gradient(xi), xyz)
    normal = np.cross(tangents[:, 0], tangents[:, 1])
    normal /= np.linalg.norm(normal, axis=1, keepdims=True)
    gap = np.linspace(-0.3, 0.3, len(xi))
    foot = cell.shape(xi) @ xyz
    lifted = foot + gap[:, None] * normal
    found, position, distance = closest(kind, np.broadcast_to(xyz, (len(xi), *xyz.shape)), lifted)
    np.testing.assert_allclose(position, foot, atol=1e-7)
    np.testing.assert_allclose(found, xi, atol=1e-6)
    np.testing.assert_allclose(distance, np.abs(gap), atol=1e-9)


@pytest.mark.parametrize("kind", ["tri3", "quad4", "tri6", "quad8", "tet4", "hex8", "wedge6", "pyramid5", "line3"])
def test_outside_points_against_an_optimiser(kind: str):
    """SciPy's constrained minimiser from every corner as the reference."""
    cell = KINDS[kind]
    normals, offsets = half_spaces(kind)
    random = np.random.default_rng(3)
    xyz = np.pad(cell.reference, ((0, 0), (0, 3 - cell.dim))) + 0.05 * random.normal(size=(cell.n_nodes, 3))
    for query in 2.5 * random.normal(size=(6, 3)):
        square = lambda xi, query=query: float(np.sum((cell.shape(xi[None])[0] @ xyz - query) ** 2))  # noqa: E731
        limits = [{"type": "ineq", "fun": lambda xi: offsets - normals @ xi}]
        starts = 0.8 * (cell.reference - cell.reference.mean(axis=0)) + cell.reference.mean(axis=0)
        reference = min(
            minimize(square, start, constraints=limits, method="SLSQP", options={"ftol": 1e-14}).fun
            for start in starts
        )
        xi, position, distance = closest(kind, xyz[None], query[None])
        assert distance[0] == pytest.approx(np.sqrt(max(reference, 0)), abs=1e-6)
        assert (normals @ xi[0] <= offsets + 1e-8).all()
        np.testing.assert_allclose(cell.shape(xi)[0] @ xyz, position[0], atol=1e-12)


@pytest.mark.parametrize("kind", ["hex8", "tet10", "wedge15", "pyramid5", "hex20"])
def test_linear_fields_are_carried_between_meshes(kind: str):
    mesh = box_mesh(kind, (3, 2, 2), (1.5, 1.0, 1.0), 0.2)
    queries = np.random.default_rng(1).uniform(0, [1.5, 1, 1], (200, 3))
    blocks = [(block.kind, block.nodes) for block in mesh.blocks]
    places = nearest(blocks, mesh.points, queries)
    assert not places.distance.any()
    field = mesh.points @ [1.0, -2.0, 3.0] + 0.5
    carried = np.full(len(queries), np.nan)
    for rows, nodes, weights in interpolation(blocks, places):
        carried[rows] = np.einsum("kn,kn->k", weights, field[nodes])
    np.testing.assert_allclose(carried, queries @ [1.0, -2.0, 3.0] + 0.5, atol=1e-8)


def test_the_right_cell_of_a_graded_mesh_is_found():
    """Cells of very unequal size: the nearest centre is not the nearest cell."""
    mesh = plate_mesh("quad4", (8, 4), (1.0, 1.0))
    points = mesh.points.copy()
    points[:, 0] = points[:, 0] ** 4 * 50
    nodes = mesh.blocks[0].nodes
    queries = np.column_stack([np.linspace(0, 50, 60), np.linspace(0.1, 0.9, 60), np.linspace(-2, 2, 60)])
    places = nearest([("quad4", nodes)], points, queries)
    np.testing.assert_allclose(places.distance, np.abs(queries[:, 2]), atol=1e-9)
    np.testing.assert_allclose(places.position[:, :2], queries[:, :2], atol=1e-9)


def test_several_kinds_and_nothing():
    mesh = plate_mesh("tri3", (2, 2), (1, 1))
    other = plate_mesh("quad8", (2, 2), (1, 1))
    points = np.vstack([mesh.points, other.points + np.array([0, 0, 1])])
    blocks = [("tri3", mesh.blocks[0].nodes), ("quad8", other.blocks[0].nodes + mesh.n_nodes)]
    places = nearest(blocks, points, [[0.3, 0.4, 0.1], [0.3, 0.4, 0.8], [0.5, 0.5, 3.0]])
    np.testing.assert_allclose(places.distance, [0.1, 0.2, 2.0])
    assert (places.cell >= len(blocks[0][1])).tolist() == [False, True, True]
    with pytest.raises(ValueError, match="no cell"):
        nearest([], points, points)


@pytest.mark.parametrize("kind", ["hex8", "tet10", "pyramid5", "wedge15"])
def test_places_on_the_outside_of_a_body_lie_in_its_cells(kind: str):
    """Off a box the distance is that to the box; reference coordinates are those of the solid cell."""
    mesh = box_mesh(kind, (2, 2, 2), (1.0, 1.0, 1.0), 0.2)
    queries = np.random.default_rng(4).uniform(-0.5, 1.5, (60, 3))
    blocks = [(block.kind, block.nodes) for block in mesh.blocks]
    places = nearest(blocks, mesh.points, queries)
    inside = np.clip(queries, 0, 1)
    np.testing.assert_allclose(places.distance, np.linalg.norm(queries - inside, axis=1), atol=1e-9)
    np.testing.assert_allclose(places.position, inside, atol=1e-8)
    for rows, nodes, weights in interpolation(blocks, places):
        again = np.einsum("kn,kni->ki", weights, mesh.points[nodes])
        np.testing.assert_allclose(again, inside[rows], atol=1e-8)
