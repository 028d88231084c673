"""Crossings and veerings against closed forms (rows V01, V02 of the check values)."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest

from tests.checks.reference import row
from viewer.insight.lineage import follow


def pendula(values, coupling):
    """Two coupled pendula, the second one detuned by each of ``values``: frequencies, shapes, products of shapes."""
    found = [np.linalg.eigh([[1 + coupling, -coupling], [-coupling, 1 + coupling + e]]) for e in values]
    freq_hz = [np.sqrt(squares) / (2 * np.pi) for squares, _ in found]
    return freq_hz, [a.T @ b for (_, a), (_, b) in pairwise(found)]


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
