"""The container of ``.vtu`` files: XML head, arrays as text, base64 or raw bytes, plain or compressed.

Every size is checked against the file before memory is taken. Read here: ascii, inline base64, appended base64
and raw, zlib and lzma blocks, 32- and 64-bit headers, both byte orders. Document types and entities are refused.
"""

from __future__ import annotations

import base64
import binascii
import lzma
import mmap
import os
import re
import xml.parsers.expat
import zlib
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from viewer.errors import LoadError
from viewer.loaders.file_shapes import Stretch
from viewer.loaders.text_numbers import numbers_from
from viewer.model.arrays import Array

_TYPES = {
    "Int8": "i1",
    "UInt8": "u1",
    "Int16": "i2",
    "UInt16": "u2",
    "Int32": "i4",
    "UInt32": "u4",
    "Int64": "i8",
    "UInt64": "u8",
    "Float32": "f4",
    "Float64": "f8",
}
_SECTIONS = ("Points", "Cells", "PointData", "CellData", "FieldData")
# Deflate cannot do better than about 1032 : 1 (zlib's own documentation), lzma can.
_LARGEST_RATIO = {"vtkZLibDataCompressor": 1100, "vtkLZMADataCompressor": 8000}


class OtherReaderNeeded(Exception):
    """A legal file that this parser leaves to the general reader: its words say why."""


@dataclass
class DataArray:
    """One ``DataArray`` element: what its attributes say and where its bytes are."""

    name: str
    section: str
    dtype: str
    components: int
    tuples: int | None  # declared on field arrays
    format: str
    offset: int | None
    text: list[bytes] = field(default_factory=list)


