"""The canvas: a pyvista plotter off the screen whose picture is painted into the window, and the mouse on it.

Off the screen, since a window of VTK's own inside one of Qt's does not follow scaled displays, is not to be had on
every window system, shows half the frames where the processor draws (measured), and is fragile in closing.
"""

from __future__ import annotations

from typing import Any, cast

import numpy as np
import pyvista as pv
from PySide6.QtCore import QPointF, Qt, QTimer, Signal
from PySide6.QtGui import QImage, QMouseEvent, QPainter, QPaintEvent, QPen, QPolygonF, QResizeEvent, QWheelEvent
from PySide6.QtWidgets import QWidget

from viewer.model.arrays import Array
from viewer.panels.theme import KEY, colour, face
from viewer.panels.turning import Turning
from viewer.scene.picture import Picture
from viewer.scene.tokens import BASE_WIDTH, THEMES
from viewer.session.camera import view_of
from viewer.session.picking import Reading, nearest_node
from viewer.stage import Stage
from viewer.stage.stage import SUPERSAMPLE, reduce
from viewer.stage.windows import off_screen, pixels

ROOM = 256 * 2**20  # bytes that drawn frames may take
_SETTLE = 120  # ms after the last change of size


class Canvas(QWidget):
    """Shows a picture at a phase; frames that were drawn once are kept until picture, camera or size change.

    settled()           the size has changed and stays
    picked(row, body)   a node row of the body of that name was clicked, −1: beside the body
    turned(view)        the eye went elsewhere
    """

    settled = Signal()
    picked = Signal(int, str)
    turned = Signal(object)
    fit_wished = Signal()

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setObjectName("stage")
        self.setAccessibleName("Stage")
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setMinimumSize(320, 240)
        self._stage: Stage | None = None
        self._plotter: pv.Plotter | None = None
        self._image: QImage | None = None
        self._frames: dict[int, QImage] = {}
        self._phase = 0.0
        self._reading: Reading | None = None
        self._theme = "light"
        self._turning = Turning()
        self._settling = QTimer(self, singleShot=True, interval=_SETTLE)
        self._settling.timeout.connect(self.settled)

    # ---- what is shown

    @property
    def real_size(self) -> tuple[int, int]:
        """Width and height in real pixels of the display."""
        ratio = self.devicePixelRatioF()
        return max(round(self.width() * ratio), 64), max(round(self.height() * ratio), 64)

    @property
    def picture(self) -> Picture | None:
        return None if self._stage is None else self._stage.picture

    @property
    def image(self) -> QImage | None:
        """What is painted now."""
        return self._image

    def show_picture(self, picture: Picture, *, keep_camera: bool) -> None:
        """Put a picture on the stage; points move without anything being rebuilt until the next one."""
        self._frames.clear()
        self._theme = picture.theme
        size = SUPERSAMPLE * picture.width, SUPERSAMPLE * picture.height
        if self._stage is None or self._plotter is None:
            self._plotter = off_screen(*size)
            self._stage = Stage(picture, self._plotter)
        else:
            self._plotter.window_size = list(size)
            self._stage.show(picture, keep_camera=keep_camera)

    def clear(self) -> None:
        """An empty stage."""
        self._release()
        self._image, self._reading = None, None
        self.update()

    def set_theme(self, theme: str) -> None:
        self._theme = theme
        self.update()

    def set_reading(self, reading: Reading | None) -> None:
        """Mark a picked place."""
        self._reading = reading
        self.update()

    def draw(self, phase: float, frame: int | None = None) -> None:
        """Show a phase; ``frame`` names it, so that it needs drawing once."""
        if self._stage is None:
            return
        self._phase = phase
        kept = None if frame is None else self._frames.get(frame)
        if kept is None:
            self._stage.draw(phase)
            kept = _as_image(reduce(pixels(cast(Any, self._plotter).render_window)))
            if frame is not None and kept.sizeInBytes() * (len(self._frames) + 1) <= ROOM:
                self._frames[frame] = kept
        self._image = kept
        self.update()

    def release(self) -> None:
        """Give up the plotter, before the window closes."""
        self._settling.stop()
        self._release()
        self._image = None

    def _release(self) -> None:
        self._frames.clear()
        if self._stage is not None and self._plotter is not None:
            self._stage.close()
            self._plotter.close()
        self._stage = self._plotter = None

    # ---- painting

    def paintEvent(self, event: QPaintEvent) -> None:
        painter = QPainter(self)
        painter.fillRect(self.rect(), colour(THEMES[self._theme].background))
        if self._image is not None:
            painter.drawImage(self.rect(), self._image)
            self._paint_reading(painter)
        painter.end()

    def _paint_reading(self, painter: QPainter) -> None:
        if self._reading is None or self._stage is None:
            return
        tokens = THEMES[self._theme]
        ratio = self.width() / BASE_WIDTH
        at, rest = (
            QPointF(*(ratio * self._stage.camera().project(place[None], self._stage.boxes[0])[0]))
            for place in (self._reading.place(self._phase), self._reading.at)
        )
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        for shade, width in ((tokens.halo, 5.0), (tokens.accent, 2.2)):
            painter.setPen(QPen(colour(shade), width))
            painter.drawPolyline(QPolygonF([rest, at]))
            painter.setBrush(Qt.BrushStyle.NoBrush)
            painter.drawEllipse(at, 6.0, 6.0)
        self._paint_words(painter, at)

    def _paint_words(self, painter: QPainter, at: QPointF) -> None:
        assert self._reading is not None
        tokens = THEMES[self._theme]
        lines = [self._reading.title, *self._reading.lines]
        painter.setFont(face(KEY + 1))
        metrics = painter.fontMetrics()
        width = max(metrics.horizontalAdvance(line) for line in lines) + 20
        step = metrics.height() + 1
        height = step * len(lines) + 14
        left = at.x() + 16 if at.x() + 16 + width < self.width() else at.x() - 16 - width
        top = min(max(at.y() - height / 2, 6.0), self.height() - height - 6.0)
        painter.setPen(QPen(colour(tokens.rule), 1.0))
        painter.setBrush(colour(tokens.background))
        painter.drawRoundedRect(round(left), round(top), width, height, 6, 6)
        for row, line in enumerate(lines):
            painter.setFont(face(KEY + 1, row == 0))
            painter.setPen(colour(tokens.accent if row == 0 else tokens.ink))
            painter.drawText(QPointF(left + 10, top + 7 + step * row + metrics.ascent()), line)

    def resizeEvent(self, event: QResizeEvent) -> None:
        super().resizeEvent(event)
        self._settling.start()

    # ---- the mouse

    def mousePressEvent(self, event: QMouseEvent) -> None:
        self.setFocus(Qt.FocusReason.MouseFocusReason)
        self._turning.press(event)

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        if self._stage is None:
            return
        camera = self._turning.drag(event, self._stage.camera(), self._stage.reach, BASE_WIDTH / self.width())
        if camera is not None:
            self._go(camera)

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        if self._stage is None:
            return
        if self._turning.release(event):
            self.turned.emit(view_of(self._stage.camera()))
        elif event.button() == Qt.MouseButton.LeftButton:
            self._pick(event.position())

    def mouseDoubleClickEvent(self, event: QMouseEvent) -> None:
        self.fit_wished.emit()

    def wheelEvent(self, event: QWheelEvent) -> None:
        if self._stage is None or not event.angleDelta().y():
            return
        at = self._on_sheet(event.position())
        self.zoom(1.0015 ** event.angleDelta().y(), at)
        event.accept()

    def zoom(self, factor: float, at: QPointF | None = None) -> None:
        """Enlarge about a place in sheet pixels, the middle of the first viewport by default."""
        if self._stage is None:
            return
        box = self._stage.boxes[self._pane(at)]
        place = at or QPointF((box[0] + box[2]) / 2, (box[1] + box[3]) / 2)
        self._go(self._turning.zoomed(self._stage.camera(), factor, place.x(), place.y(), box))
        self.turned.emit(view_of(self._stage.camera()))

    def turn(self, across: float, down: float) -> None:
        """Turn by angles in rad, from the keyboard."""
        if self._stage is None:
            return
        self._go(self._turning.turned(self._stage.camera(), self._stage.reach, across, down))
        self.turned.emit(view_of(self._stage.camera()))

    def _go(self, camera) -> None:
        assert self._stage is not None
        self._stage.aim(camera)
        self._frames.clear()
        self.draw(self._phase)

    def _on_sheet(self, position: QPointF) -> QPointF:
        """Sheet pixels of a place in logical ones."""
        return position * (BASE_WIDTH / self.width())

    def _pane(self, at: QPointF | None) -> int:
        """The viewport that holds a place in sheet pixels."""
        if at is None or self._stage is None:
            return 0
        for number, (left, top, right, bottom) in enumerate(self._stage.boxes):
            if left <= at.x() < right and top <= at.y() < bottom:
                return number
        return 0

    def _pick(self, position: QPointF) -> None:
        assert self._stage is not None
        at = self._on_sheet(position)
        pane = self._pane(at)
        body = self._stage.picture.bodies[pane]
        box = self._stage.boxes[pane]
        row = nearest_node(body, self._stage.camera(), box, self._phase, at.x(), at.y()) if at.y() < box[3] else -1
        self.picked.emit(row, body.name)


def _as_image(image: Array) -> QImage:
    height, width, _ = image.shape
    packed = np.full((height, width, 4), 255, np.uint8)
    packed[:, :, :3] = image[:, :, ::-1]
    return QImage(packed.data, width, height, 4 * width, QImage.Format.Format_RGB32).copy()
