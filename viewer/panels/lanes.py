"""Work beside the window: one thread a lane, its results handed over in the window's own thread."""

from __future__ import annotations

import threading
import time
from collections import deque
from collections.abc import Callable
from contextlib import suppress
from typing import Any

from PySide6.QtCore import QObject, Qt, Signal

from viewer.errors import Cancelled, HingelightError, SolveError
from viewer.jobs import Progress

Job = Callable[[Progress], Any]
_PAUSE = 0.05  # s between two reports of progress


class Ticket:
    """One order: what to do, whom to tell, and whether it is still wanted."""

    def __init__(self, job: Job, then: Callable[[Any], None], failed: Callable[[HingelightError], None]) -> None:
        self.job, self.then, self.failed = job, then, failed
        self.stopped = threading.Event()


class Lane(QObject):
    """Carries out orders one after the other. ``progressed(stage, done, total)`` and ``idle()`` are heard in the
    window's thread, as are the answers; nothing is heard of an order that was dropped."""

    progressed = Signal(str, int, int)
    idle = Signal()
    _arrived = Signal(object, object, object)

    def __init__(self, name: str, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._name = name
        self._orders: deque[Ticket] = deque()
        self._wake = threading.Condition()
        self._now: Ticket | None = None
        self._open = True
        self._thread: threading.Thread | None = None
        self._arrived.connect(self._hand_over, Qt.ConnectionType.QueuedConnection)

    @property
    def busy(self) -> bool:
        """Whether anything is under way or waiting."""
        return self._now is not None or bool(self._orders)

    @property
    def alive(self) -> bool:
        """Whether orders will be carried out."""
        return self._open and (self._thread is None or self._thread.is_alive())

    def run(
        self,
        job: Job,
        then: Callable[[Any], None],
        failed: Callable[[HingelightError], None],
        *,
        instead: bool = False,
    ) -> None:
        """Have ``job(progress)`` done; ``instead`` drops whatever is under way or waiting."""
        if not self._open:
            return
        if instead:
            self.drop()
        with self._wake:
            self._orders.append(Ticket(job, then, failed))
            self._wake.notify()
        if self._thread is None:
            self._thread = threading.Thread(target=self._work, name=self._name, daemon=True)
            self._thread.start()

    def drop(self) -> None:
        """Stop what is under way as soon as it can be, and forget what waits."""
        with self._wake:
            for ticket in self._orders:
                ticket.stopped.set()
            self._orders.clear()
            if self._now is not None:
                self._now.stopped.set()

    def close(self, patience: float = 10.0) -> None:
        """Drop everything and end the thread, waiting for it at most ``patience`` s."""
        self.drop()
        with self._wake:
            self._open = False
            self._wake.notify()
        if self._thread is not None:
            self._thread.join(patience)
        self._thread = None

    # ---- in the thread

    def _work(self) -> None:
        while True:
            with self._wake:
                while self._open and not self._orders:
                    self._wake.wait()
                if not self._open:
                    return
                ticket = self._now = self._orders.popleft()
            answer, error = None, None
            try:
                answer = ticket.job(self._progress(ticket))
            except HingelightError as found:
                error = found
            except MemoryError:
                error = SolveError("memory ran out", do="use a coarser mesh or fewer modes")
            except Exception as found:  # a fault of ours must not end the lane, nor pass unseen
                error = SolveError(f"{type(found).__name__}: {found}", do="please report this with the file")
                error.__cause__ = found
            with suppress(RuntimeError):  # the window may be gone
                self._arrived.emit(ticket, answer, error)
            del ticket, answer, error

    def _progress(self, ticket: Ticket) -> Progress:
        last = [0.0]

        def show(stage: str, done: int, total: int) -> None:
            now = time.monotonic()
            if now - last[0] >= _PAUSE:
                last[0] = now
                with suppress(RuntimeError):
                    self.progressed.emit(stage, done, total)

        return Progress(show, ticket.stopped.is_set)

    # ---- in the window's thread

    def _hand_over(self, ticket: Ticket, answer: Any, error: HingelightError | None) -> None:
        if self._now is ticket:
            self._now = None
        if self._open and not ticket.stopped.is_set():
            if error is None:
                ticket.then(answer)
            elif not isinstance(error, Cancelled):
                ticket.failed(error)
        if self._open and not self.busy:
            self.idle.emit()
