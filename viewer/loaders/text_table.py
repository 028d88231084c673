"""One table of text: delimiter and decimal mark found from the whole, errors with line numbers."""

from __future__ import annotations

import copy
import csv
import io
import re
from pathlib import Path

import numpy as np

from viewer.errors import LoadError
from viewer.loaders.array_names import GROUP, group_name
from viewer.model.arrays import Array

_DELIMITERS = (";", "\t", "|", ",")
_LARGEST_FILE = 2_000_000_000
_WORDS = ("kind", "point", "from", "to", "direction")  # columns in which a mark is no decimal mark


class Table:
    """A table in memory: columns of text by lower-case name; numbers on demand, errors with line numbers."""

    def __init__(self, path: Path) -> None:
        self.path = path
        text = self._text()
        first = next((line for line in io.StringIO(text) if line.strip()), None)
        if first is None:
            raise LoadError("is empty", file=path)
        self.delimiter = max(_DELIMITERS, key=lambda mark: (first.count(mark), mark == ","))
        self.line_numbers: list[int] = []
        rows: list[list[str]] = []
        reader = csv.reader(io.StringIO(text, newline=""), delimiter=self.delimiter, strict=True)
        try:
            for row in reader:
                if any(field.strip() for field in row):
                    rows.append(row)
                    self.line_numbers.append(reader.line_num)
        except csv.Error as error:
            raise self.error("cannot be taken apart", reader.line_num, found=str(error)) from None
        if not rows:
            raise self.error("holds nothing but marks between fields", found=repr(first.strip()[:40]))
        names = [name.strip() if name.strip().startswith(GROUP) else name.strip().lower() for name in rows[0]]
        twice = next((name for i, name in enumerate(names) if name in names[:i]), None)
        if twice is not None:
            raise self.error(f"two columns are called '{twice}'", self.line_numbers[0])
        self.header_line = self.line_numbers.pop(0)
        for row, line in zip(rows[1:], self.line_numbers, strict=True):
            if len(row) != len(names):
                raise self.error(
                    "wrong number of fields",
                    line,
                    found=str(len(row)),
                    expected=f"{len(names)}, as in the first line",
                    do="if numbers have a decimal comma, part the fields by semicolons"
                    if self.delimiter == ","
                    else "",
                )
        self.columns = {name: [row[i].strip() for row in rows[1:]] for i, name in enumerate(names) if name}
        self._decimal_comma: bool | None = None

    def __len__(self) -> int:
        return len(self.line_numbers)

    def error(self, problem: str, line: int | None = None, **parts: str) -> LoadError:
        return LoadError(problem, file=self.path, place="" if line is None else f"line {line}", **parts)

    def need(self, *names: str) -> None:
        for name in names:
            if name not in self.columns:
                raise self.error(
                    f"column '{name}' is missing",
                    self.header_line,
                    found=", ".join(self.columns) or "no columns",
                    expected=", ".join(names),
                )

    def numbers(self, name: str) -> Array:
        """(rows,) float64 of one column."""
        texts = self.columns[name]
        if self.decimal_comma:
            texts = [text.replace(",", ".") for text in texts]
        try:
            return np.array([_number(text) for text in texts], np.float64)
        except ValueError:
            for row, text in enumerate(texts):
                try:
                    _number(text)
                except ValueError:
                    raise self.error(
                        f"column '{name}' holds no number",
                        self.line_numbers[row],
                        found=repr(self.columns[name][row][:40]),
                    ) from None
            raise

    def integers(self, name: str) -> Array:
        """(rows,) int64 of one column; "12.0" is allowed, spreadsheets write it."""
        try:
            return np.array([int(_plain(text)) for text in self.columns[name]], np.int64)
        except (ValueError, OverflowError):
            values = self.numbers(name)
            wrong = ~(np.abs(values) < 2**53) | (values != np.round(values))
            if wrong.any():
                row = int(np.argmax(wrong))
                raise self.error(
                    f"column '{name}' holds no whole number",
                    self.line_numbers[row],
                    found=repr(self.columns[name][row][:40]),
                ) from None
            return values.astype(np.int64)

    def count_of_modes(self, mode: Array) -> int:
        """Number of modes in the column ``mode``, which must number them 1, 2, 3 …"""
        numbers = np.unique(mode)
        wrong = numbers != np.arange(1, len(numbers) + 1)
        if wrong.any():
            number = numbers[np.argmax(wrong)]
            raise self.error(
                "modes are not numbered 1, 2, 3 …",
                self.line_numbers[int(np.argmax(mode == number))],
                found=f"mode {number}",
                expected=f"mode {int(np.argmax(wrong)) + 1}",
            )
        return len(numbers)

    @property
    def decimal_comma(self) -> bool:
        """Whether numbers have a decimal comma, from all fields together."""
        if self._decimal_comma is None:
            self._decimal_comma = self._found_comma()
        return self._decimal_comma

    def _found_comma(self) -> bool:
        number = re.compile(r"[+-]?[\d.,]+([eE][+-]?\d+)?")
        comma = point = None
        for name, texts in self.columns.items():
            if name in _WORDS:
                continue
            for text, line in zip(texts, self.line_numbers, strict=True):
                if ("," in text or "." in text) and number.fullmatch(text):
                    if "," in text and ("." in text or text.count(",") > 1):
                        raise self.error(
                            "a number has marks between thousands",
                            line,
                            found=repr(text[:40]),
                            expected="one decimal mark and nothing else",
                        )
                    if "," in text:
                        comma = line
                    else:
                        point = line
        if comma is not None and point is not None:
            raise self.error(
                "decimal points and decimal commas are mixed",
                comma,
                found=f"a comma here, a point in line {point}",
                expected="one of them throughout",
            )
        return comma is not None

    def part(self, rows: Array) -> Table:
        """The same table with these rows only."""
        part = copy.copy(self)
        part._decimal_comma = self.decimal_comma
        part.line_numbers = [self.line_numbers[i] for i in rows]
        part.columns = {name: [texts[i] for i in rows] for name, texts in self.columns.items()}
        return part

    def groups(self) -> dict[str, Array]:
        """Rows of each group_ column's members."""
        return {group_name(name): np.nonzero(self.numbers(name))[0] for name in self.columns if group_name(name)}

    def _text(self) -> str:
        if not self.path.is_file():
            raise LoadError(
                "there is no such table", file=self.path, do="write it, or name the file that has the data"
            )
        if self.path.stat().st_size > _LARGEST_FILE:
            raise LoadError("is too large for a table", file=self.path, do="use .vtu, .npz or .h5")
        data = self.path.read_bytes()
        encoding = "utf-16" if data[:2] in (b"\xff\xfe", b"\xfe\xff") else "utf-8-sig"
        try:
            text = data.decode(encoding)
        except UnicodeDecodeError as error:
            line = data[: error.start].count(b"\n") + 1
            raise LoadError(
                "is not UTF-8 text", file=self.path, place=f"line {line}", do="save it as UTF-8"
            ) from None
        if "\0" in text:
            raise LoadError(
                "is not a text file", file=self.path, place=f"line {text[: text.index(chr(0))].count(chr(10)) + 1}"
            )
        return text


def _plain(text: str) -> str:
    """Python's own digit groups are no numbers of a table."""
    if "_" in text:
        raise ValueError(text)
    return text


def _number(text: str) -> float:
    return float(_plain(text))
