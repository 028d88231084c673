"""Every cell kind: shape functions, node order, quadrature, faces, measures, orientation."""

import itertools
import math

import numpy as np
import pytest
import vtk

from tests.meshes import distorted_cells
from viewer.cells import (
    KINDS,
    by_meshio,
    by_vtk,
    cofactors,
    determinants,
    inverted,
    jacobian_components,
    jacobians,
    repair_orientation,
)
from viewer.cells import measures as measures_of

ALL = pytest.mark.parametrize("kind", KINDS.values(), ids=KINDS.keys())
SOLIDS = pytest.mark.parametrize("kind", [k for k in KINDS.values() if k.dim == 3], ids=lambda k: k.name)
LINEAR = {
    "line": "line2",
    "tri": "tri3",
    "quad": "quad4",
    "tet": "tet4",
    "pyramid": "pyramid5",
    "wedge": "wedge6",
    "hex": "hex8",
}


def inside(kind, count=20, seed=1):
    """Random points strictly inside the reference cell: means of its corners with positive weights."""
    weights = np.random.default_rng(seed).dirichlet(np.ones(kind.n_corners), count)
    return weights @ kind.reference[: kind.n_corners]


def in_space(kind):
    """The reference cell as one cell in space (1, n, 3)."""
    return np.pad(kind.reference, ((0, 0), (0, 3 - kind.dim)))[None]


@ALL
def test_partition_of_unity_and_delta(kind):
    np.testing.assert_allclose(kind.shape(inside(kind)).sum(axis=1), 1, atol=1e-13)
    np.testing.assert_allclose(kind.shape(kind.reference), np.eye(kind.n_nodes), atol=1e-13)
    np.testing.assert_allclose(kind.gradient(inside(kind)).sum(axis=1), 0, atol=1e-12)


@ALL
def test_gradient_is_the_derivative(kind):
    xi, step = inside(kind), 1e-5
    for axis in range(kind.dim):
        shift = step * np.eye(kind.dim)[axis]
        difference = (kind.shape(xi + shift) - kind.shape(xi - shift)) / (2 * step)
        np.testing.assert_allclose(kind.gradient(xi)[:, :, axis], difference, atol=1e-7)


@ALL
def test_complete_to_its_degree(kind):
    """Interpolates every polynomial of its degree: what convergence rests on."""
    xi = inside(kind)
    for powers in itertools.product(range(kind.degree + 1), repeat=kind.dim):
        if sum(powers) <= kind.degree:
            nodal, wanted = (np.prod(p ** np.array(powers), axis=1) for p in (kind.reference, xi))
            np.testing.assert_allclose(kind.shape(xi) @ nodal, wanted, atol=1e-12)


@ALL
def test_mid_side_nodes_are_means(kind):
    quadratic = kind.n_nodes > kind.n_corners
    for edge in kind.edges:
        assert len(edge) == (3 if quadratic else 2)
        if quadratic:
            np.testing.assert_allclose(kind.reference[edge[2]], kind.reference[list(edge[:2])].mean(axis=0))
    assert len({frozenset(e[:2]) for e in kind.edges}) == len(kind.edges)


def vtk_cell(kind):
    return vtk.vtkGenericCell.InstantiateCell(kind.vtk_type)


def to_vtk(kind, xi):
    """VTK's parametric coordinates: [0, 1] in every direction, pyramids as a collapsed brick."""
    p = np.pad(xi, ((0, 0), (0, 3 - kind.dim))).astype(float)
    if kind.family == "pyramid":
        p[:, :2] /= np.maximum(1 - p[:, 2:], 1e-300)
        p[:, :2] = (p[:, :2] + 1) / 2
    elif kind.family == "wedge":
        p[:, 2] = (p[:, 2] + 1) / 2
    elif kind.family in ("line", "quad", "hex"):
        p[:, : kind.dim] = (p[:, : kind.dim] + 1) / 2
    return p


@ALL
def test_vtk_has_the_same_nodes_and_shape_functions(kind):
    """VTK's own cell classes. Its 13-node pyramid spans another space (a collapsed 20-node brick), so there only
    the node order and the mid-side values are comparable."""
    cell = vtk_cell(kind)
    assert cell.GetNumberOfPoints() == kind.n_nodes
    assert by_vtk(kind.vtk_type) is kind
    assert cell.GetCellDimension() == kind.dim
    if kind.dim == 0:
        return
    xi = kind.reference if kind.name == "pyramid13" else np.vstack([kind.reference, inside(kind)])
    values = np.zeros((len(xi), kind.n_nodes))
    for row, point in zip(values, to_vtk(kind, xi), strict=True):
        weights = [0.0] * kind.n_nodes
        cell.InterpolateFunctions(list(point), weights)
        row[:] = weights
    np.testing.assert_allclose(kind.shape(xi), values, atol=1e-12)


