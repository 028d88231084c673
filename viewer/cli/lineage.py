"""``hingelight lineage``: modes followed through a sweep, or through the dossier's designs in order."""

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
def lineage(
    dossier: DossierPath,
    sweep: Annotated[
        str | None, typer.Argument(help="A sweep of the dossier; without one its designs are followed in order.")
    ] = None,
    count: Annotated[int | None, typer.Option(min=1, help="How many modes to solve.")] = None,
    insert: Annotated[
        bool | None,
        typer.Option("--insert/--no-insert", help="Put further steps where modes pass one another too fast."),
    ] = None,
    out: Annotated[Path | None, typer.Option(help="Also write the table to this .csv or .json file.")] = None,
    pictures: Annotated[Path | None, typer.Option(help="Also write the chart to this folder.")] = None,
    theme: Theme = "light",
    width: Width = 960,
    as_json: Json = False,
    no_cache: NoCache = False,
) -> None:
    """Follow every mode through a sweep or a row of designs: which cross, which veer, which stay unresolved."""
    from viewer.export.charts import save_chart
    from viewer.export.file_names import slugs
    from viewer.export.lineage_rows import encounter_rows, lineage_rows, step_rows
    from viewer.export.tables import readable, write_table
    from viewer.scene.lineage_chart import lineage_chart
    from viewer.workspace.passage import follow_designs, follow_sweep

    theme_checked(theme)
    opened = workspace(no_cache).open(dossier)
    with progress_bar() as progress:
        if sweep is None:
            found, names = follow_designs(opened, count, progress), opened.names
        else:
            plan = opened.dossier.sweep(sweep)
            found, names = follow_sweep(opened, plan, count, insert, progress), (plan.design,)
        if pictures is not None:
            stem = "designs" if sweep is None else slugs([sweep])[sweep]
            save_chart(lineage_chart(found, theme=theme), pictures / f"lineage_{stem}.png", width=width)
    facts = found.to_dict()
    if out is not None:
        write_table(out, lineage_rows(facts))
    cautions = [*opened.warnings, *(words for name in names for words in opened.doubts(name))]
    if as_json:
        answer({"title": opened.dossier.title, **facts, "sentence": found.sentence, "cautions": cautions})
        return
    typer.echo(found.sentence)
    typer.echo("\n" + readable(step_rows(facts)))
    if facts["encounters"]:
        typer.echo("\n" + readable(encounter_rows(facts)))
    for caution in cautions:
        typer.echo(f"caution: {caution}")
