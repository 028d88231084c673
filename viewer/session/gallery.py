"""The gallery: which modes it shows, what stands under each, and the small pictures."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from viewer.export.rows import point_rows
from viewer.model.written import hertz
from viewer.scene.compose import single_picture
from viewer.scene.picture import Picture
from viewer.session.pictures import name_of
from viewer.session.project import Project
from viewer.session.state import Band, State
from viewer.workspace import Study

MOVES = 5.0  # percent of the mode's largest motion from which on a mode is said to move a point


@dataclass(frozen=True)
class Item:
    """One mode of the gallery."""

    mode: int
    name: str
    frequency: str


def items(project: Project, state: State) -> tuple[Item, ...]:
    """The modes that the gallery shows, in order."""
    study = project.study(state.design)
    if study is None:
        return ()
    return tuple(
        Item(mode, name_of(project, state, state.design, mode), hertz(float(study.modes.freq_hz[mode - 1])))
        for mode in passing(study, state.band)
    )


def passing(study: Study, band: Band) -> tuple[int, ...]:
    """Numbers of the modes that pass the filter."""
    hz = study.modes.freq_hz
    low = -np.inf if band.low is None else band.low
    high = np.inf if band.high is None else band.high
    kept = {i + 1 for i in range(study.count) if low <= hz[i] <= high}
    if band.moving:
        kept &= {
            row["mode"]
            for row in point_rows(study)
            if row["point"] == band.moving and row["motion_percent_of_largest"] >= MOVES
        }
    return tuple(sorted(kept))


def point_names(study: Study | None) -> tuple[str, ...]:
    """The functional points by which the gallery can be filtered."""
    return () if study is None else tuple(point.name for point in study.design.points)


def thumbnail(study: Study, mode: int, theme: str, width: int, height: int) -> Picture:
    """The small picture of one mode: the body alone, coloured by energy."""
    picture = single_picture(study, mode, theme=theme, ghost=False)
    bodies = tuple(replace(body, points=(), hinges=(), flaps=()) for body in picture.bodies)
    return picture.with_(bodies=bodies, width=width, height=height)
