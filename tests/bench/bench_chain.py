"""Time and memory of the whole chain on a large solid: load, skin, energies, one still.

``python tests/bench/bench_chain.py [cells] [--material]``. A cube of about that many hexahedra (default: a million)
with three modes is written as an interchange file by a process of its own; then each stage says its seconds and the
most memory that was held in it above the file's size. Without ``--material`` energies are relative, as for a mesh and
modes alone; with it closure and residual are formed as well. Leaves with 1 when a stage goes above the goal. Memory
is read from Linux's /proc.

Measured on two cores shared with others, therefore in seconds that the process was busy (NumPy 2.4), and GB above
the file (of 0.01, 0.05, 0.19 and 1.8 GB)::

    cells        30 000      238 000     1 000 000   9 800 000   1 000 000 with material
    load        0.1 s 0.2    0.5 s 0.3   1.9 s 0.4    16 s  1.9     1.9 s 0.4
    skin        0.0 s 0.2    0.3 s 0.4   1.4 s 0.8    18 s  5.6     1.4 s 0.8
    energies    1.2 s 0.2     10 s 0.5    48 s 1.5   344 s  5.5     209 s 2.9
    picture     0.1 s 0.2    1.0 s 0.6   5.1 s 1.7    55 s 13.6     5.1 s 1.7
    still       1.5 s 0.5    1.6 s 0.6   1.6 s 0.6     4 s  1.1     1.6 s 0.8

From a million to ten, n·log n grows 11.4-fold: load grew 9-fold, skin 12.6 (sorting faces, within what repeats
differ by here), energies 7, picture 11, still 2. Nothing grew markedly faster. (The energies of a million without
material were taken before the rigid share was formed in slices; its memory is lower now.) With material three modes,
each with a search of its own, took 19 steps each of 1.3 s; beyond about 3.5 million 8-node hexahedra
``closure.MOST_ROOM`` leaves the residual out.
"""

from __future__ import annotations

import multiprocessing
import os
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np

GOAL = 3.0  # GB above the size of the file
COUNT = 3


class Bends:
    """Cantilever-like shapes along x, Euler–Bernoulli kinematics, made when asked."""

    has_rotations = is_complex = False
    count = COUNT

    def __init__(self, points: np.ndarray) -> None:
        self._points = points

    def translations(self, index: int) -> np.ndarray:
        x, _, z = self._points.T
        k = (index + 0.5) * np.pi
        bent = np.zeros_like(self._points)
        bent[:, 2], bent[:, 0] = 1 - np.cos(k * x), -z * k * np.sin(k * x)
        return bent

    def rotations(self, index: int) -> None:
        return None


def write(path: Path, cells: int) -> None:
    """The file of the cube; runs in a process of its own, whose memory does not count."""
    from tests.bench.bench_interchange import box
    from viewer.loaders import write_interchange
    from viewer.model.modes import ModeSet

    side = max(2, round(cells ** (1 / 3)))
    mesh = box((side + 1) ** 3)
    write_interchange(path, mesh, ModeSet(mesh.node_ids, 100.0 * (1 + np.arange(COUNT)), Bends(mesh.points)))


def held(word: str) -> float:
    """VmHWM or VmRSS of this process and its children, GB; children are readers, which end with their stage."""
    for line in Path("/proc/self/status").read_text().splitlines():
        if line.startswith(word):
            return int(line.split()[1]) * 1024 / 1e9
    raise OSError(f"no {word} in /proc/self/status")


def stage(name: str, size: float, work: Callable[[], Any]) -> tuple[Any, bool]:
    """Run one stage; its result, and whether it kept to the goal."""
    Path("/proc/self/clear_refs").write_text("5")  # forgets the peak so far
    start, before = time.perf_counter(), sum(os.times()[:4])
    result = work()
    seconds, busy, peak = time.perf_counter() - start, sum(os.times()[:4]) - before, held("VmHWM")
    good = peak - size <= GOAL
    print(
        f"{name:9} {seconds:8.1f} s, busy {busy:7.1f} s   peak {peak:5.2f} GB, {peak - size:5.2f} above the file, "
        f"kept {held('VmRSS'):5.2f} GB   {'' if good else 'ABOVE THE GOAL'}",
        flush=True,
    )
    return result, good


def main(cells: int, material: bool) -> int:
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "cube.vtu"
        writer = multiprocessing.get_context("spawn").Process(target=write, args=(path, cells))
        writer.start()
        writer.join()
        size = path.stat().st_size / 1e9

        import viewer
        from viewer.export import save_png
        from viewer.model.design import Assignment, Design, Material, Physics
        from viewer.scene.compose import single_picture
        from viewer.workspace import study

        steel = Physics({"steel": Material("steel", 2.1e11, 0.3, 7850.0)}, (Assignment("*", "steel"),))
        (mesh, modes), one = stage(
            "load", size, lambda: (mesh := viewer.read_mesh(path), viewer.read_modes(path, mesh))
        )
        print(f"{mesh.n_cells} cells, {mesh.n_nodes} nodes, file {size:.2f} GB, goal {GOAL:g} GB above it")
        _, two = stage("skin", size, lambda: mesh.skin)
        design = Design("cube", mesh, steel if material else Physics())
        told, three = stage("energies", size, lambda: study(design, modes))
        picture, four = stage("picture", size, lambda: single_picture(told, 1))
        _, five = stage("still", size, lambda: save_png(picture, Path(folder) / "cube.png"))
    return 0 if one and two and three and four and five else 1


if __name__ == "__main__":
    numbers = [word for word in sys.argv[1:] if word.isdigit()]
    sys.exit(main(int(numbers[0]) if numbers else 1_000_000, "--material" in sys.argv))
