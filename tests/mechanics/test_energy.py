"""Energies by cell add up to the global forms; springs and masses against hand-computed fractions."""

from __future__ import annotations

import re
from fractions import Fraction

import numpy as np
import pytest

from tests.checks.reference import row
from tests.mechanics.models import CLAMP, STEEL, design, lone_nodes, merged
from tests.meshes import box_mesh, plate_mesh
from viewer.errors import ModelError
from viewer.mechanics.assembly import assemble
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import energies
from viewer.model.design import LumpedMass, Selector, Spring, Support
from viewer.model.modes import ArrayShapes, ModeSet

MESHES = {
    "hexahedra": (box_mesh("hex8", (6, 2, 2), (1.0, 0.2, 0.1), 0.2), None),
    "quadratic tetrahedra": (box_mesh("tet10", (4, 1, 1), (1.0, 0.2, 0.1)), None),
    "shells": (plate_mesh("quad4", (6, 3), (1.0, 0.5), 0.2), 0.01),
    "two kinds": (
        merged(box_mesh("hex8", (6, 2, 2), (1.0, 0.2, 0.1)), box_mesh("tet4", (6, 2, 2), (1.0, 0.2, 0.1))),
        None,
    ),
}
FITTINGS = {
    "springs": (
        Spring("pad", Selector(group="x1"), None, [1e4, 2e4, 5e5, 0, 0, 0]),
        Spring("stay", Selector(near=[0.5, 0, 0]), None, axis=[1, 1, 1], axial=1e5),
    ),
    "masses": (LumpedMass("camera", Selector(group="x1"), 1.5, [1.1, 0.1, 0.2], np.diag([0.1, 0.2, 0.3])),),
}


@pytest.mark.parametrize("name", MESHES)
def test_parts_add_up_to_the_global_forms(name):
    mesh, thickness = MESHES[name]
    model = design(mesh, thickness=thickness, supports=(CLAMP,), **FITTINGS)
    modes, system = solve(model, 5), assemble(model)
    found = energies(model, modes)
    shapes = system.gather(modes.shapes.moved, modes.shapes.turned)
    strain = 0.5 * np.einsum("kn,nk->k", shapes, system.K @ shapes.T)
    moving = 0.5 * np.einsum("kn,nk->k", shapes, system.M @ shapes.T) * (2 * np.pi * modes.freq_hz) ** 2
    np.testing.assert_allclose(found.strain.sum(axis=1) + found.springs.sum(axis=1), strain, rtol=1e-10)
    np.testing.assert_allclose(found.kinetic.sum(axis=1) + found.masses.sum(axis=1), moving, rtol=1e-10)
    np.testing.assert_allclose(found.closure, 1, atol=1e-8)
    assert found.trusted.all()
    assert (found.springs.sum(axis=1) > 0).all()
    assert (found.masses.sum(axis=1) > 0).all()


def chain(k1, k2, k3):
    """Row S01: K = [[k1 + k2, −k2], [−k2, k2 + k3]], M = I along x."""
    at = [Selector(nodes=[1]), Selector(nodes=[2])]
    return design(
        lone_nodes(2),
        masses=(LumpedMass("first", at[0], 1.0), LumpedMass("second", at[1], 1.0)),
        springs=(
            Spring("ground 1", at[0], None, [k1, 0, 0, 0, 0, 0]),
            Spring("between", *at, [k2, 0, 0, 0, 0, 0]),
            Spring("ground 2", at[1], None, [k3, 0, 0, 0, 0, 0]),
        ),
        supports=(Support("guide", Selector(nodes=[1, 2]), ("uy", "uz")),),
    )


def test_spring_fractions_s09():
    model = chain(1.0, 1.0, 1.0)
    modes = solve(model, 2)
    np.testing.assert_allclose((2 * np.pi * modes.freq_hz) ** 2, [1, 3], rtol=1e-12)
    found = energies(model, modes)
    text = [re.findall(r"\d+/\d+|\b0\b", part) for part in row("S09").text.split(",")]
    assert [len(part) for part in text] == [3, 3]
    for j, fractions in enumerate(text):
        expected = [float(Fraction(f)) for f in fractions]
        np.testing.assert_allclose(found.springs[j] / found.springs[j].sum(), expected, atol=1e-12)
        assert list(found.to_dict(j)["springs"].values()) == pytest.approx(expected, abs=1e-12)
        assert found.spring_share(j) == pytest.approx(1)
        assert found.mass_share(j) == pytest.approx(1)
        assert list(found.to_dict(j)["masses"].values()) == pytest.approx([0.5, 0.5])
        assert "springs hold 100.0% of the strain energy" in found.sentence(j)


def stretched(mesh, factor=1.0):
    """u = factor · x: constant strain."""
    moved = np.zeros((1, mesh.n_nodes, 3), np.result_type(factor, float))
    moved[0, :, 0] = factor * mesh.points[:, 0]
    return ModeSet(mesh.node_ids, [100.0], ArrayShapes(moved))


