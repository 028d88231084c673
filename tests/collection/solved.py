"""Solved parts, kept in a temporary folder between runs."""

from __future__ import annotations

import hashlib
import os
import tempfile
import zlib
from dataclasses import dataclass
from functools import cache, cached_property
from pathlib import Path

import numpy as np

from tests.collection import statics, truth
from tests.collection.parts import SEED, VERSION, Part
from tests.collection.sheets import Built, build
from viewer.jobs import atomic_path
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import Energies, energies
from viewer.model.arrays import Array
from viewer.model.modes import ArrayShapes, ModeSet


@dataclass(frozen=True, eq=False)
class Solved:
    """A part at one density: ``first`` is the index of the first elastic mode."""

    part: Part
    density: int
    built: Built
    modes: ModeSet

    @property
    def first(self) -> int:
        return 6 if self.part.free else 0

    @cached_property
    def stiffness(self) -> Array:
        """(bands,) N·m/rad, settled whatever the mesh of the modes; NaN where there is none."""
        return _settled(self.part)[:, 0]

    @cached_property
    def change(self) -> Array:
        """(bands,) by what share the last halving of the cells changed the stiffness."""
        return _settled(self.part)[:, 1]

    @cached_property
    def own_stiffness(self) -> Array:
        """(bands,) N·m/rad on the mesh of the modes."""
        return np.array([statics.stiffness(self.built, band) for band in self.part.sheet.bands])

    @cached_property
    def energies(self) -> Energies:
        return energies(self.built.design, self.modes)

    @cached_property
    def truths(self) -> list[list[truth.Truth]]:
        """For every elastic mode, what each band does."""
        found, out = self.energies, []
        for i in range(self.first, self.modes.count):
            whole = float(found.total_strain[i])
            out.append(
                truth.truths(
                    self.built, found.strain[i], whole, found.volumes, self.modes.shape(i), self.modes.rotations(i)
                )
            )
        return out


def solved(part: Part, density: int = 1) -> Solved:
    """Solve a part, or read it where it was solved before by the same generator."""
    built = build(part.name, part.sheet, part.kind, density)
    path = _folder() / f"{part.name.replace('>', '_')}-{density}-{_key(built, part.modes)}.npz"
    ids = built.mesh.node_ids
    if path.exists():
        with np.load(path) as kept:
            shapes = ArrayShapes(kept["moved"], kept.get("turned"))
            modes = ModeSet(ids, kept["freq"], shapes, None, "mass", "computed", part.name)
            return Solved(part, density, built, modes)
    modes = solve(built.design, part.modes + 6 * part.free)
    arrays = {"freq": modes.freq_hz, "moved": np.stack([modes.shape(i) for i in range(modes.count)])}
    if modes.shapes.has_rotations:
        arrays["turned"] = np.stack([modes.rotations(i) for i in range(modes.count)])
    with atomic_path(path) as target:
        np.savez(target, **arrays)
    return Solved(part, density, built, modes)


@cache
def _settled(part: Part) -> Array:
    """(bands, 2) settled stiffness and last change of a part, kept beside its modes."""
    path = _folder() / f"{part.name.replace('>', '_')}-static-{_key(build(part.name, part.sheet, part.kind), 0)}.npz"
    if path.exists():
        with np.load(path) as kept:
            return kept["settled"]
    found = [(s.value, s.change) for s in statics.settled(part.name, part.sheet, part.kind)]
    values = np.array(found).reshape(len(found), 2)
    with atomic_path(path) as target:
        np.savez(target, settled=values)
    return values


def _key(built: Built, modes: int) -> str:
    """Everything that the solution depends on, so that an old one is never taken for a new one."""
    mesh, bands = built.mesh, built.sheet.bands
    (block,) = mesh.blocks
    told = repr((SEED, VERSION, modes, bands, [a.thickness for a in built.design.physics.assignments]))
    data = [mesh.points, block.nodes, *mesh.cell_groups.values(), *mesh.node_groups.values()]
    whole = hashlib.sha256(told.encode())
    whole.update(str([zlib.crc32(np.ascontiguousarray(a).tobytes()) for a in data]).encode())
    return whole.hexdigest()[:12]


def _folder() -> Path:
    folder = Path(tempfile.gettempdir()) / f"hingelight-collection-{os.getuid() if hasattr(os, 'getuid') else 'me'}"
    folder.mkdir(mode=0o700, exist_ok=True)
    return folder
