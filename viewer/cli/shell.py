"""What all commands share: options, the progress bar, JSON, and turning errors into one line and an exit code.

Exit 0 done, 1 bad input, 2 usage, 130 stopped by Ctrl-C.
"""

from __future__ import annotations

import functools
import json
import signal
import sys
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from types import FrameType
from typing import TYPE_CHECKING, Annotated, Any, NoReturn

import typer

from viewer.errors import Cancelled, HingelightError

if TYPE_CHECKING:
    from viewer.jobs import Progress

DossierPath = Annotated[Path, typer.Argument(help="dossier.toml, or the folder that holds it.")]
Json = Annotated[bool, typer.Option("--json", help="Print one JSON document instead of text.")]
NoCache = Annotated[bool, typer.Option("--no-cache", help="Neither read nor write the cache of solved modes.")]
Theme = Annotated[str, typer.Option(help="Colours: light or dark.")]
Width = Annotated[int, typer.Option(min=320, max=3840, help="Width of pictures in pixels.")]


def command(body: Callable[..., Any]) -> Callable[..., Any]:
    """Wrap a command's body: an error of our tree is one line (or one JSON object) and exit 1; Ctrl-C is 130."""

    @functools.wraps(body)
    def run(*args: Any, **options: Any) -> None:
        as_json = bool(options.get("as_json"))
        with _interrupts():
            try:
                body(*args, **options)
            except (KeyboardInterrupt, Cancelled):
                _stop(as_json)
            except Exception as error:
                _explain(error, as_json)

    return run


class _CtrlC:
    """Hears Ctrl-C: the first is remembered for the next tick of progress, a second breaks off at once.

    An exception in the middle of any code would be lost where Python or a library swallows it: in a destructor, in a
    callback, or while VTK is imported.
    """

    asked = False

    def __call__(self, number: int, frame: FrameType | None) -> None:
        if self.asked:
            signal.default_int_handler(number, frame)
        self.asked = True


@contextmanager
def _interrupts() -> Iterator[None]:
    if threading.current_thread() is not threading.main_thread():
        yield  # only the main thread hears signals
        return
    earlier = signal.signal(signal.SIGINT, _CtrlC())
    try:
        yield
    finally:
        signal.signal(signal.SIGINT, earlier)


def _stop_asked() -> bool:
    hears = signal.getsignal(signal.SIGINT)
    return isinstance(hears, _CtrlC) and hears.asked


def _stop(as_json: bool) -> NoReturn:
    _fail({"error": "Cancelled", "problem": "stopped; nothing half-written is left"}, as_json, "")
    raise typer.Exit(130) from None


def _explain(error: Exception, as_json: bool) -> NoReturn:
    """One line for an error that a user can be told about; any other goes on as it is."""
    if isinstance(error, HingelightError):
        _fail(error.to_dict(), as_json, str(error))
    elif isinstance(error, MemoryError):
        text = "memory ran out; do: use a coarser mesh, fewer modes or a machine with more memory"
        _fail({"error": "MemoryError", "problem": text}, as_json, text)
    else:
        raise error
    raise typer.Exit(1) from None


def _fail(parts: dict[str, Any], as_json: bool, text: str) -> None:
    if as_json:
        answer(parts)
    else:
        typer.echo(f"hingelight: {text or parts['problem']}", err=True)


def answer(document: Any) -> None:
    """Print one JSON document; NaN and infinity become null, since JSON has no word for them."""
    from viewer.model.plain import plain

    typer.echo(json.dumps(plain(document), indent=2, ensure_ascii=False, allow_nan=False))


@contextmanager
def progress_bar() -> Iterator[Progress]:
    """A progress sink that hears Ctrl-C, and draws on standard error when that is a terminal."""
    from viewer.jobs import Progress

    if not sys.stderr.isatty():
        yield Progress(stop=_stop_asked)
        return
    from rich.console import Console
    from rich.progress import BarColumn, TextColumn, TimeElapsedColumn
    from rich.progress import Progress as Bar

    with Bar(
        TextColumn("{task.description}"),
        BarColumn(30),
        TextColumn("{task.fields[count]}"),
        TimeElapsedColumn(),
        console=Console(stderr=True),
        transient=True,
    ) as bar:
        task = bar.add_task("", total=None, count="")

        def show(stage: str, done: int, total: int) -> None:
            bar.update(
                task, description=stage, completed=done, total=total or None, count=f"{done}/{total}" if total else ""
            )

        yield Progress(show, _stop_asked)


def workspace(no_cache: bool) -> Any:
    """The run's workspace."""
    from viewer.workspace import Workspace

    return Workspace(cache=None) if no_cache else Workspace()


def theme_checked(theme: str) -> str:
    if theme not in ("light", "dark"):
        raise typer.BadParameter(f"'{theme}' is neither light nor dark", param_hint="--theme")
    return theme
