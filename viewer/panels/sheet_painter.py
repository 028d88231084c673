"""Paints a sheet's primitives with Qt, at any size."""

from __future__ import annotations

from functools import cache

from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QColor, QFont, QFontDatabase, QImage, QPainter, QPen, QPolygonF

from viewer.scene.primitives import Disc, GradientBar, Line, Point, Polygon, Primitive, Ring, Sheet, Text
from viewer.scene.typeface import font_file, text_width


def paint_sheet(painter: QPainter, sheet: Sheet) -> None:
    """Paint in sheet pixels; the painter's transformation makes them the window's."""
    painter.setRenderHint(QPainter.RenderHint.Antialiasing)
    for item in sheet.items:
        _paint(painter, item)


def outline(points: tuple[Point, ...]) -> QPolygonF:
    return QPolygonF([QPointF(x, y) for x, y in points])


def _paint(painter: QPainter, item: Primitive) -> None:
    if isinstance(item, Text):
        _write(painter, item)
    elif isinstance(item, Polygon):
        painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(QColor(item.colour))
        painter.drawConvexPolygon(outline(item.points))
    elif isinstance(item, Line):
        pen = _pen(item.colour, item.width)
        if item.dash:
            pen.setDashPattern([length / item.width for length in item.dash])
        painter.setPen(pen)
        painter.setBrush(Qt.BrushStyle.NoBrush)
        painter.drawPolyline(outline(item.points))
    elif isinstance(item, Disc):
        painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(QColor(item.colour))
        painter.drawEllipse(QPointF(item.x, item.y), item.radius, item.radius)
    elif isinstance(item, Ring):
        painter.setPen(_pen(item.colour, item.width))
        painter.setBrush(Qt.BrushStyle.NoBrush)
        painter.drawEllipse(QPointF(item.x, item.y), item.radius, item.radius)
    elif isinstance(item, GradientBar):
        _bar(painter, item)


def _write(painter: QPainter, item: Text) -> None:
    """In the pictures' own face, which sheets are measured in."""
    font = QFont(_family(item.bold))
    font.setPixelSize(max(round(item.size), 1))
    font.setBold(item.bold)
    font.setHintingPreference(QFont.HintingPreference.PreferNoHinting)
    painter.setFont(font)
    painter.setPen(QColor(item.colour))
    share = {"left": 0.0, "middle": 0.5, "right": 1.0}[item.anchor]
    left = item.x - share * text_width(item.words, item.size, item.bold)
    painter.drawText(QPointF(left, item.y), item.words)


def _bar(painter: QPainter, item: GradientBar) -> None:
    count = len(item.colours)
    pixels = item.colours.astype("uint8").copy()
    image = QImage(pixels.data, count, 1, 3 * count, QImage.Format.Format_RGB888)
    painter.drawImage(QRectF(item.x, item.y, item.width, item.height), image)


def _pen(colour: str, width: float) -> QPen:
    pen = QPen(QColor(colour), width)
    pen.setCapStyle(Qt.PenCapStyle.FlatCap)
    pen.setJoinStyle(Qt.PenJoinStyle.MiterJoin)
    return pen


@cache
def _family(bold: bool) -> str:
    number = QFontDatabase.addApplicationFont(str(font_file(bold)))
    families = QFontDatabase.applicationFontFamilies(number)
    return families[0] if families else QFont().family()
