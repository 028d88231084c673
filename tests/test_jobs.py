"""Progress, cancellation, atomic writes, child processes."""

from __future__ import annotations

import time

import pytest

from viewer.errors import Cancelled, ExportError, ModelError, SolveError
from viewer.jobs import SILENT, Crew, Progress, atomic_path, in_child


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


def _write(path, text, progress=SILENT):
    path.write_text(text)


def _write_slowly(path, progress=SILENT):
    path.with_suffix(".begun").write_text("")
    for _ in range(600):
        progress.tick("waiting")
        time.sleep(0.1)
    path.write_text("")


def _refuse_order(text, progress=SILENT):
    raise ModelError(text)


def _die_of_order(progress=SILENT):
    import multiprocessing
    import os

    while multiprocessing.parent_process() is None:  # the caller must not carry this one out himself
        time.sleep(0.01)
    os._exit(9)


@pytest.mark.parametrize("helpers", [0, 1, 2])
def test_a_crew_carries_out_every_order_once(tmp_path, helpers):
    with Crew(helpers) as crew:
        for number in range(30):
            crew.give(_write, tmp_path / f"{number}.txt", text=str(number))
        crew.finish()
        assert sorted(int(path.read_text()) for path in tmp_path.iterdir()) == list(range(30))


@pytest.mark.parametrize("helpers", [0, 1])
def test_a_failed_order_raises_its_own_error(helpers):
    with pytest.raises(ModelError, match="no material"), Crew(helpers) as crew:  # noqa: PT012 (anywhere in the crew's life)
        crew.give(_refuse_order, "no material")
        crew.finish()


def test_a_helper_that_dies_is_an_error_and_no_hang(tmp_path):
    with pytest.raises(SolveError, match="without an answer"), Crew(1) as crew:  # noqa: PT012 (anywhere in the crew's life)
        crew.give(_write, tmp_path / "first", "")
        while not (tmp_path / "first").exists():  # the helper has come to work
            time.sleep(0.02)
        crew.give(_die_of_order)
        while crew._processes[0].is_alive():
            time.sleep(0.02)
        crew.finish()


def test_cancelling_stops_caller_and_helpers_and_leaves_no_order(tmp_path):
    progress = Progress(stop=lambda: (tmp_path / "one.begun").exists() and (tmp_path / "two.begun").exists())
    with pytest.raises(Cancelled), Crew(1, progress) as crew:  # noqa: PT012 (anywhere in the crew's life)
        crew.give(_write_slowly, tmp_path / "one")
        crew.give(_write_slowly, tmp_path / "two")
        crew.finish()
    assert not any(process.is_alive() for process in crew._processes)
    assert sorted(path.name for path in tmp_path.iterdir()) == ["one.begun", "two.begun"]
