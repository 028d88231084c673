"""Classic netCDF files (CDF-1, CDF-2, CDF-5): the header taken apart, arrays read where it says they lie.

By the published description of the file format. Every count is checked against the file before memory is taken.
"""

from __future__ import annotations

import math
import mmap
from dataclasses import dataclass, field
from pathlib import Path
from types import TracebackType

import numpy as np

from viewer.errors import LoadError
from viewer.model.arrays import Array

SIGNATURE = b"CDF"
# By number in the header: type in the file, big-endian.
_TYPES = {
    1: "i1", 2: "S1", 3: ">i2", 4: ">i4", 5: ">f4", 6: ">f8", 7: "u1", 8: ">u2", 9: ">u4", 10: ">i8", 11: ">u8",
}  # fmt: skip
_DIMENSIONS, _VARIABLES, _ATTRIBUTES = 10, 11, 12
_LONGEST_NAME = 1000


@dataclass(frozen=True)
class ClassicVariable:
    """One array: shape (records first), type, attributes of text, and where it lies."""

    file: ClassicFile
    name: str
    shape: tuple[int, ...]
    dtype: np.dtype
    texts: dict[str, str]
    begin: int
    by_record: bool

    def read(self) -> Array:
        """All values, in native byte order."""
        if not self.by_record:
            return self._stretch(self.begin, self.shape)
        rows = [self.row(i) for i in range(self.shape[0])]
        return np.stack(rows) if rows else np.empty(self.shape, self.dtype.newbyteorder("="))

    def row(self, index: int) -> Array:
        """Row ``index`` of the first axis."""
        step = self.file.record_size if self.by_record else math.prod(self.shape[1:]) * self.dtype.itemsize
        return self._stretch(self.begin + index * step, self.shape[1:])

    def _stretch(self, start: int, shape: tuple[int, ...]) -> Array:
        size = math.prod(shape) * self.dtype.itemsize
        if start + size > len(self.file.data):
            raise self.file.error(
                "the file ends inside an array",
                self.name,
                found=f"{len(self.file.data)} bytes",
                expected=f"at least {start + size}",
                do="it is cut short: write it again",
            )
        values = np.frombuffer(self.file.data[start : start + size], self.dtype)
        return values.astype(self.dtype.newbyteorder("=")).reshape(shape)


@dataclass
class ClassicFile:
    """An open file: ``variables`` by name; use as a context manager. Raises ``LoadError``."""

    path: Path
    variables: dict[str, ClassicVariable] = field(default_factory=dict)
    record_size: int = 0
    data: mmap.mmap = field(init=False)
    _at: int = 4

    def __enter__(self) -> ClassicFile:
        with self.path.open("rb") as stream:
            self.data = mmap.mmap(stream.fileno(), 0, access=mmap.ACCESS_READ)
        try:
            self._read_header()
        except BaseException:
            self.data.close()
            raise
        return self

    def __exit__(self, kind: type | None, error: BaseException | None, trace: TracebackType | None) -> None:
        self.data.close()

    def error(self, problem: str, place: str = "header", **parts: str) -> LoadError:
        return LoadError(problem, file=self.path, place=place, **parts)

    def _read_header(self) -> None:
        version = self.data[3] if len(self.data) > 3 else 0
        if not self.data[:3] == SIGNATURE or version not in (1, 2, 5):
            raise self.error("is no netCDF file", found=repr(self.data[:4]), expected="CDF with version 1, 2 or 5")
        self._count_size, self._begin_size = 8 if version == 5 else 4, 4 if version == 1 else 8
        records = self._count()
        lengths = [self._dimension() for _ in range(self._list(_DIMENSIONS))]
        self._attributes()
        found = [self._variable(lengths) for _ in range(self._list(_VARIABLES))]
        by_record = [item for item in found if item.by_record]
        sizes = [math.prod(item.shape[1:]) * item.dtype.itemsize for item in by_record]
        self.record_size = sizes[0] if len(sizes) == 1 else sum(-(-size // 4) * 4 for size in sizes)
        if by_record:
            # a writer that was streaming leaves the count open: all bits set
            whole = (len(self.data) - min(item.begin for item in by_record)) // max(self.record_size, 1)
            records = whole if records == 2 ** (8 * self._count_size) - 1 else records
            if records > whole + 1:  # the last record may lack its padding
                raise self.error(
                    "the file ends inside its records",
                    found=f"{whole} records",
                    expected=str(records),
                    do="it is cut short: write it again",
                )
        for item in found:
            shape = (records, *item.shape[1:]) if item.by_record else item.shape
            self.variables[item.name] = ClassicVariable(
                self, item.name, shape, item.dtype, item.texts, item.begin, item.by_record
            )

    def _dimension(self) -> int:
        self._name()
        return self._count()

    def _variable(self, lengths: list[int]) -> ClassicVariable:
        name = self._name()
        axes = [self._count() for _ in range(self._bounded(self._count(), self._count_size))]
        if any(axis >= len(lengths) for axis in axes):
            raise self.error("an array has an axis that does not exist", name)
        texts, dtype = self._attributes(), self._type()
        self._count()  # the size as the header states it, which large arrays outgrow
        begin = self._number(self._begin_size)
        by_record = bool(axes) and lengths[axes[0]] == 0
        return ClassicVariable(self, name, tuple(lengths[axis] for axis in axes), dtype, texts, begin, by_record)

    def _attributes(self) -> dict[str, str]:
        texts = {}
        for _ in range(self._list(_ATTRIBUTES)):
            name, dtype, count = self._name(), self._type(), self._count()
            raw = self._bytes(count * dtype.itemsize)
            if dtype.kind == "S":
                texts[name] = raw.decode("latin-1").strip("\0 ")
        return texts

    def _list(self, tag: int) -> int:
        found, count = self._number(4), self._count()
        if found not in (0, tag) or (found == 0 and count):
            raise self.error("the header is damaged", found=f"tag {found}", expected=f"tag {tag}")
        return self._bounded(count, 8)

    def _bounded(self, count: int, size: int) -> int:
        """``count`` things of at least ``size`` bytes must still fit into the file."""
        if count * size > len(self.data) - self._at:
            raise self.error("the header declares more than the file can hold", found=str(count))
        return count

    def _type(self) -> np.dtype:
        number = self._number(4)
        if number not in _TYPES:
            raise self.error("the header is damaged", found=f"type {number}", expected="1 to 11")
        return np.dtype(_TYPES[number])

    def _name(self) -> str:
        count = self._count()
        if count > _LONGEST_NAME:
            raise self.error("the header is damaged", found=f"a name of {count} bytes")
        return self._bytes(count).decode("utf-8", "replace")

    def _count(self) -> int:
        return self._number(self._count_size)

    def _number(self, size: int) -> int:
        return int.from_bytes(self._bytes(size), "big")

    def _bytes(self, count: int) -> bytes:
        """The next bytes, with their padding to a multiple of four passed over."""
        if count > len(self.data) - self._at:
            raise self.error("the file ends inside its header", do="it is cut short: write it again")
        start = self._at
        self._at = min(start + -(-count // 4) * 4, len(self.data))
        return self.data[start : start + count]
