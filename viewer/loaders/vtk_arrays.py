"""What VTK's arrays mean here: cells, ids, groups and mode shapes, from a ``.vtu`` file or from the worker.

The names stand in :mod:`viewer.loaders.vtu_files`.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from pathlib import Path
from typing import Protocol

import numpy as np

from viewer.cells import KINDS
from viewer.errors import LoadError
from viewer.jobs import SILENT, Progress
from viewer.loaders.array_names import (
    energy_array,
    group_name,
    mode_array,
    parse_energy_array,
    parse_mode_array,
)
from viewer.loaders.file_shapes import FileShapes, Parts, Stretch, stamp_of
from viewer.loaders.raw_data import RawBlock, RawMesh, RawModes, kinds_by_vtk
from viewer.loaders.vtu_xml import DataArray
from viewer.model.arrays import Array
from viewer.model.modes import ArrayShapes

# Kinds that VTK numbers in raster order: as ours after this permutation.
_RASTER: Mapping[int, tuple[str, tuple[int, ...] | None]] = {
    8: ("quad4", (0, 1, 3, 2)),
    11: ("hex8", (0, 1, 3, 2, 4, 5, 7, 6)),
}
# More runs of equal kind than this are sorted by kind: blocks are worked on one by one.
_MOST_RUNS = 64


class VtkArrays(Protocol):
    """An unstructured grid as named arrays by section ("Points", "Cells", "PointData", "CellData", "FieldData")."""

    path: Path
    n_points: int
    n_cells: int
    arrays: dict[str, dict[str, DataArray]]

    def read(self, array: DataArray, tuples: int) -> Array:
        """The values, (tuples,) or (tuples, components); size checked."""

    def stretch(self, array: DataArray, tuples: int) -> Stretch | None:
        """Where the values lie as plain bytes in the file, or None."""

    def error(self, problem: str, **parts: str) -> LoadError:
        """An error about this file."""


def shaped(values: Array, array: DataArray, tuples: int, error: Callable[..., LoadError]) -> Array:
    """``values`` as (tuples,) or (tuples, components), as ``array`` declares; ``error`` makes what is raised."""
    if values.size != tuples * array.components:
        raise error(
            "an array has a wrong length",
            place=f"{array.section}, array '{array.name}'",
            found=str(values.size),
            expected=str(tuples * array.components),
        )
    return values.reshape(tuples) if array.components == 1 else values.reshape(tuples, array.components)


def mesh_of(file: VtkArrays, progress: Progress = SILENT) -> RawMesh:
    """The mesh with ids and groups. Raises ``LoadError``."""
    points = _one(file, "Points", *file.arrays["Points"]) if file.arrays["Points"] else None
    if points is None or points.components != 3:
        raise file.error("has no points with three coordinates")
    xyz = file.read(points, file.n_points).reshape(-1, 3)
    progress.tick("reading cells")
    types = file.read(_one(file, "Cells", "types"), file.n_cells)
    ends = file.read(_one(file, "Cells", "offsets"), file.n_cells)
    raw, kept = cells_from_vtk(types, ends, lambda n: file.read(_one(file, "Cells", "connectivity"), n), file.path)
    raw.points = xyz
    node_id, elem_id = file.arrays["PointData"].get("node_id"), file.arrays["CellData"].get("elem_id")
    if node_id is not None:
        raw.node_ids = file.read(node_id, file.n_points)
    if elem_id is not None:
        deal_ids(raw, file.read(elem_id, file.n_cells), kept)
    raw.node_groups = {name: np.nonzero(values)[0] for name, values in _groups(file, "PointData", file.n_points)}
    raw.cell_groups = {name: np.nonzero(values[kept])[0] for name, values in _groups(file, "CellData", file.n_cells)}
    return raw


def modes_of(file: VtkArrays, progress: Progress = SILENT) -> RawModes:
    """The mode shapes; ours by name, else every vector array on points, in the order of the file."""
    point_data = file.arrays["PointData"]
    moved, turned = _mode_arrays(file, point_data)
    field = {
        name: file.read(array, array.tuples if array.tuples is not None else len(moved)).reshape(-1)
        for name, array in file.arrays["FieldData"].items()
        if name in ("freq_hz", "damping", "mass_normalised")
    }
    ids = file.read(point_data["node_id"], file.n_points) if "node_id" in point_data else None
    shapes: FileShapes | ArrayShapes
    if all(file.stretch(array, file.n_points) for arrays in [*moved, *turned] for array in arrays):
        shapes = FileShapes(
            str(file.path.resolve()),
            stamp_of(file.path),
            file.n_points,
            _stretches(file, moved),
            _stretches(file, turned) if turned else None,
        )
    else:
        shapes = ArrayShapes(
            _in_memory(file, moved, progress), _in_memory(file, turned, progress) if turned else None
        )
    normalised = field.get("mass_normalised")
    return RawModes(
        shapes,
        field.get("freq_hz"),
        field.get("damping"),
        ids,
        normalised is not None and len(normalised) > 0 and bool(normalised.all()),
        cell_energy=_energies(file, shapes.count),
    )


def _energies(file: VtkArrays, count: int) -> tuple[Array | None, Array] | None:
    """Element ids (None: as the cells come) and strain energies (modes, cells) that the file gives."""
    found = {parse_energy_array(name): array for name, array in file.arrays["CellData"].items()}
    given = {index: array for index, array in found.items() if index is not None}
    if not given:
        return None
    if max(given) >= count:
        raise file.error(
            "strain energies are given for a mode that is not there",
            place=f"array '{energy_array(max(given))}'",
            expected=f"at most {count} modes",
        )
    energy = np.full((count, file.n_cells), np.nan)
    for index, array in given.items():
        if array.components != 1:
            raise file.error(
                "a strain energy has one number a cell",
                place=f"array '{energy_array(index)}'",
                found=f"{array.components} components",
            )
        energy[index] = file.read(array, file.n_cells)
    ids = file.arrays["CellData"].get("elem_id")
    return None if ids is None else file.read(ids, file.n_cells), energy


# --- cells ---


def cells_from_vtk(types: Array, ends: Array, connectivity, path: object) -> tuple[RawMesh, Array]:
    """Blocks from VTK's arrays; ``connectivity(n)`` gives the n node rows. Points stay empty.

    Returns the mesh and the row in the file of each kept cell. Cells of kinds unknown here are left out, with a note.
    """
    if ends.dtype.kind not in "iu" or types.dtype.kind not in "iu":
        raise LoadError(
            "cell offsets and types are not whole numbers", file=path, found=f"{ends.dtype}, {types.dtype}"
        )
    ends = ends.astype(np.int64)
    starts = np.concatenate([[0], ends[:-1]]) if len(ends) else ends
    sizes = ends - starts
    if (sizes < 0).any():
        cell = int(np.argmax(sizes < 0))
        raise LoadError(
            "cell offsets do not grow",
            file=path,
            place=f"Cells, offsets, cell {cell + 1}",
            found=f"{ends[cell]} after {starts[cell]}",
            expected="each at least the one before",
        )
    nodes = connectivity(int(ends[-1]) if len(ends) else 0)
    names, known = kinds_by_vtk(), np.zeros(len(types), bool)
    for kind in np.unique(types):
        name = _kind_name(int(kind), names)
        if name:
            mine = types == kind
            known |= mine
            wrong = mine & (sizes != KINDS[name].n_nodes)
            if wrong.any():
                cell = int(np.argmax(wrong))
                raise LoadError(
                    f"a cell of kind {name} has a wrong number of nodes",
                    file=path,
                    place=f"cell {cell + 1}",
                    found=str(sizes[cell]),
                    expected=str(KINDS[name].n_nodes),
                )
    rows = np.nonzero(known)[0]
    cuts = np.nonzero(np.diff(types[rows].astype(np.int64)))[0] + 1
    notes = []
    if len(rows) < len(types):
        dropped = ", ".join(str(k) for k in np.unique(types[~known]))
        notes.append(f"{len(types) - len(rows)} cells left out: VTK cell types {dropped} are not known here")
    if len(cuts) >= _MOST_RUNS:
        rows = rows[np.argsort(types[rows], kind="stable")]
        cuts = np.nonzero(np.diff(types[rows].astype(np.int64)))[0] + 1
        notes.append("cells of many kinds alternate in the file: sorted by kind, ids kept")
    blocks = []
    for run in np.split(rows, cuts) if len(rows) else []:
        kind = int(types[run[0]])
        name, order = _kind_name(kind, names), _RASTER.get(kind, ("", None))[1]
        corner = starts[run][:, None] + np.arange(KINDS[name].n_nodes)
        block = nodes[corner]
        blocks.append(RawBlock(name, block if order is None else block[:, order]))
    return RawMesh(np.empty((0, 3)), blocks, notes=notes), rows


def _kind_name(vtk_type: int, names: Mapping[int, str]) -> str:
    return _RASTER[vtk_type][0] if vtk_type in _RASTER else names.get(vtk_type, "")


def deal_ids(raw: RawMesh, ids: Array, kept: Array) -> None:
    """Give each block its ids, from the ids of all cells of the file."""
    start = 0
    for block in raw.blocks:
        block.ids = ids[kept[start : start + len(block.nodes)]]
        start += len(block.nodes)


def _one(file: VtkArrays, section: str, *names: str) -> DataArray:
    for name in names:
        if name in file.arrays[section]:
            return file.arrays[section][name]
    raise file.error(f"array '{names[0]}' is missing", place=section)


def _groups(file: VtkArrays, section: str, tuples: int) -> Iterator[tuple[str, Array]]:
    for name, array in file.arrays[section].items():
        group = group_name(name)
        if group and array.components == 1 and array.dtype[0] in "iu":
            yield group, file.read(array, tuples)


# --- modes ---


def _mode_arrays(
    file: VtkArrays, point_data: dict[str, DataArray]
) -> tuple[list[list[DataArray]], list[list[DataArray]]]:
    """Arrays of each mode's translations and rotations: one, or real and imaginary."""
    found: dict[tuple[bool, str], dict[int, DataArray]] = {}
    for name, array in point_data.items():
        parsed = parse_mode_array(name)
        if parsed is not None:
            if array.components != 3:
                raise file.error(
                    "a mode shape needs three components",
                    place=f"PointData, array '{name}'",
                    found=str(array.components),
                    expected="3",
                )
            found.setdefault(parsed[1:], {})[parsed[0]] = array
    if not found:
        vectors = [[array] for array in point_data.values() if array.components == 3 and array.dtype[0] == "f"]
        if not vectors:
            raise file.error(
                "holds no mode shapes", place="PointData", expected="vector arrays mode_001, mode_002, …"
            )
        return vectors, []
    parts = ("_re", "_im") if (False, "_re") in found or (False, "_im") in found else ("",)
    count = max(len(numbers) for numbers in found.values())
    turned = any(key[0] for key in found)
    if set(found) != {(t, p) for t in ((False, True) if turned else (False,)) for p in parts}:
        names = ", ".join(sorted(a.name for numbers in found.values() for a in numbers.values()))[:200]
        raise file.error(
            "the arrays of the modes do not belong together",
            place="PointData",
            found=names,
            expected="for every mode mode_NNN, or mode_NNN_re and mode_NNN_im; _rot for all modes or none",
        )
    for key, numbers in found.items():
        missing = next((i for i in range(count) if i not in numbers), None)
        if missing is not None:
            raise file.error(
                "a mode shape is missing",
                place="PointData",
                found=", ".join(numbers[i].name for i in sorted(numbers))[:200],
                expected=f"array '{mode_array(missing, *key)}'; modes count from 001",
            )

    def pick(turn: bool) -> list[list[DataArray]]:
        return [[found[turn, part][i] for part in parts] for i in range(count)]

    return pick(False), pick(True) if turned else []


def _stretches(file: VtkArrays, modes: list[list[DataArray]]) -> tuple[Parts, ...]:
    return tuple(tuple(s for a in arrays if (s := file.stretch(a, file.n_points))) for arrays in modes)


def _in_memory(file: VtkArrays, modes: list[list[DataArray]], progress: Progress) -> Array:
    shapes = []
    for number, arrays in enumerate(modes):
        progress.tick("reading modes", number, len(modes))
        pieces = [file.read(array, file.n_points).astype(np.float64) for array in arrays]
        shapes.append(pieces[0] if len(pieces) == 1 else pieces[0] + 1j * pieces[1])
    return np.stack(shapes)
