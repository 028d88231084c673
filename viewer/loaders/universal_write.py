"""Writes a mesh and its modes as a universal file: units, nodes, elements, groups, data at nodes (164, 2411, 2412,
2467, 55). Numbers of shapes keep six digits: the format has no more room. Everything is SI."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Sequence
from typing import TextIO

import numpy as np

from viewer.errors import LoadError
from viewer.jobs import SILENT, Progress, atomic_path
from viewer.loaders.universal_cells import DESCRIPTORS, ORDER
from viewer.loaders.universal_results import COMPLEX_MODES, DISPLACEMENT, NORMAL_MODE
from viewer.model.arrays import Array
from viewer.model.mesh import Mesh
from viewer.model.modes import ModeSet

LARGEST_LABEL = 10**9  # ten columns, one of them a blank


def write(path: str | os.PathLike[str], mesh: Mesh, modes: ModeSet | None, progress: Progress = SILENT) -> None:
    """Atomic. Raises ``LoadError`` for kinds of cells and ids that the format has no place for."""
    _check(path, mesh)
    with atomic_path(path) as part, part.open("w", encoding="latin-1", errors="replace", newline="\n") as stream:
        put_data_set(stream, 164, unit_lines(1.0))
        put_data_set(stream, 2411, _nodes(mesh))
        put_data_set(stream, 2412, _elements(mesh))
        if mesh.node_groups or mesh.cell_groups:
            put_data_set(stream, 2467, _groups(mesh))
        if modes is not None:
            for index in range(modes.count):
                progress.tick(f"writing {os.path.basename(path)}", index, modes.count)
                put_data_set(stream, 55, _mode(modes, index))


def put_data_set(stream: TextIO, number: int, lines: Iterable[str]) -> None:
    stream.write(f"    -1\n{number:6d}\n")
    stream.writelines(f"{line}\n" for line in lines)
    stream.write("    -1\n")


def unit_lines(length_unit: float) -> Iterable[str]:
    """Lines of a data set 164: lengths in units of ``length_unit`` metres, forces in newtons."""
    code, words = (1, "SI: Meter (newton)") if length_unit == 1.0 else (9, "USER_DEFINED")
    return [f"{code:10d}{words:<20}{2:10d}", long_line([1 / length_unit, 1, 1]), long_line([273.15])]


def _check(path: object, mesh: Mesh) -> None:
    for block in mesh.blocks:
        if block.kind not in DESCRIPTORS:
            raise LoadError(
                f"universal files have no {block.kind}",
                file=path,
                expected=", ".join(DESCRIPTORS),
                do="write .vtu or .npz",
            )
    for word, ids in (("node", mesh.node_ids), ("element", mesh.cell_ids)):
        if len(ids) and (ids.min() < 1 or ids.max() >= LARGEST_LABEL):
            raise LoadError(
                f"{word} ids do not fit a universal file",
                file=path,
                found=f"{ids.min()} to {ids.max()}",
                expected=f"1 to {LARGEST_LABEL - 1}",
            )


def _nodes(mesh: Mesh) -> Iterable[str]:
    for label, point in zip(mesh.node_ids.tolist(), mesh.points.tolist(), strict=True):
        yield f"{label:10d}{1:10d}{1:10d}{11:10d}"
        yield long_line(point)


def _elements(mesh: Mesh) -> Iterable[str]:
    for block in mesh.blocks:
        count = block.nodes.shape[1]
        back = np.argsort(ORDER.get(block.kind, range(count)))
        for label, nodes in zip(block.ids.tolist(), mesh.node_ids[block.nodes[:, back]].tolist(), strict=True):
            yield whole_line([label, DESCRIPTORS[block.kind], 1, 1, 7, count])
            if block.kind.startswith("line"):
                yield whole_line([0, 1, 1])
            yield from in_lines(nodes, 8, whole_line)


def _groups(mesh: Mesh) -> Iterable[str]:
    found = [(name, 7, mesh.node_ids[rows]) for name, rows in mesh.node_groups.items()]
    found += [(name, 8, mesh.cell_ids[rows]) for name, rows in mesh.cell_groups.items()]
    for number, (name, kind, labels) in enumerate(found, 1):
        yield whole_line([number, 0, 0, 0, 0, 0, 0, len(labels)])
        yield " ".join(name.split())[:80] or "none"
        yield from in_lines([x for label in labels.tolist() for x in (kind, label, 0, 0)], 8, whole_line)


def _mode(modes: ModeSet, index: int) -> Iterable[str]:
    shape, turned = modes.shape(index), modes.rotations(index)
    values = shape if turned is None else np.hstack([shape, turned])
    ratio = 0.0 if modes.damping is None else float(modes.damping[index])
    mass = 1.0 if modes.normalisation == "mass" else 0.0
    return mode_lines(index + 1, modes.node_ids, values, float(modes.freq_hz[index]), ratio, mass)


def mode_lines(
    number: int, labels: Array, values: Array, freq: float, ratio: float, mass: float = 0.0
) -> Iterable[str]:
    """Lines of a data set 55: mode ``number`` with ``values`` (n, 3 or 6) at the nodes ``labels``, a complex mode
    when they are complex; ``freq`` in Hz, damping ``ratio``, modal ``mass`` (0: not known)."""
    is_complex, count = np.iscomplexobj(values), values.shape[1]
    yield "Mode shape"
    yield from ["NONE"] * 3
    yield f"MODE SAME {number:10d}FREQUENCY {freq:13.5E}"
    analysis = COMPLEX_MODES[0] if is_complex else NORMAL_MODE
    yield whole_line([1, analysis, 2 if count == 3 else 3, DISPLACEMENT, 5 if is_complex else 2, count])
    if is_complex:
        omega = 2 * np.pi * freq
        yield whole_line([2, 6, 1, number])
        yield short_line([-ratio * omega, omega * np.sqrt(max(0.0, 1 - ratio**2)), 0, 0, 0, 0])
        pairs = np.empty((len(values), 2 * count))
        pairs[:, ::2], pairs[:, 1::2] = values.real, values.imag
        values = pairs
    else:
        yield whole_line([2, 4, 1, number])
        yield short_line([freq, mass, ratio, 0])
    for label, row in zip(labels.tolist(), values.tolist(), strict=True):
        yield f"{label:10d}"
        yield from in_lines(row, 6, short_line)


def in_lines(values: Sequence, per_line: int, line: Callable[[Sequence], str]) -> Iterable[str]:
    return (line(values[i : i + per_line]) for i in range(0, len(values), per_line))


def whole_line(values: Sequence[int]) -> str:
    return "".join(f"{value:10d}" for value in values)


def short_line(values: Sequence[float]) -> str:
    return "".join(_fitting(value, 13, 5) for value in values)


def long_line(values: Sequence[float]) -> str:
    return "".join(_fitting(value, 25, 16).replace("E", "D") for value in values)


def _fitting(value: float, width: int, digits: int) -> str:
    """``1.23456E+00``; exponents of three digits lose a digit before them rather than their column."""
    text = f"{value:{width}.{digits}E}"
    return text if len(text) <= width else f"{value:{width}.{digits - 1}E}"
