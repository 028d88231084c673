"""What every format hands over, and the one place where it is checked and becomes a ``Mesh`` or a ``ModeSet``.

Formats only fetch arrays. Index ranges, finite numbers, ids, orientation, units and joining by node id are
decided here, alike for all of them.
"""

from __future__ import annotations

import os
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np

from viewer.cells import KINDS, repair_orientation
from viewer.errors import LoadError
from viewer.loaders.file_shapes import FileShapes
from viewer.model.arrays import Array
from viewer.model.mesh import CellBlock, Mesh
from viewer.model.modes import ArrayShapes, ModeSet

# A body longer or shorter than this is flagged: most often a unit of length was mixed up. Common practice, no source.
_PLAUSIBLE_DIAGONAL = (1e-3, 50.0)
# Finite, but its powers would not be.
_LARGEST_COORDINATE = 1e50
# Shapes up to this size are read at once, so that errors show early and the file may be replaced afterwards.
_READ_AT_ONCE = 32_000_000


@dataclass
class RawBlock:
    """Cells of one kind: ``nodes`` (n, nodes per cell) rows of the points from 0, VTK order; ``ids`` or None."""

    kind: str
    nodes: Array
    ids: Array | None = None


@dataclass
class RawMesh:
    """A mesh as a format found it: points in the file's unit, groups as rows, nothing checked.

    ``length_unit``: metres to the file's unit of length if the file itself states it.
    """

    points: Array
    blocks: list[RawBlock]
    node_ids: Array | None = None
    node_groups: dict[str, Array] = field(default_factory=dict)
    cell_groups: dict[str, Array] = field(default_factory=dict)
    notes: list[str] = field(default_factory=list)
    warnings: list[str] = field(default_factory=list)
    length_unit: float | None = None


@dataclass
class RawModes:
    """Mode shapes as a format found them; rows as in the file, ``node_ids`` None when the file has none.

    ``length_unit`` as in ``RawMesh``; ``cell_energy``: element ids (k,) (None: the cells in the order of the mesh)
    and strain energies (modes, k) that the file gives.
    """

    shapes: ArrayShapes | FileShapes
    freq_hz: Array | None
    damping: Array | None = None
    node_ids: Array | None = None
    mass_normalised: bool = False
    length_unit: float | None = None
    cell_energy: tuple[Array | None, Array] | None = None


@dataclass(frozen=True)
class ReadReport:
    """What was noticed on reading, in words. ``warnings`` ask for a look; ``notes`` only inform."""

    notes: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()


def finish_mesh(raw: RawMesh, path: str | os.PathLike[str], length_unit: float) -> tuple[Mesh, ReadReport]:
    """Check, orient and scale. Raises ``LoadError``."""
    points = _numbers(raw.points, "points", path)
    if points.ndim != 2 or points.shape[1] != 3 or len(points) == 0:
        raise LoadError(
            "has no usable points", file=path, found=f"an array of shape {points.shape}", expected="n rows of x, y, z"
        )
    finite = np.isfinite(points).all(axis=1)
    if not finite.all():
        row = int(np.argmin(finite))
        raise LoadError("a coordinate is not finite", file=path, place=f"point {row + 1}", found=str(points[row]))
    if np.abs(points).max() > _LARGEST_COORDINATE:
        row = int(np.argmax(np.abs(points).max(axis=1)))
        raise LoadError("a coordinate is beyond reason", file=path, place=f"point {row + 1}", found=str(points[row]))
    notes, warnings = list(raw.notes), list(raw.warnings)
    length_unit = _unit(raw.length_unit, length_unit, path, notes)
    blocks, flipped = _checked_blocks(raw.blocks, points, path)
    node_ids = _ids(raw.node_ids, len(points), "node", path, notes)
    if flipped:
        notes.append(f"{flipped} cells were turned inside out and have been put right")
    mesh = Mesh(
        points * length_unit,
        _numbered(blocks, path, notes),
        node_ids,
        {name: _group(rows, len(points), f"node group '{name}'", path) for name, rows in raw.node_groups.items()},
        {
            name: _group(rows, sum(len(b.nodes) for b in blocks), f"cell group '{name}'", path)
            for name, rows in raw.cell_groups.items()
        },
        source=str(path),
    )
    unused = mesh.n_nodes - len(mesh.used_nodes)
    if unused:
        notes.append(f"{unused} of {mesh.n_nodes} nodes belong to no cell")
    astray = _astray_mid_nodes(mesh)
    if astray:
        warnings.append(
            f"{astray} mid-side nodes lie far from the middle of their edge: the order of nodes in the file is "
            "probably another one than its format says"
        )
    low, high = _PLAUSIBLE_DIAGONAL
    if not low <= mesh.diagonal <= high:
        warnings.append(
            f"the body measures {mesh.diagonal:.3g} m from corner to corner, which is implausible: "
            f"check the unit of length (1 unit of the file was taken as {length_unit:g} m)"
        )
    return mesh, ReadReport(tuple(notes), tuple(warnings))


