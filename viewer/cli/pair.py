"""``hingelight pair``: which mode of one design became which of another."""

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
    first: Annotated[str | None, typer.Argument(help="A design; default: the dossier's first.")] = None,
    second: Annotated[str | None, typer.Argument(help="Another design; default: the dossier's second.")] = None,
    count: Annotated[int | None, typer.Option(min=1, help="How many modes to solve.")] = None,
    out: Annotated[Path | None, typer.Option(help="Also write the table to this .csv or .json file.")] = None,
    pictures: Annotated[Path | None, typer.Option(help="Also write the charts to this folder.")] = None,
    by_shape: Annotated[
        bool, typer.Option("--by-shape", help="Leave aside the pairs that the dossier states.")
    ] = False,
    theme: Theme = "light",
    width: Width = 960,
    as_json: Json = False,
    no_cache: NoCache = False,
) -> None:
    """Pair the modes of two designs by shape: what each became, what vanished, what is new."""
    from viewer.errors import InputError
    from viewer.export.charts import save_pairing_charts
    from viewer.export.file_names import slugs
    from viewer.export.finding_rows import outcome_rows
    from viewer.export.rows import short
    from viewer.export.tables import readable, write_table
    from viewer.workspace.comparison import compare

    theme_checked(theme)
    opened = workspace(no_cache).open(dossier)
    one = first or opened.names[0]
    others = [name for name in opened.names if name != one]
    two = second or (others[0] if others else "")
    if not two or one == two:
        raise InputError("two designs are needed", file=dossier, found="one", do="add another design to the dossier")
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
