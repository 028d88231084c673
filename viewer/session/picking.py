"""Picking a place of the body on the stage, and what is read off there. NumPy alone."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from viewer.insight.scale import direction_word
from viewer.model.arrays import Array
from viewer.model.cycle import cycle_peaks
from viewer.scene.figures import length
from viewer.scene.motion import displacement
from viewer.scene.picture import Body, Picture
from viewer.scene.primitives import Box
from viewer.scene.view import Camera
from viewer.session.project import Project
from viewer.session.state import Picked


def nearest_node(body: Body, camera: Camera, box: Box, phase: float, x: float, y: float) -> int:
    """Row of the node of the foremost triangle under (x, y), sheet pixels, that is nearest to it; −1: nothing there.
    Bodies of lines alone: the nearest node within 12 px."""
    faces = body.drawn.faces
    points = body.mesh.points + displacement(body.shape, body.factor, phase)
    if not len(faces):
        rows = body.drawn.nodes
        away = np.linalg.norm(camera.project(points[rows], box) - (x, y), axis=1)
        return int(rows[np.argmin(away)]) if len(rows) and away.min() <= 12 else -1
    flat = camera.project(points, box) - (x, y)
    a, b, c = (flat[faces[:, k]] for k in range(3))
    cross = lambda u, v: u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0]  # noqa: E731
    one, two, three = cross(a, b), cross(b, c), cross(c, a)
    hit = np.flatnonzero(((one >= 0) & (two >= 0) & (three >= 0)) | ((one <= 0) & (two <= 0) & (three <= 0)))
    if not len(hit):
        return -1
    height = (points[faces[hit]] @ camera.toward_eye).mean(axis=1)
    corners = faces[hit[np.argmax(height)]]
    return int(corners[np.argmin(np.linalg.norm(flat[corners], axis=1))])


@dataclass(frozen=True, eq=False)
class Reading:
    """What is read off at a picked place.

    at      (3,) m at rest; motion (3,) in units of the drawn shape; factor drawn metres per unit of the shape
    lines   words and figures, one statement a line
    """

    title: str
    at: Array
    motion: Array
    factor: float
    lines: tuple[str, ...]

    def place(self, phase: float) -> Array:
        """(3,) m at a phase, as drawn."""
        return self.at + displacement(self.motion, self.factor, phase)


def read_off(project: Project, picture: Picture, design: str, picked: Picked | None) -> Reading | None:
    """The reading at a picked place of the first body of ``picture``; None when there is none."""
    body = next((b for b in picture.bodies if b.name == design), None)
    study = project.study(design)
    if picked is None or body is None or study is None:
        return None
    if picked.name:
        carried = next((c for c in study.carried if c.name == picked.name), None)
        if carried is None:
            return None
        at, motion = carried.position, carried.motion(body.shape)[:3]
        title = picked.name
    else:
        if not 0 <= picked.row < study.design.mesh.n_nodes:
            return None
        at, motion = body.mesh.points[picked.row], body.shape[picked.row]
        title = f"node {study.design.mesh.node_ids[picked.row]}"
        groups = [n for n, rows in study.design.mesh.node_groups.items() if picked.row in rows]
        title += f", {groups[0]}" if groups else ""
    return Reading(title, at, motion, body.factor, _lines(body, picture.magnification, at, motion))


def _lines(body: Body, magnification: float | None, at: Array, motion: Array) -> tuple[str, ...]:
    size = float(cycle_peaks(motion[None])[0])
    largest = float(cycle_peaks(body.shape[body.mesh.used_nodes]).max()) or 1.0
    said = [f"at ({', '.join(_millimetres(c) for c in at)}) mm"]
    real = None if magnification is None else abs(body.factor) * size / magnification
    moved = "real size unknown" if real is None else f"{length(real)} real"
    said.append(f"moves {length(abs(body.factor) * size)} drawn, {moved}")
    said.append(f"{100 * size / largest:.0f} % of the largest, {direction_word(np.real(motion))}")
    parts = []
    for axis, value in zip("xyz", motion, strict=True):
        swing = abs(complex(value)) * abs(body.factor)
        amount = swing if real is None else swing / (magnification or 1.0)
        sign = "−" if np.real(value) < 0 else ""
        turn = np.degrees(np.angle(complex(value))) if np.iscomplexobj(motion) else 0.0
        parts.append(f"{axis} {sign}{length(amount)}" + (f" at {turn:.0f}°" if np.iscomplexobj(motion) else ""))
    said.append(", ".join(parts) + (" drawn" if real is None else " real"))
    return tuple(said)


def _millimetres(metres: float) -> str:
    return f"{1e3 * metres:.1f}".replace("-", "−")
