"""The sample hammer test of the boom: written again by its script, the same in both formats, faults and all."""

from __future__ import annotations

import importlib.util
from pathlib import Path

import numpy as np
import pytest

from viewer.cells import interpolation, nearest
from viewer.insight.correlate import mac
from viewer.loaders import read_dossier, read_mesh, read_test
from viewer.mechanics.eigen import solve

ROOT = Path(__file__).parents[2] / "sample_meshes"


@pytest.fixture(scope="module")
def script():
    spec = importlib.util.spec_from_file_location("make_hammer_test", ROOT / "make_hammer_test.py")
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


@pytest.fixture(scope="module")
def test():
    plan = read_dossier(ROOT / "boom" / "dossier.toml").test("hammer")
    return read_test(plan.files, plan.length_unit)


def same(a, b, decimals):
    """Channels up to their order and sign."""
    assert a.labels == b.labels and a.n_channels == b.n_channels
    np.testing.assert_allclose(a.points, b.points, atol=1e-9)
    for index in range(a.count):
        np.testing.assert_allclose(a.motion(index), b.motion(index), atol=decimals)


def test_both_formats_say_the_same(test):
    tables = read_test(ROOT / "boom" / "hammer.csv", 0.001)
    same(tables, test, 1e-9)
    np.testing.assert_allclose(test.freq_hz, tables.freq_hz, rtol=1e-5)  # an eigenvalue of six digits
    np.testing.assert_allclose(test.damping, tables.damping, atol=1e-6)
    ends = [{frozenset(line) for line in each.lines.tolist()} for each in (test, tables)]
    assert ends[0] == ends[1] and len(ends[0]) == 23


def test_it_is_what_was_ordered(test):
    assert len(test.labels) == 22 and test.count == 6 and test.is_complex
    on_each = np.bincount(test.sensor)
    assert set(on_each) == {1, 2, 3} and (on_each == 3).sum() == 2
    assert not test.corrections  # the faults are for the user to find


def test_the_script_writes_it_again(script, tmp_path):
    """Solved afresh on any machine, the shapes agree to the last of the four decimals that are written."""
    script.main(tmp_path)
    assert sorted(p.name for p in (tmp_path / "boom").iterdir()) == sorted(
        p.name for p in (ROOT / "boom").glob("hammer*")
    )
    for name in ("hammer.unv", "hammer.csv"):
        unit = 0.001 if name.endswith("csv") else None
        again, kept = read_test(tmp_path / "boom" / name, unit), read_test(ROOT / "boom" / name, unit)
        same(again, kept, 2.1e-4)
        np.testing.assert_allclose(again.freq_hz, kept.freq_hz, atol=0.011)


def test_with_its_faults_mended_it_is_the_baseline_of_the_dossier(script, test):
    """At the true placement, which only the script knows: every mode agrees with its own to 0.95, and not before."""
    plan = read_dossier(ROOT / "boom" / "dossier.toml").plan("baseline")
    mesh = read_mesh(plan.mesh_file, plan.length_unit)
    modes = solve(plan.build(mesh), test.count)
    blocks = [(block.kind, block.nodes) for block in mesh.blocks]
    places = nearest(blocks, mesh.points, script.WORKSHOP.points(test.points))
    assert places.distance.max() < 0.005
    motion = np.zeros((test.count, len(test.labels), 3))
    for mode in range(test.count):
        for rows, nodes, weights in interpolation(blocks, places):
            motion[mode, rows] = np.einsum("kn,knj->kj", weights, modes.shape(mode)[nodes])
    seen = np.einsum("mcj,cj->mc", motion[:, test.sensor], script.WORKSHOP.directions(test.directions))
    assert np.diag(mac(test.shapes, seen)).min() < 0.9

    shapes = test.shapes.copy()
    shapes[:, test.channels_of(test.row(script.FLIPPED[0]))] *= -1
    one, other = (test.channels_of(test.row(label)) for label in script.EXCHANGED)
    shapes[:, [*one, *other]] = shapes[:, [*other, *one]]
    agreement = mac(shapes, seen)
    assert np.diag(agreement).min() > 0.95
    assert (agreement.argmax(axis=1) == np.arange(test.count)).all()
    change = test.freq_hz / modes.freq_hz - 1
    assert (np.abs(change) < 0.04).all() and (np.abs(change) > 0.005).all()


def test_the_landmarks_of_the_dossier_are_the_places_of_the_points(script, test):
    plan = read_dossier(ROOT / "boom" / "dossier.toml").test("hammer")
    for landmark in plan.landmarks:
        place = script.WORKSHOP.points(test.points[[test.row(landmark.point)]])[0]
        assert np.linalg.norm(place - landmark.near) < 0.005
