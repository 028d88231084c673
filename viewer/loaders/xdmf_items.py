"""The tree of an XDMF file and its data items: numbers in the XML, in an HDF5 file or in a file of plain bytes.

References stay inside the document (``Reference``, ``xi:include`` of a mesh given elsewhere in it) or inside the
folder of the file (data); others are refused, and so are circles. Every size is checked before memory is taken.
"""

from __future__ import annotations

import math
import re
from contextlib import ExitStack
from dataclasses import dataclass
from pathlib import Path
from types import TracebackType
from xml.etree.ElementTree import Element

import h5py
import numpy as np

from viewer.errors import LoadError
from viewer.loaders.array_layout import StoredArray
from viewer.loaders.hdf5_sets import DataSet, member, opened
from viewer.loaders.text_numbers import numbers_from
from viewer.loaders.xml_tree import parse_tree
from viewer.model.arrays import Array

_NUMBERS = {"float": "f", "int": "i", "uint": "u", "char": "i", "uchar": "u"}
_WIDTHS = {"f": (4, 8), "i": (1, 2, 4, 8), "u": (1, 2, 4, 8)}
_MOST_HOPS = 16
# The ways in which common writers point at the mesh of another grid of the same document.
_POINTERS = (
    re.compile(r"""xpointer\(//Grid\[@Name=(["'])(?P<name>[^"']+)\1\](/Grid\[(?P<child>\d{1,9})\])?/\*\[.*\]\)"""),
    re.compile(
        r"""xpointer\(//Grid\[@Name=(["'])(?P<name>[^"']+)\1\](/Grid\[(?P<child>\d{1,9})\])?/(?P<part>\w+)\)"""
    ),
)
_STEPS_DOWN = re.compile(r"element\(/1((?:/\d{1,9})+)\)")


@dataclass
class _Words:
    """A ``StoredArray`` written out in the XML."""

    path: Path
    place: str
    text: str
    shape: tuple[int, ...]
    dtype: np.dtype

    def read(self) -> Array:
        words = self.text.encode("ascii", "replace").split()
        if len(words) != math.prod(self.shape):
            raise LoadError(
                "an array's size does not fit its declaration",
                file=self.path,
                place=self.place,
                found=f"{len(words)} numbers",
                expected=str(math.prod(self.shape)),
            )
        try:
            return numbers_from(words, self.dtype).reshape(self.shape)
        except ValueError as error:
            raise LoadError(
                "an array holds something that is no number",
                file=self.path,
                place=self.place,
                found=str(error),
                expected=f"numbers of {self.dtype}",
            ) from None

    def offset(self) -> int | None:
        return None


@dataclass
class _PlainBytes:
    """A ``StoredArray`` in a file of plain bytes."""

    path: Path
    start: int
    shape: tuple[int, ...]
    dtype: np.dtype

    def read(self) -> Array:
        with self.path.open("rb") as stream:
            stream.seek(self.start)
            return np.fromfile(stream, self.dtype, math.prod(self.shape)).reshape(self.shape)

    def offset(self) -> int | None:
        return self.start


@dataclass(frozen=True)
class Item:
    """One data item: its array and the file in which its bytes are."""

    array: StoredArray
    source: Path
    place: str

    @property
    def size(self) -> int:
        return math.prod(self.array.shape)

    def read(self) -> Array:
        """The values in native byte order."""
        values = self.array.read()
        return values.astype(values.dtype.newbyteorder("="), copy=False)


