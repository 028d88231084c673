"""Sees to it that what the state asks for is read, found out, composed and drawn, beside the window.

Lanes: ``reading`` opens files, ``finding`` answers one question after the other, ``composing`` makes pictures (the
latest wish alone counts), ``thumbing`` draws the gallery, ``writing`` exports.
"""

from __future__ import annotations

import shutil
import tempfile
from functools import partial
from pathlib import Path
from typing import Any

from PySide6.QtCore import QObject, Signal

from viewer.errors import HingelightError
from viewer.jobs import Progress
from viewer.panels.lanes import Lane
from viewer.scene.picture import Picture
from viewer.session import Session, State
from viewer.session.gallery import thumbnail
from viewer.session.loading import open_project
from viewer.session.pictures import fitted_by, picture_of, second_mode, test_of, waiting, wanted
from viewer.session.project import Project
from viewer.session.questions import Question, find, learn, learn_why_not, next_question
from viewer.session.state import TEST_PAGES
from viewer.session.thumbnails import draw_thumbnails, ready
from viewer.workspace import Workspace

_WORDS = {
    "study": "reading and solving {design}",
    "explain": "looking at mode {mode} of {design}",
    "pair": "pairing the modes of {design} and {other}",
    "compare": "comparing {design} and {other}",
    "lineage": "following the modes",
    "test": "laying test {other} beside {design}",
    "faults": "looking for wrong channels of test {other}",
}


