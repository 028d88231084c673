"""Flat charts as PNG."""

from __future__ import annotations

import os
from pathlib import Path
from typing import Any

import numpy as np

from viewer.export.stills import write_png
from viewer.jobs import SILENT, Give, Progress, at_once
from viewer.model.arrays import Array
from viewer.scene.ladder_chart import ladder_chart
from viewer.scene.mac_chart import mac_chart
from viewer.scene.primitives import Sheet
from viewer.scene.tokens import BASE_WIDTH
from viewer.stage.sheet_actors import SheetActors
from viewer.stage.stage import SUPERSAMPLE, reduce
from viewer.stage.windows import off_screen, pixels
from viewer.workspace.comparison import Comparison


def save_chart(
    sheet: Sheet, path: str | os.PathLike[str], *, width: int = BASE_WIDTH, progress: Progress = SILENT
) -> Path:
    """Write a sheet as PNG, ``width`` pixels wide; returns the path. Raises ``ExportError``."""
    progress.tick("drawing", 0, 1)
    return write_png(sheet_image(sheet, width / sheet.width), path)


def save_pairing_charts(
    comparison: Comparison,
    folder: Path,
    stem: str,
    theme: str = "light",
    width: int = BASE_WIDTH,
    give: Give = at_once,
) -> tuple[Path, Path]:
    """The ladder of frequencies and the field of agreement of a comparison; returns both paths."""
    first, second = comparison.first.names, comparison.second.names
    ladder, field = (chart(comparison.pairing, first, second, theme) for chart in (ladder_chart, mac_chart))
    paths = folder / f"{stem}_ladder.png", folder / f"{stem}_agreement.png"
    for sheet, path in zip((ladder, field), paths, strict=True):
        give(save_chart, sheet, path, width=width)
    return paths


def sheet_image(sheet: Sheet, scale: float = 1.0) -> Array:
    """(h, w, 3) uint8 of a sheet alone, on white; a sheet pixel is ``scale`` pixels."""
    size = round(scale * sheet.width), round(scale * sheet.height)
    plotter = off_screen(SUPERSAMPLE * size[0], SUPERSAMPLE * size[1])
    try:
        plotter.renderer.SetBackground(1, 1, 1)
        window: Any = plotter.render_window
        window.SetMultiSamples(0)
        SheetActors(plotter.renderer).show(sheet)
        return np.array(reduce(pixels(window)))
    finally:
        plotter.close()