class Document:
    """An open XDMF file: a context manager that closes the data files it opened."""

    def __init__(self, path: Path) -> None:
        self.path = path
        self.root = parse_tree(path)
        self._folder = path.resolve().parent
        self._open = ExitStack()
        self._files: dict[Path, h5py.File] = {}
        if self.root.tag != "Xdmf":
            raise self.error("is no XDMF file", found=f"<{self.root.tag}>"[:80], expected="<Xdmf>")

    def __enter__(self) -> Document:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._open.__exit__(kind, error, trace)

    def error(self, problem: str, **parts: str) -> LoadError:
        return LoadError(problem, file=self.path, **parts)

    # --- the tree ---

    def child(self, element: Element, tag: str) -> Element | None:
        """The child of this tag, with references and includes of a mesh followed."""
        found = element.find(tag)
        includes = [child for child in element if child.tag.rpartition(":")[2] == "include"]
        for include in includes if found is None else ():
            target = self._included(include)
            if target.tag == tag:
                found = target
            elif target.tag == "Grid" and target is not element:
                found = target.find(tag)
            if found is not None:
                break
        return None if found is None else self.followed(found)

    def followed(self, element: Element) -> Element:
        """The element that a ``Reference`` stands for."""
        for _ in range(_MOST_HOPS):
            given = element.get("Reference")
            if given is None:
                return element
            path = (element.text or "").strip() if given.upper() == "XML" else given.strip()
            target = self._at(path)
            if target is None or target.tag != element.tag:
                raise self.error(
                    "a reference leads nowhere",
                    place=f"<{element.tag}>",
                    found=path[:120],
                    expected="the path of such an element in this file, as /Xdmf/Domain/DataItem[1]",
                )
            element = target
        raise self.error("references go round in a circle", place=f"<{element.tag}>")

    def _at(self, path: str) -> Element | None:
        if not path.startswith("/Xdmf/") or len(path) > 500:
            return None
        try:
            return self.root.find("./" + path.removeprefix("/Xdmf/"))
        except Exception:  # what is no path fails in many ways
            return None

    def _included(self, include: Element) -> Element:
        pointer = include.get("xpointer", "")
        if include.get("href"):
            raise self.error("includes another file", found=include.get("href", "")[:120], do="put it into this file")
        steps = _STEPS_DOWN.fullmatch(pointer)
        if steps:
            found = self.root
            for number in steps[1].split("/")[1:]:
                if not 1 <= int(number) <= len(found):
                    break
                found = found[int(number) - 1]
            else:
                return found
        match = next((m for pattern in _POINTERS if (m := pattern.fullmatch(pointer))), None)
        if match:
            for grid in self.root.iter("Grid"):
                if grid.get("Name") == match["name"]:
                    children = grid.findall("Grid")
                    at = int(match["child"] or 0)
                    if at <= len(children):
                        return children[at - 1] if at else grid
        raise self.error(
            "an include is not understood",
            place="<xi:include>",
            found=pointer[:120] or "no xpointer",
            expected='xpointer(//Grid[@Name="…"]/*[self::Topology or self::Geometry])',
        )

    # --- the numbers ---

    def item(self, element: Element, place: str) -> Item:
        """The data item in ``element``, its size checked. Raises ``LoadError``."""
        found = element.find("DataItem")
        if found is None:
            raise self.error("holds no data item", place=place)
        given = self.followed(found)
        kind = given.get("ItemType", "Uniform")
        if kind.lower() != "uniform":
            raise self.error(
                "a data item is of a type that is not read", place=place, found=kind[:40], expected="Uniform"
            )
        words = given.get("Dimensions", "").split()
        if not words or len(words) > 8 or not all(re.fullmatch(r"\d{1,15}", word) for word in words):
            raise self.error("Dimensions are not numbers", place=place, found=repr(given.get("Dimensions"))[:60])
        shape = tuple(int(word) for word in words)
        layout = given.get("Format", "XML").upper()
        if layout == "XML":
            return Item(
                _Words(self.path, place, given.text or "", shape, self._dtype(given, place)), self.path, place
            )
        if layout == "HDF":
            return self._stored(given, shape, place)
        if layout == "BINARY":
            return self._plain(given, shape, place)
        raise self.error(
            "a data item has an unknown format", place=place, found=layout[:40], expected="XML, HDF or Binary"
        )

    def _dtype(self, given: Element, place: str) -> np.dtype:
        name = given.get("NumberType") or given.get("DataType") or "Float"
        kind = _NUMBERS.get(name.lower(), "")
        width = given.get("Precision", "1" if "char" in name.lower() else "4")
        if not kind or width not in map(str, _WIDTHS[kind]):
            raise self.error(
                "a data item has an unknown type of number", place=place, found=f"{name[:40]}, precision {width[:40]}"
            )
        order = ">" if given.get("Endian", "").lower() == "big" else "<"
        return np.dtype(f"{order}{kind}{width}")

    def _inside(self, name: str, place: str) -> Path:
        target = (self._folder / name).resolve() if name and "\0" not in name else self._folder
        if not target.is_relative_to(self._folder):
            raise self.error(
                "refers to a file outside its folder",
                place=place,
                found=name[:120],
                do="put the files together into one folder",
            )
        if not target.is_file():
            raise self.error("refers to a file that does not exist", place=place, found=name[:120])
        return target

    def _stored(self, given: Element, shape: tuple[int, ...], place: str) -> Item:
        name, _, inner = (given.text or "").strip().rpartition(":")
        if not name or not inner:
            raise self.error(
                "does not say where its numbers are", place=place, found=repr(inner[:80]), expected="file.h5:/path"
            )
        source = self._inside(name, place)
        if source not in self._files:
            self._files[source] = self._open.enter_context(opened(source))
        found = member(self._files[source], inner)
        if not isinstance(found, h5py.Dataset):
            raise LoadError(f"array '{inner[:80]}' is missing", file=source, place=place)
        data = DataSet(source, inner, found)
        if math.prod(data.shape) != math.prod(shape):
            raise LoadError(
                "an array's size does not fit its declaration",
                file=source,
                place=inner,
                found=str(data.shape),
                expected=str(shape),
            )
        return Item(data, source, place)

    def _plain(self, given: Element, shape: tuple[int, ...], place: str) -> Item:
        source, dtype = self._inside((given.text or "").strip(), place), self._dtype(given, place)
        seek = given.get("Seek", "0")
        if not re.fullmatch(r"\d{1,15}", seek) or given.get("Compression", "Raw").lower() != "raw":
            raise self.error(
                "a binary data item is not understood",
                place=place,
                found=f"Seek {seek[:20]}, Compression {given.get('Compression', 'Raw')[:20]}",
            )
        end = int(seek) + math.prod(shape) * dtype.itemsize
        if end > source.stat().st_size:
            raise LoadError(
                "the file ends inside an array",
                file=source,
                place=place,
                found=f"{source.stat().st_size} bytes",
                expected=f"at least {end}",
            )
        return Item(_PlainBytes(source, int(seek), shape, dtype), source, place)
