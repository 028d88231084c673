"""Solids of directional material: against scikit-fem with the moduli turned by the textbook's 6 × 6 matrix, patch
tests of every formulation, the isotropic limit, and what is asked for when something lacks."""

from dataclasses import replace

import numpy as np
import pytest
import skfem

from tests.mechanics.models import CLAMP
from tests.mechanics.test_followers import joined, moved
from tests.mechanics.test_solid_independent import PAIRS, assembled, rows_of, scikit_mesh
from tests.meshes import box_mesh, distorted_cells, line_mesh
from viewer.cells import KINDS
from viewer.errors import ModelError
from viewer.mechanics import materials
from viewer.mechanics.assembly import assemble
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import energies
from viewer.mechanics.formulations import formulation_for
from viewer.mechanics.solid import SOLIDS
from viewer.model.design import (
    Assignment,
    Design,
    Directional,
    Material,
    Physics,
    Property,
    Section,
    Selector,
    Support,
    Tie,
)

# a softwood's order of magnitude (from memory): stiff along the grain, three different planes
CONSTANTS = Directional(11e9, 0.9e9, 0.37, 0.7e9, 0.75e9, 0.04e9, e3=0.5e9, nu13=0.42, nu23=0.47)
WOOD = Material("wood", CONSTANTS.e1, CONSTANTS.nu12, 450.0, CONSTANTS)
PROPERTY = Property(WOOD, direction=(1.0, 2.0, -0.5), orientation=(0.3, 0.1, 1.0))


def axes():
    """Rows: axes 1, 2, 3 of the property, by Gram and Schmidt."""
    first = np.array(PROPERTY.direction) / np.linalg.norm(PROPERTY.direction)
    third = np.array(PROPERTY.orientation) - np.dot(PROPERTY.orientation, first) * first
    third /= np.linalg.norm(third)
    return np.array([first, np.cross(third, first), third])


def turned_moduli():
    """(6, 6) in global axes, order xx yy zz yz zx xy: C' = M C Mᵀ with the matrix M that turns stresses (Auld B.A.,
    Acoustic Fields and Waves in Solids, 1973, vol. 1, ch. 3: Bond's matrix; chapter from memory)."""
    own = CONSTANTS
    compliance = np.diag([1 / own.e1, 1 / own.e2, 1 / own.e3, 1 / own.g23, 1 / own.g13, 1 / own.g12])
    for i, j, ratio, modulus in ((0, 1, own.nu12, own.e1), (0, 2, own.nu13, own.e1), (1, 2, own.nu23, own.e2)):
        compliance[i, j] = compliance[j, i] = -ratio / modulus
    a = axes().T  # from the material's axes to the global ones
    bond = np.empty((6, 6))
    pairs = ((1, 2), (2, 0), (0, 1))
    for i in range(3):
        bond[i, :3] = a[i] ** 2
        bond[i, 3:] = [2 * a[i, m] * a[i, n] for m, n in pairs]
    for row, (i, j) in enumerate(pairs, 3):
        bond[row, :3] = a[i] * a[j]
        bond[row, 3:] = [a[i, m] * a[j, n] + a[i, n] * a[j, m] for m, n in pairs]
    return bond @ np.linalg.inv(compliance) @ bond.T


def test_moduli_are_those_of_the_turned_matrix():
    order = [0, 1, 2, 5, 3, 4]  # ours: xx yy zz xy yz zx
    wanted = turned_moduli()[np.ix_(order, order)]
    np.testing.assert_allclose(materials.voigt(materials.tensor(PROPERTY)), wanted, atol=1e-12 * wanted.max())


