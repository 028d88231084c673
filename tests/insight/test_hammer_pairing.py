"""A test beside the modes of a design: the right pairs, and the names of those that the points cannot tell apart."""

from __future__ import annotations

from functools import cache
from pathlib import Path

import numpy as np
import pytest
import scipy.sparse as sp

from tests.mechanics.models import CLAMP, design
from tests.meshes import plate_mesh
from tests.sentences import unfounded
from viewer.errors import InputError
from viewer.insight.hammer_pairing import ALIKE, TestCorrelation, correlate_test, look_alike
from viewer.insight.pairing import close_groups
from viewer.mechanics.eigen import solve
from viewer.mechanics.reduced import reduce_to_channels
from viewer.model.testset import TestSet
from viewer.workspace import Workspace

SAMPLES = Path(__file__).parents[2] / "sample_meshes"


@cache
def sample(name: str):
    """Points (n, 3), shapes (k, n, 3) and frequencies (k,) of the first design of a sample, or of a free crooked
    sheet."""
    if name == "free sheet":
        mesh = plate_mesh("quad4", (14, 9), (0.5, 0.31), distort=0.2)
        turned = mesh.points @ np.linalg.qr(np.random.default_rng(1).normal(size=(3, 3)))[0].T
        model = design(mesh.with_(points=turned), thickness=0.003)
    else:
        opened = Workspace(cache=None).open(SAMPLES / name)
        model = opened.study(opened.names[0]).design
    modes = solve(model, 14 if name == "free sheet" else 10)
    return model.mesh.points, np.array([modes.shape(i) for i in range(modes.count)]), modes.freq_hz


def measured_set(shapes, freq_hz, sensor=None, directions=None, points=None, **more) -> TestSet:
    """A test set of shapes (m, c); along z at points of their own unless said."""
    count = shapes.shape[1]
    sensor = np.arange(count) if sensor is None else sensor
    directions = np.tile([0.0, 0, 1], (count, 1)) if directions is None else directions
    points = np.random.default_rng(0).normal(size=(max(sensor) + 1, 3)) if points is None else points
    labels = tuple(str(i + 1) for i in range(len(points)))
    return TestSet("hammer", labels, points, np.zeros((0, 2)), sensor, directions, freq_hz, shapes, **more)


def correlated(test: TestSet, analysis, hz, **more) -> TestCorrelation:
    found = correlate_test(test, analysis, hz, design="baseline", **more)
    assert not unfounded(found.sentence, found.to_dict()), found.sentence
    return found


# --- shapes given by hand ---


def shapes(count=6, channels=20, seed=3):
    """Orthonormal shapes: nothing looks like anything else."""
    return np.linalg.qr(np.random.default_rng(seed).normal(size=(channels, count)))[0].T


HZ = np.array([10.0, 20, 31, 43, 56, 70])


def test_pairs_whatever_the_order_size_and_phase():
    order, factors = [2, 0, 1], np.array([3.0, -1j, 0.2 + 0.1j])[:, None]
    found = correlated(measured_set(factors * shapes()[order], [19.0, 22, 30]), shapes(), HZ, names=tuple("abcdef"))
    assert [(p.test, p.analysis, p.name) for p in found.paired] == [(1, 3, "c"), (2, 1, "a"), (3, 2, "b")]
    assert [p.mac for p in found.paired] == pytest.approx([1, 1, 1])
    assert [p.scale for p in found.paired] == pytest.approx(factors[:, 0].tolist())
    assert [p.to_dict()["change_percent"] for p in found.paired] == pytest.approx(
        [100 * (31 / 19 - 1), 100 * (10 / 22 - 1), 100 * (20 / 30 - 1)]
    )
    assert found.partner(2) == 1 and found.partner(9) is None
    assert found.comac == pytest.approx(np.ones(20)) and found.ecomac == pytest.approx(np.zeros(20), abs=1e-12)
    assert not found.alike and not any(p.doubtful for p in found.pairs)
    assert found.sentence.startswith("All 3 measured modes of hammer are found in baseline with an agreement of 100%")