@ALL
def test_meshio_has_the_same_name(kind):
    meshio = pytest.importorskip("meshio")
    assert by_meshio(kind.meshio_name) is kind
    assert meshio._vtk_common.vtk_to_meshio_type[kind.vtk_type] == kind.meshio_name


def test_unknown_types_are_none():
    assert by_vtk(7) is None
    assert by_meshio("polyhedron8") is None


def exact(family, powers):
    """Integral of a monomial over the reference cell, closed forms: a! b! c! / (a + b + c + d)! on simplices."""
    line = lambda a: (1 + (-1) ** a) / (a + 1)  # noqa: E731
    simplex = lambda p: math.prod(map(math.factorial, p)) / math.factorial(sum(p) + len(p))  # noqa: E731
    if family in ("tri", "tet"):
        return simplex(powers)
    if family == "wedge":
        return simplex(powers[:2]) * line(powers[2])
    if family == "pyramid":  # x and y range over ±(1 − z): a beta function is left over z
        a, b, c = powers
        return line(a) * line(b) * math.gamma(c + 1) * math.gamma(a + b + 3) / math.gamma(a + b + c + 4)
    return math.prod(map(line, powers))


@pytest.mark.parametrize("order", range(9))
@pytest.mark.parametrize("family", LINEAR)
def test_quadrature_is_exact(family, order):
    kind = KINDS[LINEAR[family]]
    points, weights = kind.rule(order)
    assert (weights > 0).all()
    assert (kind.shape(points) > 0).all(), "points lie inside"
    for powers in itertools.product(range(order + 1), repeat=kind.dim):
        total = {"tri": sum(powers), "tet": sum(powers), "pyramid": sum(powers), "wedge": sum(powers[:2])}
        if total.get(family, 0) <= order:
            value = weights @ np.prod(points ** np.array(powers), axis=1)
            assert value == pytest.approx(exact(family, powers), rel=1e-13, abs=1e-14), powers


@SOLIDS
def test_faces_point_outward_and_close_the_cell(kind):
    centre, used = kind.reference[: kind.n_corners].mean(axis=0), []
    for name, local in kind.faces:
        face, points = KINDS[name], kind.reference[list(local)]
        assert len(local) == face.n_nodes
        middle = face.reference[: face.n_corners].mean(axis=0)[None]
        tangent = jacobians(name, points[None], middle)[0, 0]
        assert np.cross(tangent[:, 0], tangent[:, 1]) @ (face.shape(middle)[0] @ points - centre) > 0
        np.testing.assert_allclose(points, (face.shape(face.reference) @ points), atol=1e-13)
        if len(local) > face.n_corners:
            for a, b, mid in face.edges:
                np.testing.assert_allclose(points[mid], (points[a] + points[b]) / 2, atol=1e-13)
        used += [frozenset((local[e[0]], local[e[1]])) for e in face.edges]
    assert sorted(map(sorted, used)) == sorted(sorted(e[:2]) for e in kind.edges for _ in range(2))


@pytest.mark.parametrize("kind", [k for k in KINDS.values() if k.dim == 2], ids=lambda k: k.name)
def test_triangles_fill_the_surface_and_use_every_node(kind):
    points = in_space(kind)[0]
    parts = points[np.array(kind.triangles)]
    area = np.cross(parts[:, 1] - parts[:, 0], parts[:, 2] - parts[:, 0])[:, 2] / 2
    assert (area > 0).all()
    assert area.sum() == pytest.approx({"tri": 0.5, "quad": 4.0}[kind.family])
    assert set(np.ravel(kind.triangles)) == set(range(kind.n_nodes))


REFERENCE_SIZE = {
    "vertex": 0,
    "line": 2,
    "tri": 1 / 2,
    "quad": 4,
    "tet": 1 / 6,
    "pyramid": 4 / 3,
    "wedge": 1,
    "hex": 8,
}


@ALL
def test_measure_of_a_stretched_cell(kind):
    stretch, turn = np.array([2.0, 3.0, 5.0]), np.linalg.qr(np.random.default_rng(2).normal(size=(3, 3)))[0]
    turn *= np.linalg.det(turn)
    moved = (in_space(kind) * stretch) @ turn.T + 7
    wanted = REFERENCE_SIZE[kind.family] * math.prod(stretch[: kind.dim])
    np.testing.assert_allclose(measures_of(kind.name, moved), [wanted], rtol=1e-12)


