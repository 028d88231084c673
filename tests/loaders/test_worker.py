"""The reader worker: reused, bounded in time, replaced after a crash, deaf to what libraries print."""

import os
import signal
import threading

import meshio
import numpy as np
import pytest

from viewer.errors import Cancelled, LoadError
from viewer.jobs import Progress
from viewer.loaders.worker_client import ReaderWorker


@pytest.fixture
def worker():
    worker = ReaderWorker()
    yield worker
    worker.stop()


@pytest.fixture
def tet(tmp_path):
    points = np.array([[0, 0, 0], [1, 0, 0], [0, 1, 0], [0, 0, 1.0]])
    meshio.write(
        tmp_path / "a.msh", meshio.Mesh(points, [("tetra", [[0, 1, 2, 3]])]), file_format="gmsh22", binary=True
    )
    return tmp_path / "a.msh"


def test_one_process_serves_many_files_and_survives_bad_ones(worker, tet, tmp_path):
    bad = tmp_path / "bad.msh"
    bad.write_text("hello\n")  # meshio prints and ends the process with SystemExit
    arrays, _ = worker.read(tet, "meshio")
    first = worker._process.pid
    for _ in range(3):
        with pytest.raises(LoadError, match="meshio gave the file up"):
            worker.read(bad, "meshio")
        again, _ = worker.read(tet, "meshio")
        assert np.array_equal(again["Points", "Points"], arrays["Points", "Points"])
    assert worker._process.pid == first


def test_a_dead_worker_is_replaced(worker, tet):
    worker.read(tet, "meshio")
    first = worker._process.pid
    os.kill(first, signal.SIGKILL)
    worker._process.wait()
    worker.read(tet, "meshio")
    assert worker._process.pid != first


def test_a_crash_while_reading_is_one_clear_error(worker, tet):
    worker.read(tet, "meshio")
    os.kill(worker._process.pid, signal.SIGSTOP)  # it will not answer …
    threading.Timer(0.3, os.kill, (worker._process.pid, signal.SIGKILL)).start()  # … and dies
    with pytest.raises(LoadError, match=r"a\.msh: the reader broke down on this file; found: exit code -9"):
        worker.read(tet, "meshio")
    worker.read(tet, "meshio")


def test_too_slow_is_killed_and_replaced(tet):
    worker = ReaderWorker(time_limit=0.2)
    with pytest.raises(LoadError, match=r"a\.msh: takes too long to read; found: no answer in 0 s"):
        worker.read(tet, "meshio")  # starting Python takes longer than that
    assert worker._process is None
    worker._time_limit = None
    worker.read(tet, "meshio")
    worker.stop()


def test_cancelling_kills_the_read(worker, tet):
    with pytest.raises(Cancelled):
        worker.read(tet, "meshio", Progress(stop=lambda: True))
    assert worker._process is None


def test_memory_is_bounded(worker, tet):
    resource = pytest.importorskip("resource")
    worker.read(tet, "meshio")
    limit = resource.prlimit(worker._process.pid, resource.RLIMIT_AS)[0] if hasattr(resource, "prlimit") else 1
    assert 0 < limit < os.sysconf("SC_PAGE_SIZE") * os.sysconf("SC_PHYS_PAGES") or limit == 4 << 30
