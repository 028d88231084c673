"""Every other format: read by meshio or VTK in the worker process, understood as a ``.vtu`` file would be.

In the formats of mesh generators (all but VTK's own), cells that only lie on others (the boundary triangles of a
solid, points and curves) carry groups but no matter: they are left out and their groups become node groups, and the
report says so. Line cells on the edges of others may also be beams that stiffen them: those in a group whose name has
a word for it (``beam``, ``bar``, ``rod``, ``truss``, ``strut``, ``rib``, ``stringer``, ``stiffener``) stay, and the
report says that too. In text decks every element was written as one and stays.
"""

from __future__ import annotations

import functools
import re
from dataclasses import replace
from pathlib import Path

import numpy as np

from viewer.cells import KINDS
from viewer.errors import LoadError
from viewer.jobs import SILENT, Progress
from viewer.loaders.file_shapes import Stretch
from viewer.loaders.raw_data import RawBlock, RawMesh, RawModes
from viewer.loaders.vtk_arrays import mesh_of, modes_of, shaped
from viewer.loaders.vtu_xml import DataArray
from viewer.loaders.worker_client import shared_worker
from viewer.model.arrays import Array

_BY_VTK = (".vtk", ".vtu", ".vtp", ".stl", ".ply", ".obj", ".cgns")
_BEAM_WORD = re.compile(r"(?<![a-z])(beam|bar|rod|truss|strut|rib|stringer|stiffener)(s|es)?(?![a-z])", re.I)


@functools.cache
def suffixes() -> frozenset[str]:
    """Suffixes that the worker reads."""
    import meshio

    return frozenset({suffix for suffix in meshio.extension_to_filetypes if suffix.count(".") == 1} | set(_BY_VTK))


def read_mesh(path: Path, progress: Progress = SILENT) -> RawMesh:
    """The mesh in the file. Raises ``LoadError``."""
    answer = _Answer(path, progress)
    raw = mesh_of(answer, progress)
    raw.notes = answer.notes + raw.notes
    return raw if path.suffix.lower() in _BY_VTK else without_carriers(raw)


def read_modes(path: Path, progress: Progress = SILENT) -> RawModes:
    """Vector arrays on points as mode shapes. Raises ``LoadError``."""
    return modes_of(_Answer(path, progress), progress)


class _Answer:
    """The worker's arrays, with the face of an open ``.vtu`` file."""

    def __init__(self, path: Path, progress: Progress) -> None:
        self.path = path
        how = "vtk" if path.suffix.lower() in _BY_VTK else "meshio"
        self._values, self.notes = shared_worker().read(path, how, progress)
        self.arrays: dict[str, dict[str, DataArray]] = {
            section: {} for section in ("Points", "Cells", "PointData", "CellData", "FieldData")
        }
        for (section, name), values in self._values.items():
            components = int(np.prod(values.shape[1:])) if section != "FieldData" else 1
            kind = values.dtype.str.lstrip("<>|=")
            self.arrays[section][name] = DataArray(name, section, kind, components, values.size, "memory", None)
        self.n_points = len(self._values["Points", "Points"])
        self.n_cells = len(self._values["Cells", "types"])

    def read(self, array: DataArray, tuples: int) -> Array:
        values = self._values[array.section, array.name]
        return shaped(values, array, tuples, self.error)

    def stretch(self, array: DataArray, tuples: int) -> Stretch | None:
        return None

    def error(self, problem: str, **parts: str) -> LoadError:
        return LoadError(problem, file=self.path, **parts)


