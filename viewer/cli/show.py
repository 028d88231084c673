"""``hingelight show``: the window."""

from __future__ import annotations

from importlib.util import find_spec
from pathlib import Path
from typing import Annotated

import typer

from viewer.cli.shell import command

INSTALL = 'pip install "hingelight[window]"'


@command
def show(
    path: Annotated[
        Path | None, typer.Argument(help="dossier.toml, its folder, or a mesh file; the sample boom by default.")
    ] = None,
    modes: Annotated[Path | None, typer.Argument(help="Mode set that belongs to a bare mesh.")] = None,
) -> None:
    """Open the window: stage, magnification rail, gallery and everything in words."""
    from viewer.errors import InputError

    if find_spec("PySide6") is None:
        raise InputError("the window needs PySide6, which is not installed", do=f"install it: {INSTALL}")
    from viewer.panels.app import run

    raise typer.Exit(run(path, modes))
