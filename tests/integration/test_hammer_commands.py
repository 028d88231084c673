"""``pair`` of a hammer test, and its part of a review, on a small dossier with a known fault."""

from __future__ import annotations

import csv
import html
import json
import shutil
from pathlib import Path

import pytest
from typer.testing import CliRunner

from tests.integration.tested_dossier import FLIPPED, MEASURED, write_square, write_tested
from tests.sentences import unfounded
from viewer.cli import app
from viewer.insight.pair_words import pair_sentence
from viewer.loaders import read_dossier


def run(*arguments: object):
    return CliRunner().invoke(app, [str(a) for a in arguments])


def good(*arguments: object) -> str:
    result = run(*arguments)
    assert result.exit_code == 0, result.output + str(result.exception)
    return result.stdout


@pytest.fixture(scope="module")
def kept(tmp_path_factory) -> Path:
    return write_tested(tmp_path_factory.mktemp("kept")).parent


@pytest.fixture
def dossier(kept, tmp_path) -> Path:
    """A copy that may be written to."""
    return Path(shutil.copytree(kept, tmp_path / "parts")) / "dossier.toml"


@pytest.fixture(scope="module")
def printed(kept):
    return json.loads(good("pair", kept, "hammer", "--json"))


def test_the_answer_names_pairs_and_what_seems_wrong(kept):
    out = good("pair", kept, "hammer")
    assert f"All {MEASURED} measured modes of hammer are found in channel" in out
    assert f"point {FLIPPED}, +Z: sign flipped" in out
    assert "--accept 1 writes them into the dossier" in out
    assert "phase collinearity" in out and "damping" in out


def test_design_and_test_may_be_named_in_any_order(kept):
    assert good("pair", kept, "channel", "hammer") == good("pair", kept, "hammer", "channel")


def test_every_number_of_a_sentence_is_printed_as_json(printed):
    findings = [value for value in printed.values() if isinstance(value, dict) and "sentence" in value]
    assert len(findings) == 5
    for facts in findings:
        assert not unfounded(facts["sentence"], facts), facts["sentence"]
    for facts in printed["correlation"]["pairs"]:
        assert not unfounded(pair_sentence(facts), facts), pair_sentence(facts)


def test_tables_and_extra_points_as_files(kept, tmp_path):
    pairs, points = tmp_path / "pairs.csv", tmp_path / "points.csv"
    said = good("pair", kept, "hammer", "--out", pairs, "--extra-points", points, "--extra", 3)
    rows = list(csv.DictReader(pairs.open(encoding="utf-8")))
    assert [row["analysis_mode"] for row in rows[:MEASURED]] == [str(n + 1) for n in range(MEASURED)]
    assert all(float(row["mac"]) > 0.8 for row in rows[:MEASURED])
    if points.exists():
        found = list(csv.DictReader(points.open(encoding="utf-8")))
        assert 1 <= len(found) <= 3 and {"node", "x_m", "direction", "worst_auto_mac"} <= set(found[0])
    else:
        assert "no further point would help" in said


def test_accepting_writes_it_down_and_every_output_says_so(dossier):
    out = good("pair", dossier, "hammer", "--accept", "all")
    assert f"written into {dossier}: point {FLIPPED}, +Z: sign flipped" in out
    (made,) = read_dossier(dossier).test("hammer").corrections
    assert (made.kind, made.point, made.axis) == ("flip", FLIPPED, "z")
    later = good("pair", dossier, "hammer")
    assert "caution: test hammer: readings are corrected as the dossier says" in later
    assert "contradicts the others" in later


@pytest.mark.parametrize(
    ("options", "words"),
    [
        (("hammer", "--accept", "9"), "no correction 9 is proposed"),
        (("hammer", "--accept", "one"), "does not name corrections"),
        (("hammer", "--place", "4"), "has no placement 4"),
        (("channel", "hammer", "--count", "0"), ""),
        (("hammer", "nothing"), "no design named 'nothing'"),
        (("channel", "--accept", "1"), "go with a hammer test"),
        (("channel",), "name a test: hammer"),
    ],
)
def test_what_cannot_be_is_said_in_one_line(dossier, options, words):
    before = dossier.read_text(encoding="utf-8")
    result = run("pair", dossier, *options)
    assert result.exit_code in (1, 2) and words in result.output
    assert "Traceback" not in result.output
    assert dossier.read_text(encoding="utf-8") == before


def test_an_open_placement_is_chosen_with_an_option(tmp_path):
    path = write_square(tmp_path / "square")
    refused = run("pair", path, "hammer")
    assert refused.exit_code == 1 and "8 placements that fit equally well" in refused.output
    assert "--place NUMBER" in refused.output and refused.output.count("placement = {rotation") == 8
    out = good("pair", path, "hammer", "--place", "2")
    assert f"written into {path}: placement 2 of test hammer" in out
    assert "where the dossier places them" in good("pair", path, "hammer")


def test_the_review_has_a_section_with_all_figures(kept, tmp_path):
    folder = tmp_path / "out"
    good("review", kept, "--out", folder, "--width", 320, "--count", 2, "--no-cache")
    summary = json.loads((folder / "summary.json").read_text(encoding="utf-8"))
    page = html.unescape((folder / "index.html").read_text(encoding="utf-8"))
    facts = summary["tests"]["hammer"]
    assert "Whether channel is right: test hammer" in page
    for name in ("correlation", "registration", "faults", "points", "expansion"):
        sentence = facts[name]["sentence"]
        assert sentence in page
        assert not unfounded(sentence, facts[name]), sentence
    assert len(facts["channels_listed"]) == 54
    files = summary["files"]
    assert sum(name.endswith("_beside.gif") for name in files) == MEASURED
    assert {"test-hammer_ladder.png", "test-hammer_faults.png", "test-hammer_pairs.csv"} <= set(files)
    assert page.count("an estimate:") == MEASURED, "findings of expanded shapes are marked"


def test_a_review_with_an_open_placement_says_what_to_choose(tmp_path):
    path = write_square(tmp_path / "square")
    folder = tmp_path / "out"
    good("review", path, "--out", folder, "--width", 320, "--count", 1, "--no-cache")
    page = html.unescape((folder / "index.html").read_text(encoding="utf-8"))
    assert "in 8 ways that fit equally well" in page and "--place NUMBER" in page
    assert "turned 180° about" in page
