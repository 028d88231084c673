"""A newcomer's walk: what README.md prints as runnable runs, in a fresh copy of the repository's tracked files.

A fenced ``python`` block is run as a plain script, a ``toml`` block is checked as a dossier beside the sample's
meshes, when the line before its fence is the HTML comment ``<!-- runs -->``.
"""

from __future__ import annotations

import os
import re
import subprocess
import sys
from pathlib import Path

import pytest

from tests.integration.small_dossier import write_block
from viewer.cli import app

ROOT = Path(__file__).resolve().parents[2]
_BLOCK = re.compile(r"^<!-- runs -->\n```(toml|python)\n(.*?)^```", re.M | re.S)
BLOCKS = _BLOCK.findall((ROOT / "README.md").read_text(encoding="utf-8"))


@pytest.fixture(scope="module")
def copy(tmp_path_factory) -> Path:
    """The tracked files as they stand, in a folder of their own."""
    try:
        listed = subprocess.run(["git", "ls-files", "-z"], cwd=ROOT, capture_output=True, check=True).stdout
    except (OSError, subprocess.CalledProcessError):
        pytest.skip("no git checkout: the tracked files cannot be listed")
    folder = tmp_path_factory.mktemp("walk") / "a copy"
    for name in listed.decode().split("\0"):
        if name and (ROOT / name).is_file():
            target = folder / name
            target.parent.mkdir(parents=True, exist_ok=True)
            target.write_bytes((ROOT / name).read_bytes())
    return folder


def start(folder: Path, *arguments: object) -> subprocess.CompletedProcess:
    environment = {**os.environ, "PYTHONPATH": str(folder), "XDG_CACHE_HOME": str(folder / "cache")}
    return subprocess.run(
        [sys.executable, *map(str, arguments)],
        cwd=folder,
        env=environment,
        capture_output=True,
        text=True,
        timeout=300,
        check=False,
    )


def test_marks_are_read():
    """Every mark stands before a block that is run; the README marks at least one."""
    text = (ROOT / "README.md").read_text(encoding="utf-8")
    assert text.count("<!-- runs -->") == len(BLOCKS)
    if not BLOCKS:
        pytest.skip("README.md marks no block as runnable")


@pytest.mark.parametrize("number", range(len(BLOCKS)))
def test_readme_block_runs(copy, number):
    language, text = BLOCKS[number]
    if language == "python":
        script = copy / f"block_{number}.py"
        script.write_text(text, encoding="utf-8")
        done = start(copy, script)
    else:
        meshes = re.findall(r'^mesh = "(.*)"', text, re.M)
        homes = [path.parent for path in sorted(copy.glob("sample_meshes/*/dossier.toml"))]
        (home, *_) = [home for home in homes if all((home / mesh).is_file() for mesh in meshes)] or [copy]
        dossier = home / f"block_{number}.toml"
        dossier.write_text(text, encoding="utf-8")
        done = start(copy, "-m", "viewer", "check", dossier)
    assert done.returncode == 0, done.stdout + done.stderr
    assert "Traceback" not in done.stderr


def test_plain_script_without_a_guard_solves_a_larger_model(tmp_path):
    """4 851 nodes are solved in a child process, which must not run the script again."""
    write_block(tmp_path, (20, 20, 10))
    script = tmp_path / "script.py"
    script.write_text(
        'import viewer\nprint("started")\nopened = viewer.open_dossier("dossier.toml", cache=False)\n'
        'modes = viewer.solve(opened["block"], 2, cache=False)\nprint(len(modes.freq_hz), modes.freq_hz[0] > 0)\n'
    )
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    done = subprocess.run(
        [sys.executable, script],
        cwd=tmp_path,
        env=environment,
        capture_output=True,
        text=True,
        timeout=180,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    assert done.stdout.split() == ["started", "2", "True"]


def test_samples_are_sound(copy):
    """The dossiers that come along are what the README's first command opens."""
    from typer.testing import CliRunner

    found = sorted(copy.glob("sample_meshes/*/dossier.toml"))
    if not found:
        pytest.skip("the samples are not tracked")
    for path in found:
        result = CliRunner().invoke(app, ["check", str(path)])
        assert result.exit_code == 0, result.output
        assert "the dossier is sound" in result.output
