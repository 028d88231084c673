"""What became of a mode: its frequency, shape, hinges and character in the redesign, in one sentence."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from viewer.insight.character import Character
from viewer.insight.hinges import Hinge, HingeFinding
from viewer.insight.pairing import ModePair
from viewer.model.written import GAP, change, hertz

NEAR = 0.03  # of the diagonal: hinges farther apart are two
ALONG = np.cos(np.radians(30))
NOTABLE = 0.1  # relative change of a hinge's share of the energy that is said


@dataclass(frozen=True)
class HingeChange:
    """One hinge of the first design's mode, of the second's, or of both at one place; shares of strain energy."""

    place: str
    first: int | None
    second: int | None
    first_share: float | None
    second_share: float | None

    def _relative(self) -> float | None:
        return None if not self.first_share or self.second_share is None else self.second_share / self.first_share - 1

    def to_dict(self) -> dict[str, Any]:
        return {
            "place": self.place or None,
            "first_hinge": self.first,
            "second_hinge": self.second,
            "first_share": self.first_share,
            "second_share": self.second_share,
            "share_change": self._relative(),
        }


@dataclass(frozen=True, eq=False)
class Outcome:
    """What became of one mode of ``first_design`` in ``second_design``.

    names       of both modes as the user gave them; characters: suggested names where there are none
    hinges      None where hinges are not known for both
    """

    first_design: str
    second_design: str
    pair: ModePair
    names: tuple[str, str]
    characters: tuple[str, str]
    hinges: tuple[HingeChange, ...] | None

    @property
    def sentence(self) -> str:
        return sentence_of(self.to_dict())

    def to_dict(self) -> dict[str, Any]:
        return {
            "first_design": self.first_design,
            "second_design": self.second_design,
            **self.pair.to_dict(),
            "first_name": self.names[0] or None,
            "second_name": self.names[1] or None,
            "first_does": self.characters[0] or None,
            "second_does": self.characters[1] or None,
            "hinges": None if self.hinges is None else [hinge.to_dict() for hinge in self.hinges],
        }


def outcome(
    designs: tuple[str, str],
    pair: ModePair,
    names: tuple[str, str],
    characters: tuple[Character | None, Character | None],
    hinges: tuple[HingeFinding | None, HingeFinding | None],
    diagonal: float,
) -> Outcome:
    """The outcome of a pair; what is None is left unsaid. ``diagonal`` m, of the smaller body."""
    does = tuple("" if c is None else c.suggested_name or "" for c in characters)
    changes = None
    if hinges[0] is not None and hinges[1] is not None:
        changes = hinge_changes(hinges[0], hinges[1], NEAR * diagonal)
    return Outcome(designs[0], designs[1], pair, names, (does[0], does[1]), changes)


def hinge_changes(first: HingeFinding, second: HingeFinding, near: float) -> tuple[HingeChange, ...]:
    """Hinges of two modes matched by place and direction, nearest first; ``near`` m."""
    ways = sorted(
        (float(np.linalg.norm(a.position - b.position)), i, j)
        for i, a in enumerate(first.hinges)
        for j, b in enumerate(second.hinges)
        if abs(float(a.direction @ b.direction)) >= ALONG
    )
    mine: dict[int, int] = {}
    for distance, i, j in ways:
        if distance <= near and i not in mine and j not in mine.values():
            mine[i] = j
    changes = [_change(a, second.hinges[mine[i]] if i in mine else None) for i, a in enumerate(first.hinges)]
    changes += [_change(None, b) for j, b in enumerate(second.hinges) if j not in mine.values()]
    return tuple(changes)


def _change(a: Hinge | None, b: Hinge | None) -> HingeChange:
    share = lambda h: None if h is None or not np.isfinite(h.strain_share) else float(h.strain_share)  # noqa: E731
    one = a or b
    return HingeChange(
        getattr(one, "place", ""),
        None if a is None else a.number,
        None if b is None else b.number,
        share(a),
        share(b),
    )


def sentence_of(facts: dict[str, Any]) -> str:
    """The plain sentence made of the figures of ``Outcome.to_dict``."""
    one, two = facts["first_design"], facts["second_design"]
    if facts["kind"] == "beyond":
        which, other = ("first", two) if facts["first_mode"] else ("second", one)
        return (
            f"{_mode(facts[f'{which}_design'], facts, which)} lies so near the end of the modes compared that its "
            f"counterpart in {other} may lie beyond them (best agreement {facts['mac']:.0%})."
        )
    if facts["kind"] == "new":
        return f"{_mode(two, facts, 'second')} is new: no mode of {one} among those compared looks like it."
    head = _mode(one, facts, "first")
    if facts["kind"] == "vanished":
        return f"{head} has no counterpart among the modes of {two} (best agreement {facts['mac']:.0%})."
    if facts["kind"] == "merged":
        return f"{head} is taken up by mode {facts['merged_into']} of {two} (agreement {facts['mac']:.0%})."
    words = f"{head} becomes mode {facts['second_mode']} of {two} at {_hz(facts['second_hz'])}"
    if facts["change_percent"] is not None:
        words += f" ({change(facts['second_hz'], facts['first_hz'])})"
    agreement = facts["mac"] if facts["subspace_agreement"] is None else facts["subspace_agreement"]
    words += f", {_alike(agreement)} (agreement {agreement:.0%}"
    if facts["subspace_agreement"] is not None:
        listed = lambda modes: " and ".join(str(n) for n in modes)  # noqa: E731
        words += (
            f", modes {listed(facts['close_modes_first'])} against {listed(facts['close_modes_second'])} as a group"
        )
    words += ")"
    for hinge in facts["hinges"] or ():
        words += _hinge_words(hinge)
    if facts["first_does"] and facts["second_does"] and facts["first_does"] != facts["second_does"]:
        words += f"; what was “{facts['first_does']}” is now “{facts['second_does']}”"
    return words + "."


def _mode(design: str, facts: dict[str, Any], which: str) -> str:
    name = f" ({facts[f'{which}_name']})" if facts[f"{which}_name"] else ""
    return f"Mode {facts[f'{which}_mode']} of {design}{name}, {_hz(facts[f'{which}_hz'])},"


def _hz(value: float) -> str:
    return hertz(value) if value >= 0.01 else f"0{GAP}Hz"


def _alike(agreement: float) -> str:
    return "the same shape" if agreement >= 0.95 else "much the same shape" if agreement >= 0.8 else "a changed shape"


def _hinge_words(hinge: dict[str, Any]) -> str:
    at = f" at {hinge['place']}" if hinge["place"] else ""
    if hinge["second_hinge"] is None:
        held = "" if hinge["first_share"] is None else f", which held {hinge['first_share']:.0%} of the energy,"
        return f"; hinge {hinge['first_hinge']}{at}{held} is gone"
    if hinge["first_hinge"] is None:
        holds = "" if hinge["second_share"] is None else f" with {hinge['second_share']:.0%} of the energy"
        return f"; a new hinge{at}{holds}"
    if hinge["share_change"] is None or abs(hinge["share_change"]) < NOTABLE:
        return f"; hinge {hinge['first_hinge']}{at} stays"
    verb = "lost" if hinge["share_change"] < 0 else "gained"
    return (
        f"; hinge {hinge['first_hinge']}{at} {verb} {abs(hinge['share_change']):.0%} of its share of the energy "
        f"({hinge['first_share']:.0%} to {hinge['second_share']:.0%})"
    )
