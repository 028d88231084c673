"""Test sets in universal files: points 2411, 781 or 15, trace lines 82, modes 55 or 2414, coordinate systems 18 and
2420, units 164.

What the descriptions of the data sets leave open is settled so:

- A node with a displacement system of its own (18, 2420) has its channels along the axes of that system; of
  cylindrical and spherical ones along the directions at the node. A remark says so.
- A direction of a node that is zero in every mode was not measured. Turning at nodes (components 4 to 6) is left out.
- A node must have a result in every mode of its run.
- Complex modes state an eigenvalue: frequency |λ| / 2π, damping ratio −Re λ / |λ|. A ratio of zero is not known.
- Data sets of one mode number and nearly one frequency (within 10 %) are several runs in one file: the first of each
  are the first run, and so on. They are merged as runs of several files are.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np

from viewer.errors import LoadError
from viewer.jobs import SILENT, Progress
from viewer.loaders.raw_tests import LARGEST, LARGEST_COORDINATE, RawTest
from viewer.loaders.universal_files import length_unit, mode_results, newest_nodes, part_points, rows_of, strokes
from viewer.loaders.universal_frames import PART
from viewer.loaders.universal_results import ResultData
from viewer.loaders.universal_sections import RESULTS, Universal, read_universal
from viewer.model.arrays import Array

_WANTED = RESULTS | {15, 18, 82, 164, 781, 2411, 2420}
_SAME_MODE = 0.1


def read_runs(path: Path, progress: Progress = SILENT) -> list[RawTest]:
    """The runs of a file. Raises ``LoadError``."""
    parts = read_universal(path, _WANTED, progress)
    found = mode_results(parts)
    node_ids, points = part_points(parts)
    _check_points(parts, node_ids, points)
    axes, turned = _axes(parts, points)
    lines = strokes(parts, node_ids)
    names = [str(label) for label in node_ids.tolist()]
    runs = []
    for modes in _by_run(path, found):
        sensor, direction, shapes, remarks = _channels(path, modes, node_ids)
        applied = np.intersect1d(sensor, turned)
        if len(applied):
            listed = ", ".join(names[row] for row in applied[:10]) + (" …" if len(applied) > 10 else "")
            remarks.append(f"points with a coordinate system of their own measure along its axes: {listed}")
        damping = np.array([item.damping for item in modes])
        runs.append(
            RawTest(
                names,
                points,
                lines,
                sensor,
                axes[sensor, direction],
                np.array([item.freq_hz for item in modes]),
                shapes,
                np.where(damping == 0, np.nan, damping),
                length_unit(parts),
                remarks,
            )
        )
    return runs


def _check_points(parts: Universal, node_ids: Array, points: Array) -> None:
    """Finite and of reasonable size, each label once."""
    sections = newest_nodes(parts)
    places = [section.place(row) for section in sections for row in range(len(section.labels))]
    with np.errstate(invalid="ignore"):
        wrong = ~(np.abs(points) <= LARGEST_COORDINATE).all(axis=1)
    if wrong.any():
        row = int(np.argmax(wrong))
        finite = np.isfinite(points[row]).all()
        raise LoadError(
            f"a coordinate is {'beyond reason' if finite else 'not finite'}",
            file=parts.path,
            place=places[row],
            found=f"node {node_ids[row]} at {points[row]}",
        )
    seen: dict[int, int] = {}
    for row, label in enumerate(node_ids.tolist()):
        before = seen.setdefault(label, row)
        if before != row:
            raise LoadError(
                f"node {label} is given twice",
                file=parts.path,
                place=places[row],
                found=f"also in {places[before]}",
                expected="each label once",
            )


def _axes(parts: Universal, points: Array) -> tuple[Array, Array]:
    """(n, 3, 3) directions of each node's displacements, one a row, and the rows of nodes whose own they are."""
    moves_in = np.concatenate([section.moves_in for section in newest_nodes(parts)])
    axes = np.broadcast_to(np.eye(3), (len(points), 3, 3)).copy()
    for label in np.unique(moves_in).tolist():
        mine = moves_in == label
        if label not in (0, 1) and label not in parts.frames:
            row = int(np.argmax(mine))
            place = [s.place(r) for s in newest_nodes(parts) for r in range(len(s.labels))][row]
            raise LoadError(
                "a node moves in a coordinate system that the file does not define",
                file=parts.path,
                place=place,
                found=f"system {label}",
                expected=f"0, the part's, or one of: {', '.join(str(k) for k in parts.frames) or 'none'}",
                do="export the coordinate systems (data set 18 or 2420) too",
            )
        axes[mine] = parts.frames.get(label, PART).directions(points[mine])
    return axes, np.flatnonzero((np.abs(axes - np.eye(3)) > 1e-5).any(axis=(1, 2)))


