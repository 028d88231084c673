"""The command line end to end on a small dossier: files, figures, repeatability, errors."""

from __future__ import annotations

import html
import json
import os
import re
import shutil
from html.parser import HTMLParser
from pathlib import Path
from urllib.parse import unquote

import pytest
from PIL import Image
from typer.testing import CliRunner

from tests.integration.small_dossier import EFFECT, FIRST, MODE_NAME, POINT, SECOND, write_small
from tests.sentences import unfounded
from viewer.cli import app
from viewer.scene.figures import digits, hertz, length

WIDTH = "320"
NUMBER = r"[-−+]?\d[\d\u202f]*(?:\.\d+)?(?:e[-+]?\d+)?"


def run(*arguments: object):
    return CliRunner().invoke(app, [str(a) for a in arguments])


def good(*arguments: object):
    result = run(*arguments)
    assert result.exit_code == 0, result.output + str(result.exception)
    return result.stdout


@pytest.fixture(scope="module")
def dossier(tmp_path_factory) -> Path:
    return write_small(tmp_path_factory.mktemp("parts") / "two channels")


@pytest.fixture(scope="module")
def review(dossier, tmp_path_factory):
    """One review for all tests that only look: the folder, the printed JSON."""
    folder = tmp_path_factory.mktemp("review") / "out folder"
    printed = good("review", dossier, "--out", folder, "--width", WIDTH, "--json", "--no-cache")
    return folder, json.loads(printed)


class Page(HTMLParser):
    """Text, links and tags of a page."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.text, self.links, self.tags = [], [], []
        self.feed(text)

    def handle_starttag(self, tag, attributes):
        self.tags.append(tag)
        self.links += [value for name, value in attributes if name in ("href", "src", "srcset") and value]

    def handle_data(self, data):
        self.text.append(data)


# --- review


def test_review_writes_what_it_lists_and_nothing_else(review):
    folder, printed = review
    summary = json.loads((folder / "summary.json").read_text(encoding="utf-8"))
    assert printed == summary
    there = {str(p.relative_to(folder)) for p in folder.rglob("*")}
    assert there == set(summary["files"])
    assert all((folder / name).stat().st_size > 0 for name in there)
    assert [p.name for p in folder.parent.iterdir()] == [folder.name], "nothing is left beside the folder"
    assert all(re.fullmatch(r"[a-z0-9_.-]+", name) for name in there), "safe in every file system"
    # per design two modes of loop, still, strip; one true-scale still; per pair a loop, a still, an overlay
    assert sum(name.endswith(".gif") for name in there) == 4 + 2
    assert sum(name.endswith("_true_scale.png") for name in there) == 1
    assert sum(name.endswith("_overlay.png") for name in there) == 2


def test_page_shows_files_that_are_there_and_escapes_names(review):
    folder, _ = review
    page = Page((folder / "index.html").read_text(encoding="utf-8"))
    links = [link for link in page.links if not link.startswith("#")]
    assert all((folder / unquote(link)).is_file() for link in links)
    shown = {Path(unquote(link)).name for link in links}
    listed = set(json.loads((folder / "summary.json").read_text(encoding="utf-8"))["files"])
    assert listed - shown <= {"index.html", "summary.json", *(n for n in listed if n.endswith("_true_scale.png"))}
    text = "".join(page.text)
    for name in (FIRST, SECOND, MODE_NAME, POINT, EFFECT, 'Channel <i>trial</i> & "co"', "clamped root <x>"):
        assert name in text, name
    assert not {"i", "b", "v1", "x", "1", "m", "script"} & set(page.tags), "no name became markup"


def test_pictures_have_the_width_asked_for(review):
    folder, _ = review
    for path in (*folder.glob("*.gif"), *folder.glob("*_mode_0?.png"), *folder.glob("*_overlay.png")):
        with Image.open(path) as picture:
            assert picture.width == int(WIDTH), path.name
            if path.suffix == ".gif":
                assert picture.n_frames == 40


def figures(text: str) -> list[str]:
    return re.findall(NUMBER, text)


def test_every_number_of_a_mode_caption_is_in_the_summary(review):
    """Captions are found on the page; each number in them is one of the summary, rounded as captions are."""
    folder, summary = review
    text = (folder / "index.html").read_text(encoding="utf-8")
    captions = [html.unescape(c) for c in re.findall(r"<figcaption>.*?<p>(.*?)</p>", text, re.S)]
    rows = [row for design in summary["designs"].values() for row in design["modes"]]
    found = [c for c in captions if "largest motion at" in c]
    assert len(found) == len(rows) == 4
    for caption, row in zip(found, rows, strict=True):
        values = [value for value in row.values() if isinstance(value, int | float) and not isinstance(value, bool)]
        words = {figure for value in row.values() if isinstance(value, str) for figure in figures(value)}
        said = {f for v in values for f in (digits(v), digits(abs(v), 1), f"{v:.2f}", str(v))}
        said |= {figures(form(v))[0] for v in values if v > 0 for form in (hertz, length)}
        for figure in figures(caption):
            assert figure.lstrip("+−") in said | words, (caption, figure)
        assert hertz(row["frequency_hz"]) in caption


def told(facts):
    """Every (sentence, the figures it stands beside) of a summary."""
    if isinstance(facts, dict):
        if "sentence" in facts:
            yield facts["sentence"], facts
        for value in facts.values():
            yield from told(value)
    elif isinstance(facts, list):
        for value in facts:
            yield from told(value)


def test_every_number_of_a_sentence_is_a_figure_of_the_summary(review):
    _, summary = review
    found = list(told(summary))
    assert len(found) > 4 * 3  # character, hinges and gain of four modes, outcomes, struts
    for sentence, facts in found:
        assert not unfounded(sentence, facts), (sentence, unfounded(sentence, facts))


def test_every_sentence_of_the_page_is_in_the_summary(review):
    folder, summary = review
    text = (folder / "index.html").read_text(encoding="utf-8")
    known = {" ".join(sentence.split()) for sentence, _ in told(summary)}
    refused = {words for d in summary["designs"].values() for f in d["findings"] for words in f["refused"]}
    listed = [html.unescape(c) for c in re.findall(r"<figcaption>.*?</figcaption>", text, re.S)]
    said = [html.unescape(item) for caption in listed for item in re.findall(r"<li>(.*?)</li>", caption, re.S)]
    assert said
    for sentence in said:
        assert " ".join(sentence.split()) in known | refused, sentence


def test_tables_hold_the_figures_of_the_summary(review):
    folder, summary = review
    for path in folder.glob("*_modes.json"):
        table = json.loads(path.read_text(encoding="utf-8"))
        rows = table if isinstance(table, list) else table["rows"]
        assert rows in [design["modes"] for design in summary["designs"].values()]
    for path in folder.glob("*.csv"):
        lines = path.read_text(encoding="utf-8").splitlines()
        assert len(lines) > 1, path.name


def test_stated_amplitude_is_the_size_at_its_point(review):
    """120 µm stated at the point along y: the table's real motion, projected, gives it back."""
    _, summary = review
    modes = summary["designs"][FIRST]["modes"]
    assert modes[0]["largest_real_m"] >= 100e-6
    assert modes[0]["magnification"] > 1
    assert modes[0]["size_statistic"] == "peak"
    assert modes[1]["largest_real_m"] is None
    assert modes[1]["magnification"] is None
    drawing = summary["designs"][FIRST]["drawing"]
    assert drawing[0]["condition"] == "drive at 12 Hz"


