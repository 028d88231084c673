"""Starts the window."""

from __future__ import annotations

import signal
import sys
from pathlib import Path
from typing import cast

from PySide6.QtCore import QTimer
from PySide6.QtWidgets import QApplication

from viewer.panels.window import Window
from viewer.session.loading import sample

_BEAT = 200  # ms


def run(path: Path | None, modes: Path | None = None) -> int:
    """Show a window until it is closed; returns the exit code. Nothing given: the sample boom."""
    app = cast(QApplication, QApplication.instance() or QApplication(sys.argv[:1]))
    app.setApplicationName("Hingelight")
    app.setStyle("Fusion")
    window = Window()
    window.show()
    signal.signal(signal.SIGINT, lambda *_: app.closeAllWindows())  # Ctrl-C in the terminal
    beat = QTimer(interval=_BEAT)
    beat.timeout.connect(lambda: None)  # Python hears signals only while it runs
    beat.start()
    shown = path or sample()
    if shown is not None:
        window.open(shown, modes)
    else:
        window.notice.show_message("Nothing is open", "Open a dossier with Ctrl+O, or drop one here.")
    return app.exec()
