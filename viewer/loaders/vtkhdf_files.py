"""``.vtkhdf``: VTK's published HDF5 layout, the interchange for large sets.

Group ``VTKHDF`` of type ``UnstructuredGrid``, or ``PolyData`` of which vertices, lines and polygons are read; in
pieces or in one; with steps (each one mode, see :mod:`viewer.loaders.step_modes`) or with the arrays of
:mod:`viewer.loaders.vtu_files` (``mode_001`` …, ``freq_hz``, ``node_id``, ``group_NAME``), which is what is written
here. VTK puts ``_`` for every ``.`` and ``/`` in the name of an array, so that groups are written without them.
Arrays written here are contiguous: one mode of many is read alone. Lengths are metres in files written here.
"""

from __future__ import annotations

import math
import os
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import h5py
import numpy as np

from viewer.errors import LoadError
from viewer.jobs import SILENT, Progress, atomic_path
from viewer.loaders.file_shapes import FileShapes, Stretch, stamp_of
from viewer.loaders.hdf5_sets import DataSet, data_sets, member, numbers, opened
from viewer.loaders.raw_data import RawMesh, RawModes
from viewer.loaders.step_modes import shape_names, step_frequencies
from viewer.loaders.vtk_arrays import mesh_of, modes_of
from viewer.loaders.vtu_files import arrays_to_write
from viewer.loaders.vtu_xml import DataArray
from viewer.model.arrays import Array
from viewer.model.mesh import Mesh
from viewer.model.modes import ArrayShapes, ModeSet

SUFFIXES = (".vtkhdf",)
_ROOT = "VTKHDF"
_VERSIONS = (1, 2)
# Parts of a poly data set and the VTK cell types by number of nodes (0: any other number).
_POLY = {"Vertices": {1: 1}, "Lines": {2: 3}, "Polygons": {3: 5, 4: 9, 0: 7}}


def read_mesh(path: Path, progress: Progress = SILENT) -> RawMesh:
    """The mesh in the file, that of the first step if there are several. Raises ``LoadError``."""
    with _grid(path) as grid:
        return mesh_of(grid, progress)


def read_modes(path: Path, progress: Progress = SILENT) -> RawModes:
    """The mode shapes; they stay in the file when neither chunked nor compressed. Raises ``LoadError``."""
    with _grid(path) as grid:
        return modes_of(grid, progress) if grid.n_steps < 2 else _modes_of_steps(grid, progress)


def write(path: str | os.PathLike[str], mesh: Mesh, modes: ModeSet | None, progress: Progress = SILENT) -> None:
    """One piece, contiguous arrays in the order of creation, one mode in memory at a time. Atomic."""
    with atomic_path(path) as part, h5py.File(part, "w", track_order=True) as file:
        root = file.create_group(_ROOT, track_order=True)
        root.attrs["Version"] = np.array([2, 0], np.int64)
        root.attrs.create("Type", np.bytes_(b"UnstructuredGrid"))
        for name, count in (("NumberOfPoints", mesh.n_nodes), ("NumberOfCells", mesh.n_cells)):
            root[name] = np.array([count], np.int64)
        groups = {s: root.create_group(s, track_order=True) for s in ("PointData", "CellData", "FieldData")}
        for section, name, dtype, shape, make in arrays_to_write(mesh, modes):
            progress.tick(f"writing {Path(path).name}")
            values = np.ascontiguousarray(make(), dtype)
            assert values.shape == shape, name
            if section in groups:
                groups[section][name.replace(".", "%2E")] = values
                continue
            if name == "offsets":
                values = np.concatenate([[0], values]).astype(np.int64)
            if name == "connectivity":
                root["NumberOfConnectivityIds"] = np.array([len(values)], np.int64)
            root[name.capitalize()] = values


@contextmanager
def _grid(path: Path) -> Iterator[_Grid]:
    with opened(path) as file:
        yield _Grid(path, file)


