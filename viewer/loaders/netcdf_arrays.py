"""The arrays of a netCDF file by name, alike for both flavours: classic, and version 4 on HDF5."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path
from typing import Any, Protocol

import h5py

from viewer.errors import LoadError
from viewer.loaders import hdf5_sets
from viewer.loaders.netcdf_classic import SIGNATURE, ClassicFile
from viewer.model.arrays import Array

_LONGEST_TEXTS = 10_000_000


class Variable(Protocol):
    """One array of the file, in either flavour."""

    @property
    def shape(self) -> tuple[int, ...]:
        """Steps or cells first."""

    @property
    def texts(self) -> Mapping[str, str]:
        """Attributes that are text."""

    def read(self) -> Array:
        """All values."""

    def row(self, index: int) -> Array:
        """One row of the first axis."""


class _Hdf5Variable:
    def __init__(self, path: Path, name: str, data: h5py.Dataset) -> None:
        self.name, self.shape, self._data, self._path = name, data.shape or (), data, path
        self.texts = {key: _text(value) for key, value in data.attrs.items() if key == "elem_type"}

    def read(self) -> Array:
        if self._data.dtype.kind == "S" and self._data.nbytes <= _LONGEST_TEXTS:
            return self._data[()]
        return hdf5_sets.DataSet(self._path, self.name, self._data).read()

    def row(self, index: int) -> Array:
        return hdf5_sets.DataSet(self._path, self.name, self._data).rows(index, 1)[0]


@contextmanager
def opened(path: Path) -> Iterator[Mapping[str, Variable]]:
    """The arrays of an open file. Raises ``LoadError``."""
    with path.open("rb") as stream:
        head = stream.read(8)
    if head.startswith(SIGNATURE):
        with ClassicFile(path) as classic:
            yield classic.variables
    elif head == b"\x89HDF\r\n\x1a\n":
        with hdf5_sets.opened(path) as file:
            found = {name: hdf5_sets.member(file, name) for name in file}
            yield {
                name: _Hdf5Variable(path, name, item)
                for name, item in found.items()
                if isinstance(item, h5py.Dataset)
            }
    else:
        raise LoadError("is no netCDF file", file=path, found=repr(head), expected="CDF or HDF5")


def _text(value: Any) -> str:
    value = value.tolist() if hasattr(value, "tolist") else value
    value = value[0] if isinstance(value, list) and value else value
    return value.decode("latin-1").strip("\0 ") if isinstance(value, bytes) else str(value)
