"""K and M of 28 000 8-node hexahedra: our whole ``assemble`` against scikit-fem's vector elements.

Run: ``python -m tests.bench.bench_assembly [nx ny nz]`` (default 40 35 20). Ours counts everything from the design to
the two CSR matrices, checks of the cells included, with the default formulation (incompatible modes) and the plain
one; scikit-fem's counts K and M with its 2 × 2 × 2 rule on a basis that is ready. Ratios of CPU seconds of one run
(wall time of a shared machine is noise); goal 0.35.
"""

from __future__ import annotations

import sys
import time

import skfem
from skfem.models.elasticity import lame_parameters, linear_elasticity

from tests.independent import basis
from tests.mechanics.models import STEEL, design
from tests.meshes import box_mesh
from viewer.mechanics.assembly import assemble

GOAL = 0.35


def main(counts: tuple[int, ...]) -> bool:
    mesh = box_mesh("hex8", counts, (4.0, 3.5, 2.0))
    ours = {}
    for name in ("hex8-incompatible", "hex8-full"):
        start = time.process_time()
        assemble(design(mesh, formulation=name))
        ours[name] = time.process_time() - start
    start = time.process_time()
    space = basis(mesh)
    ready = time.process_time() - start

    @skfem.BilinearForm
    def mass(u, v, _):
        return STEEL.density * sum(u[i] * v[i] for i in range(3))

    start = time.process_time()
    linear_elasticity(*lame_parameters(STEEL.youngs_modulus, STEEL.poisson)).assemble(space)
    mass.assemble(space)
    theirs = time.process_time() - start
    print(f"{mesh.n_cells} hex8; scikit-fem K + M {theirs:.2f} s (basis {ready:.2f} s not counted)")
    for name, seconds in ours.items():
        print(f"{name}: {seconds:.2f} s, ratio {seconds / theirs:.3f} (goal {GOAL})")
    return max(ours.values()) <= GOAL * theirs


if __name__ == "__main__":
    sys.exit(0 if main(tuple(int(a) for a in sys.argv[1:4]) or (40, 35, 20)) else 1)
