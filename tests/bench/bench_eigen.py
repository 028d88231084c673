"""Twenty modes of 28 000 8-node hexahedra: our ``solve_system`` against SciPy's own shift-invert with its defaults.

Run: ``python -m tests.bench.bench_eigen [nx ny nz] [solver]`` (default 40 35 20, PARDISO where it is installed;
SciPy's side takes many minutes and several gigabytes there). Ours counts the choice of the shift, factorisation,
Lanczos, the residual check and the count of modes by a second factorisation; SciPy's is
``eigsh(K, 20, M, sigma=0)`` on the same matrices of a clamped body. Ratio of CPU seconds of one run, which
counts all threads; goal 0.25.
"""

from __future__ import annotations

import sys
import time

import numpy as np
import scipy.sparse as sp
import scipy.sparse.linalg as spla

from tests.mechanics.models import CLAMP, design
from tests.meshes import box_mesh
from viewer.mechanics.assembly import assemble
from viewer.mechanics.eigen import solve_system

GOAL, MODES = 0.25, 20


def main(counts: tuple[int, ...], solver: str) -> bool:
    system = assemble(design(box_mesh("hex8", counts, (4.0, 3.5, 2.0)), supports=(CLAMP,)))
    start = time.process_time()
    modes = solve_system(system, MODES, solver=solver)
    ours = time.process_time() - start
    print(f"{system.n_dof} directions, ours ({solver or 'default solver'}) {ours:.2f} s", flush=True)
    free = np.nonzero(~system.held)[0]
    stiffness, mass = (sp.csc_array(matrix[free][:, free]) for matrix in (system.K, system.M))
    start = time.process_time()
    values = spla.eigsh(stiffness, MODES, mass, sigma=0, return_eigenvectors=True)[0]
    theirs = time.process_time() - start
    off = np.abs(np.sqrt(np.sort(values)) / (2 * np.pi) / modes.freq_hz - 1).max()
    print(f"SciPy {theirs:.2f} s, ratio {ours / theirs:.3f} (goal {GOAL}), largest difference {off:.1e}")
    return ours <= GOAL * theirs


if __name__ == "__main__":
    numbers = tuple(int(a) for a in sys.argv[1:4]) or (40, 35, 20)
    sys.exit(0 if main(numbers, sys.argv[4] if len(sys.argv) > 4 else "") else 1)
