"""The cache on disk: one plain ``.npz`` per mode set, written atomically, never pickled, size-capped."""

from __future__ import annotations

import contextlib
import zipfile
from pathlib import Path

import numpy as np
import platformdirs

from viewer.jobs import atomic_path
from viewer.model.modes import ArrayShapes, ModeSet

SIZE_CAP = 4 * 2**30  # bytes kept at most; the least recently used go first


class Cache:
    """Mode sets by key. ``folder`` None: the user's cache folder."""

    def __init__(self, folder: Path | None = None, size_cap: int = SIZE_CAP) -> None:
        self.folder = folder or Path(platformdirs.user_cache_dir("hingelight", appauthor=False)) / "modes"
        self.size_cap = size_cap

    def path(self, key: str) -> Path:
        return self.folder / f"{key}.npz"

    def get(self, key: str) -> ModeSet | None:
        """The stored mode set, or None; an unreadable entry counts as missing and is removed."""
        path = self.path(key)
        if not path.exists():
            return None
        try:
            modes = read_modes_npz(path)
            path.touch()  # the time of last use decides what is dropped first
        except (OSError, ValueError, KeyError, zipfile.BadZipFile, EOFError):
            path.unlink(missing_ok=True)
            return None
        return modes

    def trim(self) -> None:
        """Drop the least recently used entries until the folder is within its cap."""
        entries = sorted(((p.stat().st_mtime, p.stat().st_size, p) for p in self.folder.glob("*.npz")), reverse=True)
        kept = 0
        for _, size, path in entries:
            kept += size
            if kept > self.size_cap:
                with contextlib.suppress(OSError):
                    path.unlink()


def write_modes_npz(path: Path, modes: ModeSet) -> Path:
    """Write a mode set held in memory as a plain ``.npz``."""
    moved = np.stack([modes.shape(i) for i in range(modes.count)]) if modes.count else np.zeros((0, 0, 3))
    arrays = {"node_ids": modes.node_ids, "freq_hz": modes.freq_hz, "moved": moved}
    if modes.shapes.has_rotations:
        arrays["turned"] = np.stack([modes.rotations(i) for i in range(modes.count)])  # type: ignore[misc]
    if modes.damping is not None:
        arrays["damping"] = modes.damping
    words = np.array([modes.normalisation, modes.origin, modes.source])
    with atomic_path(path) as part:
        np.savez(part, words=words, **arrays)  # type: ignore[arg-type]
    return path


def read_modes_npz(path: Path) -> ModeSet:
    """Read what :func:`write_modes_npz` wrote."""
    with np.load(path, allow_pickle=False) as data:
        normalisation, origin, source = (str(word) for word in data["words"])
        return ModeSet(
            node_ids=data["node_ids"],
            freq_hz=data["freq_hz"],
            shapes=ArrayShapes(data["moved"], data.get("turned")),
            damping=data.get("damping"),
            normalisation=normalisation,
            origin=origin,
            source=source,
        )
