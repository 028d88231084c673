"""Noise in shapes is seen and taken out without costing the mode its hinge.

The truth is the same shape before noise was added, solved by our own elements, or by scikit-fem's. How much noise may
be left is arithmetic, no source: white noise of relative size e on N values puts e/√N into each of the model's modes,
so that a filter that passes a handful of them leaves a few e/√N.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

import viewer.insight.smoothing as smoothing
from tests import independent
from tests.mechanics.models import CLAMP, STEEL, design
from tests.meshes import box_mesh, plate_mesh
from viewer.errors import Cancelled, RefusedError
from viewer.insight.correlate import mac
from viewer.insight.smoothing import NOISE_BOUND, needs_smoothing, noise_estimate, smoothed
from viewer.jobs import Progress
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import energies
from viewer.mechanics.relative import relative_energies
from viewer.model.design import Assignment, Design, Link, LumpedMass, Physics, Selector, Support
from viewer.model.modes import ArrayShapes, ModeSet

LEVEL, SEEDS = 0.02, 5  # noise on every component, of the rms of the shape


def cells_between(mesh, low, high):
    centres = np.concatenate([mesh.points[block.nodes].mean(axis=1) for block in mesh.blocks])
    return np.nonzero((centres[:, 0] > low) & (centres[:, 0] < high))[0]


def grooved_sheet(kind="quad4"):
    """A clamped sheet with a groove across it."""
    mesh = plate_mesh(kind, (40, 12), (0.2, 0.12))
    mesh = mesh.with_(cell_groups={"band": cells_between(mesh, 0.12, 0.13)})
    thin = (Assignment("*", "steel", 0.002), Assignment("band", "steel", 0.001))
    return Design("grooved", mesh, Physics({"steel": STEEL}, thin, supports=(CLAMP,)))


def notched_bar():
    """A clamped bar of 20-node bricks, notched from both sides to 40 % over 10 mm."""
    mesh = box_mesh("hex20", (20, 3, 1), (0.2, 0.08, 0.006))
    points = np.array(mesh.points)
    points[:, 2] = (points[:, 2] - 0.003) * np.interp(np.abs(points[:, 0] - 0.125), [0.005, 0.015], [0.4, 1.0])
    return design(mesh.with_(points=points, cell_groups={"band": cells_between(mesh, 0.12, 0.13)}), supports=(CLAMP,))


def tapered_plate():
    mesh = plate_mesh("tri3", (16, 8), (0.3, 0.12))
    points = np.array(mesh.points)
    points[:, 1] = (points[:, 1] - 0.06) * (1 - 0.7 * points[:, 0] / 0.3)
    mesh = mesh.with_(points=points, cell_groups={"band": cells_between(mesh, 0.0, 0.08)})
    return design(mesh, thickness=0.002, supports=(CLAMP,))


def free_channel():
    """A free sheet folded twice; the band are its two edges' cells."""
    mesh = plate_mesh("quad4", (12, 18), (0.3, 0.24))
    x, s = mesh.points[:, 0], mesh.points[:, 1]
    points = np.stack([x, np.clip(s, 0.08, 0.16), np.maximum(np.maximum(0.08 - s, s - 0.16), 0)], axis=1)
    mesh = mesh.with_(points=points, cell_groups={"band": cells_between(mesh, 0.0, 0.05)})
    return design(mesh, thickness=0.0015)


PARTS = {"grooved": grooved_sheet, "notched": notched_bar, "tapered": tapered_plate, "channel": free_channel}


def rms(values):
    return float(np.sqrt((values**2).sum(axis=1).mean()))


def one(modes, index, noise=0.0, seed=0, rotations=True, freq=None):
    """Mode ``index`` alone, with noise on translations and rotations."""
    random = np.random.default_rng(seed)
    spoil = lambda values: values + noise * rms(values) * random.standard_normal(values.shape)  # noqa: E731
    moved = spoil(modes.shape(index))[None]
    turned = modes.rotations(index)
    turned = spoil(turned)[None] if rotations and turned is not None else None
    return ModeSet(modes.node_ids, [modes.freq_hz[index] if freq is None else freq], ArrayShapes(moved, turned))


def error(found, clean):
    return rms(found - clean) / rms(clean)


