"""Complex modes from a file to a moving picture: waves that travel round a plate, and a plate with one damper."""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest
import scipy.linalg as sl
from PIL import Image

from tests.integration.models import STEEL
from tests.meshes import plate_mesh
from viewer import animate
from viewer.loaders import read_modes, write_interchange
from viewer.mechanics.assembly import assemble
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import energies
from viewer.model.design import Assignment, Design, Physics, Selector, Support
from viewer.model.modes import ArrayShapes, ModeSet
from viewer.scene.tokens import FRAMES
from viewer.workspace import study

COUNT = 4


@cache
def plate() -> Design:
    held = tuple(Support(f"edge {g}", Selector(group=g), ("ux", "uy", "uz")) for g in ("x0", "x1", "y0", "y1"))
    return Design(
        "plate",
        plate_mesh("quad4", (10, 10), (0.3, 0.3)),
        Physics(
            {STEEL.name: STEEL},
            (Assignment("*", STEEL.name, 0.003),),
            supports=held,
        ),
    )


@cache
def travelling() -> ModeSet:
    """The two equal modes of a square plate, a quarter of a period apart: a wave that runs round."""
    modes = solve(plate(), 3)
    assert modes.freq_hz[1] == pytest.approx(modes.freq_hz[2], rel=1e-6)
    shape = modes.shape(1) + 1j * modes.shape(2)
    return ModeSet(modes.node_ids, modes.freq_hz[1:2], ArrayShapes(shape[None]))


@cache
def damped() -> ModeSet:
    """A dashpot at one node, out of the middle: the state-space problem on twelve modes, solved by LAPACK through
    SciPy. s = −ζω ± iω√(1 − ζ²); the frequency is |s|/2π (common practice, no source)."""
    design, modes = plate(), solve(plate(), 12)
    node = int(np.argmin(np.linalg.norm(design.mesh.points - [0.1, 0.12, 0], axis=1)))
    touch = np.array([modes.shape(i)[node, 2] for i in range(modes.count)])
    damping = 25.0 * np.outer(touch, touch)
    rigidity = np.diag((2 * np.pi * modes.freq_hz) ** 2)
    n = modes.count
    state = np.block([[np.zeros((n, n)), np.eye(n)], [-rigidity, -damping]])
    roots, vectors = sl.eig(state)
    upper = np.nonzero(roots.imag > 0)[0]
    upper = upper[np.argsort(np.abs(roots[upper]))][:COUNT]
    real = np.stack([modes.shape(i) for i in range(n)])
    moved = np.einsum("mk,mnj->knj", vectors[:n, upper], real)
    return ModeSet(
        modes.node_ids,
        np.abs(roots[upper]) / (2 * np.pi),
        ArrayShapes(moved),
        damping=-roots[upper].real / np.abs(roots[upper]),
    )


@pytest.mark.parametrize("make", [travelling, damped])
@pytest.mark.parametrize("suffix", [".vtu", ".npz"])
def test_complex_shapes_come_back_to_the_last_digit(make, suffix, tmp_path):
    modes = make()
    path = write_interchange(tmp_path / f"waves{suffix}", plate().mesh, modes)
    given = read_modes(path, plate().mesh)
    assert given.is_complex
    for i in range(modes.count):
        np.testing.assert_array_equal(given.shape(i), modes.shape(i))
    if modes.damping is not None:
        np.testing.assert_array_equal(given.damping, modes.damping)


def test_one_damper_makes_modes_complex():
    modes = damped()
    assert (modes.damping > 1e-3).any()
    assert (modes.damping < 0.3).all()
    # of the two equal modes one combination rests at the damper and stays real
    felt = np.nonzero(modes.damping > 1e-9)[0]
    assert len(felt) == COUNT - 1
    for i in felt:
        shape = modes.shape(int(i))
        assert np.abs((shape * shape).sum()) < 0.9999 * (np.abs(shape) ** 2).sum(), "phases differ"


def test_energies_of_complex_modes(tmp_path):
    """φᴴKφ of the real and imaginary parts added, which the matrices give directly; the phase of a shape is free."""
    design, modes = plate(), damped()
    given = read_modes(write_interchange(tmp_path / "damped.vtu", design.mesh, modes), design.mesh)
    found = energies(design, given)
    turned = ModeSet(given.node_ids, given.freq_hz, ArrayShapes(given.shapes.moved * np.exp(0.7j)))
    same = energies(design, turned).strain
    np.testing.assert_allclose(same, found.strain, rtol=1e-9, atol=1e-12 * found.strain.max())
    parts = [
        energies(design, ModeSet(given.node_ids, given.freq_hz, ArrayShapes(part)))
        for part in (given.shapes.moved.real, given.shapes.moved.imag)
    ]
    total = parts[0].strain + parts[1].strain
    np.testing.assert_allclose(found.strain, total, rtol=1e-9, atol=1e-12 * total.max())
    system = assemble(design)
    z = system.dof[:, 2]
    moving = np.array([np.real(np.conj(s[:, 2]) @ (system.M[z][:, z] @ s[:, 2])) for s in given.shapes.moved])
    np.testing.assert_allclose(2 * found.kinetic.sum(axis=1), moving * (2 * np.pi * given.freq_hz) ** 2, rtol=0.01)


def test_a_wave_that_runs_round_closes_as_the_standing_modes_do(tmp_path):
    design = plate()
    given = read_modes(write_interchange(tmp_path / "wave.vtu", design.mesh, travelling()), design.mesh)
    found = energies(design, given)
    np.testing.assert_allclose(found.closure, 1, atol=1e-3)
    assert found.trusted.all()


def test_loop_of_a_travelling_wave_has_forty_different_frames(tmp_path):
    loops = {}
    for name, modes in (("wave", travelling()), ("standing", solve(plate(), 2))):
        path = animate(plate(), modes, modes.count, width=320).save(tmp_path / f"{name}.gif")
        with Image.open(path) as loop:
            assert loop.n_frames == FRAMES
            frames = []
            for number in range(FRAMES):
                loop.seek(number)
                frames.append(loop.convert("RGB").tobytes())
        loops[name] = len(set(frames))
    assert loops["wave"] == FRAMES
    assert loops["standing"] == FRAMES // 2 + 1


def test_still_of_a_complex_mode_shows_its_extreme(tmp_path):
    """At phase 0 the shape is as large as it gets: the picture differs most from rest there."""
    made = study(plate(), damped())
    for index in range(made.count):
        shape = made.modes.shape(index)
        turned = shape * made.scale(index).turn
        swing = [(np.real(turned * np.exp(1j * p)) ** 2).sum() for p in np.linspace(0, np.pi, 61)[:-1]]
        assert np.argmax(swing) == 0
    path = animate(plate(), damped(), 1, width=320).save(tmp_path / "still.png")
    with Image.open(path) as still:
        assert still.size == (320, 240)
        assert len(still.convert("RGB").getcolors(1 << 20)) > 50