def test_what_has_no_counterpart_stays_alone_on_both_sides():
    measured = np.concatenate([shapes()[[0]], shapes(1, seed=8), shapes()[[3]]])
    found = correlated(measured_set(measured, [10.0, 25, 43]), shapes(), HZ)
    assert [(p.kind, p.test, p.analysis) for p in found.pairs] == [
        ("paired", 1, 1),
        ("unpaired", 2, None),
        ("paired", 3, 4),
        ("unpaired", None, 2),
        ("unpaired", None, 3),
        ("beyond", None, 5),
        ("beyond", None, 6),
    ]
    assert (
        "measured mode 2 has no counterpart; modes 2 and 3 of baseline were not found in the test" in found.sentence
    )
    assert "at the measured frequencies" in found.sentence


def test_nothing_alike_is_said_and_no_figure_invented():
    found = correlated(measured_set(shapes(2, seed=9), [10.0, 20]), shapes(), HZ)
    assert found.sentence == "None of the 2 measured modes of hammer looks like a mode of baseline."
    assert np.isnan(found.comac).all() and found.to_dict()["worst_channel"] is None


def test_close_modes_that_come_out_mixed_are_compared_as_a_group():
    turn = np.array([[1, 1], [-1, 1]]) / np.sqrt(2)
    measured = np.concatenate([turn @ shapes()[:2], shapes()[[2]]])
    found = correlated(measured_set(measured, [10.0, 10.1, 31]), shapes(), np.array([10.0, 10.1, 31, 43, 56, 70]))
    first, second, third = found.paired
    assert first.mac == pytest.approx(0.5) and first.subspace == pytest.approx(1) and first.group == ((1, 2), (1, 2))
    assert {first.analysis, second.analysis} == {1, 2} and third.analysis == 3 and third.subspace is None
    assert [number for number, _ in first.mixture] == [1, 2]
    mixture = sum(factor * shapes()[number - 1] for number, factor in first.mixture)
    assert mixture == pytest.approx(measured[0])
    assert found.ecomac == pytest.approx(np.zeros(20), abs=1e-12)


def test_a_flipped_channel_stands_out_in_the_enhanced_criterion_and_in_words():
    measured = shapes().copy()
    measured[:, 7] *= -1
    found = correlated(measured_set(measured, HZ), shapes(), HZ)
    facts = found.to_dict()
    assert facts["worst_channel"] == "point 8, +Z" and int(np.argmax(found.ecomac)) == 7
    assert found.sentence.endswith("; they differ most at point 8, +Z.")
    assert "differ most" not in correlated(measured_set(shapes(), HZ), shapes(), HZ).sentence


def test_channels_not_used_do_not_count():
    measured, used = shapes().copy(), np.ones(20, bool)
    measured[:, 4], used[4] = 100.0, False
    found = correlated(measured_set(measured, HZ), shapes(), HZ, used=used)
    assert [p.mac for p in found.paired] == pytest.approx(np.ones(6), abs=1e-9)
    assert np.isnan(found.ecomac[4]) and not np.isnan(np.delete(found.ecomac, 4)).any()
    assert found.to_dict()["channels_used"] == 19


def test_phase_figures_of_the_measured_shape_go_with_its_pair():
    scattered = shapes() * np.exp(1j * np.random.default_rng(1).normal(0, 0.2, (6, 20)))
    found = correlated(
        measured_set(scattered, HZ, damping=np.array([0.01, np.nan, 0.02, 0.01, 0.01, 0.01])), shapes(), HZ
    )
    for p in found.paired:
        assert 0.8 < p.collinearity < 1 and 3 < p.phase_deviation_deg < 20
    assert [p.damping for p in found.paired[:3]] == [0.01, None, 0.02]


def test_another_mode_nearly_as_good_makes_a_pair_doubtful():
    analysis = shapes().copy()
    measured = analysis[[0]] + 0.98 * analysis[[1]]
    found = correlated(measured_set(measured, [15.0]), analysis, HZ)
    assert found.paired[0].doubtful and found.paired[0].runner_up[0] == 2
    assert "for measured mode 1 another mode of baseline agrees nearly as well" in found.sentence