class _Grid:
    """``VtkArrays`` on the first step of the file."""

    def __init__(self, path: Path, file: h5py.File) -> None:
        self.path = path
        root = member(file, _ROOT)
        if not isinstance(root, h5py.Group):
            raise self.error("holds no group VTKHDF", found=", ".join(list(file)[:8]) or "nothing")
        self.root, self.kind = root, _type(root)
        version = np.asarray(root.attrs.get("Version", ())).reshape(-1)
        if len(version) != 2 or version[0] not in _VERSIONS:
            raise self.error("unknown version", place=_ROOT, found=str(version), expected="1.x or 2.x")
        if self.kind not in ("UnstructuredGrid", "PolyData"):
            raise self.error(
                "is of a type that is not read here",
                place=_ROOT,
                found=self.kind or "no type",
                expected="UnstructuredGrid or PolyData",
            )
        steps = member(root, "Steps")
        self.steps = steps if isinstance(steps, h5py.Group) else None
        self.n_steps = 0 if self.steps is None else self._count_of_steps(self.steps)
        self.pieces = self.pieces_of(0)
        points = numbers(path, root, "NumberOfPoints")
        self.first_point = self._step_number("PointOffsets", 0)
        self.piece_points = points[self.pieces]
        self.n_points = int(self.piece_points.sum())
        self._cells = self._cells_of_pieces()
        self.n_cells = len(self._cells["types"])
        self._sets = {section: self._group(section) for section in ("PointData", "CellData", "FieldData")}
        self._sets["Points"] = {name: s for name, s in data_sets(path, root).items() if name == "Points"}
        self.arrays: dict[str, dict[str, DataArray]] = {
            section: {name: self._array(section, name, data) for name, data in sets.items()}
            for section, sets in self._sets.items()
        }
        self.arrays["Cells"] = {
            name: DataArray(name, "Cells", values.dtype.str[1:], 1, len(values), "memory", None)
            for name, values in self._cells.items()
        }

    def error(self, problem: str, **parts: str) -> LoadError:
        return LoadError(problem, file=self.path, **parts)

    # --- the face of an open .vtu file ---

    def read(self, array: DataArray, tuples: int) -> Array:
        if array.section == "Cells":
            return self._cells[array.name][:tuples]
        data = self._sets[array.section][array.name]
        if array.section == "FieldData" and self.n_steps < 2:
            return self.field(array.name)
        first = self._first_row(array.section, array.name, 0)
        self._check_rows(data, first, tuples)
        values = data.rows(first, tuples)
        return values.reshape(tuples) if array.components == 1 else values.reshape(tuples, array.components)

    def stretch(self, array: DataArray, tuples: int) -> Stretch | None:
        return self.stretch_at(array.name, 0)

    def stretch_at(self, name: str, step: int) -> Stretch | None:
        """Where an array on points lies at a step, or None when its bytes are not plain."""
        data, first = self._sets["PointData"][name], self._first_row("PointData", name, step)
        self._check_rows(data, first, self.n_points)
        start = data.offset()
        return None if start is None else Stretch(start + first * 3 * data.dtype.itemsize, data.dtype.str)

    def rows_at(self, name: str, step: int) -> Array:
        """The values of an array on points at a step."""
        data, first = self._sets["PointData"][name], self._first_row("PointData", name, step)
        self._check_rows(data, first, self.n_points)
        return data.rows(first, self.n_points)

    def field(self, name: str) -> Array:
        """All values of a field array, of all steps."""
        return self._sets["FieldData"][name].read().reshape(-1)

    def times(self) -> Array | None:
        """(steps,) the values of the steps; None when they are missing."""
        values = data_sets(self.path, self.steps).get("Values") if self.steps is not None else None
        if values is None or values.shape != (self.n_steps,) or values.dtype.kind not in "fiu":
            return None
        return values.read().astype(np.float64)

    def _check_rows(self, data: DataSet, first: int, count: int) -> None:
        if not data.shape or first + count > data.shape[0]:
            raise self.error(
                "an array has a wrong length",
                place=data.name,
                found=f"{data.shape[0] if data.shape else 0} rows",
                expected=f"at least {first + count}",
            )

    # --- layout ---

    def _array(self, section: str, name: str, data: DataSet) -> DataArray:
        components = math.prod(data.shape[1:]) if section != "FieldData" else 1
        tuples = None if section != "FieldData" else math.prod(data.shape)
        return DataArray(name, section, data.dtype.str[1:], components, tuples, "memory", None)

    def _group(self, section: str) -> dict[str, DataSet]:
        group = member(self.root, section)
        if not isinstance(group, h5py.Group):
            return {}
        plain = {n: d for n in group if isinstance(d := member(group, n), h5py.Dataset) and d.dtype.kind in "fiuc"}
        return {name: DataSet(self.path, data.name, data) for name, data in plain.items()}

    def _count_of_steps(self, steps: h5py.Group) -> int:
        count = np.asarray(steps.attrs.get("NSteps", -1))
        if count.dtype.kind not in "iu" or count.size != 1 or not 1 <= int(count.reshape(())) < 2**31:
            raise self.error(
                "the number of steps is wrong", place="Steps, NSteps", found=str(count)[:40], expected="1 or more"
            )
        return int(count.reshape(()))

    def _step_number(self, name: str, step: int) -> int:
        """A number of the steps' table; 0 without steps."""
        if self.steps is None:
            return 0
        values = numbers(self.path, self.steps, name)
        if step >= len(values):
            raise self.error(
                "the steps' table is too short", place=name, found=str(len(values)), expected=str(self.n_steps)
            )
        return int(values[step])

    def _first_row(self, section: str, name: str, step: int) -> int:
        if section == "Points":
            return self._step_number("PointOffsets", step)
        if self.steps is None:
            return 0
        known = member(self.steps, f"{section}Offsets/{name}")
        return self._step_number(f"{section}Offsets/{name}", step) if isinstance(known, h5py.Dataset) else 0

    def pieces_of(self, step: int) -> slice:
        count = len(numbers(self.path, self.root, "NumberOfPoints"))
        if count == 0:
            raise self.error("holds no piece", place="NumberOfPoints")
        if self.steps is None:
            return slice(0, count)
        first = self._step_number("PartOffsets", step)
        has_number = isinstance(member(self.steps, "NumberOfParts"), h5py.Dataset)
        parts = self._step_number("NumberOfParts", step) if has_number else 1
        if parts == 0 or first + parts > count:
            raise self.error(
                "a step names pieces that do not exist",
                place=f"Steps, step {step + 1}",
                found=f"{parts} from {first}",
                expected=f"0 to {count}",
            )
        return slice(first, first + parts)

    def _cells_of_pieces(self) -> dict[str, Array]:
        if self.kind == "UnstructuredGrid":
            return self._joined(self.root, None, 0)
        found = []
        for topology, (name, types) in enumerate(_POLY.items()):
            group = member(self.root, name)
            if isinstance(group, h5py.Group):
                found.append(self._joined(group, types, topology))
        strips = member(self.root, "Strips/Connectivity")
        if isinstance(strips, h5py.Dataset) and strips.size:
            raise self.error("holds triangle strips, which are not read", place="Strips", do="save it as triangles")
        ends, start = [], 0
        for part in found:
            ends.append(part["offsets"] + start)
            start += len(part["connectivity"])
        return {
            "types": np.concatenate([np.empty(0, np.int64), *(part["types"] for part in found)]),
            "offsets": np.concatenate([np.empty(0, np.int64), *ends]),
            "connectivity": np.concatenate([np.empty(0, np.int64), *(part["connectivity"] for part in found)]),
        }

    def _joined(self, group: h5py.Group, types: dict[int, int] | None, topology: int) -> dict[str, Array]:
        """Connectivity of all pieces of the first step with rows counted through, ends and types of the cells."""
        table = {name: numbers(self.path, group, name) for name in ("NumberOfCells", "NumberOfConnectivityIds")}
        for name, values in table.items():
            if self.pieces.stop > len(values):
                raise self.error(
                    "a table of pieces is too short",
                    place=name,
                    found=str(len(values)),
                    expected=str(self.pieces.stop),
                )
        cells = table["NumberOfCells"][self.pieces]
        ids = table["NumberOfConnectivityIds"][self.pieces]
        first_cell, first_id = (self._first_cell(name, topology) for name in ("CellOffsets", "ConnectivityIdOffsets"))
        nodes = self._part(group, "Connectivity", first_id, int(ids.sum()))
        # each piece writes one offset more than it has cells; steps before this one wrote theirs too
        before = first_cell + self.pieces.start
        offsets = self._part(group, "Offsets", before, int(cells.sum()) + len(cells))
        points = np.concatenate([[0], np.cumsum(self.piece_points)[:-1]])
        outside = (nodes < 0) | (nodes >= np.repeat(self.piece_points, ids))
        if outside.any():
            raise self.error(
                "a cell names a point that does not exist",
                place=f"{group.name}/Connectivity, row {int(np.argmax(outside)) + 1}",
                found=f"index {nodes[outside][0]}",
                expected="0 to one less than the points of its piece",
            )
        nodes = nodes + np.repeat(points, ids)
        starts = np.concatenate([[0], np.cumsum(ids)[:-1]])
        ends, at = [np.empty(0, np.int64)], 0
        for piece, count in enumerate(cells.tolist()):
            mine = offsets[at : at + count + 1]
            at += count + 1
            if mine[0] != 0 or mine[-1] != ids[piece]:
                raise self.error(
                    "the offsets of a piece do not fit its connectivity",
                    place=f"{group.name}/Offsets, piece {piece + 1}",
                    found=f"{mine[0]} to {mine[-1]}",
                    expected=f"0 to {ids[piece]}",
                )
            ends.append(mine[1:] + starts[piece])
        end = np.concatenate(ends)
        if types is None:
            kind = self._part(group, "Types", first_cell, int(cells.sum()))
        else:
            sizes = np.diff(end, prepend=0)
            kind = np.full(len(sizes), types.get(0, 0))
            for size, number in types.items():
                kind[(sizes == size) & (size > 0)] = number
        return {"types": kind, "offsets": end, "connectivity": nodes}

    def _first_cell(self, name: str, topology: int) -> int:
        if self.steps is None:
            return 0
        if self.kind != "PolyData":
            return self._step_number(name, 0)
        values = numbers(self.path, self.steps, name)
        return int(values[topology]) if topology < len(values) else 0

    def _part(self, group: h5py.Group, name: str, first: int, count: int) -> Array:
        found = member(group, name)
        if not isinstance(found, h5py.Dataset):
            raise self.error(f"array '{name}' is missing", place=group.name or "")
        data = DataSet(self.path, found.name, found)
        if data.dtype.kind not in "iu" or len(data.shape) != 1:
            raise self.error("is not a row of whole numbers", place=data.name, found=f"{data.shape} of {data.dtype}")
        self._check_rows(data, first, count)
        return data.rows(first, count).astype(np.int64)


