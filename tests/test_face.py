"""The public face: lazy, complete, and the command's exit codes."""

from __future__ import annotations

import json
import subprocess
import sys

import pytest

import viewer


def run(*arguments: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "viewer", *arguments], capture_output=True, text=True, timeout=120, check=False
    )


def test_help_imports_nothing_heavy():
    code = (
        "import sys\n"
        "from viewer.cli import app\n"
        "from typer.testing import CliRunner\n"
        "result = CliRunner().invoke(app, ['--help'])\n"
        "assert result.exit_code == 0, result.output\n"
        "heavy = {'numpy', 'scipy', 'vtk', 'vtkmodules', 'pyvista', 'PySide6', 'h5py', 'pydantic', 'meshio'}\n"
        "print(sorted(heavy & set(sys.modules)))\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=60, check=True)
    assert done.stdout.strip() == "[]"


def test_every_public_name_resolves():
    for name in viewer.__all__:
        assert getattr(viewer, name) is not None
    with pytest.raises(AttributeError):
        viewer.no_such_name  # noqa: B018


@pytest.mark.parametrize("command", ["review", "modes", "hinges", "struts", "pair", "check"])
def test_missing_dossier_is_one_line_and_exit_1(command, tmp_path):
    done = run(command, str(tmp_path / "nowhere" / "dossier.toml"))
    assert done.returncode == 1
    assert "Traceback" not in done.stderr
    assert len(done.stderr.strip().splitlines()) == 1
    assert "nowhere" in done.stderr


def test_missing_dossier_as_json(tmp_path):
    done = run("modes", str(tmp_path / "dossier.toml"), "--json")
    assert done.returncode == 1
    assert json.loads(done.stdout)["error"] in {"DossierError", "LoadError"}


def test_wrong_usage_is_exit_2():
    assert run("modes").returncode == 2
    assert run("no-such-command").returncode == 2