def finish_modes(raw: RawModes, mesh: Mesh, path: str | os.PathLike[str], length_unit: float) -> ModeSet:
    """Check, join to the mesh by node id and scale. Raises ``LoadError``."""
    shapes = raw.shapes
    if shapes.count == 0:
        raise LoadError("holds no mode", file=path)
    length_unit = _unit(raw.length_unit, length_unit, path, [])
    freq = _per_mode(raw.freq_hz, "freq_hz", shapes.count, path)
    if (freq < 0).any():
        raise LoadError(
            "a frequency is negative",
            file=path,
            place=f"freq_hz {int(np.argmax(freq < 0)) + 1}",
            found=str(freq[freq < 0][0]),
            expected="zero or more, Hz",
        )
    damping = None if raw.damping is None else _per_mode(raw.damping, "damping", shapes.count, path)
    n_rows = shapes.n_rows if isinstance(shapes, FileShapes) else shapes.moved.shape[1]
    if n_rows == 0:
        raise LoadError("the mode shapes have no nodes", file=path)
    ids = _ids(raw.node_ids, n_rows, "node", path, [])
    rows = _join(ids, mesh, path, numbered=raw.node_ids is None)
    if isinstance(shapes, FileShapes):
        shapes = shapes.arranged(rows, length_unit)
        if shapes.nbytes <= _READ_AT_ONCE:
            shapes = shapes.loaded()
    else:
        shapes = _arranged(shapes, rows, length_unit, path)
    known = raw.mass_normalised and length_unit == 1.0
    energy = None if raw.cell_energy is None else _cell_energy(*raw.cell_energy, shapes.count, mesh, path)
    normalisation = "mass" if known else "unknown"
    return ModeSet(mesh.node_ids, freq, shapes, damping, normalisation, "imported", str(path), energy)


def kinds_by_vtk() -> Mapping[int, str]:
    """Kind name by VTK cell type."""
    return {kind.vtk_type: name for name, kind in KINDS.items()}


def finite_shapes(values: Array, what: str, path: object) -> Array:
    """``values`` (modes, nodes, 3) if every number is finite, else ``LoadError`` naming mode and row."""
    finite = np.isfinite(values)
    if not finite.all():
        mode, row = np.argwhere(~finite.all(axis=2))[0]
        raise LoadError(
            "holds a number that is not finite",
            file=path,
            place=f"{what}, mode {mode + 1}, row {row + 1}",
            found=str(values[mode, row]),
        )
    return values


# --- checks ---


def _unit(stated: float | None, given: float, path: object, notes: list[str]) -> float:
    """Metres to the unit of length: what the file states; asking for another one is an error (1 asks for none)."""
    if stated is None or abs(stated / given - 1) < 1e-4:
        return given
    if given != 1.0:
        raise LoadError(
            "the unit of length is stated twice and differs",
            file=path,
            found=f"{stated:g} m in the file, {given:g} m beside it",
            do="leave the unit out where the file is named, or mend the units in the file",
        )
    notes.append(f"the file states its unit of length: {stated:g} m")
    return stated