def _type(root: h5py.Group) -> str:
    kind = root.attrs.get("Type", b"")
    return kind.decode("ascii", "replace") if isinstance(kind, bytes) else str(kind)


def _modes_of_steps(grid: _Grid, progress: Progress) -> RawModes:
    for step in range(grid.n_steps):
        pieces = grid.pieces_of(step)
        n = int(numbers(grid.path, grid.root, "NumberOfPoints")[pieces].sum())
        if n != grid.n_points:
            raise grid.error(
                "the mesh changes from step to step",
                place=f"step {step + 1}",
                found=f"{n} points",
                expected=f"{grid.n_points}, as in the first step",
            )
    vectors = [n for n, a in grid.arrays["PointData"].items() if a.components == 3 and a.dtype[0] == "f"]
    moved, turned = shape_names(vectors, grid.path)
    shapes: FileShapes | ArrayShapes
    stretches = [_stretches(grid, names) for names in (moved, turned)]
    if all(stretch for steps in stretches for parts in steps for stretch in parts):
        stamp = stamp_of(grid.path)
        shapes = FileShapes(
            str(grid.path.resolve()), stamp, grid.n_points, stretches[0], stretches[1] if turned else None
        )
    else:
        shapes = ArrayShapes(_loaded(grid, moved, progress), _loaded(grid, turned, progress) if turned else None)
    given = grid.arrays["FieldData"].get("freq_hz")
    own = given is not None and given.tuples == grid.n_steps
    freq = grid.field("freq_hz") if own else step_frequencies(grid.times())
    ids = grid.arrays["PointData"].get("node_id")
    return RawModes(shapes, freq, None, None if ids is None else grid.read(ids, grid.n_points))


def _stretches(grid: _Grid, names: tuple[str, ...]) -> tuple:
    return tuple(tuple(grid.stretch_at(name, step) for name in names) for step in range(grid.n_steps))


def _loaded(grid: _Grid, names: tuple[str, ...], progress: Progress) -> Array:
    shapes = []
    for step in range(grid.n_steps):
        progress.tick("reading modes", step, grid.n_steps)
        parts = [grid.rows_at(name, step).reshape(-1, 3).astype(np.float64) for name in names]
        shapes.append(parts[0] if len(parts) == 1 else parts[0] + 1j * parts[1])
    return np.stack(shapes)
