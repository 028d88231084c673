"""Meshes that nobody here wrote: one that pyvista's wheel carries, some from meshio's source distribution (both MIT).

The source distribution is downloaded by pip into the user's cache folder and only unpacked; its files are never part
of this repository. Where it cannot be had the tests skip with the reason, unless HINGELIGHT_REQUIRE_REAL=1.
"""

from __future__ import annotations

import os
import subprocess
import sys
import tarfile
import tempfile
from functools import cache
from pathlib import Path

import platformdirs
import pytest

_NAME = "meshio-5.3.5"
_FOLDER = Path(os.environ.get("HINGELIGHT_REAL_MESHES") or Path(platformdirs.user_cache_dir("hingelight")) / "real")


def real_mesh(name: str) -> Path:
    """Path of the file of this name below meshio's tests/meshes."""
    found = _unpacked()
    if isinstance(found, str):
        if os.environ.get("HINGELIGHT_REQUIRE_REAL") == "1":
            pytest.fail(found)
        pytest.skip(found)
    (path,) = (found / "tests" / "meshes").rglob(name)
    return path


@cache
def _unpacked() -> Path | str:
    """The unpacked distribution, or why there is none."""
    target = _FOLDER / _NAME
    if target.is_dir():
        return target
    _FOLDER.mkdir(parents=True, exist_ok=True)
    with tempfile.TemporaryDirectory(dir=_FOLDER) as aside:
        command = [
            sys.executable,
            "-m",
            "pip",
            "download",
            "--quiet",
            "--disable-pip-version-check",
            "--no-deps",
            "--no-binary",
            ":all:",
            "--dest",
            aside,
            _NAME.replace("-", "=="),
        ]
        try:
            done = subprocess.run(command, capture_output=True, text=True, timeout=300, check=False)
        except (OSError, subprocess.TimeoutExpired) as error:
            return f"{_NAME} cannot be downloaded: {error}"
        archive = Path(aside) / f"{_NAME}.tar.gz"
        if done.returncode or not archive.is_file():
            return f"{_NAME} cannot be downloaded: {(done.stderr.strip() or 'no reason given').splitlines()[-1]}"
        with tarfile.open(archive) as packed:
            packed.extractall(aside, filter="data")
        try:
            (Path(aside) / _NAME).replace(target)
        except OSError:  # another test process was faster
            if not target.is_dir():
                raise
    return target
