"""The strip that says how far an export is, with a way to stop it."""

from __future__ import annotations

from PySide6.QtCore import Signal
from PySide6.QtWidgets import QFrame, QHBoxLayout, QLabel, QProgressBar, QPushButton, QWidget

from viewer.panels.theme import MARGIN


class ExportStrip(QFrame):
    """``stopped()``: the user wants no more of it."""

    stopped = Signal()

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setObjectName("export_strip")
        self._words = QLabel(self)
        self._bar = QProgressBar(self)
        self._bar.setTextVisible(False)
        self._bar.setFixedWidth(220)
        self._bar.setAccessibleName("Progress of the export")
        self.stop_button = QPushButton("Stop the export", self)
        self.stop_button.clicked.connect(self.stopped)
        box = QHBoxLayout(self)
        box.setContentsMargins(MARGIN, 4, 12, 4)
        box.addWidget(self._words, 1)
        box.addWidget(self._bar)
        box.addWidget(self.stop_button)
        self.hide()

    @property
    def words(self) -> str:
        return self._words.text()

    def begin(self, what: str) -> None:
        self._words.setText(f"Writing {what}")
        self.setAccessibleName(self._words.text())
        self._bar.setRange(0, 0)
        self.show()

    def show_progress(self, stage: str, done: int, total: int) -> None:
        """How far it is; a stage of unknown length only moves."""
        self._bar.setRange(0, total)
        self._bar.setValue(done)
        self._bar.setToolTip(stage)

    def end(self) -> None:
        self.hide()
