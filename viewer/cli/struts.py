"""``hingelight struts``: between which places a link would raise a mode most."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from viewer.cli.shell import DossierPath, Json, NoCache, answer, command, progress_bar, workspace


@command
def struts(
    dossier: DossierPath,
    mode: Annotated[
        int | None, typer.Option(min=1, help="Number of the mode to raise; default: the lowest elastic one.")
    ] = None,
    design: Annotated[str | None, typer.Option(help="The design; default: the first.")] = None,
    stiffness: Annotated[
        float | None,
        typer.Option(help="N/m of every strut; default: a rod of the design's material, 1 % of the diagonal thick."),
    ] = None,
    top: Annotated[int, typer.Option(min=1, max=100, help="How many struts to list.")] = 10,
    resolve: Annotated[
        bool, typer.Option("--resolve/--no-resolve", help="Solve the design again with each of the best three.")
    ] = True,
    out: Annotated[Path | None, typer.Option(help="Also write the table to this .csv or .json file.")] = None,
    as_json: Json = False,
    no_cache: NoCache = False,
) -> None:
    """Rank struts between facing places by how far they raise a mode; the dossier's clearances stay empty."""
    from viewer.export.strut_rows import strut_rows
    from viewer.export.tables import readable, write_table
    from viewer.insight.strut import RESOLVED
    from viewer.workspace.trials import try_struts

    opened = workspace(no_cache).open(dossier)
    name = design or opened.names[0]
    with progress_bar() as progress:
        found = try_struts(
            opened,
            name,
            mode,
            stiffness=stiffness,
            top=top,
            resolve=RESOLVED if resolve else 0,
            progress=progress,
        )
    facts = found.to_dict()
    rows = strut_rows(name, facts)
    if out is not None:
        write_table(out, rows)
    cautions = [*opened.warnings, *opened.doubts(name), *(f"{name}: {words}" for words in found.cautions)]
    if as_json:
        about = {"title": opened.dossier.title, "design": name, "sentence": found.sentence}
        answer({**about, **facts, "cautions": cautions})
        return
    typer.echo(found.sentence)
    if rows:
        typer.echo("\n" + readable(rows) + "\n")
        typer.echo(f"Stiffness: {found.stiffness_words}.")
    for caution in cautions:
        typer.echo(f"caution: {caution}")
