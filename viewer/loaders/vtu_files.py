"""``.vtu``, the default interchange: one mesh with its mode shapes.

Point arrays ``mode_001`` … hold translations (``mode_001_re`` and ``mode_001_im`` when complex),
``mode_001_rot`` … rotations; field arrays ``freq_hz``, ``damping`` and ``mass_normalised`` (1 when the shapes
have unit modal mass) have one value a mode; ``node_id`` and ``elem_id`` are integers; an integer array
``group_NAME`` on points or cells is a group, its members not zero. Lengths are metres in files written here.

Read without VTK, so that sizes are checked before memory is taken and a shape can stay in the file.
"""

from __future__ import annotations

import os
from collections.abc import Iterator
from pathlib import Path

import numpy as np

from viewer.cells import KINDS
from viewer.errors import LoadError
from viewer.jobs import SILENT, Progress, atomic_path
from viewer.loaders.array_names import group_array, group_name, mask, mode_array, parse_mode_array
from viewer.loaders.file_shapes import FileShapes, Parts, stamp_of
from viewer.loaders.raw_data import RawBlock, RawMesh, RawModes, kinds_by_vtk
from viewer.loaders.vtu_xml import DataArray, VtuFile
from viewer.model.arrays import Array
from viewer.model.mesh import Mesh
from viewer.model.modes import ArrayShapes, ModeSet

SUFFIXES = (".vtu",)
# Kinds that VTK numbers in raster order: as ours after this permutation.
_RASTER = {8: ("quad4", (0, 1, 3, 2)), 11: ("hex8", (0, 1, 3, 2, 4, 5, 7, 6))}
# More runs of equal kind than this are sorted by kind: blocks are worked on one by one.
_MOST_RUNS = 64


def read_mesh(path: Path, progress: Progress = SILENT) -> RawMesh:
    """The mesh as it stands in the file. Raises ``LoadError``, or ``OtherReaderNeeded`` for what VTK must read."""
    with VtuFile(path) as file:
        points = _one(file, "Points", *file.arrays["Points"]) if file.arrays["Points"] else None
        if points is None or points.components != 3:
            raise file.error("has no points with three coordinates")
        xyz = file.read(points, file.n_points).reshape(-1, 3)
        progress.tick("reading cells")
        types = file.read(_one(file, "Cells", "types"), file.n_cells)
        ends = file.read(_one(file, "Cells", "offsets"), file.n_cells)
        raw, kept = cells_from_vtk(types, ends, lambda n: file.read(_one(file, "Cells", "connectivity"), n), path)
        raw.points = xyz
        node_id, elem_id = file.arrays["PointData"].get("node_id"), file.arrays["CellData"].get("elem_id")
        if node_id is not None:
            raw.node_ids = file.read(node_id, file.n_points)
        if elem_id is not None:
            deal_ids(raw, file.read(elem_id, file.n_cells), kept)
        raw.node_groups = {name: np.nonzero(values)[0] for name, values in _groups(file, "PointData", file.n_points)}
        raw.cell_groups = {name: np.nonzero(values[kept])[0] for name, values in _groups(file, "CellData", file.n_cells)}
        return raw


def read_modes(path: Path, progress: Progress = SILENT) -> RawModes:
    """The mode shapes; ours by name, else every vector array on points, in the order of the file."""
    with VtuFile(path) as file:
        point_data = file.arrays["PointData"]
        moved, turned = _mode_arrays(file, point_data)
        field = {
            name: file.read(array, array.tuples if array.tuples is not None else len(moved)).reshape(-1)
            for name, array in file.arrays["FieldData"].items() if name in ("freq_hz", "damping", "mass_normalised")
        }
        ids = file.read(point_data["node_id"], file.n_points) if "node_id" in point_data else None
        shapes: FileShapes | ArrayShapes
        if all(file.stretch(array, file.n_points) for arrays in [*moved, *turned] for array in arrays):
            shapes = FileShapes(str(path.resolve()), stamp_of(path), file.n_points,
                                _stretches(file, moved), _stretches(file, turned) if turned else None)
        else:
            shapes = ArrayShapes(_in_memory(file, moved, progress), _in_memory(file, turned, progress) if turned else None)
        normalised = field.get("mass_normalised")
        return RawModes(shapes, field.get("freq_hz"), field.get("damping"), ids,
                        normalised is not None and len(normalised) > 0 and bool(normalised.all()))


def write(path: str | os.PathLike[str], mesh: Mesh, modes: ModeSet | None, progress: Progress = SILENT) -> None:
    """Appended raw, not compressed, 64-bit header; one mode in memory at a time. Atomic."""
    arrays = list(_arrays_to_write(mesh, modes))
    with atomic_path(path) as part, part.open("wb") as stream:
        stream.write(_head(mesh, arrays).encode("ascii"))
        for number, (_, name, dtype, shape, make) in enumerate(arrays):
            progress.tick(f"writing {Path(path).name}", number, len(arrays))
            values = np.ascontiguousarray(make(), dtype)
            assert values.shape == shape, name
            stream.write(np.array([values.nbytes], "<u8").tobytes())
            stream.write(values.reshape(-1).view(np.uint8).data)
        stream.write(b"\n  </AppendedData>\n</VTKFile>\n")


