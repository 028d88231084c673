"""The magnification rail as figures: where things stand on a logarithmic scale from ×1 to beyond what is drawn."""

from __future__ import annotations

from dataclasses import dataclass
from math import ceil, floor, log10

from viewer.insight.scale import Scale
from viewer.scene.figures import digits, length, times

SNAP = 0.02  # of the rail: a handle this near to ×1 is at ×1
LEAST_PERCENT, MOST_PERCENT = 0.01, 40.0  # of the diagonal, where the size is unknown
ROOM = 3.0  # the rail goes on this many times beyond what is drawn by itself


@dataclass(frozen=True)
class Tick:
    """``at`` 0 … 1 along the rail; words only at the main ones."""

    at: float
    words: str = ""


@dataclass(frozen=True)
class Rail:
    """What the rail shows.

    known    whether the mode has a real size; without one the rail measures the drawn peak in % of the diagonal
    at       0 … 1, where the handle stands; ``drawn`` where it stands by itself
    label    beside the handle: magnification and real motion
    hint     what would make the size known, empty when it is
    """

    known: bool
    at: float
    drawn: float
    label: str
    hint: str
    ticks: tuple[Tick, ...]
    low: float
    high: float
    own: float

    def enlarged_at(self, at: float) -> float | None:
        """How many times as large as drawn by itself the motion is when the handle stands at ``at``; None: at true
        scale."""
        at = min(max(at, 0.0), 1.0)
        if self.known and at < SNAP:
            return None
        return 10 ** (self.low + at * (self.high - self.low)) / self.own

    def place(self, value: float) -> float:
        """0 … 1 of a magnification (or of a percentage) along the rail."""
        return min(max((log10(max(value, 1e-300)) - self.low) / (self.high - self.low), 0.0), 1.0)


def rail_of(scale: Scale | None, true_scale: bool, enlarge: float) -> Rail | None:
    """The rail of a mode that is drawn by ``scale`` when nothing else is wished."""
    if scale is None:
        return None
    own = scale.magnification
    if own is None:
        return _unknown(scale, enlarge)
    high = max(ceil(log10(max(own * ROOM, 10.0))), 1)
    now = 1.0 if true_scale else own * enlarge
    label = f"{times(now)} · {length(scale.largest_real or 0.0)} real"
    if true_scale:
        label = f"true scale · {length(scale.largest_real or 0.0)} real"
    rail = Rail(True, 0.0, 0.0, label, "", _ticks(0, high, lambda e: _times_words(e)), 0.0, float(high), own)
    return _with_places(rail, now, own)


def _unknown(scale: Scale, enlarge: float) -> Rail:
    low, high = log10(LEAST_PERCENT), log10(MOST_PERCENT)
    now = scale.drawn_percent * enlarge
    label = f"peak drawn at {digits(now)} % of the diagonal"
    hint = "size unknown: give [[amplitudes]] in the dossier"
    ticks = _ticks(floor(low), ceil(high), lambda e: f"{digits(10.0**e, 1)} %")
    rail = Rail(False, 0.0, 0.0, label, hint, (), low, high, scale.drawn_percent)
    shown = [Tick((t.at * (ceil(high) - floor(low)) + floor(low) - low) / (high - low), t.words) for t in ticks]
    return _with_places(
        Rail(**{**vars(rail), "ticks": tuple(t for t in shown if -1e-9 <= t.at <= 1 + 1e-9)}),
        now,
        scale.drawn_percent,
    )


def _with_places(rail: Rail, now: float, own: float) -> Rail:
    return Rail(**{**vars(rail), "at": rail.place(now), "drawn": rail.place(own)})


def _times_words(exponent: int) -> str:
    return "×1 true" if exponent == 0 else f"×{digits(10.0**exponent, 1)}"


def _ticks(low: int, high: int, words) -> tuple[Tick, ...]:
    found = []
    span = high - low
    for e in range(low, high + 1):
        found.append(Tick((e - low) / span, words(e)))
        if e < high:
            found += [Tick((e - low + log10(k)) / span) for k in range(2, 10)]
    return tuple(found)
