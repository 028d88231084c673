"""``.unv``, ``.uff``: universal files as meshes and mode sets. What is read of them: :mod:`universal_sections`.

Lengths: units stated in the file (data set 164) win over ``length_unit``; stating another one is an error.
Nodes of data set 2411 win over 781, those over 15; results of 2414 win over 55: newer data sets of one content.
Shapes are taken in the part's system ("global vectors" in the descriptions of 55 and 2414). A node without an entry
has not moved in data set 55 (its description, note 9); in 2414 it has no result, which is an error for nodes in use.
Rotations that are zero throughout count as not given (2414, note 11: unused values are zero).
"""

from __future__ import annotations

from collections import Counter
from pathlib import Path

import numpy as np

from viewer.cells import KINDS
from viewer.errors import LoadError
from viewer.jobs import SILENT, Progress
from viewer.loaders.meshio_files import without_carriers
from viewer.loaders.raw_data import RawBlock, RawMesh, RawModes
from viewer.loaders.universal_cells import ORDER, kind_of
from viewer.loaders.universal_frames import PART
from viewer.loaders.universal_results import (
    ACCELERATION,
    ANALYSES,
    AT_NODES,
    COMPLEX_MODES,
    DISPLACEMENT,
    GENERAL,
    ON_ELEMENTS,
    STRAIN_ENERGY,
    UNKNOWN,
    VELOCITY,
    ResultData,
)
from viewer.loaders.universal_sections import GEOMETRY, RESULTS, Nodes, Universal, read_universal
from viewer.loaders.universal_write import write
from viewer.model.arrays import Array
from viewer.model.modes import ArrayShapes

__all__ = ["SUFFIXES", "read_mesh", "read_modes", "write"]

SUFFIXES = (".unv", ".uff")
_SHAPES = (DISPLACEMENT, GENERAL, UNKNOWN, VELOCITY, ACCELERATION)  # proportional in a mode; first found is taken
_UNIT_MASS = 1e-5  # six digits are written


def read_mesh(path: Path, progress: Progress = SILENT) -> RawMesh:
    """Nodes and elements, or the trace lines of a file without elements. Raises ``LoadError``."""
    parts = read_universal(path, GEOMETRY, progress)
    node_ids, points = part_points(parts)
    notes, warnings = _remarks(parts)
    blocks, unknown = _blocks(parts, node_ids)
    if unknown:
        listed = ", ".join(f"{n} of descriptor {d} with {c} nodes" for (d, c), n in unknown.items())
        warnings.append(f"elements left out, their kind is not known here: {listed}")
    if not blocks and parts.trace_lines:
        blocks = [RawBlock(KINDS["line2"].name, strokes(parts, node_ids))]
        notes.append("the file has no elements: its trace lines are shown as lines")
    raw = RawMesh(points, blocks, node_ids, notes=notes, warnings=warnings)
    raw.node_groups, raw.cell_groups = _groups(parts, node_ids, blocks)
    raw = without_carriers(raw)
    raw.length_unit = length_unit(parts)
    return raw


def read_modes(path: Path, progress: Progress = SILENT) -> RawModes:
    """Normal and complex modes at nodes, with strain energies of elements where the file has them."""
    parts = read_universal(path, RESULTS | {15, 164, 781, 2411}, progress)
    found = mode_results(parts)
    listed = _nodes_of_modes(parts, found)
    is_complex = any(np.iscomplexobj(item.values) for item in found)
    values = np.zeros((len(found), len(listed), 6), complex if is_complex else float)
    for item, into in zip(found, values, strict=True):
        rows, there = rows_of(item.labels, listed)
        if len(np.unique(item.labels)) != len(item.labels):
            raise LoadError("a node has two results in one mode", file=path, place=item.place)
        _check_missing(item, listed, path)
        into[rows[there], : item.values.shape[1]] = item.values[there]
    turned = values[:, :, 3:]
    masses = np.array([item.modal_mass for item in found])
    damping = np.array([item.damping for item in found])
    is_normal = all(item.analysis not in COMPLEX_MODES for item in found)
    return RawModes(
        ArrayShapes(values[:, :, :3], turned if turned.any() else None),
        np.array([item.freq_hz for item in found]),
        damping if damping.any() or not is_normal else None,
        listed,
        is_normal and bool((np.abs(masses - 1) <= _UNIT_MASS).all()),
        length_unit=length_unit(parts),
        cell_energy=_strain_energies(parts, found),
    )


