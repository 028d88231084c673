"""In words: what is said about the chosen mode, question by question in the order of DESIGN §1."""

from __future__ import annotations

import re
from dataclasses import dataclass

from viewer.export.rows import point_rows
from viewer.insight.outcome import Outcome
from viewer.insight.scale import Scale
from viewer.scene.figures import digits, length
from viewer.session.model_words import LOOKING, model_words
from viewer.session.pictures import heading, name_of
from viewer.session.project import Project
from viewer.session.state import State
from viewer.workspace.explanation import Explanation

HEADINGS = {
    "does": "What it does",
    "folds": "Where it folds",
    "size": "How big it really is",
    "matters": "Whether it matters",
    "model": "Whether the model is right",
    "redesign": "What the redesign did",
    "change": "Where to stiffen or lighten next",
}


@dataclass(frozen=True)
class Bar:
    """A share drawn as a bar: 0 … 1; ``kind`` "energy" or "volume"."""

    label: str
    share: float
    kind: str


@dataclass(frozen=True)
class Entry:
    """One question and its answer.

    known   False: the sentence says what would answer it
    steps   how many things clicking lights up one after the other
    offer   what can be done about it, in words; empty: nothing
    """

    subject: str
    sentence: str
    known: bool = True
    bars: tuple[Bar, ...] = ()
    steps: int = 1
    offer: str = ""

    @property
    def heading(self) -> str:
        return HEADINGS[self.subject]


def entries(project: Project, state: State) -> tuple[Entry, ...]:
    """The answers about the chosen mode, as far as they are known."""
    study = project.study(state.design)
    if study is None or not 1 <= state.mode <= study.count:
        return ()
    return (
        _does(project, state),
        _folds(project, state),
        size_entry(study.scale(state.mode - 1)),
        _matters(project, state),
        _model(project, state),
        _redesign(project, state),
        _change(project, state),
    )


def as_text(project: Project, state: State) -> str:
    """Everything that is said about the chosen mode, as plain text."""
    name = name_of(project, state, state.design, state.mode)
    title = " · ".join(part for part in (state.design, heading(project, state), name) if part)
    said = [f"{entry.heading}: {entry.sentence}" for entry in entries(project, state)]
    return "\n".join([project.title, title, "", *said]) + "\n"


def _does(project: Project, state: State) -> Entry:
    told = project.told.get((state.design, state.mode))
    if told is None or told.character is None:
        return _unknown("does", told)
    return Entry("does", _after_title(told.character.sentence, state.mode))


def _folds(project: Project, state: State) -> Entry:
    told = project.told.get((state.design, state.mode))
    if told is None or told.hinges is None:
        return _unknown("folds", told)
    facts = told.hinges.to_dict()
    bars: tuple[Bar, ...] = ()
    listed = facts["hinges"]
    if listed:
        shown = next((h for h in listed if h["number"] == state.hinge), listed[0])
        if shown["strain_share"] is not None:
            bars = (Bar("energy", shown["strain_share"], "energy"), Bar("volume", shown["volume_share"], "volume"))
    return Entry("folds", told.hinges.sentence, bars=bars, steps=max(len(listed), 1))


def size_entry(scale: Scale) -> Entry:
    """How big the mode really is, or what would tell."""
    facts = scale.to_dict()
    if facts["largest_real_m"] is None:
        return Entry(
            "size",
            "Unknown: a mode shape has no size of its own. State one measured motion in the dossier ([[amplitudes]] "
            "with design, mode, point, direction and value) and every figure becomes real.",
            False,
        )
    base = "relative to the base" if facts["relative_to_base"] else "absolute"
    under = f"With {facts['condition']}, it" if facts["condition"] else "It"
    return Entry(
        "size",
        f"{under} really moves {length(scale.largest_real or 0.0)} at {facts['largest_place']}, "
        f"{facts['largest_direction']} ({facts['statistic']}, {base}).",
    )


def _matters(project: Project, state: State) -> Entry:
    study = project.studies[state.design]
    rows = [row for row in point_rows(study) if row["mode"] == state.mode]
    if not rows:
        return Entry(
            "matters",
            "Unknown: no point is declared whose motion matters. Add [[points]] to the dossier, with the direction "
            "that hurts.",
            False,
        )
    said = []
    for row in rows:
        percent = row["motion_percent_of_largest"]
        little = "hardly moves" if percent < 5 else "moves"
        effect = f"{row['effect'].capitalize()}: the" if row["effect"] else "The"
        words = f"{effect} {row['point']} {little} {row['direction']}, {digits(percent)} % of the largest motion"
        if row["real_motion_m"] is not None:
            words += f", {length(row['real_motion_m'])} really"
        said.append(f"{words}.")
    return Entry("matters", " ".join(said), steps=1)


def _model(project: Project, state: State) -> Entry:
    sentence, known, offer = model_words(project, state)
    return Entry("model", sentence, known, offer=offer)


def outcome_of(project: Project, state: State) -> Outcome | None:
    """What became of the chosen mode in the other design, where that is known."""
    other = project.other_of(state.design, state.other)
    found = project.comparison(state.design, other)
    if found is None:
        return None
    return next((o for o in found.outcomes if o.pair.first == state.mode), None)


def _redesign(project: Project, state: State) -> Entry:
    other = project.other_of(state.design, state.other)
    if not other:
        return Entry("redesign", "There is one design only: add another [[designs]] to compare it with.", False)
    found = outcome_of(project, state)
    if found is not None:
        return Entry("redesign", found.sentence)
    refused = project.comparisons.get((state.design, other))
    return Entry("redesign", refused if isinstance(refused, str) else LOOKING, False)


def _change(project: Project, state: State) -> Entry:
    told = project.told.get((state.design, state.mode))
    if told is None or told.gain is None:
        return _unknown("change", told)
    return Entry("change", _after_title(told.gain.sentence, state.mode))


def _after_title(sentence: str, mode: int) -> str:
    """A sentence without "Mode 1 (boom nods): " or "Mode 1 (84.79 Hz): " in front, which stands over it already."""
    found = re.match(rf"Mode {mode}(?: \([^()]*\))?: ", sentence)
    said = sentence[found.end() :] if found else sentence
    return said[:1].upper() + said[1:]


def _unknown(subject: str, told: Explanation | None) -> Entry:
    """Still being looked for, or why it cannot be had."""
    if told is None:
        return Entry(subject, LOOKING, False)
    reasons = "; ".join(told.refused)
    return Entry(subject, f"Unknown: {reasons}." if reasons else "Unknown.", False)
