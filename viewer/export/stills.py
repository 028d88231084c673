"""One phase as a still."""

from __future__ import annotations

import os
from pathlib import Path

from PIL import Image

from viewer.jobs import SILENT, Progress, atomic_path
from viewer.model.arrays import Array
from viewer.scene.picture import Picture
from viewer.stage import Stage


def image(picture: Picture, phase: float = 0.0) -> Array:
    """(h, w, 3) uint8 sRGB of a picture at ``phase`` rad, top row first."""
    with Stage(picture) as stage:
        return stage.image(phase)


def save_png(picture: Picture, path: str | os.PathLike[str], phase: float = 0.0, progress: Progress = SILENT) -> Path:
    """Write one phase as PNG; returns the path. Raises ``ExportError`` when the file cannot be written."""
    progress.tick("drawing", 0, 1)
    write_png(image(picture, phase), path)
    progress.tick("drawing", 1, 1)
    return Path(path)


def write_png(image: Array, path: str | os.PathLike[str], dpi: int | None = None) -> Path:
    """Write (h, w, 3) uint8 as PNG, atomically; returns the path."""
    with atomic_path(path) as part:
        Image.fromarray(image).save(part, format="PNG", **({"dpi": (dpi, dpi)} if dpi else {}))
    return Path(path)
