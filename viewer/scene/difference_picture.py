"""Where a redesign moves otherwise: the second design's mode, coloured by how far it departs from the first's."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np

from viewer.insight.difference import difference_by_cell
from viewer.model.cycle import cycle_peaks
from viewer.scene.compose import SINGLE, WHOLE, compared_scales, mode_body, picture_height
from viewer.scene.figures import hertz
from viewer.scene.note_layout import scale_note
from viewer.scene.palette import energy_top
from viewer.scene.picture import Picture, View
from viewer.scene.showing import Showing
from viewer.scene.surface import drawn_areas
from viewer.workspace import Study

TITLE = "difference of motion, % of the largest"


def difference_picture(
    first: Study,
    first_mode: int,
    second: Study,
    second_mode: int,
    *,
    true_scale: bool = False,
    enlarge: float = 1.0,
    width: int = 960,
    paired_by: str = "",
    showing: Showing = WHOLE,
    **look: Any,
) -> Picture:
    """The picture of mode ``second_mode`` of the second design, coloured by how far its motion is from that of mode
    ``first_mode`` of the first, in percent of the largest of both; sizes, signs and phases as in a comparison.
    ``look``: theme, ghost, mesh_edges, view of ``Picture``."""
    studies, modes = (first, second), (first_mode, second_mode)
    indices = [study.index_of(mode) for study, mode in zip(studies, modes, strict=True)]
    scales, basis = compared_scales(studies, indices, true_scale, enlarge)
    one, two = (
        scale.factor * study.turned_shape(i, scale.turn)
        for study, i, scale in zip(studies, indices, scales, strict=True)
    )
    body = mode_body(second, indices[1], scales[1], scales[1].turn, energy=False)
    apart = difference_by_cell(first.design.mesh, second.design.mesh, one, two)
    largest = max(
        float(cycle_peaks(u[s.design.mesh.used_nodes]).max()) for s, u in zip(studies, (one, two), strict=True)
    )
    percent = 100 * apart / max(largest, 1e-300)
    body = replace(body, density=percent)
    names = (first.design.name, second.design.name)
    note = scale_note(
        modes,
        first.name(indices[0]) or second.name(indices[1]),
        float(second.modes.freq_hz[indices[1]]),
        (scales[0], scales[1]),
        [first.condition, second.condition, paired_by],
        names=names,
        size_basis=basis,
    )
    was = hertz(float(first.modes.freq_hz[indices[0]]))
    said = [f"{names[1]} drawn, coloured by how far it departs from {names[0]} ({was})"]
    if np.isnan(percent).any():
        said.append(f"no colour where there is no {names[0]}")
    title = f"{note.title}: {names[1]} less {names[0]}"
    note = replace(note, title=title, drawing=(*said, *note.drawing, *showing.words))
    return Picture(
        showing.parts([body], look.get("view", View()).toward_eye),
        note,
        magnification=scales[1].magnification,
        energy_top=energy_top([percent], [drawn_areas(second.design.mesh)]),
        energy_words=TITLE,
        width=width,
        height=picture_height(width, SINGLE),
        **look,
    )
