"""What a universal file says, data set by data set, as frozen data; nothing joined, nothing converted.

Read here, by the published descriptions of the data sets: 15, 781, 2411 nodes; 2412 elements; 82 trace lines; 18,
2420 coordinate systems; 164 units; 55, 2414 data at nodes and on elements; 2467, 2477 groups. Everything else is left
out and named. Labels are those of the file. The same parts serve finite-element results and hammer tests.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from viewer.jobs import SILENT, Progress
from viewer.loaders.universal_frames import Frame, frames_18, frames_2420
from viewer.loaders.universal_results import ResultData, result_55, result_2414
from viewer.loaders.universal_text import Records, data_sets, opened
from viewer.model.arrays import Array, frozen, frozen_map

GEOMETRY = frozenset({15, 18, 82, 164, 781, 2411, 2412, 2420, 2467, 2477})
RESULTS = frozenset({55, 2414})
# Beams have a line with their orientation before that of their nodes; some writers give one to rods (11) as well.
_BEAMS, _ROD = (21, 22, 23, 24), 11
_NODE_ENTITY, _ELEMENT_ENTITY = 7, 8


@dataclass(frozen=True)
class Units:
    """Data set 164: a number of the file divided by its factor is SI."""

    code: int
    words: str
    length: float
    force: float


@dataclass(frozen=True, eq=False)
class Nodes:
    """Nodes of one data set: ``labels`` (n,), ``points`` (n, 3) in their ``systems`` (n,), ``moves_in`` (n,) the
    system of their displacements. Points of data set 2411 are in the part's system whatever ``systems`` says.
    ``line`` of the file at which the first stands."""

    number: int
    labels: Array
    systems: Array
    moves_in: Array
    points: Array
    line: int = 0

    def __post_init__(self) -> None:
        for name in ("labels", "systems", "moves_in"):
            object.__setattr__(self, name, frozen(getattr(self, name), np.int64, shape=(len(self.points),)))
        object.__setattr__(self, "points", frozen(self.points, np.float64, shape=(None, 3)))

    def place(self, row: int) -> str:
        """Where the node in ``row`` stands, for messages."""
        return f"line {self.line + row * (1 if self.number == 15 else 2)} (data set {self.number})"


@dataclass(frozen=True, eq=False)
class Elements:
    """Elements of one descriptor and size: ``labels`` (k,), ``nodes`` (k, m) labels in the file's order."""

    descriptor: int
    labels: Array
    nodes: Array

    def __post_init__(self) -> None:
        object.__setattr__(self, "labels", frozen(self.labels, np.int64, shape=(len(self.nodes),)))
        object.__setattr__(self, "nodes", frozen(self.nodes, np.int64, shape=(None, None)))


@dataclass(frozen=True)
class TraceLine:
    """Data set 82: node labels in the order of drawing; 0 lifts the pen."""

    number: int
    name: str
    nodes: tuple[int, ...]
    place: str = ""  # in the file, for messages

    def strokes(self) -> list[tuple[int, int]]:
        """Pairs of labels to join."""
        pairs = zip(self.nodes[:-1], self.nodes[1:], strict=True)
        return [(a, b) for a, b in pairs if a and b and a != b]


@dataclass(frozen=True)
class Group:
    """Data set 2467 or 2477: labels of members."""

    name: str
    nodes: tuple[int, ...]
    elements: tuple[int, ...]


@dataclass(frozen=True, eq=False)
class Universal:
    """The parts of one file. ``left_out``: number of a data set → how often it stands in the file."""

    path: Path
    units: Units | None = None
    frames: Mapping[int, Frame] = field(default_factory=dict)
    nodes: tuple[Nodes, ...] = ()
    elements: tuple[Elements, ...] = ()
    trace_lines: tuple[TraceLine, ...] = ()
    groups: tuple[Group, ...] = ()
    results: tuple[ResultData, ...] = ()
    left_out: Mapping[int, int] = field(default_factory=dict)

    def __post_init__(self) -> None:
        object.__setattr__(self, "frames", frozen_map(self.frames))
        object.__setattr__(self, "left_out", frozen_map(self.left_out))


