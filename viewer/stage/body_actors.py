"""One design in one mode on the stage: lit surface, contour, ghost, mesh lines and beams."""

from __future__ import annotations

import numpy as np
from vtkmodules.util.numpy_support import numpy_to_vtk, numpy_to_vtkIdTypeArray, vtk_to_numpy
from vtkmodules.vtkCommonCore import vtkLookupTable, vtkPoints
from vtkmodules.vtkCommonDataModel import vtkCellArray, vtkPolyData
from vtkmodules.vtkRenderingCore import vtkActor, vtkPolyDataMapper, vtkRenderer

from viewer.model.arrays import Array
from viewer.scene import contour, ghost, tokens
from viewer.scene.colouring import colouring
from viewer.scene.flap_outline import flap_outline
from viewer.scene.motion import displacement
from viewer.scene.node_lines import crossings
from viewer.scene.palette import mix, pick
from viewer.scene.picture import Body, Picture
from viewer.scene.surface import Surface
from viewer.scene.tokens import THEMES, rgb
from viewer.scene.view import Camera
from viewer.stage.flap_actors import FlapActors
from viewer.stage.region_actors import RegionActors
from viewer.stage.segments import Segments

LIFT = 1.5  # px: lines stand this far before the surface, so that they do not sink into it
GHOST_LIFT = 0.5  # px: less, so that the contour wins where body and ghost coincide
CASED_LIFT = (2.0, 2.5)  # px: casing and core of node lines
DASHED_LIFT = 3.0  # px: more, so that the compared contour wins where both designs coincide

_TINT_LIFT = 1.0  # depth units and slope factor by which a tint stands before the surface it lies on
_SAME_PLACE = 1e-6  # of the diagonal: edges this near to one another are one edge of the ghost


class Motion:
    """Skin nodes of a body at a phase, float32 about a local origin: far-off coordinates keep their digits."""

    def __init__(self, body: Body, surface: Surface) -> None:
        points = body.mesh.points[surface.nodes]
        self.origin = points.mean(axis=0) if len(points) else np.zeros(3)
        self.rest = (points - self.origin).astype(np.float32)
        shape = body.shape[surface.nodes]
        self._shape = shape.astype(np.complex64 if np.iscomplexobj(shape) else np.float32)
        self._factor = body.factor

    def at(self, phase: float) -> Array:
        """(s, 3) float32 positions about ``origin``, m."""
        return self.rest + displacement(self._shape, self._factor, phase)


class SurfaceActor:
    """The lit surface. Its arrays belong to VTK and are written in place."""

    def __init__(self, renderer: vtkRenderer, surface: Surface, motion: Motion, colour: str) -> None:
        self._surface = surface
        self._points = numpy_to_vtk(motion.rest[surface.vertex], deep=True)
        self._normals = numpy_to_vtk(np.zeros((surface.n_vertices, 3), np.float32), deep=True)
        self._normals.SetName("normals")
        self._corners = vtkPoints()
        self._corners.SetData(self._points)
        self._renderer, self._origin = renderer, motion.origin
        self._sheets: list[vtkPolyData] = []
        self.actor, self._mapper, self._data = self._lay(surface.triangles, colour)

    def _lay(self, triangles: Array, colour: str) -> tuple[vtkActor, vtkPolyDataMapper, vtkPolyData]:
        """An actor of triangles (t, 3) of vertices, which go where this surface goes."""
        cells, data, mapper, actor = vtkCellArray(), vtkPolyData(), vtkPolyDataMapper(), vtkActor()
        cells.SetData(
            numpy_to_vtkIdTypeArray(np.arange(0, 3 * len(triangles) + 1, 3, dtype=np.int64), deep=True),
            numpy_to_vtkIdTypeArray(triangles.ravel().astype(np.int64), deep=True),
        )
        data.SetPoints(self._corners)
        data.SetPolys(cells)
        data.GetPointData().SetNormals(self._normals)
        mapper.SetInputData(data)
        mapper.ScalarVisibilityOff()
        actor.SetMapper(mapper)
        actor.SetPosition(*self._origin)
        actor.SetVisibility(len(triangles) > 0)
        paint = actor.GetProperty()
        paint.SetColor(*rgb(colour))
        paint.SetInterpolationToPhong()
        paint.SetAmbient(0.70)
        paint.SetDiffuse(0.30)
        paint.SetSpecular(0.0)
        self._renderer.AddActor(actor)
        self._sheets.append(data)
        return actor, mapper, data

    def tint(self, some: Array, colour: str, opacity: float) -> None:
        """Lay a see-through ``colour`` over the triangles ``some`` (t,) bool."""
        actor, mapper, _ = self._lay(self._surface.triangles[some], colour)
        actor.GetProperty().SetOpacity(opacity)
        actor.PickableOff()
        mapper.SetResolveCoincidentTopologyToPolygonOffset()
        mapper.SetRelativeCoincidentTopologyPolygonOffsetParameters(-_TINT_LIFT, -_TINT_LIFT)

    def colour_by(self, share: Array, colours: Array) -> None:
        """Colour by a value 0…1 by vertex through a ramp (n, 3) uint8."""
        table = vtkLookupTable()
        table.SetNumberOfTableValues(len(colours))
        for row, (r, g, b) in enumerate(colours / 255.0):
            table.SetTableValue(row, r, g, b, 1.0)
        table.SetTableRange(0.0, 1.0)
        self._data.GetPointData().SetScalars(numpy_to_vtk(np.ascontiguousarray(share, np.float32), deep=True))
        self._mapper.SetLookupTable(table)
        self._mapper.SetScalarRange(0.0, 1.0)
        self._mapper.InterpolateScalarsBeforeMappingOn()
        self._mapper.ScalarVisibilityOn()

    def move(self, points: Array, face_normals: Array) -> None:
        """Go to skin-node positions (s, 3) with their face normals (t, 3)."""
        vtk_to_numpy(self._points)[:] = points[self._surface.vertex]
        vtk_to_numpy(self._normals)[:] = self._surface.vertex_normals(face_normals)
        self._points.Modified()
        self._normals.Modified()
        self._corners.Modified()
        for data in self._sheets:
            data.Modified()


