"""The sheet over a picture: scale note, rulers, colour bar, title keys and labels, composed as primitives."""

from __future__ import annotations

from viewer.scene.primitives import (
    Box, Disc, Frame, GradientBar, Line, Polygon, Primitive, Ring, Sheet, Text, sheet_size,
)

__all__ = ["Box", "Disc", "Frame", "GradientBar", "Line", "Polygon", "Primitive", "Ring", "Sheet", "Text", "sheet_size"]