def mode_results(parts: Universal) -> list[ResultData]:
    """The data sets that are modes, one a mode, in the order of the file. Raises ``LoadError`` when there is none."""
    at_nodes = [item for item in parts.results if item.location == AT_NODES]
    modes = [item for item in at_nodes if item.is_mode and item.values.shape[1] in (3, 6)]
    for number in (2414, 55):
        for quantity in _SHAPES:
            found = [item for item in modes if item.number == number and item.quantity == quantity]
            if found:
                return found
    there = Counter(f"{ANALYSES.get(r.analysis, r.analysis)} in data sets {r.number}" for r in parts.results)
    other = [f"{n} × {words}" for words, n in there.items()] + [f"{n} × {k}" for k, n in parts.left_out.items()]
    raise LoadError(
        "holds no mode shape",
        file=parts.path,
        found=", ".join(other) or "no results",
        expected="normal or complex modes, displacements at nodes, in data sets 55 or 2414",
    )


def part_points(parts: Universal) -> tuple[Array, Array]:
    """Labels (n,) and points (n, 3) of all nodes in the part's system, in the file's unit. Raises ``LoadError``."""
    chosen = newest_nodes(parts)
    if not chosen:
        others = ", ".join(f"{number} ({times} times)" for number, times in parts.left_out.items())
        raise LoadError(
            "holds no nodes",
            file=parts.path,
            found=f"data sets {others}" if others else "none that is read here",
            expected="data set 2411, 781 or 15",
        )
    points = []
    for section in chosen:
        xyz = np.array(section.points)
        for label in np.unique(section.systems).tolist() if section.number != 2411 else ():
            mine = section.systems == label
            if label not in (0, 1) and label not in parts.frames:
                raise LoadError(
                    "nodes are given in a coordinate system that the file does not define",
                    file=parts.path,
                    place=f"node {section.labels[np.argmax(mine)]}",
                    found=f"system {label}",
                    expected=f"0, the part's, or one of: {', '.join(str(k) for k in parts.frames) or 'none'}",
                    do="export the coordinate systems (data set 18 or 2420) too",
                )
            xyz[mine] = parts.frames.get(label, PART).to_part(xyz[mine])
        points.append(xyz)
    return np.concatenate([section.labels for section in chosen]), np.concatenate(points)


def length_unit(parts: Universal) -> float | None:
    """Metres to the file's unit of length as it states it, or None."""
    return None if parts.units is None else 1.0 / parts.units.length


def rows_of(labels: Array, known: Array) -> tuple[Array, Array]:
    """Row in ``known`` of each label, and whether it is there at all."""
    if not len(known):
        return np.zeros(labels.shape, np.int64), np.zeros(labels.shape, bool)
    order = np.argsort(known, kind="stable")
    rows = order[np.minimum(np.searchsorted(known, labels, sorter=order), len(known) - 1)]
    return rows, known[rows] == labels


def newest_nodes(parts: Universal) -> list[Nodes]:
    for number in (2411, 781, 15):
        chosen = [section for section in parts.nodes if section.number == number and len(section.labels)]
        if chosen:
            return chosen
    return []


def _blocks(parts: Universal, node_ids: Array) -> tuple[list[RawBlock], dict[tuple[int, int], int]]:
    blocks, unknown = [], {}
    for run in parts.elements:
        count = run.nodes.shape[1]
        kind = kind_of(run.descriptor, count)
        if not kind:
            unknown[run.descriptor, count] = len(run.labels)
            continue
        rows, there = rows_of(run.nodes, node_ids)
        if not there.all():
            cell, corner = np.argwhere(~there)[0]
            raise LoadError(
                "an element names a node that does not exist",
                file=parts.path,
                place=f"element {run.labels[cell]}",
                found=f"node {run.nodes[cell, corner]}",
                expected="a node of the file",
            )
        blocks.append(RawBlock(kind, rows[:, ORDER.get(kind, range(count))], run.labels))
    return blocks, unknown