# --- cells ---

def cells_from_vtk(types: Array, ends: Array, connectivity, path: object) -> tuple[RawMesh, Array]:
    """Blocks from VTK's arrays; ``connectivity(n)`` gives the n node rows. Points stay empty.

    Returns the mesh and the row in the file of each kept cell. Cells of kinds unknown here are left out, with a note.
    """
    if ends.dtype.kind not in "iu" or types.dtype.kind not in "iu":
        raise LoadError("cell offsets and types are not whole numbers", file=path, found=f"{ends.dtype}, {types.dtype}")
    ends = ends.astype(np.int64)
    starts = np.concatenate([[0], ends[:-1]]) if len(ends) else ends
    sizes = ends - starts
    if (sizes < 0).any():
        cell = int(np.argmax(sizes < 0))
        raise LoadError("cell offsets do not grow", file=path, place=f"Cells, offsets, cell {cell + 1}",
                        found=f"{ends[cell]} after {starts[cell]}", expected="each at least the one before")
    nodes = connectivity(int(ends[-1]) if len(ends) else 0)
    names, known, raster = kinds_by_vtk(), np.zeros(len(types), bool), {}
    for kind in np.unique(types):
        name, raster[kind] = _RASTER.get(int(kind), (names.get(int(kind), ""), None))
        if name:
            mine = types == kind
            known |= mine
            wrong = mine & (sizes != KINDS[name].n_nodes)
            if wrong.any():
                cell = int(np.argmax(wrong))
                raise LoadError(f"a cell of kind {name} has a wrong number of nodes", file=path, place=f"cell {cell + 1}",
                                found=str(sizes[cell]), expected=str(KINDS[name].n_nodes))
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
        name, order = _RASTER.get(kind, (names.get(kind, ""), None))
        corner = starts[run][:, None] + np.arange(KINDS[name].n_nodes)
        block = nodes[corner]
        blocks.append(RawBlock(name, block if order is None else block[:, order]))
    return RawMesh(np.empty((0, 3)), blocks, notes=notes), rows


def deal_ids(raw: RawMesh, ids: Array, kept: Array) -> None:
    """Give each block its ids, from the ids of all cells of the file."""
    cuts = np.cumsum([len(block.nodes) for block in raw.blocks])[:-1]
    for block, part in zip(raw.blocks, np.split(ids[kept], cuts), strict=True):
        block.ids = part


def _one(file: VtuFile, section: str, *names: str) -> DataArray:
    for name in names:
        if name in file.arrays[section]:
            return file.arrays[section][name]
    raise file.error(f"array '{names[0]}' is missing", place=section)


def _groups(file: VtuFile, section: str, tuples: int) -> Iterator[tuple[str, Array]]:
    for name, array in file.arrays[section].items():
        group = group_name(name)
        if group and array.components == 1 and array.dtype[0] in "iu":
            yield group, file.read(array, tuples)


# --- modes ---

def _mode_arrays(file: VtuFile, point_data: dict[str, DataArray]) -> tuple[list[list[DataArray]], list[list[DataArray]]]:
    """Arrays of each mode's translations and rotations: one, or real and imaginary."""
    found: dict[tuple[bool, str], dict[int, DataArray]] = {}
    for name, array in point_data.items():
        parsed = parse_mode_array(name)
        if parsed is not None:
            if array.components != 3:
                raise file.error("a mode shape needs three components", place=f"PointData, array '{name}'",
                                 found=str(array.components), expected="3")
            found.setdefault(parsed[1:], {})[parsed[0]] = array
    if not found:
        vectors = [[array] for array in point_data.values() if array.components == 3 and array.dtype[0] == "f"]
        if not vectors:
            raise file.error("holds no mode shapes", place="PointData", expected="vector arrays mode_001, mode_002, …")
        return vectors, []
    parts = ("_re", "_im") if (False, "_re") in found or (False, "_im") in found else ("",)
    count = max((max(numbers) for numbers in found.values()), default=-1) + 1
    turned = any(key[0] for key in found)
    if set(found) != {(t, p) for t in ((False, True) if turned else (False,)) for p in parts}:
        names = ", ".join(sorted(a.name for numbers in found.values() for a in numbers.values()))[:200]
        raise file.error("the arrays of the modes do not belong together", place="PointData", found=names,
                         expected="for every mode mode_NNN, or mode_NNN_re and mode_NNN_im; _rot for all modes or none")
    for key, numbers in found.items():
        if len(numbers) != count:
            missing = min(set(range(count)) - set(numbers))
            raise file.error("a mode shape is missing", place="PointData",
                             expected=f"array '{mode_array(missing, *key)}'")
    def pick(turn: bool) -> list[list[DataArray]]:
        return [[found[turn, part][i] for part in parts] for i in range(count)]
    return pick(False), pick(True) if turned else []


