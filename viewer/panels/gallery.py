"""The gallery: a row of small moving pictures, one a mode."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from PySide6.QtCore import (
    QAbstractListModel,
    QModelIndex,
    QPersistentModelIndex,
    QRect,
    QSize,
    Qt,
    QTimer,
    Signal,
)
from PySide6.QtGui import QImage, QPainter
from PySide6.QtWidgets import QListView, QStyle, QStyledItemDelegate, QStyleOptionViewItem, QWidget

from viewer.panels.theme import GALLERY, KEY, LABEL, TINT, colour, face
from viewer.scene.tokens import THEMES
from viewer.session.gallery import Item

CARD = QSize(174, GALLERY - 14)
PICTURE = QSize(158, 100)  # logical pixels
_PERIOD = 1600  # ms, of one cycle
_Index = QModelIndex | QPersistentModelIndex


class GalleryModel(QAbstractListModel):
    """The items, and the frames of those whose small picture is there. ``renamed(mode, name)``: by the user."""

    renamed = Signal(int, str)

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.items: tuple[Item, ...] = ()
        self.frames: dict[int, list[QImage]] = {}

    def rowCount(self, parent: _Index = QModelIndex()) -> int:
        return 0 if parent.isValid() else len(self.items)

    def data(self, index: _Index, role: int = Qt.ItemDataRole.DisplayRole):
        if not index.isValid() or index.row() >= len(self.items):
            return None
        item = self.items[index.row()]
        if role == Qt.ItemDataRole.EditRole:
            return item.name
        if role == Qt.ItemDataRole.DisplayRole:
            return f"{item.mode}  {item.name}"
        if role in (Qt.ItemDataRole.ToolTipRole, Qt.ItemDataRole.AccessibleTextRole):
            return f"Mode {item.mode}: {item.name or 'no name'}, {item.frequency}"
        return None

    def setData(self, index: _Index, value, role: int = Qt.ItemDataRole.EditRole) -> bool:
        if role != Qt.ItemDataRole.EditRole or not index.isValid():
            return False
        item = self.items[index.row()]
        if str(value).strip() != item.name:
            self.renamed.emit(item.mode, str(value))
        return True

    def flags(self, index: _Index) -> Qt.ItemFlag:
        flag = Qt.ItemFlag
        return flag.ItemIsEnabled | flag.ItemIsSelectable | flag.ItemIsEditable

    def show_items(self, items: tuple[Item, ...]) -> None:
        if items == self.items:
            return
        same = [i.mode for i in items] == [i.mode for i in self.items]
        if same:
            self.items = items
            self.dataChanged.emit(self.index(0), self.index(len(items) - 1))
            return
        self.beginResetModel()
        self.items = items
        self.endResetModel()

    def row_of(self, mode: int) -> int:
        return next((row for row, item in enumerate(self.items) if item.mode == mode), -1)


class _Card(QStyledItemDelegate):
    """Paints one item; edits its name in place."""

    def __init__(self, view: GalleryPanel) -> None:
        super().__init__(view)
        self._view = view

    def sizeHint(self, option: QStyleOptionViewItem, index: _Index) -> QSize:
        return CARD

    def paint(self, painter: QPainter, option: QStyleOptionViewItem, index: _Index) -> None:
        view, box = self._view, option.rect.adjusted(4, 4, -4, -2)
        tokens, item = THEMES[view.theme], view.items.items[index.row()]
        chosen = bool(option.state & QStyle.StateFlag.State_Selected)
        painter.save()
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        painter.setPen(Qt.PenStyle.NoPen)
        if chosen:
            painter.setBrush(colour(TINT[view.theme]))
            painter.drawRoundedRect(box, 6, 6)
            painter.fillRect(QRect(box.left(), box.top(), box.width(), 4), colour(tokens.accent))
        frames = view.items.frames.get(item.mode)
        if frames:
            place = QRect(box.center().x() - PICTURE.width() // 2, box.top() + 6, PICTURE.width(), PICTURE.height())
            painter.drawImage(place, frames[view.frame % len(frames)])
        painter.setFont(face(LABEL, chosen))
        painter.setPen(colour(tokens.ink))
        room = box.adjusted(8, 0, -6, 0)
        words = painter.fontMetrics().elidedText(
            f"{item.mode}  {item.name}", Qt.TextElideMode.ElideRight, room.width()
        )
        painter.drawText(room.left(), box.bottom() - 24, words)
        painter.setFont(face(KEY + 1))
        painter.setPen(colour(tokens.soft))
        painter.drawText(room.left(), box.bottom() - 7, item.frequency)
        painter.restore()

    def updateEditorGeometry(self, editor: QWidget, option: QStyleOptionViewItem, index: _Index) -> None:
        box = option.rect.adjusted(6, 0, -6, 0)
        editor.setGeometry(box.left(), box.bottom() - 46, box.width(), 26)
        editor.setAccessibleName("Name of the mode")


class GalleryPanel(QListView):
    """``chosen(mode)`` by mouse or key; ``renamed(mode, name)``."""

    chosen = Signal(int)
    renamed = Signal(int, str)

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setObjectName("gallery")
        self.setAccessibleName("Gallery of modes")
        self.theme, self.frame = "light", 0
        self.items = GalleryModel(self)
        self.setModel(self.items)
        self.setItemDelegate(_Card(self))
        self.setFlow(QListView.Flow.LeftToRight)
        self.setWrapping(False)
        self.setUniformItemSizes(True)
        self.setFixedHeight(GALLERY)
        self.setHorizontalScrollMode(QListView.ScrollMode.ScrollPerPixel)
        self.setVerticalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.setEditTriggers(QListView.EditTrigger.EditKeyPressed | QListView.EditTrigger.DoubleClicked)
        self.setSelectionMode(QListView.SelectionMode.SingleSelection)
        self.items.renamed.connect(self.renamed)
        self._clock = QTimer(self, interval=_PERIOD // 20)
        self._clock.timeout.connect(self._step)

    def show_items(self, items: tuple[Item, ...], mode: int, theme: str) -> None:
        """Show these modes, ``mode`` chosen."""
        self.theme = theme
        self.items.show_items(items)
        row = self.items.row_of(mode)
        if row != self.currentIndex().row():
            index = self.items.index(row) if row >= 0 else QModelIndex()
            self.setCurrentIndex(index)
            if row >= 0:
                self.scrollTo(index)
        self.viewport().update()

    def currentChanged(self, current: _Index, previous: _Index) -> None:
        super().currentChanged(current, previous)
        if current.isValid() and current.row() < len(self.items.items):
            self.chosen.emit(self.items.items[current.row()].mode)

    def set_frames(self, mode: int, path: Path) -> None:
        """The small picture of a mode is ready: (frames, h, w, 4) uint8 in a file."""
        found = np.load(path)
        _, height, width, _ = found.shape
        self.items.frames[mode] = [
            QImage(np.ascontiguousarray(f).data, width, height, 4 * width, QImage.Format.Format_RGBA8888).copy()
            for f in found
        ]
        self.viewport().update()

    def clear_frames(self) -> None:
        self.items.frames.clear()
        self.viewport().update()

    def play(self, playing: bool) -> None:
        self._clock.start() if playing else self._clock.stop()

    def rename_chosen(self) -> None:
        """Edit the chosen mode's name in place."""
        if self.currentIndex().isValid() and self.state() != QListView.State.EditingState:
            self.edit(self.currentIndex())

    def _step(self) -> None:
        self.frame += 1
        self.viewport().update()
