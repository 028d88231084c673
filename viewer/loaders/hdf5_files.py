"""``.h5``: the arrays of :mod:`viewer.loaders.array_layout` as data sets in the root of an HDF5 file."""

from __future__ import annotations

import os
from pathlib import Path

import h5py
import numpy as np

from viewer.jobs import SILENT, Progress, atomic_path
from viewer.loaders.array_layout import arrays_to_write, mesh_of, modes_of
from viewer.loaders.hdf5_sets import data_sets, opened
from viewer.loaders.raw_data import RawMesh, RawModes
from viewer.model.mesh import Mesh
from viewer.model.modes import ModeSet

SUFFIXES = (".h5", ".hdf5")


def read_mesh(path: Path, progress: Progress = SILENT) -> RawMesh:
    """The mesh in the file. Raises ``LoadError``."""
    with opened(path) as file:
        return mesh_of(data_sets(path, file), path)


def read_modes(path: Path, progress: Progress = SILENT) -> RawModes:
    """The mode shapes; they stay in the file when neither chunked nor compressed. Raises ``LoadError``."""
    with opened(path) as file:
        return modes_of(data_sets(path, file), path)


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
