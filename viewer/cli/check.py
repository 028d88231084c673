"""``hingelight check``: is the dossier sound; or, for a bare mesh, a ready dossier to start from."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from viewer.cli.shell import Json, NoCache, answer, command, progress_bar, workspace


@command
def check(
    path: Annotated[Path, typer.Argument(help="dossier.toml, its folder, or a mesh file.")],
    modes: Annotated[Path | None, typer.Argument(help="Mode set that belongs to a bare mesh.")] = None,
    as_json: Json = False,
    no_cache: NoCache = False,
) -> None:
    """Check a dossier without drawing; for a bare mesh, print a ready dossier with what was found and is needed."""
    from viewer.export.checkup import check_dossier, check_mesh

    with progress_bar() as progress:
        if path.is_dir() or path.suffix.lower() == ".toml":
            report = check_dossier(workspace(no_cache).open(path), progress)
        else:
            report = check_mesh(path, modes, progress)
    if as_json:
        answer(report.to_dict())
    else:
        typer.echo(report.text)
    if not report.sound:
        raise typer.Exit(1)
