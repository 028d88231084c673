"""The parallel camera and how it is fitted. Pixels are at 960 wide, y down from the top left corner."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from viewer.model.arrays import Array
from viewer.scene import colour_bar, tokens
from viewer.scene.marks import mark_pieces
from viewer.scene.motion import swing
from viewer.scene.picture import Picture, View
from viewer.scene.primitives import Box, Frame, sheet_size
from viewer.scene.title_keys import key_room_of_test

Drawn = list[tuple[Array, Array]]  # points and drawn amplitudes, both (n, 3) m

WIDE = 3.0  # a body wider than this on the screen is compared stacked, not left and right
KEY_TOP = 60  # left and right: the title key's height
LEAST_BODY = 130  # side by side: least height kept for a body and its labels
LOWEST, TALLEST = 384, 720  # side by side: the picture's height


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

    def same_as(self, other: Camera) -> bool:
        """Whether pictures from both look the same, rounding apart."""
        near = 1e-6 * self.metres_per_pixel
        return (
            abs(self.metres_per_pixel - other.metres_per_pixel) < near
            and bool(np.allclose([self.right, self.up], [other.right, other.up], rtol=0, atol=1e-9))
            and bool(np.allclose(self.focus, other.focus, rtol=1e-12, atol=near))
        )

    def project(self, points: Array, box: Box) -> Array:
        """(k, 2) pixels in ``box`` of points (k, 3) in metres."""
        away = np.atleast_2d(points) - self.focus
        middle = np.array([box[0] + box[2], box[1] + box[3]]) / 2
        return middle + away @ np.stack([self.right, -self.up], axis=1) / self.metres_per_pixel


def axes(view: View) -> tuple[Array, Array, Array]:
    """Orthonormal right, up and toward-the-eye of a view; an ``up`` along the line of sight is replaced."""
    eye = np.asarray(view.toward_eye, float)
    eye = eye / np.linalg.norm(eye)
    right = np.cross(np.asarray(view.up, float), eye)
    if np.linalg.norm(right) < 1e-6 * np.linalg.norm(view.up):
        right = np.cross(np.eye(3)[np.argmin(np.abs(eye))], eye)
    right = right / np.linalg.norm(right)
    return right, np.cross(eye, right), eye


def scene_box(picture: Picture) -> Array:
    """(2, 2) lower and upper corner, along right and up of the picture's view in m, of everything drawn of all
    bodies and their marks over a cycle: exact, since each node's largest motion along an axis is."""
    return _screen_box(_drawn(picture), picture.view)


def shown_box(picture: Picture) -> Array:
    """(2, 3) bounding box in m of everything drawn over a cycle, for clipping planes."""
    return _space_box(_drawn(picture))


def _screen_box(drawn: Drawn, view: View) -> Array:
    right, up, _ = axes(view)
    low, high = np.full(2, np.inf), np.full(2, -np.inf)
    for points, move in drawn:
        for k, axis in enumerate((right, up)):
            rest, reach = points @ axis, swing(move, axis)
            low[k] = min(low[k], np.min(rest - reach))
            high[k] = max(high[k], np.max(rest + reach))
    return np.array([low, high])


def _space_box(drawn: Drawn) -> Array:
    low = np.min([np.min(points - np.abs(move), axis=0) for points, move in drawn], axis=0)
    return np.array([low, np.max([np.max(points + np.abs(move), axis=0) for points, move in drawn], axis=0)])


def _drawn(picture: Picture) -> Drawn:
    """(points (n, 3), drawn amplitude (n, 3)), m, of bodies and marks."""
    found = [(piece.points, piece.move) for pieces in mark_pieces(picture) for piece in pieces]
    for body in picture.bodies:
        rows = body.drawn.nodes
        if len(rows):
            found.append((body.mesh.points[rows], body.factor * body.shape[rows]))
    return found or [(np.zeros((1, 3)), np.zeros((1, 3)))]


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


def fit(
    picture: Picture, band_height: float = tokens.BAND_HEIGHT, *, bare: bool = False
) -> tuple[Camera, tuple[Box, ...]]:
    """Camera and viewports that hold both extremes of the motion of every body, at one scale.

    Inside each viewport the body keeps clear of margins, of what stands at the top (rulers, colour bar, title
    key) and, above, of the note band (``band_height``); ``bare``: of margins alone.
    """
    right, up, eye = axes(picture.view)
    drawn = _drawn(picture)
    low, high = _screen_box(drawn, picture.view)
    size, wide = _extent(low, high)
    boxes = panes(picture, band_height, wide)
    top, bottom = (float(tokens.MARGIN),) * 2 if bare else _furniture(picture, wide)
    x0, y0, x1, y1 = boxes[0]
    room = np.maximum([x1 - x0 - 2 * tokens.MARGIN, y1 - y0 - top - bottom], 1.0)
    scale = float(np.max(size / room))
    middle = (low + high) / 2
    middle[1] += (top - bottom) / 2 * scale  # the body sits in the middle of what is left free
    depth = float(eye @ _space_box(drawn).mean(axis=0))
    focus = middle[0] * right + middle[1] * up + depth * eye
    return Camera(focus, right, up, eye, scale), boxes


def side_height(picture: Picture, band_height: float) -> int:
    """Height in sheet pixels, a multiple of 16, at which bodies side by side fill their viewports."""
    low, high = scene_box(picture)
    size, wide = _extent(low, high)
    boxes = panes(picture, band_height, wide)
    drawn = (boxes[0][2] - boxes[0][0] - 2 * tokens.MARGIN) * size[1] / size[0]
    one = sum(_furniture(picture, wide)) + max(drawn, LEAST_BODY)
    height = one * (len(boxes) if wide else 1) + band_height
    return int(np.clip(16 * np.ceil(height / 16), LOWEST, TALLEST))


def _extent(low: Array, high: Array) -> tuple[Array, bool]:
    """Width and height (2,) of a box on the screen, m, never zero; and whether bodies so wide are stacked."""
    size = np.maximum(high - low, 1e-12 * (np.abs(high) + np.abs(low)) + 1e-30)
    return size, bool(size[0] > WIDE * size[1])


def _furniture(picture: Picture, wide: bool) -> tuple[float, float]:
    """Sheet pixels in a viewport that rulers, keys and the colour bar take above and below the body."""
    caution = colour_bar.caution_room(picture)
    if picture.layout == "side" and not wide:
        return float(KEY_TOP), float(tokens.MARGIN) if picture.energy_top is None else colour_bar.ROOM + caution
    return tokens.TOP + max(caution, key_room_of_test(picture)), float(tokens.MARGIN)


def frame(picture: Picture, camera: Camera, boxes: tuple[Box, ...]) -> Frame:
    """What the sheet over this picture must know about the camera."""
    width, height = sheet_size(picture.width, picture.height)
    project = lambda p, k: camera.project(p, boxes[k])  # noqa: E731
    return Frame(width, height, boxes, camera.metres_per_pixel, project, camera.toward_eye)
