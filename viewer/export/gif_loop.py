"""A loop of one cycle as an animated GIF with one palette, so that resting pixels rest."""

from __future__ import annotations

import os
from pathlib import Path

from PIL import Image

from viewer.errors import ExportError
from viewer.export.frames import drawings, source_frames
from viewer.export.shared_palette import SharedPalette
from viewer.export.stills import write_png
from viewer.jobs import SILENT, Progress, atomic_path
from viewer.model.arrays import Array
from viewer.scene.picture import Picture
from viewer.scene.tokens import FRAME_MS, FRAMES
from viewer.stage import Stage

PALETTE_PHASES = (0.0, 0.125, 0.25, 0.625, 0.75)  # of a cycle: both extremes, both directions, rest


def save_gif(
    picture: Picture,
    path: str | os.PathLike[str],
    progress: Progress = SILENT,
    *,
    still: str | os.PathLike[str] | None = None,
) -> Path:
    """Write one cycle, 40 frames of 40 ms, repeating for ever; returns the path.

    still  also write the first frame, in all its colours, to this PNG file
    Raises ``ExportError`` when the file cannot be written, ``Cancelled`` (nothing is left) when asked to stop.
    """
    source = source_frames(picture)
    tasters = tuple(source[round(share * FRAMES)] for share in PALETTE_PHASES)
    with atomic_path(path) as part:
        indexed: dict[int, Image.Image] = {}
        waiting: dict[int, Array] = {}
        palette: SharedPalette | None = None
        with Stage(picture) as stage:
            for frame, image in drawings(picture, stage.image, tasters, progress):
                if frame == 0 and still is not None:
                    write_png(image, still)
                waiting[frame] = image
                if palette is None and all(taster in waiting for taster in tasters):
                    palette = SharedPalette([waiting[taster] for taster in tasters])
                if palette is not None:
                    indexed |= {number: palette.index(held) for number, held in waiting.items()}
                    waiting = {}
        progress.tick("writing the loop", FRAMES, FRAMES)
        write_loop([indexed[frame] for frame in source], part)
    return Path(path)


def write_loop(frames: list[Image.Image], path: Path) -> None:
    """Write indexed frames of 40 ms; the duration that a reader will see is checked.

    A writer may join equal neighbours into one longer frame: their time must not be lost.
    """
    frames[0].save(
        path,
        format="GIF",
        save_all=True,
        append_images=frames[1:],
        duration=FRAME_MS,
        loop=0,
        disposal=1,
        optimize=False,
    )
    expected = FRAME_MS * len(frames)
    found = duration(path)
    if found != expected:
        raise ExportError(
            "the loop does not last one cycle", file=path, found=f"{found} ms", expected=f"{expected} ms"
        )


def duration(path: Path) -> int:
    """Sum of the frame times of a GIF, ms."""
    with Image.open(path) as loop:
        total = 0
        for number in range(getattr(loop, "n_frames", 1)):
            loop.seek(number)
            total += int(loop.info.get("duration", 0))
    return total