def test_two_modes_alike_at_the_points_are_named():
    analysis = shapes().copy()
    analysis[4] = analysis[1] + 0.2 * analysis[4]
    found = correlated(measured_set(analysis[:4], HZ[:4]), analysis, HZ)
    assert found.alike == ((2, 5),)
    assert found.paired[1].alike == (5,) and found.paired[1].doubtful and not found.paired[0].doubtful
    assert "at these points modes 2 and 5 of baseline look alike" in found.sentence


def test_a_mode_that_does_not_move_the_points_looks_like_any_other():
    analysis = shapes().copy()
    analysis[3] = 0
    assert look_alike(analysis, HZ)[3].tolist() == [1, 1, 1, 0, 1, 1]


def test_measured_twice_is_said():
    found = correlated(measured_set(shapes()[[0, 0, 1]], [10.0, 10.2, 20]), shapes(), HZ)
    assert found.to_dict()["measured_looking_alike"] == [[1, 2]]
    assert [p.kind for p in found.pairs[:3]].count("paired") >= 2


@pytest.mark.parametrize(
    ("analysis", "hz", "more"),
    [
        (shapes()[:, :-1], HZ, {}),
        (shapes(), HZ[:-1], {}),
        (shapes(), HZ, {"used": np.ones(3, bool)}),
        (shapes(), HZ, {"used": np.zeros(20, bool)}),
        (shapes(), HZ, {"reduced_mass": np.eye(4)}),
    ],
)
def test_what_does_not_fit_is_refused(analysis, hz, more):
    with pytest.raises(InputError, match="test 'hammer'"):
        correlate_test(measured_set(shapes(), HZ), analysis, hz, **more)


# --- through the reduced mass ---


def test_modes_alike_by_mac_are_apart_through_the_reduced_mass():
    """Points crowded at the free end of a sheet: bending modes share much there, and nothing in the reduced mass."""
    mesh = plate_mesh("quad4", (16, 4), (1, 0.2))
    model = design(mesh, thickness=0.005, supports=(CLAMP,))
    modes = solve(model, 6)
    along = np.concatenate([np.nonzero(np.abs(mesh.points[:, 0] - x) < 1e-9)[0] for x in (0.25, 0.5, 0.75, 0.875, 1)])
    sensing = sp.csr_array(
        (np.ones(len(along)), (np.arange(len(along)), 3 * along + 2)), (len(along), 3 * mesh.n_nodes)
    )
    analysis = np.array([sensing @ modes.shape(i).ravel() for i in range(6)])
    mass = reduce_to_channels(model, sensing).mass
    random = np.random.default_rng(2)
    noise = 0.02 * np.abs(analysis[:4]).max(axis=1, keepdims=True) * random.normal(size=(4, len(along)))
    found = correlated(
        measured_set(analysis[:4] + noise, modes.freq_hz[:4]), analysis, modes.freq_hz, reduced_mass=mass
    )
    facts = found.to_dict()
    assert min(p.cross for p in found.paired) > 0.98
    beside = ~np.eye(4, dtype=bool)
    assert found.self_orthogonality[:4, :4][beside].max() == pytest.approx(facts["reduction_error"])
    assert facts["reduction_error"] < 0.05 < found.analysis_auto[:4, :4][beside].max()
    assert facts["worst_cross_orthogonality"] < 0.1


# --- the samples: random points, few and many ---


