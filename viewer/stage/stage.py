"""The stage: draws a picture at any phase with the plotter it is given, or off the screen.

Renderer layers: 0 bodies, 1 marks (always over bodies), 2 the sheet of words and figures. Each body of a
side-by-side picture has a viewport of its own; all viewports share one camera.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, cast

import numpy as np
import pyvista as pv
from PIL import Image
from vtkmodules.vtkRenderingCore import vtkLight, vtkRenderer

from viewer.model.arrays import Array
from viewer.scene import view
from viewer.scene.forms import Piece
from viewer.scene.marks import facing_pieces, standing_pieces
from viewer.scene.picture import Body, Picture, View
from viewer.scene.primitives import Box
from viewer.scene.sheet import SheetPlan, note_height, plan_sheet
from viewer.scene.surface import Surface, surface_of
from viewer.scene.tokens import BASE_WIDTH, THEMES, rgb
from viewer.stage.body_actors import BodyActors, DashedBody, GhostBody
from viewer.stage.mark_actors import MarkActors
from viewer.stage.sheet_actors import SheetActors
from viewer.stage.windows import off_screen, pixels

SUPERSAMPLE = 2
WHITE = "#FFFFFF"
# camera lights: position about the focus with the camera at (0, 0, 1); brightness
LIGHTS = (((-0.45, 0.80, 0.75), 0.92), ((0.85, 0.10, 0.75), 0.36), ((0.10, 0.90, -0.90), 0.15))


class Stage:
    """A picture being drawn.

    plotter  a pyvista plotter whose window is drawn into; None: an off-screen one, at twice the picture's size,
             that :meth:`image` reduces
    bare     when set: bodies and marks alone, on white and without a sheet, for figures that bring their own words;
             line widths are those of a picture ``bare`` times 960 wide, however small this one is
    """

    def __init__(self, picture: Picture, plotter: pv.Plotter | None = None, *, bare: float | None = None) -> None:
        self.picture = picture
        self._bare = bare
        self._own = plotter is None
        self.plotter = plotter or off_screen(SUPERSAMPLE * picture.width, SUPERSAMPLE * picture.height)
        self._window = cast(Any, self.plotter.render_window)
        self._window.SetMultiSamples(0)
        self._window.SetNumberOfLayers(3)
        self._added: list[vtkRenderer] = []
        self._plan: tuple[view.Camera, SheetPlan] | None = None
        self._build({})

    def show(self, picture: Picture, *, keep_camera: bool = False) -> None:
        """Replace the picture; surfaces of meshes that were already shown are kept."""
        known = {_drawing(body): surface for body, surface in zip(self.picture.bodies, self._surfaces, strict=True)}
        camera = self.camera() if keep_camera else None
        self._clear()
        self.picture = picture
        self._build(known)
        if camera is not None:
            self.aim(camera)

    def draw(self, phase: float) -> None:
        """Move everything to ``phase`` (rad), without rendering."""
        camera = self.camera()
        for actors in self._bodies:
            actors.draw(phase, camera)
        self._face(camera)
        for marks in (*self._marks, *self._facing):
            marks.draw(phase)
        if self._bare is not None:
            return
        if self._plan is None or not camera.same_as(self._plan[0]):
            frame = view.frame(self.picture, camera, self._boxes)
            self._plan = camera, plan_sheet(self.picture, frame, self._surfaces)
        self._sheet.show(self._plan[1].at(phase))

    def image(self, phase: float | None = None) -> Array:
        """(h, w, 3) uint8 sRGB at the picture's size, top row first; ``phase`` draws first when given."""
        if phase is not None:
            self.draw(phase)
        image = pixels(self._window)
        return reduce(image) if self._own else image

    def close(self) -> None:
        """Take everything off the plotter; an off-screen plotter is closed."""
        self._clear()
        if self._own:
            self.plotter.close()

    def __enter__(self) -> Stage:
        return self

    def __exit__(self, *error: object) -> None:
        self.close()

    def camera(self) -> view.Camera:
        """The camera as it stands now: in a window the user may have turned it."""
        camera = self._panes[0].GetActiveCamera()
        x, y, z = camera.GetDirectionOfProjection()
        right, up, toward = view.axes(View((-x, -y, -z), camera.GetViewUp()))
        _, top, _, bottom = self._boxes[0]
        scale = 2 * camera.GetParallelScale() / (bottom - top)
        return view.Camera(np.array(camera.GetFocalPoint()), right, up, toward, scale)

    @property
    def boxes(self) -> tuple[Box, ...]:
        """The viewport of each body, sheet pixels."""
        return self._boxes

    # ------------------------------------------------------------------ building

    def _build(self, known: dict[tuple[int, int], Surface]) -> None:
        picture = self.picture
        for body in picture.bodies:
            if _drawing(body) not in known:
                known[_drawing(body)] = surface_of(body.mesh, body.skin)
        self._surfaces = [known[_drawing(body)] for body in picture.bodies]
        camera, self._boxes = view.fit(
            picture, note_height(picture) if self._bare is None else 0.0, bare=self._bare is not None
        )
        self._lay_renderers()
        self.reach = view.shown_box(picture)  # (2, 3) m, of everything drawn over a cycle
        self.aim(camera)
        width = picture.width if self._bare is None else self._bare * BASE_WIDTH
        self._scale = self._window.GetSize()[0] / picture.width * width / BASE_WIDTH
        self._bodies: list[BodyActors | DashedBody | GhostBody] = []
        scale, surfaces = self._scale, self._surfaces
        if self._overlaid:
            theme = THEMES[picture.theme]
            pane, over = self._panes[0], self._over[0]
            baseline, modified = picture.bodies[:2]
            self._bodies.append(BodyActors(pane, picture, modified, surfaces[1], scale, theme.modified))
            self._bodies.append(DashedBody(pane, over, baseline, surfaces[0], scale, theme.baseline))
        else:
            for pane, body, surface in zip(self._panes, picture.bodies, surfaces, strict=True):
                make = GhostBody if body.form == "ghost" else BodyActors
                self._bodies.append(make(pane, picture, body, surface, scale))
        self._marks = self._mark_actors(standing_pieces(picture))
        self._facing: list[MarkActors] = []
        self._faced = np.zeros(3)
        self._sheet = SheetActors(self._renderer(2))
        self._plan = None

    @property
    def _overlaid(self) -> bool:
        return self.picture.layout == "overlay" and len(self.picture.bodies) > 1

    def _face(self, camera: view.Camera) -> None:
        """Make rings and rims anew when the camera has turned: they face the eye."""
        if np.allclose(self._faced, camera.toward_eye, rtol=0, atol=1e-9):
            return
        for marks in self._facing:
            marks.clear()
        self._facing = self._mark_actors(facing_pieces(self.picture, camera.toward_eye))
        self._faced = camera.toward_eye

    def _mark_actors(self, pieces: Sequence[Sequence[Piece]]) -> list[MarkActors]:
        shown = pieces[1:] if self._overlaid else pieces  # in an overlay, those of the body in front
        return [
            MarkActors(pane, over, of_body, self.picture.theme, self._scale)
            for pane, over, of_body in zip(self._panes, self._over, shown, strict=True)
        ]

    def _lay_renderers(self) -> None:
        """One renderer for each viewport in layer 0 and in layer 1."""
        width, height = view.sheet_size(self.picture.width, self.picture.height)
        boxes = list(dict.fromkeys(self._boxes))
        self._panes: list[vtkRenderer] = []
        self._over: list[vtkRenderer] = []
        for number, (left, top, right, bottom) in enumerate(boxes):
            pane = self.plotter.renderer if number == 0 else self._renderer(0)
            over = self._renderer(1)
            for renderer in (pane, over):
                renderer.SetViewport(left / width, 1 - bottom / height, right / width, 1 - top / height)
                renderer.SetActiveCamera(self.plotter.renderer.GetActiveCamera())
                light(renderer)
            pane.SetBackground(*rgb(THEMES[self.picture.theme].background if self._bare is None else WHITE))
            pane.GradientBackgroundOff()
            self._panes.append(pane)
            self._over.append(over)

    def _renderer(self, layer: int) -> vtkRenderer:
        renderer = vtkRenderer()
        renderer.SetLayer(layer)
        if layer:
            renderer.InteractiveOff()
        self._window.AddRenderer(renderer)
        self._added.append(renderer)
        return renderer

    def _clear(self) -> None:
        for renderer in self._added:
            renderer.RemoveAllViewProps()
            self._window.RemoveRenderer(renderer)
        self._added = []
        self.plotter.renderer.RemoveAllViewProps()
        self.plotter.renderer.SetViewport(0, 0, 1, 1)

    def aim(self, camera: view.Camera) -> None:
        """Point the shared camera; its clipping planes hold both extremes from any side."""
        low, high = self.reach
        radius = float(np.linalg.norm(high - low) + np.linalg.norm((high + low) / 2 - camera.focus)) or 1.0
        _, top, _, bottom = self._boxes[0]
        eye = self._panes[0].GetActiveCamera()
        eye.ParallelProjectionOn()
        eye.SetFocalPoint(*camera.focus)
        eye.SetPosition(*(camera.focus + 2 * radius * camera.toward_eye))
        eye.SetViewUp(*camera.up)
        eye.SetParallelScale((bottom - top) / 2 * camera.metres_per_pixel)
        eye.SetClippingRange(radius, 3 * radius)


def _drawing(body: Body) -> tuple[int, int]:
    """What tells surfaces apart while their bodies live: mesh and the part of it that is drawn."""
    return id(body.mesh), id(body.drawn)


def light(renderer: vtkRenderer) -> None:
    """The three camera lights, in place of whatever light there was."""
    renderer.RemoveAllLights()
    renderer.AutomaticLightCreationOff()
    for position, brightness in LIGHTS:
        lamp = vtkLight()
        lamp.SetLightTypeToCameraLight()
        lamp.SetPosition(*position)
        lamp.SetFocalPoint(0, 0, 0)
        lamp.SetIntensity(brightness)
        renderer.AddLight(lamp)


def reduce(image: Array) -> Array:
    """(h, w, 3) uint8: the mean of each 2 × 2 box of a (2h, 2w, 3) image, rounded."""
    return np.asarray(Image.fromarray(image).reduce(SUPERSAMPLE))
