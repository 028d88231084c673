"""Writes a mesh and its modes as a universal file: units, nodes, elements, groups, data at nodes (164, 2411, 2412,
2467, 55). Numbers of shapes keep six digits: the format has no more room. Everything is SI."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Sequence

import numpy as np

from viewer.errors import LoadError
from viewer.jobs import SILENT, Progress, atomic_path
from viewer.loaders.universal_cells import DESCRIPTORS, ORDER
from viewer.loaders.universal_results import COMPLEX_MODES, DISPLACEMENT, NORMAL_MODE
from viewer.model.mesh import Mesh
from viewer.model.modes import ModeSet

_LARGEST_LABEL = 10**9  # ten columns, one of them a blank


def write(path: str | os.PathLike[str], mesh: Mesh, modes: ModeSet | None, progress: Progress = SILENT) -> None:
    """Atomic. Raises ``LoadError`` for kinds of cells and ids that the format has no place for."""
    _check(path, mesh)
    with atomic_path(path) as part, part.open("w", encoding="latin-1", errors="replace", newline="\n") as stream:

        def data_set(number: int, lines: Iterable[str]) -> None:
            stream.write(f"    -1\n{number:6d}\n")
            stream.writelines(f"{line}\n" for line in lines)
            stream.write("    -1\n")

        data_set(164, [f"{1:10d}{'SI: Meter (newton)':<20}{2:10d}", _long([1, 1, 1]), _long([273.15])])
        data_set(2411, _nodes(mesh))
        data_set(2412, _elements(mesh))
        if mesh.node_groups or mesh.cell_groups:
            data_set(2467, _groups(mesh))
        if modes is not None:
            for index in range(modes.count):
                progress.tick(f"writing {os.path.basename(path)}", index, modes.count)
                data_set(55, _mode(modes, index))


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
        if len(ids) and (ids.min() < 1 or ids.max() >= _LARGEST_LABEL):
            raise LoadError(
                f"{word} ids do not fit a universal file",
                file=path,
                found=f"{ids.min()} to {ids.max()}",
                expected=f"1 to {_LARGEST_LABEL - 1}",
            )


def _nodes(mesh: Mesh) -> Iterable[str]:
    for label, point in zip(mesh.node_ids.tolist(), mesh.points.tolist(), strict=True):
        yield f"{label:10d}{1:10d}{1:10d}{11:10d}"
        yield _long(point)


def _elements(mesh: Mesh) -> Iterable[str]:
    for block in mesh.blocks:
        count = block.nodes.shape[1]
        back = np.argsort(ORDER.get(block.kind, range(count)))
        for label, nodes in zip(block.ids.tolist(), mesh.node_ids[block.nodes[:, back]].tolist(), strict=True):
            yield _whole([label, DESCRIPTORS[block.kind], 1, 1, 7, count])
            if block.kind.startswith("line"):
                yield _whole([0, 1, 1])
            yield from _in_lines(nodes, 8, _whole)


def _groups(mesh: Mesh) -> Iterable[str]:
    found = [(name, 7, mesh.node_ids[rows]) for name, rows in mesh.node_groups.items()]
    found += [(name, 8, mesh.cell_ids[rows]) for name, rows in mesh.cell_groups.items()]
    for number, (name, kind, labels) in enumerate(found, 1):
        yield _whole([number, 0, 0, 0, 0, 0, 0, len(labels)])
        yield " ".join(name.split())[:80] or "none"
        yield from _in_lines([x for label in labels.tolist() for x in (kind, label, 0, 0)], 8, _whole)


def _mode(modes: ModeSet, index: int) -> Iterable[str]:
    shape, turned = modes.shape(index), modes.rotations(index)
    values = shape if turned is None else np.hstack([shape, turned])
    freq, ratio = float(modes.freq_hz[index]), 0.0 if modes.damping is None else float(modes.damping[index])
    is_complex, count = modes.is_complex, values.shape[1]
    yield "Mode shape"
    yield from ["NONE"] * 3
    yield f"MODE SAME {index + 1:10d}FREQUENCY {freq:13.5E}"
    analysis = COMPLEX_MODES[0] if is_complex else NORMAL_MODE
    yield _whole([1, analysis, 2 if count == 3 else 3, DISPLACEMENT, 5 if is_complex else 2, count])
    if is_complex:
        omega = 2 * np.pi * freq
        yield _whole([2, 6, 1, index + 1])
        yield _short([-ratio * omega, omega * np.sqrt(max(0.0, 1 - ratio**2)), 0, 0, 0, 0])
        pairs = np.empty((len(values), 2 * count))
        pairs[:, ::2], pairs[:, 1::2] = values.real, values.imag
        values = pairs
    else:
        yield _whole([2, 4, 1, index + 1])
        yield _short([freq, 1.0 if modes.normalisation == "mass" else 0.0, ratio, 0])
    for label, row in zip(modes.node_ids.tolist(), values.tolist(), strict=True):
        yield f"{label:10d}"
        yield from _in_lines(row, 6, _short)


def _in_lines(values: Sequence, per_line: int, line: Callable[[Sequence], str]) -> Iterable[str]:
    return (line(values[i : i + per_line]) for i in range(0, len(values), per_line))


def _whole(values: Sequence[int]) -> str:
    return "".join(f"{value:10d}" for value in values)


def _short(values: Sequence[float]) -> str:
    return "".join(_fitting(value, 13, 5) for value in values)


def _long(values: Sequence[float]) -> str:
    return "".join(_fitting(value, 25, 16).replace("E", "D") for value in values)


def _fitting(value: float, width: int, digits: int) -> str:
    """``1.23456E+00``; exponents of three digits lose a digit before them rather than their column."""
    text = f"{value:{width}.{digits}E}"
    return text if len(text) <= width else f"{value:{width}.{digits - 1}E}"
