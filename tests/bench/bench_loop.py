"""A 40-frame loop of 180 000 triangles at 960 × 720, against a plain pyvista script that does the same job.

Run: ``python -m tests.bench.bench_loop``. Prints both times and their ratio, measured in one run by turns.
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
    """Print times in seconds and the ratio of medians; exit code 1 above the target."""
    scene = picture(body(channel(along=900, across=44, down=28)), width=960, height=720)
    triangles = 2 * scene.bodies[0].mesh.n_cells
    taken: dict[str, list[float]] = {"plain": [], "ours": []}
    with tempfile.TemporaryDirectory() as folder:
        for _ in range(rounds):
            for name, job in (("plain", plain), ("ours", ours)):
                start = time.perf_counter()
                job(scene, Path(folder) / f"{name}.gif")
                taken[name].append(time.perf_counter() - start)
        size = (Path(folder) / "ours.gif").stat().st_size / 1e6
    middle = {name: float(np.median(times)) for name, times in taken.items()}
    ratio = middle["ours"] / middle["plain"]
    sys.stdout.write(
        f"{triangles} triangles, {FRAMES} frames: plain {middle['plain']:.1f} s, ours {middle['ours']:.1f} s, "
        f"ratio {ratio:.2f} (target {TARGET}), file {size:.1f} MB\n"
    )
    return int(ratio > TARGET)


if __name__ == "__main__":
    raise SystemExit(main())