def test_second_review_repeats_pixels_and_removes_its_own_stale_files_only(dossier, review, tmp_path):
    """One mode less, into a copy of the first review that also holds a file of the user. Both are solved afresh."""
    first, _ = review
    folder = tmp_path / "out"
    shutil.copytree(first, folder)
    mine = folder / "my notes.txt"
    mine.write_text("keep", encoding="utf-8")
    good("review", dossier, "--out", folder, "--width", WIDTH, "--count", 1, "--no-cache")
    summary = json.loads((folder / "summary.json").read_text(encoding="utf-8"))
    after, before = {p.name for p in folder.iterdir()}, {p.name for p in first.iterdir()}
    assert after == {*summary["files"], mine.name}
    assert mine.read_text(encoding="utf-8") == "keep"
    gone = before - after
    assert len(gone) == len([n for n in before if "_02" in n]) > 8
    assert all("_02" in name for name in gone), "the second modes' files and nothing else"
    shows_all_modes = ("_ladder.png", "_agreement.png", "_strut.png")  # and so changes with their number
    pictures = [n for n in after if Path(n).suffix in (".gif", ".png") and not n.endswith(shows_all_modes)]
    assert len(pictures) > 8
    for name in pictures:
        assert (folder / name).read_bytes() == (first / name).read_bytes(), f"{name}: same input, same pixels"


# --- the other commands


def test_modes_as_json_and_as_table(dossier, review, tmp_path):
    _, summary = review
    answer = json.loads(good("modes", dossier, "--json", "--out", tmp_path / "t.csv"))
    assert [row["frequency_hz"] for row in answer["modes"]] == pytest.approx(
        [row["frequency_hz"] for design in summary["designs"].values() for row in design["modes"]], rel=1e-12
    )
    assert (tmp_path / "t.csv").is_file()
    text = good("modes", dossier, "--design", SECOND)
    assert MODE_NAME not in text
    assert all(digits(row["frequency_hz"], 4) in text for row in summary["designs"][SECOND]["modes"])


