"""The part of a review that sets a test beside its design: whether the model is right."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from viewer.errors import RefusedError
from viewer.export.desk import Desk
from viewer.export.hammer_pictures import expanded_still, pair_loop, write_test_charts
from viewer.export.hammer_rows import (
    accept_words,
    channel_rows,
    choose_words,
    expansion_rows,
    extra_point_rows,
    placement_rows,
    proposal_rows,
    test_pair_rows,
)
from viewer.export.index_page import PageLoop, PageSection, PageTable
from viewer.insight.hammer_pairing import TestPair
from viewer.insight.pair_words import pair_sentence
from viewer.jobs import SILENT, Progress
from viewer.workspace import OpenDossier
from viewer.workspace.explanation import asked
from viewer.workspace.testing import TestExplanation, TestStudy

EXPANDED = "Of the measured shape spread over the mesh, an estimate:"


def beside_designs(
    opened: OpenDossier, count: int | None = None, progress: Progress = SILENT
) -> tuple[list[TestStudy], list[str]]:
    """Every test of the dossier beside its design, and why where that cannot be."""
    found, apart = [], []
    for plan in opened.dossier.tests:
        try:
            found.append(opened.test(plan.name, count=count, progress=progress))
        except RefusedError as error:
            apart.append(f"test {plan.name} is not compared: {error}")
    return found, apart


def test_section(desk: Desk, study: TestStudy) -> PageSection:
    """Write what shows a test beside its design; returns its part of the page."""
    progress = desk.steps.next(f"test {study.name} beside {study.design}")
    stem = desk.slugs[slug_key(study.name)]
    told = study.explain(progress)
    desk.tests[study.name] = (study, told)
    title = f"Whether {study.design} is right: test {study.name}"
    text = [*told.sentences, *(f"Corrected as the dossier says: {words}." for words in study.corrected)]
    text += [*_how_to_accept(study, told), *told.refused]
    if not study.registration.settled:
        rows = placement_rows(study.registration.to_dict())
        tables = desk.table(f"{stem}_placements", f"Where test {study.name} may lie", rows, show=True)
        return PageSection(title, (*text, choose_words(study)), (), tables, comparison=True)
    charts = write_test_charts(desk.folder, stem, study, told, give=desk.give, **desk.look)
    loops = [] if told.correlation is None else [_charts(told, charts)]
    for pair in () if told.correlation is None else told.correlation.paired:
        progress = desk.steps.next(f"test {study.name} mode {pair.test}")
        loops.append(_pair(desk, stem, study, pair, told, progress))
    return PageSection(title, tuple(text), tuple(loops), _tables(desk, stem, study, told), comparison=True)


def slug_key(name: str) -> str:
    """Under which a test's file names are kept: a design may have the same name."""
    return f"test {name}"


def summary_of(study: TestStudy, told: TestExplanation) -> dict[str, Any]:
    """Every figure that the page shows of a test."""
    return {**study.to_dict(), **told.to_dict(), "channels_listed": channel_rows(study, told)}


def _charts(told: TestExplanation, charts: tuple[tuple[str, str], ...]) -> PageLoop:
    assert told.correlation is not None
    sentence = told.correlation.sentence
    first, *others = charts
    return PageLoop("Which mode is which", still=first[1], caption=sentence, alt=sentence, findings=tuple(others))


def _pair(
    desk: Desk, stem: str, study: TestStudy, pair: TestPair, told: TestExplanation, progress: Progress
) -> PageLoop:
    """The loop of a pair; where the test can be expanded, what the measured shape does, marked as such."""
    mode = pair.test or 1
    loop = pair_loop(desk.folder, stem, study, pair, give=desk.give, **desk.look)
    sentences: tuple[str, ...] = ()
    findings = loop.findings
    if told.expansion is not None:
        hinges = asked(lambda: study.expanded(progress).hinges(mode - 1, progress), [])
        findings = (
            *findings,
            expanded_still(desk.folder, stem, study, mode, hinges, give=desk.give, **desk.look),
        )
        sentences = () if hinges is None else (f"{EXPANDED} {hinges.sentence}",)
    return replace(loop, caption=pair_sentence(pair.to_dict()), sentences=sentences, findings=findings)


def _tables(desk: Desk, stem: str, study: TestStudy, told: TestExplanation) -> tuple[PageTable, ...]:
    name = study.name
    tables: tuple[PageTable, ...] = ()
    if told.correlation is not None:
        rows = test_pair_rows(told.correlation.to_dict())
        tables += desk.table(f"{stem}_pairs", f"Test {name} beside {study.design}", rows, show=True)
    if told.faults is not None:
        rows = proposal_rows(name, told.faults.to_dict())
        tables += desk.table(f"{stem}_corrections", f"Corrections proposed for test {name}", rows, show=True)
    tables += desk.table(f"{stem}_channels", f"Channels of test {name}", channel_rows(study, told))
    if told.points is not None:
        rows = extra_point_rows(study, told.points)
        tables += desk.table(f"{stem}_extra_points", f"Points that would help test {name} most", rows)
    if told.expansion is not None:
        rows = expansion_rows(told.expansion.to_dict())
        tables += desk.table(f"{stem}_expansion", f"Test {name} spread over the mesh", rows)
    return tables


def _how_to_accept(study: TestStudy, told: TestExplanation) -> list[str]:
    if told.faults is None or not told.faults.proposals:
        return []
    return [f"Nothing is corrected unless you accept it: {accept_words(study, told.faults)}."]
