"""Modes that come from a file with translations only tell the same energies as the solution they came from.

The truth is our own solution of the same model, whose energies the tests of mechanics check against the global
quadratic forms. Bounds: energies by cell to 2 % of the whole, closure within 1 %.
"""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest

from tests.integration.models import block_with_plate, bracket, channel, npz_by_hand, without_rotations
from viewer.errors import LoadError
from viewer.loaders import read_mesh, read_modes, write_interchange
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import energies

DESIGNS = {
    "hex8": lambda: bracket("hex8"),
    "hex20": lambda: bracket("hex20"),
    "tet10": lambda: bracket("tet10"),
    "channel of quad4 and tri3": channel,
    "hex8 with quad4": block_with_plate,
}
CARRIERS = (".vtu", ".npz", ".h5", ".csv")
COUNT = 5


@cache
def solved(name: str):
    design = DESIGNS[name]()
    modes = solve(design, COUNT)
    return design, modes, energies(design, modes)


def difference(found, truth) -> np.ndarray:
    """(k,) Σ|ΔUe| / ΣUe, springs among the parts."""
    mine = np.hstack([found.strain, found.springs])
    theirs = np.hstack([truth.strain, truth.springs])
    return np.abs(mine - theirs).sum(axis=1) / theirs.sum(axis=1)


@pytest.mark.parametrize("suffix", CARRIERS)
@pytest.mark.parametrize("name", DESIGNS)
def test_translations_alone_tell_the_energies(name, suffix, tmp_path):
    design, modes, truth = solved(name)
    path = write_interchange(tmp_path / f"part{suffix}", design.mesh, without_rotations(modes))
    mesh = read_mesh(path)
    given = read_modes(path, mesh)
    assert given.shapes.has_rotations is False
    assert given.origin == "imported"
    found = energies(design.with_(mesh=mesh), given)
    assert difference(found, truth).max() <= 0.02
    np.testing.assert_allclose(found.closure, 1, atol=0.01)
    assert found.trusted.all()
    np.testing.assert_allclose(found.kinetic.sum(axis=1), truth.kinetic.sum(axis=1), rtol=0.01)
    np.testing.assert_allclose(found.masses, truth.masses, rtol=0.01)


@pytest.mark.parametrize("name", DESIGNS)
def test_single_precision_is_good_enough_or_said_not_to_be(name, tmp_path):
    design, modes, truth = solved(name)
    path = npz_by_hand(tmp_path / "short.npz", design.mesh, modes, dtype=np.float32)
    found = energies(design, read_modes(path, design.mesh))
    warned = any("digits" in caution for caution in found.cautions)
    assert difference(found, truth).max() <= 0.02 or warned


def test_a_mass_that_spins_with_the_sheet_is_recovered_or_not_trusted(tmp_path):
    """Its inertia loads the edge's rotations: least strain energy alone is 17 % off in mode 3."""
    design = block_with_plate("edge")
    modes = solve(design, COUNT)
    path = npz_by_hand(tmp_path / "edge.npz", design.mesh, modes)
    found, truth = energies(design, read_modes(path, design.mesh)), energies(design, modes)
    good = difference(found, truth) <= 0.02
    assert (good | ~found.trusted | any("cannot be recovered" in caution for caution in found.cautions)).all()


def test_lost_digits_of_a_thin_sheet_are_said(tmp_path):
    """Three digits after the point of the largest motion: bending energies of the sheet are noise."""
    design, modes, _ = solved("channel of quad4 and tri3")
    moved = np.stack([modes.shape(i) for i in range(modes.count)])
    step = 1e-3 * np.abs(moved).max(axis=(1, 2), keepdims=True)
    path = tmp_path / "blunt.npz"
    np.savez(path, modes=np.round(moved / step) * 1e-3, freq_hz=modes.freq_hz, node_id=design.mesh.node_ids)
    found = energies(design, read_modes(path, design.mesh))
    assert not found.trusted.all(), "noise of this size must not pass as a mode"
    assert any("digits" in caution for caution in found.cautions)


@pytest.mark.parametrize("suffix", [".npz", ".csv"])
def test_modes_in_any_order_of_nodes_are_joined_by_id(suffix, tmp_path):
    design, modes, truth = solved("channel of quad4 and tri3")
    order = np.random.default_rng(5).permutation(design.mesh.n_nodes)
    if suffix == ".npz":
        path = npz_by_hand(tmp_path / "mixed.npz", design.mesh, modes, order)
    else:
        path = tmp_path / "mixed.csv"
        rows = ["mode,node,ux,uy,uz,freq_hz"]
        for number in range(modes.count):
            shape, freq = modes.shape(number), float(modes.freq_hz[number])
            for row in order:
                moved = ",".join(repr(float(u)) for u in shape[row])
                rows.append(f"{number + 1},{design.mesh.node_ids[row]},{moved},{freq!r}")
        path.write_text("\n".join(rows) + "\n")
    given = read_modes(path, design.mesh)
    np.testing.assert_array_equal(given.freq_hz, modes.freq_hz)
    for number in range(modes.count):
        np.testing.assert_array_equal(given.shape(number), modes.shape(number))
    found = energies(design, given)
    assert found.trusted.all()
    assert difference(found, truth).max() <= 0.02


@pytest.mark.parametrize(("change", "words"), [("fewer", "only in the mesh"), ("more", "only in the mode file")])
def test_modes_on_other_nodes_are_refused_by_name(change, words, tmp_path):
    design, modes, _ = solved("channel of quad4 and tri3")
    moved = np.stack([modes.shape(i) for i in range(modes.count)])
    ids = design.mesh.node_ids
    if change == "fewer":
        moved, ids = moved[:, :-3], ids[:-3]
    else:
        moved, ids = np.concatenate([moved, moved[:, :3]], axis=1), np.append(ids, [900001, 900002, 900003])
    path = tmp_path / "other.npz"
    np.savez(path, modes=moved, freq_hz=modes.freq_hz, node_id=ids)
    with pytest.raises(LoadError) as caught:
        read_modes(path, design.mesh)
    text = str(caught.value)
    assert "other.npz" in text
    assert f"3 nodes {words}" in text
    assert "\n" not in text
    if change == "more":
        assert "900001" in text


def test_shuffled_rows_without_ids_are_no_modes(tmp_path):
    """Rows in another order and no ids: nothing can tell but the mechanics, which must not trust the energies."""
    design, modes, _ = solved("hex8")
    plain = design.with_(mesh=design.mesh.with_(node_ids=np.arange(1, design.mesh.n_nodes + 1)))
    moved = np.stack([modes.shape(i) for i in range(modes.count)])
    moved = moved[:, np.random.default_rng(2).permutation(moved.shape[1])]
    path = tmp_path / "nameless.npz"
    np.savez(path, modes=moved, freq_hz=modes.freq_hz)
    found = energies(plain, read_modes(path, plain.mesh))
    assert not found.trusted.any()
