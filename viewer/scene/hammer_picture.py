"""A hammer test beside the model: over an analysis mode, next to it, alone, and expanded onto the mesh.

Test and analysis share phase, sign and magnification: the test's shape is multiplied by the modal scale factor that
brings its used channels closest to those of the analysis. Measured phases are kept, and the motion travels, where
they are seen at all; else the shape is drawn at its best common phase.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any

import numpy as np

from viewer.errors import RefusedError
from viewer.insight.correlate import modal_scale_factor
from viewer.insight.hinges import HingeFinding
from viewer.insight.scale import DRAWN_PEAK, Scale
from viewer.model.arrays import Array
from viewer.model.cycle import cycle_peaks
from viewer.model.mesh import Mesh
from viewer.scene.compose import OVERLAY, SINGLE, mode_body, picture_height, single_picture
from viewer.scene.figures import digits, hertz
from viewer.scene.note_layout import EXAGGERATED, note_height, scale_note
from viewer.scene.picture import Body, Note, Picture
from viewer.scene.placed_test import PlacedTest, steadiest
from viewer.scene.tokens import BASE_WIDTH
from viewer.scene.view import side_height
from viewer.workspace import Study

PHASES_SEEN = 10.0  # degrees of phase scatter from which on a travelling motion can be told from a standing one
ROLES = ("test", "ink")
NO_TICKS = np.empty((0, 3))
LEAST_SCATTER = 0.1  # degrees that are worth a figure
ALMOST_ONE = 0.995  # a MAC that two digits would call 1.00
MEASURED_ONLY = "points move in the measured directions only"
FOLLOWING = "unmeasured directions follow the drawn body"


def over_picture(
    study: Study,
    mode: int,
    placed: PlacedTest,
    test_mode: int,
    analysis: Array,
    *,
    mac: float | None = None,
    keep_phases: bool | None = None,
    labels: Sequence[str] | str = (),
    true_scale: bool = False,
    enlarge: float = 1.0,
    width: int = BASE_WIDTH,
    paired_by: str = "",
    **look: Any,
) -> Picture:
    """Analysis mode ``mode`` as a plain body, test mode ``test_mode`` (both from 1) as points and lines on top.

    analysis     (c,) motion of the analysis mode along every channel of the test, in units of its shape
    mac          of the pair, said in the note
    keep_phases  None: where the phase scatter is 10° or more
    enlarge      draw that many times as large as the analysis mode is drawn by itself
    labels       of the points to write; "all"
    ``look``: theme, ghost, mesh_edges, view of ``Picture``. ``RefusedError`` when nothing measured moves.
    """
    body, scale = _analysis(study, mode, true_scale, enlarge)
    motion, said = _scaled_test(placed, test_mode, analysis * _turn(analysis, scale), keep_phases)
    motion = placed.completed(motion, study.design.mesh, body.shape)
    if len(placed.partly) and placed.partly.any():
        said = [*said, FOLLOWING]
    test = placed.mark(*_named(placed, test_mode, motion), calls=placed.tags(labels), ticks=NO_TICKS)
    note = _paired_note(study, mode, placed, test_mode, scale, said, mac, paired_by)
    return Picture(
        (replace(body, name=f"analysis: {body.name}", points=(), traces=(test,)),),
        note,
        magnification=scale.magnification,
        width=width,
        height=picture_height(width, SINGLE),
        **look,
    )


def beside_picture(
    study: Study,
    mode: int,
    placed: PlacedTest,
    test_mode: int,
    analysis: Array,
    *,
    mac: float | None = None,
    keep_phases: bool | None = None,
    labels: Sequence[str] | str = (),
    true_scale: bool = False,
    enlarge: float = 1.0,
    width: int = BASE_WIDTH,
    paired_by: str = "",
    **look: Any,
) -> Picture:
    """The test's points and lines over the undeformed contour at the left, the analysis mode at the right, with one
    camera, phase and magnification. Arguments as for :func:`over_picture`."""
    body, scale = _analysis(study, mode, true_scale, enlarge)
    motion, said = _scaled_test(placed, test_mode, analysis * _turn(analysis, scale), keep_phases)
    if placed.partly.any():
        said = [*said, MEASURED_ONLY]
    said = ["same phase, size and camera", *said]
    test = placed.mark(*_named(placed, test_mode, motion), calls=placed.tags(labels), ticks=NO_TICKS, stems=True)
    left = Body(
        test.name,
        body.mesh,
        np.zeros((body.mesh.n_nodes, 3)),
        body.factor,
        float(placed.test.freq_hz[test_mode - 1]),
        traces=(test,),
        form="ghost",
    )
    note = _paired_note(study, mode, placed, test_mode, scale, said, mac, paired_by)
    picture = Picture(
        (left, replace(body, name=f"analysis: {body.name}", points=())),
        note,
        layout="side",
        magnification=scale.magnification,
        width=width,
        height=picture_height(width, OVERLAY),
        roles=ROLES,
        **look,
    )
    return picture.with_(height=picture_height(width, side_height(picture, note_height(picture)) / BASE_WIDTH))


def alone_picture(
    placed: PlacedTest,
    test_mode: int,
    *,
    keep_phases: bool | None = None,
    labels: Sequence[str] | str = (),
    enlarge: float = 1.0,
    width: int = BASE_WIDTH,
    **look: Any,
) -> Picture:
    """A test mode without any model: its points and lines, and where they rest."""
    test, index = placed.test, placed.index_of(test_mode)
    motion, said = _phased(placed, test_mode, steadiest(test.shapes[index, placed.used]), keep_phases)
    mesh = Mesh(placed.points, (), np.arange(len(placed.points)))
    peak = float(cycle_peaks(motion).max(initial=0.0))
    if not peak > 0:
        raise _nothing_moves(placed, test_mode)
    mark = placed.mark(*_named(placed, test_mode, motion), calls=placed.tags(labels), stems=True, at_rest=True)
    body = Body(
        mark.name,
        mesh,
        np.zeros((mesh.n_nodes, 3)),
        enlarge * DRAWN_PEAK * mesh.diagonal / peak,
        float(test.freq_hz[index]),
        traces=(mark,),
        form="ghost",
    )
    drawn = f"size arbitrary, peak drawn at {digits(100 * enlarge * DRAWN_PEAK, trim=True)} % of the diagonal"
    measured = [MEASURED_ONLY] if placed.partly.any() else []
    note = Note(
        f"Test mode {test_mode}",
        hertz(float(test.freq_hz[index])),
        (drawn, *said, *measured),
        (f"test: {test.name}, {len(test.labels)} points, {test.n_channels} channels", *placed.corrections_said),
    )
    return Picture((body,), note, width=width, height=picture_height(width, SINGLE), **look)


def expanded_picture(
    study: Study,
    test_mode: int,
    placed: PlacedTest,
    said: str = "",
    *,
    name: str = "",
    keep_phases: bool | None = None,
    energy: bool = True,
    finding: HingeFinding | None = None,
    labels: Sequence[str] | str = (),
    width: int = BASE_WIDTH,
    **look: Any,
) -> Picture:
    """Test mode ``test_mode`` expanded onto the mesh, with what was measured on top.

    study  of the expanded shapes, which are in the units of the test's and have its numbers
    said   where they come from, for the note: "expanded from 34 channels on 6 analysis modes"
    name   of the mode
    """
    picture = single_picture(study, test_mode, energy=energy, finding=finding, width=width, **look)
    (body,) = picture.bodies
    motion, phases = _phased(placed, test_mode, study.scale(test_mode - 1).turn, keep_phases)
    if not np.iscomplexobj(motion):
        body = _in_phase(body)
    motion = placed.completed(motion, body.mesh, body.shape)
    test = placed.mark(*_named(placed, test_mode, motion), calls=placed.tags(labels), ticks=NO_TICKS)
    note = picture.note
    told = any(said in words for words in note.condition)  # the study's own condition says it already
    note = replace(
        note,
        title=" · ".join(part for part in (f"Test mode {test_mode}", name) if part),
        frequency="",
        drawing=(*([said] if said and not told else []), *note.drawing, *phases),
        condition=(*note.condition, *placed.corrections_said),
    )
    name = f"expanded onto {body.name}"
    return picture.with_(bodies=(replace(body, name=name, points=(), traces=(test,)),), note=note)


# ---- parts


def _analysis(study: Study, mode: int, true_scale: bool, enlarge: float) -> tuple[Body, Scale]:
    index = study.index_of(mode)
    scale = study.scale(index, true_scale=true_scale).enlarged(enlarge)
    return mode_body(study, index, scale, scale.turn, energy=False), scale


def _in_phase(body: Body) -> Body:
    """The body with the real part of its motion alone."""
    if not np.iscomplexobj(body.shape):
        return body
    masses = tuple(replace(mark, motion=np.real(mark.motion)) for mark in body.masses)
    hinges = tuple(replace(mark, motion=np.real(mark.motion), fold=np.real(mark.fold)) for mark in body.hinges)
    return replace(body, shape=np.real(body.shape), masses=masses, hinges=hinges)


def _turn(values: Array, scale: Scale) -> complex | float:
    """What the analysis mode is multiplied by before it is drawn: a sign for a real one, so that it stays real."""
    return scale.turn if np.iscomplexobj(values) else (-1.0 if scale.turn.real < 0 else 1.0)


def _scaled_test(
    placed: PlacedTest, test_mode: int, analysis: Array, keep_phases: bool | None
) -> tuple[Array, list[str]]:
    """Measured motion (p, 3) in units of the analysis mode, and what the note says of it."""
    values = placed.test.shapes[placed.index_of(test_mode)]
    factor = modal_scale_factor(analysis[placed.used], values[placed.used])
    if abs(factor) == 0:
        raise _nothing_moves(placed, test_mode)
    motion, said = _phased(placed, test_mode, factor, keep_phases)
    scaled = f"test sized and signed by the modal scale factor over {int(placed.used.sum())} channels"
    return motion, [scaled, *said]


def _phased(placed: PlacedTest, test_mode: int, factor: complex, keep: bool | None) -> tuple[Array, list[str]]:
    """Measured motion times ``factor``, with its phases or at its best common one, and the words for it."""
    motion = placed.motion(test_mode)
    if not np.iscomplexobj(motion):
        return motion * np.real(factor), []
    degrees = placed.phase_scatter_deg(test_mode)
    scatter = f"phase scatter {_up_to(degrees)}"
    if keep is None:
        keep = degrees >= PHASES_SEEN
    if keep:
        return motion * factor, [f"measured phases kept: {scatter}"]
    return np.real(motion * factor), [f"drawn in phase: {scatter} left out"]


def _up_to(degrees: float) -> str:
    if degrees < LEAST_SCATTER:
        return f"below {LEAST_SCATTER:g}°"
    return f"up to {digits(degrees, trim=True)}°"


def _named(placed: PlacedTest, test_mode: int, motion: Array) -> tuple[str, Array, float]:
    return f"test: {placed.test.name}", motion, float(placed.test.freq_hz[test_mode - 1])


def _paired_note(
    study: Study,
    mode: int,
    placed: PlacedTest,
    test_mode: int,
    scale: Scale,
    said: Sequence[str],
    mac: float | None,
    paired_by: str,
) -> Note:
    index = study.index_of(mode)
    conditions = [study.condition, paired_by, *placed.corrections_said]
    note = scale_note(mode, study.name(index), None, scale, conditions)
    drawing = sorted((*note.drawing, *said), key=lambda words: words == EXAGGERATED)  # the warning last
    return replace(
        note,
        title=f"Test mode {test_mode} · analysis {note.title[0].lower()}{note.title[1:]}",
        frequency="" if mac is None else f"MAC {mac:.{2 if mac < ALMOST_ONE else 3}f}",
        drawing=tuple(drawing),
    )


def _nothing_moves(placed: PlacedTest, test_mode: int) -> RefusedError:
    return RefusedError(
        f"test mode {test_mode} of '{placed.test.name}' cannot be drawn",
        found="no motion in the channels that are used, or none in common with the analysis mode",
        do="check the channels of the test, and which modes are paired",
    )
