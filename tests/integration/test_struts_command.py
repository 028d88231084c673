"""The command that ranks struts, on two small folded channels."""

from __future__ import annotations

import json

import pytest
from typer.testing import CliRunner

from tests.integration.small_dossier import FIRST, SECOND, write_small
from tests.sentences import unfounded
from viewer.cli import app
from viewer.workspace import Workspace
from viewer.workspace.trials import try_struts


def run(*arguments: object):
    return CliRunner().invoke(app, [str(each) for each in arguments])


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    path = write_small(tmp_path_factory.mktemp("struts") / "two channels")
    text = (path / "dossier.toml").read_text(encoding="utf-8")
    box = '\n[[clearances]]\nname = "cable"\nbox = [[-1000, -1000, -1000], [100, 1000, 1000]]\n'
    (path / "dossier.toml").write_text(text + box, encoding="utf-8")
    return path


def test_figures_as_json_are_those_of_the_finding(folder):
    result = run("struts", folder, "--json", "--top", 3)
    assert result.exit_code == 0, result.output
    facts = json.loads(result.stdout)
    assert (facts["design"], facts["mode"]) == (FIRST, 1)
    assert not unfounded(facts["sentence"], facts)
    assert facts["left_out"]["passes a forbidden volume"] > 0
    assert len(facts["struts"]) == 3 and all(each["resolved"] for each in facts["struts"])
    for each in facts["struts"]:
        assert all(end["centre_m"][0] > 0.1 for end in (each["from"], each["to"]))
        assert each["predicted"]["frequency_hz"] == pytest.approx(each["resolved"]["frequency_hz"], rel=0.02)
    found = try_struts(Workspace(cache=None).open(folder), FIRST, top=3)
    assert found.sentence == facts["sentence"]


def test_a_table_for_reading_and_one_for_a_file(folder, tmp_path):
    table = tmp_path / "struts.json"
    options = ("--design", SECOND, "--mode", 3, "--stiffness", 2e5, "--top", 4, "--no-resolve", "--out", table)
    result = run("struts", folder, *options)
    assert result.exit_code == 0, result.output
    rows = json.loads(table.read_text(encoding="utf-8"))
    rows = rows if isinstance(rows, list) else rows["rows"]
    assert [row["strut"] for row in rows] == [1, 2, 3, 4]
    assert {row["stiffness_nperm"] for row in rows} == {2e5} and {row["resolved_hz"] for row in rows} == {None}
    assert result.stdout.startswith("Mode 3: ") and "Stiffness: as given." in result.stdout


@pytest.mark.parametrize(
    ("options", "code", "words"),
    [
        (("--design", "third"), 1, "no design named 'third'"),
        (("--stiffness", -1), 1, "positive stiffness"),
        (("--mode", 0), 2, "--mode"),
        (("--out", "x.xls"), 1, "x.xls"),
    ],
)
def test_mistakes_are_one_clear_line(folder, options, code, words):
    result = run("struts", folder, "--no-resolve", *options)
    assert result.exit_code == code
    assert words in result.output and "Traceback" not in result.output
