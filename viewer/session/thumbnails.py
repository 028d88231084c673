"""Draws the gallery's small moving pictures in a process of its own, one file a mode as each gets ready."""

from __future__ import annotations

import os
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from viewer.jobs import SILENT, Progress, in_child
from viewer.model.arrays import Array
from viewer.scene.motion import is_standing
from viewer.scene.picture import Picture
from viewer.scene.tokens import THEMES, rgb

if TYPE_CHECKING:
    from viewer.stage import Stage

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
    from viewer.stage import Stage

    os.nice(5)  # the window goes first
    stage: Stage | None = None
    try:
        for mode, picture in pictures.items():
            if stage is None:
                stage = Stage(picture, bare=_BARE)
            else:
                stage.show(picture)
            part = folder / f"{mode}.part"
            with open(part, "wb") as file:
                np.save(file, _frames(stage, picture))
            part.replace(folder / f"{mode}.npy")
    finally:
        if stage is not None:
            stage.close()


def _frames(stage: Stage, picture: Picture) -> Array:
    """(FRAMES, h, w, 4) uint8 of one cycle, the ground transparent."""
    ground = THEMES[picture.theme].background
    stage.plotter.renderer.SetBackground(*rgb(ground))
    standing = all(is_standing(body.shape) for body in picture.bodies)
    source = [min(frame, FRAMES - frame) if standing else frame for frame in range(FRAMES)]
    drawn = {frame: _clear(stage.image(2 * np.pi * frame / FRAMES), ground) for frame in sorted(set(source))}
    return np.stack([drawn[frame] for frame in source])


def _clear(image: Array, ground: str) -> Array:
    """With alpha: pixels of the ground's very colour are transparent."""
    key = np.round(255 * np.array(rgb(ground))).astype(np.int16)
    away = np.abs(image.astype(np.int16) - key).max(axis=2)
    alpha = np.where(away <= 1, 0, 255).astype(np.uint8)
    return np.dstack([image, alpha])
