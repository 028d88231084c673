"""Test sets in ``.csv`` tables, written by hand, by a spreadsheet or by ten lines of anybody's script.

Three or four files share the front part of their names; any of them, or ``NAME.csv``, names the set:

``NAME_points.csv``       point, x, y, z: a line each, labels as you like. Where sensors sit on slanted faces, their
                          own axes: turn_z, turn_y, turn_x, angles in degrees by which they are turned about z, then
                          about the turned y, then about the turned x; or two of the axes as vectors: x_axis_x,
                          x_axis_y, x_axis_z, y_axis_x, y_axis_y, y_axis_z (z follows, right-handed)
``NAME_lines.csv``        from, to: labels of points that a trace line joins (the file may be missing)
``NAME_shapes.csv``       mode, point, direction and a value: a line for each mode and channel. The direction is a
                          signed axis (+X, -z, y), or three columns dx, dy, dz of unit length, both in the point's own
                          axes where it has some. The value is one column value; or re, im; or amplitude, phase_deg
``NAME_frequencies.csv``  mode, freq_hz and perhaps damping: ratios, 0.01 is one percent, blank where unknown

Modes are numbered 1, 2, 3 …; every mode has every channel. The first line of each file names the columns, in any
order. Fields are parted by comma, semicolon, tab or bar; numbers have a point, or a comma where the comma does not
part fields. The unit of length of the points is not in the files: it is declared where they are named.
"""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np

from viewer.jobs import SILENT, Progress
from viewer.loaders.raw_tests import LARGEST, LARGEST_COORDINATE, RawTest
from viewer.loaders.text_table import Table
from viewer.model.arrays import Array
from viewer.model.testset import direction_words

_TABLES = ("_points", "_lines", "_shapes", "_frequencies")
_TURNS = ("turn_z", "turn_y", "turn_x")
_AXES = ("x_axis_x", "x_axis_y", "x_axis_z", "y_axis_x", "y_axis_y", "y_axis_z")
COMPONENTS = ("dx", "dy", "dz")
VALUES = (("value",), ("re", "im"), ("amplitude", "phase_deg"))
_UNIT, _SQUARE = 0.01, 0.01  # directions written with two digits are still meant to be of unit length
_PARALLEL = 1 - 1e-6


def _stem(path: Path) -> str:
    return next((path.stem.removesuffix(end) for end in _TABLES if path.stem.endswith(end)), path.stem)


def table_path(path: Path, tail: str) -> Path:
    """``NAME_points.csv`` and so on for any of the set's names."""
    return path.with_name(f"{_stem(path)}{tail}.csv")


def set_exists(path: Path) -> bool:
    """Whether tables of a test exist under this name."""
    return table_path(path, "_points").is_file()


def read_runs(path: Path, progress: Progress = SILENT) -> list[RawTest]:
    """The one run of a set of tables. Raises ``LoadError``."""
    points = Table(table_path(path, "_points"))
    points.need("point", "x", "y", "z")
    rows = _labels(points)
    places = _finite(points, ("x", "y", "z"), LARGEST_COORDINATE, "a coordinate")
    axes = _local_axes(points)
    lines = _lines(table_path(path, "_lines"), rows)
    progress.tick("reading shapes")
    shapes = Table(table_path(path, "_shapes"))
    shapes.need("mode", "point")
    if not len(shapes):
        raise shapes.error("holds no mode", shapes.header_line, expected="a line for each mode and channel")
    mode = shapes.integers("mode")
    count = shapes.count_of_modes(mode)
    sensor = _known_rows(shapes, "point", rows)
    directions = _directions(shapes)
    channel, first = _channels(shapes, mode, sensor, directions, count)
    values = _values(shapes)
    shape = np.zeros((count, len(first)), values.dtype)
    shape[mode - 1, channel] = values * np.sign((directions * directions[first][channel]).sum(axis=1))
    still = ~shape.any(axis=1)
    if still.any():
        number = int(np.argmax(still)) + 1
        raise shapes.error(f"mode {number} does not move at all", shapes.line_numbers[int(np.argmax(mode == number))])
    freq, damping = _frequencies(table_path(path, "_frequencies"), shapes, mode, count)
    # rows of the axes are their unit vectors: a direction in them becomes one of the test
    turned = np.einsum("ci,cij->cj", directions[first], axes[sensor[first]])
    turned /= np.linalg.norm(turned, axis=1, keepdims=True)
    remarks = ["sensors have axes of their own, which were applied"] if not _plain(axes) else []
    return [
        RawTest(list(rows), places, lines, sensor[first], turned, freq, shape, damping, None, remarks, _stem(path))
    ]


