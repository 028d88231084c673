"""Element matrices of 8-node hexahedra against scikit-fem's assembly of the same body, one process, by turns.

Run: ``python -m tests.bench.bench_assembly_elements [bricks per side]`` (default 30: 27 000 bricks; scikit-fem takes
minutes there). Prints the times of stiffness (incompatible modes, the default) and mass kernels, of scikit-fem's K
and M with the same 2 × 2 × 2 rule on a ready basis, and the ratio; the part of the time left to our assembly is the
rest up to 0.35.
"""

from __future__ import annotations

import sys
import time

import numpy as np
import skfem
from skfem.models.elasticity import lame_parameters, linear_elasticity

from tests.meshes import box_mesh
from viewer.mechanics.formulations import formulation_for
from viewer.model.design import Material, Property

TARGET = 0.25
MATERIAL = Material("aluminium", 70e9, 0.33, 2700.0)


def ours(xyz: np.ndarray, name: str) -> tuple[float, float]:
    """Seconds for stiffness and mass of all cells, in pieces of the size that assembly takes."""
    element, prop = formulation_for("hex8", name), Property(MATERIAL)
    took = []
    for kernel in (element.stiffness, element.mass):
        start = time.perf_counter()
        for first in range(0, len(xyz), 3600):
            kernel(xyz[first : first + 3600], prop)
        took.append(time.perf_counter() - start)
    return took[0], took[1]


def theirs(side: int) -> tuple[float, float]:
    """Seconds for scikit-fem's K and M, the basis not counted."""
    line = np.linspace(0, 1, side + 1)
    model = skfem.MeshHex.init_tensor(line, line, line)
    basis = skfem.Basis(model, skfem.ElementVector(skfem.ElementHex1()), intorder=3)
    start = time.perf_counter()
    linear_elasticity(*lame_parameters(MATERIAL.youngs_modulus, MATERIAL.poisson)).assemble(basis)
    middle = time.perf_counter()
    skfem.BilinearForm(lambda u, v, _: MATERIAL.density * sum(u[i] * v[i] for i in range(3))).assemble(basis)
    return middle - start, time.perf_counter() - middle


def main(side: int = 30, rounds: int = 2) -> int:
    """Print the times in seconds and the ratio of the best rounds; exit code 1 above the target."""
    mesh = box_mesh("hex8", (side, side, side), (1.0, 1.0, 1.0))
    xyz = mesh.points[mesh.blocks[0].nodes]
    runs = [(ours(xyz, "hex8-incompatible"), ours(xyz, "hex8-full"), theirs(side)) for _ in range(rounds)]
    best = [tuple(min(run[i][j] for run in runs) for j in range(2)) for i in range(3)]
    for name, (stiffness, mass) in zip(("hex8-incompatible", "hex8-full", "scikit-fem"), best, strict=True):
        sys.stdout.write(f"{name:18s} K {stiffness:8.3f} s   M {mass:8.3f} s\n")
    ratio = sum(best[0]) / sum(best[2])
    sys.stdout.write(f"{len(xyz)} bricks, ratio {ratio:.3f}, target {TARGET}\n")
    return int(ratio > TARGET)


if __name__ == "__main__":
    raise SystemExit(main(*map(int, sys.argv[1:2])))
