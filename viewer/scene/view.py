"""The parallel camera and how it is fitted. Pixels are at 960 wide, y down from the top left corner."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from viewer.model.arrays import Array
from viewer.scene import tokens
from viewer.scene.motion import swing
from viewer.scene.picture import Body, Picture, View
from viewer.scene.primitives import Box, Frame, sheet_size

WIDE = 3.0                     # a body wider than this on the screen is compared stacked, not left and right
KEY_TOP = 60                   # side by side: the title key's height
BAR_ROOM = 84                  # side by side: room for the colour bar below the body
MARK_ROOM = 0.02               # pegs and beads around the nodes they mark, as a share of the diagonal


@dataclass(frozen=True, eq=False)
class Camera:
    """A parallel camera shared by every viewport.

    focus             (3,) m: the point at the middle of each viewport
    right, up, toward_eye  (3,) orthonormal
    metres_per_pixel  at 960 wide
    """

    focus: Array
    right: Array
    up: Array
    toward_eye: Array
    metres_per_pixel: float

    def project(self, points: Array, box: Box) -> Array:
        """(k, 2) pixels in ``box`` of points (k, 3) in metres."""
        away = np.atleast_2d(points) - self.focus
        x, y = (box[0] + box[2]) / 2, (box[1] + box[3]) / 2
        return np.stack([x + away @ self.right / self.metres_per_pixel, y - away @ self.up / self.metres_per_pixel], 1)


def axes(view: View) -> tuple[Array, Array, Array]:
    """Orthonormal right, up and toward-the-eye of a view; an ``up`` along the line of sight is replaced."""
    eye = np.asarray(view.toward_eye, float)
    eye = eye / np.linalg.norm(eye)
    right = np.cross(np.asarray(view.up, float), eye)
    if np.linalg.norm(right) < 1e-6 * np.linalg.norm(view.up):
        right = np.cross(np.eye(3)[np.argmin(np.abs(eye))], eye)
    right = right / np.linalg.norm(right)
    return right, np.cross(eye, right), eye


def reach(body: Body, right: Array, up: Array) -> Array:
    """(2, 2) lower and upper corner along ``right`` and ``up``, m, of everything drawn of a body over a cycle."""
    mesh = body.mesh
    rows = mesh.used_nodes if len(mesh.used_nodes) else np.arange(mesh.n_nodes)
    extent = []
    for axis in (right, up):
        rest = mesh.points[rows] @ axis
        move = abs(body.factor) * swing(body.shape[rows], axis)
        low, high = [np.min(rest - move)], [np.max(rest + move)]
        room = MARK_ROOM * mesh.diagonal
        for mark in (*body.masses, *body.points):
            at = float(mark.position @ axis)
            swung = abs(body.factor) * float(swing(mark.motion[:3], axis)) + room
            low.append(at - swung)
            high.append(at + swung)
        extent.append((min(low), max(high)))
    return np.array(extent).T


def scene_box(picture: Picture) -> Array:
    """(2, 2) lower and upper corner of all bodies over a cycle, along right and up of the picture's view, m."""
    right, up, _ = axes(picture.view)
    boxes = np.array([reach(body, right, up) for body in picture.bodies])
    return np.array([boxes[:, 0].min(axis=0), boxes[:, 1].max(axis=0)])


def panes(picture: Picture, band_height: float, wide: bool = False) -> tuple[Box, ...]:
    """One viewport for each body: the picture above the note band, split left and right, or stacked when ``wide``."""
    width, height = sheet_size(picture.width, picture.height)
    bottom = height - band_height
    if picture.layout != "side" or len(picture.bodies) < 2:
        return ((0.0, 0.0, width, bottom),) * len(picture.bodies)
    n = len(picture.bodies)
    if wide:
        return tuple((0.0, bottom * k / n, width, bottom * (k + 1) / n) for k in range(n))
    return tuple((width * k / n, 0.0, width * (k + 1) / n, bottom) for k in range(n))


def fit(picture: Picture, band_height: float = tokens.BAND_HEIGHT) -> tuple[Camera, tuple[Box, ...]]:
    """Camera and viewports that hold both extremes of the motion of every body, at one scale.

    Inside each viewport the body keeps clear of margins, of what stands at the top (rulers, colour bar, title
    key) and, above, of the note band (``band_height``).
    """
    right, up, eye = axes(picture.view)
    low, high = scene_box(picture)
    size = np.maximum(high - low, 1e-12 * (np.abs(high) + np.abs(low)) + 1e-30)
    wide = bool(size[0] > WIDE * size[1])
    boxes = panes(picture, band_height, wide)
    top, bottom = float(tokens.TOP), float(tokens.MARGIN)
    if picture.layout == "side" and not wide:
        top = KEY_TOP
        bottom = BAR_ROOM if picture.energy_top is not None else tokens.MARGIN
    x0, y0, x1, y1 = boxes[0]
    room = np.maximum([x1 - x0 - 2 * tokens.MARGIN, y1 - y0 - top - bottom], 1.0)
    scale = float(np.max(size / room))
    middle = (low + high) / 2
    middle[1] += (top - bottom) / 2 * scale            # the body sits in the middle of what is left free
    depth = np.mean([eye @ (b.mesh.points.min(axis=0) + b.mesh.points.max(axis=0)) / 2 for b in picture.bodies])
    focus = middle[0] * right + middle[1] * up + depth * eye
    return Camera(focus, right, up, eye, scale), boxes


def shown_box(picture: Picture, index: int) -> Array:
    """(2, 3) bounding box in m of body ``index`` at both extremes, for clipping planes."""
    body = picture.bodies[index]
    move = abs(body.factor) * np.abs(body.shape)
    return np.array([(body.mesh.points - move).min(axis=0), (body.mesh.points + move).max(axis=0)])


def frame(picture: Picture, camera: Camera, boxes: tuple[Box, ...]) -> Frame:
    """What the sheet over this picture must know about the camera."""
    width, height = sheet_size(picture.width, picture.height)
    return Frame(width, height, boxes, camera.metres_per_pixel, lambda p, k: camera.project(p, boxes[k]))
