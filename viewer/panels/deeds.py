"""What commands and panels do: each deed is an action on the session, or something asked of the conductor."""

from __future__ import annotations

from math import tau
from pathlib import Path
from typing import TYPE_CHECKING, cast

from PySide6.QtCore import QObject
from PySide6.QtGui import QAction
from PySide6.QtWidgets import QApplication, QFileDialog

from viewer.errors import HingelightError, RefusedError
from viewer.panels.key_sheet import KeySheet
from viewer.scene.picture import View
from viewer.scene.primitives import Spot
from viewer.scene.tokens import FRAMES
from viewer.session import actions
from viewer.session.camera import STEP
from viewer.session.charts import put_spot
from viewer.session.gallery import passing
from viewer.session.hammer_changes import accepted, correct
from viewer.session.model_words import ACCEPT
from viewer.session.pictures import against, has_test_shape, require_size, scale_of, test_of
from viewer.session.rail import rail_of
from viewer.session.saving import save_names
from viewer.session.state import Band
from viewer.session.words import as_text, entries

if TYPE_CHECKING:
    from viewer.panels.window import Window


class Deeds(QObject):
    """The deeds of one window."""

    def __init__(self, window: Window) -> None:
        super().__init__(window)
        self._window = window
        self._session = window.session
        self._recent: list[QAction] = []
        self._keys: KeySheet | None = None
        self.list_recent()

    # ---- files

    def open_file(self) -> None:
        """Ask for a file."""
        path, _ = QFileDialog.getOpenFileName(self._window, "Open a dossier, or a mesh with modes")
        if path:
            self._window.open(Path(path))

    def list_recent(self) -> None:
        """The files opened before, at the end of the menu."""
        menu = self._window.menu
        for action in self._recent:
            menu.removeAction(action)
            action.deleteLater()
        self._recent = [menu.addSeparator()] if self._window.settings.recent else []
        for text in self._window.settings.recent:
            path = Path(text)
            action = menu.addAction(f"Open {path.parent.name}/{path.name}" if path.suffix else f"Open {path.name}")
            action.setToolTip(text)
            action.setData(text)
            action.triggered.connect(self._open_recent)
            self._recent.append(action)

    def _open_recent(self) -> None:
        self._window.open(Path(cast(QAction, self.sender()).data()))

    def save_names(self) -> None:
        """Write the names given here into the dossier."""
        project = self._session.project
        if project is None or not self._session.state.named:
            return
        try:
            save_names(project, self._session.state)
        except HingelightError as error:
            self._window.show_error(error)
            return
        self._window.notice.show_message("Names are saved", str(project.opened.dossier.path))

    def export(self, kind: str) -> None:
        """Ask where to, and write what is on the stage (``gif``, ``png``) or the ``tables``."""
        self._window.exporting.ask(kind)

    def export_to(self, kind: str, path: Path) -> None:
        """The same without asking."""
        self._window.exporting.write(kind, path)

    def copy_words(self) -> None:
        """What is said about the mode, as text on the clipboard."""
        if self._session.project is not None:
            QApplication.clipboard().setText(as_text(self._session.project, self._session.state))

    def close_window(self) -> None:
        self._window.close()

    def stop(self) -> None:
        """Stop what the user waits for."""
        self._window.conductor.stop()

    # ---- history

    def undo(self) -> None:
        self._session.undo()

    def redo(self) -> None:
        self._session.redo()

    # ---- modes and designs

    def choose_mode(self, mode: int) -> None:
        self._session.do(actions.choose_mode, mode, self._session.project)

    def step_mode(self, step: int) -> None:
        project, state = self._session.project, self._session.state
        study = None if project is None else project.study(state.design)
        if study is not None:
            self._session.do(actions.step_mode, step, passing(study, state.band))

    def rename(self) -> None:
        """Edit the name of the chosen mode."""
        self._window.gallery.rename_chosen()

    def take_name(self, mode: int, name: str) -> None:
        self._session.do(actions.rename, self._session.state.design, mode, name)

    def filter_modes(self) -> None:
        """Go to the gallery's filter."""
        self._window.filter_bar.ask()

    def set_band(self, band: Band) -> None:
        self._session.do(actions.set_band, band, join="band")

    def show_all_modes(self) -> None:
        """Close the gallery's filter."""
        self._window.filter_bar.hide()
        self._session.do(actions.set_band, Band())
        self._window.gallery.setFocus()

    def choose_design(self, design: str) -> None:
        self._session.do(actions.choose_design, design, self._session.project)

    def next_design(self, step: int) -> None:
        project = self._session.project
        if project is not None:
            at = project.designs.index(self._session.state.design) + step
            self.choose_design(project.designs[at % len(project.designs)])

    def choose_layout(self, layout: str) -> None:
        project, state = self._session.project, self._session.state
        if project is None or (layout != "single" and not project.other_of(state.design, state.other)):
            self._window.show_error(
                RefusedError("there is one design only, so nothing to compare", do="add another [[designs]]")
            )
            return
        self._session.do(actions.compare, layout)

    def next_layout(self) -> None:
        self.choose_layout(actions.next_layout(self._session.state).layout)

    def next_test_layout(self) -> None:
        """The hammer test over the design, beside it, alone, away."""
        project, state = self._session.project, self._session.state
        if project is None:
            return
        if not test_of(project, state):
            tests = project.opened.dossier.tests
            do = f"choose design {tests[0].design}" if tests else "add [[tests]] to the dossier"
            self._window.show_error(RefusedError(f"design '{state.design}' has no hammer test", do=do))
            return
        self._session.do(actions.next_test_layout)

    def set_beside(self, name: str) -> None:
        """Have another design, or another test, beside the design."""
        self._session.do(actions.set_beside, name)

    def next_beside(self) -> None:
        project, state = self._session.project, self._session.state
        names, chosen = ((), "") if project is None else against(project, state)
        if chosen in names:
            self.set_beside(names[(names.index(chosen) + 1) % len(names)])

    def take_up(self, subject: str) -> None:
        """Do what is offered with what is said: corrections of the test, into the dossier or out of it."""
        project, state = self._session.project, self._session.state
        entry = None if project is None else next((e for e in entries(project, state) if e.subject == subject), None)
        if project is None or entry is None or not entry.offer:
            return
        name = test_of(project, state)
        try:
            now = accepted(project, name) if entry.offer == ACCEPT else ()
            self._window.conductor.replace_project(correct(project, name, now))
        except HingelightError as error:
            self._window.show_error(error)
            return
        done = "written into" if now else "taken out of"
        self._window.notice.show_message(
            f"Corrections of test {name} are {done} the dossier", str(project.opened.dossier.path)
        )

    def turn_page(self, page: str) -> None:
        self._session.do(actions.turn_page, page)

    def put_spot(self, spot: Spot) -> None:
        """What a chart's spot stands for, onto the stage."""
        project = self._session.project
        if project is not None:
            self._session.do(put_spot, project, spot)

    # ---- motion

    def toggle_play(self) -> None:
        playback = self._window.playback
        if playback.playing:
            self._session.do(actions.stand_at, playback.phase)
        else:
            self._session.do(actions.play)

    def step_phase(self, step: int) -> None:
        playback = self._window.playback
        phase = (playback.phase + step * tau / FRAMES) % tau
        self._session.do(actions.stand_at, phase)
        playback.stop(phase)

    def true_scale(self) -> None:
        """Snap to ×1; refused where no size is known."""
        project, state = self._session.project, self._session.state
        scale = None if project is None else scale_of(project, state)
        if scale is None or project is None:
            return
        if scale.magnification is None:
            try:
                require_size(project, state)
            except HingelightError as error:
                self._window.show_error(error)
            return
        self._session.do(actions.true_scale)

    def drawn_scale(self) -> None:
        self._session.do(actions.drawn_scale)

    def nudge(self, factor: float) -> None:
        """Draw motion larger or smaller by a factor."""
        project, state = self._session.project, self._session.state
        scale = None if project is None else scale_of(project, state)
        if scale is None:
            return
        now = state.enlarge
        if state.true_scale and scale.magnification:
            now = 1.0 / scale.magnification
        self._session.do(actions.enlarge, now * factor, join="enlarge")

    def move_handle(self, at: float) -> None:
        """The rail's handle is at 0 … 1."""
        project, state = self._session.project, self._session.state
        rail = None if project is None else rail_of(scale_of(project, state), state.true_scale, state.enlarge)
        if rail is None:
            return
        factor = rail.enlarged_at(at)
        if factor is None:
            self._session.do(actions.true_scale, join="drag")
        else:
            self._session.do(actions.enlarge, factor, join="drag")

    def let_go(self) -> None:
        """The handle stays: the next drag is another step."""
        self._session.end_step()

    # ---- look

    def switch(self, what: str) -> None:
        self._session.do(actions.switch, what)

    def toggle_theme(self) -> None:
        self._session.do(actions.toggle_theme)

    def look_from(self, name: str) -> None:
        self._session.do(actions.look_from, name)

    def fit(self) -> None:
        self._session.do(actions.fit)

    def turned(self, view: View) -> None:
        self._session.do(actions.turn, view)

    def turn_eye(self, across: int, up: int) -> None:
        self._window.canvas.turn(across * STEP, up * STEP)

    def zoom(self, factor: float) -> None:
        self._window.canvas.zoom(factor)

    # ---- what is lit

    def light(self, subject: str) -> None:
        """Light up what a sentence speaks of."""
        project, state = self._session.project, self._session.state
        if project is None:
            return
        entry = next((e for e in entries(project, state) if e.subject == subject), None)
        if entry is None:
            return
        hinges = entry.steps if subject == "folds" and entry.bars else 0
        self._session.do(actions.light, subject, hinges, has_test_shape(project, state))
        self._pick_subject(subject)

    def _pick_subject(self, subject: str) -> None:
        """Sentences about a place pick it."""
        project, state = self._session.project, self._session.state
        if project is None or state.subject != subject:
            return
        if subject == "matters":
            names = [point.name for point in project.studies[state.design].design.points]
            if names:
                self._session.do(actions.pick, -1, names[0], join="light")
        elif subject == "size":
            self._pick_largest()

    def _pick_largest(self) -> None:
        project, state = self._session.project, self._session.state
        scale = None if project is None else scale_of(project, state)
        if scale is not None:
            name = scale.largest_place if scale.largest_row < 0 else ""
            self._session.do(actions.pick, scale.largest_row, name, join="light")

    def pick(self, row: int, body: str) -> None:
        if row < 0:
            self._session.do(actions.pick)
        elif body == self._session.state.design:
            self._session.do(actions.pick, row)

    def pick_next(self) -> None:
        """The next named point; after the last the place of largest motion, then none."""
        project, state = self._session.project, self._session.state
        if project is None or project.study(state.design) is None:
            return
        names = [carried.name for carried in project.studies[state.design].carried]
        picked = state.picked
        if picked is not None and picked.row >= 0:
            self._session.do(actions.pick)
            return
        at = names.index(picked.name) + 1 if picked is not None and picked.name in names else 0
        if at < len(names):
            self._session.do(actions.pick, -1, names[at])
        else:
            self._pick_largest()

    def dismiss(self) -> None:
        """Close the filter or the notice; with none, light nothing."""
        if self._keys is not None and self._keys.isVisible():
            self._keys.hide()
        elif self._window.filter_bar.written_into:
            self.show_all_modes()
        elif self._window.notice.kind in ("error", "message"):
            self._window.notice.dismiss()
        elif self._session.state.page != "stage":
            self._session.do(actions.turn_page, "stage")
        else:
            self._session.do(actions.unlight)

    # ---- help

    def show_menu(self) -> None:
        self._window.header.more.showMenu()

    def show_keys(self) -> None:
        """All keys on one sheet; again: away with it."""
        if self._keys is None:
            self._keys = KeySheet(self._window)
        self._keys.setVisible(not self._keys.isVisible())