@SOLIDS
def test_volume_is_the_flux_through_the_faces(kind):
    """Divergence theorem on curved cells: V = ⅓ ∮ x·n dA, exact where faces and volume share their geometry."""
    xyz = distorted_cells(kind.name, 5)
    flux = np.zeros(len(xyz))
    for name, local in kind.faces:
        points, weights = KINDS[name].rule(8)
        side = jacobians(name, xyz[:, list(local)], points)
        normal = np.cross(side[..., 0], side[..., 1])
        flux += np.einsum("q,bqi,bqi->b", weights, normal, KINDS[name].shape(points) @ xyz[:, list(local)]) / 3
    np.testing.assert_allclose(measures_of(kind.name, xyz), flux, rtol=1e-11)


@pytest.mark.parametrize("name", ["tet4", "pyramid5", "wedge6", "hex8", "tri3", "quad4", "line2"])
def test_measure_agrees_with_vtk(name):
    kind = KINDS[name]
    points, ids, data = vtk.vtkPoints(), vtk.vtkIdList(), vtk.vtkUnstructuredGrid()
    points.SetDataTypeToDouble()
    xyz = in_space(kind) @ np.array([[2.0, 0.3, 0.1], [0.2, 1.5, -0.4], [0.0, 0.5, 1.1]])  # faces stay flat
    for row in xyz[0]:
        ids.InsertNextId(points.InsertNextPoint(row))
    data.SetPoints(points)
    data.InsertNextCell(kind.vtk_type, ids)
    sizes = vtk.vtkCellSizeFilter()
    sizes.SetInputData(data)
    sizes.Update()
    word = {1: "Length", 2: "Area", 3: "Volume"}[kind.dim]
    given = sizes.GetOutput().GetCellData().GetArray(word).GetValue(0)
    np.testing.assert_allclose(measures_of(name, xyz), [abs(given)], rtol=1e-12)


def test_curved_line_and_surface():
    """The parabola y = x² on [0, 1] has the length ½√5 + ¼ asinh 2; as a line and as the profile of a sheet.

    The root under the integral is no polynomial: quadrature is near, not exact.
    """
    line = np.array([[[0, 0, 0], [1, 1, 0], [0.5, 0.25, 0.0]]])
    wanted = math.sqrt(5) / 2 + math.asinh(2) / 4
    np.testing.assert_allclose(measures_of("line3", line), [wanted], rtol=2e-4)
    bent = in_space(KINDS["quad9"]).copy()
    bent[0, :, 2] = bent[0, :, 0] ** 2  # z = x² over [−1, 1]², width 2
    np.testing.assert_allclose(measures_of("quad9", bent), [4 * wanted], rtol=2e-2)


@SOLIDS
def test_orientation_is_repaired(kind):
    cells = distorted_cells(kind.name, 6)
    points, nodes = cells.reshape(-1, 3), np.arange(6 * kind.n_nodes).reshape(6, -1)
    good, flipped = repair_orientation(kind.name, points, nodes)
    assert flipped == 0
    assert good is nodes
    wrong = nodes.copy()
    wrong[[1, 4]] = wrong[[1, 4]][:, kind.mirror]
    assert (inverted(kind.name, points[wrong]) == [1, 4]).all()
    repaired, flipped = repair_orientation(kind.name, points, wrong)
    assert flipped == 2
    np.testing.assert_array_equal(repaired, nodes)


def test_both_windings_of_the_wedge():
    """The same six points numbered either way come out with a positive volume."""
    points = np.array([[0, 0, 0], [1, 0, 0], [0, 1, 0], [0, 0, 2], [1, 0, 2], [0, 1, 2.0]])
    for winding in ([0, 1, 2, 3, 4, 5], [0, 2, 1, 3, 5, 4], [3, 4, 5, 0, 1, 2]):
        nodes, _ = repair_orientation("wedge6", points, np.array([winding]))
        assert measures_of("wedge6", points[nodes])[0] == pytest.approx(1.0)


def test_collapsed_and_folded_cells_are_named():
    cube = in_space(KINDS["hex8"])[0]
    flat, folded = cube * [1, 1, 0], cube.copy()
    folded[6] = [-0.9, -0.9, 0.5]  # one corner pushed through: positive volume, folded inside
    assert list(inverted("hex8", np.stack([cube, flat, folded]))) == [1, 2]
    assert measures_of("hex8", folded[None])[0] > 0


def test_component_algebra():
    matrix = np.random.default_rng(0).normal(size=(3, 3, 7))
    plain = np.moveaxis(matrix, 2, 0)
    np.testing.assert_allclose(determinants(matrix), np.linalg.det(plain))
    adjugate = np.linalg.inv(plain) * np.linalg.det(plain)[:, None, None]
    np.testing.assert_allclose(cofactors(matrix), adjugate.transpose(2, 1, 0))
    xyz, xi = distorted_cells("hex20", 2), inside(KINDS["hex20"], 3)
    j = jacobian_components(xyz, KINDS["hex20"].gradient(xi))
    np.testing.assert_array_equal(j[1, 2], jacobians("hex20", xyz, xi)[..., 1, 2])
