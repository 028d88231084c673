"""``hingelight review``: everything for a dossier into one folder."""

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
def review(
    dossier: DossierPath,
    out: Annotated[Path, typer.Option(help="Folder for the pages, loops, pictures and tables.")] = Path(
        "hingelight-review"
    ),
    count: Annotated[int | None, typer.Option(min=1, help="How many modes a design.")] = None,
    theme: Theme = "light",
    width: Width = 960,
    as_json: Json = False,
    no_cache: NoCache = False,
) -> None:
    """Explain every mode of every design: loops, pictures, tables, comparisons, and a page that shows them."""
    from viewer.export.report import write_review
    from viewer.export.tables import readable

    theme_checked(theme)
    opened = workspace(no_cache).open(dossier)
    with progress_bar() as progress:
        done = write_review(opened, out, count=count, theme=theme, width=width, progress=progress)
    if as_json:
        answer(done.summary)
        return
    for title, rows in done.tables:
        typer.echo(f"\n{title}\n{readable(rows)}")
    for caution in done.cautions:
        typer.echo(f"caution: {caution}")
    typer.echo(f"\nOpen {done.index}")
