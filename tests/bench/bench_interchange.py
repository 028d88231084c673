"""Reading a large mode set against a raw read of the same bytes.

``python tests/bench/bench_interchange.py [nodes] [modes]``. Ratios of one run on a warm file cache. Goals: all modes
at most 2.5 times the raw read, one mode of twenty at most 0.6 times. Prints one line a carrier and leaves with 1 when
a goal is missed.
"""

from __future__ import annotations

import sys
import tempfile
import time
from pathlib import Path

import numpy as np

from viewer.loaders import read_mesh, read_modes, write_interchange
from viewer.model.mesh import CellBlock, Mesh
from viewer.model.modes import ModeSet

ALL_GOAL, ONE_GOAL = 2.5, 0.6


class Waves:
    """A shape source that makes its shapes when asked, so that the set never is in memory."""

    has_rotations = is_complex = False

    def __init__(self, points: np.ndarray, count: int) -> None:
        self._points, self.count = points, count

    def translations(self, index: int) -> np.ndarray:
        return np.sin((index + 1) * self._points)

    def rotations(self, index: int) -> None:
        return None


def box(nodes: int) -> Mesh:
    """A box of hexahedra with about ``nodes`` nodes."""
    n = max(2, round(nodes ** (1 / 3)))
    row = np.arange(n**3).reshape(n, n, n)
    corners = [
        row[a : n - 1 + a, b : n - 1 + b, c : n - 1 + c].ravel()
        for c in (0, 1)
        for a, b in ((0, 0), (1, 0), (1, 1), (0, 1))
    ]
    points = np.stack(np.meshgrid(*3 * [np.linspace(0, 1, n)], indexing="ij"), axis=-1).reshape(-1, 3)
    hexes = np.stack(corners, axis=1)
    return Mesh(points, (CellBlock("hex8", hexes, np.arange(1, len(hexes) + 1)),), np.arange(1, n**3 + 1))


def best(work, repeats: int = 3) -> float:
    """Shortest of a few runs, s."""
    times = []
    for _ in range(repeats):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
    return min(times)


def main() -> int:
    nodes, count = (int(a) for a in (sys.argv[1:] + ["1000000", "20"][len(sys.argv) - 1 :])[:2])
    mesh = box(nodes)
    modes = ModeSet(mesh.node_ids, np.arange(1.0, count + 1), Waves(mesh.points, count))
    missed = False
    with tempfile.TemporaryDirectory() as folder:
        for suffix in (".vtu", ".npz", ".h5"):
            path = Path(folder) / f"set{suffix}"
            start = time.perf_counter()
            write_interchange(path, mesh, modes)
            written = time.perf_counter() - start

            def all_modes(path=path) -> None:
                read = read_modes(path, mesh)
                for i in range(read.count):
                    read.shape(i)

            def raw_read(path=path, piece=bytearray(24 * mesh.n_nodes)) -> None:
                with path.open("rb", buffering=0) as stream:
                    while stream.readinto(piece):
                        pass

            raw = best(raw_read)
            every = best(all_modes) / raw
            one = best(lambda path=path: read_modes(path, mesh).shape(count // 2)) / raw
            whole = best(lambda path=path: read_mesh(path), 1) / raw
            missed |= every > ALL_GOAL or one > ONE_GOAL
            print(
                f"{suffix}: {path.stat().st_size / 1e6:.0f} MB, raw read {raw:.2f} s; against it: all modes "
                f"{every:.2f}, one mode {one:.2f}, mesh {whole:.2f}, written {written / raw:.2f}"
            )
            path.unlink()
    return int(missed)


if __name__ == "__main__":
    sys.exit(main())
