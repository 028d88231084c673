"""The command that follows modes through a sweep or a row of designs, on two small folded channels."""

from __future__ import annotations

import csv
import json

import pytest
from PIL import Image
from typer.testing import CliRunner

from tests.integration.small_dossier import MODE_NAME, SECOND, Run, write_block, write_small
from tests.sentences import unfounded
from viewer.cli import app

_SWEEP = """
[[sweeps]]
name = "sheet / 1"
what = "thickness"
target = "*"
values = [1.2, 1.5, 2]
"""


def run(*arguments: object):
    return CliRunner().invoke(app, [str(each) for each in arguments])


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    path = write_small(tmp_path_factory.mktemp("lineage") / "two channels")
    text = (path / "dossier.toml").read_text(encoding="utf-8")
    (path / "dossier.toml").write_text(text + _SWEEP, encoding="utf-8")
    return path


def test_a_sweep_as_json_table_and_picture(folder, tmp_path):
    result = run("lineage", folder, "sheet / 1", "--json", "--out", tmp_path / "t.csv", "--pictures", tmp_path)
    assert result.exit_code == 0, result.output
    facts = json.loads(result.stdout)
    assert facts["values"] == pytest.approx([0.0012, 0.0015, 0.002]) and facts["unit"] == "mm"
    assert facts["lineages"][0]["name"] == MODE_NAME  # that of the design as it is, at 1.5 mm
    assert not unfounded(facts["sentence"], facts)
    hz = facts["lineages"][0]["frequency_hz"]
    assert hz[0] < hz[1] < hz[2]
    rows = list(csv.DictReader((tmp_path / "t.csv").read_text(encoding="utf-8").splitlines()))
    assert [float(row["frequency_hz"]) for row in rows if row["lineage"] == "1"] == hz
    assert [row["value"] for row in rows[:3]] == ["1.2", "1.5", "2.0"]
    with Image.open(tmp_path / "lineage_sheet-1.png") as image:
        assert image.size[0] == 960


def test_without_a_sweep_the_designs_are_followed(folder):
    result = run("lineage", folder)
    assert result.exit_code == 0, result.output
    assert "followed through all 2 designs" in result.stdout and SECOND in result.stdout


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (("sheet",), "no sweep named 'sheet'; expected: one of: sheet / 1"),
        (("sheet / 1", "--out", "x.xls"), "x.xls"),
    ],
)
def test_mistakes_are_one_clear_line(folder, arguments, words):
    result = run("lineage", folder, *arguments)
    assert result.exit_code == 1
    assert words in result.output and "Traceback" not in result.output


def test_one_design_alone(tmp_path):
    result = run("lineage", write_block(tmp_path, (2, 2, 2)))
    assert result.exit_code == 1 and "one design alone has no lineage" in result.output


def test_a_sweep_killed_midway_keeps_what_it_solved(tmp_path):
    """Ctrl-C after the first value is in the cache: nothing is left running, a second run solves only the others."""
    write_block(tmp_path, (10, 8, 8))
    values = ", ".join(str(7000 + 100 * k) for k in range(12))
    text = f'[[sweeps]]\nname = "s"\nwhat = "density"\ntarget = "steel"\nvalues = [{values}]\n'
    with (tmp_path / "dossier.toml").open("a") as file:
        file.write(text)
    cache = tmp_path / "cache"
    solved = lambda: {p: p.stat().st_ino for p in cache.rglob("*.npz") if ".part" not in p.name}  # noqa: E731
    first = Run("lineage", tmp_path, "s", cache=cache)
    first.wait_until(lambda: len(solved()) >= 1)
    code, _, errors = first.interrupt()
    assert code == 130 and "Traceback" not in errors
    assert not first.left_over()
    kept = solved()
    assert 1 <= len(kept) < 12
    second = Run("lineage", tmp_path, "s", "--json", cache=cache)
    out, errors = second.process.communicate(timeout=300)
    assert second.process.returncode == 0, errors
    assert len(json.loads(out)["values"]) == 12
    after = solved()
    assert len(after) == 12
    assert {path: after[path] for path in kept} == kept  # not written anew
