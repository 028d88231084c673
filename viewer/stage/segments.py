"""Unlit line segments: contours, ghosts, beams, mesh lines."""

from __future__ import annotations

import numpy as np
from vtkmodules.util.numpy_support import numpy_to_vtk, numpy_to_vtkIdTypeArray
from vtkmodules.vtkCommonCore import vtkPoints
from vtkmodules.vtkCommonDataModel import vtkCellArray, vtkPolyData
from vtkmodules.vtkRenderingCore import vtkActor, vtkPolyDataMapper, vtkRenderer

from viewer.model.arrays import Array
from viewer.scene.tokens import rgb


class Segments:
    """One actor of separate segments, whose ends are replaced at each frame.

    width    real pixels of the render window; origin (3,) m: what the given ends are relative to
    """

    def __init__(self, renderer: vtkRenderer, colour: str, width: float, origin: Array, opacity: float = 1.0) -> None:
        self._data = vtkPolyData()
        mapper = vtkPolyDataMapper()
        mapper.SetInputData(self._data)
        mapper.SetScalarModeToUseCellData()
        self.actor = vtkActor()
        self.actor.SetMapper(mapper)
        self.actor.SetPosition(*origin)
        self.actor.PickableOff()
        paint = self.actor.GetProperty()
        paint.LightingOff()
        paint.SetColor(*rgb(colour))
        paint.SetLineWidth(width)
        paint.SetOpacity(opacity)
        renderer.AddActor(self.actor)

    def show(self, ends: Array, colours: Array | None = None) -> None:
        """Draw segments ``ends`` (m, 2, 3), m; ``colours`` (m, 3) uint8 overrides the one colour."""
        count = len(ends)
        points = vtkPoints()
        points.SetData(numpy_to_vtk(np.ascontiguousarray(ends, np.float32).reshape(-1, 3), deep=True))
        cells = vtkCellArray()
        cells.SetData(
            numpy_to_vtkIdTypeArray(np.arange(0, 2 * count + 1, 2, dtype=np.int64), deep=True),
            numpy_to_vtkIdTypeArray(np.arange(2 * count, dtype=np.int64), deep=True),
        )
        self._data.SetPoints(points)
        self._data.SetLines(cells)
        self._data.GetCellData().SetScalars(
            None if colours is None else numpy_to_vtk(np.ascontiguousarray(colours), deep=True)
        )
        self._data.Modified()
        self.actor.SetVisibility(count > 0)
