"""A window's keys and mouse, and waiting for what they bring about."""

from __future__ import annotations

import numpy as np


class Told:
    """A window, and hands on its keys and mouse."""

    def __init__(self, window, until, settled) -> None:
        self.window, self.until, self.settled = window, until, settled

    @property
    def state(self):
        return self.window.session.state

    @property
    def picture(self):
        return self.window.canvas.picture

    def key(self, key, modifier=None) -> None:
        from PySide6.QtCore import Qt
        from PySide6.QtTest import QTest

        QTest.keyClick(self.window, key, modifier or Qt.KeyboardModifier.NoModifier)

    def click(self, widget, place=None) -> None:
        from PySide6.QtCore import QPoint, Qt
        from PySide6.QtTest import QTest

        at = widget.rect().center() if place is None else QPoint(*(round(x) for x in place))
        QTest.mouseClick(widget, Qt.MouseButton.LeftButton, Qt.KeyboardModifier.NoModifier, at)

    def drag(self, widget, start, end) -> None:
        from PySide6.QtCore import QPoint, Qt
        from PySide6.QtTest import QTest

        QTest.mousePress(widget, Qt.MouseButton.LeftButton, Qt.KeyboardModifier.NoModifier, QPoint(*start))
        for share in np.linspace(0, 1, 6):
            place = QPoint(*(round(a + share * (b - a)) for a, b in zip(start, end, strict=True)))
            QTest.mouseMove(widget, place)
        QTest.mouseRelease(widget, Qt.MouseButton.LeftButton, Qt.KeyboardModifier.NoModifier, QPoint(*end))

    def drawn(self) -> None:
        """Until the picture that is wished is on the stage."""
        self.until(lambda: not self.window.conductor._lanes["composing"].busy, "composed")
        self.window.repaint()

    def still(self) -> None:
        """Until all is known and drawn; stand at the first phase, with the gallery at its first frame."""
        from viewer.session import actions

        self.settled(self.window)
        self.window.session.do(actions.stand_at, 0.0)
        self.window.playback.stop(0.0)
        self.window.gallery.frame = 0
        self.window.repaint()

    def entry(self, subject: str):
        return next(e for e in self.window.words.entries if e.entry is not None and e.entry.subject == subject)

    def text(self) -> str:
        return " ".join(self.window.notice.words.split())
