"""A 40-frame loop of 180 000 triangles at 960 × 720, against a plain pyvista script that does the same job.

Run: ``python -m tests.bench.bench_loop``. Prints both times and their ratio, measured in one run by turns; processor
time (all threads) beside elapsed time, since on a busy machine only the former compares.
The plain script warps the mesh, adds it again and writes each frame. It is given its best case: one rendering a
frame (``render=False``, no scalar bar, which would render twice more), no contour, ghost or note.
"""

from __future__ import annotations

import sys
import tempfile
import time
from pathlib import Path

import numpy as np
import pyvista as pv

from tests.stage.channel import body, channel, picture
from viewer.export import save_gif
from viewer.export.frames import phase_of
from viewer.scene.picture import Picture
from viewer.scene.tokens import FRAMES

TARGET = 0.45


def plain(scene: Picture, path: Path) -> None:
    """The loop as a plain script would make it."""
    shown = scene.bodies[0]
    quads = shown.mesh.blocks[0].nodes
    faces = np.hstack([np.full((len(quads), 1), 4), quads])
    mesh = pv.PolyData(np.array(shown.mesh.points), faces.ravel()).triangulate()
    mesh["shape"] = shown.factor * shown.shape
    mesh["energy"] = np.linalg.norm(shown.shape, axis=1)
    plotter = pv.Plotter(off_screen=True, window_size=[scene.width, scene.height])
    plotter.open_gif(str(path), fps=25)
    for frame in range(FRAMES):
        warped = mesh.warp_by_vector("shape", factor=np.cos(phase_of(frame)))
        plotter.add_mesh(
            warped, scalars="energy", name="body", smooth_shading=True, show_scalar_bar=False, render=False
        )
        plotter.write_frame()
    plotter.close()


def ours(scene: Picture, path: Path) -> None:
    """The same loop through the public function."""
    save_gif(scene, path)


def main(rounds: int = 1) -> int:
    """Print times in seconds and the ratios of medians; exit code 1 when processor time is above the target."""
    scene = picture(body(channel(along=900, across=44, down=28)), width=960, height=720)
    triangles = 2 * scene.bodies[0].mesh.n_cells
    taken: dict[str, list[tuple[float, float]]] = {"plain": [], "ours": []}
    with tempfile.TemporaryDirectory() as folder:
        for _ in range(rounds):
            for name, job in (("plain", plain), ("ours", ours)):
                start, used = time.perf_counter(), time.process_time()
                job(scene, Path(folder) / f"{name}.gif")
                taken[name].append((time.perf_counter() - start, time.process_time() - used))
        size = (Path(folder) / "ours.gif").stat().st_size / 1e6
    sys.stdout.write(f"{triangles} triangles, {FRAMES} frames, file {size:.1f} MB, target {TARGET}\n")
    ratios = []
    for what, column in (("elapsed", 0), ("processor", 1)):
        theirs, mine = (float(np.median([pair[column] for pair in taken[name]])) for name in ("plain", "ours"))
        ratios.append(mine / theirs)
        sys.stdout.write(f"{what:>9}: plain {theirs:.1f} s, ours {mine:.1f} s, ratio {ratios[-1]:.2f}\n")
    return int(ratios[1] > TARGET)


if __name__ == "__main__":
    raise SystemExit(main())
