"""States that were left, for undo and redo."""

from __future__ import annotations

from dataclasses import dataclass, replace

from viewer.session.state import State

DEPTH = 200
PASSING = ("view", "fits", "playing", "phase", "theme")  # looks that undo leaves as they are


@dataclass(frozen=True)
class History:
    """The state now, those before it, and those undone. ``joined`` names the action that made the present one:
    steps of one drag are one step back."""

    present: State
    past: tuple[State, ...] = ()
    future: tuple[State, ...] = ()
    joined: str = ""

    def then(self, state: State, join: str = "") -> History:
        """The history after an action; ``join``: it continues the action of that name."""
        if _steady(state) == _steady(self.present):
            return replace(self, present=state)
        if join and join == self.joined:
            return replace(self, present=state, future=())
        return History(state, (*self.past, self.present)[-DEPTH:], (), join)

    def undone(self) -> History:
        """One step back; the same when there is none."""
        if not self.past:
            return self
        back = _with_passing(self.past[-1], self.present)
        return History(back, self.past[:-1], (self.present, *self.future))

    def redone(self) -> History:
        """One step forward again."""
        if not self.future:
            return self
        ahead = _with_passing(self.future[0], self.present)
        return History(ahead, (*self.past, self.present), self.future[1:])


def _steady(state: State) -> tuple[object, ...]:
    return tuple(value for name, value in vars(state).items() if name not in PASSING)


def _with_passing(state: State, now: State) -> State:
    return state.with_(**{name: getattr(now, name) for name in PASSING})
