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
        if question not in asked:
            return question
    return None


def _urgent_first(project: Project, state: State) -> Iterator[Question]:
    design, other = state.design, project.other_of(state.design, state.other)
    if project.study(design) is None:
        yield Question("study", design)
        return
    if other and state.compared:
        if project.study(other) is None:
            yield Question("study", other)
        elif project.comparison(design, other) is None and second_mode(project, state) is None:
            yield Question("pair", design, other=other)
    if state.page in ("pairing", "ladder") and other and project.study(other) is not None:
        if project.comparison(design, other) is None:
            yield Question("pair", design, other=other)
    if state.page == "lineage" and project.lineage is None:
        yield Question("lineage")
    if (design, state.mode) not in project.told:
        yield Question("explain", design, state.mode)
    if other:
        if project.study(other) is None:
            yield Question("study", other)
        elif (design, other) not in project.close:
            if project.comparison(design, other) is None and not isinstance(
                project.comparisons.get((design, other)), str
            ):
                yield Question("pair", design, other=other)
            yield Question("compare", design, other=other)
    for mode in range(1, project.count(design) + 1):
        if (design, mode) not in project.told:
            yield Question("explain", design, mode)
    for name in project.designs:
        if name == design:
            continue
        if project.study(name) is None:
            yield Question("study", name)
        for mode in range(1, project.count(name) + 1):
            if (name, mode) not in project.told:
                yield Question("explain", name, mode)
