"""Lines of a text deck with the files it includes: inside its folder, without circles, each with its place."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from pathlib import Path
from typing import NamedTuple

import numpy as np

from viewer.errors import LoadError
from viewer.loaders.raw_data import RawBlock
from viewer.model.arrays import Array

_LARGEST, _MOST_INCLUDES = 2_000_000_000, 1000


class Line(NamedTuple):
    """One line without its end, and where it stands."""

    text: str
    file: Path
    number: int

    def error(self, problem: str, **parts: str) -> LoadError:
        return LoadError(problem, file=self.file, place=f"line {self.number}", **parts)


def lines_of(path: Path, included: Callable[[Line], str | None]) -> Iterator[Line]:
    """Every line of the deck; where ``included`` gives a file name for a line, the lines of that file instead.

    Raises ``LoadError`` for files outside the deck's folder, circles, binary files and more than there is room for.
    """
    folder, spent = path.resolve().parent, [0, 0]

    def walk(file: Path, above: tuple[Path, ...]) -> Iterator[Line]:
        for line in _lines(file, spent):
            name = included(line)
            if name is None:
                yield line
                continue
            target = (folder / name).resolve() if name and "\0" not in name else folder
            if not target.is_relative_to(folder):
                raise line.error(
                    "includes a file outside the folder of the deck",
                    found=name[:120],
                    do="put the files together into one folder",
                )
            if not target.is_file():
                raise line.error("includes a file that does not exist", found=name[:120])
            if target in (*above, file.resolve()):
                raise line.error("includes go round in a circle", found=name[:120])
            spent[1] += 1
            if spent[1] > _MOST_INCLUDES:
                raise line.error("includes too many files", expected=f"at most {_MOST_INCLUDES}")
            yield from walk(target, (*above, file.resolve()))

    yield from walk(path, ())


def _lines(file: Path, spent: list[int]) -> Iterator[Line]:
    spent[0] += file.stat().st_size
    if spent[0] > _LARGEST:
        raise LoadError("is too large for a text deck", file=file, do="use .vtu, .npz or .h5")
    data = file.read_bytes()
    if data[:2] in (b"\xff\xfe", b"\xfe\xff") or b"\0" in data:
        raise LoadError("is not a plain text file", file=file, do="save it as UTF-8 text")
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError:
        text = data.decode("latin-1")  # decks are older than UTF-8; only names and remarks hold such letters
    for number, line in enumerate(text.replace("\r\n", "\n").replace("\r", "\n").split("\n"), 1):
        yield Line(line, file, number)


class Nodes:
    """Nodes by id while a deck is read."""

    def __init__(self) -> None:
        self.rows: dict[int, int] = {}
        self._xyz: list[tuple[float, float, float]] = []

    def add(self, line: Line, number: int, xyz: tuple[float, float, float]) -> None:
        if number in self.rows:
            raise line.error("node ids repeat", found=f"node {number} more than once", expected="each id once")
        self.rows[number] = len(self.rows)
        self._xyz.append(xyz)

    @property
    def points(self) -> Array:
        return np.array(self._xyz, np.float64).reshape(-1, 3)

    @property
    def ids(self) -> Array:
        return np.fromiter(self.rows, np.int64, len(self.rows))


class Cells:
    """Cells by id while a deck is read, runs of one kind together; nodes are looked up when all are known."""

    def __init__(self) -> None:
        self.rows: dict[int, int] = {}
        self._runs: list[tuple[str, tuple[int, ...] | None, list[tuple[int, list[int], Line]]]] = []

    def add(self, line: Line, kind: str, number: int, nodes: list[int], order: tuple[int, ...] | None = None) -> None:
        """``order``: permutation from the deck's nodes to VTK's."""
        if number in self.rows:
            raise line.error("element ids repeat", found=f"element {number} more than once", expected="each id once")
        self.rows[number] = len(self.rows)
        if not self._runs or self._runs[-1][:2] != (kind, order):
            self._runs.append((kind, order, []))
        self._runs[-1][2].append((number, nodes, line))

    def blocks(self, nodes: Nodes) -> list[RawBlock]:
        """Raises ``LoadError`` naming the line of a cell whose node does not exist."""
        found = []
        for kind, order, cells in self._runs:
            table = np.empty((len(cells), len(cells[0][1])), np.int64)
            for row, (number, names, line) in enumerate(cells):
                try:
                    table[row] = [nodes.rows[name] for name in names]
                except KeyError as error:
                    raise line.error(
                        "an element names a node that does not exist",
                        found=f"node {error.args[0]} in element {number}",
                        expected="a node of the deck",
                    ) from None
            ids = np.array([number for number, _, _ in cells], np.int64)
            found.append(RawBlock(kind, table if order is None else table[:, order], ids))
        return found


def whole(line: Line, text: str, what: str) -> int:
    """``text`` as an id of up to 15 digits."""
    word = text.strip()
    if not word.isascii() or not word.removeprefix("+").isdigit() or len(word) > 15:
        raise line.error(f"{what} is no whole number", found=repr(text.strip()[:40]))
    return int(word)
