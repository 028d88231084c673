"""Mode shapes left in their file, so that one mode of a huge file is read alone."""

from __future__ import annotations

import os
from dataclasses import dataclass, replace
from pathlib import Path
from typing import NamedTuple

import numpy as np

from viewer.errors import LoadError
from viewer.model.arrays import Array, frozen
from viewer.model.modes import ArrayShapes


class Stretch(NamedTuple):
    """Where one array of (rows, 3) numbers lies in a file: byte offset and dtype with byte order ("<f8", "<c16")."""

    offset: int
    dtype: str


Parts = tuple[Stretch, ...]  # one stretch, or the real and the imaginary one


def stamp_of(path: str | os.PathLike[str]) -> tuple[int, int]:
    """Size and time of change of a file: tells that it was rewritten since it was opened."""
    status = os.stat(path)
    return status.st_size, status.st_mtime_ns


@dataclass(frozen=True, eq=False)
class FileShapes:
    """A ``ShapeSource`` on a file of uncompressed arrays; picklable.

    path      the file, ``stamp`` its size and time when it was checked
    n_rows    nodes in the file
    moved     per mode the translations; one stretch, or two (real, imaginary)
    turned    per mode the rotations, or None
    rows      (n,) row in the file of each row handed out, None: as in the file
    scale     factor on translations (metres per unit of length in the file)

    Reading raises ``LoadError`` when the file changed, ended early, or holds a number that is not finite.
    """

    path: str
    stamp: tuple[int, int]
    n_rows: int
    moved: tuple[Parts, ...]
    turned: tuple[Parts, ...] | None = None
    rows: Array | None = None
    scale: float = 1.0

    @property
    def count(self) -> int:
        return len(self.moved)

    @property
    def has_rotations(self) -> bool:
        return self.turned is not None

    @property
    def is_complex(self) -> bool:
        return any(len(parts) == 2 or np.dtype(parts[0].dtype).kind == "c" for parts in self.moved)

    @property
    def nbytes(self) -> int:
        """Bytes that all shapes take in the file."""
        every = [*self.moved, *(self.turned or ())]
        return sum(3 * self.n_rows * np.dtype(s.dtype).itemsize for parts in every for s in parts)

    def translations(self, index: int) -> Array:
        return self._read(self.moved[index], index, self.scale)

    def rotations(self, index: int) -> Array | None:
        return None if self.turned is None else self._read(self.turned[index], index, 1.0)

    def arranged(self, rows: Array | None, scale: float) -> FileShapes:
        """The same shapes handed out in other rows and units."""
        return replace(self, rows=rows, scale=scale)

    def loaded(self) -> ArrayShapes:
        """All shapes in memory."""
        turned = [self.rotations(i) for i in range(self.count)] if self.has_rotations else None
        moved = np.empty((0, self.n_rows, 3))
        if self.count:
            moved = np.stack([self.translations(i) for i in range(self.count)])
        return ArrayShapes(moved, np.stack(turned) if turned else None)  # type: ignore[arg-type]

    def _read(self, parts: Parts, index: int, scale: float) -> Array:
        try:
            if stamp_of(self.path) != self.stamp:
                raise LoadError("changed since it was opened", file=self.path, do="open it again")
            with Path(self.path).open("rb") as stream:
                pieces = [self._stretch(stream, stretch, index) for stretch in parts]
        except OSError as error:
            raise LoadError("cannot be read", file=self.path, found=error.strerror or str(error)) from None
        shape = pieces[0] if len(pieces) == 1 else pieces[0] + 1j * pieces[1]
        shape = shape.astype(np.complex128 if np.iscomplexobj(shape) or self.is_complex else np.float64, copy=False)
        if self.rows is not None:
            shape = shape[self.rows]
        if scale != 1.0:
            shape = shape * scale
        shape.flags.writeable = False
        return shape if shape.flags.owndata else frozen(shape)

    def _stretch(self, stream, stretch: Stretch, index: int) -> Array:
        values = np.empty((self.n_rows, 3), stretch.dtype)
        stream.seek(stretch.offset)
        got = stream.readinto(values.view(np.uint8).reshape(-1).data) if self.n_rows else 0
        if got != values.nbytes:
            raise LoadError(
                "ends early",
                file=self.path,
                place=f"mode {index + 1}",
                found=f"{got} bytes",
                expected=f"{values.nbytes} bytes",
            )
        finite = np.isfinite(values)
        if not finite.all():
            row = int(np.nonzero(~finite.all(axis=1))[0][0])
            raise LoadError(
                "holds a number that is not finite",
                file=self.path,
                place=f"mode {index + 1}, row {row + 1}",
                found=str(values[row]),
            )
        return values
