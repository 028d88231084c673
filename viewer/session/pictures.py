"""From a state to the picture on the stage: the same pictures that the command line draws, at any size."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from viewer.errors import RefusedError
from viewer.insight.hinges import HingeFinding
from viewer.insight.scale import Scale
from viewer.model.written import hertz
from viewer.scene.compose import pair_picture, single_picture
from viewer.scene.difference_picture import difference_picture
from viewer.scene.gain_picture import gain_picture
from viewer.scene.note_layout import mode_title
from viewer.scene.picture import Picture, View
from viewer.session.project import Project
from viewer.session.state import State
from viewer.workspace import Study


def picture_of(project: Project, state: State, size: tuple[int, int] | None = None) -> Picture:
    """What is on the stage; ``size`` in real pixels, None: that of an export, 960 wide.

    The studies that it needs must be known (see :func:`wanted`). Raises what composing raises.
    """
    if state.compared:
        picture = _pair(project, state)
    else:
        picture = _single(project, state)
    picture = _named(project, state, picture)
    return picture if size is None else picture.with_(width=size[0], height=size[1])


def wanted(project: Project, state: State) -> tuple[str, ...]:
    """The designs whose studies the picture needs and that are not known yet."""
    needed = [state.design]
    if state.compared and (other := project.other_of(state.design, state.other)):
        needed.append(other)
    return tuple(name for name in needed if project.study(name) is None)


def fitted_by(state: State) -> tuple[Any, ...]:
    """Two states that agree in this show the same thing from the same place: the camera may stay as the user left
    it."""
    whose = (state.design, state.mode, state.layout, state.other, state.other_mode)
    return (*whose, state.fits, state.hinge, state.subject == "change")


def second_mode(project: Project, state: State) -> int | None:
    """The mode of the other design that is compared with; None when the chosen mode has no counterpart."""
    other = project.other_of(state.design, state.other)
    return state.other_mode or (project.partner(state.design, state.mode, other) if other else None)


def scale_of(project: Project, state: State) -> Scale | None:
    """How the chosen mode is drawn by itself."""
    study = project.study(state.design)
    if study is None or not 1 <= state.mode <= study.count:
        return None
    return study.scale(state.mode - 1)


def name_of(project: Project, state: State, design: str, mode: int) -> str:
    """The user's name of a mode, saved or not."""
    if (design, mode) in state.named:
        return state.named[design, mode]
    study = project.study(design)
    return "" if study is None or not 1 <= mode <= study.count else study.name(mode - 1)


def _single(project: Project, state: State) -> Picture:
    study = _study(project, state.design)
    told = project.told.get((state.design, state.mode))
    if state.subject == "change" and told is not None and told.gain is not None and not told.gain.rigid:
        try:
            return gain_picture(study, state.mode, told.gain, **_look(state))
        except RefusedError:
            pass
    scale = study.scale(study.index_of(state.mode))
    known = scale.magnification is not None
    size: dict[str, Any] = {"true_scale": state.true_scale and known}
    if not size["true_scale"] and state.enlarge != 1.0:
        size["peak_percent"] = scale.drawn_percent * state.enlarge
    return single_picture(
        study,
        state.mode,
        energy=state.energy,
        node_lines=state.node_lines,
        finding=_finding(project, state, state.design, state.mode),
        chosen=state.hinge if state.hinges and state.energy and told is not None and told.hinges is not None else 0,
        **size,
        **_look(state),
    )


def _pair(project: Project, state: State) -> Picture:
    other = project.other_of(state.design, state.other)
    if not other:
        raise RefusedError("there is one design only, so nothing to compare", do="add another [[designs]]")
    theirs = second_mode(project, state)
    if theirs is None:
        raise RefusedError(
            f"mode {state.mode} of '{state.design}' has no counterpart among the modes of '{other}'",
            do="choose another mode, or a pair in the pairing picture",
        )
    first, second = _study(project, state.design), _study(project, other)
    true = state.true_scale and all(
        s.scale(m - 1).magnification is not None for s, m in ((first, state.mode), (second, theirs))
    )
    if state.layout == "difference":
        return difference_picture(first, state.mode, second, theirs, true_scale=true, **_look(state))
    return pair_picture(
        first,
        state.mode,
        second,
        theirs,
        layout=state.layout,
        true_scale=true,
        energy=state.energy,
        node_lines=state.node_lines,
        findings=(
            _finding(project, state, state.design, state.mode),
            _finding(project, state, other, theirs),
        ),
        **_look(state),
    )


def _finding(project: Project, state: State, design: str, mode: int) -> HingeFinding | None:
    told = project.told.get((design, mode))
    return told.hinges if told is not None and state.hinges and state.energy else None


def _look(state: State) -> dict[str, Any]:
    look: dict[str, Any] = {"theme": state.theme, "ghost": state.ghost, "mesh_edges": state.mesh_edges}
    if (state.view.toward_eye, state.view.up) != (View().toward_eye, View().up):
        look["view"] = state.view
    return look


def _named(project: Project, state: State, picture: Picture) -> Picture:
    """The picture with names that are not saved yet in its title."""
    if (state.design, state.mode) not in state.named or picture.layout != "single" or state.compared:
        return picture
    title = mode_title(state.mode, state.named[state.design, state.mode])
    return picture.with_(note=replace(picture.note, title=title))


def _study(project: Project, design: str) -> Study:
    found = project.study(design)
    if found is None:
        raise RefusedError(f"design '{design}' has not been read yet")
    return found


def heading(project: Project, state: State) -> str:
    """ "mode 1 · 84.6 Hz" """
    study = project.study(state.design)
    if study is None or not 1 <= state.mode <= study.count:
        return ""
    return f"mode {state.mode} · {hertz(float(study.modes.freq_hz[state.mode - 1]))}"
