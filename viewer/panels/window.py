"""The window: its panels side by side, and how state, panels and conductor are tied together."""

from __future__ import annotations

from pathlib import Path
from typing import cast

from PySide6.QtCore import QUrl
from PySide6.QtGui import QAction, QCloseEvent, QDragEnterEvent, QDropEvent, QKeySequence
from PySide6.QtWidgets import QHBoxLayout, QMainWindow, QMenu, QStackedWidget, QVBoxLayout, QWidget

from viewer.errors import HingelightError
from viewer.panels.canvas import Canvas
from viewer.panels.chart_page import ChartPage
from viewer.panels.commands import COMMANDS
from viewer.panels.conductor import Conductor
from viewer.panels.deeds import Deeds
from viewer.panels.export_strip import ExportStrip
from viewer.panels.exporting import Exporting
from viewer.panels.filter_bar import FilterBar
from viewer.panels.gallery import PICTURE, GalleryPanel
from viewer.panels.header import HeaderPanel
from viewer.panels.notice import Notice
from viewer.panels.playback import Playback
from viewer.panels.rail import RailPanel
from viewer.panels.theme import palette, sheet
from viewer.panels.words import WordsPanel
from viewer.scene.picture import Picture
from viewer.scene.primitives import Sheet
from viewer.session import Session, State, actions
from viewer.session.charts import chart_of, shown_spot
from viewer.session.gallery import items, point_names
from viewer.session.picking import read_off
from viewer.session.pictures import against, heading, scale_of
from viewer.session.project import Project
from viewer.session.rail import rail_of
from viewer.session.settings import read_settings, write_settings
from viewer.session.words import entries


