"""Where to stiffen and where to lighten: a gain map as a diverging picture, drawn at rest."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np

from viewer.errors import RefusedError
from viewer.insight.gain import GainMap
from viewer.model.arrays import Array
from viewer.scene.compose import SINGLE, WHOLE, mode_body, picture_height
from viewer.scene.figures import hertz
from viewer.scene.note_layout import mode_title
from viewer.scene.palette import gain_top
from viewer.scene.picture import Body, CallOut, Note, Picture, View
from viewer.scene.showing import Showing
from viewer.scene.surface import drawn_areas
from viewer.workspace import Study

TITLE = "Hz per kg of the same material"
ESTIMATE = "first-order estimate of small changes: solve the changed design before relying on it"
AT_REST = "drawn at rest"


def gain_picture(
    study: Study, mode: int, gain: GainMap, *, width: int = 960, showing: Showing = WHOLE, **look: Any
) -> Picture:
    """The gain map of mode number ``mode`` (from 1); ``look``: theme, mesh_edges, view of ``Picture``.

    ``RefusedError`` when the map has no figures in Hz: a rigid-body mode, or energies that are relative or not
    trusted.
    """
    index = study.index_of(mode)
    top = gain_top(gain.per_kg, drawn_areas(study.design.mesh))
    if not top > 0:
        raise RefusedError(
            f"mode {mode} of '{study.design.name}' has no gain map in hertz",
            found="a rigid-body mode" if gain.rigid else "energies that are relative or not trusted",
            expected="a mode that bends, with energies of its own",
            do="give materials and check closure and residual of the mode",
        )
    scale = study.scale(index)
    body = mode_body(study, index, scale, scale.turn, energy=False)
    body = replace(body, factor=0.0, gain=gain.per_kg, call_outs=call_outs(body, gain), points=(), masses=body.masses)
    several = f"mean of modes {_listed(gain.modes)} of equal frequency" if len(gain.modes) > 1 else ""
    note = Note(
        mode_title(mode, study.name(index)),
        hertz(float(study.modes.freq_hz[index])),
        (ESTIMATE,),
        tuple(part for part in (AT_REST, several, study.condition) if part),
    )
    shown = showing.parts([body], look.get("view", View()).toward_eye)
    note = replace(note, drawing=(*note.drawing, *showing.words))
    look = {**look, "ghost": False}
    return Picture(
        shown, note, gain_top=top, energy_words=TITLE, width=width, height=picture_height(width, SINGLE), **look
    )


def call_outs(body: Body, gain: GainMap) -> tuple[CallOut, ...]:
    """The worded extremes of ``gain``, signed as their cells are."""
    found = []
    for words, position, cells in gain.callouts:
        value = float(np.nan_to_num(np.nanmean(gain.per_kg[cells]))) if len(cells) else 0.0
        lines = tuple(part.strip() for part in words.split(":", 1))
        at: Array = np.asarray(position, float)
        found.append(CallOut(lines, at, np.zeros(3), 1 if value >= 0 else -1, cells))
    return tuple(found)


def _listed(modes: tuple[int, ...]) -> str:
    return f"{', '.join(str(m) for m in modes[:-1])} and {modes[-1]}"
