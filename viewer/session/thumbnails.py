"""Draws the gallery's small moving pictures in a process of its own, one file a mode as each gets ready."""

from __future__ import annotations

import os
from pathlib import Path

import numpy as np

from viewer.jobs import SILENT, Progress, in_child
from viewer.model.arrays import Array
from viewer.scene.picture import Picture
from viewer.scene.tokens import THEMES, rgb

FRAMES = 20  # of one cycle
_BARE = 0.45  # line widths are those of a picture this many times 960 wide


def draw_thumbnails(pictures: dict[int, Picture], folder: Path, progress: Progress = SILENT) -> None:
    """Write ``folder/MODE.npy`` (frames, h, w, 4) uint8 for each picture, in a child process that is killed when
    cancelled; a mode that cannot be drawn has none. ``progress`` ticks while it draws."""
    in_child(_draw_all, pictures, folder, progress=progress, stage="drawing the gallery")


def ready(folder: Path) -> dict[int, Path]:
    """The files that are whole, by mode."""
    return {int(path.stem): path for path in sorted(folder.glob("*.npy"))}


def _draw_all(pictures: dict[int, Picture], folder: Path) -> None:
    os.nice(5)  # the stage goes first
    for mode, picture in pictures.items():
        part = folder / f"{mode}.part"
        with open(part, "wb") as file:
            np.save(file, frames(picture))
        part.replace(folder / f"{mode}.npy")


def frames(picture: Picture) -> Array:
    """(FRAMES, h, w, 4) uint8 of one cycle, the ground transparent."""
    from viewer.stage import Stage

    ground = THEMES[picture.theme].background
    drawn: dict[int, Array] = {}
    with Stage(picture, bare=_BARE) as stage:
        stage.plotter.renderer.SetBackground(*rgb(ground))
        for frame in range(FRAMES // 2 + 1):
            drawn[frame] = _clear(stage.image(2 * np.pi * frame / FRAMES), ground)
    return np.stack([drawn[min(frame, FRAMES - frame)] for frame in range(FRAMES)])


def _clear(image: Array, ground: str) -> Array:
    """With alpha: pixels of the ground's very colour are transparent."""
    key = np.round(255 * np.array(rgb(ground))).astype(np.int16)
    away = np.abs(image.astype(np.int16) - key).max(axis=2)
    alpha = np.where(away <= 1, 0, 255).astype(np.uint8)
    return np.dstack([image, alpha])
