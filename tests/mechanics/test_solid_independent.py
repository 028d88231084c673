"""Assembled stiffness and mass against scikit-fem (BSD licence) wherever both use the same element and quadrature.

Its wedges are left out: version 12's rules on the reference wedge (volume ½) have weights that add up to ¼, measured.
"""

import numpy as np
import pytest
import skfem
from scipy.spatial import cKDTree
from skfem.models.elasticity import lame_parameters, linear_elasticity

from tests.meshes import box_mesh
from viewer.cells import KINDS
from viewer.mechanics.formulations import formulation_for
from viewer.mechanics.solid import SolidFormulation
from viewer.model.design import Material, Property

MATERIAL = Material("aluminium", 70e9, 0.33, 2700.0)
PROPERTY = Property(MATERIAL)

# formulation: scikit-fem's mesh, element, degree of quadrature for stiffness and mass
PAIRS = {
    "tet4-constant": (skfem.MeshTet1, skfem.ElementTetP1, 1, 2),
    "tet10-full": (skfem.MeshTet1, skfem.ElementTetP2, 2, 4),
    "hex8-full": (skfem.MeshHex1, skfem.ElementHex1, 3, 5),
    "hex20-full": (skfem.MeshHex1, skfem.ElementHexS2, 5, 7),
    "hex20-reduced": (skfem.MeshHex1, skfem.ElementHexS2, 3, 7),
    "hex27-full": (skfem.MeshHex1, skfem.ElementHex2, 5, 7),
}


def scikit_mesh(mesh, kind, theirs):
    """The same corners; scikit-fem's own corner order is found by comparing the two reference cells."""
    ours = kind.reference[: kind.n_corners].copy()
    if kind.family == "hex":
        ours = (ours + 1) / 2
    order = cKDTree(ours).query(theirs.elem.refdom.p.T, distance_upper_bound=1e-9)[1]
    used, corners = np.unique(mesh.blocks[0].nodes[:, order], return_inverse=True)
    return theirs(mesh.points[used].T.copy(), corners.reshape(-1, kind.n_corners).T.copy())


def rows_of(basis, mesh):
    """For each of scikit-fem's freedoms, our node at the same place; every node is met."""
    distance, rows = cKDTree(mesh.points).query(basis.doflocs.T)
    assert distance.max() < 1e-12
    assert len(np.unique(rows)) == mesh.n_nodes
    return rows


def assembled(matrices, dofs, size):
    out = np.zeros((size, size))
    np.add.at(out, (dofs[:, :, None], dofs[:, None, :]), matrices)
    return out


def compare(ours, mesh, model, element, order, mass_order):
    """Our assembled matrices against scikit-fem's on its ``model`` of the mesh, to 1e-10 of the largest entry."""
    nodes = mesh.blocks[0].nodes
    vector = skfem.Basis(model, skfem.ElementVector(element()), intorder=order)
    wanted = linear_elasticity(*lame_parameters(MATERIAL.youngs_modulus, MATERIAL.poisson)).assemble(vector).toarray()
    nodal = rows_of(vector, mesh)
    direction = np.empty(len(nodal), int)  # freedoms of one node follow one another: x, y, z
    for node in range(mesh.n_nodes):
        direction[nodal == node] = range(3)
    place = 3 * nodal + direction
    dofs = (3 * nodes[:, :, None] + np.arange(3)).reshape(len(nodes), -1)
    found = assembled(ours.stiffness(mesh.points[nodes], PROPERTY), dofs, 3 * mesh.n_nodes)[np.ix_(place, place)]
    assert np.abs(found - wanted).max() < 1e-10 * np.abs(wanted).max()

    scalar = skfem.Basis(model, element(), intorder=mass_order)
    wanted = skfem.BilinearForm(lambda u, v, _: MATERIAL.density * u * v).assemble(scalar).toarray()
    place = rows_of(scalar, mesh)
    found = assembled(ours.mass(mesh.points[nodes], PROPERTY), nodes, mesh.n_nodes)[np.ix_(place, place)]
    assert np.abs(found - wanted).max() < 1e-10 * np.abs(wanted).max()


@pytest.mark.parametrize("name", PAIRS)
def test_same_matrices(name):
    theirs, element, order, mass_order = PAIRS[name]
    kind = KINDS[name.partition("-")[0]]
    mesh = box_mesh(kind.name, (2, 2, 2), (1.0, 1.5, 0.8), distort=0.2, seed=7)
    model = scikit_mesh(mesh, kind, theirs)
    compare(formulation_for(kind.name, name), mesh, model, element, order, mass_order)


def test_curved_tetrahedra():
    """Inner mid-side nodes moved: scikit-fem's isoparametric 10-node mesh. The 4-point rule is the same in both;
    the mass takes rules exact for it (degree 4 + 3), which in scikit-fem 12 needs its nominal degree 8."""
    mesh = box_mesh("tet10", (2, 2, 2), (1.0, 1.0, 1.0), distort=0.2, seed=7)
    points = mesh.points.copy()
    straight = skfem.MeshTet2.from_mesh(scikit_mesh(mesh, KINDS["tet10"], skfem.MeshTet1))
    inner = np.setdiff1d(np.arange(mesh.n_nodes), np.concatenate(list(mesh.node_groups.values())))
    points[inner] += 0.02 * (np.random.default_rng(3).random((len(inner), 3)) - 0.5)
    mesh, rows = mesh.with_(points=points), cKDTree(mesh.points).query(straight.doflocs.T)[1]
    model = skfem.MeshTet2(points[rows].T.copy(), straight.t)
    compare(SolidFormulation("tet10 fine", "tet10", 2, 7), mesh, model, skfem.ElementTetP2, 2, 8)
