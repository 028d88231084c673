"""Starts, asks, bounds and replaces the reader worker."""

from __future__ import annotations

import atexit
import functools
import json
import os
import queue
import subprocess
import sys
import tempfile
import threading
import time
from pathlib import Path
from typing import Any

import numpy as np

import viewer
from viewer.errors import LoadError
from viewer.jobs import SILENT, Progress
from viewer.model.arrays import Array

# Seconds a read may take: start-up and libraries, and the slowest text reader seen (about 1 MB/s, ten times slower).
_TIME, _TIME_PER_MB = 60.0, 10.0


class ReaderWorker:
    """One worker process, started when first asked, kept for the next file, replaced when it dies or is too slow."""

    def __init__(self, time_limit: float | None = None) -> None:
        self._time_limit = time_limit
        self._process: subprocess.Popen[str] | None = None
        self._answers: queue.Queue[str | None] = queue.Queue()
        self._lock = threading.Lock()

    def read(
        self, path: Path, how: str, progress: Progress = SILENT
    ) -> tuple[dict[tuple[str, str], Array], list[str]]:
        """Arrays by (section, name), and notes. ``how`` is "meshio" or "vtk". Raises ``LoadError``, ``Cancelled``."""
        with self._lock, tempfile.TemporaryDirectory(prefix="hingelight-") as folder:
            reply = self._ask({"path": str(path.resolve()), "how": how, "folder": folder}, path, progress)
            error = reply.get("error")
            if error:
                parts = {name: error.get(name) or "" for name in ("place", "found", "expected", "do")}
                raise LoadError(error["problem"], file=path, **parts)
            with np.load(Path(folder) / "arrays.npz", allow_pickle=False) as stored:
                values = [stored[f"arr_{i}"] for i in range(len(reply["arrays"]))]
            return {(section, name): v for (section, name), v in zip(reply["arrays"], values, strict=True)}, reply[
                "notes"
            ]

    def stop(self) -> None:
        """End the process."""
        if self._process is not None:
            self._process.kill()
            self._process.wait()
            for stream in (self._process.stdin, self._process.stdout):
                if stream is not None:
                    stream.close()
            self._process = None

    def _ask(self, request: dict[str, str], path: Path, progress: Progress) -> dict[str, Any]:
        if self._process is None or self._process.poll() is not None:
            self._start()
        process = self._process
        assert process is not None
        assert process.stdin is not None
        limit = self._time_limit or _TIME + _TIME_PER_MB * path.stat().st_size / 1e6
        give_up = time.monotonic() + limit
        try:
            process.stdin.write(json.dumps(request) + "\n")
            process.stdin.flush()
            while True:
                progress.tick(f"reading {path.name}")
                try:
                    line = self._answers.get(timeout=0.1)
                    break
                except queue.Empty:
                    if time.monotonic() > give_up:
                        raise LoadError(
                            "takes too long to read",
                            file=path,
                            found=f"no answer in {limit:.0f} s",
                            do="save it as .vtu or .npz; the file may be damaged",
                        ) from None
        except BrokenPipeError:
            line = None
        except BaseException:
            self.stop()
            raise
        if line is None:
            code = process.wait()
            self.stop()
            raise LoadError(
                "the reader broke down on this file",
                file=path,
                found=f"exit code {code}",
                do="the file is damaged, or needs more memory than there is: write it again",
            )
        return json.loads(line)

    def _start(self) -> None:
        self.stop()
        root = str(Path(viewer.__file__).parent.parent)
        paths = os.pathsep.join(p for p in (root, os.environ.get("PYTHONPATH", "")) if p)
        self._process = subprocess.Popen(
            [sys.executable, "-m", "viewer.loaders.reader_worker"],
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            stderr=subprocess.DEVNULL,
            text=True,
            encoding="utf-8",
            env={**os.environ, "PYTHONPATH": paths},
        )
        self._answers = queue.Queue()
        threading.Thread(target=_listen, args=(self._process.stdout, self._answers), daemon=True).start()


def _listen(stream: Any, answers: queue.Queue[str | None]) -> None:
    try:
        for line in stream:
            answers.put(line)
    except ValueError:  # closed while reading
        pass
    answers.put(None)


@functools.cache
def shared_worker() -> ReaderWorker:
    """The one worker of this process."""
    worker = ReaderWorker()
    atexit.register(worker.stop)
    return worker
