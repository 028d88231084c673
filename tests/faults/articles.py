"""The samples as modelled, and real articles of them: thickness, mass and modulus are a few percent off by group."""

from __future__ import annotations

import hashlib
import os
import tempfile
from dataclasses import replace
from functools import cache
from pathlib import Path

import numpy as np

from viewer.jobs import atomic_path
from viewer.mechanics.eigen import solve
from viewer.model.design import Assignment, Design
from viewer.model.modes import ArrayShapes, ModeSet
from viewer.workspace import Workspace

SAMPLES = Path(__file__).parents[2] / "sample_meshes"
ARTICLES = 5  # of each sample
MODES = {"boom": 12, "fork": 14}  # of the model that a test is set beside
TESTED = {"boom": 6, "fork": 8}  # modes measured, as many as the samples' dossiers name
VERSION = 2


@cache
def design(name: str) -> Design:
    """The sample ``name`` as modelled."""
    return Workspace(cache=None).open(SAMPLES / name)["baseline"]


@cache
def modelled(name: str) -> ModeSet:
    """Modes of the model; solved once, kept in memory and in a temporary folder."""
    return _solved(name, design(name), MODES[name])


@cache
def real(name: str, article: int) -> ModeSet:
    """Modes of real article 0 … ``ARTICLES`` − 1, on the nodes of the model."""
    rng = np.random.default_rng([VERSION, article, *name.encode()])
    return _solved(f"{name}-{article}", _off(design(name), rng), TESTED[name])


def _off(modelled: Design, rng: np.random.Generator) -> Design:
    """Modulus off by 2 … 6 % in the whole; by group modulus ±5 %, density ±3 % and sheet ±4 %; masses ±5 %."""
    physics = modelled.physics
    (material,) = physics.materials.values()
    sheet = {a.target: a.thickness for a in physics.assignments}
    whole = 1 + rng.choice([-1, 1]) * rng.uniform(0.02, 0.06)
    off = lambda share: 1 + rng.uniform(-share, share)  # noqa: E731
    materials, assignments = {}, []
    for group in modelled.mesh.cell_groups:
        own = f"{material.name} of {group}"
        stiff, heavy = material.youngs_modulus * whole * off(0.05), material.density * off(0.03)
        materials[own] = replace(material, name=own, youngs_modulus=stiff, density=heavy)
        thick = sheet.get(group, sheet["*"])
        assignments.append(Assignment(group, own, None if thick is None else thick * off(0.04)))
    masses = tuple(replace(m, mass=m.mass * off(0.05)) for m in physics.masses)
    physics = replace(physics, materials=materials, assignments=tuple(assignments), masses=masses)
    return modelled.with_(physics=physics)


def _solved(name: str, design: Design, count: int) -> ModeSet:
    told = repr((VERSION, count, design.physics.materials, design.physics.assignments, design.physics.masses))
    key = hashlib.sha256(told.encode() + design.mesh.points.tobytes()).hexdigest()[:12]
    path = _folder() / f"{name}-{key}.npz"
    if not path.exists():
        modes = solve(design, count)
        moved = np.stack([modes.shape(i) for i in range(count)])
        turned = [modes.rotations(i) for i in range(count)]
        arrays = {} if turned[0] is None else {"turned": np.stack(turned)}
        with atomic_path(path) as target:
            np.savez(target, freq=modes.freq_hz, moved=moved, **arrays)
    with np.load(path) as kept:
        shapes = ArrayShapes(kept["moved"], kept.get("turned"))
        return ModeSet(design.mesh.node_ids, kept["freq"], shapes, None, "mass", "computed", design.name)


def _folder() -> Path:
    folder = Path(tempfile.gettempdir()) / f"hingelight-articles-{os.getuid() if hasattr(os, 'getuid') else 'me'}"
    folder.mkdir(mode=0o700, exist_ok=True)
    return folder
