"""A strut trial as a picture: the mode with the bar that would raise it, its frequency before and after."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from viewer.errors import InputError, RefusedError
from viewer.insight.strut_finding import StrutTrial, TrialStrut
from viewer.scene.compose import single_picture
from viewer.scene.figures import GAP, hertz
from viewer.scene.picture import Picture
from viewer.scene.strut_marks import Strut
from viewer.workspace import Study

ESTIMATE = "the strut is an estimate: joints are softer than this"


def strut_picture(study: Study, mode: int, trial: StrutTrial, rank: int = 1, **look: Any) -> Picture:
    """Mode number ``mode`` (from 1) with strut number ``rank`` (from 1, the best) of its ``trial``; ``look`` as for
    ``single_picture``. ``RefusedError`` when the trial found no strut, ``InputError`` for a rank it does not have."""
    if not trial.struts:
        raise RefusedError(f"no strut was found for mode {mode} of '{study.design.name}'", do="allow other places")
    if not 1 <= rank <= len(trial.struts):
        raise InputError(f"the trial has no strut {rank}", expected=f"1 to {len(trial.struts)}")
    picture = single_picture(study, mode, struts=(_strut(trial, trial.struts[rank - 1], rank),), **look)
    note = replace(picture.note, drawing=(*picture.note.drawing, ESTIMATE))
    return picture.with_(note=note)


def _strut(trial: StrutTrial, strut: TrialStrut, rank: int) -> Strut:
    lines = [f"strut {rank}"]
    if strut.resolved is not None:
        before = trial.freq_hz if trial.model_freq_hz is None else trial.model_freq_hz
        lines.append(f"{_change(before, strut.resolved.freq_hz)} re-solved{_mixed(strut.resolved.mixed)}")
        lines.append(f"predicted {hertz(strut.predicted.freq_hz)}")
    else:
        lines.append(f"{_change(trial.freq_hz, strut.predicted.freq_hz)} predicted{_mixed(strut.predicted.mixed)}")
    return strut.first.centre, strut.other.centre, lines


def _change(before: float, after: float) -> str:
    return f"{hertz(before).removesuffix(f'{GAP}Hz')} → {hertz(after)}"


def _mixed(mixed: bool) -> str:
    return ", mixed with others" if mixed else ""
