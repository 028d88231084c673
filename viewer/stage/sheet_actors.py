"""Draws a sheet with flat VTK actors in the topmost renderer, at any size of the window."""

from __future__ import annotations

import numpy as np
from vtkmodules.util.numpy_support import numpy_to_vtk, numpy_to_vtkIdTypeArray
from vtkmodules.vtkCommonCore import vtkPoints
from vtkmodules.vtkCommonDataModel import vtkCellArray, vtkPolyData
from vtkmodules.vtkRenderingCore import vtkActor2D, vtkPolyDataMapper2D, vtkRenderer, vtkTextActor

from viewer.scene.flatten import triangulate
from viewer.scene.primitives import Primitive, Sheet, Text
from viewer.scene.tokens import rgb
from viewer.stage.fonts import DPI, set_face


class SheetActors:
    """The actors of one renderer, kept between frames.

    ``show`` may be called with any sheet at any time; what did not change since the last call (the same ``fixed``
    object at the same size of the window) is not touched.
    """

    def __init__(self, renderer: vtkRenderer) -> None:
        self._renderer = renderer
        self._fixed, self._moving = _Shapes(renderer, 0), _Shapes(renderer, 1)
        self._texts: list[vtkTextActor] = []
        self._shown: tuple[object, tuple[int, int]] | None = None

    def show(self, sheet: Sheet) -> None:
        """Draw ``sheet`` instead of what was drawn before; rendering is left to the caller."""
        window = self._renderer.GetRenderWindow()
        window.SetDPI(DPI)
        width, height = window.GetSize()
        scale = width / sheet.width
        if self._shown is None or self._shown[0] is not sheet.fixed or self._shown[1] != (width, height):
            self._fixed.show(sheet.fixed, scale, height)
            self._write([item for item in sheet.fixed if isinstance(item, Text)], scale, height)
            self._shown = (sheet.fixed, (width, height))
        self._moving.show(sheet.moving, scale, height)

    def clear(self) -> None:
        """Take everything off the renderer."""
        for shapes in (self._fixed, self._moving):
            self._renderer.RemoveViewProp(shapes.actor)
        for actor in self._texts:
            self._renderer.RemoveViewProp(actor)
        self._texts, self._shown = [], None

    def _write(self, texts: list[Text], scale: float, height: int) -> None:
        while len(self._texts) < len(texts):
            actor = vtkTextActor()
            actor.SetTextScaleModeToNone()
            actor.SetLayerNumber(2)
            actor.PickableOff()
            actor.GetPositionCoordinate().SetCoordinateSystemToDisplay()
            self._renderer.AddViewProp(actor)
            self._texts.append(actor)
        for actor in self._texts[len(texts) :]:
            actor.VisibilityOff()
        for actor, text in zip(self._texts, texts, strict=False):
            actor.VisibilityOn()
            actor.SetInput(text.words)
            paint = actor.GetTextProperty()
            below = set_face(paint, text.size * scale, text.bold)
            paint.SetColor(*rgb(text.colour))
            {
                "left": paint.SetJustificationToLeft,
                "middle": paint.SetJustificationToCentered,
                "right": paint.SetJustificationToRight,
            }[text.anchor]()
            actor.GetPositionCoordinate().SetValue(round(text.x * scale), height - round(text.y * scale) - below)


class _Shapes:
    """All that is not text, as one mesh of coloured triangles."""

    def __init__(self, renderer: vtkRenderer, layer: int) -> None:
        self._data = vtkPolyData()
        mapper = vtkPolyDataMapper2D()
        mapper.SetInputData(self._data)
        mapper.SetScalarModeToUseCellData()
        self.actor = vtkActor2D()
        self.actor.SetMapper(mapper)
        self.actor.SetLayerNumber(layer)
        self.actor.PickableOff()
        renderer.AddViewProp(self.actor)

    def show(self, items: tuple[Primitive, ...], scale: float, height: int) -> None:
        points, triangles, colours = triangulate(items, least_width=1 / scale)
        place = np.zeros((len(points), 3), np.float32)
        place[:, 0], place[:, 1] = points[:, 0] * scale, height - points[:, 1] * scale
        corners, cells = vtkPoints(), vtkCellArray()
        corners.SetData(numpy_to_vtk(place, deep=True))
        cells.SetData(
            numpy_to_vtkIdTypeArray(np.arange(0, 3 * len(triangles) + 1, 3, dtype=np.int64), deep=True),
            numpy_to_vtkIdTypeArray(triangles.ravel().astype(np.int64), deep=True),
        )
        self._data.SetPoints(corners)
        self._data.SetPolys(cells)
        self._data.GetCellData().SetScalars(numpy_to_vtk(np.ascontiguousarray(colours), deep=True))
        self._data.Modified()
