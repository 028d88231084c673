"""Hiding, cutting, node lines and videos from the command line, from dossier to file."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest
from PIL import Image
from typer.testing import CliRunner

from tests.integration.small_dossier import SECOND, write_small
from viewer.cli import app

WIDTH = ("--width", "320")


def run(*arguments: object):
    return CliRunner().invoke(app, [str(a) for a in arguments])


@pytest.fixture(scope="module")
def dossier(tmp_path_factory) -> Path:
    return write_small(tmp_path_factory.mktemp("small"), along=6)


def drawn(dossier, folder, *options):
    """The still as an array, and the note's statements about drawing."""
    result = run("animate", dossier, 1, "--out", folder / "a.png", "--json", *WIDTH, *options)
    assert result.exit_code == 0, result.output
    with Image.open(folder / "a.png") as still:
        return np.asarray(still), json.loads(result.stdout)["note"]["drawing"]


@pytest.mark.parametrize(
    ("options", "said"),
    [
        (("--hide", "far flange"), "hidden: far flange"),
        (("--only", "far flange"), "shown: only far flange"),
        (("--cut", "x=120mm"), "cut at x = 120\u00a0mm"),
        (("--cut", "x = 0.12 m"), "cut at x = 120\u00a0mm"),
        (("--cut", "0,0,2=1.5cm"), "cut at z = 15\u00a0mm"),
        (("--cut", "1,0,-1=-2e-2m"), "cut across (0.71, 0, −0.71) at −20\u00a0mm"),
        (("--node-lines",), "node lines, if any: no motion normal to the surface"),
    ],
)
def test_what_is_shown_is_drawn_and_said(dossier, tmp_path, options, said):
    whole, before = drawn(dossier, tmp_path)
    part, after = drawn(dossier, tmp_path, *options)
    assert sorted(after) == sorted([*before, said])
    assert (whole.shape != part.shape) or np.abs(whole.astype(int) - part).max() > 30


def test_compared_designs_are_cut_alike(dossier, tmp_path):
    _, said = drawn(dossier, tmp_path, "--against", SECOND, "--cut", "z=20mm", "--hide", "far flange")
    assert said[-2:] == ["hidden: far flange", "cut at z = 20\u00a0mm"]


@pytest.mark.parametrize(
    ("options", "code", "words"),
    [
        (("--hide", "lid"), 1, "far flange"),
        (("--only", "lid"), 1, "'lid'"),
        (("--cut", "x=-1m"), 1, "misses the body"),
        (("--cut", "x=120"), 2, "units: m, cm, mm"),
        (("--cut", "w=120mm"), 2, "is no plane"),
        (("--cut", "1,0=120mm"), 1, "is no plane"),
        (("--cut", "0,0,0=120mm"), 1, "is no plane"),
        (("--cut", "1,2,3"), 2, "is no plane"),
    ],
)
def test_refusals_name_what_is_wrong(dossier, tmp_path, options, code, words):
    result = run("animate", dossier, 1, "--out", tmp_path / "a.png", *WIDTH, *options)
    assert result.exit_code == code, result.output
    assert words in " ".join(result.output.replace("│", " ").split())
    assert not list(tmp_path.iterdir())


def test_a_video_is_written(dossier, tmp_path):
    ffmpeg = pytest.importorskip("imageio_ffmpeg")
    result = run("animate", dossier, 1, "--out", tmp_path / "a.mp4", *WIDTH)
    assert result.exit_code == 0, result.output
    assert ffmpeg.count_frames_and_secs(str(tmp_path / "a.mp4")) == (160, pytest.approx(6.4, abs=0.02))
