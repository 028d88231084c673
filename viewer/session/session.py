"""The one holder of the window's state: actions go in, listeners hear what became of them."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

from viewer.session.history import History
from viewer.session.project import Project
from viewer.session.state import State

Listener = Callable[[State, State], None]


class Session:
    """State with its history, and the project it is about. Not thread-safe: belongs to one thread."""

    def __init__(self, state: State | None = None) -> None:
        self._history = History(state or State())
        self._listeners: list[Listener] = []
        self.project: Project | None = None

    @property
    def state(self) -> State:
        return self._history.present

    @property
    def can_undo(self) -> bool:
        return bool(self._history.past)

    @property
    def can_redo(self) -> bool:
        return bool(self._history.future)

    def listen(self, listener: Listener) -> None:
        """Call ``listener(before, after)`` after each change of the state."""
        self._listeners.append(listener)

    def forget(self) -> None:
        """Let go of every listener."""
        self._listeners.clear()

    def do(self, action: Callable[..., State], *given: Any, join: str = "") -> None:
        """Carry out a pure action ``(state, *given) -> state``."""
        self._go(self._history.then(action(self.state, *given), join))

    def end_step(self) -> None:
        """What is done next is another step, even if it continues the last one."""
        self._history = replace(self._history, joined="")

    def undo(self) -> None:
        self._go(self._history.undone())

    def redo(self) -> None:
        self._go(self._history.redone())

    def start(self, project: Project | None, state: State) -> None:
        """Begin anew with another project: what was done before cannot be undone."""
        self.project = project
        before, self._history = self.state, History(state)
        self._tell(before)

    def _go(self, history: History) -> None:
        before, self._history = self.state, history
        if history.present is not before:
            self._tell(before)

    def _tell(self, before: State) -> None:
        for listener in list(self._listeners):
            listener(before, self.state)
