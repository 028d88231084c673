"""Starts the window."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import cast

from PySide6.QtWidgets import QApplication

from viewer.panels.window import Window
from viewer.session.loading import sample


def run(path: Path | None, modes: Path | None = None) -> int:
    """Show a window until it is closed; returns the exit code. Nothing given: the sample boom."""
    app = cast(QApplication, QApplication.instance() or QApplication(sys.argv[:1]))
    app.setApplicationName("Hingelight")
    app.setStyle("Fusion")
    window = Window()
    window.show()
    shown = path or sample()
    if shown is not None:
        window.open(shown, modes)
    return app.exec()
