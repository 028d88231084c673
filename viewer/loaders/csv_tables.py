"""``.csv`` tables, written by hand or by a spreadsheet.

Up to four files share the front part of their names:

``NAME_nodes.csv``        node, x, y, z and perhaps group_…
``NAME_elements.csv``     element, kind, n1, n2, … (node ids, VTK order) and perhaps group_…
``NAME.csv``              mode, node, ux, uy, uz and perhaps rx, ry, rz; ux_re, ux_im … when complex; perhaps freq_hz
``NAME_frequencies.csv``  mode, freq_hz and perhaps damping, mass_normalised

The first line names the columns, in any order. Fields are parted by comma, semicolon, tab or bar; numbers have a
point, or a comma where the comma does not part fields. Which of these holds is found from the file as a whole.
"""

from __future__ import annotations

import csv
import os
import re
from collections.abc import Sequence
from contextlib import ExitStack
from pathlib import Path

import numpy as np

from viewer.cells import KINDS
from viewer.errors import LoadError
from viewer.jobs import SILENT, Progress, atomic_path
from viewer.loaders.array_names import group_array, mask
from viewer.loaders.raw_data import RawBlock, RawMesh, RawModes
from viewer.loaders.text_table import Table
from viewer.model.arrays import Array
from viewer.model.mesh import Mesh
from viewer.model.modes import ArrayShapes, ModeSet

SUFFIXES = (".csv",)
_TABLES = ("_nodes", "_elements", "_frequencies")
_AXES = ("ux", "uy", "uz", "rx", "ry", "rz")


def _stem(path: Path) -> str:
    for tail in _TABLES:
        if path.stem.endswith(tail):
            return path.stem.removesuffix(tail)
    return path.stem


def _table_path(path: Path, tail: str) -> Path:
    return path.with_name(f"{_stem(path)}{tail}.csv")


def frequency_table(path: Path) -> Path:
    """The table of frequencies that belongs to a mode file of any format."""
    return path.with_name(f"{path.stem}_frequencies.csv")


def has_tables(path: Path) -> bool:
    """Whether tables of a mesh exist under this name."""
    return _table_path(path, "_nodes").is_file()


def read_mesh(path: Path, progress: Progress = SILENT) -> RawMesh:
    """The mesh of ``NAME_nodes.csv`` and ``NAME_elements.csv``. Raises ``LoadError``."""
    nodes = Table(_table_path(path, "_nodes"))
    nodes.need("node", "x", "y", "z")
    if not len(nodes):
        raise nodes.error("holds no node")
    progress.tick("reading elements")
    elements = Table(_table_path(path, "_elements"))
    elements.need("element", "kind", "n1")
    node_ids = nodes.integers("node")
    raw = RawMesh(np.column_stack([nodes.numbers(axis) for axis in "xyz"]), _blocks(elements, node_ids), node_ids)
    raw.node_groups, raw.cell_groups = nodes.groups(), elements.groups()
    return raw


def _blocks(table: Table, node_ids: Array) -> list[RawBlock]:
    kinds, ids = np.array([kind.lower() for kind in table.columns["kind"]]), table.integers("element")
    order = np.argsort(node_ids, kind="stable")
    cuts = np.nonzero(kinds[1:] != kinds[:-1])[0] + 1
    blocks = []
    for run in np.split(np.arange(len(kinds)), cuts) if len(kinds) else []:
        kind, first = str(kinds[run[0]]), table.line_numbers[run[0]]
        if kind not in KINDS:
            raise table.error(f"unknown kind of cell '{kind}'", first, expected=f"one of: {', '.join(KINDS)}")
        names = [f"n{i + 1}" for i in range(KINDS[kind].n_nodes)]
        table.need(*names)
        part = table.part(run)
        for name in (n for n in table.columns if re.fullmatch(r"n\d+", n) and n not in names):
            full = next((i for i, text in enumerate(part.columns[name]) if text), None)
            if full is not None:
                raise table.error(
                    f"a {kind} has {len(names)} nodes", part.line_numbers[full], found=f"a node in {name}"
                )
        wanted = np.column_stack([part.integers(name) for name in names])
        at = np.minimum(np.searchsorted(node_ids, wanted, sorter=order), len(node_ids) - 1)
        rows = order[at]
        wrong = (node_ids[rows] != wanted).any(axis=1)
        if wrong.any():
            row = int(np.argmax(wrong))
            unknown = wanted[row][node_ids[rows[row]] != wanted[row]][0]
            raise table.error(
                "an element names a node that does not exist",
                part.line_numbers[row],
                found=f"node {unknown}",
                expected="a node of the table of nodes",
            )
        blocks.append(RawBlock(kind, rows, ids[run]))
    return blocks