def _labels(table: Table) -> dict[str, int]:
    """Row of each label."""
    if not len(table):
        raise table.error("holds no point", table.header_line, expected="a line for each point")
    rows: dict[str, int] = {}
    for row, label in enumerate(table.columns["point"]):
        if not label:
            raise table.error("a point has no label", table.line_numbers[row])
        if label in rows:
            raise table.error(
                f"point {label} is given twice",
                table.line_numbers[row],
                found=f"also in line {table.line_numbers[rows[label]]}",
                expected="each label once",
            )
        rows[label] = row
    return rows


def _finite(table: Table, names: Sequence[str], largest: float, what: str) -> Array:
    """(rows, names) numbers that are numbers."""
    values = np.column_stack([table.numbers(name) for name in names])
    with np.errstate(invalid="ignore"):
        wrong = ~(np.abs(values) <= largest)
    if wrong.any():
        row, column = np.argwhere(wrong)[0]
        finite = np.isfinite(values[row, column])
        raise table.error(
            f"{what} is {'beyond reason' if finite else 'not finite'}",
            table.line_numbers[row],
            found=f"{names[column]} = {table.columns[names[column]][row]}",
            expected=f"at most {largest:g}" if finite else "a number",
        )
    return values


def _known_rows(table: Table, name: str, rows: dict[str, int]) -> Array:
    found = np.empty(len(table), np.int64)
    for row, label in enumerate(table.columns[name]):
        if label not in rows:
            some = ", ".join(list(rows)[:5]) + (" …" if len(rows) > 5 else "")
            raise table.error(
                f"there is no point '{label}'", table.line_numbers[row], expected=f"a label of the points: {some}"
            )
        found[row] = rows[label]
    return found


def _local_axes(table: Table) -> Array:
    """(points, 3, 3) unit vectors of each point's own axes, one a row."""
    by_turns = [name for name in _TURNS if name in table.columns]
    by_axes = [name for name in _AXES if name in table.columns]
    if by_turns and by_axes:
        raise table.error(
            "axes of sensors are given in two ways",
            table.header_line,
            found=f"{by_turns[0]} and {by_axes[0]}",
            expected=f"either {', '.join(_TURNS)} or {', '.join(_AXES)}",
        )
    if by_turns:
        table.need(*_TURNS)
        z, y, x = np.radians(_finite(table, _TURNS, 1e6, "an angle")).T
        return _about(0, x) @ _about(1, y) @ _about(2, z)
    if not by_axes:
        return np.broadcast_to(np.eye(3), (len(table), 3, 3))
    table.need(*_AXES)
    given = _finite(table, _AXES, LARGEST_COORDINATE, "an axis").reshape(-1, 2, 3)
    size = np.linalg.norm(given, axis=2)
    wrong = (np.abs(size - 1) > _UNIT).any(axis=1) | (np.abs((given[:, 0] * given[:, 1]).sum(axis=1)) > _SQUARE)
    if wrong.any():
        row = int(np.argmax(wrong))
        raise table.error(
            "the axes of a point are not of unit length and at right angles",
            table.line_numbers[row],
            found=" and ".join(str(tuple(axis)) for axis in given[row].tolist()),
        )
    x = given[:, 0] / size[:, :1]
    z = np.cross(x, given[:, 1])
    z /= np.linalg.norm(z, axis=1, keepdims=True)
    return np.stack([x, np.cross(z, x), z], axis=1)


