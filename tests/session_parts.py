"""A small dossier for the window's tests: an invented strip clamped at one end, as it is and thicker."""

from __future__ import annotations

from pathlib import Path

from tests.meshes import plate_mesh
from viewer.loaders import write_interchange
from viewer.session import Project, State
from viewer.session.questions import find, learn, next_question

DOSSIER = """
title = "Strip (invented)"
condition = "clamped root"

[units]
length = "mm"
amplitude = "um"
modulus = "GPa"

[materials.steel]
youngs_modulus = 210
poisson = 0.3
density = 7850

[[designs]]
name = "thin"                                   # as it is
mesh = "strip.npz"
length_unit = "m"
solve = 4
assign = [{target = "*", material = "steel", thickness = 2}]
supports = [{name = "root", box = [[-1, -1, -1], [0.1, 61, 1]]}]

[designs.mode_names]
1 = "strip bends"

[[designs]]
name = "thick"
mesh = "strip.npz"
length_unit = "m"
solve = 4
assign = [{target = "*", material = "steel", thickness = 2.6}]
supports = [{name = "root", box = [[-1, -1, -1], [0.1, 61, 1]]}]

[[points]]
name = "tip"
near = [300, 30, 0]
direction = "+z"
effect = "noise"
direction_word = "up and down"

[[amplitudes]]
design = "thin"
mode = 1
point = "tip"
value = 12
condition = "fan at 20 Hz"
"""


def write_strip(folder: Path) -> Path:
    """Write the dossier and its mesh into ``folder``; returns the dossier."""
    folder.mkdir(parents=True, exist_ok=True)
    write_interchange(folder / "strip.npz", plate_mesh("quad4", (20, 4), (0.3, 0.06)))
    (folder / "dossier.toml").write_text(DOSSIER, encoding="utf-8")
    return folder / "dossier.toml"


def answer_all(project: Project, state: State) -> tuple[Project, list[str]]:
    """Ask and answer until all is known, as the window does; returns the kinds of questions in order, too."""
    asked: list[str] = []
    while (question := next_question(project, state, frozenset())) is not None:
        asked.append(question.kind)
        assert len(asked) < 60
        project = learn(project, question, find(project, question))
    return project, asked