def read_modes(path: Path, progress: Progress = SILENT) -> RawModes:
    """The shapes of ``NAME.csv``, every mode on the same nodes. Raises ``LoadError``."""
    if not path.is_file():
        raise LoadError("there is no such table", file=path, expected="columns mode, node, ux, uy, uz")
    table = Table(path)
    is_complex = "ux_re" in table.columns
    parts = ("_re", "_im") if is_complex else ("",)
    table.need("mode", "node", *(axis + part for axis in _AXES[:3] for part in parts))
    mode, node = table.integers("mode"), table.integers("node")
    if not len(table):
        raise table.error("holds no mode")
    count = table.count_of_modes(mode)
    order = np.argsort(mode, kind="stable")
    per_mode = len(table) // count
    ids = node[order].reshape(count, per_mode) if per_mode * count == len(table) else None
    if ids is None or (np.bincount(mode - 1, minlength=count) != per_mode).any():
        sizes = np.bincount(mode - 1, minlength=count)
        odd = int(np.argmax(sizes != sizes[0]))
        raise table.error(
            "the modes have different numbers of nodes",
            found=f"{sizes[0]} in mode 1, {sizes[odd]} in mode {odd + 1}",
            expected="every node in every mode",
        )
    by_id = np.argsort(ids, axis=1, kind="stable")
    back = by_id[0].argsort()  # all modes come in the order of the first one
    same = np.take_along_axis(ids, by_id, 1) == ids[0][by_id[0]]
    if not same.all():
        odd = int(np.argmin(same.all(axis=1)))
        raise table.error("the modes are not on the same nodes", found=f"mode {odd + 1} differs from mode 1")
    pick = order.reshape(count, per_mode)[np.arange(count)[:, None], by_id[:, back]]

    def shapes(axes: Sequence[str]) -> Array:
        real, *imaginary = ([table.numbers(axis + part)[pick] for axis in axes] for part in parts)
        values = np.stack(real, axis=-1)
        return values + 1j * np.stack(imaginary[0], axis=-1) if imaginary else values

    turned = any(axis + parts[0] in table.columns for axis in _AXES[3:])
    if turned:
        table.need(*(axis + part for axis in _AXES[3:] for part in parts))
    raw = RawModes(ArrayShapes(shapes(_AXES[:3]), shapes(_AXES[3:]) if turned else None), None, None, ids[0])
    if "freq_hz" in table.columns:
        freq = table.numbers("freq_hz")[pick]
        if (freq != freq[:, :1]).any():
            raise table.error(
                "a mode has more than one frequency", found=f"mode {int(np.argmax((freq != freq[:, :1]).any(1))) + 1}"
            )
        raw.freq_hz = freq[:, 0]
    frequencies = frequency_table(path)
    if frequencies.is_file():
        freq, raw.damping = read_frequencies(frequencies, count)
        raw.freq_hz = freq if raw.freq_hz is None else raw.freq_hz
        raw.mass_normalised = _mass_normalised(frequencies)
    return raw


