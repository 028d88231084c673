"""``.vtu``, the default interchange: one mesh with its mode shapes.

Point arrays ``mode_001`` … hold translations (``mode_001_re`` and ``mode_001_im`` when complex),
``mode_001_rot`` … rotations; field arrays ``freq_hz``, ``damping`` and ``mass_normalised`` (1 when the shapes
have unit modal mass) have one value a mode; ``node_id`` and ``elem_id`` are integers; an integer array
``group_NAME`` on points or cells is a group, its members not zero. Cell arrays ``strain_energy_001`` … hold strain
energies of each mode, if the solver that made it gave them. Lengths are metres in files written here.

Read without VTK, so that sizes are checked before memory is taken and a shape can stay in the file.
"""

from __future__ import annotations

import os
from pathlib import Path

import numpy as np

from viewer.cells import KINDS
from viewer.jobs import SILENT, Progress, atomic_path
from viewer.loaders.array_names import energy_array, group_array, mask, mode_array
from viewer.loaders.raw_data import RawMesh, RawModes
from viewer.loaders.vtk_arrays import mesh_of, modes_of
from viewer.loaders.vtu_xml import VtuFile
from viewer.model.mesh import Mesh
from viewer.model.modes import ModeSet

SUFFIXES = (".vtu",)


def read_mesh(path: Path, progress: Progress = SILENT) -> RawMesh:
    """The mesh in the file. Raises ``LoadError``, or ``OtherReaderNeeded`` for what VTK must read."""
    with VtuFile(path) as file:
        return mesh_of(file, progress)


def read_modes(path: Path, progress: Progress = SILENT) -> RawModes:
    """The mode shapes in the file, left there when they are plain bytes. Raises as :func:`read_mesh`."""
    with VtuFile(path) as file:
        return modes_of(file, progress)


def write(path: str | os.PathLike[str], mesh: Mesh, modes: ModeSet | None, progress: Progress = SILENT) -> None:
    """Appended raw, not compressed, 64-bit header; one mode in memory at a time. Atomic."""
    arrays = list(arrays_to_write(mesh, modes))
    with atomic_path(path) as part, part.open("wb") as stream:
        stream.write(_head(mesh, arrays).encode("ascii"))
        for number, (_, name, dtype, shape, make) in enumerate(arrays):
            progress.tick(f"writing {Path(path).name}", number, len(arrays))
            values = np.ascontiguousarray(make(), dtype)
            assert values.shape == shape, name
            stream.write(np.array([values.nbytes], "<u8").tobytes())
            stream.write(values.reshape(-1).view(np.uint8).data)
        stream.write(b"\n  </AppendedData>\n</VTKFile>\n")


def arrays_to_write(mesh: Mesh, modes: ModeSet | None):
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
    if modes is not None and modes.cell_energy is not None:
        for i, energy in enumerate(modes.cell_energy):
            yield "CellData", energy_array(i), "<f8", (cells,), lambda energy=energy: energy
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
            yield (
                "PointData",
                mode_array(index, turned, part),
                "<f8",
                (n, 3),
                lambda shape=shape, part=part: np.imag(shape(index)) if part == "_im" else np.real(shape(index)),
            )


def _head(mesh: Mesh, arrays: list) -> str:
    lines = [
        '<?xml version="1.0"?>',
        '<VTKFile type="UnstructuredGrid" version="1.0" byte_order="LittleEndian" header_type="UInt64">',
        "  <UnstructuredGrid>",
    ]
    offset = 0
    by_section: dict[str, list[str]] = {}
    for section, name, dtype, shape, _ in arrays:
        kind = {"<f8": "Float64", "<i8": "Int64", "<u1": "UInt8"}[dtype]
        parts = f' NumberOfComponents="{shape[1]}"' if len(shape) > 1 else ""
        tuples = f' NumberOfTuples="{shape[0]}"' if section == "FieldData" else ""
        by_section.setdefault(section, []).append(
            f'<DataArray type="{kind}" Name="{name}"{parts}{tuples} format="appended" offset="{offset}"/>'
        )
        offset += 8 + int(np.prod(shape)) * np.dtype(dtype).itemsize

    def element(name: str, indent: str) -> list[str]:
        inner = [f"{indent}  {line}" for line in by_section.get(name, [])]
        return [f"{indent}<{name}>", *inner, f"{indent}</{name}>"]

    lines += element("FieldData", "    ")
    lines.append(f'    <Piece NumberOfPoints="{mesh.n_nodes}" NumberOfCells="{mesh.n_cells}">')
    for name in ("PointData", "CellData", "Points", "Cells"):
        lines += element(name, "      ")
    lines += ["    </Piece>", "  </UnstructuredGrid>", '  <AppendedData encoding="raw">', "   _"]
    return "\n".join(lines)
