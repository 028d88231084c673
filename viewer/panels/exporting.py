"""Exports from the window: they run beside it and can be stopped; a stopped one leaves no file."""

from __future__ import annotations

from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING

from PySide6.QtCore import QObject
from PySide6.QtWidgets import QFileDialog

from viewer.errors import HingelightError
from viewer.jobs import Progress
from viewer.session.exports import SUFFIXES, request_of, suggested_name, with_suffix, write_tables

if TYPE_CHECKING:
    from viewer.panels.window import Window

_WORDS = {"gif": "Export a loop", "png": "Export a still", "tables": "Export the tables"}


class Exporting(QObject):
    """Asks for a file, has it written in the conductor's lane ``writing``, shows the strip meanwhile."""

    def __init__(self, window: Window) -> None:
        super().__init__(window)
        self._window = window
        self._lane = window.conductor.writing
        self._lane.progressed.connect(window.export_strip.show_progress)
        window.export_strip.stopped.connect(self.stop)

    def ask(self, kind: str) -> None:
        """Ask where to, then write."""
        project, state = self._window.session.project, self._window.session.state
        if project is None or project.study(state.design) is None:
            return
        known = " ".join(f"*{suffix}" for suffix in SUFFIXES[kind])
        name = suggested_name(project, state, kind)
        path, _ = QFileDialog.getSaveFileName(self._window, _WORDS[kind], name, f"{_WORDS[kind]} ({known})")
        if path:
            self.write(kind, Path(path))

    def write(self, kind: str, path: Path) -> None:
        """Write what is on the stage, or the tables, to ``path``; one export after the other."""
        project, state = self._window.session.project, self._window.session.state
        if project is None or project.study(state.design) is None:
            return
        try:
            target = with_suffix(path, kind)
        except HingelightError as error:
            self._window.show_error(error)
            return

        def job(progress: Progress) -> tuple[Path, ...]:
            if kind == "tables":
                return write_tables(project, state, target, progress)
            return (request_of(project, state, target).write_in_child(progress),)

        self._window.export_strip.begin(target.name)
        self._lane.run(job, partial(self._done, target), self._failed)

    def stop(self) -> None:
        """Stop the export under way and those that wait."""
        self._lane.drop()
        self._window.export_strip.end()

    def _done(self, target: Path, written: tuple[Path, ...]) -> None:
        self._window.export_strip.end()
        also = "" if len(written) == 1 else "\n" + "\n".join(path.name for path in written)
        self._window.notice.show_message(
            f"{target.name} is written" if not also else "Tables are written", f"{target.parent}{also}"
        )

    def _failed(self, error: HingelightError) -> None:
        self._window.export_strip.end()
        self._window.show_error(error)
