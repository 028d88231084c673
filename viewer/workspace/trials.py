"""Strut trials of a dossier's designs; large ones in a process that can be killed."""

from __future__ import annotations

from functools import partial

import numpy as np

from viewer.insight.strut import RESOLVED, strut_trial
from viewer.insight.strut_finding import StrutTrial
from viewer.jobs import SILENT, Progress, in_child
from viewer.workspace.workspace import IN_CHILD_ABOVE, OpenDossier


def try_struts(
    opened: OpenDossier,
    name: str,
    mode: int | None = None,
    *,
    stiffness: float | None = None,
    top: int = 10,
    resolve: int = RESOLVED,
    progress: Progress = SILENT,
) -> StrutTrial:
    """Struts for mode ``mode`` (number from 1; None: the lowest elastic one) of the named design, past the dossier's
    clearances. Other arguments and errors as those of :func:`viewer.insight.strut.strut_trial`."""
    plan, design = opened.dossier.plan(name), opened.design(name, progress)
    modes = opened.modes(name, max(mode or 1, plan.mode_count), progress)
    number = mode or 1 + int(np.argmax(modes.freq_hz > 0))
    run = partial(
        strut_trial,
        design,
        modes,
        number,
        stiffness=stiffness,
        clearances=plan.clearances,
        top=top,
        resolve=resolve,
    )
    if design.mesh.n_nodes <= IN_CHILD_ABOVE:
        return run(progress=progress)
    found: StrutTrial = in_child(run, progress=progress, stage=f"trying struts on {name}")
    return found
