"""What should be found out next, given what is shown and what is known."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from viewer.session.pictures import second_mode
from viewer.session.project import Project
from viewer.session.state import State


@dataclass(frozen=True)
class Question:
    """``kind``: "study", "explain", "pair" (which mode became which), "compare" (and what changed), "lineage"."""

    kind: str
    design: str = ""
    mode: int = 0
    other: str = ""


def next_question(project: Project, state: State, asked: frozenset[Question]) -> Question | None:
    """The most urgent question that is neither answered nor among those ``asked`` in vain; None: all is known."""
    for question in _urgent_first(project, state):
        if question not in asked and not _answered(project, question):
            return question
    return None


def _urgent_first(project: Project, state: State) -> Iterator[Question]:
    other = project.other_of(state.design, state.other)
    if project.study(state.design) is None:
        yield Question("study", state.design)
        return
    yield from _for_the_stage(project, state, other)
    yield Question("explain", state.design, state.mode)
    if other:
        yield Question("study", other)
        if project.study(other) is not None:
            yield Question("pair", state.design, other=other)
            yield Question("compare", state.design, other=other)
    yield from _every_mode(project, state.design)
    for name in project.designs:
        yield Question("study", name)
        yield from _every_mode(project, name)


def _for_the_stage(project: Project, state: State, other: str) -> Iterator[Question]:
    """What the stage, or a chart in its place, waits for."""
    if state.page == "lineage":
        yield Question("lineage")
    charted = state.page in ("pairing", "ladder")
    if other and (charted or state.compared):
        yield Question("study", other)
        if project.study(other) is not None and (charted or second_mode(project, state) is None):
            yield Question("pair", state.design, other=other)


def _every_mode(project: Project, design: str) -> Iterator[Question]:
    for mode in range(1, project.count(design) + 1):
        yield Question("explain", design, mode)


def _answered(project: Project, question: Question) -> bool:
    pair = (question.design, question.other)
    return {
        "study": project.study(question.design) is not None,
        "explain": (question.design, question.mode) in project.told,
        "pair": pair in project.comparisons,
        "compare": pair in project.close,
        "lineage": project.lineage is not None,
    }[question.kind]
