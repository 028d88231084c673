"""Flat 8-node hexahedra: constant strain and curvature, curved walls, the passage to thick cells, exceptions."""

import numpy as np
import pytest

from tests.mechanics.test_solid import ALUMINIUM, assembled, patch_error, zero_modes
from tests.meshes import box_mesh
from viewer.cells import KINDS, measures
from viewer.mechanics import flat_brick, materials
from viewer.mechanics.formulations import formulation_for
from viewer.mechanics.patch import rigid_fields
from viewer.model.design import Material, Property
from viewer.model.mesh import CellBlock, Mesh

ELEMENT = formulation_for("hex8")
THICKNESS = 0.02
OUTLINE = (1.0, 1.5)


def sheet(layers=2, lean=0.0, warp=0.0, jitter=0.0, bottom=0.0):
    """A sheet of 3 × 3 × ``layers`` cells with a crooked outline that is the same at every height, and its inner
    nodes. ``lean`` of the edges through it, ``warp`` and ``jitter`` (each inner node on its own, 3-D) in thicknesses
    of a layer; ``bottom`` moves the lower face down."""
    mesh = box_mesh("hex8", (3, 3, layers), (*OUTLINE, layers * THICKNESS))
    points, random = mesh.points.copy(), np.random.default_rng(5)
    rim = np.unique(np.concatenate([mesh.node_groups[side] for side in ("x0", "x1", "y0", "y1")]))
    inner = np.setdiff1d(np.arange(len(points)), rim)
    column = np.unique(np.round(points[:, :2], 6), axis=0, return_inverse=True)[1].ravel()
    shift = random.uniform(-0.08, 0.08, (column.max() + 1, 2))
    shift[column[rim]] = 0.0
    x, y, z = mesh.points.T
    points[:, :2] += shift[column] + lean * z[:, None] * [0.7, -0.4]
    points[:, 2] += warp * THICKNESS * np.sin(7 * x + 3 * y) - bottom * (z < THICKNESS / 2)
    loose = np.setdiff1d(inner, np.concatenate([mesh.node_groups["z0"], mesh.node_groups["z1"]]))
    points[loose] += jitter * THICKNESS * random.uniform(-1, 1, (len(loose), 3))
    return mesh.with_(points=points), loose


def flat_cells(count=6, jitter=0.3, seed=0):
    """(count, 8, 3) cells about ten times as wide as thick, turned in space, their corners moved by ``jitter`` of the
    thickness, thin across the directions 0, 1, 2 by turns."""
    random = np.random.default_rng(seed)
    cells = []
    for number in range(count):
        half = np.roll([1.0, 1.3, 0.12], -(number % 3))
        turn = np.linalg.qr(random.normal(size=(3, 3)))[0]
        turn *= np.sign(np.linalg.det(turn))
        moved = KINDS["hex8"].reference * half + 0.12 * jitter * random.uniform(-1, 1, (8, 3))
        cells.append(moved @ turn)
    return np.array(cells)


def test_the_wall_is_crossed_by_the_shortest_direction():
    thin, share = flat_brick.wall(flat_cells())
    np.testing.assert_array_equal(thin, [2, 1, 0, 2, 1, 0])
    np.testing.assert_array_equal(share, 1.0)
    bricks = KINDS["hex8"].reference * np.array([[[1, 1, 1]], [[1, 1.2, 0.5]], [[20, 1, 0.6]], [[1, 2, 0.375]]])
    np.testing.assert_allclose(flat_brick.wall(bricks)[1], [0, 0, 0, 0.5], atol=1e-15)


@pytest.mark.parametrize("jitter", [0.0, 0.5])
def test_rigid_motions_and_constant_strain_of_single_cells(jitter):
    """Six motions are free and no others; every constant strain stores ½ ε D ε V on any shape."""
    cells = flat_cells(jitter=jitter)
    stiffness = ELEMENT.stiffness(cells, ALUMINIUM)
    assert np.abs(stiffness - np.swapaxes(stiffness, 1, 2)).max() == 0
    moduli = materials.solid(ALUMINIUM.material)
    for xyz, matrix, volume in zip(cells, stiffness, measures("hex8", cells), strict=True):
        fields = rigid_fields(xyz, xyz.mean(axis=0)).reshape(-1, 6)
        assert np.abs(matrix @ fields).max() < 1e-9 * np.linalg.norm(matrix, 2)
        assert zero_modes(matrix) == 6
        strains = np.zeros((6, 3, 3))
        strains[range(6), flat_brick.FIRST, flat_brick.SECOND] = 0.5
        moved = xyz @ (strains + np.swapaxes(strains, 1, 2))
        np.testing.assert_allclose(
            np.einsum("in,nm,jm->ij", moved.reshape(6, -1), matrix, moved.reshape(6, -1)),
            moduli * volume,
            rtol=0,
            atol=1e-9 * moduli.max() * volume,
        )


def test_numbering_does_not_matter():
    cells = flat_cells()
    stiffness = ELEMENT.stiffness(cells, ALUMINIUM)
    for nodes in flat_brick.TURNS:
        places = (3 * nodes[:, None] + np.arange(3)).ravel()
        turned = ELEMENT.stiffness(cells[:, nodes], ALUMINIUM)
        np.testing.assert_allclose(
            turned, stiffness[:, places][:, :, places], rtol=0, atol=1e-12 * np.abs(stiffness).max()
        )


@pytest.mark.parametrize("shape", [{}, {"lean": 0.8}, {"warp": 0.5}, {"lean": 0.8, "warp": 0.5}, {"layers": 3}])
def test_patch_of_constant_strain(shape):
    """Edges through the sheet parallel: any outline, lean and warp."""
    assert max(patch_error(ELEMENT, *sheet(**shape))) < 1e-9