def read_frequencies(path: Path, count: int) -> tuple[Array, Array | None]:
    """Frequencies in Hz and damping ratios (or None) of modes 1 to ``count``. Raises ``LoadError``."""
    table = Table(path)
    table.need("mode", "freq_hz")
    mode = table.integers("mode")
    if table.count_of_modes(mode) != count or len(mode) != count:
        raise table.error(
            "the frequencies do not fit the modes", found=f"{len(mode)} lines", expected=f"{count} modes"
        )
    order = np.argsort(mode)
    damping = table.numbers("damping")[order] if "damping" in table.columns else None
    return table.numbers("freq_hz")[order], damping


def _mass_normalised(path: Path) -> bool:
    table = Table(path)
    return "mass_normalised" in table.columns and bool(table.numbers("mass_normalised").all())


def write(path: str | os.PathLike[str], mesh: Mesh, modes: ModeSet | None, progress: Progress = SILENT) -> None:
    """The two tables of the mesh and, with modes, the two of the modes; comma and decimal point. All or none."""
    path = Path(path)
    with ExitStack() as stack:

        def rows_of(target: Path, header: Sequence[str]):
            stream = stack.enter_context(
                stack.enter_context(atomic_path(target)).open("w", encoding="ascii", newline="")
            )
            writer = csv.writer(stream, lineterminator="\n")
            writer.writerow(header)
            return writer

        _write_mesh(rows_of, path, mesh)
        if modes is not None:
            _write_modes(rows_of, path, modes, progress)


def _write_mesh(rows_of, path: Path, mesh: Mesh) -> None:
    n, cells = mesh.n_nodes, mesh.n_cells
    masks = [mask(rows, n) for rows in mesh.node_groups.values()]
    writer = rows_of(
        path.with_name(f"{path.stem}_nodes.csv"), ["node", "x", "y", "z", *map(group_array, mesh.node_groups)]
    )
    for i, (number, point) in enumerate(zip(mesh.node_ids.tolist(), mesh.points.tolist(), strict=True)):
        writer.writerow([number, *point, *(m[i] for m in masks)])
    widest = max((block.nodes.shape[1] for block in mesh.blocks), default=1)
    masks = [mask(rows, cells) for rows in mesh.cell_groups.values()]
    header = ["element", "kind", *(f"n{i + 1}" for i in range(widest)), *map(group_array, mesh.cell_groups)]
    writer, row = rows_of(path.with_name(f"{path.stem}_elements.csv"), header), 0
    for block in mesh.blocks:
        blanks = [""] * (widest - block.nodes.shape[1])
        for number, nodes in zip(block.ids.tolist(), mesh.node_ids[block.nodes].tolist(), strict=True):
            writer.writerow([number, block.kind, *nodes, *blanks, *(m[row] for m in masks)])
            row += 1


def _write_modes(rows_of, path: Path, modes: ModeSet, progress: Progress) -> None:
    parts = ("_re", "_im") if modes.is_complex else ("",)
    axes = _AXES if modes.shapes.has_rotations else _AXES[:3]
    writer = rows_of(path, ["mode", "node", *(axis + part for part in parts for axis in axes)])
    ids = modes.node_ids.tolist()
    for i in range(modes.count):
        progress.tick(f"writing {path.name}", i, modes.count)
        turned = modes.rotations(i)
        shape = modes.shape(i) if turned is None else np.hstack([modes.shape(i), turned])
        values = np.hstack([shape.real, shape.imag]) if modes.is_complex else shape
        for number, row in zip(ids, values.tolist(), strict=True):
            writer.writerow([i + 1, number, *row])
    damping = [] if modes.damping is None else [modes.damping.tolist()]
    header = ["mode", "freq_hz", *(["damping"] if damping else []), "mass_normalised"]
    writer = rows_of(path.with_name(f"{path.stem}_frequencies.csv"), header)
    for i, freq in enumerate(modes.freq_hz.tolist()):
        writer.writerow([i + 1, freq, *(column[i] for column in damping), int(modes.normalisation == "mass")])
