"""The sheet of keys: every command with its key, over the stage."""

from __future__ import annotations

from html import escape
from itertools import groupby

from PySide6.QtCore import Qt
from PySide6.QtGui import QKeySequence
from PySide6.QtWidgets import QDialog, QGridLayout, QLabel, QWidget

from viewer.panels.commands import COMMANDS

_COLUMNS = 3


class KeySheet(QDialog):
    """Closed by Esc."""

    def __init__(self, parent: QWidget) -> None:
        super().__init__(parent)
        self.setWindowTitle("All keys")
        self.setAccessibleName("All keys")
        grid = QGridLayout(self)
        grid.setHorizontalSpacing(36)
        grid.setVerticalSpacing(14)
        for number, (group, commands) in enumerate(groupby(COMMANDS, lambda command: command.group)):
            lines = [f"<b>{group}</b>"]
            for command in commands:
                lines.append(f"{_spoken(command.keys)} &nbsp; {command.words}")
            label = QLabel("<br>".join(lines), self)
            label.setTextFormat(Qt.TextFormat.RichText)
            grid.addWidget(label, number // _COLUMNS, number % _COLUMNS, Qt.AlignmentFlag.AlignTop)


def _spoken(keys: tuple[str, ...]) -> str:
    native = QKeySequence.SequenceFormat.NativeText
    return escape(" or ".join(QKeySequence(key).toString(native) for key in keys))