def strokes(parts: Universal, node_ids: Array) -> Array:
    """(k, 2) rows of nodes that trace lines join, each pair once. Raises ``LoadError``."""
    found = [np.empty((0, 2), np.int64)]
    for line in parts.trace_lines:
        labels = np.reshape(line.strokes(), (-1, 2)).astype(np.int64)
        rows, there = rows_of(labels, node_ids)
        if not there.all():
            raise LoadError(
                "a trace line names a node that does not exist",
                file=parts.path,
                place=line.place,
                found=f"node {labels[~there][0]}",
                expected="a node of the file",
            )
        found.append(rows)
    return np.unique(np.sort(np.concatenate(found), axis=1), axis=0)


def _groups(parts: Universal, node_ids: Array, blocks: list[RawBlock]) -> tuple[dict[str, Array], dict[str, Array]]:
    cells = np.concatenate([np.empty(0, np.int64), *(b.ids for b in blocks if b.ids is not None)])
    found: tuple[dict[str, Array], dict[str, Array]] = ({}, {})
    for group in parts.groups:
        for members, known, into in ((group.nodes, node_ids, found[0]), (group.elements, cells, found[1])):
            rows, there = rows_of(np.array(members, np.int64), known)
            if there.any():
                into[group.name] = np.union1d(into.get(group.name, np.empty(0, np.int64)), rows[there])
    return found


def _remarks(parts: Universal) -> tuple[list[str], list[str]]:
    """Notes and warnings."""
    notes, warnings = [], []
    if parts.left_out:
        listed = ", ".join(f"{number} ({times} times)" for number, times in parts.left_out.items())
        notes.append(f"data sets left out: {listed}")
    systems = {label for s in newest_nodes(parts) for label in np.unique(s.systems).tolist() if s.number != 2411}
    if any(label in parts.frames and parts.frames[label].kind != "cartesian" for label in systems):
        notes.append("angles of cylindrical and spherical coordinates were taken as degrees")
    local = {label for section in newest_nodes(parts) for label in np.unique(section.moves_in).tolist()}
    local = {label for label in local if label in parts.frames and _is_turned(parts, label)}
    if local:
        listed = ", ".join(str(label) for label in sorted(local))
        warnings.append(
            f"nodes have displacement systems of their own ({listed}): shapes in this file are taken in the part's "
            "system, as data sets 55 and 2414 are defined; look at the shapes there"
        )
    return notes, warnings


def _is_turned(parts: Universal, label: int) -> bool:
    frame = parts.frames[label]
    return frame.kind != "cartesian" or not np.allclose(frame.axes, np.eye(3), atol=1e-5)


def _nodes_of_modes(parts: Universal, found: list[ResultData]) -> Array:
    """Labels of all nodes: those of the file in its order, then those that only the shapes name."""
    in_results = np.unique(np.concatenate([item.labels for item in found]))
    if not newest_nodes(parts):
        return found[0].labels if len(found[0].labels) == len(in_results) else in_results
    labels = np.concatenate([section.labels for section in newest_nodes(parts)])
    return np.concatenate([labels, np.setdiff1d(in_results, labels)])


def _check_missing(item: ResultData, listed: Array, path: Path) -> None:
    """Every node in use must have an entry of data set 2414."""
    missing = np.setdiff1d(listed, item.labels)
    if item.number == 55 or not len(missing):
        return
    elements = read_universal(path, frozenset({2412})).elements
    if elements:
        missing = np.intersect1d(missing, np.concatenate([run.nodes.ravel() for run in elements]))
    if len(missing):
        raise LoadError(
            f"{len(missing)} nodes have no result in a mode",
            file=path,
            place=item.place,
            found=f"node {missing[0]} is missing",
            expected="every node, also those that do not move",
        )


def _strain_energies(parts: Universal, found: list[ResultData]) -> tuple[Array, Array] | None:
    """(k,) element labels and (modes, k) J that the file gives, when it does for every mode: by mode number."""
    mine = [
        item
        for item in parts.results
        if item.location == ON_ELEMENTS and item.quantity == STRAIN_ENERGY and item.is_mode and len(item.labels)
    ]
    by_mode = {item.mode: item for item in mine}
    if not mine or len(by_mode) != len(mine) or any(item.mode not in by_mode for item in found):
        return None
    labels = np.unique(np.concatenate([item.labels for item in mine]))
    energy = np.full((len(found), len(labels)), np.nan)
    for row, item in enumerate(by_mode[item.mode] for item in found):
        energy[row, np.searchsorted(labels, item.labels)] = np.real(item.values).sum(axis=1)
    return labels, energy