def _by_run(path: Path, found: list[ResultData]) -> list[list[ResultData]]:
    """The modes of each run, in the order of the file."""
    runs: list[list[ResultData]] = []
    for item in found:
        if not 0 < item.freq_hz < 1e12:
            raise LoadError(
                f"mode {item.mode} has no frequency",
                file=path,
                place=item.place,
                found=f"{item.freq_hz:g} Hz",
                expected="above zero; complex modes: their eigenvalue in rad/s",
            )
        earlier = sum(1 for run in runs for other in run if _same_mode(item, other))
        if earlier == len(runs):
            runs.append([])
        runs[earlier].append(item)
    for item in found if len(runs) > 1 else ():
        if any(other.mode == item.mode and not _same_mode(item, other) for other in found):
            raise LoadError(
                "the numbers of modes do not tell modes from runs",
                file=path,
                place=item.place,
                found=f"mode {item.mode} at several frequencies, one of them twice",
                expected="one number for each mode, the same in all runs",
                do="number the modes, or put runs into files of their own",
            )
    return runs


def _same_mode(a: ResultData, b: ResultData) -> bool:
    return a.mode == b.mode and abs(a.freq_hz - b.freq_hz) <= _SAME_MODE * b.freq_hz


def _channels(path: Path, modes: list[ResultData], node_ids: Array) -> tuple[Array, Array, Array, list[str]]:
    """Row of the node and number of the axis (0 to 2) of each channel, (modes, channels) shapes, remarks."""
    first = modes[0].labels
    is_complex = any(np.iscomplexobj(item.values) for item in modes)
    values = np.zeros((len(modes), len(first), 3), complex if is_complex else float)
    turning = False
    for item, into in zip(modes, values, strict=True):
        rows = _entry_rows(path, item, modes[0], node_ids)
        into[rows] = item.values[:, :3]
        turning |= bool(item.values[:, 3:].any())
        if not into.any():
            raise LoadError(f"mode {item.mode} does not move at all", file=path, place=item.place)
    measured = values.any(axis=0)
    entry, axis = np.nonzero(measured)
    remarks = []
    if not measured.all():
        count = int((~measured).sum())
        remarks.append(f"{count} directions at points are zero in every mode and count as not measured")
    if turning:
        remarks.append("turning at points is in the file and was left out")
    return rows_of(first, node_ids)[0][entry], axis, values[:, entry, axis], remarks


def _entry_rows(path: Path, item: ResultData, first: ResultData, node_ids: Array) -> Array:
    """(entries,) row among the entries of ``first`` of each entry of ``item``; all must be there, once and finite."""
    with np.errstate(invalid="ignore"):
        wrong = ~(np.abs(item.values) <= LARGEST).all(axis=1)
    if wrong.any():
        row = int(np.argmax(wrong))
        finite = np.isfinite(item.values[row]).all()
        raise LoadError(
            f"a value is {'beyond reason' if finite else 'not finite'}",
            file=path,
            place=item.place_of(row),
            found=f"node {item.labels[row]}, {item.values[row]}",
            expected=f"at most {LARGEST:g}" if finite else "numbers",
        )
    known = rows_of(item.labels, node_ids)[1]
    if not known.all():
        row = int(np.argmin(known))
        raise LoadError(
            "a result stands at a node that does not exist",
            file=path,
            place=item.place_of(row),
            found=f"node {item.labels[row]}",
            expected="a node of the file",
        )
    seen: dict[int, int] = {}
    for row, label in enumerate(item.labels.tolist()):
        before = seen.setdefault(label, row)
        if before != row:
            raise LoadError(
                "a node has two results in one mode",
                file=path,
                place=item.place_of(row),
                found=f"node {label}, also in {item.place_of(before)}",
                expected="one; runs of a test are data sets of their own",
            )
    rows, there = rows_of(item.labels, first.labels)
    if there.all() and len(item.labels) == len(first.labels):
        return rows
    lacking, label = (first, item.labels[~there][0]) if not there.all() else (item, _missing(first, item))
    raise LoadError(
        f"a point has no value in mode {lacking.mode}",
        file=path,
        place=lacking.place,
        found=f"node {label} is missing, which mode {(item if lacking is first else first).mode} has",
        expected="every channel in every mode",
    )


def _missing(first: ResultData, item: ResultData) -> int:
    return int(np.setdiff1d(first.labels, item.labels)[0])
