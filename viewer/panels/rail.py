"""The magnification rail: a logarithmic scale with a handle, real motion beside it."""

from __future__ import annotations

from PySide6.QtCore import QEvent, QPointF, QRectF, Qt, Signal
from PySide6.QtGui import QKeyEvent, QMouseEvent, QPainter, QPaintEvent, QPen
from PySide6.QtWidgets import QWidget

from viewer.panels.theme import KEY, LABEL, MARGIN, RAIL, WARNING, colour, face
from viewer.scene.tokens import THEMES
from viewer.session.rail import Rail

_LEFT, _RIGHT, _LINE = 138.0, 60.0, 45.0
_STEP = 0.02
_KEYS = {Qt.Key.Key_Left: -_STEP, Qt.Key.Key_Right: _STEP}


class RailPanel(QWidget):
    """``moved(at)``: the handle is at 0 … 1 of the rail; ``let_go()``: and stays there."""

    moved = Signal(float)
    let_go = Signal()

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setObjectName("rail")
        self.setFixedHeight(RAIL)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setCursor(Qt.CursorShape.PointingHandCursor)
        self.setToolTip("How much larger than real motion is drawn. T: true scale, D: as drawn by itself.")
        self._rail: Rail | None = None
        self._theme = "light"
        self._held = False
        self.show_rail(None, "light")

    def show_rail(self, rail: Rail | None, theme: str) -> None:
        self._rail, self._theme = rail, theme
        words = "no mode" if rail is None else ", ".join(part for part in (rail.label, rail.hint) if part)
        self.setAccessibleName(f"Magnification: {words}")
        self.update()

    # ---- painting

    def paintEvent(self, event: QPaintEvent) -> None:
        painter = QPainter(self)
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        tokens = THEMES[self._theme]
        painter.fillRect(self.rect(), colour(tokens.background))
        painter.setFont(face(LABEL))
        painter.setPen(colour(tokens.soft))
        painter.drawText(QPointF(MARGIN, _LINE + 5), "magnification")
        if self._rail is not None:
            self._paint_scale(painter, self._rail)
            self._paint_handle(painter, self._rail)
        painter.end()

    def _paint_scale(self, painter: QPainter, rail: Rail) -> None:
        tokens = THEMES[self._theme]
        painter.setPen(QPen(colour(tokens.soft), 2.0))
        painter.drawLine(QPointF(self._x(0), _LINE), QPointF(self._x(1), _LINE))
        painter.setFont(face(KEY))
        for tick in rail.ticks:
            x, half = self._x(tick.at), 6.0 if tick.words else 3.0
            painter.setPen(QPen(colour(tokens.soft), 1.0))
            painter.drawLine(QPointF(x, _LINE - half), QPointF(x, _LINE + half))
            if tick.words:
                painter.drawText(QRectF(x - 60, _LINE + 12, 120, 18), Qt.AlignmentFlag.AlignHCenter, tick.words)
        own = self._x(rail.drawn)  # where it stands by itself
        painter.setPen(QPen(colour(tokens.soft), 1.4))
        painter.drawEllipse(QPointF(own, _LINE), 4.5, 4.5)

    def _paint_handle(self, painter: QPainter, rail: Rail) -> None:
        tokens = THEMES[self._theme]
        x = self._x(rail.at)
        painter.setPen(QPen(colour(tokens.accent), 2.0) if self.hasFocus() else Qt.PenStyle.NoPen)
        painter.setBrush(colour(tokens.ink))
        painter.drawRoundedRect(QRectF(x - 5, _LINE - 12, 10, 24), 5, 5)
        painter.setPen(colour(tokens.ink))
        painter.setFont(face(LABEL, True))
        width = painter.fontMetrics().horizontalAdvance(rail.label)
        left = min(max(x - width + 12, MARGIN), self.width() - MARGIN - width)
        painter.drawText(QPointF(left, _LINE - 18), rail.label)
        if rail.hint:
            self._paint_hint(painter, rail.hint, left - 18, left + width + 18)

    def _paint_hint(self, painter: QPainter, hint: str, before: float, behind: float) -> None:
        """What would make the size known, on that side of the label where there is more room: up to ``before`` it, or
        from ``behind`` it on."""
        right = self.width() - MARGIN
        first = before - MARGIN > right - behind
        room = QRectF(MARGIN, 8, before - MARGIN, 24) if first else QRectF(behind, 8, right - behind, 24)
        painter.setPen(colour(WARNING[self._theme]))
        painter.setFont(face(LABEL))
        words = painter.fontMetrics().elidedText(hint, Qt.TextElideMode.ElideRight, int(room.width()))
        align = Qt.AlignmentFlag.AlignRight if first else Qt.AlignmentFlag.AlignLeft
        painter.drawText(room, align | Qt.AlignmentFlag.AlignVCenter, words)

    def _x(self, at: float) -> float:
        return _LEFT + at * (self.width() - _LEFT - _RIGHT)

    # ---- mouse and keys

    def _go(self, event: QMouseEvent) -> None:
        self.moved.emit((event.position().x() - _LEFT) / (self.width() - _LEFT - _RIGHT))

    def mousePressEvent(self, event: QMouseEvent) -> None:
        self._held = event.button() == Qt.MouseButton.LeftButton
        if self._held:
            self._go(event)

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        if self._held:
            self._go(event)

    def mouseReleaseEvent(self, event: QMouseEvent) -> None:
        if self._held:
            self._held = False
            self.let_go.emit()

    def event(self, event: QEvent) -> bool:
        if event.type() == QEvent.Type.ShortcutOverride and event.key() in _KEYS:  # type: ignore[attr-defined]
            event.accept()  # arrows move the handle while it has the focus, not the gallery
            return True
        return super().event(event)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        step = _KEYS.get(Qt.Key(event.key()))
        if step is None or self._rail is None:
            super().keyPressEvent(event)
            return
        self.moved.emit(self._rail.at + step)
        self.let_go.emit()

    def focusInEvent(self, event) -> None:
        super().focusInEvent(event)
        self.update()

    def focusOutEvent(self, event) -> None:
        super().focusOutEvent(event)
        self.update()
