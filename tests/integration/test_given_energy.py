"""Strain energies that came with the modes: kept by the interchange, compared with ours, drawn."""

import numpy as np
import pytest

from tests.loaders.samples import make_mesh, make_modes
from viewer.errors import LoadError, RefusedError
from viewer.export.rows import group_rows, mode_rows
from viewer.insight.given_energy import agreement, given_density
from viewer.loaders import read_mesh, read_modes, write_interchange
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import energies
from viewer.model.design import Assignment, Design, Material, Physics, Selector, Support
from viewer.model.mesh import CellBlock, Mesh
from viewer.scene.compose import single_picture
from viewer.workspace.study import study

STEEL = Material("steel", 2.1e11, 0.3, 7850.0)


def bar(parts=6) -> Mesh:
    """Hexahedra in a row, the last one longer, clamped at x = 0."""
    x = np.r_[np.arange(parts), parts + 1.5] * 0.05
    points = np.array([[a, b, c] for a in x for c in (0, 0.02) for b in (0, 0.03)])
    first = 4 * np.arange(parts)[:, None]
    cells = first + np.array([0, 4, 5, 1, 2, 6, 7, 3])
    return Mesh(
        points, (CellBlock("hex8", cells, np.arange(parts) + 1),), np.arange(len(points)) + 1,
        {"root": np.arange(4)}, {"near": np.arange(3), "far": np.arange(3, parts)},
    )  # fmt: skip


@pytest.fixture(scope="module")
def solved():
    physics = Physics({"steel": STEEL}, (Assignment("*", "steel"),), (Support("root", Selector(group="root")),))
    design = Design("bar", bar(), physics)
    modes = solve(design, 3)
    return design, modes, energies(design, modes)


@pytest.mark.parametrize("suffix", [".vtu", ".npz", ".h5", ".vtkhdf"])
def test_kept_by_the_interchange(tmp_path, suffix):
    mesh = make_mesh()
    energy = np.random.default_rng(4).random((4, mesh.n_cells))
    energy[2, 1] = np.nan
    path = write_interchange(tmp_path / f"a{suffix}", mesh, make_modes(mesh).with_(cell_energy=energy))
    assert np.array_equal(read_modes(path, mesh).cell_energy, energy, equal_nan=True)
    turned = mesh.with_(blocks=mesh.blocks[::-1])  # joined by element id, never by row
    assert np.array_equal(read_modes(path, turned).cell_energy, energy[:, [3, 2, 0, 1]], equal_nan=True)


def test_own_energies_agree_in_any_unit(solved):
    design, modes, own = solved
    rows = mode_rows(study(design, modes.with_(cell_energy=own.strain * 1e3)))
    assert [row["given_energy_agreement"] for row in rows] == pytest.approx([1, 1, 1])
    assert [row["given_energy_agreement"] for row in mode_rows(study(design, modes))] == [None] * 3
    backwards = mode_rows(study(design, modes.with_(cell_energy=own.strain[:, ::-1])))
    assert backwards[0]["given_energy_agreement"] < 0  # bending is largest at the root, not at the tip


def test_shares_by_group(solved):
    design, modes, own = solved
    for row in group_rows(study(design, modes.with_(cell_energy=own.strain * 7))):
        assert row["given_strain_energy_percent"] == pytest.approx(row["strain_energy_percent"])
    assert "given_strain_energy_percent" not in group_rows(study(design, modes))[0]


def test_drawn(solved):
    design, modes, own = solved
    given = modes.with_(cell_energy=own.strain * 7)
    picture, plain = (single_picture(study(design, given), 1, given_energy=which) for which in (True, False))
    assert picture.energy_words == "given strain energy density ÷ mean"
    assert np.allclose(picture.bodies[0].density, plain.bodies[0].density)
    without = single_picture(study(design.with_(physics=Physics()), given), 1, given_energy=True)
    assert np.allclose(without.bodies[0].density, plain.bodies[0].density)  # volumes from the cells themselves
    with pytest.raises(RefusedError, match="no strain energies were given with mode 1"):
        single_picture(study(design, modes), 1, given_energy=True)


def test_densities_and_agreement_of_part(solved):
    design, modes, own = solved
    energy = own.strain.copy()
    energy[:, 2] = np.nan
    density = given_density(design.mesh, modes.with_(cell_energy=energy), 0)
    there = np.arange(6) != 2
    assert density[2] == 0
    assert np.average(density[there], weights=own.volumes[there]) == pytest.approx(1)
    assert agreement(own.strain[0], energy[0]) == pytest.approx(1)
    assert np.isnan(agreement(own.strain[0], np.ones(6)))
    assert np.isnan(agreement(own.strain[0], np.full(6, np.nan)))


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"strain_energy": np.ones((3, 4))}, r"do not fit the modes and cells; found: \(3, 4\); expected: \(4, 4\)"),
        ({"strain_energy": -np.ones((4, 4))}, r"mode 1, element 7: a strain energy is negative or not finite"),
        ({"strain_energy": np.full((4, 4), np.inf)}, r"negative or not finite"),
    ],
)
def test_bad_energies(tmp_path, change, message):
    mesh = make_mesh()
    path = write_interchange(tmp_path / "a.npz", mesh, make_modes(mesh))
    with np.load(path) as stored:
        np.savez(path, **{**stored, **change})
    with pytest.raises(LoadError, match=message):
        read_modes(path, read_mesh(path))
