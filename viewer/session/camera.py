"""How the eye moves: pure functions from camera to camera."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from viewer.model.arrays import Array
from viewer.scene.picture import View
from viewer.scene.primitives import Box
from viewer.scene.view import Camera

TURN = np.radians(0.4)  # for each pixel
STEP = np.radians(10.0)  # for each press of a key
_Z = np.array([0.0, 0.0, 1.0])


def orbit(camera: Camera, across: float, down: float, centre: Array) -> Camera:
    """Turn about the upright line through ``centre`` (3,) and about the camera's own horizontal, by angles in rad;
    the part that would stand the body on its head is left out."""
    turned = _turned(camera, _rotation(_Z, -across), centre)
    tipped = _turned(turned, _rotation(turned.right, -down), centre)
    return turned if tipped.up @ _Z < min(turned.up @ _Z, 0.0) - 1e-12 else tipped


def pan(camera: Camera, right: float, down: float) -> Camera:
    """Move the body by pixels at 960 wide."""
    moved = camera.metres_per_pixel * (down * camera.up - right * camera.right)
    return replace(camera, focus=camera.focus + moved)


def zoom(camera: Camera, factor: float, x: float, y: float, box: Box) -> Camera:
    """Enlarge by ``factor``; what is under (x, y) stays there."""
    away = np.array([x - (box[0] + box[2]) / 2, y - (box[1] + box[3]) / 2]) * camera.metres_per_pixel
    kept = (1 - 1 / factor) * (away[0] * camera.right - away[1] * camera.up)
    return replace(camera, metres_per_pixel=camera.metres_per_pixel / factor, focus=camera.focus + kept)


def view_of(camera: Camera) -> View:
    """Where the eye stands, as a picture has it."""
    eye, up = camera.toward_eye, camera.up
    return View((float(eye[0]), float(eye[1]), float(eye[2])), (float(up[0]), float(up[1]), float(up[2])))


def _turned(camera: Camera, rotation: Array, centre: Array) -> Camera:
    return replace(
        camera,
        focus=centre + rotation @ (camera.focus - centre),
        right=rotation @ camera.right,
        up=rotation @ camera.up,
        toward_eye=rotation @ camera.toward_eye,
    )


def _rotation(axis: Array, angle: float) -> Array:
    """(3, 3) by Rodrigues' formula, from memory."""
    x, y, z = axis
    cross = np.array([[0, -z, y], [z, 0, -x], [-y, x, 0]])
    return np.eye(3) + np.sin(angle) * cross + (1 - np.cos(angle)) * cross @ cross
