"""Modes paired across unrelated meshes, symmetric parts, and what became of modes that have no partner."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.linalg import subspace_angles

from tests.mechanics.models import CLAMP, STEEL, design
from tests.meshes import box_mesh, line_mesh, plate_mesh
from tests.sentences import unfounded
from viewer.insight.pairing import Pairing, close_groups, pair, subspace_agreement
from viewer.mechanics.eigen import solve
from viewer.model.design import Assignment, Design, Physics, Section, Selector, Support
from viewer.model.modes import ArrayShapes, ModeSet


def paired(first: Design, second: Design, count: int = 10) -> Pairing:
    return pair(first, solve(first, count), second, solve(second, count))


def assert_the_same(found: Pairing, count: int, least: float = 0.98) -> None:
    """Each of the first modes is its own partner, or one of the other's close group, none vanished and none new."""
    counts = found.to_dict()["counts"]
    assert (counts["vanished"], counts["new"], counts["merged"]) == (0, 0, 0)
    first = [p for p in found.pairs if p.first is not None and p.first <= count]
    assert [p.kind for p in first] == ["paired"] * count
    for p in first:
        assert p.second == p.first or p.second in p.group[1]
        assert p.agreement >= least, p
    assert not unfounded(found.sentence, found.to_dict())


def plate(kind, counts, size=(0.5, 0.31), held="x0", **more):
    mesh = plate_mesh(kind, counts, size, **more)
    return design(mesh, thickness=0.003, supports=(Support("root", Selector(group=held)),))


def test_a_sheet_on_squares_and_on_finer_crooked_triangles():
    coarse, fine = plate("quad4", (14, 9)), plate("tri3", (23, 17), distort=0.2)
    assert_the_same(paired(coarse, fine, 12), 10)
    assert_the_same(paired(fine, coarse, 12), 10)


def test_a_partner_beyond_the_modes_compared_is_said_not_a_mode_lost():
    """Modes 10 and 11 of this sheet are 1 % apart and change places from one mesh to the other: with ten modes of
    each, the tenth of either has its partner beyond the end."""
    found = paired(plate("quad4", (14, 9)), plate("tri3", (23, 17), distort=0.2), 10)
    assert_the_same(found, 9)
    assert [(p.kind, p.first, p.second) for p in found.pairs[9:]] == [("beyond", 10, None), ("beyond", None, 10)]
    assert "counterparts of mode 10 of test and of mode 10 of test may lie beyond" in found.sentence


def test_a_block_on_bricks_and_on_tetrahedra():
    size = (0.4, 0.07, 0.05)
    bricks = design(box_mesh("hex8", (24, 4, 3), size), supports=(CLAMP,))
    tetrahedra = design(box_mesh("tet10", (9, 2, 2), size, distort=0.2), supports=(CLAMP,))
    assert_the_same(paired(bricks, tetrahedra), 10)


def test_a_free_block_pairs_its_rigid_motions_as_a_group():
    size = (0.4, 0.07, 0.05)
    found = paired(design(box_mesh("hex8", (16, 3, 2), size)), design(box_mesh("hex20", (7, 2, 2), size)), 9)
    assert_the_same(found, 9)
    assert found.pairs[0].group == ((1, 2, 3, 4, 5, 6), (1, 2, 3, 4, 5, 6))
    assert found.pairs[0].to_dict()["change_percent"] is None


def test_equal_frequencies_of_a_square_plate_are_compared_as_a_group():
    """Modes (1,2) and (2,1) of a square plate have one frequency: on each mesh they come out in some mixture."""
    edges = tuple(Support(e, Selector(group=e)) for e in ("x0", "x1", "y0", "y1"))
    first, second = (
        design(plate_mesh(kind, counts, (0.4, 0.4), distort=d), thickness=0.003, supports=edges)
        for kind, counts, d in (("quad4", (16, 16), 0.0), ("tri3", (21, 21), 0.15))
    )
    found = paired(first, second, 6)
    assert_the_same(found, 6)
    for number in (2, 3):
        (p,) = [p for p in found.pairs if p.first == number]
        assert p.group == ((2, 3), (2, 3)) and p.subspace is not None
    assert found.pairs[0].subspace is None