def _about(axis: int, angle: Array) -> Array:
    """(n, 3, 3) rows: axes turned by ``angle`` (n,) about the axis of that number."""
    out = np.zeros((len(angle), 3, 3))
    j, k = (axis + 1) % 3, (axis + 2) % 3
    out[:, axis, axis] = 1
    out[:, j, j] = out[:, k, k] = np.cos(angle)
    out[:, j, k], out[:, k, j] = np.sin(angle), -np.sin(angle)
    return out


def _plain(axes: Array) -> bool:
    return bool(np.allclose(axes, np.eye(3)))


def _lines(path: Path, rows: dict[str, int]) -> Array:
    if not path.is_file():
        return np.empty((0, 2), np.int64)
    table = Table(path)
    table.need("from", "to")
    ends = np.column_stack([_known_rows(table, name, rows) for name in ("from", "to")])
    same = ends[:, 0] == ends[:, 1]
    if same.any():
        row = int(np.argmax(same))
        raise table.error(
            "a trace line joins a point with itself",
            table.line_numbers[row],
            found=f"point {table.columns['from'][row]}",
            expected="two points",
        )
    return ends


def _directions(table: Table) -> Array:
    """(rows, 3) unit vectors, in the point's own axes."""
    by_vector = [name for name in COMPONENTS if name in table.columns]
    if "direction" in table.columns:
        if by_vector:
            raise table.error(
                "directions are given in two ways",
                table.header_line,
                found=f"direction and {by_vector[0]}",
                expected="either direction, or dx, dy, dz",
            )
        return _signed_axes(table)
    table.need(*(COMPONENTS if by_vector else ("direction",)))
    vectors = _finite(table, COMPONENTS, LARGEST, "a direction")
    size = np.linalg.norm(vectors, axis=1)
    wrong = np.abs(size - 1) > _UNIT
    if wrong.any():
        row = int(np.argmax(wrong))
        raise table.error(
            "a direction has no length" if size[row] == 0 else "a direction is not of unit length",
            table.line_numbers[row],
            found=f"{tuple(vectors[row].tolist())}, length {size[row]:.4g}",
            expected="length 1",
        )
    return vectors / size[:, None]


def _signed_axes(table: Table) -> Array:
    out = np.zeros((len(table), 3))
    for row, text in enumerate(table.columns["direction"]):
        word = text.lower().replace("−", "-")
        axis = word.lstrip("+-")
        if axis not in ("x", "y", "z") or len(word) - len(axis) > 1:
            raise table.error(
                "is no direction", table.line_numbers[row], found=repr(text[:40]), expected="a signed axis: +X, -Z, y"
            )
        out[row, "xyz".index(axis)] = -1.0 if word.startswith("-") else 1.0
    return out


def _channels(table: Table, mode: Array, sensor: Array, directions: Array, count: int) -> tuple[Array, Array]:
    """(rows,) channel of each row of the table, and (channels,) the row in which each first stands.

    A channel is a point and a direction, either way round: its first row says which way counts.
    """
    channel = np.empty(len(table), np.int64)
    first: list[int] = []
    of_point: dict[int, list[int]] = {}
    seen: dict[tuple[int, int], int] = {}
    for row in range(len(table)):
        known = of_point.setdefault(int(sensor[row]), [])
        for number in known:
            if abs(float(directions[row] @ directions[first[number]])) > _PARALLEL:
                break
        else:
            number = len(first)
            known.append(number)
            first.append(row)
        before = seen.setdefault((int(mode[row]), number), row)
        if before != row:
            raise table.error(
                f"a channel is given twice in mode {mode[row]}",
                table.line_numbers[row],
                found=f"{_channel_words(table, directions, row)}, also in line {table.line_numbers[before]}",
                expected="each channel once, in one direction",
            )
        channel[row] = number
    there = np.zeros((count, len(first)), bool)
    there[mode - 1, channel] = True
    if not there.all():
        missing, number = np.argwhere(~there)[0]
        row = first[number]
        raise table.error(
            f"a channel has no value in mode {missing + 1}",
            table.line_numbers[row],
            found=f"{_channel_words(table, directions, row)} which mode {mode[row]} has",
            expected="every channel in every mode",
        )
    return channel, np.array(first, np.int64)


