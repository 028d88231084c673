"""The mouse on the stage: dragging turns, with Shift or the middle button it moves, the wheel enlarges."""

from __future__ import annotations

from PySide6.QtCore import QPointF, Qt
from PySide6.QtGui import QMouseEvent

from viewer.model.arrays import Array
from viewer.scene.primitives import Box
from viewer.scene.view import Camera
from viewer.session.camera import TURN, orbit, pan, zoom

_STILL = 4.0  # logical px: a press that moves less is a click


class Turning:
    """What is being dragged."""

    def __init__(self) -> None:
        self._from: QPointF | None = None
        self._last = QPointF()
        self._moves = self._dragged = False

    def press(self, event: QMouseEvent) -> None:
        middle = event.button() == Qt.MouseButton.MiddleButton
        self._from = self._last = event.position()
        self._moves = middle or bool(event.modifiers() & Qt.KeyboardModifier.ShiftModifier)
        self._dragged = False

    def drag(self, event: QMouseEvent, camera: Camera, reach: Array, sheet: float) -> Camera | None:
        """The camera after this step; None when nothing is dragged. ``reach``: see
        :meth:`turned`; ``sheet``: sheet pixels a logical pixel."""
        if self._from is None:
            return None
        if not self._dragged and (event.position() - self._from).manhattanLength() < _STILL:
            return None
        self._dragged = True
        step = event.position() - self._last
        self._last = event.position()
        if self._moves:
            return pan(camera, sheet * step.x(), sheet * step.y())
        return self.turned(camera, reach, TURN * step.x(), TURN * step.y())

    def release(self, event: QMouseEvent) -> bool:
        """Whether the press was a drag."""
        dragged, self._from, self._dragged = self._dragged, None, False
        return dragged

    def turned(self, camera: Camera, reach: Array, across: float, down: float) -> Camera:
        """``reach`` (2, 3) m: the box about whose middle it turns."""
        return orbit(camera, across, -down, reach.mean(axis=0))

    def zoomed(self, camera: Camera, factor: float, x: float, y: float, box: Box) -> Camera:
        return zoom(camera, factor, x, y, box)
