"""``.xdmf``: unstructured grids with numbers in the XML, or in HDF5 files or plain bytes beside it.

Read by its published model: uniform and mixed topologies up to second order, sets as groups, attributes. Each step
of a temporal collection is one mode (:mod:`viewer.loaders.step_modes`), its frequency an attribute or information
``freq_hz`` of the step, else its time. A single grid may hold the arrays of :mod:`viewer.loaders.vtu_files`. Where
the numbers lie uncompressed in one HDF5 file, one mode of many is read alone.
"""

from __future__ import annotations

import math
from pathlib import Path
from typing import NamedTuple
from xml.etree.ElementTree import Element

import numpy as np

from viewer.errors import LoadError
from viewer.jobs import SILENT, Progress
from viewer.loaders.array_names import group_array
from viewer.loaders.csv_tables import frequency_table
from viewer.loaders.file_shapes import FileShapes, Stretch, stamp_of
from viewer.loaders.raw_data import RawMesh, RawModes
from viewer.loaders.step_modes import shape_names, step_frequencies
from viewer.loaders.vtk_arrays import mesh_of, modes_of, shaped
from viewer.loaders.vtu_xml import DataArray
from viewer.loaders.xdmf_cells import cells_of
from viewer.loaders.xdmf_items import Document, Item
from viewer.model.arrays import Array
from viewer.model.modes import ArrayShapes

SUFFIXES = (".xdmf", ".xmf")


class _Step(NamedTuple):
    grid: Element
    place: str


def read_mesh(path: Path, progress: Progress = SILENT) -> RawMesh:
    """The mesh in the file, that of the first step if there are several. Raises ``LoadError``."""
    with Document(path) as document:
        alone, steps = _grids(document)
        grid = _Grid(document, alone or steps[0].grid)
        raw = mesh_of(grid, progress)
        raw.notes += grid.notes
        return raw


def read_modes(path: Path, progress: Progress = SILENT) -> RawModes:
    """The mode shapes; they stay in one HDF5 file when neither chunked nor compressed. Raises ``LoadError``."""
    with Document(path) as document:
        alone, steps = _grids(document)
        if not steps:
            assert alone is not None
            return modes_of(_Grid(document, alone), progress)
        return _modes_of_steps(document, _Grid(document, alone or steps[0].grid), steps, progress)


def _grids(document: Document) -> tuple[Element | None, list[_Step]]:
    """The grid outside any collection, and the steps of the one temporal collection; either may be missing."""
    alone: list[Element] = []
    series: list[Element] = []

    def sort(grid: Element, depth: int) -> None:
        kind = grid.get("GridType", "Uniform").lower()
        children = grid.findall("Grid")
        if kind == "uniform":
            alone.append(grid)
        elif kind == "collection" and grid.get("CollectionType", "Spatial").lower() == "temporal":
            series.append(grid)
        elif kind in ("collection", "tree") and len(children) == 1:
            sort(children[0], depth + 1)
        else:
            raise document.error(
                "a grid is of a type that is not read",
                place=f"Grid '{grid.get('Name', '')}'"[:80],
                found=f"{kind} {grid.get('CollectionType', '')} of {len(children)} grids"[:80],
                expected="one uniform grid, or a temporal collection of them",
            )

    for domain in document.root.iterfind("Domain"):
        for grid in domain.iterfind("Grid"):
            sort(grid, 0)
    if len(series) > 1 or len(alone) > 1 or not (series or alone):
        raise document.error(
            "holds no grid" if not (series or alone) else "holds several grids",
            found=", ".join(g.get("Name", "?") for g in series + alone)[:120] or "none",
            expected="one uniform grid, one temporal collection, or one of each",
        )
    steps = [_Step(grid, f"step {number}") for s in series for number, grid in enumerate(s.iterfind("Grid"), 1)]
    if series and not steps:
        raise document.error("holds no step", place=f"Grid '{series[0].get('Name', '')}'"[:80])
    for step in steps:
        if step.grid.get("GridType", "Uniform").lower() != "uniform":
            raise document.error("a step is no uniform grid", place=step.place)
    return alone[0] if alone else None, steps