@pytest.mark.parametrize("name", PARTS)
def test_noise_is_taken_out_and_the_mode_stays(name):
    part = PARTS[name]()
    modes = solve(part, 6 if part.physics.supports else 12)
    given = energies(part, modes).strain
    band = part.mesh.cell_groups["band"]
    elastic = np.nonzero(modes.freq_hz > 0)[0]
    for index in elastic[[0, 1, 5]]:
        clean, strain = modes.shape(index), given[index]
        assert noise_estimate(part, clean) < 1e-4
        for seed in range(SEEDS):
            rough = one(modes, index, LEVEL, seed, rotations=seed % 2 == 0)
            added = error(rough.shape(0), clean)
            assert noise_estimate(part, rough.shape(0)) == pytest.approx(added, rel=0.25)
            found = smoothed(part, rough, 1)
            # N values (about 1 000, a third along the sheet's normal) and up to ten modes below the edge leave
            # √(10 · 3/N) of the noise: 0.17, with some chance above.
            assert error(found.shape, clean) < 0.25 * added
            assert found.noise == pytest.approx(added, rel=0.1)
            assert not found.foreign
            assert mac(found.shape.ravel(), clean.ravel()) > 0.9998
            assert (found.rotations is None) == (modes.rotations(index) is None)
            after = energies(part, found.modes, judged=False)
            assert after.closure[0] == pytest.approx(1, abs=0.001)
            assert np.abs(after.strain[0] - strain).sum() < 0.02 * strain.sum()
            assert after.strain[0, band].sum() / strain[band].sum() == pytest.approx(1, abs=0.05)


def test_without_smoothing_the_energies_are_lost():
    """Why all this is needed: with the noise left in, the figures are off by orders of magnitude."""
    part = grooved_sheet()
    modes = solve(part, 1)
    rough = energies(part, one(modes, 0, LEVEL), judged=False)
    assert rough.closure[0] > 10


def test_little_noise_is_smoothed_where_it_spoils_energies():
    part = grooved_sheet()
    modes = solve(part, 6)
    for index, level, needed in ((0, 0.0, False), (0, 3e-4, True), (5, 1e-4, False), (5, LEVEL, True)):
        rough = one(modes, index, level)
        closure = energies(part, rough, judged=False).closure[0]
        assert needs_smoothing(noise_estimate(part, rough.shape(0)), closure) is needed
        assert needed or abs(closure - 1) < 0.02
    assert not needs_smoothing(float("nan"), 1.5)
    assert not needs_smoothing(1e-9, float("nan"))  # a rigid-body mode
    assert needs_smoothing(1e-3, float("nan"))  # no material stated, no closure


def test_clean_shapes_pass_unchanged():
    for part in (grooved_sheet(), notched_bar()):
        modes = solve(part, 8)
        found = smoothed(part, modes, 8)
        assert found.noise < 1e-8
        assert error(found.shape, modes.shape(7)) < 1e-8
        assert found.mode == 8
        assert found.modes.freq_hz[0] == modes.freq_hz[7]
        assert found.modes.origin != "computed"


@pytest.mark.parametrize("factor", [0.0, 0.1, 10.0])
def test_frequency_missing_or_of_another_model(factor):
    for part in (grooved_sheet(), notched_bar()):
        modes = solve(part, 4)
        for index in (0, 3):
            rough = one(modes, index, LEVEL, freq=factor * modes.freq_hz[index], rotations=False)
            found = smoothed(part, rough, 1)
            assert error(found.shape, modes.shape(index)) < 0.008
            assert found.modes.freq_hz[0] == rough.freq_hz[0]


def test_without_material_a_uniform_one_is_assumed_and_supports_hold():
    part = grooved_sheet()
    modes = solve(part, 4)
    bare = tuple(replace(item, material="") for item in part.physics.assignments)
    unknown = part.with_(physics=Physics(assignments=bare, supports=part.physics.supports))
    for index in (0, 3):
        rough = one(modes, index, LEVEL, rotations=False)
        assert noise_estimate(unknown, rough.shape(0)) > 10 * NOISE_BOUND / 3
        found = smoothed(unknown, rough, 1)
        assert error(found.shape, modes.shape(index)) < 0.008
        assert not np.abs(found.shape[part.mesh.node_groups["x0"]]).any()
        before = relative_energies(unknown, one(modes, index)).strain[0]
        after = relative_energies(unknown, found.modes).strain[0]
        assert np.abs(after - before).sum() < 0.03


def test_supports_links_and_lumped_masses_hold_exactly():
    mesh = plate_mesh("quad4", (16, 6), (0.2, 0.08))
    tip = Selector(nodes=mesh.node_ids[mesh.node_groups["x1"]])
    lead = int(mesh.node_ids[mesh.node_groups["x1"][0]])
    part = design(
        mesh,
        thickness=0.002,
        supports=(CLAMP,),
        masses=(LumpedMass("weight", Selector(box=np.array([[0.1, 0, 0], [0.14, 0.08, 0]])), 0.5),),
        links=(Link("bar", Selector(nodes=np.array([lead])), tip),),
    )
    modes = solve(part, 3)
    for index in range(3):
        found = smoothed(part, one(modes, index, LEVEL, rotations=index != 1), 1)
        assert error(found.shape, modes.shape(index)) < 0.008
        end = found.shape[mesh.node_groups["x1"]]
        along = np.gradient(end[:, 2], mesh.points[mesh.node_groups["x1"], 1])
        assert np.ptp(along) < 1e-9 * np.abs(end).max() / 0.08  # the linked edge stays straight
        assert not np.abs(found.shape[mesh.node_groups["x0"]]).any()
        assert energies(part, found.modes, judged=False).closure[0] == pytest.approx(1, abs=0.001)


