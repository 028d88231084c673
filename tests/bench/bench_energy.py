"""Energies of 20 modes by cell: ours against scikit-fem's elemental functional, and a million hexahedra.

Run: ``python -m tests.bench.bench_energy [nx ny nz]`` (default 40 35 20) prints the ratio of CPU seconds, goal 0.1.
Ours counts the whole of ``energies`` (strain and kinetic, layout and checks included); scikit-fem's the two
functionals evaluated by cell once a mode on a basis that is ready. By turns, and the median of the rounds' ratios,
since a shared machine runs now faster, now slower.
``python -m tests.bench.bench_energy million`` prints seconds and peak memory for 20 shapes on 100 × 100 × 100 cells.
"""

from __future__ import annotations

import resource
import sys
import time

import numpy as np
import skfem
from skfem.helpers import ddot, sym_grad, trace
from skfem.models.elasticity import lame_parameters

from tests.independent import basis
from tests.mechanics.models import CLAMP, STEEL, design
from tests.meshes import box_mesh
from viewer.mechanics.energy import energies
from viewer.model.modes import ArrayShapes, ModeSet

GOAL, MODES, ROUNDS = 0.1, 20, 5


def shapes(mesh) -> ModeSet:
    """Smooth shapes that stand for modes, at 0 Hz: the residual of imported modes is not part of the comparison."""
    x, y, z = (mesh.points / mesh.points.max(axis=0)).T
    moved = np.stack(
        [
            np.stack([np.sin((j + 1) * x) * y, np.cos(j * y) * z * x, np.sin(j * z + x) * x], axis=1)
            for j in range(MODES)
        ]
    )
    return ModeSet(mesh.node_ids, np.zeros(MODES), ArrayShapes(moved))


def against_skfem(counts: tuple[int, ...]) -> bool:
    mesh = box_mesh("hex8", counts, (4.0, 3.5, 2.0))
    model = design(mesh, formulation="hex8-full", supports=(CLAMP,))
    modes = shapes(mesh)
    space = basis(mesh)
    first, second = lame_parameters(STEEL.youngs_modulus, STEEL.poisson)

    @skfem.Functional
    def strain_energy(w):
        strain = sym_grad(w["u"])
        return 0.5 * first * trace(strain) ** 2 + second * ddot(strain, strain)

    @skfem.Functional
    def kinetic_energy(w):
        return 0.5 * STEEL.density * sum(w["u"].value[i] ** 2 for i in range(3))

    vectors = np.zeros((MODES, space.N))
    vectors[:, space.nodal_dofs[:3].T] = modes.shapes.moved
    ours, theirs = [], []
    for _ in range(ROUNDS):
        start = time.process_time()
        found = energies(model, modes)
        ours.append(time.process_time() - start)
        start, strain = time.process_time(), []
        for vector in vectors:
            field = space.interpolate(vector)
            strain.append(strain_energy.elemental(space, u=field))
            kinetic_energy.elemental(space, u=field)
        theirs.append(time.process_time() - start)
    off = np.abs(np.stack(strain) - found.strain).max() / found.strain.max()
    each = ", ".join(f"{a:.2f}/{b:.2f}" for a, b in zip(ours, theirs, strict=True))
    ratio = float(np.median(np.divide(ours, theirs)))
    print(
        f"{mesh.n_cells} hex8, {MODES} modes: ours/scikit-fem by turns {each} s, median ratio {ratio:.3f} "
        f"(goal {GOAL}), largest difference {off:.1e}"
    )
    return ratio <= GOAL


def million() -> bool:
    mesh = box_mesh("hex8", (100, 100, 100), (1.0, 1.0, 1.0))
    model, modes = design(mesh, supports=(CLAMP,)), shapes(mesh)
    before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1e6
    start = time.process_time()
    energies(model, modes)
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1e6
    print(
        f"{mesh.n_cells} hex8, {MODES} modes: {time.process_time() - start:.1f} s, peak {peak:.1f} GB "
        f"({before:.1f} GB before, mesh and shapes {MODES * mesh.n_nodes * 24 / 1e9:.1f} GB of it)"
    )
    return True


if __name__ == "__main__":
    if sys.argv[1:] == ["million"]:
        sys.exit(0 if million() else 1)
    sys.exit(0 if against_skfem(tuple(int(a) for a in sys.argv[1:4]) or (40, 35, 20)) else 1)