class VtuFile:
    """An open file: ``n_points``, ``n_cells`` and ``arrays[section][name]``; use as a context manager."""

    def __init__(self, path: str | os.PathLike[str]) -> None:
        self.path = Path(path)
        self._stream = self.path.open("rb")
        try:
            self._map = mmap.mmap(self._stream.fileno(), 0, access=mmap.ACCESS_READ)
        except (ValueError, OSError):
            self._stream.close()
            raise LoadError("is empty", file=path, expected="a .vtu file") from None
        try:
            self._open()
        except BaseException:
            self.close()
            raise

    def _open(self) -> None:
        head, self._appended = self._split()
        reader = _Head(self)
        reader.feed(head)
        self.n_points, self.n_cells, self.arrays = reader.n_points, reader.n_cells, reader.arrays
        self._order, self._header = reader.order, np.dtype(reader.order + reader.header)
        self._compressor, self._appended_encoding = reader.compressor, reader.appended_encoding
        if self._compressor and self._compressor not in _LARGEST_RATIO:
            raise OtherReaderNeeded(f"compressed by {self._compressor}")

    def __enter__(self) -> VtuFile:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def close(self) -> None:
        self._map.close()
        self._stream.close()

    def error(self, problem: str, **parts: str) -> LoadError:
        return LoadError(problem, file=self.path, **parts)

    def read(self, array: DataArray, tuples: int) -> Array:
        """The values, (tuples,) or (tuples, components), in native byte order."""
        dtype = np.dtype(self._order + array.dtype)
        count = tuples * array.components
        if array.format == "ascii":
            values = self._ascii(array, count)
        else:
            data = self._payload(array, count * dtype.itemsize)
            values = np.frombuffer(data, dtype, count)
        values = values.astype(dtype.newbyteorder("="), copy=True)
        return values if array.components == 1 else values.reshape(tuples, array.components)

    def stretch(self, array: DataArray, tuples: int) -> Stretch | None:
        """Where the array lies in the file when it is raw and not compressed, its size checked; else None."""
        if array.format != "appended" or self._appended_encoding != "raw" or self._compressor:
            return None
        dtype = np.dtype(self._order + array.dtype)
        start = self._raw_start(array, tuples * array.components * dtype.itemsize)
        return Stretch(start, dtype.str)

    # --- finding the bytes ---

    def _split(self) -> tuple[bytes, int]:
        """The XML up to the appended data, and where the appended bytes start (0: there are none)."""
        at = self._map.find(b"<AppendedData")
        if at < 0:
            return bytes(self._map), 0
        close = self._map.find(b">", at)
        mark = self._map.find(b"_", close)
        if close < 0 or mark < 0 or self._map[close + 1 : mark].strip():
            raise self.error("the appended data do not begin with '_'")
        return self._map[: close + 1] + b"</AppendedData></VTKFile>", mark + 1

    def _place(self, array: DataArray) -> str:
        return f"{array.section}, array '{array.name}'"

    def _misfit(self, array: DataArray, found: int, expected: int) -> LoadError:
        return self.error(
            "an array's size does not fit its declaration",
            place=self._place(array),
            found=f"{found} bytes",
            expected=f"{expected} bytes",
        )

    def _raw_start(self, array: DataArray, expected: int) -> int:
        at, size = self._appended + (array.offset or 0), self._header.itemsize
        if not self._appended or at + size > len(self._map):
            raise self.error(
                "the file ends before an array",
                place=self._place(array),
                found=f"{len(self._map)} bytes",
                expected=f"at least {at + size + expected}",
                do="the file is cut short: write it again",
            )
        found = int(np.frombuffer(self._map[at : at + size], self._header)[0])
        if found != expected:
            raise self._misfit(array, found, expected)
        if at + size + found > len(self._map):
            raise self.error(
                "the file ends inside an array",
                place=self._place(array),
                found=f"{len(self._map)} bytes",
                expected=f"at least {at + size + found}",
                do="the file is cut short: write it again",
            )
        return at + size

    def _payload(self, array: DataArray, expected: int) -> bytes:
        """The decoded bytes of a binary array, exactly ``expected`` of them."""
        if array.format == "appended" and self._appended_encoding == "raw":
            if not self._compressor:
                start = self._raw_start(array, expected)
                return self._map[start : start + expected]
            at = self._appended + (array.offset or 0)
            return self._inflated(
                array, expected, lambda start, size: self._map[at + start : at + start + size], True
            )
        if array.format == "appended":
            at = self._appended + (array.offset or 0)
            text_at: Callable[[int, int], bytes] = lambda start, size: self._map[at + start : at + start + size]  # noqa: E731
        else:
            text = b"".join(b"".join(array.text).split())
            text_at = lambda start, size: text[start : start + size]  # noqa: E731
        if self._compressor:
            return self._inflated(array, expected, text_at, False)
        size = self._header.itemsize
        first = self._decoded(array, text_at(0, _base64_length(size)))
        if len(first) < size:
            raise self._misfit(array, len(first), size)
        found = int(np.frombuffer(first, self._header, 1)[0])
        if found != expected:
            raise self._misfit(array, found, expected)
        if text_at(0, _base64_length(size)).endswith(b"="):  # header and data encoded one after the other
            data = self._decoded(array, text_at(_base64_length(size), _base64_length(expected)))
        else:
            data = self._decoded(array, text_at(0, _base64_length(size + expected)))[size:]
        if len(data) != expected:
            raise self._misfit(array, len(data), expected)
        return data

    def _inflated(self, array: DataArray, expected: int, bytes_at: Callable[[int, int], bytes], raw: bool) -> bytes:
        """Blocks: header of (blocks, size of one, size of the last or 0, compressed sizes …), then the blocks."""
        size = self._header.itemsize

        def fetch(start: int, length: int) -> bytes:
            if raw:
                return bytes_at(start, length)
            return self._decoded(array, bytes_at(start, _base64_length(length)))[:length]

        def numbers(data: bytes, count: int) -> list[int]:
            if len(data) < count * size:
                raise self.error("the file ends inside an array", place=self._place(array))
            return [int(n) for n in np.frombuffer(data, self._header, count)]

        blocks, whole, last = numbers(fetch(0, 3 * size), 3)
        if blocks == 0:
            if expected:
                raise self._misfit(array, 0, expected)
            return b""
        found = (blocks - 1) * whole + (last or whole)
        if found != expected:
            raise self._misfit(array, found, expected)
        head = (3 + blocks) * size
        if head > len(self._map):
            raise self._misfit(array, len(self._map), head)
        packed = numbers(fetch(0, head), 3 + blocks)[3:]
        if sum(packed) > len(self._map) or found > _LARGEST_RATIO[self._compressor] * max(sum(packed), 1) + 65536:
            raise self.error(
                "an array declares more than its compressed bytes can hold",
                place=self._place(array),
                found=f"{sum(packed)} bytes for {found}",
            )
        data = fetch(head if raw else _base64_length(head), sum(packed))
        pieces, at = [], 0
        for number, length in enumerate(packed, 1):
            wanted = (last or whole) if number == blocks else whole
            pieces.append(self._unpacked(array, data[at : at + length], wanted))
            at += length
        return b"".join(pieces)

    def _unpacked(self, array: DataArray, data: bytes, wanted: int) -> bytes:
        tool = zlib.decompressobj() if self._compressor == "vtkZLibDataCompressor" else lzma.LZMADecompressor()
        try:
            piece = tool.decompress(data, wanted + 1)
        except (zlib.error, lzma.LZMAError, EOFError) as error:
            raise self.error("compressed data are damaged", place=self._place(array), found=str(error)) from None
        if len(piece) != wanted:
            raise self._misfit(array, len(piece), wanted)
        return piece

    def _decoded(self, array: DataArray, text: bytes) -> bytes:
        try:
            return base64.b64decode(text, validate=True)
        except binascii.Error as error:
            raise self.error(
                "base64 text is damaged or cut short", place=self._place(array), found=str(error)
            ) from None

    def _ascii(self, array: DataArray, count: int) -> Array:
        words = b"".join(array.text).split()
        if len(words) != count:
            raise self.error(
                "an array's size does not fit its declaration",
                place=self._place(array),
                found=f"{len(words)} numbers",
                expected=f"{count}",
            )
        try:
            return numbers_from(words, np.dtype(array.dtype))
        except ValueError as error:
            raise self.error(
                "an array holds something that is no number",
                place=self._place(array),
                found=str(error),
                expected=f"numbers of {array.dtype}",
            ) from None


