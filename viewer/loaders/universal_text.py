"""The text of a universal file: data sets between delimiters, records of fixed columns, Fortran's numbers.

A data set opens with a line ``    -1``, names its number on the next one and closes with ``    -1``. Binary ones
("58b") say on that line how many lines and bytes follow.

Fields are cut at the columns of the published formats, so that touching numbers part correctly. A line that holds
exactly as many words as its record has fields is parted at its blanks instead: for files in the right columns this
is the same, and files of scripts that mind no columns are read as well.
"""

from __future__ import annotations

import mmap
import re
from collections.abc import Iterator, Sequence
from contextlib import contextmanager, suppress
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from viewer.errors import LoadError
from viewer.model.arrays import Array

_LARGEST_FILE = 4_000_000_000
_DELIMITER = re.compile(rb"^ {0,4}-1[ \t]*\r?$", re.M)
_NUMBER_LINE = re.compile(rb"\r?\n?[ \t]*(\d+)(b)?([ \t\d]*)\r?\n")
_BINARY_CLOSING = re.compile(rb"[\r\n]{0,2} {4}-1[ \t]*(?=\r?(?:\n\s*-1[ \t]*\r?\n|\s*\Z))")
_NO_EXPONENT_LETTER = re.compile(rb"([+-]?[\d.]+)([+-]\d+)")  # 1.00000-101: Fortran drops the letter at three digits


@dataclass(frozen=True)
class DataSet:
    """One data set: its number, the line of the file at which its records start, and their bytes."""

    number: int
    line: int
    data: bytes | None  # None: binary, or not asked for


@contextmanager
def opened(path: Path) -> Iterator[mmap.mmap]:
    """The bytes of the file."""
    if path.stat().st_size > _LARGEST_FILE:
        raise LoadError("is too large for text", file=path, do="use .vtu, .npz or .h5")
    with path.open("rb") as stream, mmap.mmap(stream.fileno(), 0, access=mmap.ACCESS_READ) as data:
        yield data


def data_sets(data: mmap.mmap, path: Path, wanted: frozenset[int]) -> Iterator[DataSet]:
    """Every data set in the order of the file; bytes of the ``wanted`` ones only. Raises ``LoadError``."""
    at, line = 0, 1
    while True:
        opening = _DELIMITER.search(data, at)
        between = data[at : opening.start() if opening else len(data)]
        if between.strip():
            raise LoadError(
                "text stands outside of data sets",
                file=path,
                place=f"line {line + _first_word_line(between)}",
                found=repr(between.strip()[:40].decode("latin-1")),
                expected="a line of -1 in columns 5 and 6 before and after every data set",
                do="the file is damaged or no universal file",
            )
        if opening is None:
            return
        line += between.count(b"\n")
        head = _NUMBER_LINE.match(data, opening.end())
        if head is None:
            raise LoadError(
                "a data set has no number",
                file=path,
                place=f"line {line + 1}",
                found=repr(data[opening.end() : opening.end() + 40].strip().decode("latin-1")),
                expected="the number of a data set after the line of -1",
            )
        number, start = int(head[1][:9]), head.end()
        binary = head[2] is not None
        closing = _closing(data, _binary_data(data, path, head, line + 1) if binary else start, binary)
        if closing is None:
            raise LoadError(
                f"data set {number} does not end",
                file=path,
                place=f"line {line + 1}",
                found="the end of the file",
                expected="a line of -1",
                do="the file is cut short: write it again",
            )
        take = number in wanted and not binary
        yield DataSet(number, line + 2, data[start : closing[0]] if take else None)
        line += data[opening.start() : closing[1]].count(b"\n")
        at = closing[1]


def _closing(data: mmap.mmap, start: int, binary: bool) -> tuple[int, int] | None:
    """Where the closing delimiter stands. Behind binary bytes it follows without a line end; when it is not where
    the announced size puts it, it is the first one that an opening delimiter or the end of the file follows."""
    if not binary:
        match = _DELIMITER.search(data, start)
    else:
        match = _BINARY_CLOSING.match(data, start) or _BINARY_CLOSING.search(data, start)
    return None if match is None else match.span()


def _binary_data(data: mmap.mmap, path: Path, head: re.Match[bytes], line: int) -> int:
    """Behind the lines and bytes that the head of a binary data set announces; behind its lines only when the
    closing delimiter is not there: one library announces half of what it writes."""
    parts = head[3].split()
    at = head.end()
    if len(parts) >= 4:
        for _ in range(min(int(parts[2]), 100)):
            at = data.find(b"\n", at) + 1 or len(data) + 1
        behind = at + int(parts[3])
        if behind <= len(data):
            return behind if _BINARY_CLOSING.match(data, behind) else at
    raise LoadError(
        f"binary data set {head[1].decode()} does not fit the file",
        file=path,
        place=f"line {line}",
        found=repr(head[0].strip().decode("latin-1")),
        expected="the number of lines and bytes that follow",
        do="the file is cut short or was sent as text: write it again",
    )


def _first_word_line(text: bytes) -> int:
    """Line ends before the first word."""
    return text[: len(text) - len(text.lstrip())].count(b"\n")


