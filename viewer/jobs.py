"""Progress, cancellation, atomic writes and child processes.

Every function that can take over a second takes ``progress: Progress = SILENT`` and calls
``progress.tick(stage, done, total)`` between library calls; a cancelled job raises ``Cancelled`` there.
A call that gives no chance to look (a long factorisation) runs through :func:`in_child` and is killed.
"""

from __future__ import annotations

import contextlib
import multiprocessing
import os
import pickle
import sys
import tempfile
import traceback
import types
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

from viewer.errors import Cancelled, ExportError, HingelightError, SolveError


class Progress:
    """A progress sink. ``show(stage, done, total)`` draws, ``stop()`` says whether to cancel; both optional."""

    def __init__(
        self,
        show: Callable[[str, int, int], None] | None = None,
        stop: Callable[[], bool] | None = None,
    ) -> None:
        self._show, self._stop = show, stop

    def tick(self, stage: str, done: int = 0, total: int = 0) -> None:
        """Report ``done`` of ``total`` steps of ``stage`` (0 of 0: length unknown); raise ``Cancelled`` if asked."""
        if self._stop is not None and self._stop():
            raise Cancelled()
        if self._show is not None:
            self._show(stage, done, total)


SILENT = Progress()


@contextlib.contextmanager
def atomic_path(target: str | os.PathLike[str]) -> Iterator[Path]:
    """Yield a temporary path beside ``target``; move it into place on success, delete it on any failure.

    The temporary name keeps the suffix, since writers choose their format by it.
    """
    final = Path(target)
    try:
        final.parent.mkdir(parents=True, exist_ok=True)
        handle, name = tempfile.mkstemp(prefix=".part-", suffix="".join(final.suffixes[-1:]), dir=final.parent)
        os.close(handle)
    except OSError as error:
        raise ExportError("cannot be written", file=final, found=str(error), do="choose a writable folder") from error
    part = Path(name)
    try:
        yield part
        umask = os.umask(0)
        os.umask(umask)
        part.chmod(0o666 & ~umask)  # mkstemp makes private files; an output gets the user's usual mode
        part.replace(final)
    except OSError as error:
        raise ExportError("cannot be written", file=final, found=str(error), do="check space and rights") from error
    finally:
        part.unlink(missing_ok=True)


def write_text(target: str | os.PathLike[str], text: str) -> Path:
    """Write UTF-8 text atomically; returns the path."""
    with atomic_path(target) as part:
        part.write_text(text, encoding="utf-8", newline="\n")
    return Path(target)


def in_child(function: Callable[..., Any], *args: Any, progress: Progress = SILENT, stage: str = "") -> Any:
    """Run ``function(*args)`` in a fresh process and return its result; cancelling kills it at once.

    ``function`` must be importable and everything picklable; large results belong in a file whose path is
    returned. Errors of our tree come back as they were; anything else becomes a ``SolveError``. Within such a child
    the function runs in place: whoever kills the child ends it too.
    """
    if multiprocessing.current_process().daemon:
        return function(*args)
    with tempfile.TemporaryDirectory(prefix="hingelight-") as folder:
        # not through the pipe that starts the process: a child that fails before it reads would leave us writing
        order = Path(folder) / "order"
        with open(order, "wb") as file:
            pickle.dump((function, args), file, protocol=pickle.HIGHEST_PROTOCOL)
        return _answer_of(order, progress, stage)


def _answer_of(order: Path, progress: Progress, stage: str) -> Any:
    context = multiprocessing.get_context("spawn")
    mine, theirs = context.Pipe(duplex=False)
    process = context.Process(target=_child, args=(theirs, order), daemon=True)
    with no_main_module():
        process.start()
    theirs.close()
    try:
        while not mine.poll(0.1):
            progress.tick(stage)
            if not process.is_alive() and not mine.poll(0):
                raise SolveError(
                    f"the child process for '{stage}' ended without an answer",
                    found=f"exit code {process.exitcode}",
                    do="most often memory ran out: use a coarser mesh or fewer modes",
                )
        try:
            good, answer = mine.recv()
        except EOFError as error:
            raise SolveError(f"the child process for '{stage}' ended without an answer") from error
    finally:
        if process.is_alive():
            process.terminate()
        process.join()
        mine.close()
    if good:
        return answer
    raise answer


@contextlib.contextmanager
def no_main_module() -> Iterator[None]:
    """Keep the child from running the caller's script again: plain scripts have no guard against that."""
    main = sys.modules["__main__"]
    sys.modules["__main__"] = types.ModuleType("__main__")
    try:
        yield
    finally:
        sys.modules["__main__"] = main


def _child(pipe, order: Path) -> None:
    try:
        with open(order, "rb") as file:
            function, args = pickle.load(file)
        answer: tuple[bool, Any] = (True, function(*args))
    except HingelightError as error:
        answer = (False, error)
    except KeyboardInterrupt:
        answer = (False, Cancelled())
    except BaseException as error:
        trace = traceback.format_exc(limit=-3)
        answer = (False, SolveError(f"{type(error).__name__}: {error}", found=trace))
    with contextlib.suppress(OSError):
        pipe.send(answer)
    pipe.close()