def test_complex_shapes():
    part = grooved_sheet()
    modes = solve(part, 2)
    turn = np.exp(0.7j)
    rough = [one(modes, 0, LEVEL, seed).shape(0) for seed in (1, 2)]
    shape = turn.real * rough[0] + 1j * turn.imag * rough[1]
    found = smoothed(part, ModeSet(modes.node_ids, modes.freq_hz[:1], ArrayShapes(shape[None])), 1)
    assert found.modes.is_complex
    assert np.linalg.norm(found.shape - turn * modes.shape(0)) < 0.005 * np.linalg.norm(modes.shape(0))
    assert noise_estimate(part, shape) == pytest.approx(LEVEL * np.sqrt(3), rel=0.25)


def test_modes_of_another_library_have_little_noise():
    """scikit-fem's quadratic bricks on our trilinear ones: another formulation is no noise."""
    bar = box_mesh("hex8", (16, 3, 2), (2.0, 0.3, 0.2))
    part = design(bar, supports=(CLAMP,))
    modes = independent.modes(bar, STEEL, 4, degree=2, held="x0")
    for index in range(4):
        assert noise_estimate(part, modes.shape(index)) < NOISE_BOUND
        rough = one(modes, index, LEVEL)
        assert noise_estimate(part, rough.shape(0)) > 5 * NOISE_BOUND
        found = smoothed(part, rough, 1)
        # Twice what smoothing takes from the clean shape, its difference from our model, which is no noise.
        foreign = smoothed(part, one(modes, index), 1).noise
        assert error(found.shape, modes.shape(index)) < 0.008 + 2 * foreign


def test_a_shape_of_another_design_is_called_foreign():
    """The support is missing from the model: bending at the clamp is not what a free plate does."""
    part = grooved_sheet()
    modes = solve(part, 3)
    free = part.with_(physics=replace(part.physics, supports=()))
    found = smoothed(free, one(modes, 0, LEVEL), 1)
    assert found.foreign
    assert "does not follow this shape" in found.caution
    assert "does not follow" not in smoothed(part, one(modes, 0, LEVEL), 1).caution


def test_the_caution_says_the_figure_of_the_dict():
    part = notched_bar()
    found = smoothed(part, one(solve(part, 1), 0, LEVEL), 1)
    facts = found.to_dict()
    assert found.caution.startswith(f"{facts['noise']:.1%} of the shape")
    assert facts["mode"] == 1
    assert facts["expected_noise"] == pytest.approx(facts["noise"], rel=0.25)


def test_noise_on_designs_that_cannot_tell():
    mesh = plate_mesh("quad4", (4, 4), (1.0, 1.0))
    shape = np.random.default_rng(0).standard_normal(mesh.points.shape)
    assert np.isnan(noise_estimate(Design("bare", mesh), shape))  # no thickness stated
    assert np.isnan(noise_estimate(grooved_sheet(), np.zeros_like(grooved_sheet().mesh.points)))
    held = design(mesh, thickness=0.01, supports=(Support("all", Selector(nodes=mesh.node_ids)),))
    assert np.isnan(noise_estimate(held, shape))


def test_rigid_motion_is_no_noise():
    part = free_channel()
    modes = solve(part, 6)
    for index in range(6):
        assert noise_estimate(part, modes.shape(index)) < 1e-9
        rough = one(modes, index, LEVEL, freq=0.0)
        assert noise_estimate(part, rough.shape(0)) == pytest.approx(LEVEL * np.sqrt(3), rel=0.25)
        assert error(smoothed(part, rough, 1).shape, modes.shape(index)) < 0.01


def test_too_large_a_model_is_refused(monkeypatch):
    part = notched_bar()
    modes = solve(part, 1)
    monkeypatch.setattr(smoothing, "FACTOR_LIMIT", 100)
    with pytest.raises(RefusedError, match="free directions"):
        smoothed(part, modes, 1)


def test_cancelling_stops_it():
    part = grooved_sheet()
    modes = solve(part, 1)
    with pytest.raises(Cancelled):
        smoothed(part, modes, 1, Progress(stop=lambda: True))
