"""``hingelight pair``: which mode of one design became which of another, or which measured mode is which."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from viewer.cli.shell import (
    DossierPath,
    Json,
    NoCache,
    Theme,
    Width,
    answer,
    command,
    progress_bar,
    theme_checked,
    workspace,
)


@command
def pair(
    dossier: DossierPath,
    first: Annotated[
        str | None, typer.Argument(help="A design, or a hammer test; default: the dossier's first design.")
    ] = None,
    second: Annotated[
        str | None, typer.Argument(help="Another design; default: the dossier's second, or the test's own design.")
    ] = None,
    count: Annotated[int | None, typer.Option(min=1, help="How many modes to solve.")] = None,
    out: Annotated[Path | None, typer.Option(help="Also write the table to this .csv or .json file.")] = None,
    pictures: Annotated[Path | None, typer.Option(help="Also write charts and pictures to this folder.")] = None,
    by_shape: Annotated[
        bool, typer.Option("--by-shape", help="Leave aside the pairs that the dossier states.")
    ] = False,
    accept: Annotated[
        str | None,
        typer.Option(help="Of a test: write these proposed corrections (numbers like 1,3 or all) into the dossier."),
    ] = None,
    place: Annotated[
        int | None, typer.Option(min=1, help="Of a test: write this one of the listed placements into the dossier.")
    ] = None,
    extra_points: Annotated[
        Path | None, typer.Option(help="Of a test: write the points that would help most to this .csv file.")
    ] = None,
    extra: Annotated[int, typer.Option(min=1, max=50, help="How many extra points.")] = 5,
    theme: Theme = "light",
    width: Width = 960,
    as_json: Json = False,
    no_cache: NoCache = False,
) -> None:
    """Pair the modes of two designs by shape, or those of a hammer test and a design: what became or is which."""
    from viewer.errors import InputError
    from viewer.export.charts import save_pairing_charts
    from viewer.export.file_names import slugs
    from viewer.export.finding_rows import outcome_rows
    from viewer.export.rows import short
    from viewer.export.tables import readable, write_table
    from viewer.workspace.comparison import compare

    theme_checked(theme)
    opened = workspace(no_cache).open(dossier)
    tests = [test.name for test in opened.dossier.tests if test.name not in opened.names]
    if first in tests or second in tests:
        from viewer.cli.pair_hammer import Wish, pair_test

        test, design = (first, second) if first in tests else (second, first)
        wish = Wish(count, out, pictures, accept, place, extra_points, extra, theme, width, as_json)
        pair_test(opened, str(test), design or "", wish)
        return
    if accept is not None or place is not None or extra_points is not None:
        raise InputError(
            "--accept, --place and --extra-points go with a hammer test",
            file=dossier,
            expected=f"one of: {', '.join(tests)}" if tests else "a test in the dossier ([[tests]])",
        )
    one = first or opened.names[0]
    others = [name for name in opened.names if name != one]
    two = second or (others[0] if others else "")
    if not two or one == two:
        do = f"add another design to the dossier, or name a test: {', '.join(tests)}" if tests else ""
        raise InputError(
            "two designs are needed", file=dossier, found="one", do=do or "add another design to the dossier"
        )
    with progress_bar() as progress:
        before, after = opened.study(one, count, progress), opened.study(two, count, progress)
        stated = () if by_shape else opened.stated_pairs(one, two)
        found = compare(before, after, stated, progress)
        if pictures is not None:
            stems = slugs(opened.names)
            save_pairing_charts(found, pictures, f"{stems[one]}_{stems[two]}", theme, width)
    facts = found.to_dict()
    rows = outcome_rows(facts)
    if out is not None:
        write_table(out, rows)
    cautions = [*opened.warnings, *(w for s in (before, after) for w in (*opened.doubts(s.design.name), *s.cautions))]
    if as_json:
        answer({"title": opened.dossier.title, **facts, "cautions": cautions})
        return
    typer.echo(found.sentence)
    typer.echo(facts["support_sentence"])
    for item in found.outcomes:
        typer.echo(f"  {item.sentence}")
    typer.echo("\n" + readable(short(rows)))
    for caution in cautions:
        typer.echo(f"caution: {caution}")