def test_exceptions_to_the_patch_test():
    """Measured errors of motion, relative to the largest: 0.8 % where inner nodes between two layers are each moved
    by up to a tenth of a layer's thickness in any direction, 0.14 % where a flat layer of crooked outline lies on
    thick cells."""
    assert 1e-3 < patch_error(ELEMENT, *sheet(jitter=0.1))[0] < 1e-2
    assert 1e-4 < patch_error(ELEMENT, *sheet(bottom=0.4))[0] < 2e-3


CURVATURES = {"cylinder": (1.0, 0.0, 0.0), "saddle": (1.0, -0.6, 0.0), "twist": (0.0, 0.0, 1.0)}


@pytest.mark.parametrize("curvature", CURVATURES.values(), ids=CURVATURES)
def test_constant_curvature_is_exact_on_a_crooked_outline(curvature):
    """Kirchhoff's plate of constant curvature w = −(a x² + b y²)/2 − c x y, u = −z ∇w: one layer, nodes at the rim
    held, stores D/2 (a² + b² + 2ν a b + 2 (1 − ν) c²) per area, with D = E t³ / 12 (1 − ν²) (Timoshenko & Woinowsky-
    Krieger, Theory of Plates and Shells, pure bending). Nodes inside find it."""
    a, b, c = curvature
    mesh, _ = sheet(layers=1)
    x, y, z = (mesh.points - [0, 0, THICKNESS / 2]).T
    deflection = -(a * x**2 + b * y**2) / 2 - c * x * y
    wanted = np.stack([z * (a * x + c * y), z * (b * y + c * x), deflection], axis=1).ravel()
    matrix = assembled(ELEMENT, mesh)
    rim = np.unique(np.concatenate([mesh.node_groups[side] for side in ("x0", "x1", "y0", "y1")]))
    held = (3 * rim[:, None] + np.arange(3)).ravel()
    free = np.setdiff1d(np.arange(len(wanted)), held)
    found = wanted.copy()
    found[free] = np.linalg.solve(matrix[np.ix_(free, free)], -matrix[np.ix_(free, held)] @ wanted[held])
    young, ratio = ALUMINIUM.material.youngs_modulus, ALUMINIUM.material.poisson
    rigidity = young * THICKNESS**3 / (12 * (1 - ratio**2))
    exact = rigidity / 2 * (a**2 + b**2 + 2 * ratio * a * b + 2 * (1 - ratio) * c**2) * np.prod(OUTLINE)
    assert found @ matrix @ found / 2 == pytest.approx(exact, rel=1e-9)
    assert np.abs(found - wanted).max() < 1e-9 * np.abs(wanted).max()


def ring(cells, slenderness=20.0):
    """A ring of radius 1 m, one layer thick and one cell wide, of cells ``slenderness`` times as long as thick."""
    length = 2 * np.pi / cells
    mesh = box_mesh("hex8", (cells, 1, 1), (2 * np.pi, length, length / slenderness))
    angle, along, height = mesh.points.T
    radius = 1 + height - height.max() / 2
    points = np.stack([radius * np.cos(angle), along, -radius * np.sin(angle)], axis=1)
    _, first, same = np.unique(np.round(points, 9), axis=0, return_index=True, return_inverse=True)
    nodes = same.ravel()[mesh.blocks[0].nodes]
    return Mesh(points[first], (CellBlock("hex8", nodes, np.arange(1, cells + 1)),), np.arange(1, len(first) + 1))


def test_curved_wall():
    """A thin ring pulled across a diameter by two forces P gives way by (π/4 − 2/π) P R³ / E I (Timoshenko, Strength
    of Materials, part I). Tied thickness strains keep straight cells on a curve from locking: measured with shear
    alone tied, 16 and 32 cells give 0.41 and 0.90 of it; with incompatible modes alone 0.24 and 0.83."""
    prop, share = Property(Material("no Poisson", 1e9, 0.0, 1.0)), []
    for cells in (16, 32):
        mesh = ring(cells)
        matrix = assembled(ELEMENT, mesh, prop)
        x, _, z = mesh.points.T
        ends = np.nonzero(np.abs(z) < 1e-9)[0]
        load = np.zeros(len(matrix))
        load[3 * ends] = np.sign(x[ends]) / (len(ends) / 2)
        moved = np.linalg.lstsq(matrix / 1e9, load / 1e9, rcond=1e-13)[0]
        length = 2 * np.pi / cells
        inertia = length * (length / 20) ** 3 / 12
        share.append(load @ moved / ((np.pi / 4 - 2 / np.pi) / (1e9 * inertia)))
    error = 1 - np.array(share)
    assert 0 < error[1] < 0.02
    assert error[0] / error[1] == pytest.approx(4, rel=0.1)  # second order, as polygons approach the circle


def test_stiffness_passes_smoothly_from_wall_to_solid():
    """Between thickness over width 1/4 and 1/2 the two stiffnesses are mixed; at both ends nothing jumps or kinks."""
    prop = Property(Material("steel", 200e9, 0.3, 8000.0))
    corners = KINDS["hex8"].reference.copy()
    corners[2:4, 0] += 0.4
    bent = (corners.prod(axis=1)[:, None] * [1, 0, 0]).ravel()

    def energy(ratio):
        return bent @ ELEMENT.stiffness(corners[None] * [1, 1, ratio], prop)[0] @ bent

    for ratio in (flat_brick.FLAT, flat_brick.THICK):
        step = 1e-4
        below, at, above = energy(ratio - step), energy(ratio), energy(ratio + step)
        assert abs((above - at) - (at - below)) < 1e-2 * abs(above - below)
