"""Crossings and veerings against closed forms (rows V01, V02 of the check values)."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest

from tests.checks.reference import row
from tests.sentences import unfounded
from viewer.insight.lineage import follow
from viewer.model.variation import Unit


def pendula(values, coupling):
    """Two coupled pendula, the second one detuned by each of ``values``: frequencies, shapes, products of shapes."""
    found = [np.linalg.eigh([[1 + coupling, -coupling], [-coupling, 1 + coupling + e]]) for e in values]
    freq_hz = [np.sqrt(squares) / (2 * np.pi) for squares, _ in found]
    return freq_hz, [a.T @ b for (_, a), (_, b) in pairwise(found)]


def test_the_pendula_have_the_stated_frequencies():
    """Row V01: 1 + k + e/2 ∓ √(e²/4 + k²)."""
    freq_hz, _ = pendula([0.0, 0.2], 0.05)
    for hz, expected in zip(freq_hz, row("V01").parts, strict=True):
        assert (2 * np.pi * hz) ** 2 == pytest.approx(expected, rel=row("V01").tolerances[0])


@pytest.mark.parametrize("count", [8, 15, 40])
def test_coupled_pendula_veer_with_the_stated_gap(count):
    gap = row("V02").parts[0][0]  # least gap of λ, at e = 0
    values = np.linspace(-0.4, 0.4, count)
    finding = follow(values, *pendula(values, 0.05), parameter="detuning")
    (encounter,) = finding.encounters
    assert encounter.kind == "veering"
    assert encounter.gap_lambda == pytest.approx(gap, rel=1e-9)
    assert encounter.at == pytest.approx(0, abs=1e-9)
    assert all(line.modes == (k,) * count for k, line in enumerate(finding.lines, 1))  # each stays on its branch
    assert 45 < encounter.turned_deg <= 90
    assert "veer at detuning" in finding.sentence and not unfounded(finding.sentence, finding.to_dict())


def test_a_veering_narrower_than_the_step_is_unresolved_and_the_proposed_step_resolves_it():
    values = np.linspace(-0.41, 0.4, 9)
    (encounter,) = follow(values, *pendula(values, 0.001)).encounters
    assert encounter.kind == "unresolved"
    assert encounter.gap_lambda == pytest.approx(0.002, rel=1e-6)  # 2k, closed form
    low, high = encounter.between
    finer = np.arange(low, high, encounter.step)
    (resolved,) = follow(finer, *pendula(finer, 0.001)).encounters
    assert resolved.kind == "veering"
    assert resolved.gap_lambda == pytest.approx(0.002, rel=1e-6)


def test_uncoupled_pendula_cross_and_keep_their_names():
    values = np.linspace(-0.43, 0.4, 6)
    finding = follow(values, *pendula(values, 0.0), names=[{1: "left", 2: "right"}])
    (encounter,) = finding.encounters
    assert encounter.kind == "crossing"
    assert encounter.at == pytest.approx(0, abs=1e-9)
    assert finding.lines[0].modes[0] == 1 and finding.lines[0].modes[-1] == 2
    assert "left and right cross" in finding.sentence


def test_a_mode_that_ends_and_one_that_begins():
    first, second = np.eye(3)[:, :2], np.eye(3)[:, 1:]  # three shapes, two at a time
    finding = follow([0, 1], [np.array([1.0, 2.0]), np.array([2.0, 3.0])], [first.T @ second])
    assert [line.modes for line in finding.lines] == [(1, 0), (2, 1), (0, 2)]
    assert not finding.encounters


def mixed(count, seed):
    """A random rotation of ``count`` shapes among themselves."""
    turn, _ = np.linalg.qr(np.random.default_rng(seed).normal(size=(count, count)))
    return turn


@pytest.mark.parametrize("seed", range(5))
def test_a_step_right_on_a_crossing_where_the_shapes_come_out_in_any_mixture(seed):
    values = np.array([-0.2, -0.1, 0.0, 0.1, 0.2])
    freq_hz, crosses = pendula(values, 0.0)
    turn = mixed(2, seed)
    crosses = [crosses[0], crosses[1] @ turn, turn.T @ crosses[2], crosses[3]]
    finding = follow(values, freq_hz, crosses)
    (encounter,) = finding.encounters
    assert (encounter.kind, encounter.at, encounter.gap_hz) == ("crossing", 0.0, 0.0)
    assert sorted(line.modes[0] for line in finding.lines) == [1, 2]
    assert all(line.modes[0] != line.modes[-1] for line in finding.lines)


@pytest.mark.parametrize("noise", [0.0, 1e-9])
def test_a_round_bar_has_pairs_of_equal_frequency_throughout_and_no_encounter(noise):
    """Both planes of bending stay alike at every length: neither order nor mixture of the pair means anything."""
    random = np.random.default_rng(1)
    turns = [mixed(2, seed) for seed in range(6)]
    freq_hz = [np.sort((1 + 0.1 * s) * (1 + noise * random.normal(size=2))) for s in range(6)]
    finding = follow(range(6), freq_hz, [a.T @ b for a, b in pairwise(turns)])
    assert len(finding.lines) == 2 and all(all(line.modes) for line in finding.lines)
    assert not finding.encounters


def test_equal_frequencies_that_part_keep_their_shapes_names():
    """At the first step two modes are equal and mixed, later they part: the lines follow the shapes."""
    values = [0.0, 0.1, 0.2]
    freq_hz, crosses = pendula(values, 0.0)
    finding = follow(values, freq_hz, [mixed(2, 3).T @ crosses[0], crosses[1]])
    assert all(all(line.modes) for line in finding.lines) and not finding.encounters


def test_the_parameter_is_told_in_the_users_unit():
    values = np.array([0.001, 0.002, 0.003, 0.004])
    freq_hz, crosses = pendula(200 * (values - 0.00213), 0.0)
    finding = follow(values, freq_hz, crosses, parameter="thickness of web", unit=Unit("mm", 1e-3))
    assert finding.labels == ("1", "2", "3", "4")
    assert "mode 1 and mode 2 cross at thickness of web 2.13\u00a0mm" in finding.sentence
    assert not unfounded(finding.sentence, finding.to_dict())


def test_designs_without_a_parameter_change_places_and_pairs_that_are_stated_stand():
    swap = np.eye(3)[[1, 0, 2]]
    freq_hz = [np.array([10.0, 20, 30])] * 2
    found = follow([1, 2], freq_hz, [swap], parameter="design", unit=None, labels=["old", "new"])
    (encounter,) = found.encounters
    assert encounter.kind == "swapped" and encounter.at == pytest.approx(1.5)
    assert found.sentence.endswith("all 2 designs; mode 1 and mode 2 change places from old to new.")
    assert not unfounded(found.sentence, found.to_dict())
    stated = follow([1, 2], freq_hz, [swap], unit=None, labels=["old", "new"], stated=[[(1, 1), (2, 2)]])
    assert [line.modes for line in stated.lines] == [(1, 1), (2, 2), (3, 3)]
    assert not stated.encounters


def test_names_are_found_along_the_lineage():
    freq_hz = [np.array([10.0, 20, 30])] * 3
    names = [{}, {1: "nods"}, {1: "other", 3: "twists"}]
    found = follow([1, 2, 3], freq_hz, [np.eye(3)[[1, 0, 2]], np.eye(3)], names=names)
    assert [line.name for line in found.lines] == ["", "nods", "twists"]
    assert found.called(found.lines[0]) == "mode 1"
