"""Ctrl-C while drawing and while solving: exit 130 within seconds, nothing half-written, no process left.

The signal goes to the whole process group, as a terminal sends it. "Within seconds" is a patience of the test, not a
claim about time: what is asserted is that the run ends by itself."""

from __future__ import annotations

import os
import sys
from pathlib import Path

import pytest

from tests.integration.small_dossier import Run, write_block, write_small

pytestmark = pytest.mark.skipif(
    not Path("/proc/self/stat").exists() or sys.platform == "win32", reason="process groups are read from /proc"
)


def parts(folder: Path) -> list[Path]:
    return [path for path in folder.rglob("*") if path.name.startswith(".part-")]


def has_drawn(folder: Path) -> bool:
    """Whether a loop is finished in the folder that is being filled (one being written has a name of its own)."""
    return any(not path.name.startswith(".") for part in parts(folder) for path in part.glob("*.gif"))


def stopped_cleanly(run: Run, *folders: Path) -> None:
    code, out, errors = run.interrupt()
    assert code == 130, (code, out, errors)
    assert "Traceback" not in out + errors
    assert len(errors.strip().splitlines()) == 1
    assert "stopped" in errors
    assert run.left_over() == {}, "no process is left"
    for folder in folders:
        assert not folder.exists() or parts(folder) == []


def test_while_drawing(tmp_path):
    dossier, out = write_small(tmp_path / "in"), tmp_path / "reviews" / "out"
    run = Run("review", dossier, "--out", out, "--width", "320", cache=tmp_path / "cache")
    run.wait_until(lambda: has_drawn(tmp_path / "reviews"))
    stopped_cleanly(run, tmp_path)
    assert list((tmp_path / "reviews").iterdir()) == []


def test_while_drawing_over_an_earlier_review(tmp_path):
    """The earlier review stays as it was."""
    dossier, out = write_small(tmp_path / "in"), tmp_path / "reviews" / "out"
    out.mkdir(parents=True)
    (out / "index.html").write_text("earlier")
    run = Run("review", dossier, "--out", out, "--width", "320", "--no-cache", cache=tmp_path / "cache")
    run.wait_until(lambda: has_drawn(tmp_path / "reviews"))
    stopped_cleanly(run, tmp_path)
    assert [(p.name, p.read_text()) for p in out.iterdir()] == [("index.html", "earlier")]


def test_while_libraries_are_imported(tmp_path):
    """VTK turns an interrupt into an ImportError; two moments are tried, whichever it meets."""
    dossier, out = write_small(tmp_path / "in", along=4), tmp_path / "out"
    for used in (1.0, 1.6):
        run = Run("review", dossier, "--out", out, "--width", "320", "--no-cache", cache=tmp_path / "cache")
        run.wait_until(lambda: busy(run.process.pid, used))  # noqa: B023
        stopped_cleanly(run, tmp_path)
        assert not out.exists()


@pytest.mark.parametrize("cached", [True, False])
def test_while_solving(tmp_path, cached):
    """8 125 nodes, 24 000 directions: a factorisation gives no chance to look, so it runs in its own process."""
    dossier, out = write_block(tmp_path / "in", (24, 24, 12)), tmp_path / "reviews" / "out"
    options = [] if cached else ["--no-cache"]
    run = Run("review", dossier, "--out", out, *options, cache=tmp_path / "cache")
    run.wait_until(lambda: any("spawn_main" in words and busy(pid) for pid, words in run.group.items()))
    stopped_cleanly(run, tmp_path)
    assert not out.exists()
    assert not any((tmp_path / "cache").rglob("*.npz"))


def busy(pid: int, seconds: float = 2.5) -> bool:
    """Whether the process has used so much processor time that it is past its imports."""
    try:
        fields = Path(f"/proc/{pid}/stat").read_text().rsplit(")", 1)[1].split()
    except OSError:
        return False
    return (int(fields[11]) + int(fields[12])) / os.sysconf("SC_CLK_TCK") > seconds
