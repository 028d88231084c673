"""``.h5``: the arrays of :mod:`viewer.loaders.array_layout` as data sets in the root of an HDF5 file."""

from __future__ import annotations

import os
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import h5py
import numpy as np

from viewer.errors import LoadError
from viewer.jobs import SILENT, Progress, atomic_path
from viewer.loaders.array_layout import arrays_to_write, mesh_of, modes_of
from viewer.loaders.raw_data import RawMesh, RawModes
from viewer.model.arrays import Array
from viewer.model.mesh import Mesh
from viewer.model.modes import ModeSet

SUFFIXES = (".h5", ".hdf5")
# Larger data sets must not be packed tighter than this: storage that is missing reads as zeros without end.
_BOMB_SIZE, _BOMB_RATIO = 200_000_000, 100


class _DataSet:
    """A ``StoredArray`` in the file."""

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

    def offset(self) -> int | None:
        return self._start


def read_mesh(path: Path, progress: Progress = SILENT) -> RawMesh:
    """The mesh in the file. Raises ``LoadError``."""
    with _arrays(path) as arrays:
        return mesh_of(arrays, path)


def read_modes(path: Path, progress: Progress = SILENT) -> RawModes:
    """The mode shapes; they stay in the file when neither chunked nor compressed. Raises ``LoadError``."""
    with _arrays(path) as arrays:
        return modes_of(arrays, path)


def write(path: str | os.PathLike[str], mesh: Mesh, modes: ModeSet | None, progress: Progress = SILENT) -> None:
    """Contiguous data sets in the order of creation, one mode in memory at a time. Atomic."""
    with atomic_path(path) as part, h5py.File(part, "w", track_order=True) as file:
        for name, shape, dtype, parts in arrays_to_write(mesh, modes):
            progress.tick(f"writing {name}")
            data, row = file.create_dataset(name, shape, dtype), 0
            for values in parts():
                progress.tick(f"writing {name}")
                data[row : row + len(values)] = np.ascontiguousarray(values, dtype)
                row += len(values)


@contextmanager
def _arrays(path: Path) -> Iterator[dict[str, _DataSet]]:
    try:
        with h5py.File(path, "r") as file:
            found = {}
            for name in file:
                if isinstance(file.get(name, getlink=True), h5py.HardLink) and isinstance(file[name], h5py.Dataset):
                    found[name] = _DataSet(path, name, file[name])
            yield found
    except (OSError, RuntimeError, KeyError, ValueError) as error:
        raise LoadError(
            "the file is damaged or no HDF5 file",
            file=path,
            found=str(error)[:200],
            do="write it again; it may be cut short",
        ) from None