class Window(QMainWindow):
    """One window on one dossier. ``settings_path``: where it remembers things, None: the usual place."""

    def __init__(self, settings_path: Path | None = None) -> None:
        super().__init__()
        self._settings_path = settings_path
        self.settings = read_settings(settings_path)
        self.session = Session(State(theme=self.settings.theme))
        self.conductor = Conductor(self.session, (2 * PICTURE.width(), 2 * PICTURE.height()), self)
        self._build()
        self.exporting = Exporting(self)
        self.deeds = Deeds(self)
        self._bind_commands()
        self._connect()
        self.setAcceptDrops(True)
        self.resize(*self.settings.size)
        self.setMinimumSize(900, 600)
        self._dress(self.settings.theme)
        self.canvas.setFocus()
        self.refresh()

    def _build(self) -> None:
        self.menu = QMenu(self)
        self.menu.setAccessibleName("All commands")
        self.header = HeaderPanel(self.menu, self)
        self.rail, self.canvas, self.gallery = RailPanel(self), Canvas(self), GalleryPanel(self)
        self.words, self.filter_bar, self.export_strip = WordsPanel(self), FilterBar(self), ExportStrip(self)
        self.pages = QStackedWidget(self)
        self.pages.addWidget(self.canvas)
        self.chart = ChartPage(self)
        self.pages.addWidget(self.chart)
        self.notice = Notice(self.pages)
        self.playback = Playback(self.canvas, self)
        left = QVBoxLayout()
        left.setContentsMargins(0, 0, 0, 0)
        left.setSpacing(0)
        for panel in (self.header, self.rail, self.pages, self.export_strip, self.filter_bar, self.gallery):
            left.addWidget(panel, 1 if panel is self.pages else 0)
        centre = QWidget(self)
        box = QHBoxLayout(centre)
        box.setContentsMargins(0, 0, 0, 0)
        box.setSpacing(0)
        box.addLayout(left, 1)
        box.addWidget(self.words)
        self.setCentralWidget(centre)

    def _bind_commands(self) -> None:
        group = COMMANDS[0].group
        for command in COMMANDS:
            action = QAction(command.words, self)
            action.setShortcuts([QKeySequence(keys) for keys in command.keys])
            action.setData(command)
            action.triggered.connect(self._carry_out)
            self.addAction(action)
            if command.group != group:
                self.menu.addSeparator()
                group = command.group
            self.menu.addAction(action)

    def _carry_out(self) -> None:
        command = cast(QAction, self.sender()).data()
        getattr(self.deeds, command.name)(*command.given)

    def _connect(self) -> None:
        session, deeds = self.session, self.deeds
        session.listen(self._changed)
        self.conductor.opened.connect(self._opened)
        self.conductor.learned.connect(self.refresh)
        self.conductor.composed.connect(self._show_picture)
        self.conductor.thumbnail.connect(self.gallery.set_frames)
        self.conductor.thumbnails_void.connect(self.gallery.clear_frames)
        self.conductor.failed.connect(self.show_error)
        self.conductor.working.connect(self.notice.show_progress)
        self.conductor.waited.connect(self.notice.progress_over)
        self.notice.stopped.connect(deeds.stop)
        self.header.design_chosen.connect(deeds.choose_design)
        self.header.layout_chosen.connect(deeds.choose_layout)
        self.header.test_wished.connect(deeds.next_test_layout)
        self.header.beside_chosen.connect(deeds.set_beside)
        self.rail.moved.connect(deeds.move_handle)
        self.rail.let_go.connect(deeds.let_go)
        self.gallery.chosen.connect(deeds.choose_mode)
        self.gallery.renamed.connect(deeds.take_name)
        self.filter_bar.wished.connect(deeds.set_band)
        self.filter_bar.closed.connect(deeds.show_all_modes)
        self.chart.taken.connect(deeds.put_spot)
        self.words.lit.connect(deeds.light)
        self.words.taken_up.connect(deeds.take_up)
        self.canvas.settled.connect(self._settled)
        self.canvas.picked.connect(deeds.pick)
        self.canvas.turned.connect(deeds.turned)
        self.canvas.fit_wished.connect(deeds.fit)

    # ---- opening, closing

    def open(self, path: Path, modes: Path | None = None) -> None:
        """Open a dossier, or a mesh with modes."""
        self.notice.hide()
        self._wished = (path, modes)
        self.conductor.open(path, modes, self.session.state.theme)

    def _opened(self) -> None:
        path, modes = self._wished
        if modes is None:
            self.settings = self.settings.with_recent(path.resolve())
        self.deeds.list_recent()

    def dragEnterEvent(self, event: QDragEnterEvent) -> None:
        if _dropped(event.mimeData().urls()):
            event.acceptProposedAction()

    def dropEvent(self, event: QDropEvent) -> None:
        files = _dropped(event.mimeData().urls())
        if files:
            self.open(files[0], files[1] if len(files) > 1 else None)

    def closeEvent(self, event: QCloseEvent) -> None:
        self.settings = self.settings.__class__(
            self.session.state.theme, (self.width(), self.height()), self.settings.recent
        )
        write_settings(self.settings, self._settings_path)
        self.playback.stop()
        self.gallery.play(False)
        self.conductor.close()
        self.session.forget()
        self.canvas.release()
        super().closeEvent(event)

    # ---- state → widgets

    def _changed(self, before: State, after: State) -> None:
        if before.theme != after.theme:
            self._dress(after.theme)
        self.refresh()

    def refresh(self) -> None:
        """Show the state as it is now."""
        state, project = self.session.state, self.session.project
        self._play(state)
        self.rail.show_rail(
            None if project is None else rail_of(scale_of(project, state), state.true_scale, state.enlarge),
            state.theme,
        )
        if project is None:
            self.header.show_project("Hingelight", (), "", "single", False)
            self.words.show_entries((), "", "", state.theme)
            return
        self.setWindowTitle(f"{project.title} · Hingelight")
        tested = bool(project.opened.dossier.tests)
        self.header.show_project(
            project.title, project.designs, state.design, state.layout, bool(state.named), tested
        )
        self.header.show_beside(*against(project, state))
        shown = items(project, state)
        self.gallery.show_items(shown, state.mode, state.theme)
        points = point_names(project.study(state.design))
        self.filter_bar.show_band(state.band, points, len(shown), project.count(state.design))
        self.words.show_entries(entries(project, state), heading(project, state), state.subject, state.theme)
        self._show_page(project, state)
        self._show_reading()

    def _show_page(self, project: Project, state: State) -> None:
        """The stage, or a chart in its place, which then has the keyboard."""
        if state.page == "stage":
            if self.pages.currentWidget() is not self.canvas:
                self.pages.setCurrentWidget(self.canvas)
                self.canvas.setFocus()
                self.notice.raise_()
            return
        sheet = chart_of(project, state)
        self.chart.show_chart(
            sheet, shown_spot(project, state, sheet) if isinstance(sheet, Sheet) else -1, state.theme
        )
        if self.pages.currentWidget() is not self.chart:
            self.pages.setCurrentWidget(self.chart)
            self.chart.setFocus()
            self.notice.raise_()

    def _play(self, state: State) -> None:
        self.gallery.play(state.playing)
        if state.playing:
            self.playback.play()
        elif self.playback.playing:
            self.playback.stop()

    def _show_picture(self, picture: Picture, keep_camera: bool) -> None:
        try:
            self.canvas.show_picture(picture, keep_camera=keep_camera)
        except HingelightError as error:
            self.show_error(error)
            return
        self._show_reading()
        self.playback.picture_changed()

    def _show_reading(self) -> None:
        state, project = self.session.state, self.session.project
        reading = None
        if project is not None and self.canvas.picture is not None:
            reading = read_off(project, self.canvas.picture, state.design, state.picked)
        self.canvas.set_reading(reading)

    def _settled(self) -> None:
        self.conductor.size = self.canvas.real_size
        self.conductor.compose()
        if self.notice.kind:
            self.notice.place()

    def show_error(self, error: HingelightError) -> None:
        """Say what went wrong; nothing closes."""
        self.notice.show_error(error)

    def _dress(self, theme: str) -> None:
        self.setPalette(palette(theme))
        self.setStyleSheet(sheet(theme))
        self.canvas.set_theme(theme)


def _dropped(urls: list[QUrl]) -> list[Path]:
    return [Path(url.toLocalFile()) for url in urls if url.isLocalFile()]


__all__ = ["Window", "actions"]
