"""What should be found out next, given what is shown and what is known; how it is found out; what is known then."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

from viewer.errors import HingelightError, RefusedError
from viewer.jobs import SILENT, Progress
from viewer.session.loading import compare_studies, explain, follow, lay_test, look_for_faults, read_study
from viewer.session.pictures import second_mode, test_of
from viewer.session.project import Project
from viewer.session.state import TEST_PAGES, State


@dataclass(frozen=True)
class Question:
    """``kind``: "study", "explain", "pair" (which mode became which), "compare" (and what changed), "lineage", "test"
    (a hammer test beside its design, whose name is ``other``), "faults" (channels of it that seem wrong)."""

    kind: str
    design: str = ""
    mode: int = 0
    other: str = ""


def find(project: Project, question: Question, progress: Progress = SILENT) -> Any:
    """The answer, from what is known. Raises what reading, solving and finding raise."""
    opened, studies = project.opened, project.studies
    if question.kind == "study":
        return read_study(opened, question.design, progress)
    if question.kind == "explain":
        return explain(studies[question.design], question.mode, progress)
    if question.kind == "lineage":
        return follow(opened, progress)
    if question.kind == "test":
        return lay_test(opened, question.other, progress)
    if question.kind == "faults":
        tested = project.tested(question.other)
        assert tested is not None
        return look_for_faults(tested, progress)
    first, second = studies[question.design], studies[question.other]
    return compare_studies(opened, first, second, progress, closely=question.kind == "compare")


def learn(project: Project, question: Question, answer: Any) -> Project:
    """The project with an answer more."""
    if question.kind == "study":
        return project.with_study(question.design, answer)
    if question.kind == "explain":
        return project.with_told(question.design, answer)
    if question.kind == "lineage":
        return project.with_lineage(answer)
    if question.kind in ("test", "faults"):
        return project.with_test(question.other, answer)
    pair = (question.design, question.other)
    return project.with_comparison(pair, answer, closely=question.kind == "compare")


def learn_why_not(project: Project, question: Question, error: HingelightError) -> Project | None:
    """The project that knows why there is no answer; None where that has no place in what is said of a mode."""
    if question.kind in ("pair", "compare") and isinstance(error, RefusedError):
        return project.with_comparison((question.design, question.other), str(error))
    if question.kind == "lineage":
        return project.with_lineage(str(error))
    if question.kind == "test":
        return project.with_test(question.other, str(error))
    return None


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
    yield from _of_tests(project, state.design)
    yield from _every_mode(project, state.design)
    for name in project.designs:
        yield Question("study", name)
        yield from _every_mode(project, name)


def _for_the_stage(project: Project, state: State, other: str) -> Iterator[Question]:
    """What the stage, or a chart in its place, waits for."""
    if state.page == "lineage":
        yield Question("lineage")
    if state.tested or state.page in TEST_PAGES:
        if name := test_of(project, state):
            yield Question("test", state.design, other=name)
        return
    charted = state.page in ("pairing", "ladder")
    if other and (charted or state.compared):
        yield Question("study", other)
        if project.study(other) is not None and (charted or second_mode(project, state) is None):
            yield Question("pair", state.design, other=other)


def _of_tests(project: Project, design: str) -> Iterator[Question]:
    for name in project.tests_of(design):
        yield Question("test", design, other=name)
        if project.tested(name) is not None:
            yield Question("faults", design, other=name)


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
        "test": question.other in project.tests,
        "faults": (found := project.tested(question.other)) is not None and found.faults is not None,
    }[question.kind]