def _cell_energy(ids: Array | None, values: Array, count: int, mesh: Mesh, path: object) -> Array | None:
    """(modes, n_cells) by cell row, NaN where none is given; None when no cell of the mesh has any."""
    ids = mesh.cell_ids if ids is None else _ids(ids, values.shape[1], "element", path, [])
    if values.shape != (count, len(ids)):
        raise LoadError(
            "the strain energies do not fit the modes and cells",
            file=path,
            found=str(values.shape),
            expected=f"({count}, {len(ids)})",
        )
    order = np.argsort(ids, kind="stable")
    rows = order[np.minimum(np.searchsorted(ids, mesh.cell_ids, sorter=order), len(ids) - 1)]
    there = ids[rows] == mesh.cell_ids
    values = np.where(there, _numbers(values, "strain energies", path)[:, rows], np.nan)
    if np.isinf(values).any() or (values < 0).any():
        mode, cell = np.argwhere(np.isinf(values) | (values < 0))[0]
        raise LoadError(
            "a strain energy is negative or not finite",
            file=path,
            place=f"mode {mode + 1}, element {mesh.cell_ids[cell]}",
            found=str(values[mode, cell]),
        )
    return values if np.isfinite(values).any() else None


def _numbers(values: Array, what: str, path: object) -> Array:
    if values.dtype.kind not in "fiu":
        raise LoadError(f"{what} are not real numbers", file=path, found=str(values.dtype))
    return values.astype(np.float64)


def _checked_blocks(blocks: Sequence[RawBlock], points: Array, path: object) -> tuple[list[RawBlock], int]:
    checked, flipped = [], 0
    for number, block in enumerate(blocks, 1):
        place = f"cells {number} ({block.kind})"
        if block.kind not in KINDS:
            raise LoadError(
                f"unknown kind of cell '{block.kind}'", file=path, place=place, expected=f"one of: {', '.join(KINDS)}"
            )
        size = KINDS[block.kind].n_nodes
        nodes = block.nodes
        if nodes.dtype.kind not in "iu":
            raise LoadError("connectivity is not of whole numbers", file=path, place=place, found=str(nodes.dtype))
        if nodes.ndim != 2 or nodes.shape[1] != size:
            raise LoadError(
                "wrong number of nodes per cell",
                file=path,
                place=place,
                found=str(nodes.shape),
                expected=f"(cells, {size})",
            )
        if nodes.size and (int(nodes.min()) < 0 or int(nodes.max()) >= len(points)):
            bad = (nodes < 0) | (nodes >= len(points))
            cell, corner = np.argwhere(bad)[0]
            raise LoadError(
                "a cell names a point that does not exist",
                file=path,
                place=f"{place}, cell {cell + 1}",
                found=f"index {nodes[cell, corner]}",
                expected=f"0 to {len(points) - 1}",
            )
        if not len(nodes):
            continue
        right, n_flipped = repair_orientation(block.kind, points, nodes.astype(np.int64))
        flipped += n_flipped
        checked.append(RawBlock(block.kind, right, block.ids))
    if not checked:
        raise LoadError("holds no cell of a known kind", file=path, expected=f"any of: {', '.join(KINDS)}")
    return checked, flipped


def _numbered(blocks: list[RawBlock], path: object, notes: list[str]) -> tuple[CellBlock, ...]:
    given = None
    total = sum(len(block.nodes) for block in blocks)
    known = [block.ids for block in blocks if block.ids is not None]
    if len(known) == len(blocks):
        for block, ids in zip(blocks, known, strict=True):
            if ids.shape != (len(block.nodes),):
                raise LoadError(
                    f"wrong number of element ids for {block.kind}",
                    file=path,
                    found=str(ids.shape),
                    expected=f"({len(block.nodes)},)",
                )
        given = np.concatenate(known)
    ids = _ids(given, total, "element", path, notes)
    cuts = np.cumsum([len(block.nodes) for block in blocks])[:-1]
    return tuple(CellBlock(b.kind, b.nodes, i) for b, i in zip(blocks, np.split(ids, cuts), strict=True))


def _astray_mid_nodes(mesh: Mesh) -> int:
    """Number of mid-side nodes further from the middle of their edge than half its length."""
    count = 0
    for block in mesh.blocks:
        for edge in KINDS[block.kind].edges:
            if len(edge) == 3:
                first, second, middle = (mesh.points[block.nodes[:, node]] for node in edge)
                away = np.linalg.norm(middle - (first + second) / 2, axis=1)
                count += int((away > 0.5 * np.linalg.norm(second - first, axis=1)).sum())
    return count