@pytest.mark.parametrize("kind", ["hex8", "tet4", "wedge15"])
def test_constant_strain_has_uniform_density(kind):
    mesh = box_mesh(kind, (3, 2, 2), (1, 1, 1), 0.2)
    found = energies(design(mesh), stretched(mesh))
    np.testing.assert_allclose(found.density(0), 1, rtol=1e-9)
    assert found.volumes.sum() == pytest.approx(1)
    modulus = STEEL.youngs_modulus * 0.7 / (1.3 * 0.4)  # E(1 − ν)/((1 + ν)(1 − 2ν)), lateral strain held
    assert found.total_strain[0] == pytest.approx(0.5 * modulus)


def test_volumes_of_shells_take_the_thickness():
    mesh = plate_mesh("quad4", (2, 2), (1, 1))
    found = energies(design(mesh, thickness=0.02), solve(design(mesh, thickness=0.02), 7), [6])
    np.testing.assert_allclose(found.volumes, 0.02 / 4)


def test_complex_shapes_count_both_parts():
    mesh = box_mesh("hex8", (2, 1, 1), (1, 1, 1))
    plain, turned = energies(design(mesh), stretched(mesh)), energies(design(mesh), stretched(mesh, 3 + 4j))
    np.testing.assert_allclose(turned.strain, 25 * plain.strain)
    np.testing.assert_allclose(turned.kinetic, 25 * plain.kinetic)
    np.testing.assert_allclose(turned.closure, plain.closure)
    np.testing.assert_allclose(turned.residual, plain.residual)
    np.testing.assert_allclose(turned.residual_cells, plain.residual_cells)


def test_chosen_modes_keep_their_numbers():
    model = design(MESHES["hexahedra"][0], supports=(CLAMP,))
    modes = solve(model, 5)
    some, every = energies(model, modes, [3, 1]), energies(model, modes)
    np.testing.assert_array_equal(some.strain, every.strain[[3, 1]])
    assert some.to_dict(0)["mode"] == 4
    assert some.sentence(0).startswith("Mode 4 (")


def test_rigid_body_modes_have_no_closure():
    model = design(MESHES["hexahedra"][0])
    found = energies(model, solve(model, 8))
    assert np.isnan(found.closure[:6]).all()
    assert "rigid-body mode" in found.sentence(0)
    assert found.to_dict(0)["closure"] is None
    assert found.trusted[6:].all()


def test_modes_of_another_mesh_are_refused():
    mesh, other = box_mesh("hex8", (2, 1, 1), (1, 1, 1)), box_mesh("hex8", (3, 1, 1), (1, 1, 1))
    with pytest.raises(ModelError, match="not given on the nodes"):
        energies(design(mesh), stretched(other))
    with pytest.raises(ModelError, match="mode 1 has no frequency"):
        energies(design(mesh), stretched(mesh).with_(freq_hz=[np.nan]))
    still = stretched(mesh).with_(shapes=ArrayShapes(np.zeros((1, mesh.n_nodes, 3))))
    with pytest.raises(ModelError, match="mode 1 moves no mass"):
        energies(design(mesh), still)


def test_shell_shapes_without_rotations_keep_their_energies():
    """A thin plate's modes stripped of their rotations; torsion of nothing is lost here, so no caution."""
    model = design(plate_mesh("quad4", (8, 5), (1.0, 0.6)), thickness=0.004, supports=(CLAMP,))
    modes = solve(model, 4)
    stripped = modes.with_(shapes=ArrayShapes(modes.shapes.moved), origin="imported")
    whole, found = energies(model, modes), energies(model, stripped)
    np.testing.assert_allclose(found.strain, whole.strain, rtol=0, atol=1e-3 * whole.strain.max())
    assert found.trusted.all()
    assert found.cautions == whole.cautions
    coarse = np.round(modes.shapes.moved, 2)
    blurred = energies(model, stripped.with_(shapes=ArrayShapes(coarse)))
    assert any("too few digits" in text for text in blurred.cautions)


def test_single_shell_node_carries_a_body_by_its_own_rotation():
    mesh = plate_mesh("quad4", (4, 2), (1.0, 0.5))
    tip = Selector(near=[1.0, 0.25, 0.0])
    body = LumpedMass("arm", tip, 1.0, [1.4, 0.25, 0.0], 0.1 * np.eye(3))
    model = design(mesh, thickness=0.01, supports=(CLAMP,), masses=(body,))
    system = assemble(model)
    assert system.cautions == ()
    node = int(tip.rows(mesh)[0])
    assert system.M[system.dof[node, 4], system.dof[node, 4]] > 0.1 + 0.4**2  # about y: m d² + inertia, and the sheet
    found = energies(model, solve(model, 3))
    np.testing.assert_allclose(found.total_strain, found.total_kinetic, rtol=1e-8)
