"""The layout that ``.npz`` and ``.h5`` files share: named arrays.

==================  =====================  ===========================================================
points              (n, 3) float           coordinates
node_id             (n,) integer           optional; 1 to n when absent
cells_hex8 …        (k, 8) integer         node rows from 0, one array a kind (``cells_hex8_2`` for a second
                                           block of the kind), VTK node order
elem_id_hex8 …      (k,) integer           optional, named as its cells
node_group_NAME     (n,) integer           members not zero
cell_group_NAME     (all cells,) integer   members not zero; cells in the order of the ``cells_`` arrays
modes               (m, n, 3) float or complex
rotations           (m, n, 3)              optional
freq_hz             (m,) float             Hz
damping             (m,) float             optional, 1 = critical
mass_normalised     (m,) integer           optional, 1 when the shapes have unit modal mass
strain_energy       (m, all cells) float   optional, as the solver gave it; cells as for groups
==================  =====================  ===========================================================
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator, Mapping
from pathlib import Path
from typing import Protocol

import numpy as np

from viewer.errors import LoadError
from viewer.loaders.array_names import group_array, group_name, mask
from viewer.loaders.file_shapes import FileShapes, Stretch, stamp_of
from viewer.loaders.raw_data import RawBlock, RawMesh, RawModes
from viewer.model.arrays import Array
from viewer.model.mesh import Mesh
from viewer.model.modes import ArrayShapes, ModeSet

_CELLS = re.compile(r"cells_([a-z]+\d+)(_\d+)?")


class StoredArray(Protocol):
    """One array in a file: shape and dtype known, values not yet read."""

    shape: tuple[int, ...]
    dtype: np.dtype

    def read(self) -> Array:
        """The values; sizes have been checked."""

    def offset(self) -> int | None:
        """Where plain C-ordered bytes start in the file; None when they are packed or scattered."""


def mesh_of(arrays: Mapping[str, StoredArray], path: Path) -> RawMesh:
    """The mesh that the arrays describe. Raises ``LoadError``."""
    points = _need(arrays, "points", path)
    if len(points.shape) != 2 or points.shape[1] != 3:
        raise LoadError(
            "points have a wrong shape", file=path, place="points", found=str(points.shape), expected="(n, 3)"
        )
    n, blocks = points.shape[0], []
    for name in arrays:
        match = _CELLS.fullmatch(name)
        if match:
            ids = arrays.get("elem_id" + name.removeprefix("cells"))
            blocks.append(RawBlock(match[1], arrays[name].read(), None if ids is None else ids.read()))
    cells = sum(len(block.nodes) for block in blocks)
    node_id = arrays.get("node_id")
    return RawMesh(
        points.read(),
        blocks,
        None if node_id is None else node_id.read(),
        dict(_groups(arrays, "node_", n, path)),
        dict(_groups(arrays, "cell_", cells, path)),
    )


def modes_of(arrays: Mapping[str, StoredArray], path: Path) -> RawModes:
    """The mode shapes that the arrays describe, left in the file where possible. Raises ``LoadError``."""
    moved, turned = _need(arrays, "modes", path), arrays.get("rotations")
    if len(moved.shape) != 3 or moved.shape[2] != 3 or moved.dtype.kind not in "fc":
        raise LoadError(
            "mode shapes have a wrong shape",
            file=path,
            place="modes",
            found=f"{moved.shape} of {moved.dtype}",
            expected="(modes, nodes, 3) of float or complex",
        )
    if turned is not None and turned.shape != moved.shape:
        raise LoadError(
            "rotations do not fit the modes",
            file=path,
            place="rotations",
            found=str(turned.shape),
            expected=str(moved.shape),
        )
    stretches, turned_stretches = _stretches(moved), None if turned is None else _stretches(turned)
    shapes: FileShapes | ArrayShapes
    if stretches and (turned is None or turned_stretches):
        shapes = FileShapes(str(path.resolve()), stamp_of(path), moved.shape[1], stretches, turned_stretches)
    else:
        shapes = ArrayShapes(moved.read(), None if turned is None else turned.read())
    field = {
        name: arrays[name].read() for name in ("freq_hz", "damping", "node_id", "mass_normalised") if name in arrays
    }
    normalised = field.get("mass_normalised")
    return RawModes(
        shapes,
        field.get("freq_hz"),
        field.get("damping"),
        field.get("node_id"),
        normalised is not None and normalised.size > 0 and bool(np.all(normalised)),
        cell_energy=_energies(arrays),
    )


def _energies(arrays: Mapping[str, StoredArray]) -> tuple[Array | None, Array] | None:
    """Element ids (None: as the cells come) and strain energies (modes, cells) that the file gives."""
    if "strain_energy" not in arrays:
        return None
    energy = arrays["strain_energy"].read()
    ids = [arrays.get("elem_id" + name.removeprefix("cells")) for name in arrays if _CELLS.fullmatch(name)]
    known = [part.read() for part in ids if part is not None]
    return (np.concatenate(known) if known and len(known) == len(ids) else None), energy


def arrays_to_write(mesh: Mesh, modes: ModeSet | None) -> Iterator[tuple[str, tuple[int, ...], np.dtype, Callable]]:
    """(name, shape, dtype, parts) of every array; ``parts()`` iterates over it along the first axis in pieces."""

    def whole(name: str, values: Array):
        return name, values.shape, values.dtype, lambda: iter((values,))

    yield whole("points", mesh.points)
    yield whole("node_id", mesh.node_ids)
    seen: dict[str, int] = {}
    for block in mesh.blocks:
        seen[block.kind] = seen.get(block.kind, 0) + 1
        tail = block.kind + ("" if seen[block.kind] == 1 else f"_{seen[block.kind]}")
        yield whole(f"cells_{tail}", block.nodes)
        yield whole(f"elem_id_{tail}", block.ids)
    for prefix, groups, count in (
        ("node_", mesh.node_groups, mesh.n_nodes),
        ("cell_", mesh.cell_groups, mesh.n_cells),
    ):
        for name, rows in groups.items():
            yield whole(prefix + group_array(name), mask(rows, count))
    if modes is None:
        return
    yield whole("freq_hz", modes.freq_hz)
    if modes.damping is not None:
        yield whole("damping", modes.damping)
    yield whole("mass_normalised", np.full(modes.count, modes.normalisation == "mass", np.uint8))
    if modes.cell_energy is not None:
        yield whole("strain_energy", modes.cell_energy)
    shape, dtype = (modes.count, mesh.n_nodes, 3), np.dtype(np.complex128 if modes.is_complex else np.float64)
    yield "modes", shape, dtype, lambda: (modes.shape(i)[None] for i in range(modes.count))
    if modes.shapes.has_rotations:
        yield "rotations", shape, dtype, lambda: (modes.rotations(i)[None] for i in range(modes.count))  # type: ignore[index]


def _need(arrays: Mapping[str, StoredArray], name: str, path: Path) -> StoredArray:
    if name not in arrays:
        raise LoadError(f"array '{name}' is missing", file=path, found=", ".join(list(arrays)[:12]) or "no arrays")
    return arrays[name]


def _groups(arrays: Mapping[str, StoredArray], prefix: str, count: int, path: Path) -> Iterator[tuple[str, Array]]:
    for name, array in arrays.items():
        group = group_name(name.removeprefix(prefix)) if name.startswith(prefix) else ""
        if group:
            if array.shape != (count,):
                raise LoadError(
                    "a group's mask has a wrong length",
                    file=path,
                    place=name,
                    found=str(array.shape),
                    expected=f"({count},)",
                )
            yield group, np.nonzero(array.read())[0]


def _stretches(array: StoredArray) -> tuple[tuple[Stretch], ...] | None:
    start = array.offset()
    if start is None or not array.shape[0]:
        return None
    step = array.shape[1] * 3 * array.dtype.itemsize
    return tuple((Stretch(start + i * step, array.dtype.str),) for i in range(array.shape[0]))
