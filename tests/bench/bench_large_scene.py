"""A box of a million 8-node hexahedra through scene and stage: time of each step, and how it grows with size.

Run: ``python -m tests.bench.bench_large_scene [cells along an edge, 100]``. Each step is taken at an eighth of the
cells and at all of them, in processes of their own; the growth is the exponent of the cell count, from processor
time. Exit code 1 when a step grows faster than n^1.25 (n·log n over this span is n^1.05; the rest is cache misses).
"""

from __future__ import annotations

import json
import resource
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np

from tests.meshes import box_mesh
from viewer.export import save_gif, save_png
from viewer.scene import node_lines, view
from viewer.scene.marks import mark_pieces
from viewer.scene.palette import energy_top
from viewer.scene.picture import Body, Note, Picture, SupportMark
from viewer.scene.section import Plane
from viewer.scene.showing import Showing
from viewer.scene.surface import drawn_areas, surface_of

STEEPEST = 1.25
LEAST = 0.2  # s: shorter steps say nothing about growth


def model(n: int) -> Body:
    """A cube of n³ cells that bends, with an invented energy field."""
    mesh = box_mesh("hex8", (n, n, n), (1.0, 1.0, 1.0))
    x = mesh.points[:, 0]
    shape = np.stack([-2 * x * (mesh.points[:, 2] - 0.5), 0 * x, x**2], axis=1)
    middle = np.add.reduce(mesh.points[mesh.blocks[0].nodes], axis=1) / 8
    density = (1 - middle[:, 0]) * (2 * middle[:, 2] - 1) ** 2
    half = np.flatnonzero(middle[:, 1] < 0.5)
    mesh = mesh.with_(cell_groups={"near": half})
    held = SupportMark("root", np.flatnonzero(x == 0))
    return Body("box", mesh, shape, 0.1, 10.0, density / density.mean(), (held,))


def steps(n: int) -> dict[str, tuple[float, float, float]]:
    """Elapsed s, processor s, and peak memory so far in MB, of each step."""
    body = model(n)
    taken = {"(model)": (0.0, 0.0, _peak())}

    def step(name, job):
        start, used = time.perf_counter(), time.process_time()
        result = job()
        taken[name] = (time.perf_counter() - start, time.process_time() - used, _peak())
        return result

    step("skin", lambda: body.mesh.skin)
    step("surface", lambda: surface_of(body.mesh))
    top = step("energy scale", lambda: energy_top([body.density], [drawn_areas(body.mesh)]))
    note = Note("Mode 1", "10 Hz", ("size arbitrary",))
    picture = Picture((body,), note, energy_top=top)
    step("marks", lambda: mark_pieces(picture))
    step("camera", lambda: view.fit(picture))
    (cut,) = step("cut", lambda: Showing(plane=Plane((1, 0.4, 0.3), 0.8)).parts([body], picture.view.toward_eye))
    step("hide", lambda: Showing(hide=("near",)).parts([body], picture.view.toward_eye))
    step("node lines", lambda: node_lines.lines_of(body))
    with tempfile.TemporaryDirectory() as folder:
        step("still", lambda: save_png(picture, Path(folder) / "a.png"))
        step("still, cut", lambda: save_png(picture.with_(bodies=(cut,)), Path(folder) / "b.png"))
        step("loop", lambda: save_gif(picture, Path(folder) / "a.gif"))
    return taken


def _peak() -> float:
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024


def main(n: int = 100) -> int:
    """Print times, memory and growth."""
    small, large = (_apart(size) for size in (n // 2, n))
    print(f"{(n // 2) ** 3} and {n**3} hex8          elapsed s      processor s   peak MB  growth")
    worst = 0.0
    for name, (elapsed, used, memory) in large.items():
        before = small[name]
        growth = np.log(max(used, 1e-9) / max(before[1], 1e-9)) / np.log(8) if used >= LEAST else 0.0
        worst = max(worst, growth)
        grown = f"n^{growth:.2f}" if growth else ""
        print(f"{name:24} {before[0]:7.2f} {elapsed:7.2f}  {before[1]:7.2f} {used:7.2f} {memory:9.0f}  {grown}")
    return int(worst > STEEPEST)


def _apart(n: int) -> dict[str, tuple[float, float, float]]:
    run = subprocess.run(
        [sys.executable, "-m", "tests.bench.bench_large_scene", "--steps", str(n)],
        capture_output=True,
        text=True,
        check=True,
    )
    return json.loads(run.stdout)


if __name__ == "__main__":
    if "--steps" in sys.argv:
        print(json.dumps(steps(int(sys.argv[-1]))))
        raise SystemExit(0)
    raise SystemExit(main(*map(int, sys.argv[1:])))
