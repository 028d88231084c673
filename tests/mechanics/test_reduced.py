"""Reduction to picked degrees of freedom and to the channels of a test."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.linalg
import scipy.sparse as sp

from tests.checks.reference import row
from tests.mechanics.models import CLAMP, STEEL, design
from tests.meshes import box_mesh, line_mesh, plate_mesh
from viewer.errors import ModelError
from viewer.mechanics.assembly import assemble
from viewer.mechanics.eigen import solve
from viewer.mechanics.reduced import guyan, reduce_to_channels, serep
from viewer.model.design import Assignment, Design, Link, Physics, Section, Selector, Support

CHAIN = np.array([[2.0, -1, 0], [-1, 2, -1], [0, -1, 1]])  # row M12
FIRST_AND_LAST = [0, 2]


def frequencies(stiffness, mass):
    return np.sqrt(np.maximum(scipy.linalg.eigh(stiffness, mass, eigvals_only=True), 0)) / (2 * np.pi)


def looking_along(mesh, nodes, axes):
    """Channels at nodes along axes: (c, 3 n_nodes)."""
    count = len(nodes)
    return sp.csr_array((np.ones(count), (np.arange(count), 3 * np.asarray(nodes) + axes)), (count, 3 * mesh.n_nodes))


# --- picked degrees of freedom ---


def test_the_chain_m12():
    """The row writes seven decimals, which is coarser than its tolerance for the smallest value."""
    exact = [2 - 2 * np.cos((2 * k - 1) * np.pi / 7) for k in (1, 2, 3)]  # the formula in the row
    for found in (np.linalg.eigvalsh(CHAIN), exact):
        assert found == pytest.approx(row("M12").values, rel=row("M12").tolerances[0], abs=0.5e-7)


def test_guyan_m13():
    found = guyan(CHAIN, np.eye(3), FIRST_AND_LAST)
    assert found.stiffness == pytest.approx(np.array([[1.5, -0.5], [-0.5, 0.5]]), abs=1e-12)  # the row's inputs
    assert found.mass == pytest.approx(np.array([[1.25, 0.25], [0.25, 1.25]]), abs=1e-12)
    values = scipy.linalg.eigh(found.stiffness, found.mass, eigvals_only=True)
    assert values == pytest.approx(row("M13").values, rel=row("M13").tolerances[0])


def test_serep_m15():
    _, vectors = np.linalg.eigh(CHAIN)
    found = serep(CHAIN, np.eye(3), vectors[:, :2].T, FIRST_AND_LAST)
    second = row("M15").text.partition("(")[2].partition(")")[0]
    expected = [float(number) for number in second.split(";")]
    kept = [float(number) for number in row("M15").text.partition(")")[2].strip("; ").split(";")]
    tolerance = row("M15").tolerances[0]
    assert found.transform[1] == pytest.approx(expected, rel=tolerance)
    assert scipy.linalg.eigh(found.stiffness, found.mass, eigvals_only=True) == pytest.approx(kept, rel=tolerance)


# --- channels of a test ---

BLOCK = box_mesh("hex8", (8, 2, 2), (1, 0.1, 0.12), distort=0.1)
SHEET = plate_mesh("quad4", (10, 4), (1, 0.3))


def on_nodes(mesh, thickness, supports, count=9, along=(0, 1, 2), seed=1):
    model = design(mesh, thickness=thickness, supports=supports)
    system = assemble(model)
    random = np.random.default_rng(seed)
    movable = np.nonzero(np.isin(system.dof[:, :3], system.free).all(axis=1))[0]
    nodes, axes = random.choice(movable, count, replace=False), random.choice(along, count)
    return system, looking_along(mesh, nodes, axes), system.dof[nodes, axes]


@pytest.mark.parametrize(("mesh", "thickness"), [(BLOCK, None), (SHEET, 0.01)])
@pytest.mark.parametrize("supports", [(CLAMP,), ()])
def test_channels_on_degrees_of_freedom_give_guyans_matrices(mesh, thickness, supports):
    system, sensing, dofs = on_nodes(mesh, thickness, supports)
    found = reduce_to_channels(system, sensing)
    expected = guyan(
        system.restrict(system.K), system.restrict(system.M), np.searchsorted(system.free, dofs).tolist()
    )
    assert found.rank == len(dofs) and not found.unseen and not found.repeated
    assert found.mass == pytest.approx(expected.mass, abs=1e-9 * np.abs(expected.mass).max())
    assert found.stiffness == pytest.approx(expected.stiffness, abs=1e-9 * np.abs(expected.stiffness).max())


@pytest.mark.parametrize("supports", [(CLAMP,), ()])
def test_channels_inside_cells_are_what_a_dense_saddle_point_gives(supports):
    """Against the constrained problem solved as a whole, min uᵀKu with S u = q, by dense least squares."""
    mesh = box_mesh("hex8", (4, 1, 1), (1, 0.2, 0.25))
    system = assemble(design(mesh, supports=supports))
    random = np.random.default_rng(2)
    weights = np.zeros((8, mesh.n_nodes))
    for channel, cell in enumerate(random.choice(4, 8)):
        weights[channel, mesh.blocks[0].nodes[cell]] = random.dirichlet(np.ones(8))
    directions = random.normal(size=(8, 3))
    directions /= np.linalg.norm(directions, axis=1, keepdims=True)
    sensing = sp.csr_array(np.einsum("cn,ca->cna", weights, directions).reshape(8, -1))
    stiffness, mass = (system.restrict(m).toarray() for m in (system.K, system.M))
    looks = sensing.toarray()[:, system.free]
    size = np.abs(stiffness).max()
    saddle = np.block([[stiffness / size, looks.T], [looks, np.zeros((8, 8))]])
    transform = np.linalg.lstsq(saddle, np.vstack([np.zeros((len(stiffness), 8)), np.eye(8)]))[0][: len(stiffness)]
    found = reduce_to_channels(system, sensing)
    expected = transform.T @ mass @ transform
    assert found.mass == pytest.approx(expected, abs=1e-7 * np.abs(expected).max())
    if not supports:  # the whole mass rides on a rigid motion that all channels see
        for axis in range(3):
            pushed = directions[:, axis]
            assert pushed @ found.mass @ pushed == pytest.approx(8000 * 0.05, rel=1e-9)
            assert pushed @ found.stiffness @ pushed == pytest.approx(0, abs=1e-6 * np.abs(found.stiffness).max())


def test_frequencies_come_from_above_and_close_for_many_channels():
    """Guyan 1965: the reduced model is a Ritz model, its frequencies bounds from above."""
    system, sensing, _ = on_nodes(SHEET, 0.01, (CLAMP,), count=30, along=(2,))
    found = reduce_to_channels(system, sensing)
    exact = solve(system.design, 4).freq_hz
    reduced = frequencies(found.stiffness, found.mass)[:4]
    assert (reduced >= exact * (1 - 1e-9)).all()
    assert reduced[:2] == pytest.approx(exact[:2], rel=0.01)


def test_modes_at_the_channels_are_orthogonal_through_the_reduced_mass():
    system, sensing, _ = on_nodes(SHEET, 0.01, (CLAMP,), count=30, along=(2,))
    mass, modes = reduce_to_channels(system, sensing).mass, solve(system.design, 3)
    seen = np.array([sensing @ modes.shape(i).ravel() for i in range(3)])
    product = seen @ mass @ seen.T
    assert product == pytest.approx(np.eye(3), abs=0.03)
    plain = seen @ seen.T
    assert abs(plain[0, 2]) / np.sqrt(plain[0, 0] * plain[2, 2]) > abs(product[0, 2])


def test_two_channels_at_one_place_count_once_and_say_so():
    system, sensing, _ = on_nodes(SHEET, 0.01, (CLAMP,), along=(2,))
    twice = sp.csr_array(sp.vstack([sensing, -sensing[[0]]]))
    once, found = reduce_to_channels(system, sensing), reduce_to_channels(system, twice)
    assert found.rank == 9 and found.repeated == ((0, 9),)
    assert "2 channels repeat what others see" in found.statements[0]
    shape = np.random.default_rng(0).normal(size=9)
    both = np.append(shape, -shape[0])
    assert both @ found.mass @ both == pytest.approx(shape @ once.mass @ shape, rel=1e-9)
    both[[0, 9]] = shape[0] + 0.1, -shape[0] + 0.1  # contradicting: the mean counts
    assert both @ found.mass @ both == pytest.approx(shape @ once.mass @ shape, rel=1e-9)


def in_cells(cells, places):
    """Channels along z in square cells of SHEET at local places (−1…1, −1…1): bilinear shape functions."""
    out = np.zeros((len(cells), SHEET.n_nodes, 3))
    for channel, (cell, (x, y)) in enumerate(zip(cells, places, strict=True)):
        weights = [(1 - x) * (1 - y), (1 + x) * (1 - y), (1 + x) * (1 + y), (1 - x) * (1 + y)]
        out[channel, SHEET.blocks[0].nodes[cell], 2] = np.array(weights) / 4
    return sp.csr_array(out.reshape(len(cells), -1))


def test_channels_crowded_together_are_one_or_are_named():
    """Near neighbours differ by noise alone, which would bend the sheet between them: so near they
    count as one, and noise of 3 % then leaves the products of modes as they are; a little farther they are named."""
    system = assemble(design(SHEET, thickness=0.01, supports=(CLAMP,)))
    cells = [3, 7, 12, 15, 18, 22, 26, 29, 34, 37]
    alone = reduce_to_channels(system, in_cells(cells, [(0, 0)] * 10))
    assert not alone.crowded.any() and alone.rank == 10
    near = reduce_to_channels(system, in_cells([*cells, 15, 22], [(0, 0)] * 10 + [(0.1, 0), (0, 0.1)]))
    assert near.repeated == ((3, 10), (5, 11)) and near.rank == 10 and not near.crowded.any()
    farther = reduce_to_channels(system, in_cells([*cells, 15], [(0, 0)] * 10 + [(0.5, 0)]))
    assert not farther.repeated and farther.crowded[[3, 10]].all() and farther.crowded.sum() == 2
    assert "2 channels sit so near others" in farther.statements[0]
    random, shape = np.random.default_rng(3), np.ones(12)
    for _ in range(20):
        noisy = shape + 0.03 * random.normal(size=12)
        assert noisy @ near.mass @ noisy == pytest.approx(shape @ near.mass @ shape, rel=0.15)


def test_a_channel_where_the_model_is_held_counts_for_nothing():
    system, sensing, _ = on_nodes(SHEET, 0.01, (CLAMP,), along=(2,))
    held = looking_along(SHEET, SHEET.node_groups["x0"][:1], 2)
    found = reduce_to_channels(system, sp.csr_array(sp.vstack([held, sensing])))
    assert found.still.tolist() == [True] + 9 * [False]
    assert not found.mass[0].any()
    assert found.mass[1:, 1:] == pytest.approx(reduce_to_channels(system, sensing).mass)
    with pytest.raises(ModelError, match="no channel sits where the model can move"):
        reduce_to_channels(system, held)


def test_a_free_sheet_seen_across_its_plane_keeps_what_no_channel_sees_at_rest():
    system, sensing, _ = on_nodes(SHEET, 0.01, (), along=(2,))
    found = reduce_to_channels(system, sensing)
    assert found.unseen == 3 and "3 motions of the whole body" in found.statements[0]
    lifted = np.ones(9)
    assert lifted @ found.mass @ lifted == pytest.approx(8000 * 1 * 0.3 * 0.01, rel=1e-9)


def test_a_rigid_link_carries_a_channel():
    """A beam clamped at one end whose tip leads a node without cells: the channel there sees the tip."""
    mesh = line_mesh([[0, 0, 0], [0.5, 0, 0], [1, 0, 0]])
    points = np.vstack([mesh.points, [1, 0, 0.2]])
    mesh = mesh.with_(
        points=points,
        node_ids=np.arange(1, 5),
        node_groups={**mesh.node_groups, "tip": np.array([2]), "lamp": np.array([3])},
    )
    physics = Physics(
        {"steel": STEEL},
        (Assignment("*", "steel", section=Section("round", diameter=0.02)),),
        supports=(Support("root", Selector(group="x0")),),
        links=(Link("arm", Selector(group="tip"), Selector(group="lamp")),),
    )
    system = assemble(Design("beam", mesh, physics))
    at_tip, at_lamp = (reduce_to_channels(system, looking_along(mesh, [node], 2)) for node in (2, 3))
    assert at_lamp.mass == pytest.approx(at_tip.mass, rel=1e-9)  # z of the lamp is z of the tip: its arm is along z
    across = reduce_to_channels(system, looking_along(mesh, [3], 0))  # x of the lamp: the tip's slope times the arm
    assert across.stiffness[0, 0] == pytest.approx(1 / (1 * 0.2**2 / (200e9 * np.pi * 0.02**4 / 64)), rel=0.01)


def test_channels_of_another_mesh_are_refused():
    system, _, _ = on_nodes(SHEET, 0.01, (CLAMP,))
    with pytest.raises(ModelError, match="belong to another mesh"):
        reduce_to_channels(system, sp.csr_array(np.ones((2, 9))))
