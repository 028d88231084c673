"""Data sets in HDF5 files as ``StoredArray``: only numbers stored in this very file, sizes checked before reading."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import h5py
import numpy as np

from viewer.errors import LoadError
from viewer.model.arrays import Array

# Larger data sets must not be packed tighter than this: storage that is missing reads as zeros without end.
_BOMB_SIZE, _BOMB_RATIO = 200_000_000, 100


class DataSet:
    """A ``StoredArray`` in the file. Raises ``LoadError`` when it is no plain array of numbers kept in the file."""

    def __init__(self, path: Path, name: str, data: h5py.Dataset) -> None:
        self.path, self.name, self._data = path, name, data
        if data.shape is None or data.dtype.kind not in "fiuc" or data.is_virtual or data.external:
            raise LoadError(
                "is no plain array of numbers",
                file=path,
                place=name,
                found=str(data.dtype),
                expected="numbers stored in this file",
            )
        self.shape, self.dtype = data.shape, data.dtype
        stored = data.id.get_storage_size()
        plain = data.chunks is None
        if (plain and data.nbytes != stored) or (data.nbytes > _BOMB_SIZE and data.nbytes > _BOMB_RATIO * stored):
            raise LoadError(
                "an array declares more than the file stores",
                file=path,
                place=name,
                found=f"{stored} bytes",
                expected=f"{data.nbytes} bytes",
            )
        self._start = data.id.get_offset() if plain else None
        if self._start is not None and self._start + data.nbytes > path.stat().st_size:
            raise LoadError(
                "the file ends inside an array", file=path, place=name, do="it is cut short: write it again"
            )

    def read(self) -> Array:
        return self._data[()]

    def rows(self, start: int, count: int) -> Array:
        """``count`` rows from ``start``; both have been checked against ``shape``."""
        return self._data[start : start + count]

    def offset(self) -> int | None:
        return self._start


@contextmanager
def opened(path: Path) -> Iterator[h5py.File]:
    """The file, open for reading; whatever the library finds wrong while it is open becomes a ``LoadError``."""
    try:
        with h5py.File(path, "r") as file:
            yield file
    except (OSError, RuntimeError, KeyError, ValueError) as error:
        raise LoadError(
            "the file is damaged or no HDF5 file",
            file=path,
            found=str(error)[:200],
            do="write it again; it may be cut short",
        ) from None


def member(group: h5py.Group, name: str) -> h5py.Group | h5py.Dataset | None:
    """The group or data set at ``name`` (parts joined by ``/``); links by name or out of the file are not taken."""
    found: h5py.Group | h5py.Dataset = group
    for part in (part for part in name.split("/") if part not in ("", ".")):
        if not isinstance(found, h5py.Group) or not isinstance(found.get(part, getlink=True), h5py.HardLink):
            return None
        found = found[part]
    return found if isinstance(found, h5py.Group | h5py.Dataset) else None


def data_sets(path: Path, group: h5py.Group) -> dict[str, DataSet]:
    """The data sets directly in a group, by name."""
    found = {name: member(group, name) for name in group}
    return {name: DataSet(path, item.name, item) for name, item in found.items() if isinstance(item, h5py.Dataset)}


def numbers(path: Path, group: h5py.Group, name: str) -> Array:
    """The whole numbers of a short data set, flat; ``LoadError`` when it is missing or holds others."""
    item = member(group, name)
    if not isinstance(item, h5py.Dataset):
        raise LoadError(f"array '{name}' is missing", file=path, place=group.name or "")
    values = DataSet(path, item.name, item).read()
    if values.dtype.kind not in "iu" or (values.size and not 0 <= int(values.min()) <= int(values.max()) < 2**62):
        raise LoadError(
            "counts are not whole numbers from 0", file=path, place=item.name, found=str(values.reshape(-1)[:4])
        )
    return values.astype(np.int64).reshape(-1)
