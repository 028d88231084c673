"""The face of pictures in VTK: DejaVu Sans from its file, since VTK's built-in face drops φ, arrows and U+202F."""

from __future__ import annotations

from vtkmodules.vtkCommonCore import VTK_FONT_FILE
from vtkmodules.vtkRenderingCore import vtkTextProperty

from viewer.scene.typeface import font_file

DPI = 72  # at which a font size in points is one in pixels
_DESCENDER = 483 / 2048  # of DejaVu Sans, in em: VTK's lower edge of a line lies this far below the baseline


def set_face(paint: vtkTextProperty, size: float, bold: bool) -> int:
    """Set face and size (real px per em); returns how far the baseline lies above the text's lower edge, px."""
    paint.SetFontFamily(VTK_FONT_FILE)
    paint.SetFontFile(str(font_file(bold)))
    pixels = max(round(size), 1)
    paint.SetFontSize(pixels)
    paint.SetVerticalJustificationToBottom()
    return round(_DESCENDER * pixels)
