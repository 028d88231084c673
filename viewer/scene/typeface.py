"""The one face of every picture, DejaVu Sans as matplotlib's wheel carries it, and its measures."""

from __future__ import annotations

from functools import lru_cache
from importlib.util import find_spec
from pathlib import Path

from PIL import ImageFont

from viewer.errors import ExportError

_EM = 2048  # px at which the face is measured: its own units per em, so that hinting does not round


@lru_cache(maxsize=2)
def font_file(bold: bool = False) -> Path:
    """The TrueType file. matplotlib is located, never imported; ``ExportError`` when it is not installed."""
    spec = find_spec("matplotlib")
    name = "DejaVuSans-Bold.ttf" if bold else "DejaVuSans.ttf"
    for folder in (spec.submodule_search_locations or ()) if spec is not None else ():
        path = Path(folder) / "mpl-data" / "fonts" / "ttf" / name
        if path.is_file():
            return path
    raise ExportError(
        "the face for pictures is missing", found="no matplotlib fonts", expected=name, do="pip install matplotlib"
    )


@lru_cache(maxsize=2)
def _face(bold: bool) -> ImageFont.FreeTypeFont:
    return ImageFont.truetype(str(font_file(bold)), _EM, layout_engine=ImageFont.Layout.BASIC)


@lru_cache(maxsize=4096)
def text_width(words: str, size: float, bold: bool = False) -> float:
    """Advance width of one line in px at ``size`` px per em."""
    return float(_face(bold).getlength(words)) * size / _EM


def ascent(size: float) -> float:
    """Height above the baseline of capitals and tall letters, px (DejaVu Sans: 0.76 em)."""
    return 0.76 * size


def descent(size: float) -> float:
    """Depth below the baseline of g, p and y, px (DejaVu Sans: 0.24 em)."""
    return 0.24 * size


def wrap(pieces: tuple[str, ...], width: float, size: float, bold: bool = False, joint: str = " · ") -> list[str]:
    """Lines no wider than ``width``: pieces joined by ``joint`` while they fit; a piece too long for a line of
    its own is broken between words, and only a single word can be wider than a line."""
    lines: list[str] = []
    for piece in pieces:
        joined = lines[-1] + joint + piece if lines else piece
        if text_width(joined, size, bold) <= width:
            lines[-1:] = [joined]
            continue
        lines.append("")
        for word in piece.split(" "):
            longer = f"{lines[-1]} {word}" if lines[-1] else word
            if lines[-1] and text_width(longer, size, bold) > width:
                lines.append(word)
            else:
                lines[-1] = longer
    return lines