def without_carriers(raw: RawMesh) -> RawMesh:
    """The mesh without cells whose corners are all corners of one face or edge of a cell of higher dimension."""
    top = max((KINDS[block.kind].dim for block in raw.blocks if len(block.nodes)), default=0)
    if top < 1:
        return raw
    lower = [KINDS[block.kind] for block in raw.blocks if len(block.nodes) and KINDS[block.kind].dim < top]
    known = {size: _corner_sets(raw.blocks, size) for size in {kind.n_corners for kind in lower}}
    beam_groups = [name for name in raw.cell_groups if _BEAM_WORD.search(name)]
    beams = np.zeros(sum(len(block.nodes) for block in raw.blocks), bool)
    for name in beam_groups:
        beams[raw.cell_groups[name]] = True
    kept, blocks, start, stiffening = [], [], 0, 0
    dropped: dict[str, int] = {}
    for block in raw.blocks:
        kind = KINDS[block.kind]
        rows = np.arange(start, start + len(block.nodes))
        start += len(block.nodes)
        carrier = np.zeros(len(rows), bool)
        if kind.dim < top and len(rows):
            carrier = _among(block.nodes[:, : kind.n_corners], known[kind.n_corners][kind.dim])
            if kind.dim == 1:
                stiffening += int((carrier & beams[rows]).sum())
                carrier &= ~beams[rows]
        if carrier.any():
            dropped[block.kind] = dropped.get(block.kind, 0) + int(carrier.sum())
        kept.append(rows[~carrier])
        if not carrier.all():
            ids = None if block.ids is None else block.ids[~carrier]
            blocks.append(RawBlock(block.kind, block.nodes[~carrier], ids))
    if stiffening:
        named = ", ".join(f"'{name}'" for name in beam_groups)
        raw.notes.append(f"{stiffening} line cells on edges of others kept as beams by the name of a group: {named}")
    if not dropped:
        return raw
    old = np.concatenate(kept)
    new_row = np.full(start, -1)
    new_row[old] = np.arange(len(old))
    node_groups, cell_groups, moved = dict(raw.node_groups), {}, []
    for name, members in raw.cell_groups.items():
        left = new_row[members][new_row[members] >= 0]
        if len(left):
            cell_groups[name] = left
        elif len(members) and name not in node_groups:
            node_groups[name] = _nodes_of(raw.blocks, members)
            moved.append(name)
    words = ", ".join(f"{count} {kind}" for kind, count in dropped.items())
    note = f"{words} left out: they lie on other cells and carry only groups"
    if moved:
        note += f"; node groups now: {', '.join(moved)}"
    notes = [*raw.notes, note]
    return replace(raw, blocks=blocks, node_groups=node_groups, cell_groups=cell_groups, notes=notes)


def _corner_sets(blocks: list[RawBlock], size: int) -> dict[int, Array]:
    """By dimension of a carrier: sorted sets of ``size`` corners that cells of higher dimension offer."""
    found: dict[int, list[Array]] = {0: [], 1: [], 2: []}
    for block in blocks:
        kind = KINDS[block.kind]
        corners = block.nodes[:, : kind.n_corners]
        if size == 1 and kind.dim > 0:
            found[0].append(corners.reshape(-1, 1))
        if size == 2 and kind.dim > 1:
            found[1] += [block.nodes[:, edge[:2]] for edge in kind.edges]
        if size in (3, 4) and kind.dim == 3:
            found[2] += [block.nodes[:, face[:size]] for name, face in kind.faces if KINDS[name].n_corners == size]
    empty = np.empty((0, size), np.int64)
    return {d: np.unique(np.sort(np.concatenate([empty, *parts]), axis=1), axis=0) for d, parts in found.items()}


def _among(sets: Array, known: Array) -> Array:
    """(len(sets),) whether each corner set is among the known ones."""
    if not len(known):
        return np.zeros(len(sets), bool)
    _, label = np.unique(np.concatenate([known, np.sort(sets, axis=1)]), axis=0, return_inverse=True)
    label = label.reshape(-1)
    there = np.zeros(label.max() + 1, bool)
    there[label[: len(known)]] = True
    return there[label[len(known) :]]


def _nodes_of(blocks: list[RawBlock], cells: Array) -> Array:
    parts, start = [], 0
    for block in blocks:
        mine = cells[(cells >= start) & (cells < start + len(block.nodes))] - start
        parts.append(block.nodes[mine].ravel())
        start += len(block.nodes)
    return np.unique(np.concatenate(parts))