def _ids(given: Array | None, count: int, word: str, path: object, notes: list[str]) -> Array:
    if given is None:
        notes.append(f"the file has no {word} ids: numbered 1 to {count} in the order of the file")
        return np.arange(1, count + 1)
    if given.shape != (count,):
        raise LoadError(f"wrong number of {word} ids", file=path, found=str(given.shape), expected=f"({count},)")
    if given.dtype.kind == "f" and np.isfinite(given).all() and (given == np.round(given)).all():
        given = given.astype(np.int64)
    if given.dtype.kind not in "iu" or (given.dtype == np.uint64 and count and given.max() > 2**63 - 1):
        raise LoadError(f"{word} ids are not whole numbers", file=path, found=str(given.dtype), expected="integers")
    ids = given.astype(np.int64)
    order = np.sort(ids)
    twice = np.nonzero(order[1:] == order[:-1])[0]
    if len(twice):
        raise LoadError(
            f"{word} ids repeat", file=path, found=f"{word} {order[twice[0]]} more than once", expected="each id once"
        )
    return ids


def _group(rows: Array, count: int, what: str, path: object) -> Array:
    rows = np.sort(rows).astype(np.int64)
    if len(rows) and (rows[0] < 0 or rows[-1] >= count):
        raise LoadError(
            f"{what} reaches outside",
            file=path,
            found=f"row {rows[-1] if rows[-1] >= count else rows[0]}",
            expected=f"0 to {count - 1}",
        )
    return rows


def _per_mode(values: Array | None, name: str, count: int, path: object) -> Array:
    if values is None:
        raise LoadError(
            "the frequencies of the modes are missing",
            file=path,
            expected=f"an array {name} with one value a mode",
            do=f"add the array, or put a table {os.path.splitext(os.path.basename(str(path)))[0]}_frequencies.csv "
            "with the columns mode, freq_hz beside the file",
        )
    values = _numbers(values, name, path).reshape(-1)
    if len(values) != count:
        raise LoadError(
            f"{name} does not fit the modes",
            file=path,
            found=f"{len(values)} values",
            expected=f"{count}, one a mode",
        )
    if not np.isfinite(values).all():
        raise LoadError(
            f"{name} holds a number that is not finite",
            file=path,
            place=f"mode {int(np.argmin(np.isfinite(values))) + 1}",
        )
    return values


def _join(ids: Array, mesh: Mesh, path: object, numbered: bool) -> Array | None:
    """Row in the file of each mesh node; None when they come in the order of the mesh."""
    if np.array_equal(ids, mesh.node_ids):
        return None
    order = np.argsort(ids, kind="stable")
    at = np.searchsorted(ids, mesh.node_ids, sorter=order)
    rows = order[np.minimum(at, len(ids) - 1)]
    missing = mesh.node_ids[ids[rows] != mesh.node_ids]
    # ids are unique, so that equal numbers without a missing one leave no extra one; the search is slow
    same = len(ids) == mesh.n_nodes and not len(missing)
    extra = ids[:0] if same else np.setdiff1d(ids, mesh.node_ids)
    if len(missing) or len(extra):
        told = [
            f"{len(some)} nodes only in the {where} ({_few(some)})"
            for some, where in ((missing, "mesh"), (extra, "mode file"))
            if len(some)
        ]
        why = "; the mode file has no node ids, so they were taken as 1 to n" if numbered else ""
        raise LoadError(
            "the mode shapes are not those of this mesh",
            file=path,
            found=", ".join(told) + why,
            expected=f"the {mesh.n_nodes} node ids of {mesh.source or 'the mesh'}",
        )
    return rows


def _few(ids: Array) -> str:
    return ", ".join(str(i) for i in ids[:4]) + (", …" if len(ids) > 4 else "")


def _arranged(shapes: ArrayShapes, rows: Array | None, scale: float, path: object) -> ArrayShapes:
    finite_shapes(shapes.moved, "shapes", path)
    if shapes.turned is not None:
        finite_shapes(shapes.turned, "rotations", path)
    if rows is None and scale == 1.0:
        return shapes
    pick = slice(None) if rows is None else rows
    turned = None if shapes.turned is None else shapes.turned[:, pick]
    return ArrayShapes(shapes.moved[:, pick] * scale, turned)
