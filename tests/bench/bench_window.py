"""Playback of 200 000 triangles on the window's canvas against bare rendering of the same scene standing still.

Run under a screen, or a virtual one: ``xvfb-run -a python -m tests.bench.bench_window [triangles]``. In one run, by
turns, on one canvas of 1060 × 604 logical pixels:

bare     the scene as it stands, rendered again and read back, nothing moved
live     every frame of a cycle moved, its normals and contour found, rendered and painted; no frame is kept
kept     frames of a second cycle, which are kept from the first
turning  the eye turned before every frame: the ghost and the labels are found anew as well

Exit code 1 when live playback falls below 0.6 of the frames of bare rendering.
"""

from __future__ import annotations

import sys
import time

import numpy as np
from PySide6.QtWidgets import QApplication

from tests.bench.bench_large_scene import model
from viewer.export.frames import phase_of
from viewer.panels.canvas import Canvas
from viewer.scene.palette import energy_top
from viewer.scene.picture import Note, Picture
from viewer.scene.surface import drawn_areas
from viewer.stage.windows import pixels

LEAST = 0.6
ROUNDS, FRAMES = 5, 6


def main(triangles: int = 200_000) -> int:
    """Print frames per second and their ratios."""
    app = QApplication.instance() or QApplication([])
    body = model(round((triangles / 12) ** 0.5))
    top = energy_top([body.density], [drawn_areas(body.mesh)])
    canvas = Canvas()
    canvas.resize(1060, 604)
    canvas.show()
    app.processEvents()
    picture = Picture((body,), Note("Mode 1", "10 Hz", ("size arbitrary",)), energy_top=top)
    width, height = canvas.real_size
    canvas.show_picture(picture.with_(width=width, height=height), keep_camera=False)
    canvas.draw(0.0)
    window = canvas._stage.plotter.render_window
    taken: dict[str, list[float]] = {name: [] for name in ("bare", "live", "kept", "turning")}

    def each(name, job) -> None:
        for frame in range(FRAMES):
            start = time.perf_counter()
            job(frame)
            app.processEvents()
            taken[name].append(time.perf_counter() - start)

    for frame in range(FRAMES):
        canvas.draw(phase_of(frame), 100 + frame)
    for _ in range(ROUNDS):
        each("bare", lambda frame: pixels(window))
        each("live", lambda frame: canvas.draw(phase_of(frame)))
        each("kept", lambda frame: canvas.draw(phase_of(frame), 100 + frame))
    for _ in range(2):
        each("turning", lambda frame: canvas.turn(0.02, 0.0))
    canvas.release()
    faces = len(body.mesh.skin.faces)
    bare = float(np.median(taken["bare"]))
    print(f"{faces} triangles, {width} × {height}, {'by the processor' if 'llvmpipe' in _renderer(window) else ''}")
    for name, times in taken.items():
        middle = float(np.median(times))
        print(f"{name:8} {1e3 * middle:7.1f} ms a frame  {1 / middle:6.1f} frames/s  ratio {bare / middle:.2f}")
    live, kept = (float(np.median(taken[name])) for name in ("live", "kept"))
    cycle = (21 * live + 19 * kept) / 40  # 21 drawings make 40 frames; then all are kept
    print(f"first cycle of a standing mode: {1 / cycle:.1f} frames/s, ratio {bare / cycle:.2f}")
    return int(bare / live < LEAST)


def _renderer(window) -> str:
    return str(window.ReportCapabilities())


if __name__ == "__main__":
    raise SystemExit(main(*map(int, sys.argv[1:])))
