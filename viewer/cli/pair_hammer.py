"""``hingelight pair`` of a hammer test: is the model right, what seems wrong in the test, what would help."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import typer

from viewer.cli.shell import answer, progress_bar

if TYPE_CHECKING:
    from viewer.jobs import Progress
    from viewer.workspace import OpenDossier
    from viewer.workspace.testing import TestExplanation, TestStudy


@dataclass(frozen=True)
class Wish:
    """The options of the command."""

    count: int | None
    out: Path | None
    pictures: Path | None
    accept: str | None
    place: int | None
    extra_points: Path | None
    extra: int
    theme: str
    width: int
    as_json: bool


def pair_test(opened: OpenDossier, test: str, design: str, wish: Wish) -> None:
    """Pair the modes of ``test`` with those of ``design`` ("": the test's own) and print all that is found."""
    from viewer.export.hammer_page import summary_of
    from viewer.export.hammer_rows import accept_words, channel_rows, proposal_rows, test_pair_rows
    from viewer.export.rows import short
    from viewer.export.tables import readable, write_table

    with progress_bar() as progress:
        opened, done = _written(opened, test, design, wish, progress)
        study = opened.test(test, design, wish.count, progress)
        _settled(study)
        told = study.explain(progress, extra=wish.extra)
        if wish.extra_points is not None:
            done += _extra(study, wish.extra_points, wish.extra, progress)
        if wish.pictures is not None:
            _pictures(study, told, wish, progress)
    assert told.correlation is not None
    rows = test_pair_rows(told.correlation.to_dict())
    if wish.out is not None:
        write_table(wish.out, rows)
    cautions = [*opened.warnings, *opened.doubts(study.design), *study.cautions]
    if wish.as_json:
        facts = {"title": opened.dossier.title, **summary_of(study, told), "written": done, "cautions": cautions}
        answer(facts)
        return
    for words in (*done, *told.sentences, *told.refused):
        typer.echo(words)
    typer.echo("\n" + readable(short(rows)))
    if told.faults is not None and told.faults.proposals:
        typer.echo("\n" + readable(proposal_rows(test, told.faults.to_dict())))
        typer.echo(accept_words(study, told.faults).replace("DOSSIER", str(opened.dossier.path)))
    doubtful = [row for row in channel_rows(study, told) if not row["used"]]
    if doubtful:
        typer.echo("\nNot used:\n" + readable(doubtful))
    for caution in cautions:
        typer.echo(f"caution: {caution}")


def _extra(study: TestStudy, path: Path, count: int, progress: Progress) -> list[str]:
    """The points that would help most, into a table; what was done in words."""
    from viewer.export.hammer_rows import extra_point_rows
    from viewer.export.tables import write_table

    rows = extra_point_rows(study, study.points(progress, count))
    if not rows:
        return [f"no further point would help: {path} is not written"]
    write_table(path, rows)
    return [f"written: {path}, places in metres, in the mesh's axes and in the test's"]


def _settled(study: TestStudy) -> None:
    """Refuse while the placement is not settled, with the option that settles it."""
    from viewer.errors import RefusedError

    try:
        study.registration.require(study.length_unit)
    except RefusedError as error:
        error.do += f"; hingelight pair DOSSIER {study.name} --place NUMBER writes the line for you"
        raise


def _written(
    opened: OpenDossier, test: str, design: str, wish: Wish, progress: Progress
) -> tuple[OpenDossier, list[str]]:
    """What was accepted, written into the dossier; the dossier as it is then, and what was done in words."""
    from viewer.errors import InputError
    from viewer.insight.corrections import correction_words
    from viewer.loaders import write_test_changes
    from viewer.workspace.testing import with_accepted

    done: list[str] = []
    path = opened.dossier.path
    if wish.place is not None:
        placed = opened.test(test, design, wish.count, progress).registration
        listed = [placed.placement, *(a.placement for a in placed.alternatives)]
        if wish.place > len(listed):
            raise InputError(
                f"test '{test}' has no placement {wish.place}", file=path, expected=f"1 to {len(listed)}"
            )
        write_test_changes(path, test, placement=listed[wish.place - 1])
        done.append(f"written into {path}: placement {wish.place} of test {test}")
        opened = opened.workspace.open(path)
    if wish.accept is not None:
        study = opened.test(test, design, wish.count, progress)
        numbers = _numbers(wish.accept, study, progress)
        corrections = with_accepted(study, numbers, progress)
        write_test_changes(path, test, corrections=corrections)
        fresh = corrections[len(study.plan.corrections) :]
        done += [f"written into {path}: {correction_words(c, study.test)}" for c in fresh]
        opened = opened.workspace.open(path)
    return opened, done


def _numbers(text: str, study: TestStudy, progress: Progress) -> list[int]:
    """ "1,3" as numbers; "all": every proposal that has one cause."""
    from viewer.errors import InputError

    if text.strip().lower() == "all":
        return [p.number for p in study.faults(progress).proposals if p.certain]
    try:
        return [int(part) for part in text.replace(" ", "").split(",") if part]
    except ValueError:
        raise InputError(
            "--accept does not name corrections", found=f"'{text}'", expected="numbers like 1,3, or all"
        ) from None


def _pictures(study: TestStudy, told: TestExplanation, wish: Wish, progress: Progress) -> None:
    """Charts, stills and loops into a folder."""
    from viewer.export.file_names import slugs
    from viewer.export.hammer_pictures import expanded_still, pair_loop, write_test_charts

    assert wish.pictures is not None and told.correlation is not None
    folder, stem = wish.pictures, slugs([f"test {study.name}"])[f"test {study.name}"]
    look: dict[str, Any] = {"theme": wish.theme, "width": wish.width}
    write_test_charts(folder, stem, study, told, **look)
    paired = told.correlation.paired
    for done, pair in enumerate(paired):
        progress.tick("drawing", done, len(paired))
        pair_loop(folder, stem, study, pair, **look)
        if told.expansion is not None and pair.test is not None:
            hinges = study.expanded(progress).hinges_if_known(pair.test - 1)
            expanded_still(folder, stem, study, pair.test, hinges, **look)
