"""Draws marks: pegs, beads and legs among the bodies, functional points over them."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from vtkmodules.util.numpy_support import numpy_to_vtk, numpy_to_vtkIdTypeArray
from vtkmodules.vtkCommonCore import vtkPoints
from vtkmodules.vtkCommonDataModel import vtkCellArray, vtkPolyData
from vtkmodules.vtkRenderingCore import vtkActor, vtkPolyDataMapper, vtkRenderer

from viewer.model.arrays import Array
from viewer.scene.forms import Piece
from viewer.scene.palette import mix
from viewer.scene.tokens import THEMES, rgb

_LIFT = 1.5  # depth units and slope factor by which lines stand before their faces


class MarkActors:
    """The marks of one body.

    among  renderer of the body: pegs and beads hide, and are hidden, as solid things
    over   renderer above it: what stays visible in front of the body
    scale  real pixels of the window per sheet pixel, for line widths
    """

    def __init__(
        self, among: vtkRenderer, over: vtkRenderer, pieces: Sequence[Piece], theme: str, scale: float
    ) -> None:
        self._drawn = [_PieceActors(over if piece.on_top else among, piece, theme, scale) for piece in pieces]

    def draw(self, phase: float) -> None:
        """Move every mark to a phase, without rendering."""
        for actors in self._drawn:
            actors.draw(phase)

    def clear(self) -> None:
        """Take all marks off their renderers."""
        for actors in self._drawn:
            actors.clear()
        self._drawn = []


class _PieceActors:
    def __init__(self, renderer: vtkRenderer, piece: Piece, theme: str, scale: float) -> None:
        self._renderer, self._piece = renderer, piece
        self._origin = piece.points.mean(axis=0)  # far-off coordinates keep their digits in float32
        self._points = vtkPoints()
        self._points.SetData(numpy_to_vtk(self._places(0.0), deep=True))
        self._actors: list[vtkActor] = []
        tokens = THEMES[theme]
        if len(piece.triangles):
            actor = self._add(piece.triangles, mix(tokens.body, getattr(tokens, piece.fill), piece.strength))
            paint = actor.GetProperty()
            paint.SetAmbient(0.70)
            paint.SetDiffuse(0.30)
            paint.SetSpecular(0.0)
            paint.SetOpacity(piece.opacity)
            paint.SetFrontfaceCulling(piece.inside_out)
            if not piece.shaded:
                paint.LightingOff()
            elif piece.normals is None:
                paint.SetInterpolationToFlat()
            else:
                paint.SetInterpolationToPhong()
                data = actor.GetMapper().GetInput()
                data.GetPointData().SetNormals(numpy_to_vtk(piece.normals.astype(np.float32), deep=True))
        if len(piece.lines):
            actor = self._add(piece.lines, getattr(tokens, piece.edge))
            actor.GetProperty().LightingOff()
            actor.GetProperty().SetLineWidth(piece.line_width * scale)
            mapper = actor.GetMapper()
            mapper.SetResolveCoincidentTopologyToPolygonOffset()
            mapper.SetRelativeCoincidentTopologyLineOffsetParameters(-_LIFT, -_LIFT)

    def draw(self, phase: float) -> None:
        if self._piece.moves:
            self._points.SetData(numpy_to_vtk(self._places(phase), deep=True))
            self._points.Modified()

    def clear(self) -> None:
        for actor in self._actors:
            self._renderer.RemoveViewProp(actor)

    def _places(self, phase: float) -> Array:
        return (self._piece.at(phase) - self._origin).astype(np.float32)

    def _add(self, cells: Array, colour: str) -> vtkActor:
        held, corners = vtkCellArray(), cells.shape[1]
        held.SetData(
            numpy_to_vtkIdTypeArray(np.arange(0, cells.size + 1, corners, dtype=np.int64), deep=True),
            numpy_to_vtkIdTypeArray(cells.ravel().astype(np.int64), deep=True),
        )
        data = vtkPolyData()
        data.SetPoints(self._points)
        (data.SetLines if corners == 2 else data.SetPolys)(held)
        mapper = vtkPolyDataMapper()
        mapper.SetInputData(data)
        actor = vtkActor()
        actor.SetMapper(mapper)
        actor.SetPosition(*self._origin)
        actor.PickableOff()
        actor.GetProperty().SetColor(*rgb(colour))
        self._renderer.AddViewProp(actor)
        self._actors.append(actor)
        return actor
