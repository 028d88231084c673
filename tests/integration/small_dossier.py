"""A dossier of two folded channels, small enough to be reviewed in a test, with the most awkward of names."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np

from tests.integration.models import channel_mesh
from tests.meshes import box_mesh
from viewer.loaders import write_interchange

FIRST, SECOND = 'as built "A" <v1>', "Änderung & 2/б"
MODE_NAME = 'nods <b> & "sways"'
POINT, EFFECT = "lens 'left' <1>", "blur & smear ½"

_TEXT = """
title = 'Channel <i>trial</i> & "co"'
condition = "clamped root <x>"

[units]
length = "mm"
amplitude = "um"
modulus = "GPa"

[materials.steel]
youngs_modulus = 205
poisson = 0.3
density = 7850

[[designs]]
name = '{first}'
mesh = "first.vtu"
solve = 2
assign = [{{target = "*", material = "steel", thickness = 1.5}}]
supports = [{{name = "root", group = "root"}}]
masses = [{{name = "head <m>", group = "tip", mass = 0.4}}]
springs = [{{name = "strut", group = "tip", stiffness = [0, 0, 1000]}}]
mode_names = {{1 = '{mode}'}}

[[designs]]
name = "{second}"
mesh = "second.vtu"
solve = 2
assign = [{{target = "*", material = "steel", thickness = 2.5}}]
supports = [{{name = "root", group = "root"}}]
masses = [{{name = "head <m>", group = "tip", mass = 0.4}}]

[[points]]
name = "{point}"
group = "tip"
direction = "+y"
effect = "{effect}"

[[amplitudes]]
design = '{first}'
mode = 1
point = "{point}"
direction = "{way}"
value = 120
condition = "drive at 12 Hz"
"""


def write_small(folder: Path, *, along: int = 17, way: str = "+y") -> Path:
    """A dossier of two designs of about a hundred cells each, two modes each, one stated amplitude."""
    folder.mkdir(parents=True, exist_ok=True)
    for name, length in (("first", 0.4), ("second", 0.36)):
        mesh, groups = channel_mesh(along, length)
        write_interchange(folder / f"{name}.vtu", mesh.with_(node_groups=groups))
    text = _TEXT.format(first=FIRST, second=SECOND, mode=MODE_NAME, point=POINT, effect=EFFECT, way=way)
    (folder / "dossier.toml").write_text(text, encoding="utf-8")
    return folder


def write_block(folder: Path, counts: tuple[int, int, int]) -> Path:
    """A solid block whose solution takes a while."""
    folder.mkdir(parents=True, exist_ok=True)
    mesh = box_mesh("hex8", counts, np.array(counts) * 0.01)
    write_interchange(folder / "block.vtu", mesh)
    (folder / "dossier.toml").write_text(
        'title = "block"\n[materials.steel]\nyoungs_modulus = 2e11\npoisson = 0.3\ndensity = 7850\n'
        '[[designs]]\nname = "block"\nmesh = "block.vtu"\nsolve = 4\n'
        'assign = [{target = "*", material = "steel"}]\nsupports = [{name = "root", group = "x0"}]\n'
    )
    return folder


class Run:
    """``hingelight`` in a process group of its own, as a shell would start it."""

    def __init__(self, *arguments: object, cache: Path) -> None:
        self.process = subprocess.Popen(
            [sys.executable, "-m", "viewer", *map(str, arguments)],
            start_new_session=True,
            text=True,
            stdout=subprocess.PIPE,
            stderr=subprocess.PIPE,
            env={**os.environ, "XDG_CACHE_HOME": str(cache)},
        )

    @property
    def group(self) -> dict[int, str]:
        """Command lines of the processes of the group that still run, by id."""
        found = {}
        for entry in Path("/proc").iterdir():
            if entry.name.isdigit():
                try:
                    state, _, group = (entry / "stat").read_text().rsplit(")", 1)[1].split()[:3]
                    if int(group) == self.process.pid and state != "Z":
                        found[int(entry.name)] = (entry / "cmdline").read_text().replace("\0", " ")
                except OSError:
                    continue  # it has just ended
        return found

    def left_over(self, patience: float = 20) -> dict[int, str]:
        """``group`` once it is empty, or what still runs after ``patience`` s: a process that is on its way out, its
        memory already given back, may be seen for a moment after its parent has ended."""
        end = time.monotonic() + patience
        while (found := self.group) and time.monotonic() < end:
            time.sleep(0.05)
        return found

    def wait_until(self, ready: Callable[[], bool], seconds: float = 120) -> None:
        end = time.monotonic() + seconds
        while not ready():
            if self.process.poll() is not None:
                raise AssertionError(f"ended too soon: {self.process.communicate()}")
            if time.monotonic() > end:
                self.kill()
                raise AssertionError("did not get that far")
            time.sleep(0.05)

    def interrupt(self, patience: float = 60) -> tuple[int, str, str]:
        """Ctrl-C: every process of the foreground group gets the signal. Exit code, output, errors."""
        os.killpg(self.process.pid, signal.SIGINT)
        try:
            out, errors = self.process.communicate(timeout=patience)
        except subprocess.TimeoutExpired:
            self.kill()
            raise AssertionError(f"still runs {patience} s after Ctrl-C") from None
        return self.process.returncode, out, errors

    def kill(self) -> None:
        os.killpg(self.process.pid, signal.SIGKILL)
        self.process.communicate()