def read_universal(path: Path, wanted: frozenset[int] = GEOMETRY | RESULTS, progress: Progress = SILENT) -> Universal:
    """The ``wanted`` data sets of a universal file. Raises ``LoadError`` naming the line."""
    units: Units | None = None
    frames: dict[int, Frame] = {}
    nodes: list[Nodes] = []
    elements: dict[tuple[int, int], tuple[list[int], list[list[int]]]] = {}
    lines: list[TraceLine] = []
    groups: list[Group] = []
    results: list[ResultData] = []
    left_out: dict[int, int] = {}
    with opened(path) as data:
        for found in data_sets(data, path, wanted):
            progress.tick(f"reading data set {found.number} of {path.name}")
            if found.data is None:
                if found.number not in GEOMETRY | RESULTS:
                    left_out[found.number] = left_out.get(found.number, 0) + 1
                continue
            records = Records(path, found)
            match found.number:
                case 164:
                    units = _units(records, units)
                case 18:
                    frames |= {frame.label: frame for frame in frames_18(records, frames)}
                case 2420:
                    frames |= {frame.label: frame for frame in frames_2420(records)}
                case 15 | 781 | 2411:
                    nodes.append(_nodes(records))
                case 2412:
                    _elements(records, elements)
                case 82:
                    lines.append(_trace_line(records))
                case 2467 | 2477:
                    groups += _groups(records)
                case 55:
                    results.append(result_55(records))
                case 2414:
                    results.append(result_2414(records))
    runs = tuple(
        Elements(descriptor, labels, np.reshape(rows, (len(labels), count)))  # type: ignore[arg-type]
        for (descriptor, count), (labels, rows) in elements.items()
    )
    return Universal(path, units, frames, tuple(nodes), runs, tuple(lines), tuple(groups), tuple(results), left_out)


def _units(records: Records, before: Units | None) -> Units:
    line = records.lines[records.take(1, "the units")[0]].decode("latin-1")
    code = line[:10].strip()
    if not (code.isascii() and code.isdigit()):
        raise records.error("the code of units is no number", found=repr(code))
    length, force, _, _ = records.reals(4, "the units", 3, 25)
    if not (0 < length < np.inf and 0 < force < np.inf):
        raise records.error(
            "a factor of units is not above zero",
            found=f"length {length:g}, force {force:g}",
            expected="how many units of the file make one of SI",
        )
    units = Units(int(code), line[10:30].strip(), length, force)
    if before is not None and before.length != length:
        raise records.error(
            "units of length are stated twice and differ",
            found=f"{before.length:g} and {length:g} to the metre",
            do="split the file where its units change",
        )
    return units


def _nodes(records: Records) -> Nodes:
    number, count = records.number, records.left
    if number == 15:
        rows = records.take(count, "nodes")
        widths = (10,) * 4 + (13,) * 3
        heads, points = records.integers(rows, widths, slice(4)), records.numbers(rows, widths, slice(4, 7))
    else:
        if count % 2:
            raise records.error(
                "the data set ends inside a node", count - 1, found=f"{count} lines", expected="two lines a node"
            )
        rows = records.take(count, "nodes")
        heads = records.integers(rows[::2], (10,) * 4)
        points = records.numbers(rows[1::2], (25,) * 3)
    if (heads[:, 0] < 1).any():
        row = int(np.argmax(heads[:, 0] < 1))
        raise records.error(
            "a node's label is not above zero", row if number == 15 else 2 * row, found=str(heads[row, 0])
        )
    return Nodes(number, heads[:, 0], heads[:, 1], heads[:, 2], points, records.first)


def _elements(records: Records, found: dict[tuple[int, int], tuple[list[int], list[list[int]]]]) -> None:
    while records:
        label, descriptor, _, _, _, count = records.whole((10,) * 6, "an element")
        if label < 1 or count < 1:
            raise records.error("an element's label or number of nodes is not above zero", found=f"{label}, {count}")
        rod = descriptor == _ROD and records.left >= 2 and len(records.lines[records.at].split()) == 3
        if descriptor in _BEAMS or rod:
            records.take(1, f"element {label}")
        labels, rows = found.setdefault((descriptor, count), ([], []))
        labels.append(label)
        rows.append(records.wholes(count, f"element {label}"))


def _trace_line(records: Records) -> TraceLine:
    number, count, _ = records.whole((10,) * 3, "a trace line")
    name = records.text("a trace line")
    nodes: list[int] = []
    while records:  # to the end of the data set: one library's count leaves repeated nodes out
        row = records.take(1, "a trace line")
        line = records.lines[row[0]].rstrip()
        words = line.split()
        touching = any(len(word) > 10 for word in words)
        nodes += records.integers(row, (10,) * (-(-len(line) // 10) if touching else len(words)))[0].tolist()
    if len(nodes) < count:
        raise records.error("the data set ends inside a trace line", found=f"{len(nodes)} nodes", expected=str(count))
    return TraceLine(number, name, tuple(nodes), f"line {records.first} (data set 82)")


def _groups(records: Records) -> list[Group]:
    groups = []
    while records:
        head = records.whole((10,) * 8, "a group")
        name = records.text("a group") or f"group {head[0]}"
        members = np.reshape(records.wholes(4 * head[7], f"group '{name}'") if head[7] > 0 else [], (-1, 4))
        groups.append(
            Group(
                name,
                *(
                    tuple(members[members[:, 0] == kind, 1].astype(int).tolist())
                    for kind in (_NODE_ENTITY, _ELEMENT_ENTITY)
                ),
            )
        )
    return groups