def _base64_length(size: int) -> int:
    return 4 * ((size + 2) // 3)


class _Head:
    """Reads the XML; raises at the first thing that is not as it should be."""

    def __init__(self, owner: VtuFile) -> None:
        self.owner = owner
        self.n_points = self.n_cells = 0
        self.arrays: dict[str, dict[str, DataArray]] = {name: {} for name in _SECTIONS}
        self.order, self.header, self.compressor, self.appended_encoding = "<", "u4", "", ""
        self._stack: list[str] = []
        self._open: DataArray | None = None
        self._pieces = 0

    def feed(self, text: bytes) -> None:
        parser = xml.parsers.expat.ParserCreate()
        parser.StartDoctypeDeclHandler = self._refuse
        parser.EntityDeclHandler = self._refuse
        parser.StartElementHandler, parser.EndElementHandler = self._start, self._end
        parser.CharacterDataHandler = self._text
        parser.buffer_text, parser.buffer_size = True, 1 << 20
        try:
            parser.Parse(text, True)
        except xml.parsers.expat.ExpatError as error:
            raise self.owner.error(
                "is not a complete XML file",
                place=f"line {error.lineno}",
                found=str(error),
                expected="a .vtu file",
                do="write it again; it may be cut short",
            ) from None
        if self._pieces == 0:
            raise self.owner.error("holds no mesh", expected="VTKFile, UnstructuredGrid, Piece")

    def _refuse(self, *_: object) -> None:
        raise self.owner.error("declares a document type or entities", expected="plain VTK XML", do="remove them")

    def _start(self, tag: str, given: dict[str, str]) -> None:
        if not self._stack:
            self._root(tag, given)
        elif tag == "Piece":
            self._pieces += 1
            if self._pieces > 1:
                raise OtherReaderNeeded("in several pieces")
            self.n_points = self._count(given, "NumberOfPoints")
            self.n_cells = self._count(given, "NumberOfCells")
        elif tag == "AppendedData":
            self.appended_encoding = given.get("encoding", "")
            if self.appended_encoding not in ("raw", "base64"):
                raise self.owner.error("unknown encoding of appended data", found=self.appended_encoding)
        elif tag in ("DataArray", "Array") and self._stack[-1] in _SECTIONS:
            self._array(given)
        self._stack.append(tag)
        if len(self._stack) > 20:
            raise self.owner.error("is nested too deeply")

    def _root(self, tag: str, given: dict[str, str]) -> None:
        if tag != "VTKFile" or given.get("type") != "UnstructuredGrid":
            raise self.owner.error(
                "is not an unstructured grid",
                found=f'<{tag} type="{given.get("type", "")}">',
                expected='<VTKFile type="UnstructuredGrid">',
            )
        self.order = ">" if given.get("byte_order") == "BigEndian" else "<"
        header = given.get("header_type", "UInt32")
        if header not in ("UInt32", "UInt64"):
            raise self.owner.error("unknown header_type", found=header, expected="UInt32 or UInt64")
        self.header = _TYPES[header]
        self.compressor = given.get("compressor", "")

    def _count(self, given: dict[str, str], name: str) -> int:
        text = given.get(name, "")
        if not re.fullmatch(r"\d{1,18}", text):
            raise self.owner.error(f"{name} is not a number", place="Piece", found=repr(text))
        return int(text)

    def _array(self, given: dict[str, str]) -> None:
        section, kind = self._stack[-1], given.get("type", "")
        name = given.get("Name", "Points" if section == "Points" else "")
        if kind not in _TYPES:
            return  # strings and bits are nothing we need
        numbers = {}
        for key, default in (("NumberOfComponents", "1"), ("NumberOfTuples", ""), ("offset", "")):
            text = given.get(key, default)
            if text and not re.fullmatch(r"\d{1,18}", text):
                raise self.owner.error(f"{key} is not a number", place=f"{section}, array '{name}'", found=repr(text))
            numbers[key] = int(text) if text else None
        format_ = given.get("format", "ascii")
        if format_ not in ("ascii", "binary", "appended"):
            raise self.owner.error("unknown format", place=f"{section}, array '{name}'", found=format_)
        array = DataArray(
            name,
            section,
            _TYPES[kind],
            numbers["NumberOfComponents"] or 1,
            numbers["NumberOfTuples"],
            format_,
            numbers["offset"],
        )
        if name in self.arrays[section]:
            raise self.owner.error("an array is given twice", place=f"{section}, array '{name}'")
        self.arrays[section][name] = self._open = array

    def _end(self, tag: str) -> None:
        self._stack.pop()
        if tag in ("DataArray", "Array"):
            self._open = None

    def _text(self, text: str) -> None:
        if self._open is not None and self._stack[-1] in ("DataArray", "Array") and self._open.format != "appended":
            self._open.text.append(text.encode("ascii", "replace"))
