"""Exports from the window: the command line's pixels, and nothing left of one that is stopped or killed."""

from __future__ import annotations

import csv
import multiprocessing
import os
import signal

import numpy as np
import pytest
from PIL import Image, ImageSequence
from typer.testing import CliRunner

from tests.panels.told import Told
from tests.session_parts import write_strip
from viewer.cli import app as cli


@pytest.fixture
def strip(tmp_path):
    return write_strip(tmp_path / "strip")


@pytest.fixture
def told(make_window, strip, until, settled):
    hands = Told(make_window(strip), until, settled)
    hands.settled(hands.window)
    return hands


@pytest.fixture
def out(tmp_path):
    (tmp_path / "out").mkdir()
    return tmp_path / "out"


def command(*arguments) -> None:
    done = CliRunner().invoke(cli, [str(each) for each in arguments])
    assert done.exit_code == 0, done.output


def exported(told, kind, path) -> None:
    told.window.deeds.export_to(kind, path)
    assert told.window.export_strip.isVisible() and path.name in told.window.export_strip.words
    told.until(lambda: not told.window.conductor.writing.busy, f"{path.name} is written")
    assert not told.window.export_strip.isVisible()


def test_a_loop_has_the_command_lines_pixels(told, strip, out):
    """And the window plays on meanwhile."""
    drawn = told.window.playback.drawn
    exported(told, "gif", out / "loop.gif")
    assert told.window.playback.drawn > drawn and "loop.gif is written" in told.text()
    command("animate", strip, 1, "--out", out / "theirs.gif")
    mine, theirs = ([np.asarray(f.convert("RGB")) for f in ImageSequence.Iterator(Image.open(out / name))]
                    for name in ("loop.gif", "theirs.gif"))  # fmt: skip
    assert len(mine) == len(theirs) > 1
    assert all((one == two).all() for one, two in zip(mine, theirs, strict=True))
    assert (mine[0] != mine[len(mine) // 2]).any(), "it moves"


def test_a_still_of_a_dark_pair_has_the_command_lines_pixels(told, strip, out):
    from PySide6.QtCore import Qt

    told.key(Qt.Key.Key_L)
    told.key(Qt.Key.Key_C)
    exported(told, "png", out / "pair.png")
    command("animate", strip, 1, "--against", "thick", "--theme", "dark", "--out", out / "theirs.png")
    mine, theirs = (np.asarray(Image.open(out / name)) for name in ("pair.png", "theirs.png"))
    assert mine.shape == theirs.shape and (mine == theirs).all()


def test_tables_are_the_command_lines(told, strip, out):
    exported(told, "tables", out / "thin_modes.csv")
    command("modes", strip, "--design", "thin", "--out", out / "theirs.csv")
    assert (out / "thin_modes.csv").read_text() == (out / "theirs.csv").read_text()
    with open(out / "thin_comparison.csv", newline="", encoding="utf-8") as file:
        assert len(list(csv.DictReader(file))) >= 4
    assert "thin_points.csv" in told.text()


def test_a_stopped_export_leaves_no_file(told, out):
    """Stopped by its button while the child draws."""
    told.window.deeds.export_to("gif", out / "loop.gif")
    told.until(lambda: multiprocessing.active_children(), "the child draws")
    told.click(told.window.export_strip.stop_button)
    told.until(lambda: not told.window.conductor.writing.busy, "it is over")
    assert list(out.iterdir()) == [] and not told.window.export_strip.isVisible()
    assert told.window.notice.kind == "", "who stops something need not be told"
    exported(told, "png", out / "still.png")
    assert [path.name for path in out.iterdir()] == ["still.png"], "the next one is written"


def test_a_killed_export_leaves_no_file(told, out):
    """Killed from outside while it writes, as when memory runs out: told, and nothing is left."""
    told.window.deeds.export_to("gif", out / "loop.gif")
    told.until(lambda: multiprocessing.active_children(), "the child draws")
    for child in multiprocessing.active_children():
        os.kill(child.pid, signal.SIGKILL)
    told.until(lambda: told.window.notice.kind == "error", "it is told")
    assert "ended without an answer" in told.text()
    assert list(out.iterdir()) == []


def test_closing_the_window_stops_an_export(told, out):
    told.window.deeds.export_to("gif", out / "loop.gif")
    told.until(lambda: multiprocessing.active_children(), "the child draws")
    told.window.close()
    assert not multiprocessing.active_children() and list(out.iterdir()) == []


def test_a_place_that_cannot_be_written_is_told(told, out):
    (out / "a file").write_text("no folder", encoding="utf-8")
    told.window.deeds.export_to("png", out / "a file" / "still.png")
    told.until(lambda: told.window.notice.kind == "error", "it is told")
    assert "a file" in told.text()
    told.window.deeds.export_to("gif", out / "loop.avi")
    told.until(lambda: ".avi" in told.text(), "the wrong suffix is told")
    assert [path.name for path in out.iterdir()] == ["a file"] and told.window.isVisible()