def sampled(name, seed, noise=0.03):
    """A test at 1 to 15 random nodes, along one axis, along directions of their own or along all three axes; some of
    the modes, frequencies off by 3 %, slightly complex, noise as a share of each mode's rms. Rigid motions of the
    free body come in a mixture, at frequencies of soft supports. Also which mode each measured one is."""
    points, everywhere, hz = sample(name)
    random, modes = np.random.default_rng(seed), len(hz)
    nodes = random.choice(len(points), random.integers(1, 16), replace=False)
    kind = random.integers(0, 3)
    sensor = np.repeat(np.arange(len(nodes)), 3 if kind == 0 else 1)
    directions = [np.tile(np.eye(3), (len(nodes), 1)), np.tile(np.eye(3)[random.integers(0, 3)], (len(nodes), 1))]
    directions = [*directions, random.normal(size=(len(nodes), 3))][kind]
    directions = directions / np.linalg.norm(directions, axis=1, keepdims=True)
    analysis = np.einsum("kca,ca->kc", everywhere[:, nodes[sensor]], directions)
    kept = np.sort(random.choice(modes, random.integers(modes // 2, modes + 1), replace=False))
    true, support = analysis.copy(), np.zeros(modes)
    if hz[0] == 0:
        true[:6] = np.linalg.qr(random.normal(size=(6, 6)))[0] @ analysis[:6]
        support[:6] = [1.1, 1.9, 2.5, 4.2, 5.7, 8.0]
    size = (len(kept), analysis.shape[1])
    rms = np.sqrt((true[kept] ** 2).mean(axis=1, keepdims=True))
    measured = true[kept] * np.exp(1j * random.normal(0, 0.05, size))
    measured += noise * rms * (random.normal(size=size) + 1j * random.normal(size=size)) / np.sqrt(2)
    measured_hz = (hz * (1 + 0.03 * random.normal(size=modes)) + support)[kept]
    order = np.argsort(measured_hz)
    test = measured_set(measured[order], measured_hz[order], sensor, directions, points[nodes])
    return test, analysis, hz, kept[order]


@pytest.mark.parametrize("name", ["boom", "fork", "free sheet"])
def test_every_mode_the_points_can_tell_apart_is_paired_right_and_the_others_are_named(name):
    told, named, wrong_but_named = 0, 0, 0
    for seed in range(200):
        test, analysis, hz, truth = sampled(name, seed)
        found = correlate_test(test, analysis, hz)
        groups, alike = close_groups(hz), {number for group in found.alike for number in group}
        for p in found.pairs[: test.count]:
            right = int(truth[p.test - 1])
            correct = p.kind == "paired" and p.analysis - 1 in groups[right]
            if right + 1 in alike:
                named += 1
                wrong_but_named += not correct
            else:
                told += 1
                assert correct, (seed, p)
            if p.analysis in alike:
                assert p.doubtful
    assert told > 600 and named > 300 and wrong_but_named > 50  # the check could have failed, the naming is needed


@pytest.mark.parametrize("name", ["boom", "fork"])
def test_enough_points_leave_nothing_open(name):
    points, everywhere, hz = sample(name)
    nodes = np.random.default_rng(5).choice(len(points), 40, replace=False)
    analysis = everywhere[:, nodes].reshape(len(hz), -1)
    test = measured_set(analysis, hz, np.repeat(np.arange(40), 3), np.tile(np.eye(3), (40, 1)), points[nodes])
    found = correlated(test, analysis, hz)
    assert not found.alike and [p.analysis for p in found.pairs] == list(range(1, len(hz) + 1))
    assert look_alike(analysis, hz).max() < ALIKE


@pytest.mark.parametrize("seed", range(6))
def test_order_of_channels_and_modes_and_complex_factors_change_no_pair(seed):
    test, analysis, hz, _ = sampled("boom", seed)
    found = correlated(test, analysis, hz)
    random = np.random.default_rng(seed)
    channels, modes = random.permutation(test.n_channels), random.permutation(len(hz))
    factors = random.normal(size=(test.count, 1)) + 1j * random.normal(size=(test.count, 1))
    turned = test.only(channels).with_(shapes=test.shapes[:, channels] * factors)
    again = correlated(turned, analysis[modes][:, channels], hz[modes])
    assert again.matrix == pytest.approx(found.matrix[:, modes], abs=1e-9)
    assert sorted(tuple(sorted(int(modes[n - 1]) + 1 for n in g)) for g in again.alike) == sorted(found.alike)
    for p, q in zip(found.pairs[: test.count], again.pairs[: test.count], strict=True):
        assert (p.kind, p.test) == (q.kind, q.test)
        if not p.doubtful:
            assert p.analysis is None or p.analysis == int(modes[q.analysis - 1]) + 1
            assert q.agreement == pytest.approx(p.agreement, abs=1e-9)