class BodyActors:
    """A body drawn solid: surface coloured by energy (or by ``tint``), contour, ghost.

    scale  real pixels of the window for one pixel at 960 wide
    """

    def __init__(
        self, renderer: vtkRenderer, picture: Picture, body: Body, surface: Surface, scale: float, tint: str = ""
    ) -> None:
        theme = THEMES[picture.theme]
        self._surface, self._diagonal = surface, body.mesh.diagonal
        self._motion = Motion(body, surface)
        origin = self._motion.origin
        self._dotted = bool(tint)
        colour = mix(theme.body, tint, tokens.OVERLAY_TINT) if tint else theme.body
        self._solid = SurfaceActor(renderer, surface, self._motion, colour)
        self._beam_colours: Array | None = None
        found = None if tint else colouring(picture, body)
        if found is not None:
            self._solid.colour_by(found.share(surface.vertex_values(found.values)), found.ramp)
            self._beam_colours = pick(found.ramp, found.share(found.values[surface.line_cells]))
        edge = tint or theme.body_edge
        width = tokens.OVERLAY_SOLID if tint else tokens.CONTOUR
        self._contour = Segments(renderer, edge, scale * width, origin)
        self._beams = Segments(renderer, edge, scale * tokens.BEAM, origin) if len(surface.lines) else None
        self._flaps: FlapActors | None = None
        self._own = np.ones(len(surface.edges.nodes), bool)
        if body.flaps and not tint:
            outline = flap_outline(surface, body.flaps)
            self._solid.tint(outline.inside, theme.flap, tokens.FLAP_TINT)
            rest = self._motion.rest
            self._flaps = FlapActors(renderer, surface, outline, rest, origin, self._diagonal, theme, scale)
            self._own = ~outline.owned
        self._regions: RegionActors | None = None
        if body.regions:
            outline = flap_outline(surface, body.regions)
            self._solid.tint(outline.inside, edge, tokens.REGION_TINT)
            self._regions = RegionActors(renderer, None, surface, outline, origin, edge, scale)
        self._mesh = None
        if picture.mesh_edges:
            self._mesh = Segments(renderer, theme.mesh_edge, scale, origin, tokens.MESH_EDGE_OPACITY)
        self._ghost = None
        if picture.ghost:
            thick = tokens.OVERLAY_GHOST if tint else tokens.GHOST
            self._ghost = Segments(renderer, theme.ghost, scale * thick, origin)
        self._ghost_eye = np.zeros(3)
        self._still = crossings(body, surface)
        self._still_lines = (
            tuple(
                Segments(renderer, colour, scale * width, origin)
                for colour, width in ((theme.halo, tokens.NODE_CASING), (theme.ink, tokens.NODE_LINE))
            )
            if len(self._still.nodes)
            else ()
        )

    def draw(self, phase: float, camera: Camera) -> None:
        """Go to ``phase``; contour, and the ghost when the camera has turned, are chosen for ``camera``."""
        surface, points = self._surface, self._motion.at(phase)
        normals = surface.face_normals(points)
        self._solid.move(points, normals)
        lift = (LIFT * camera.metres_per_pixel * camera.toward_eye).astype(np.float32)
        raised = points + lift
        drawn = contour.drawn(surface.edges, normals, camera.toward_eye)
        self._contour.show(raised[surface.edges.nodes[drawn & self._own]])
        if self._flaps is not None:
            self._flaps.draw(raised, drawn)
        if self._regions is not None:
            self._regions.draw(raised, drawn)
        if self._beams is not None:
            self._beams.show(raised[surface.lines], self._beam_colours)
        for line, height in zip(self._still_lines, CASED_LIFT, strict=False):
            line.show(self._still.segments(points) + np.float32(height / LIFT) * lift)
        if self._mesh is not None:
            median = contour.median_length(self._motion.rest, surface.outline)
            dense = median <= tokens.MESH_EDGE_MEDIAN * camera.metres_per_pixel
            self._mesh.show(np.empty((0, 2, 3)) if dense else (points + lift / 2)[surface.outline])
        if self._ghost is not None and not np.allclose(self._ghost_eye, camera.toward_eye, atol=1e-9):
            self._ghost_eye = camera.toward_eye
            dashes = rest_dashes(surface, self._motion.rest, camera, self._diagonal, dotted=self._dotted)
            self._ghost.show(dashes.segments(self._motion.rest) + np.float32(GHOST_LIFT / LIFT) * lift)


