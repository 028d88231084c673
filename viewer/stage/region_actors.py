"""Draws what only one of two overlaid designs has: outlined solid and bold in the design's colour."""

from __future__ import annotations

import numpy as np
from vtkmodules.vtkRenderingCore import vtkRenderer

from viewer.model.arrays import Array
from viewer.scene import tokens
from viewer.scene.flap_outline import FlapOutline
from viewer.scene.surface import Surface
from viewer.stage.segments import Segments


class RegionActors:
    """The outline of regions; it moves with the points that :meth:`draw` is given.

    above   renderer in which the outline shows faintly where the bodies hide it, or None
    scale   real pixels of the window for one pixel at 960 wide
    """

    def __init__(
        self,
        renderer: vtkRenderer,
        above: vtkRenderer | None,
        surface: Surface,
        outline: FlapOutline,
        origin: Array,
        colour: str,
        scale: float,
    ) -> None:
        self._surface, self._outline = surface, outline
        width = scale * tokens.REGION_LINE
        self._lines = [Segments(renderer, colour, width, origin)]
        if above is not None:
            self._lines.append(Segments(above, colour, width, origin, tokens.HIDDEN_OPACITY))

    def draw(self, points: Array, contour: Array) -> None:
        """``points`` (s, 3) of the skin nodes, raised toward the eye; ``contour`` (e,) bool: edges drawn now."""
        edges, outline = self._surface.edges.nodes, self._outline
        pairs = np.concatenate([edges[contour & outline.owned], outline.border, self._surface.lines[outline.lines]])
        for line in self._lines:
            line.show(points[pairs])
