"""``.npz``: the scripting route, ``numpy.savez(path, points=…, node_id=…, cells_hex8=…, modes=…, freq_hz=…)``.

The names stand in :mod:`viewer.loaders.array_layout`. Nothing is ever unpickled; sizes are checked before inflating.
"""

from __future__ import annotations

import os
import zipfile
import zlib
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import numpy as np

from viewer.errors import LoadError
from viewer.jobs import SILENT, Progress, atomic_path
from viewer.loaders.array_layout import arrays_to_write, mesh_of, modes_of
from viewer.loaders.raw_data import RawMesh, RawModes
from viewer.model.arrays import Array
from viewer.model.mesh import Mesh
from viewer.model.modes import ModeSet

SUFFIXES = (".npz",)
# Inflated arrays above this size must not be packed tighter than 1 : 100; measured numbers pack about 1 : 2.
_BOMB_SIZE, _BOMB_RATIO = 200_000_000, 100
_LOCAL_HEADER = 30


class _Member:
    """A ``StoredArray`` in the archive."""

    def __init__(self, path: Path, archive: zipfile.ZipFile, info: zipfile.ZipInfo) -> None:
        self.path, self.archive, self.info = path, archive, info
        place = info.filename
        with archive.open(info) as stream:
            version = np.lib.format.read_magic(stream)
            if version not in ((1, 0), (2, 0)):
                raise LoadError("unknown version of array header", file=path, place=place, found=str(version))
            read = np.lib.format.read_array_header_1_0 if version == (1, 0) else np.lib.format.read_array_header_2_0
            self.shape, self.fortran, self.dtype = read(stream)
            self._start = stream.tell()
        if self.dtype.hasobject or self.dtype.names is not None:
            raise LoadError(
                "holds Python objects, which are never read",
                file=path,
                place=place,
                expected="plain arrays of numbers",
                do="save numeric arrays with numpy.savez",
            )
        expected = self.dtype.itemsize
        for length in self.shape:
            expected *= int(length)
        if info.file_size - self._start != expected:
            raise LoadError(
                "an array's size does not fit its header",
                file=path,
                place=place,
                found=f"{info.file_size - self._start} bytes",
                expected=f"{expected} bytes",
            )
        if expected > _BOMB_SIZE and expected > _BOMB_RATIO * max(info.compress_size, 1):
            raise LoadError(
                "an array inflates to far more than numbers do",
                file=path,
                place=place,
                found=f"{info.compress_size} bytes for {expected}",
                do="save it without compression",
            )

    def read(self) -> Array:
        with self.archive.open(self.info) as stream:
            return np.lib.format.read_array(stream, allow_pickle=False)

    def offset(self) -> int | None:
        if self.info.compress_type != zipfile.ZIP_STORED or self.fortran or self.info.flag_bits & 1:
            return None
        with self.path.open("rb") as stream:
            stream.seek(self.info.header_offset)
            head = stream.read(_LOCAL_HEADER)
        if len(head) < _LOCAL_HEADER or head[:4] != b"PK\x03\x04":
            raise LoadError("the archive is damaged", file=self.path, place=self.info.filename)
        names = int.from_bytes(head[26:28], "little") + int.from_bytes(head[28:30], "little")
        return self.info.header_offset + _LOCAL_HEADER + names + self._start


def read_mesh(path: Path, progress: Progress = SILENT) -> RawMesh:
    """The mesh in the archive. Raises ``LoadError``."""
    with _members(path) as members:
        return mesh_of(members, path)


def read_modes(path: Path, progress: Progress = SILENT) -> RawModes:
    """The mode shapes in the archive; they stay in the file when it is not compressed. Raises ``LoadError``."""
    with _members(path) as members:
        return modes_of(members, path)


def write(path: str | os.PathLike[str], mesh: Mesh, modes: ModeSet | None, progress: Progress = SILENT) -> None:
    """Not compressed, one mode in memory at a time. Atomic."""
    with atomic_path(path) as part, zipfile.ZipFile(part, "w", zipfile.ZIP_STORED, allowZip64=True) as archive:
        for name, shape, dtype, parts in arrays_to_write(mesh, modes):
            progress.tick(f"writing {name}")
            with archive.open(f"{name}.npy", "w", force_zip64=True) as stream:
                header = {"descr": np.lib.format.dtype_to_descr(dtype), "fortran_order": False, "shape": shape}
                np.lib.format.write_array_header_1_0(stream, header)
                for values in parts():
                    progress.tick(f"writing {name}")
                    stream.write(np.ascontiguousarray(values, dtype).reshape(-1).view(np.uint8).data)


@contextmanager
def _members(path: Path) -> Iterator[dict[str, _Member]]:
    try:
        with zipfile.ZipFile(path) as archive:
            yield {
                info.filename.removesuffix(".npy"): _Member(path, archive, info)
                for info in archive.infolist()
                if info.filename.endswith(".npy")
            }
    except (zipfile.BadZipFile, zlib.error, EOFError, ValueError, NotImplementedError, RuntimeError) as error:
        raise LoadError(
            "the archive is damaged or no .npz file",
            file=path,
            found=str(error)[:200],
            do="write it again; it may be cut short",
        ) from None
