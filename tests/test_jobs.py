"""Progress, cancellation, atomic writes, child processes."""

from __future__ import annotations

import time

import pytest

from viewer.errors import Cancelled, ExportError, ModelError, SolveError
from viewer.jobs import Progress, atomic_path, in_child


def test_atomic_write_leaves_nothing_on_failure(tmp_path):
    target = tmp_path / "out.txt"
    target.write_text("old")
    with pytest.raises(RuntimeError):  # noqa: PT012 (the failure must come from inside the block)
        with atomic_path(target) as part:
            part.write_text("half")
            raise RuntimeError
    assert target.read_text() == "old"
    assert [p.name for p in tmp_path.iterdir()] == ["out.txt"]


def test_atomic_write_into_a_file_as_folder_is_one_error(tmp_path):
    (tmp_path / "file").write_text("")
    with pytest.raises(ExportError, match="cannot be written"), atomic_path(tmp_path / "file" / "out.txt"):
        pass


def test_cancel_kills_a_child_that_never_looks():
    started = time.monotonic()
    progress = Progress(stop=lambda: time.monotonic() - started > 1.0)
    with pytest.raises(Cancelled):
        in_child(time.sleep, 600, progress=progress, stage="sleeping")


def _refuse(text):
    raise ModelError(text, file="a.vtu", found="nothing", do="add a material")


def _die():
    import os

    os._exit(9)


def test_child_errors_keep_their_parts():
    with pytest.raises(ModelError) as caught:
        in_child(_refuse, "no material")
    assert str(caught.value) == "a.vtu: no material; found: nothing; do: add a material"


def test_child_that_dies_is_an_error():
    with pytest.raises(SolveError, match="without an answer"):
        in_child(_die, stage="dying")


class _Unreadable:
    """Fails in the child, as a module that cannot be imported there does."""

    def __reduce__(self):
        return _refuse, ("cannot be read",)


def test_a_child_that_cannot_read_a_large_order_does_not_leave_us_waiting():
    with pytest.raises(ModelError, match="cannot be read"):
        in_child(len, [_Unreadable(), b"0" * 2**22], stage="reading")


def test_child_returns_its_answer():
    assert in_child(divmod, 17, 5) == (3, 2)
