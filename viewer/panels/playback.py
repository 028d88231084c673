"""Plays: at each moment the frame of that moment is shown; frames that come too late are left out, never queued."""

from __future__ import annotations

import time
from math import tau

from PySide6.QtCore import QObject, QTimer

from viewer.export.frames import phase_of, source_frames
from viewer.panels.canvas import Canvas
from viewer.scene.tokens import FRAME_MS, FRAMES


class Playback(QObject):
    """Shows the same 40 frames a cycle on the canvas that a loop has. ``drawn`` counts the frames shown."""

    def __init__(self, canvas: Canvas, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._canvas = canvas
        self._timer = QTimer(self, singleShot=True)
        self._timer.timeout.connect(self._next)
        self._began = time.perf_counter()
        self._shown = -1
        self._source: list[int] = list(range(FRAMES))
        self.phase = 0.0
        self.drawn = 0

    @property
    def playing(self) -> bool:
        return self._timer.isActive()

    def picture_changed(self) -> None:
        """Another picture is on the canvas: show it at the present phase."""
        picture = self._canvas.picture
        if picture is not None:
            self._source = source_frames(picture)
        self._shown = -1
        if not self.playing:
            self._canvas.draw(self.phase)

    def play(self) -> None:
        """Go on from the phase where it stands."""
        if not self.playing:
            self._began = time.perf_counter() - self.phase / tau * FRAMES * FRAME_MS / 1e3
            self._timer.start(0)

    def stop(self, phase: float | None = None) -> None:
        """Stand still, at ``phase`` (rad) when given."""
        self._timer.stop()
        if phase is not None:
            self.phase = phase
            self._canvas.draw(phase)

    def _next(self) -> None:
        elapsed = (time.perf_counter() - self._began) * 1e3
        frame = int(elapsed / FRAME_MS) % FRAMES
        if frame != self._shown and self._canvas.picture is not None:
            self._shown = frame
            self.phase = phase_of(frame)
            self._canvas.draw(self.phase, self._source[frame])
            self.drawn += 1
        elapsed = (time.perf_counter() - self._began) * 1e3
        self._timer.start(max(1, round(FRAME_MS - elapsed % FRAME_MS)))
