"""Modes of 1 000 000 nodes against modes of 800 000 nodes: mapping and MAC.

``python tests/bench/bench_pairing.py [nodes] [modes]`` in the project's folder, with OMP_NUM_THREADS=1. Times are
seconds of the processor, so that other work on the machine does not count; MAC is a ratio to one BLAS product of the
same size, in the same run.

Wanted: 60 s and 4 GB for 1 000 000 against 800 000 nodes and 20 modes each; MAC within twice the BLAS product.
Measured on one core, blocks of hexahedra (995 112 nodes) against tetrahedra (793 800): mapping 25.5 s, pairing 4.9 s,
peak 1.72 GB with both meshes in memory, all 20 paired, least MAC 0.999996; MAC 1.32 to 1.46 times the product.
"""

from __future__ import annotations

import resource
import sys
import time

import numpy as np

from tests.meshes import box_mesh
from viewer.insight.common_support import common_support
from viewer.insight.correlate import mac
from viewer.insight.pairing import pair
from viewer.model.design import Assignment, Design, Material, Physics
from viewer.model.modes import ModeSet


class Waves:
    """Shapes by formula, so that those of both meshes are the same motion: standing waves of growing number."""

    has_rotations = is_complex = False

    def __init__(self, points: np.ndarray, count: int) -> None:
        self.points, self.count = points, count

    def translations(self, index: int) -> np.ndarray:
        along = np.sin((index + 1) * np.pi * self.points[:, [0]] / 2.0)
        return along * np.eye(3)[index % 3] * (1 + self.points[:, [1]])

    def rotations(self, index: int) -> None:
        return None


def block(name: str, kind: str, counts: tuple[int, int, int], modes: int) -> tuple[Design, ModeSet]:
    mesh = box_mesh(kind, counts, (2.0, 0.5, 0.4))
    steel = Material("steel", 2e11, 0.3, 7850.0)
    design = Design(name, mesh, Physics({"steel": steel}, (Assignment("*", "steel"),)))
    shapes = Waves(mesh.points, modes)
    return design, ModeSet(mesh.node_ids, np.arange(1, modes + 1) * 37.0, shapes)


def counts_for(nodes: int) -> tuple[int, int, int]:
    side = (nodes / (2.0 * 0.5 * 0.4)) ** (1 / 3)
    return tuple(max(1, round(side * length) - 1) for length in (2.0, 0.5, 0.4))


def peak_gb() -> float:
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 2**20


def main(nodes: int = 1_000_000, modes: int = 20) -> None:
    first, second = (
        block("fine", "hex8", counts_for(nodes), modes),
        block("coarse", "tet4", counts_for(0.8 * nodes), modes),
    )
    print(f"nodes: {first[0].mesh.n_nodes} and {second[0].mesh.n_nodes}, cells: {first[0].mesh.n_cells} and "
          f"{second[0].mesh.n_cells}, modes: {modes}, memory with both meshes {peak_gb():.2f} GB")  # fmt: skip
    start = time.process_time()
    support = common_support(first[0], second[0])
    mapped = time.process_time() - start
    start = time.process_time()
    found = pair(*first, *second, support)
    paired = time.process_time() - start
    least = min(p.mac for p in found.pairs)
    print(
        f"mapping {mapped:.1f} s, pairing {paired:.1f} s, together {mapped + paired:.1f} s, peak {peak_gb():.2f} GB"
    )
    print(f"paired {sum(p.first == p.second for p in found.pairs)} of {modes}, least MAC {least:.6f}")
    random = np.random.default_rng(0)
    one, two = random.normal(size=(2, modes, 3 * second[0].mesh.n_nodes))
    times = {"BLAS product": lambda: one @ two.T, "MAC": lambda: mac(one, two)}
    best = {}
    for name, work in times.items():
        best[name] = np.inf
        for _ in range(5):
            start = time.process_time()
            work()
            best[name] = min(best[name], time.process_time() - start)
    print(f"MAC {best['MAC'] / best['BLAS product']:.2f} times one BLAS product of the same size")


if __name__ == "__main__":
    main(*(int(word) for word in sys.argv[1:]))