class GhostBody:
    """A body of which only the undeformed contour is drawn, dashed; its own faces hide what is behind them."""

    def __init__(self, renderer: vtkRenderer, picture: Picture, body: Body, surface: Surface, scale: float) -> None:
        theme = THEMES[picture.theme]
        self._surface, self._diagonal = surface, body.mesh.diagonal
        motion = Motion(body, surface)
        self._rest = motion.rest
        self._faces = SurfaceActor(renderer, surface, motion, theme.body)
        self._faces.actor.GetProperty().SetColor(*renderer.GetBackground())
        self._faces.actor.GetProperty().LightingOff()
        self._faces.move(motion.rest, surface.face_normals(motion.rest))
        self._ghost = Segments(renderer, theme.ghost, scale * tokens.GHOST, motion.origin)
        self._eye = np.zeros(3)

    def draw(self, phase: float, camera: Camera) -> None:
        """Nothing moves; the contour is chosen anew when the camera has turned."""
        if np.allclose(self._eye, camera.toward_eye, atol=1e-9):
            return
        self._eye = camera.toward_eye
        dashes = rest_dashes(self._surface, self._rest, camera, self._diagonal, dotted=False)
        lift = (GHOST_LIFT * camera.metres_per_pixel * camera.toward_eye).astype(np.float32)
        self._ghost.show(dashes.segments(self._rest) + lift)


class DashedBody:
    """A compared design drawn as dashed contour only; hidden parts show faintly, over everything.

    Dashes of edges that are always contour are cut once, on the undeformed shape, and ride along; silhouettes,
    which change, are cut anew at each phase.
    """

    def __init__(
        self, renderer: vtkRenderer, above: vtkRenderer, body: Body, surface: Surface, scale: float, colour: str
    ) -> None:
        self._surface, self._diagonal = surface, body.mesh.diagonal
        self._motion = Motion(body, surface)
        origin, width = self._motion.origin, scale * tokens.OVERLAY_DASHED
        self._seen = Segments(renderer, colour, width, origin)
        self._hidden = Segments(above, colour, width, origin, tokens.HIDDEN_OPACITY)
        edges = surface.edges
        pairs = np.concatenate([edges.nodes[edges.feature], surface.lines])
        self._fixed = self._cut(self._motion.rest, pairs)
        self._regions: RegionActors | None = None
        if body.regions:
            outline = flap_outline(surface, body.regions)
            self._regions = RegionActors(renderer, above, surface, outline, origin, colour, scale)

    def _cut(self, points: Array, pairs: Array) -> ghost.Dashes:
        return ghost.cut(points, pairs, tokens.DASH * self._diagonal, tokens.DASH_GAP * self._diagonal)

    def draw(self, phase: float, camera: Camera) -> None:
        """Go to ``phase``."""
        surface, points = self._surface, self._motion.at(phase)
        edges = surface.edges
        turning = contour.silhouettes(edges, surface.face_normals(points), camera.toward_eye) & ~edges.feature
        moving = self._cut(points, edges.nodes[turning])
        lift = (DASHED_LIFT * camera.metres_per_pixel * camera.toward_eye).astype(np.float32)
        ends = np.concatenate([self._fixed.segments(points), moving.segments(points)]) + lift
        self._seen.show(ends)
        self._hidden.show(ends)
        if self._regions is not None:
            drawn = contour.drawn(edges, surface.face_normals(points), camera.toward_eye)
            self._regions.draw(points + lift, drawn)


def rest_dashes(surface: Surface, rest: Array, camera: Camera, diagonal: float, *, dotted: bool) -> ghost.Dashes:
    """The undeformed contour, lines of beams included, cut into dashes (or dots) for this camera."""
    normals = surface.face_normals(rest)
    pairs = np.concatenate([contour.contour(surface.edges, normals, camera.toward_eye), surface.lines])
    on, off = (tokens.DOT, tokens.DOT_GAP) if dotted else (tokens.DASH, tokens.DASH_GAP)
    return ghost.cut(rest, ghost.once(rest, pairs, _SAME_PLACE * diagonal), on * diagonal, off * diagonal)