class Conductor(QObject):
    """``opened()`` another project; ``learned()`` something new is known; ``composed(picture, keep_camera)``;
    ``thumbnail(mode, path)``; ``failed(error)``; ``working(stage, done, total)`` on what the user waits for, and
    ``waited()`` when that is over."""

    opened = Signal()
    learned = Signal()
    composed = Signal(object, bool)
    thumbnail = Signal(int, object)
    thumbnails_void = Signal()
    failed = Signal(object)
    working = Signal(str, int, int)
    waited = Signal()

    def __init__(self, session: Session, thumbnail_size: tuple[int, int], parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._session = session
        self._thumbnail_size = thumbnail_size
        self._lanes = {name: Lane(name, self) for name in ("reading", "finding", "composing", "thumbing", "writing")}
        for name in ("reading", "finding"):
            self._lanes[name].progressed.connect(partial(self._progressed, name))
        self._asked: frozenset[Question] = frozenset()
        self._question: Question | None = None
        self._failures: dict[Question, HingelightError] = {}
        self._told: tuple[Any, ...] | None = None
        self._wish: tuple[Any, ...] | None = None
        self._shown: tuple[Any, ...] | None = None
        self._thumbed: tuple[str, str] | None = None
        self._folder: Path | None = None
        self.workspace = Workspace()
        session.listen(self._changed)

    # ---- opening and closing

    @property
    def writing(self) -> Lane:
        """The lane for exports."""
        return self._lanes["writing"]

    @property
    def busy(self) -> bool:
        """Whether anything is under way."""
        return any(lane.busy for lane in self._lanes.values())

    @property
    def alive(self) -> bool:
        return all(lane.alive for lane in self._lanes.values())

    def open(self, path: Path, modes: Path | None, theme: str) -> None:
        """Open a file in place of what is open; what is open stays when it cannot be read."""
        job = partial(open_project, path, modes, self.workspace)
        self.working.emit(f"opening {path.name}", 0, 0)
        self._lanes["reading"].run(
            lambda progress: job(progress=progress),
            lambda project: self._start(project, theme),
            self._not_opened,
            instead=True,
        )

    def replace_project(self, project: Project) -> None:
        """Go on from a project whose dossier was written: what it no longer knows is asked anew."""
        self._lanes["finding"].drop()
        self._asked, self._question = frozenset(), None
        self._failures, self._told = {}, None
        self._learn(project)

    def stop(self) -> None:
        """Stop what the user waits for; what is known stays."""
        if self._question is not None:
            self._asked |= {self._question}
        self._lanes["reading"].drop()
        self._lanes["finding"].drop()
        self._question = None
        self.waited.emit()

    def close(self) -> None:
        """End every lane and remove what was laid aside."""
        for lane in self._lanes.values():
            lane.drop()
        for lane in self._lanes.values():
            lane.close()
        self._forget_thumbnails()

    def _start(self, project: Project, theme: str) -> None:
        for name in ("finding", "composing", "thumbing"):
            self._lanes[name].drop()
        self._asked, self._question, self._wish, self._shown = frozenset(), None, None, None
        self._failures, self._told = {}, None
        self._forget_thumbnails()
        self.waited.emit()
        state = State(design=project.designs[0], theme=theme, playing=self._session.state.playing)
        self._session.start(project, state)
        self.opened.emit()
        self._go_on()

    def _not_opened(self, error: HingelightError) -> None:
        self.waited.emit()
        self.failed.emit(error)

    # ---- questions

    def _changed(self, before: State, after: State) -> None:
        self._go_on()

    def _go_on(self) -> None:
        """Ask the next question, compose what is wished."""
        project, state = self._session.project, self._session.state
        if project is None:
            return
        if self._question is None:
            self._ask(project, state)
        self._tell_failure(project, state)
        self.compose()
        self._draw_thumbnails(project, state)

    def _ask(self, project: Project, state: State) -> None:
        question = next_question(project, state, self._asked)
        self._question = question
        if question is None:
            self.waited.emit()
            return
        self._lanes["finding"].run(
            partial(find, project, question),
            partial(self._answered, question),
            partial(self._unanswered, question),
        )

    def _answered(self, question: Question, answer: Any) -> None:
        project = self._session.project
        self._question = None
        if project is None:
            return
        self._learn(learn(project, question, answer))

    def _unanswered(self, question: Question, error: HingelightError) -> None:
        project = self._session.project
        self._question = None
        self._asked |= {question}
        if project is None:
            return
        informed = learn_why_not(project, question, error)
        if informed is None:
            self._failures[question] = error
        self._learn(informed or project)

    def _tell_failure(self, project: Project, state: State) -> None:
        """What failed in the background is told when it is asked for, once each time."""
        missed = [q for q in self._failures if self._asks_for(q, project, state)]
        wish = (state.design, state.mode, state.layout, state.other, state.page) if missed else None
        if wish != self._told:
            self._told = wish
            if missed:
                self.failed.emit(self._failures[missed[0]])

    def _asks_for(self, question: Question, project: Project, state: State) -> bool:
        chosen = question == Question("explain", state.design, state.mode)
        return chosen or self._waits_for(question, project, state)

    def _learn(self, project: Project) -> None:
        self._session.project = project
        self.waited.emit()
        self.learned.emit()
        self._go_on()

    def _progressed(self, lane: str, stage: str, done: int, total: int) -> None:
        """Progress is shown where the user waits: while a file opens, or while the stage lacks what it needs."""
        project, state = self._session.project, self._session.state
        if lane == "reading" or project is None:
            self.working.emit(stage, done, total)
        elif self._question is not None and self._waits_for(self._question, project, state):
            question = self._question
            words = _WORDS[question.kind].format(design=question.design, mode=question.mode, other=question.other)
            self.working.emit(f"{words}: {stage}" if stage not in words else words, done, total)

    def _waits_for(self, question: Question, project: Project, state: State) -> bool:
        if question.kind == "study":
            return question.design in wanted(project, state)
        if question.kind == "lineage":
            return state.page == "lineage"
        if question.kind == "test":
            return state.tested or state.page in TEST_PAGES
        shown = state.compared or state.page in ("pairing", "ladder")
        return question.kind == "pair" and shown  # "compare" only adds words to what is shown by then

    # ---- pictures

    size: tuple[int, int] = (960, 720)

    def compose(self) -> None:
        """Compose the picture that is wished, unless it is on the stage or under way."""
        project, state = self._session.project, self._session.state
        if project is None or waiting(project, state):
            return
        wish = self._wish_of(project, state)
        if wish == self._wish:
            return
        self._wish = wish
        size = self.size
        self._lanes["composing"].run(
            lambda progress: picture_of(project, state, size),
            partial(self._show, state, size),
            partial(self._not_composed, wish),
            instead=True,
        )

    def _wish_of(self, project: Project, state: State) -> tuple[Any, ...]:
        """What decides the picture."""
        told = project.told.get((state.design, state.mode))
        other = project.other_of(state.design, state.other) if state.compared else ""
        partner = second_mode(project, state) if other else None
        theirs = project.told.get((other, partner or 0))
        tested = project.tested(test_of(project, state)) if state.tested else None
        look = (state.true_scale, state.enlarge, state.energy, state.ghost, state.hinges, state.mesh_edges)
        name = state.named.get((state.design, state.mode))
        return (
            id(project.opened),
            *fitted_by(state),
            *look,
            state.node_lines,
            state.theme,
            name,
            self.size,
            id(told),
            id(theirs),
            id(tested),
            other,
            partner,
        )

    def _show(self, state: State, size: tuple[int, int], picture: Picture) -> None:
        key = (fitted_by(state), size)
        keep = key == self._shown
        self._shown = key
        self.composed.emit(picture, keep)

    def _not_composed(self, wish: tuple[Any, ...], error: HingelightError) -> None:
        self.failed.emit(error)

    # ---- the gallery

    def _draw_thumbnails(self, project: Project, state: State) -> None:
        study = project.study(state.design)
        key = (state.design, state.theme)
        if study is None or key == self._thumbed:
            return
        self._forget_thumbnails()
        self._thumbed = key
        folder = self._folder = Path(tempfile.mkdtemp(prefix="hingelight-"))
        width, height = self._thumbnail_size
        seen: set[int] = set()

        def look(*_: object) -> None:
            for mode, path in ready(folder).items():
                if mode not in seen:
                    seen.add(mode)
                    self.thumbnail.emit(mode, path)

        def draw(progress: Progress) -> None:
            pictures = {m: thumbnail(study, m, state.theme, width, height) for m in range(1, study.count + 1)}
            stop = lambda: _stopped(progress)  # noqa: E731
            draw_thumbnails(pictures, folder, Progress(look, stop))

        self.thumbnails_void.emit()
        self._lanes["thumbing"].run(draw, look, lambda error: None, instead=True)

    def _forget_thumbnails(self) -> None:
        self._lanes["thumbing"].drop()
        self._thumbed = None
        if self._folder is not None:
            shutil.rmtree(self._folder, ignore_errors=True)
        self._folder = None


def _stopped(progress: Progress) -> bool:
    try:
        progress.tick("")
    except HingelightError:
        return True
    return False
