"""What is taken out of the window is what the command line gives for the same state."""

from __future__ import annotations

import csv

import numpy as np
import pytest
from PIL import Image
from typer.testing import CliRunner

from viewer.cli import app
from viewer.errors import Cancelled, ExportError
from viewer.jobs import Progress
from viewer.session import actions
from viewer.session.exports import request_of, suggested_name, tables_of, with_suffix, write_tables


def command(*arguments) -> None:
    done = CliRunner().invoke(app, [str(each) for each in arguments])
    assert done.exit_code == 0, done.output


@pytest.mark.parametrize(
    ("action", "given", "options"),
    [
        (None, (), ()),
        (actions.true_scale, (), ("--true-scale",)),
        (actions.toggle_theme, (), ("--theme", "dark")),
        (actions.switch, ("ghost",), ("--no-ghost",)),
        (actions.compare, ("side",), ("--against", "thick")),
        (actions.compare, ("difference",), ("--against", "thick", "--difference")),
    ],
    ids=["as it is", "true scale", "dark", "no ghost", "side", "difference"],
)
def test_a_still_has_the_command_lines_pixels(project, state, folder, tmp_path, action, given, options):
    shown = state if action is None else action(state, *given)
    mine = request_of(project, shown, tmp_path / "mine.png").write()
    command("animate", folder, 1, "--out", tmp_path / "theirs.png", *options)
    one, two = (np.asarray(Image.open(path)) for path in (mine, tmp_path / "theirs.png"))
    assert one.shape == two.shape and (one == two).all()


def test_the_state_tells_pictures_apart(project, state, tmp_path):
    """Two states that look different do not give the same pixels, so that equality above says something."""
    one, two = (
        np.asarray(Image.open(request_of(project, s, tmp_path / f"{n}.png").write()))
        for n, s in enumerate((state, actions.true_scale(state)))
    )
    assert one.shape != two.shape or (one != two).any()


def test_a_still_is_taken_where_it_stands(project, state, tmp_path):
    assert request_of(project, state, tmp_path / "a.png").phase == 0.0
    assert request_of(project, actions.stand_at(state, 1.25), tmp_path / "a.png").phase == 1.25


def test_tables_are_those_of_the_command_line(project, state, folder, tmp_path):
    written = write_tables(project, state, tmp_path / "thin_modes.csv")
    names = [path.name for path in written]
    assert names[0] == "thin_modes.csv" and "thin_points.csv" in names and "thin_comparison.csv" in names
    command("modes", folder, "--design", "thin", "--out", tmp_path / "theirs.csv")
    assert written[0].read_text() == (tmp_path / "theirs.csv").read_text()
    for path, (about, rows) in zip(written, tables_of(project, state).items(), strict=True):
        with open(path, newline="", encoding="utf-8") as file:
            read = list(csv.DictReader(file))
        assert len(read) == len(rows) and about in path.stem
        assert list(read[0]) == list(rows[0])


def test_a_stopped_table_leaves_what_was_whole(project, state, tmp_path):
    """Each table is written at once or not at all."""
    done = []

    def stop() -> bool:
        done.append(1)
        return len(done) > 1

    with pytest.raises(Cancelled):
        write_tables(project, state, tmp_path / "thin_modes.csv", Progress(stop=stop))
    assert [path.name for path in tmp_path.iterdir()] == ["thin_modes.csv"]


def test_names_say_what_is_shown(project, state, tmp_path):
    assert suggested_name(project, state, "gif") == "thin_mode_01.gif"
    assert suggested_name(project, actions.true_scale(state), "png") == "thin_mode_01_true_scale.png"
    assert suggested_name(project, actions.compare(state, "overlay"), "gif") == "thin_thick_mode_01_overlay.gif"
    assert suggested_name(project, state, "tables") == "thin_modes.csv"
    assert with_suffix(tmp_path / "loop", "gif").suffix == ".gif"
    with pytest.raises(ExportError):
        with_suffix(tmp_path / "loop.avi", "gif")
