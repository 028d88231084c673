"""``hingelight show``: the window."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from viewer.cli.shell import command

INSTALL = 'pip install "hingelight[window]"; on a bare system also the packages that README.md lists'


@command
def show(
    path: Annotated[
        Path | None, typer.Argument(help="dossier.toml, its folder, or a mesh file; the sample boom by default.")
    ] = None,
    modes: Annotated[Path | None, typer.Argument(help="Mode set that belongs to a bare mesh.")] = None,
) -> None:
    """Open the window: stage, magnification rail, gallery and everything in words."""
    from viewer.errors import InputError

    try:
        from viewer.panels.app import run
    except ImportError as error:  # Qt's wheel, or a library of the system that it looks for
        raise InputError("the window cannot start", found=str(error), expected="Qt", do=INSTALL) from None
    raise typer.Exit(run(path, modes))
