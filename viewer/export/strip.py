"""The phase strip: five phases of a mode side by side on white, for print."""

from __future__ import annotations

import os
from collections.abc import Sequence
from pathlib import Path

import numpy as np

from viewer.export.charts import sheet_image
from viewer.export.stills import write_png
from viewer.jobs import SILENT, Progress
from viewer.model.arrays import Array
from viewer.scene import view
from viewer.scene.picture import Picture
from viewer.scene.primitives import Box
from viewer.scene.strip_sheet import WIDTH, Strip, strip_layout
from viewer.scene.tokens import BASE_WIDTH
from viewer.stage import Stage

LINES = 1.0  # line widths, of those of a picture 960 wide


def save_strip(
    picture: Picture, path: str | os.PathLike[str], progress: Progress = SILENT, *, width: int = WIDTH
) -> Path:
    """Write the strip of a picture as PNG, ``width`` pixels wide whatever the picture's own width; returns the path.

    At 1600 wide, the size made for print, it is 500 high; taller when the note needs it, or with a second row of
    bodies when they are compared side by side.
    Raises ``ExportError`` when the file cannot be written, ``Cancelled`` when asked to stop.
    """
    return write_png(strip_image(picture, progress, width=width), path, dpi=300)


def strip_image(picture: Picture, progress: Progress = SILENT, *, width: int = WIDTH) -> Array:
    """(h, width, 3) uint8 of the strip."""
    strip = strip_layout(picture)
    scale = width / WIDTH
    image = sheet_image(strip.sheet, scale)
    rows = [tuple(_scaled(cell, scale) for cell in row) for row in strip.cells]
    drawn = _drawings(picture, strip, rows, scale, progress)
    for cells, drawings in zip(rows, drawn, strict=True):
        _paste(image, cells, drawings)
    return image


def _scaled(box: Box, scale: float) -> Box:
    left, top, right, foot = (scale * edge for edge in box)
    return left, top, right, foot


def _drawings(
    picture: Picture, strip: Strip, rows: Sequence[tuple[Box, ...]], size: float, progress: Progress
) -> list[list[Array]]:
    """By row and phase the bare drawings; one camera and one scale for all."""
    left, top, right, foot = rows[0][0]
    wide, tall = round(right - left), round(foot - top)
    bare = picture.with_(theme="light", width=wide, height=tall, magnified=None)
    if len(strip.cells) > 1:
        # viewports left and right, or below one another: either way each becomes as wide as a cell
        bare = bare.with_(width=len(strip.cells) * wide)
        stacked = len({box[1] for box in view.fit(bare, 0.0, bare=True)[1]}) > 1
        if stacked:
            bare = bare.with_(width=wide, height=len(strip.cells) * tall)
    found: list[list[Array]] = [[] for _ in strip.cells]
    scale = bare.width / BASE_WIDTH
    boxes = [tuple(round(edge * scale) for edge in box) for box in view.fit(bare, 0.0, bare=True)[1]]
    with Stage(bare, bare=LINES * size) as stage:
        for done, phase in enumerate(strip.phases):
            progress.tick("drawing phases", done, len(strip.phases))
            image = stage.image(phase)
            for row, drawings in enumerate(found):
                left, top, right, foot = boxes[row]
                drawings.append(image[top:foot, left:right])
    progress.tick("drawing phases", len(strip.phases), len(strip.phases))
    return found


def _paste(image: Array, cells: tuple[Box, ...], drawings: list[Array]) -> None:
    """Put the drawings of a row into their cells: all cut to the same box, the one that holds what any of them shows,
    so that bodies keep their place relative to one another."""
    shown = np.any([np.any(drawing != 255, axis=2) for drawing in drawings], axis=0)
    rows, columns = np.nonzero(shown.any(axis=1))[0], np.nonzero(shown.any(axis=0))[0]
    if not len(rows):
        return
    cut = slice(rows[0], rows[-1] + 1), slice(columns[0], columns[-1] + 1)
    for (left, top, right, foot), drawing in zip(cells, drawings, strict=True):
        part = drawing[cut]
        y = round((top + foot - part.shape[0]) / 2)
        x = round((left + right - part.shape[1]) / 2)
        image[y : y + part.shape[0], x : x + part.shape[1]] = part
