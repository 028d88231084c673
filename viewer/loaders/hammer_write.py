"""Test sets written as tables (:mod:`hammer_tables`) and as universal files (:mod:`hammer_universal`)."""

from __future__ import annotations

import csv
import os
from collections.abc import Iterable, Iterator, Sequence
from contextlib import ExitStack
from pathlib import Path

import numpy as np

from viewer.errors import LoadError
from viewer.jobs import atomic_path
from viewer.loaders.hammer_tables import COMPONENTS, VALUES, table_path
from viewer.loaders.universal_write import (
    LARGEST_LABEL,
    in_lines,
    long_line,
    mode_lines,
    put_data_set,
    unit_lines,
    whole_line,
)
from viewer.model.arrays import Array
from viewer.model.testset import TestSet

_EXACT = 1e-12  # a direction that is written as the word of an axis loses nothing
_SQUARE = 1e-6
_FIRST_FRAME = 11


def write_tables(path: Path, test: TestSet, length_unit: float) -> None:
    """The four tables; comma and decimal point. All or none."""
    by_word = bool((np.abs(test.directions).max(axis=1) > 1 - _EXACT).all())
    damping = [] if test.damping is None else [["" if np.isnan(d) else d] for d in test.damping.tolist()]
    labels = test.labels

    def shape_rows() -> Iterator[list]:
        ends = [[_word(d)] if by_word else d.tolist() for d in test.directions]
        for mode, shape in enumerate(test.shapes, 1):
            for point, direction, value in zip(test.sensor.tolist(), ends, shape.tolist(), strict=True):
                yield [mode, labels[point], *direction, *([value.real, value.imag] if test.is_complex else [value])]

    places = (test.points / length_unit).tolist()
    header = ["direction"] if by_word else list(COMPONENTS)
    tables: dict[str, tuple[Sequence[str], Iterable[list]]] = {
        "_points": (["point", "x", "y", "z"], ([a, *place] for a, place in zip(labels, places, strict=True))),
        "_lines": (["from", "to"], ([labels[a], labels[b]] for a, b in test.lines.tolist())),
        "_shapes": (["mode", "point", *header, *VALUES[test.is_complex]], shape_rows()),
        "_frequencies": (
            ["mode", "freq_hz", *(["damping"] if damping else [])],
            ([i + 1, freq, *(damping[i] if damping else [])] for i, freq in enumerate(test.freq_hz.tolist())),
        ),
    }
    with ExitStack() as stack:
        for tail, (names, rows) in tables.items():
            part = stack.enter_context(atomic_path(table_path(path, tail)))
            stream = stack.enter_context(part.open("w", encoding="utf-8", newline=""))
            writer = csv.writer(stream, lineterminator="\n")
            writer.writerow(names)
            writer.writerows(rows)


def _word(direction: Array) -> str:
    axis = int(np.abs(direction).argmax())
    return ("+" if direction[axis] > 0 else "-") + "XYZ"[axis]


def write_universal(path: Path, test: TestSet, length_unit: float) -> None:
    """Units, coordinate systems, points, trace lines and modes: data sets 164, 2420, 2411, 82, 55. Shapes keep six
    digits. Signs of directions go into the values: −Z becomes Z. A channel that is zero in every mode is lost, for
    directions that were not measured are written as zeros."""
    labels = _numbers(path, test.labels)
    axes = np.array([_axes(path, test, point) for point in range(len(labels))])
    values = np.zeros((test.count, len(labels), 3), test.shapes.dtype)
    along = np.einsum("cij,cj->ci", axes[test.sensor], test.directions)  # one is ±1, the others 0
    np.add.at(values.transpose(1, 0, 2), test.sensor, (test.shapes[:, :, None] * np.round(along)).transpose(1, 0, 2))
    kinds, systems = np.unique(np.round(axes, 12).reshape(-1, 9), axis=0, return_inverse=True)
    plain = [bool((kind.reshape(3, 3) == np.eye(3)).all()) for kind in kinds]
    numbers = [1 if flat else _FIRST_FRAME + i for i, flat in enumerate(plain)]
    measured = np.unique(test.sensor)
    with atomic_path(path) as part, part.open("w", encoding="latin-1", errors="replace", newline="\n") as stream:
        put_data_set(stream, 164, unit_lines(length_unit))
        if not all(plain):
            put_data_set(stream, 2420, _frames(numbers, kinds))
        put_data_set(stream, 2411, _nodes(labels, test.points / length_unit, [numbers[i] for i in systems.ravel()]))
        if len(test.lines):
            traced = [label for a, b in test.lines.tolist() for label in (int(labels[a]), int(labels[b]), 0)]
            lines = [whole_line([1, len(traced), 1]), "trace lines", *in_lines(traced, 8, whole_line)]
            put_data_set(stream, 82, lines)
        for mode in range(test.count):
            ratio = 0.0 if test.damping is None else float(np.nan_to_num(test.damping[mode]))
            freq = float(test.freq_hz[mode])
            put_data_set(stream, 55, mode_lines(mode + 1, labels[measured], values[mode, measured], freq, ratio))


