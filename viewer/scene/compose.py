"""From a study to a picture: what is drawn, at which size, in which colours, and what its scale note says."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import Any

import numpy as np

from viewer.insight.given_energy import given_density
from viewer.insight.hinges import HingeFinding
from viewer.insight.scale import Scale, common_scale
from viewer.mechanics.energy import RELATIVE
from viewer.model.arrays import Array
from viewer.model.design import LumpedMass
from viewer.scene.facing_view import facing_view
from viewer.scene.figures import digits
from viewer.scene.finding_marks import flap_marks, hinge_marks, verdict_words
from viewer.scene.node_lines import lines_of
from viewer.scene.node_lines import words as lines_words
from viewer.scene.note_layout import note_height, scale_note
from viewer.scene.palette import energy_top
from viewer.scene.picture import Body, Magnified, MassMark, Picture, PointMark, SupportMark, View
from viewer.scene.region_marks import SAID as ONE_SIDED
from viewer.scene.region_marks import region_marks
from viewer.scene.showing import Showing
from viewer.scene.strut_marks import Strut, strut_marks
from viewer.scene.surface import drawn_areas
from viewer.scene.tokens import BASE_WIDTH
from viewer.scene.view import side_height
from viewer.workspace import Study

# Height ÷ width, so that 960 wide gives multiples of 16 (video needs them).
SINGLE, OVERLAY = 720 / 960, 640 / 960
WHOLE = Showing()
SPRINGS_WORTH_SAYING = 0.005  # share of the strain energy


def single_picture(
    study: Study,
    mode: int,
    *,
    true_scale: bool = False,
    peak_percent: float | None = None,
    energy: bool = True,
    given_energy: bool = False,
    width: int = 960,
    showing: Showing = WHOLE,
    node_lines: bool = False,
    finding: HingeFinding | None = None,
    chosen: int = 0,
    struts: Sequence[Strut] = (),
    **look: Any,
) -> Picture:
    """The picture of mode number ``mode`` (from 1). ``look``: theme, ghost, mesh_edges, view of ``Picture``.

    ``given_energy`` colours by the strain energies that came with the modes.
    ``finding`` marks the hinges and flaps of the mode; hinge number ``chosen`` is set off from the others.
    ``struts`` are drawn between two places each, with words.
    ``showing`` leaves parts out; ``node_lines`` draws where a standing mode does not move.

    ``RefusedError`` when true scale is asked for and no size is known; ``InputError`` for a mode that is not there.
    """
    index = study.index_of(mode)
    scale = study.scale(index, true_scale=true_scale, peak_percent=peak_percent)
    body = mode_body(study, index, scale, scale.turn, energy and not given_energy)
    if given_energy:
        body = replace(body, density=_given_density(study, index))
    body = replace(_with_finding(body, finding, scale, chosen), struts=strut_marks(body, struts))
    note = scale_note(
        mode,
        study.name(index),
        float(study.modes.freq_hz[index]),
        scale,
        [study.condition, *_energy_remarks(study, index, energy and not given_energy)],
    )
    turned_view = _view_of(body, chosen, finding) if chosen and "view" not in look else None
    if turned_view is not None:
        look["view"] = turned_view
    shown, said = _shown([body], showing, node_lines, look)
    if turned_view is not None:
        said = (*said, "view turned to show the hinge")
    if finding is not None and not finding.hinges:
        said = (*said, verdict_words(finding))
    return Picture(
        bodies=shown,
        note=replace(note, drawing=(*note.drawing, *said)),
        magnification=scale.magnification,
        energy_top=_top([body]),
        energy_words="given strain energy density ÷ mean" if given_energy else Picture.energy_words,
        energy_caution="" if given_energy else _caution([study], [index], [body]),
        magnified=_magnified(scale) if true_scale else None,
        width=width,
        height=picture_height(width, SINGLE),
        **look,
    )


def pair_picture(
    first: Study,
    first_mode: int,
    second: Study,
    second_mode: int,
    *,
    layout: str = "side",
    true_scale: bool = False,
    enlarge: float = 1.0,
    energy: bool = True,
    width: int = 960,
    paired_by: str = "",
    showing: Showing = WHOLE,
    node_lines: bool = False,
    findings: tuple[HingeFinding | None, HingeFinding | None] = (None, None),
    **look: Any,
) -> Picture:
    """The picture of two modes of two designs, ``layout`` "side" or "overlay", on one colour scale.

    ``showing`` and ``node_lines`` as for one mode.
    ``findings`` mark hinges and flaps of designs side by side, named only; an overlay shows form alone.
    ``enlarge`` draws both that many times as large as they are drawn by themselves.
    ``paired_by`` says in the note who or what decided that these two correspond.
    """
    studies, modes = (first, second), (first_mode, second_mode)
    indices = [study.index_of(mode) for study, mode in zip(studies, modes, strict=True)]
    scales, basis = compared_scales(studies, indices, true_scale, enlarge)
    energy = energy and layout == "side"  # an overlay shows form; two energy fields would hide one another
    bodies = tuple(
        mode_body(study, i, scale, scale.turn, energy)
        for study, i, scale in zip(studies, indices, scales, strict=True)
    )
    if layout == "side":
        bodies = tuple(
            _with_finding(body, finding, scale, brief=True)
            for body, finding, scale in zip(bodies, findings, scales, strict=True)
        )
    alone = first.support_with(second).regions if layout == "overlay" else ()
    bodies = tuple(replace(body, regions=region_marks(alone, body.name)) for body in bodies)
    coloured = [body for body in bodies if body.density is not None]
    remarks = [first.condition, second.condition, paired_by]
    remarks += [
        f"{study.design.name}: {remark}"
        for study, i in zip(studies, indices, strict=True)
        for remark in _energy_remarks(study, i, energy)
    ]
    note = scale_note(
        modes,
        first.name(indices[0]) or second.name(indices[1]),
        None,
        (scales[0], scales[1]),
        remarks,
        names=(first.design.name, second.design.name),
        one_colour_scale=len(coloured) == 2,
        size_basis=basis,
    )
    shown, said = _shown(bodies, showing, node_lines, look)
    said = (*said, ONE_SIDED) if alone else said
    picture = Picture(
        bodies=shown,
        note=replace(note, drawing=(*note.drawing, *said)),
        layout=layout,
        magnification=scales[0].magnification,
        energy_top=_top(bodies),
        energy_words="strain energy density ÷ own mean",
        energy_caution=_caution(studies, indices, bodies),
        width=width,
        height=picture_height(width, OVERLAY),
        **look,
    )
    if layout == "overlay":
        return picture
    return picture.with_(height=picture_height(width, side_height(picture, note_height(picture)) / BASE_WIDTH))


def _view_of(body: Body, chosen: int, finding: HingeFinding | None) -> View | None:
    """The side that shows hinge number ``chosen`` and its flaps; None when that is the usual one."""
    if finding is None:
        return None
    cells = [hinge.cells for hinge in finding.hinges if hinge.number == chosen]
    cells += [flap.cells for flap in finding.flaps if chosen in flap.hinges]
    found = facing_view(body, np.concatenate(cells), View()) if cells else View()
    return None if found.toward_eye == View().toward_eye else found


def _with_finding(
    body: Body, finding: HingeFinding | None, scale: Scale, chosen: int = 0, *, brief: bool = False
) -> Body:
    """The body with marks for what was found in its mode, drawn turned and sized by ``scale``."""
    if finding is None:
        return body
    hinges = hinge_marks(finding, scale, scale.turn, body.mesh, chosen, brief=brief)
    return replace(body, hinges=hinges, flaps=flap_marks(finding, brief=brief))


def _shown(
    bodies: Sequence[Body], showing: Showing, node_lines: bool, look: Mapping[str, Any]
) -> tuple[tuple[Body, ...], tuple[str, ...]]:
    """The bodies as far as they are shown, with their node lines, and what the note says about it."""
    said = list(showing.words)
    if node_lines:
        bodies = [replace(body, node_lines=lines_of(body)) for body in bodies]
        told = [lines_words(body.node_lines) for body in bodies]
        said += told[:1] if len(set(told)) == 1 else [f"{b.name}: {t}" for b, t in zip(bodies, told, strict=True)]
    return showing.parts(bodies, look.get("view", View()).toward_eye), tuple(said)


def compared_scales(
    studies: tuple[Study, Study], indices: Sequence[int], true_scale: bool = False, enlarge: float = 1.0
) -> tuple[tuple[Scale, ...], str]:
    """The scales at which two modes are comparable, ``enlarge`` times as large as they are drawn by themselves, and
    what is made equal where their sizes are unknown."""
    turn = studies[0].turn_of(indices[0], studies[1], indices[1])
    scales, basis = equal_scales(studies, indices, true_scale, [1.0, turn])
    return tuple(scale.enlarged(enlarge) for scale in scales), basis


def equal_scales(
    studies: tuple[Study, Study],
    indices: Sequence[int],
    true_scale: bool = False,
    turns: Sequence[complex] = (1.0, 1.0),
) -> tuple[tuple[Scale, ...], str]:
    """The same, with given signs and phases: what can be had at once."""
    found = [study.scale(i, true_scale=true_scale) for study, i in zip(studies, indices, strict=True)]
    masses, basis = _sizes(studies, indices)
    return common_scale(found, masses, turns), basis


def _sizes(studies: Sequence[Study], indices: Sequence[int]) -> tuple[list[float], str]:
    """What makes two shapes of unknown size equally large: modal masses, or without masses mean square motion."""
    masses = [study.modal_mass(i) for study, i in zip(studies, indices, strict=True)]
    if all(mass is not None for mass in masses):
        return [float(mass or 0.0) for mass in masses], "modal mass"
    moved = [s.modes.shape(i)[s.design.mesh.used_nodes] for s, i in zip(studies, indices, strict=True)]
    return [float(np.mean(np.sum(np.abs(m) ** 2, axis=1))) for m in moved], "mean square motion"


def mode_body(study: Study, index: int, scale: Scale, turn: complex, energy: bool) -> Body:
    """The body of mode ``index`` (from 0) with its marks, coloured by ``energy`` where it is known."""
    design, shape = study.design, study.turned_shape(index, turn)
    supports = tuple(
        SupportMark(item.name, item.where.rows(design.mesh, f"support '{item.name}'"))
        for item in design.physics.supports
    )
    masses, points = [], []
    for carried in study.carried:
        motion = carried.motion(shape)
        if isinstance(carried.item, LumpedMass):
            masses.append(MassMark(carried.name, carried.item.mass, carried.position, carried.rows, motion))
        else:
            point = carried.item
            label = ": ".join(part for part in (point.effect or point.name, point.direction_word) if part)
            points.append(PointMark(label, carried.position, point.direction, motion, carried.rows))
    density = None
    if energy and study.energies is not None and study.has_strain(index):
        density = study.energies.density(index)
    return Body(
        design.name,
        design.mesh,
        shape,
        scale.factor,
        float(study.modes.freq_hz[index]),
        density,
        supports,
        tuple(masses),
        tuple(points),
    )


def _given_density(study: Study, index: int) -> Array:
    volumes = None if study.energies is None else study.energies.volumes
    return given_density(study.design.mesh, study.modes, index, volumes)


def _top(bodies: Sequence[Body]) -> float | None:
    coloured = [(body.density, drawn_areas(body.mesh)) for body in bodies if body.density is not None]
    return energy_top([d for d, _ in coloured], [a for _, a in coloured]) if coloured else None


def _caution(studies: Sequence[Study], indices: Sequence[int], bodies: Sequence[Body]) -> str:
    """One short line under the colour bar when a body's energies are not trusted, or relative only."""
    relative: list[str] = []
    doubtful: list[str] = []
    for study, index, body in zip(studies, indices, bodies, strict=True):
        if body.density is not None and study.energies is not None and not study.energies.trusted[index]:
            (relative if study.relative else doubtful).append(study.design.name)
    if len(bodies) == 1:
        return RELATIVE if relative else "energies not trusted" if doubtful else ""
    said = [f"{RELATIVE}: {', '.join(relative)}"] if relative else []
    said += [f"not trusted: {', '.join(doubtful)}"] if doubtful else []
    return "; ".join(said)


def _energy_remarks(study: Study, index: int, energy: bool) -> list[str]:
    found = study.energies
    if not energy or found is None or not study.has_strain(index):
        return []
    remarks = []
    springs = found.spring_share(index)
    if springs >= SPRINGS_WORTH_SAYING:
        remarks.append(f"springs hold {digits(100 * springs)} % of the strain energy")
    if study.relative:
        remarks.append(f"energies {RELATIVE}")
    elif not found.trusted[index]:
        figures = found.to_dict(index)
        said = f"energies not trusted: closure {figures['closure']:.2f}"
        if figures["residual"] is not None:
            said += f", residual {digits(100 * figures['residual'])} %"
        remarks.append(said)
    return remarks


def _magnified(scale: Scale) -> Magnified:
    motion = np.array(scale.largest_motion)
    return Magnified(
        scale.largest_place, np.array(scale.largest_at), motion / np.linalg.norm(motion), scale.largest_real or 0.0
    )


def picture_height(width: int, ratio: float) -> int:
    """Height in real pixels of a picture, a multiple of 16 (video needs it)."""
    return 16 * round(width * ratio / 16)