class _Grid:
    """``VtkArrays`` on one uniform grid."""

    def __init__(self, document: Document, grid: Element) -> None:
        self.document, self.path, self.notes = document, document.path, []  # type: ignore[var-annotated]
        self.arrays: dict[str, dict[str, DataArray]] = {
            section: {} for section in ("Points", "Cells", "PointData", "CellData", "FieldData")
        }
        self._values: dict[tuple[str, str], Array | Item] = {}
        self.geometry, self.points = _points(document, grid)
        self.n_points = len(self.points)
        self._put("Points", "Points", self.points)
        cells = cells_of(document, grid)
        self.n_cells = len(cells["types"])
        for name, values in cells.items():
            self._put("Cells", name, values)
        for name, center, item in attributes(document, grid):
            section = {"node": "PointData", "cell": "CellData", "grid": "FieldData"}.get(center)
            if section is not None:
                self._put(section, name, item)
        self._put_sets(grid)

    def error(self, problem: str, **parts: str) -> LoadError:
        return LoadError(problem, file=self.path, **parts)

    def read(self, array: DataArray, tuples: int) -> Array:
        values = self._values[array.section, array.name]
        values = values.read() if isinstance(values, Item) else values
        return shaped(values, array, tuples, self.error)

    def stretch(self, array: DataArray, tuples: int) -> Stretch | None:
        return None  # the bytes lie in another file

    def _put(self, section: str, name: str, values: Array | Item) -> None:
        if name in self.arrays[section]:
            raise self.error("an array is given twice", place=f"{section}, array '{name}'"[:80])
        stored = values.array if isinstance(values, Item) else values
        size, dtype = math.prod(stored.shape), stored.dtype.str[1:]
        if section == "PointData" and self.n_points:
            components = max(1, size // self.n_points)  # vectors may be written as one long row
        else:
            components = 1 if section == "FieldData" else math.prod(stored.shape[1:])
        self.arrays[section][name] = DataArray(name, section, dtype, components, size, "memory", None)
        self._values[section, name] = values

    def _put_sets(self, grid: Element) -> None:
        for given in grid.iterfind("Set"):
            name, kind = given.get("Name", ""), (given.get("SetType") or given.get("Center") or "").lower()
            section, count = {"node": ("PointData", self.n_points), "cell": ("CellData", self.n_cells)}.get(
                kind, ("", 0)
            )
            if not section or not name:
                self.notes.append(f"set '{name}' left out: it is of {kind or 'no type'}, not of nodes or cells")
                continue
            place = f"Set '{name}'"[:80]
            rows = self.document.item(given, place).read().reshape(-1)
            if rows.dtype.kind not in "iu" or (rows.size and not 0 <= int(rows.min()) <= int(rows.max()) < count):
                wanted = f"whole numbers 0 to {count - 1}"
                raise self.error("a set reaches outside", place=place, found=str(rows[:4]), expected=wanted)
            members = np.zeros(count, np.uint8)
            members[rows.astype(np.int64)] = 1
            self._put(section, group_array(name), members)


def attributes(document: Document, grid: Element) -> list[tuple[str, str, Item]]:
    """(name, center in lower case, item) of each attribute of the grid."""
    found = []
    for given in grid.iterfind("Attribute"):
        attribute = document.followed(given)
        name = attribute.get("Name", "")
        item = document.item(attribute, f"Attribute '{name}'"[:80])
        if name and item.array.dtype.kind in "fiu":
            found.append((name, attribute.get("Center", "Node").lower(), item))
    return found


def _points(document: Document, grid: Element) -> tuple[Element, Array]:
    geometry = document.child(grid, "Geometry")
    if geometry is None:
        raise document.error("a grid has no Geometry", place=f"Grid '{grid.get('Name', '')}'"[:80])
    kind = (geometry.get("GeometryType") or geometry.get("Type") or "XYZ").upper()
    width = {"XYZ": 3, "XY": 2}.get(kind)
    if width is None:
        raise document.error(
            "a geometry is of a type that is not read", place="Geometry", found=kind[:40], expected="XYZ or XY"
        )
    values = document.item(geometry, "Geometry").read()
    if values.size % width or (values.ndim > 1 and values.shape[-1] != width):
        raise document.error(
            "points have a wrong shape", place="Geometry", found=str(values.shape), expected=f"(n, {width})"
        )
    points = values.reshape(-1, width)
    return geometry, points if width == 3 else np.column_stack([points, np.zeros(len(points))])


# --- steps ---


def _modes_of_steps(document: Document, mesh: _Grid, steps: list[_Step], progress: Progress) -> RawModes:
    names = None
    items: list[list[Item]] = []
    for number, step in enumerate(steps):
        progress.tick("looking at steps", number, len(steps))
        _same_points(document, mesh, step)
        vectors = {
            name: item
            for name, center, item in attributes(document, step.grid)
            if center == "node" and item.size == 3 * mesh.n_points and item.array.dtype.kind == "f"
        }
        try:
            names = names or shape_names(list(vectors), document.path)
        except LoadError as error:
            raise error.at(place=step.place) from None
        lacking = [name for name in (*names.moved, *names.turned) if name not in vectors]
        if lacking:
            raise document.error(
                "a step lacks the shape or has another number of nodes",
                place=step.place,
                found=", ".join(vectors)[:120] or "no vector on every point",
                expected=f"{lacking[0]} with {mesh.n_points} rows",
            )
        items.append([vectors[name] for name in (*names.moved, *names.turned)])
    assert names is not None
    cut = len(names.moved)
    moved, turned = [row[:cut] for row in items], [row[cut:] for row in items]
    sources = {item.source for row in items for item in row}
    shapes: FileShapes | ArrayShapes
    if len(sources) == 1 and all(item.array.offset() is not None for row in items for item in row):
        source = sources.pop()
        shapes = FileShapes(
            str(source.resolve()),
            stamp_of(source),
            mesh.n_points,
            _stretches(moved),
            _stretches(turned) if names.turned else None,
        )
    else:
        rotations = _loaded(turned, mesh.n_points, progress) if names.turned else None
        shapes = ArrayShapes(_loaded(moved, mesh.n_points, progress), rotations)
    ids = mesh.arrays["PointData"].get("node_id")
    freq = _frequencies(document, steps)
    return RawModes(shapes, freq, None, None if ids is None else mesh.read(ids, mesh.n_points))


def _same_points(document: Document, mesh: _Grid, step: _Step) -> None:
    geometry = document.child(step.grid, "Geometry")
    if geometry is None or geometry is mesh.geometry:
        return
    _, points = _points(document, step.grid)
    if not np.array_equal(points, mesh.points):
        raise document.error(
            "the mesh changes from step to step",
            place=step.place,
            found=f"{len(points)} points",
            expected=f"the {mesh.n_points} points of the first mesh, unmoved",
        )


def _stretches(rows: list[list[Item]]) -> tuple[tuple[Stretch, ...], ...]:
    return tuple(tuple(Stretch(item.array.offset() or 0, item.array.dtype.str) for item in row) for row in rows)


def _loaded(rows: list[list[Item]], n_points: int, progress: Progress) -> Array:
    shapes = []
    for number, row in enumerate(rows):
        progress.tick("reading modes", number, len(rows))
        parts = [item.read().reshape(n_points, 3).astype(np.float64) for item in row]
        shapes.append(parts[0] if len(parts) == 1 else parts[0] + 1j * parts[1])
    return np.stack(shapes)


def _frequencies(document: Document, steps: list[_Step]) -> Array | None:
    given = [_own_frequency(document, step) for step in steps]
    if None not in given:
        return np.array(given, float)
    if any(value is not None for value in given):
        raise document.error("some steps have a freq_hz and some have none", place=steps[given.index(None)].place)
    if frequency_table(document.path).is_file():
        return None  # a table beside the file says it better than times do
    return step_frequencies(_times(document, steps))


def _times(document: Document, steps: list[_Step]) -> Array | None:
    """The time of each step, given with it or in a list with the collection; None when some are missing."""
    own = [step.grid.find("Time") for step in steps]
    values = [None if time is None else time.get("Value") for time in own]
    if None not in values:
        return np.array([_number(document, value, step) for value, step in zip(values, steps, strict=True)])
    series = next(grid for grid in document.root.iter("Grid") if steps[0].grid in list(grid))
    listed = series.find("Time")
    if listed is None or listed.get("TimeType", "").lower() != "list":
        return None
    times = document.item(listed, "Time").read().reshape(-1).astype(np.float64)
    if len(times) != len(steps):
        raise document.error(
            "the list of times does not fit the steps",
            place="Time",
            found=f"{len(times)} times",
            expected=f"{len(steps)}, one a step",
        )
    return times


def _own_frequency(document: Document, step: _Step) -> float | None:
    for information in step.grid.iterfind("Information"):
        if information.get("Name") == "freq_hz":
            return _number(document, information.get("Value"), step)
    for name, center, item in attributes(document, step.grid):
        if name == "freq_hz" and center == "grid" and item.size == 1:
            return float(item.read().reshape(-1)[0])
    return None


def _number(document: Document, text: str | None, step: _Step) -> float:
    try:
        return float((text or "").strip())
    except ValueError:
        raise document.error("a frequency or time is no number", place=step.place, found=repr(text)[:60]) from None