def test_check_says_what_it_found(dossier):
    text = good("check", dossier)
    assert "the dossier is sound" in text
    answer = json.loads(good("check", dossier, "--json"))
    assert answer["sound"] is True
    assert any("kg" in statement for statement in answer["statements"])


@pytest.mark.parametrize(
    ("options", "suffix", "size"),
    [
        ((), ".gif", (320, 240)),
        ((), ".png", (320, 240)),
        (("--true-scale",), ".png", (320, 240)),
        (("--strip",), ".png", None),
        (("--against", SECOND), ".png", None),  # as high as the bodies need
        (("--against", f"{SECOND}:2", "--overlay"), ".png", None),
        (("--no-energy", "--no-ghost", "--mesh-edges", "--theme", "dark", "--peak", "3"), ".png", (320, 240)),
    ],
)
def test_animate(dossier, tmp_path, options, suffix, size):
    path = tmp_path / f"a b{suffix}"
    answer = json.loads(good("animate", dossier, 1, "--out", path, "--width", WIDTH, "--json", *options))
    assert answer["file"] == str(path)
    with Image.open(path) as picture:
        if "--strip" in options:
            assert picture.width > picture.height * 2.5, "five phases in a row"
        assert picture.width == int(WIDTH)
        assert size is None or picture.size == size
    if "--true-scale" in options:
        assert answer["magnification"] == 1
        assert answer["note"]["drawing"][0] == "true scale, ×1"
    assert [p.name for p in tmp_path.iterdir()] == [path.name]


@pytest.mark.parametrize(
    ("arguments", "code", "words"),
    [
        ((2, "--true-scale"), 1, "amplitude"),
        ((9,), 1, "has no mode 9"),
        ((0,), 2, "1"),
        ((1, "--design", "none such"), 1, "no design named 'none such'"),
        ((1, "--out", "loop.bmp"), 1, "'.bmp'"),
        ((1, "--strip", "--out", "strip.gif"), 1, ".png for a strip"),
        ((1, "--against", f"{SECOND}:two"), 2, "two"),
        ((1, "--theme", "blue"), 2, "neither light nor dark"),
        ((1, "--width", "10"), 2, "320"),
    ],
)
def test_refusals_are_one_clear_line(dossier, tmp_path, monkeypatch, arguments, code, words):
    monkeypatch.chdir(tmp_path)
    result = run("animate", dossier, *arguments)
    assert result.exit_code == code, result.output
    assert "Traceback" not in result.output
    assert words in result.output
    if code == 1:
        assert len(result.stderr.strip().splitlines()) == 1
        answer = json.loads(run("animate", dossier, *arguments, "--json").stdout)
        assert answer["problem"]
    assert list(tmp_path.iterdir()) == []


def test_outputs_that_cannot_be_written_are_one_clear_error(dossier, tmp_path):
    """A path below a regular file: no user can write there, root included."""
    (tmp_path / "file").write_text("")
    for arguments in (
        ("review", dossier, "--out", tmp_path / "file" / "out", "--width", WIDTH),
        ("animate", dossier, 1, "--out", tmp_path / "file" / "loop.gif", "--width", WIDTH),
        ("modes", dossier, "--out", tmp_path / "file" / "table.csv"),
        ("review", dossier, "--out", tmp_path / "file", "--width", WIDTH),
    ):
        result = run(*arguments)
        assert result.exit_code == 1, (arguments, result.output, result.exception)
        (line,) = result.stderr.strip().splitlines()
        assert str(tmp_path / "file") in line
        assert "written" in line
        assert sorted(os.listdir(tmp_path)) == ["file"]


def test_a_review_that_cannot_be_written_says_so_before_the_work(dossier, tmp_path, monkeypatch):
    from viewer.workspace import OpenDossier

    monkeypatch.setattr(OpenDossier, "study", lambda *_: pytest.fail("worked before it looked where to write"))
    (tmp_path / "file").write_text("")
    for out in (tmp_path / "file", tmp_path / "file" / "deeper" / "out"):
        assert run("review", dossier, "--out", out, "--width", WIDTH).exit_code == 1


def test_direction_the_point_does_not_move_in_is_refused(tmp_path):
    """A stated amplitude at rest gives no size: no silent enormous number (at least 5 % of the peak must move)."""
    folder = write_small(tmp_path / "odd", along=6, way="+x")
    result = run("modes", folder, "--json")
    answer = json.loads(result.stdout)
    if result.exit_code == 0:
        assert answer["modes"][0]["largest_real_m"] is None or answer["modes"][0]["largest_real_m"] < 20 * 120e-6
    else:
        assert answer["error"] in ("RefusedError", "DossierError", "InputError")
        assert "5 %" in result.stdout or "moves" in result.stdout
