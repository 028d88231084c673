"""Puts the sample boom, which the window opens by itself, into the wheel; all else is said in pyproject.toml."""

from __future__ import annotations

import shutil
from pathlib import Path

from setuptools import setup
from setuptools.command.build_py import build_py

SAMPLE = Path("sample_meshes", "boom")


class WithSample(build_py):
    """Copies the sample beside the modules; an editable install finds it in the checkout."""

    def run(self) -> None:
        super().run()
        if not self.editable_mode:
            target = Path(self.build_lib, "viewer", "samples", SAMPLE.name)
            shutil.copytree(Path(__file__).parent / SAMPLE, target, dirs_exist_ok=True)


setup(cmdclass={"build_py": WithSample})
