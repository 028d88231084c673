"""The samples' lineages read true: names stay with their shapes, and symmetric modes cross."""

from __future__ import annotations

from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import pytest

from tests.sentences import unfounded
from viewer.workspace import Workspace
from viewer.workspace.passage import follow_designs
from viewer.workspace.sweep import sweep

ROOT = Path(__file__).parents[2] / "sample_meshes"


@pytest.fixture(scope="module")
def workspace():
    return Workspace(cache=None)


def test_the_fork_gets_thicker(workspace):
    """Modes across the plane of the fork stiffen with its thickness, those within it hardly; the plane is one of
    symmetry, so that none of one kind can mix with one of the other."""
    opened = workspace.open(ROOT / "fork")
    plan = opened.dossier.sweep("thickness")
    ends = (plan.values[0], 1.0, plan.values[-1])
    with ThreadPoolExecutor(1) as executor:
        found = sweep(workspace, opened["baseline"], plan.variation, ends, 8, executor=executor).lineage
    names = dict(opened["baseline"].mode_names)
    lines = {line.name: line for line in found.lines}
    assert set(names.values()) <= set(lines)
    for number, name in names.items():
        assert lines[name].modes[1] == number  # at scale 1 the sweep has the design itself
    within = ("sway", "spread")
    for name in names.values():
        hz = lines[name].freq_hz
        if any(word in name for word in within):
            assert hz[2] == pytest.approx(hz[0], rel=0.01)
        else:
            assert hz[2] > 1.3 * hz[0]
    assert {e.kind for e in found.encounters} == {"crossing"}
    for e in found.encounters:
        both = [found.lines[number - 1].name for number in (e.first, e.second)]
        assert sum(any(word in name for word in within) for name in both) == 1
    assert not unfounded(found.sentence, found.to_dict())


def test_the_trough_through_both_designs(workspace):
    """Stated pairs stand, and names given to both designs agree along every lineage."""
    opened = workspace.open(ROOT / "trough")
    found = follow_designs(opened)
    plain, strapped = (opened[name].mode_names for name in opened.names)
    assert len(found.lines) == 5
    for line in found.lines:
        assert plain[line.modes[0]] == strapped[line.modes[1]] == line.name
    assert {e.kind for e in found.encounters} == {"swapped"}
    assert not unfounded(found.sentence, found.to_dict())
