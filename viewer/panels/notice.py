"""A notice over the stage: what is being done and how to stop it, or what went wrong, in the error tree's words."""

from __future__ import annotations

from PySide6.QtCore import Qt, Signal
from PySide6.QtWidgets import QFrame, QHBoxLayout, QLabel, QProgressBar, QPushButton, QVBoxLayout, QWidget

from viewer.errors import HingelightError

HEADINGS = {"LoadError": "This file cannot be read", "DossierError": "The dossier is not right"}
_PARTS = (("Where", "place"), ("Found", "found"), ("Expected", "expected"), ("What to do", "do"))


class Notice(QFrame):
    """``stopped()``: the user wishes no more of what is under way; ``closed()``: an error was read."""

    stopped = Signal()
    closed = Signal()

    def __init__(self, parent: QWidget) -> None:
        super().__init__(parent)
        self._over = parent
        self.setObjectName("notice")
        self.setProperty("kind", "progress")
        self._heading, self._text = QLabel(self), QLabel(self)
        self._heading.setObjectName("notice_heading")
        for label in (self._heading, self._text):
            label.setWordWrap(True)
            label.setTextFormat(Qt.TextFormat.PlainText)
        self._text.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        self._bar = QProgressBar(self)
        self._bar.setTextVisible(False)
        self._bar.setAccessibleName("Progress")
        self._button = QPushButton("Stop", self)
        self._button.clicked.connect(self._press)
        words = QVBoxLayout()
        for part in (self._heading, self._text, self._bar):
            words.addWidget(part)
        box = self._box = QHBoxLayout(self)
        box.setContentsMargins(16, 12, 12, 12)
        box.addLayout(words, 1)
        box.addWidget(self._button, 0, Qt.AlignmentFlag.AlignTop)
        self.hide()

    @property
    def kind(self) -> str:
        """ "error", "message" or "progress"; empty while hidden."""
        return str(self.property("kind")) if self.isVisibleTo(self._over) else ""

    @property
    def words(self) -> str:
        return f"{self._heading.text()}\n{self._text.text()}".strip()

    def show_error(self, error: HingelightError) -> None:
        """What went wrong, in its own words."""
        heading = error.problem[:1].upper() + error.problem[1:]
        said = [f"File: {error.file}"] if error.file else []
        said += [f"{word}: {getattr(error, part)}" for word, part in _PARTS if getattr(error, part)]
        self._fill("error", heading, "\n".join(said), "Close")
        self._bar.hide()

    def show_message(self, heading: str, text: str = "") -> None:
        self._fill("message", heading, text, "Close")
        self._bar.hide()

    def show_progress(self, stage: str, done: int, total: int) -> None:
        """What is under way; errors stay until they are closed."""
        if self.kind in ("error", "message"):
            return
        self._bar.setRange(0, total)
        self._bar.setValue(done)
        self._bar.show()
        self._fill("progress", stage[:1].upper() + stage[1:], "", "Stop")

    def progress_over(self) -> None:
        if self.kind == "progress":
            self.hide()

    def dismiss(self) -> None:
        """Close what is shown; work goes on."""
        self.hide()
        self.closed.emit()

    def place(self) -> None:
        """Stand at the top of the parent, in its middle."""
        width = min(620, self._over.width() - 40)
        self.setFixedWidth(max(width, 200))
        self._box.activate()
        self.setFixedHeight(self._box.heightForWidth(self.width()))
        self.move((self._over.width() - self.width()) // 2, 16)
        self.raise_()

    def _fill(self, kind: str, heading: str, text: str, button: str) -> None:
        self._heading.setText(heading)
        self._text.setText(text)
        self._text.setVisible(bool(text))
        self._button.setText(button)
        self._button.setAccessibleName(f"{button}: {heading}")
        self.setAccessibleName(f"{heading}. {text}")
        if self.property("kind") != kind:
            self.setProperty("kind", kind)
            for widget in (self, self._heading):
                widget.style().unpolish(widget)
                widget.style().polish(widget)
        self.show()
        self.place()

    def _press(self) -> None:
        if self.kind == "progress":
            self.stopped.emit()
            self.hide()
        else:
            self.dismiss()