class Records:
    """The lines of one data set, taken from the top; every error names the line of the file."""

    def __init__(self, path: Path, source: DataSet) -> None:
        self.path, self.number, self.first = path, source.number, source.line
        text = source.data or b""
        self.lines = text.split(b"\n")
        if not self.lines[-1].strip():
            self.lines.pop()
        self.at = 0

    def __bool__(self) -> bool:
        return self.at < len(self.lines)

    @property
    def left(self) -> int:
        return len(self.lines) - self.at

    def error(self, problem: str, at: int | None = None, **parts: str) -> LoadError:
        """An error at row ``at`` of ``lines``, by default the one taken last."""
        row = max(self.at - 1, 0) if at is None else at
        return LoadError(problem, file=self.path, place=f"line {self.first + row} (data set {self.number})", **parts)

    def take(self, count: int, what: str) -> range:
        """The rows of the next ``count`` lines."""
        if not 0 <= count <= self.left:
            raise self.error(
                f"the data set ends inside {what}",
                found=f"{self.left} lines",
                expected=str(count),
                do="the file is damaged: write it again",
            )
        self.at += count
        return range(self.at - count, self.at)

    def text(self, what: str) -> str:
        """One line of words."""
        return self.lines[self.take(1, what)[0]].decode("latin-1").strip()

    def whole(self, widths: Sequence[int], what: str) -> list[int]:
        """One line of whole numbers."""
        return self._line(self.take(1, what)[0], widths, _whole)

    def wholes(self, count: int, what: str) -> list[int]:
        """``count`` whole numbers, 8I10."""
        return self._run(count, 8, 10, what, _whole)

    def reals(self, count: int, what: str, per_line: int = 6, width: int = 13) -> list[float]:
        """``count`` real numbers, 6E13.5 unless said otherwise."""
        return self._run(count, per_line, width, what, _real)

    def _run(self, count: int, per_line: int, width: int, what: str, read) -> list:
        values: list = []
        for row in self.take(max(1, -(-count // per_line)), what):
            some = min(per_line, count - len(values))
            values += self._line(row, (width,) * some, read) if some else []
        return values

    def _line(self, row: int, widths: Sequence[int], read) -> list:
        try:
            return [read(word) for word in fields(self.lines[row], widths)]
        except ValueError:
            raise self._bad_field(range(row, row + 1), widths, slice(None), read) from None

    def integers(self, rows: range, widths: Sequence[int], part: slice = slice(None)) -> Array:
        """(rows, fields) int64 of the fields in ``part``."""
        return self._table(rows, widths, part, _whole, np.int64)

    def numbers(self, rows: range, widths: Sequence[int], part: slice = slice(None)) -> Array:
        """(rows, fields) float64 of the fields in ``part``."""
        return self._table(rows, widths, part, _real, np.float64)

    def values(self, rows: Sequence[range], count: int, per_line: int = 6, width: int = 13) -> Array:
        """(entries, count) float64 where ``rows[i]`` is line i of every entry."""
        parts, left = [], count
        for line in rows:
            some = min(per_line, left)
            parts.append(self.numbers(line, (width,) * some))
            left -= some
        return np.hstack(parts)

    def _table(self, rows: range, widths: Sequence[int], part: slice, read, dtype: type) -> Array:
        lines, shape = self.lines, (len(rows), len(range(len(widths))[part]))
        text = b"\n".join(lines[rows.start : rows.stop : rows.step]).replace(b"D", b"E")
        words = [line.split() for line in text.split(b"\n")] if rows else []
        if b"_" not in text and all(len(line) == len(widths) for line in words):
            with suppress(ValueError, OverflowError):  # the quick way, which most files allow
                plain = int if read is _whole else float
                return np.array([plain(word) for line in words for word in line[part]], dtype).reshape(shape)
        try:
            return np.array([read(word) for row in rows for word in fields(lines[row], widths)[part]], dtype).reshape(
                shape
            )
        except ValueError:
            raise self._bad_field(rows, widths, part, read) from None

    def _bad_field(self, rows: range, widths: Sequence[int], part: slice, read) -> LoadError:
        kind = "whole number" if read is _whole else "number"
        for row in rows:
            words = fields(self.lines[row], widths)
            for place in range(len(widths))[part]:
                try:
                    read(words[place])
                except ValueError:
                    columns = "/".join(str(width) for width in dict.fromkeys(widths))
                    return self.error(
                        f"field {place + 1} holds no {kind}",
                        row,
                        found=repr(words[place][:40].decode("latin-1")),
                        expected=f"{len(widths)} fields, {columns} columns each",
                        do="a number did not fit its columns when it was written" if b"*" in words[place] else "",
                    )
        return self.error("holds no numbers where they are expected", rows.start)


def fields(line: bytes, widths: Sequence[int]) -> list[bytes]:
    """The fields of a line; blank ones are zero, as in Fortran."""
    words = line.split()
    if len(words) == len(widths):
        return words
    cut, start = [], 0
    for width in widths:
        cut.append(line[start : start + width].strip() or b"0")
        start += width
    return cut


def _whole(word: bytes) -> int:
    value = int(word)
    if b"_" in word or not -(2**63) <= value < 2**63:  # Python's digit groups, and numbers without end
        raise ValueError(word)
    return value


def _real(word: bytes) -> float:
    if b"_" in word:  # Python's digit groups
        raise ValueError(word)
    try:
        return float(word)
    except ValueError:
        word = word.upper().replace(b"D", b"E")
        bare = _NO_EXPONENT_LETTER.fullmatch(word)
        return float(bare[1] + b"E" + bare[2] if bare else word)
