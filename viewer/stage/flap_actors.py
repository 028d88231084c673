"""Draws flaps on a body: a tint over its colour, an outline of their own, dashes where they hang."""

from __future__ import annotations

import numpy as np
from vtkmodules.vtkRenderingCore import vtkRenderer

from viewer.model.arrays import Array
from viewer.scene import ghost, tokens
from viewer.scene.flap_outline import FlapOutline
from viewer.scene.surface import Surface
from viewer.scene.tokens import Tokens
from viewer.stage.segments import Segments


class FlapActors:
    """The lines of flaps; they move with the points that :meth:`draw` is given.

    rest    (s, 3) skin nodes at rest about ``origin``, m
    scale   real pixels of the window for one pixel at 960 wide
    """

    def __init__(
        self,
        renderer: vtkRenderer,
        surface: Surface,
        outline: FlapOutline,
        rest: Array,
        origin: Array,
        diagonal: float,
        theme: Tokens,
        scale: float,
    ) -> None:
        self._surface, self._outline = surface, outline
        self._dashes = ghost.cut(rest, outline.border, tokens.DASH * diagonal / 2, tokens.DASH_GAP * diagonal / 2)
        self._edge = Segments(renderer, theme.accent, scale * tokens.FLAP_LINE, origin)
        self._hang = Segments(renderer, theme.accent, scale * tokens.FLAP_LINE, origin)

    def draw(self, points: Array, contour: Array) -> None:
        """``points`` (s, 3) of the skin nodes, raised toward the eye; ``contour`` (e,) bool: edges drawn now."""
        self._edge.show(points[self._surface.edges.nodes[contour & self._outline.owned]])
        self._hang.show(self._dashes.segments(points) if len(self._outline.border) else np.empty((0, 2, 3)))
