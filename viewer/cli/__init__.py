"""The command ``hingelight``: one module per command, heavy imports inside the bodies."""

from __future__ import annotations

import typer

from viewer.cli.animate import animate
from viewer.cli.check import check
from viewer.cli.hinges import hinges
from viewer.cli.lineage import lineage
from viewer.cli.modes import modes
from viewer.cli.pair import pair
from viewer.cli.review import review
from viewer.cli.show import show
from viewer.cli.struts import struts

app = typer.Typer(
    name="hingelight",
    help="Explains vibration mode shapes: what moves, how big it really is, what the redesign did.",
    no_args_is_help=True,
    add_completion=False,
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["-h", "--help"]},
)
for command in (review, show, modes, hinges, struts, pair, lineage, animate, check):
    app.command()(command)


@app.callback(invoke_without_command=True)
def face(version: bool = typer.Option(False, "--version", help="Print the version and stop.", is_eager=True)) -> None:
    if version:
        from viewer import __version__

        typer.echo(f"hingelight {__version__}")
        raise typer.Exit()


def main() -> None:
    """Entry point."""
    app()