def _numbers(path: Path, labels: Sequence[str]) -> Array:
    for label in labels:
        if not (label.isascii() and label.isdigit() and 0 < int(label) < LARGEST_LABEL and str(int(label)) == label):
            raise LoadError(
                "labels of points do not fit a universal file",
                file=path,
                found=repr(label),
                expected=f"whole numbers from 1 to {LARGEST_LABEL - 1}",
                do="write .csv, or number the points",
            )
    return np.array([int(label) for label in labels], np.int64)


def _axes(path: Path, test: TestSet, point: int) -> Array:
    """(3, 3) axes, one a row, along which all channels of ``point`` measure: those of the test where they do."""
    given = test.directions[test.channels_of(point)]
    if (np.abs(given).max(axis=1, initial=0.0) > 1 - _EXACT).all() and len(given) == len(
        set(np.abs(given).argmax(axis=1).tolist())
    ):
        return np.eye(3)
    if len(given) > 3 or np.abs(given @ given.T - np.eye(len(given))).max() > _SQUARE:
        raise LoadError(
            f"the channels of point {test.labels[point]} do not fit a universal file",
            file=path,
            found=", ".join(test.channel_words(channel) for channel in test.channels_of(point)),
            expected="at most three directions at right angles",
            do="write .csv",
        )
    frame = np.linalg.qr(np.vstack([given, np.eye(3)]).T)[0].T  # directions first, then what completes them
    frame[: len(given)] = given
    frame[2] *= np.sign(np.linalg.det(frame))
    return frame


def _frames(numbers: Sequence[int], kinds: Array) -> Iterator[str]:
    yield f"{1:10d}"
    yield "test"
    for number, kind in zip(numbers, kinds, strict=True):
        if number >= _FIRST_FRAME:
            yield whole_line([number, 0, 8])
            yield f"sensor axes {number}"
            yield from (long_line(row) for row in [*kind.reshape(3, 3).tolist(), [0.0, 0.0, 0.0]])


def _nodes(labels: Array, points: Array, systems: Sequence[int]) -> Iterator[str]:
    for label, point, system in zip(labels.tolist(), points.tolist(), systems, strict=True):
        yield whole_line([label, 1, system, 11])
        yield long_line(point)


def write_test(path: str | os.PathLike[str], test: TestSet, length_unit: float = 1.0) -> Path:
    """Write a test set as .csv (a set of tables) or as .unv, points in units of ``length_unit`` metres; atomic.

    Returns the path. Raises ``LoadError`` when the format has no place for what is in the set.
    """
    target = Path(path)
    if not 0 < length_unit < np.inf:
        raise ValueError("length_unit must be above zero")
    match target.suffix.lower():
        case ".csv":
            write_tables(target, test, length_unit)
        case ".unv" | ".uff":
            write_universal(target, test, length_unit)
        case other:
            raise LoadError(
                "cannot be written in this format",
                file=target,
                found=other or "no suffix",
                expected=".csv, .unv, .uff",
            )
    return target