def test_a_round_bar_bends_in_any_plane():
    """The two planes in which a round bar bends are a choice: turned by half a right angle, MAC is 0.5 at best."""

    def bar(count):
        mesh = line_mesh(np.linspace((0, 0, 0), (1, 0, 0), count))
        section = Section("round", diameter=0.02)
        physics = Physics({"steel": STEEL}, (Assignment("*", "steel", section=section),), supports=(CLAMP,))
        return Design("bar", mesh, physics)

    def by_plane(modes, turned):
        """The pair of each bend along y and z, turned by an angle."""
        moved = np.array([modes.shape(i) for i in range(modes.count)])
        for a in range(0, modes.count, 2):
            both = moved[a : a + 2].reshape(2, -1)
            u, _, vh = np.linalg.svd(moved[a : a + 2, -1, 1:])
            c, s = np.cos(turned), np.sin(turned)
            moved[a : a + 2] = (np.array([[c, s], [-s, c]]) @ (u @ vh).T @ both).reshape(2, *moved.shape[1:])
        return ModeSet(modes.node_ids, modes.freq_hz, ArrayShapes(moved))

    first, second = bar(31), bar(44)
    one, two = solve(first, 4), solve(second, 4)
    mixed = pair(first, by_plane(one, 0.0), second, by_plane(two, np.pi / 4))
    assert mixed.matrix[:2, :2] == pytest.approx(np.full((2, 2), 0.5), abs=0.01)
    assert_the_same(mixed, 4, 0.999)


def test_agreement_of_subspaces_is_the_cosine_of_the_largest_angle_squared():
    """Against an independent implementation: scipy.linalg.subspace_angles."""
    random = np.random.default_rng(3)
    one, two = random.normal(size=(2, 40)), random.normal(size=(3, 40))
    expected = np.cos(subspace_angles(one.T, two.T).max()) ** 2
    assert subspace_agreement(one, two) == pytest.approx(expected, rel=1e-9)


def test_groups_of_close_frequencies():
    assert close_groups(np.array([1.0, 1.01, 1.5, 1.52, 1.54, 3.0])) == [(0, 1), (0, 1), *[(2, 3, 4)] * 3, (5,)]


# --- modes given by hand, on one mesh, so that what became of them is known ---


def given(shapes, freq_hz):
    """Two designs' modes on one sheet: rows of ``shapes`` mix four smooth shapes that share nothing."""
    model = plate("quad4", (6, 4))
    own = solve(model, 4)
    basis = np.array([own.shape(i) / np.linalg.norm(own.shape(i)) for i in range(4)])
    moved = np.tensordot(np.asarray(shapes, float), basis, 1)
    return ModeSet(model.mesh.node_ids, freq_hz, ArrayShapes(moved))


def became(first, second):
    one, two = plate("quad4", (6, 4)).with_(name="old"), plate("quad4", (6, 4)).with_(name="new")
    found = pair(one, first, two, second)
    assert not unfounded(found.sentence, found.to_dict())
    return found


def test_order_may_change():
    found = became(given(np.eye(4)[:3], [10, 20, 30]), given(np.eye(4)[[2, 0, 1]], [10, 20, 30]))
    assert [(p.first, p.second) for p in found.pairs] == [(1, 2), (2, 3), (3, 1)]
    assert found.partner(3) == 1
    assert "3 modes are found again" in found.sentence


def test_a_mode_vanishes_and_another_is_new():
    found = became(given(np.eye(4)[:3], [10, 20, 30]), given(np.eye(4)[[0, 3, 2]], [10, 20, 30]))
    assert [p.kind for p in found.pairs] == ["paired", "vanished", "paired", "new"]
    assert found.partner(2) is None
    assert "of old, mode 2 has no counterpart; mode 2 of new is new" in found.sentence


def test_a_mode_that_another_one_takes_up():
    second = given([[0.8, 0.6, 0, 0], [0, 0, 0, 1]], [12, 15])
    found = became(given(np.eye(4)[:2], [10, 20]), second)
    assert [(p.kind, p.second or p.into) for p in found.pairs] == [("paired", 1), ("merged", 1), ("new", 2)]
    assert found.pairs[0].mac == pytest.approx(0.64, abs=0.05)  # 0.8², but for the weight of mass at the edges
    assert "mode 2 is taken up by another" in found.sentence


def test_complex_shapes_pair_whatever_their_phase():
    first = given(np.eye(4)[:2], [10, 20])
    turned = np.array([first.shape(i) for i in range(2)]) * np.exp(1j * np.array([0.4, 2.0]))[:, None, None]
    found = became(first, ModeSet(first.node_ids, first.freq_hz, ArrayShapes(turned)))
    assert [(p.first, p.second) for p in found.pairs] == [(1, 1), (2, 2)]
    assert min(p.mac for p in found.pairs) == pytest.approx(1)
