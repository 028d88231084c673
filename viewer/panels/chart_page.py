"""A chart in the place of the stage: pairing picture, ladder, lineages; click or key puts a spot onto the stage."""

from __future__ import annotations

from PySide6.QtCore import QEvent, QPointF, QRectF, QSize, Qt, Signal
from PySide6.QtGui import QColor, QKeyEvent, QMouseEvent, QPainter, QPaintEvent, QPen, QTransform
from PySide6.QtWidgets import QWidget

from viewer.panels.sheet_painter import outline, paint_sheet
from viewer.panels.theme import SENTENCE, face
from viewer.scene.primitives import Sheet
from viewer.scene.tokens import THEMES
from viewer.session.charts import next_spot, spot_at

_STEPS = {
    Qt.Key.Key_Left: (-1.0, 0.0),
    Qt.Key.Key_Right: (1.0, 0.0),
    Qt.Key.Key_Up: (0.0, -1.0),
    Qt.Key.Key_Down: (0.0, 1.0),
}
_TAKE = (Qt.Key.Key_Return, Qt.Key.Key_Enter)


class ChartPage(QWidget):
    """``taken(spot)``: put what this spot stands for on the stage."""

    taken = Signal(object)

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setObjectName("chart")
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setMouseTracking(True)
        self._sheet: Sheet | None = None
        self._words, self._theme = "", "light"
        self._shown, self.spot = -1, -1

    @property
    def sheet(self) -> Sheet | None:
        return self._sheet

    def show_chart(self, chart: Sheet | str, shown: int, theme: str) -> None:
        """Show a sheet with the spot ``shown`` marked as being on the stage, or words in its place."""
        self._theme = theme
        new = chart if isinstance(chart, Sheet) else None
        if (self._sheet is None) != (new is None) or shown != self._shown:
            self.spot = shown
        self._sheet, self._words, self._shown = new, "" if new is not None else str(chart), shown
        if new is None or self.spot >= len(new.spots):
            self.spot = -1
        self.setAccessibleName("Chart" if new is not None else self._words)
        self._tell()

    def place_of(self, spot: int) -> QPointF:
        """The middle of a spot in the widget's pixels."""
        assert self._sheet is not None
        left, top, right, foot = self._sheet.spots[spot].box
        return self._transform().map(QPointF((left + right) / 2, (top + foot) / 2))

    def sizeHint(self) -> QSize:
        return QSize(960, 720)

    def paintEvent(self, event: QPaintEvent) -> None:
        tokens = THEMES[self._theme]
        with QPainter(self) as painter:
            painter.fillRect(self.rect(), QColor(tokens.background))
            if self._sheet is None:
                painter.setFont(face(SENTENCE))
                painter.setPen(QColor(tokens.soft))
                room = QRectF(self.rect()).adjusted(60, 40, -60, -40)
                flags = Qt.AlignmentFlag.AlignCenter | Qt.TextFlag.TextWordWrap
                painter.drawText(room, int(flags), self._words)
                return
            painter.setTransform(self._transform())
            paint_sheet(painter, self._sheet)
            painter.setBrush(Qt.BrushStyle.NoBrush)
            for spot, colour, width in ((self._shown, tokens.accent, 2.0), (self.spot, tokens.ink, 3.0)):
                if spot >= 0 and (spot != self._shown or colour == tokens.accent or self.hasFocus()):
                    painter.setPen(QPen(QColor(colour), width))
                    painter.drawPolygon(outline(self._sheet.spots[spot].outline))

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        spot = self._spot_under(event)
        self.setCursor(Qt.CursorShape.PointingHandCursor if spot >= 0 else Qt.CursorShape.ArrowCursor)
        self.setToolTip(self._sheet.spots[spot].words if self._sheet is not None and spot >= 0 else "")

    def mousePressEvent(self, event: QMouseEvent) -> None:
        spot = self._spot_under(event)
        if self._sheet is not None and spot >= 0:
            self.taken.emit(self._sheet.spots[spot])

    def event(self, event: QEvent) -> bool:
        # the window's own keys for the next and the previous mode stand back while a chart has the keyboard
        if event.type() == QEvent.Type.ShortcutOverride and isinstance(event, QKeyEvent):
            plain = event.modifiers() in (Qt.KeyboardModifier.NoModifier, Qt.KeyboardModifier.KeypadModifier)
            if plain and (event.key() in _STEPS or event.key() in _TAKE):
                event.accept()
                return True
        return super().event(event)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        key = Qt.Key(event.key())
        if self._sheet is not None and key in _STEPS:
            self.spot = next_spot(self._sheet, self.spot, _STEPS[key])
            self._tell()
        elif self._sheet is not None and key in _TAKE and self.spot >= 0:
            self.taken.emit(self._sheet.spots[self.spot])
        else:
            super().keyPressEvent(event)

    def focusInEvent(self, event) -> None:
        super().focusInEvent(event)
        self.update()

    def _tell(self) -> None:
        words = self._sheet.spots[self.spot].words if self._sheet is not None and self.spot >= 0 else ""
        self.setAccessibleDescription(words)
        self.update()

    def _spot_under(self, event: QMouseEvent) -> int:
        if self._sheet is None:
            return -1
        back, good = self._transform().inverted()
        point = back.map(event.position())
        return spot_at(self._sheet, (point.x(), point.y())) if good else -1

    def _transform(self) -> QTransform:
        """Sheet pixels to the widget's: as large as fits, in the middle."""
        assert self._sheet is not None
        scale = min(self.width() / self._sheet.width, self.height() / self._sheet.height)
        left = (self.width() - scale * self._sheet.width) / 2
        top = (self.height() - scale * self._sheet.height) / 2
        return QTransform(scale, 0.0, 0.0, scale, left, top)
