"""Seconds and memory of finding the hinge of a sheet, energies of the mode included, at 1e5 and 1e6 elements.

``python tests/bench/bench_hinges.py [cells …]``, default 100000 1000000. A sheet of 4-node shells with a thin strip
across it folds there and bends a little elsewhere; the mode is given, translations and rotations, as one of an
import. Each size runs in a process of its own. Goals: a ratio of the two of at most 12, and at most 6 GB.
"""

from __future__ import annotations

import multiprocessing
import resource
import sys
import time

import numpy as np


def sheet(cells: int):
    """A sheet 1 m × 0.5 m, 2 mm thick, with a strip of 0.5 mm from x = 0.49 to 0.51, and one mode."""
    from tests.meshes import plate_mesh
    from viewer.model.design import Assignment, Design, Material, Physics, Selector, Support
    from viewer.model.modes import ArrayShapes, ModeSet

    across = max(4, round(np.sqrt(cells / 2)))
    mesh = plate_mesh("quad4", (2 * across, across), (1.0, 0.5))
    x = mesh.points[:, 0]
    centre = np.concatenate([x[b.nodes].mean(axis=1) for b in mesh.blocks])
    strip = np.nonzero(np.abs(centre - 0.5) < 0.01)[0]
    mesh = mesh.with_(cell_groups={**mesh.cell_groups, "strip": strip})
    design = Design(
        "sheet",
        mesh,
        Physics(
            {"steel": Material("steel", 200e9, 0.3, 7850.0)},
            (Assignment("*", "steel", 0.002), Assignment("strip", "steel", 0.0005)),
            (Support("root", Selector(group="x0")),),
        ),
    )
    slope = 0.1 * np.clip((x - 0.49) / 0.02, 0, 1) + 0.02 * x**2
    ramp = np.clip(x - 0.49, 0, 0.02)
    height = 0.1 * (ramp**2 / 0.04 + np.maximum(x - 0.51, 0)) + 0.02 * x**3 / 3
    moved, turned = np.zeros((1, len(x), 3)), np.zeros((1, len(x), 3))
    moved[0, :, 2], turned[0, :, 1] = height, -slope
    return design, ModeSet(mesh.node_ids, [20.0], ArrayShapes(moved, turned))


def run(cells: int) -> None:
    from viewer.insight.hinges import find_hinges
    from viewer.mechanics.energy import energies

    design, modes = sheet(cells)
    before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    start = time.process_time()
    found = energies(design, modes, [0], judged=False)
    middle = time.process_time()
    finding = find_hinges(design, modes, 1, found)
    end = time.process_time()
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    print(
        f"{design.mesh.n_cells:9d} cells: energies {middle - start:6.1f} s, search {end - middle:6.1f} s, together "
        f"{end - start:6.1f} s of CPU; peak {peak / 1e6:4.1f} GB (mesh and mode {before / 1e6:4.1f} GB)",
        flush=True,
    )
    print("   " + finding.sentence, flush=True)


if __name__ == "__main__":
    from pathlib import Path

    sys.path.insert(0, str(Path(__file__).resolve().parents[2]))
    context = multiprocessing.get_context("spawn")
    for size in [int(float(word)) for word in sys.argv[1:]] or [100_000, 1_000_000]:
        process = context.Process(target=run, args=(size,))
        process.start()
        process.join()
