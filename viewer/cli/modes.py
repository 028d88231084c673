"""``hingelight modes``: frequencies, energies and sizes of every design as a table."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from viewer.cli.shell import DossierPath, Json, NoCache, answer, command, progress_bar, workspace


@command
def modes(
    dossier: DossierPath,
    design: Annotated[list[str] | None, typer.Option(help="Only this design; may be repeated.")] = None,
    count: Annotated[int | None, typer.Option(min=1, help="How many modes to solve.")] = None,
    out: Annotated[Path | None, typer.Option(help="Also write the table to this .csv or .json file.")] = None,
    as_json: Json = False,
    no_cache: NoCache = False,
) -> None:
    """List the modes of every design: frequency, where the energy sits, how large the motion really is."""
    from viewer.export.rows import mode_rows, short
    from viewer.export.tables import readable, write_table

    opened = workspace(no_cache).open(dossier)
    rows: list[dict[str, object]] = []
    cautions: list[str] = list(opened.warnings)
    with progress_bar() as progress:
        for name in design or opened.names:
            study = opened.study(name, count, progress)
            rows += mode_rows(study)
            cautions += study.cautions
    if out is not None:
        write_table(out, rows)
    if as_json:
        answer({"title": opened.dossier.title, "modes": rows, "cautions": cautions})
        return
    typer.echo(readable(short(rows)))
    for caution in cautions:
        typer.echo(f"caution: {caution}")