@pytest.mark.parametrize("name", PAIRS)
def test_same_stiffness_as_another_library(name):
    theirs, element, order, _ = PAIRS[name]
    kind = KINDS[name.partition("-")[0]]
    mesh = box_mesh(kind.name, (2, 2, 2), (1.0, 1.5, 0.8), distort=0.2, seed=7)
    vector = skfem.Basis(scikit_mesh(mesh, kind, theirs), skfem.ElementVector(element()), intorder=order)
    moduli = turned_moduli()

    @skfem.BilinearForm
    def form(u, v, _):
        def strain(w):
            g = w.grad
            return np.array([g[0, 0], g[1, 1], g[2, 2], g[1, 2] + g[2, 1], g[2, 0] + g[0, 2], g[0, 1] + g[1, 0]])

        return np.einsum("m...,mn,n...->...", strain(v), moduli, strain(u))

    wanted = form.assemble(vector).toarray()
    nodal = rows_of(vector, mesh)
    direction = np.empty(len(nodal), int)
    for node in range(mesh.n_nodes):
        direction[nodal == node] = range(3)
    place = 3 * nodal + direction
    nodes = mesh.blocks[0].nodes
    dofs = (3 * nodes[:, :, None] + np.arange(3)).reshape(len(nodes), -1)
    ours = formulation_for(kind.name, name).stiffness(mesh.points[nodes], PROPERTY)
    found = assembled(ours, dofs, 3 * mesh.n_nodes)[np.ix_(place, place)]
    assert np.abs(found - wanted).max() < 1e-10 * np.abs(wanted).max()


@pytest.mark.parametrize("element", SOLIDS, ids=lambda f: f.name)
def test_patch_of_constant_strain(element):
    """A linear field in a cell: forces at its nodes hold ½ εᵀCε V, and rigid motions none."""
    xyz = distorted_cells(element.kind, 4, curved=False)
    slope = np.random.default_rng(1).standard_normal((3, 3))
    moved = (xyz @ slope.T).reshape(len(xyz), -1)
    stiffness = element.stiffness(xyz, PROPERTY)
    strain = 0.5 * (slope + slope.T)
    density = 0.5 * np.einsum("ij,ijkl,kl", strain, materials.tensor(PROPERTY), strain)
    volume = element.mass(xyz, PROPERTY).sum(axis=(1, 2)) / WOOD.density
    found = 0.5 * np.einsum("bi,bij,bj->b", moved, stiffness, moved)
    np.testing.assert_allclose(found, density * volume, rtol=1e-10)
    spin = slope - slope.T
    turned = (xyz @ spin.T).reshape(len(xyz), -1)
    assert np.abs(np.einsum("bij,bj->bi", stiffness, turned)).max() < 1e-9 * np.abs(stiffness).max()
    if not element.incompatible:
        np.testing.assert_allclose(element.strain_energy(xyz, PROPERTY, moved[..., None])[:, 0], found, rtol=1e-10)


@pytest.mark.parametrize("element", SOLIDS, ids=lambda f: f.name)
def test_isotropic_numbers_give_the_isotropic_element(element):
    shear = 70e9 / 2.66
    own = Directional(70e9, 70e9, 0.33, shear, shear, shear, 70e9, 0.33, 0.33)
    alike = Property(Material("alike", 70e9, 0.33, 2700.0, own), direction=(1.0, 1.0, 0.2))  # the same around axis 1
    plain = Property(Material("plain", 70e9, 0.33, 2700.0))
    xyz = distorted_cells(element.kind, 3)
    wanted = element.stiffness(xyz, plain)
    np.testing.assert_allclose(element.stiffness(xyz, alike), wanted, atol=1e-10 * np.abs(wanted).max())


def bar(prop):
    mesh = box_mesh("hex20", (12, 2, 2), (1.0, 0.06, 0.06))
    given = Assignment("*", "wood", direction=prop.direction, orientation=prop.orientation)
    return Design("bar", mesh, Physics({"wood": WOOD}, (given,), supports=(CLAMP,)))


