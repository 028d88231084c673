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
import time
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

    def quiet(self) -> Progress:
        """One that stops when this one is asked to, and shows nothing."""
        return Progress(stop=self._stop)


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
        return _answer_of(lay_down(Path(folder) / "order", (function, args)), progress, stage)


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
        answer = (False, _as_ours(error))
    with contextlib.suppress(OSError):
        pipe.send(answer)
    pipe.close()


_WAIT = 0.02  # s between two looks
Give = Callable[..., None]  # give(function, *args, **options)


def at_once(function: Callable[..., Any], *args: Any, **options: Any) -> None:
    """Carry out an order here and now: what ``Crew.give`` is without a crew."""
    function(*args, **options)


class Crew:
    """Orders that other processes carry out beside the caller: ``with Crew() as crew: crew.give(function, *args)``.

    Orders are files in a folder of the crew's own; whoever renames one first has it, and nobody waits for anybody.
    A caller who has more than ``BACKLOG`` orders waiting carries one out himself. ``finish`` joins in until all are
    done and raises what the first failed order raised; leaving the block early kills the others at once. Functions
    must be importable, take ``progress``, and write files; arguments must be picklable.
    """

    BACKLOG = 12

    def __init__(self, helpers: int | None = None, progress: Progress = SILENT) -> None:
        """``helpers`` 0: all is done by the caller; None: by the number of processors, 3 at the most."""
        self._progress = progress
        if multiprocessing.current_process().daemon:  # such a process may not have children
            helpers = 0
        self._size = min((os.cpu_count() or 1) - 1, 3) if helpers is None else helpers
        self._folder = tempfile.TemporaryDirectory(prefix="hingelight-")
        self._processes: list[Any] = []
        self._given = 0

    def __enter__(self) -> Crew:
        return self

    def __exit__(self, *_: object) -> None:
        for process in self._processes:
            process.terminate()
        for process in self._processes:
            process.join()
        self._folder.cleanup()

    def give(self, function: Callable[..., Any], *args: Any, **options: Any) -> None:
        """Have ``function(*args, **options)`` carried out by somebody, some time before ``finish`` returns."""
        if self._size == 0:
            function(*args, **options, progress=self._progress.quiet())
            return
        folder = Path(self._folder.name)
        lay_down(folder / f"{self._given:06d}.order", (function, args, options))
        self._given += 1
        if len(self._processes) < self._size:
            process = multiprocessing.get_context("spawn").Process(target=_serve, args=(folder,), daemon=True)
            with no_main_module():
                process.start()
            self._processes.append(process)
        if len(_waiting(folder)) > self.BACKLOG:
            self._join_in()

    def finish(self, stage: str = "") -> None:
        """Return when all orders are carried out."""
        folder = Path(self._folder.name)
        while self._given:
            self._progress.tick(stage, len(list(folder.glob("*.done"))), self._given)
            if self._join_in():
                continue
            if len(list(folder.glob("*.done"))) == self._given:
                break
            time.sleep(_WAIT)
        self._raise_failure()

    def _join_in(self) -> bool:
        """Carry out one order here; False when none waits."""
        self._raise_failure()
        return _carry_out_one(Path(self._folder.name), self._progress.quiet())

    def _raise_failure(self) -> None:
        ended = not all(process.is_alive() for process in self._processes)  # they end of themselves only by failing
        for path in Path(self._folder.name).glob("*.failed"):
            raise pickle.loads(path.read_bytes())
        if ended:
            raise SolveError(
                "a process at work beside this one ended without an answer",
                do="most often memory ran out: use a coarser mesh or a smaller picture",
            )


def _waiting(folder: Path) -> list[Path]:
    return sorted(folder.glob("*.order"))


def _carry_out_one(folder: Path, progress: Progress = SILENT) -> bool:
    """Take the oldest order that nobody has taken, and carry it out."""
    for order in _waiting(folder):
        taken = order.with_suffix(".taken")
        try:
            order.rename(taken)
        except OSError:  # somebody else was faster
            continue
        function, args, options = pickle.loads(taken.read_bytes())
        function(*args, **options, progress=progress)
        taken.rename(order.with_suffix(".done"))
        return True
    return False


def _serve(folder: Path) -> None:
    """A helper's life: ended by its crew."""
    parent = multiprocessing.parent_process()
    try:
        while parent is not None and parent.is_alive():
            if not _carry_out_one(folder):
                time.sleep(_WAIT)
    except KeyboardInterrupt:  # the caller has heard it too
        return
    except BaseException as error:
        told = error if isinstance(error, HingelightError) else _as_ours(error)
        with contextlib.suppress(OSError):
            lay_down(folder / f"{os.getpid()}.failed", told)


def lay_down(path: Path, what: Any) -> Path:
    """Pickle for another process of ours into a file that appears under its name when it is whole; returns the path.

    Not through a pipe: who is killed while a full one is read or written leaves the other end waiting for ever.
    """
    part = path.with_suffix(".part")
    with open(part, "wb") as file:
        pickle.dump(what, file, protocol=pickle.HIGHEST_PROTOCOL)
    part.rename(path)
    return path


def _as_ours(error: BaseException) -> HingelightError:
    return SolveError(f"{type(error).__name__}: {error}", found=traceback.format_exc(limit=-3))
