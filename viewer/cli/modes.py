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
    name: Annotated[
        list[str] | None, typer.Option(help='Name a mode in the dossier: "DESIGN:NUMBER=words"; may be repeated.')
    ] = None,
    as_json: Json = False,
    no_cache: NoCache = False,
) -> None:
    """List the modes of every design: frequency, where the energy sits, how large the motion really is."""
    from viewer.export.rows import mode_rows, short
    from viewer.export.tables import readable, write_table
    from viewer.workspace import better_formulation

    owner = workspace(no_cache)
    for order in name or ():
        _save_name(dossier, order)
    opened = owner.open(dossier)
    rows: list[dict[str, object]] = []
    cautions: list[str] = list(opened.warnings)
    better: list[dict[str, object]] = []
    with progress_bar() as progress:
        for each in design or opened.names:
            study = opened.study(each, count, progress)
            rows += mode_rows(study)
            cautions += [*opened.doubts(each), *study.cautions]
            if as_json and (advice := better_formulation(study, progress)) is not None:
                better.append(advice.to_dict())
    if out is not None:
        write_table(out, rows)
    if as_json:
        answer({"title": opened.dossier.title, "modes": rows, "better_formulations": better, "cautions": cautions})
        return
    typer.echo(readable(short(rows)))
    for caution in cautions:
        typer.echo(f"caution: {caution}")


def _save_name(dossier: Path, order: str) -> None:
    """Carry out one ``--name``; the dossier keeps its comments and layout."""
    from viewer.loaders import save_mode_name
    from viewer.workspace.workspace import dossier_file

    where, equals, words = order.partition("=")
    design, _, number = where.rpartition(":")
    if not (equals and design and number.isdecimal()):
        raise typer.BadParameter(f"'{order}' is not DESIGN:NUMBER=words", param_hint="--name")
    save_mode_name(dossier_file(dossier), design, int(number), words.strip())