def _channel_words(table: Table, directions: Array, row: int) -> str:
    return f"point {table.columns['point'][row]}, {direction_words(directions[row])}"


def _values(table: Table) -> Array:
    """(rows,) float64, or complex128."""
    given = [names for names in VALUES if any(name in table.columns for name in names)]
    if len(given) > 1:
        raise table.error(
            "values are given in two ways",
            table.header_line,
            found=" and ".join(", ".join(name for name in names if name in table.columns) for names in given),
            expected=_ways(),
        )
    if not given:
        raise table.error(
            "column 'value' is missing", table.header_line, found=", ".join(table.columns), expected=_ways()
        )
    names = given[0]
    table.need(*names)
    values = _finite(table, names, LARGEST, "a value")
    if names == ("value",):
        return values[:, 0]
    if names == ("re", "im"):
        return values[:, 0] + 1j * values[:, 1]
    if (values[:, 0] < 0).any():
        row = int(np.argmax(values[:, 0] < 0))
        raise table.error(
            "an amplitude is below zero",
            table.line_numbers[row],
            found=table.columns["amplitude"][row],
            expected="zero or more; the phase says which way it moves",
        )
    return values[:, 0] * _phasor(values[:, 1])


def _ways() -> str:
    return "one of: " + "; ".join(", ".join(names) for names in VALUES)


def _phasor(degrees: Array) -> Array:
    """exp(i·phase), exactly ±1 and ±i at whole quarter turns, so that real shapes stay real."""
    quarters = np.mod(degrees, 360.0) / 90.0
    exact = np.array([1, 1j, -1, -1j])[np.mod(np.round(quarters), 4).astype(int)]
    return np.where(quarters == np.round(quarters), exact, np.exp(1j * np.radians(degrees)))


def _frequencies(path: Path, shapes: Table, mode: Array, count: int) -> tuple[Array, Array | None]:
    table = Table(path)
    table.need("mode", "freq_hz")
    listed = table.integers("mode")
    rows = np.full(count, -1)
    for row, (number, line) in enumerate(zip(listed.tolist(), table.line_numbers, strict=True)):
        if not 1 <= number <= count:
            raise table.error(
                f"mode {number} has no shape", line, expected=f"modes 1 to {count}, as in {shapes.path.name}"
            )
        if rows[number - 1] >= 0:
            raise table.error(f"mode {number} is given twice", line, expected="a line for each mode")
        rows[number - 1] = row
    if (rows < 0).any():
        number = int(np.argmax(rows < 0)) + 1
        raise shapes.error(
            f"mode {number} has no frequency",
            shapes.line_numbers[int(np.argmax(mode == number))],
            expected=f"a line for it in {path.name}",
        )
    freq = _finite(table, ("freq_hz",), 1e12, "a frequency")[:, 0]
    if (freq <= 0).any():
        row = int(np.argmax(freq <= 0))
        raise table.error(
            "a frequency is not above zero",
            table.line_numbers[row],
            found=table.columns["freq_hz"][row],
            expected="Hz",
        )
    return freq[rows], _damping(table)[rows] if "damping" in table.columns else None


def _damping(table: Table) -> Array:
    """(rows,) ratios, NaN where blank."""
    out = np.full(len(table), np.nan)
    known = np.array([row for row, text in enumerate(table.columns["damping"]) if text], np.int64)
    if len(known):
        part = table.part(known)
        out[known] = _finite(part, ("damping",), LARGEST, "damping")[:, 0]
        high = np.abs(out[known]) >= 1
        if high.any():
            row = int(np.argmax(high))
            raise part.error(
                "damping is not below 1",
                part.line_numbers[row],
                found=part.columns["damping"][row],
                expected="a ratio: 0.01 is one percent",
            )
    return out