def _stretches(file: VtuFile, modes: list[list[DataArray]]) -> tuple[Parts, ...]:
    return tuple(tuple(s for a in arrays if (s := file.stretch(a, file.n_points))) for arrays in modes)


def _in_memory(file: VtuFile, modes: list[list[DataArray]], progress: Progress) -> Array:
    shapes = []
    for number, arrays in enumerate(modes):
        progress.tick("reading modes", number, len(modes))
        pieces = [file.read(array, file.n_points).astype(np.float64) for array in arrays]
        shapes.append(pieces[0] if len(pieces) == 1 else pieces[0] + 1j * pieces[1])
    return np.stack(shapes)


# --- writing ---

def _arrays_to_write(mesh: Mesh, modes: ModeSet | None):
    """(section, name, dtype, shape, maker) of every array in the order in which it is written."""
    n, cells = mesh.n_nodes, mesh.n_cells
    if modes is not None:
        m = modes.count
        yield "FieldData", "freq_hz", "<f8", (m,), lambda: modes.freq_hz
        if modes.damping is not None:
            yield "FieldData", "damping", "<f8", (m,), lambda: modes.damping
        yield "FieldData", "mass_normalised", "<u1", (m,), lambda: np.full(m, modes.normalisation == "mass")
        for i in range(m):
            yield from _mode_to_write(modes, i, n)
    yield "PointData", "node_id", "<i8", (n,), lambda: mesh.node_ids
    for name, rows in mesh.node_groups.items():
        yield "PointData", group_array(name), "<u1", (n,), lambda rows=rows: mask(rows, n)
    yield "CellData", "elem_id", "<i8", (cells,), lambda: mesh.cell_ids
    for name, rows in mesh.cell_groups.items():
        yield "CellData", group_array(name), "<u1", (cells,), lambda rows=rows: mask(rows, cells)
    yield "Points", "Points", "<f8", (n, 3), lambda: mesh.points
    sizes = np.repeat([KINDS[b.kind].n_nodes for b in mesh.blocks], [len(b) for b in mesh.blocks]).astype(np.int64)
    types = np.repeat([KINDS[b.kind].vtk_type for b in mesh.blocks], [len(b) for b in mesh.blocks])
    total = int(sizes.sum())
    yield "Cells", "connectivity", "<i8", (total,), lambda: np.concatenate([b.nodes.ravel() for b in mesh.blocks])
    yield "Cells", "offsets", "<i8", (cells,), lambda: np.cumsum(sizes)
    yield "Cells", "types", "<u1", (cells,), lambda: types


def _mode_to_write(modes: ModeSet, index: int, n: int):
    for turned in (False, True) if modes.shapes.has_rotations else (False,):
        shape = modes.rotations if turned else modes.shape
        for part in ("_re", "_im") if modes.is_complex else ("",):
            yield ("PointData", mode_array(index, turned, part), "<f8", (n, 3),
                   lambda shape=shape, part=part: np.imag(shape(index)) if part == "_im" else np.real(shape(index)))


def _head(mesh: Mesh, arrays: list) -> str:
    lines = ['<?xml version="1.0"?>',
             '<VTKFile type="UnstructuredGrid" version="1.0" byte_order="LittleEndian" header_type="UInt64">',
             "  <UnstructuredGrid>"]
    offset, by_section = 0, {}
    for section, name, dtype, shape, _ in arrays:
        kind = {"<f8": "Float64", "<i8": "Int64", "<u1": "UInt8"}[dtype]
        parts = f' NumberOfComponents="{shape[1]}"' if len(shape) > 1 else ""
        tuples = f' NumberOfTuples="{shape[0]}"' if section == "FieldData" else ""
        by_section.setdefault(section, []).append(
            f'<DataArray type="{kind}" Name="{name}"{parts}{tuples} format="appended" offset="{offset}"/>')
        offset += 8 + int(np.prod(shape)) * np.dtype(dtype).itemsize
    def section(name: str, indent: str) -> list[str]:
        inner = [f"{indent}  {line}" for line in by_section.get(name, [])]
        return [f"{indent}<{name}>", *inner, f"{indent}</{name}>"]
    lines += section("FieldData", "    ")
    lines.append(f'    <Piece NumberOfPoints="{mesh.n_nodes}" NumberOfCells="{mesh.n_cells}">')
    for name in ("PointData", "CellData", "Points", "Cells"):
        lines += section(name, "      ")
    lines += ["    </Piece>", "  </UnstructuredGrid>", '  <AppendedData encoding="raw">', "   _"]
    return "\n".join(lines)