def test_slender_bars_bend_by_the_modulus_along_them():
    """Clamped and free at the end, l/h = 17: ω = 1.8751² √(E I / (m l⁴)) with the modulus along the bar (Blevins,
    Formulas for Natural Frequency and Mode Shape, 1979, table 8-1), lowered by shear and rotary inertia in first
    order: 1 − 3.3 (r/l)² (E/κG + 1), r² = h²/12; the 3.3 from memory."""
    for direction, orientation, modulus, shears in (
        ((1, 0, 0), (0, 0, 1), CONSTANTS.e1, (CONSTANTS.g13, CONSTANTS.g12)),
        ((0, 1, 0), (1, 0, 0), CONSTANTS.e3, (CONSTANTS.g23, CONSTANTS.g13)),
    ):
        model = bar(Property(WOOD, direction=direction, orientation=orientation))
        found = solve(model, 2).freq_hz
        plain = 1.87510407**2 / (2 * np.pi) * np.sqrt(modulus * 0.06**2 / 12 / WOOD.density)
        wanted = sorted(plain * (1 - 3.3 * 0.0003 * (6 / 5 * modulus / g + 1)) for g in shears)
        np.testing.assert_allclose(found, wanted, rtol=0.02)
        assert energies(model, solve(model, 2)).trusted.all()


def test_unlike_meshes_tied_are_one_body():
    """Grain aslant to the seam, 10-node tetrahedra on hexahedra of 20 nodes, against hexahedra throughout: the bound
    is that of isotropic halves (``test_followers``)."""
    whole = box_mesh("hex20", (10, 2, 2), (1.0, 0.2, 0.1))
    lower = box_mesh("hex20", (10, 2, 1), (1.0, 0.2, 0.05))
    upper = moved(box_mesh("tet10", (8, 3, 1), (1.0, 0.2, 0.05)), [0, 0, 0.05])
    given = (Assignment("*", "wood", direction=(1.0, 0.5, 0.7), orientation=(0.3, 0.1, 1.0)),)
    found = []
    for mesh, ties in (
        (whole, ()),
        (joined(upper, lower), (Tie("seam", Selector(group="0z0"), Selector(group="1")),)),
    ):
        roots = Selector(nodes=mesh.node_ids[np.isclose(mesh.points[:, 0], 0)])
        physics = Physics({"wood": WOOD}, given, supports=(Support("root", roots),), ties=ties)
        found.append(solve(Design("plank", mesh, physics), 4).freq_hz)
    np.testing.assert_allclose(found[1], found[0], rtol=0.015)


SHEET_ONLY = Material("ply", 140e9, 0.3, 1600.0, Directional(140e9, 10e9, 0.3, 5e9, 5e9, 3.5e9))


@pytest.mark.parametrize(
    ("material", "direction", "orientation", "words"),
    [
        (SHEET_ONLY, (1, 0, 0), (0, 0, 1), ["ply", "solids", "no e3, nu13, nu23"]),
        (WOOD, None, None, ["wood", "no direction", "direction = "]),
        (WOOD, (1, 0, 0), None, ["wood", "no orientation", "axes 2 and 3"]),
        (WOOD, (1, 0, 0), (2, 0, 0), ["wood", "parallel"]),
        (
            replace(WOOD, directional=replace(CONSTANTS, nu13=6.0)),
            (1, 0, 0),
            (0, 0, 1),
            ["wood", "give energy back", "nu13 6"],
        ),
    ],
)
def test_what_a_directional_solid_lacks_is_said(material, direction, orientation, words):
    given = Assignment("*", material.name, direction=direction, orientation=orientation)
    physics = Physics({material.name: material}, (given,))
    with pytest.raises(ModelError) as caught:
        assemble(Design("block", box_mesh("hex8", (1, 1, 1), (1, 1, 1)), physics))
    for word in words:
        assert word in str(caught.value)


def test_beams_stay_isotropic():
    given = Assignment("*", "wood", section=Section("round", diameter=0.01), orientation=(0, 0, 1))
    model = Design("rod", line_mesh([[0, 0, 0], [1, 0, 0]]), Physics({"wood": WOOD}, (given,)))
    with pytest.raises(ModelError, match="stands on beams"):
        assemble(model)
