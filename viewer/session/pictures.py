"""From a state to the picture on the stage: the same pictures that the command line draws, at any size."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from viewer.errors import RefusedError
from viewer.insight.hinges import HingeFinding
from viewer.insight.scale import DRAWN_PEAK, Scale
from viewer.insight.wrong_channels import Faults
from viewer.model.written import hertz
from viewer.scene.compose import equal_scales, pair_picture, single_picture
from viewer.scene.difference_picture import difference_picture
from viewer.scene.gain_picture import gain_picture
from viewer.scene.hammer_picture import alone_picture, beside_picture, over_picture
from viewer.scene.note_layout import mode_title
from viewer.scene.picture import Picture, View
from viewer.session.project import Project, Tested
from viewer.session.state import State
from viewer.workspace import Study


def picture_of(project: Project, state: State, size: tuple[int, int] | None = None) -> Picture:
    """What is on the stage; ``size`` in real pixels, None: that of an export, 960 wide.

    The studies that it needs must be known (see :func:`wanted`). Raises what composing raises.
    """
    if state.compared:
        picture = _pair(project, state)
    elif state.tested:
        picture = _test(project, state)
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


def waiting(project: Project, state: State) -> bool:
    """Whether something that the picture needs is still to be found out."""
    if wanted(project, state):
        return True
    if state.tested:
        name = test_of(project, state)
        return bool(name) and name not in project.tests
    if not state.compared or second_mode(project, state) is not None:
        return False
    other = project.other_of(state.design, state.other)
    return bool(other) and (state.design, other) not in project.comparisons


def fitted_by(state: State) -> tuple[Any, ...]:
    """Two states that agree in this show the same thing from the same place: the camera may stay as the user left
    it."""
    whose = (state.design, state.mode, state.layout, state.other, state.other_mode, state.test, state.test_mode)
    return (*whose, state.fits, state.hinge, state.subject == "change")


def second_mode(project: Project, state: State) -> int | None:
    """The mode of the other design that is compared with; None when the chosen mode has no counterpart."""
    other = project.other_of(state.design, state.other)
    return state.other_mode or (project.partner(state.design, state.mode, other) if other else None)


def test_of(project: Project, state: State) -> str:
    """The hammer test that is set beside the design: the chosen one, else its first; empty when it has none."""
    names = project.tests_of(state.design)
    return state.test if state.test in names else next(iter(names), "")


def has_test_shape(project: Project, state: State) -> bool:
    """Whether a hammer test has a shape to set beside the chosen mode, as far as is known."""
    name = test_of(project, state)
    if not name or name not in project.tests:
        return bool(name)
    tested = project.tested(name)
    return tested is not None and test_mode_of(tested, state) is not None


def against(project: Project, state: State) -> tuple[tuple[str, ...], str]:
    """What can be beside the design in this layout, other designs or its tests, and which one is."""
    if state.tested:
        return project.tests_of(state.design), test_of(project, state)
    others = tuple(name for name in project.designs if name != state.design)
    return (others, project.other_of(state.design, state.other)) if state.compared else ((), "")


def scale_of(project: Project, state: State) -> Scale | None:
    """How what is on the stage is drawn when nothing else is wished: of a pair, how its first mode is."""
    study = project.study(state.design)
    if study is None or not 1 <= state.mode <= study.count:
        return None
    if state.layout == "test alone":  # a test has no size of its own, nor one lent by an analysis
        alone = study.scale(state.mode - 1)
        return replace(alone, magnification=None, largest_real=None, drawn_percent=100 * DRAWN_PEAK)
    second, theirs = _counterpart(project, state)
    if second is None or theirs is None:
        return study.scale(state.mode - 1)
    return equal_scales((study, second), (state.mode - 1, theirs - 1))[0][0]


def require_size(project: Project, state: State) -> None:
    """``RefusedError`` that says what to give when what is on the stage has no known size."""
    if state.layout == "test alone":
        raise RefusedError("a test alone cannot be drawn at true scale: its shapes have no size", do="draw it on top")
    project.studies[state.design].scale(state.mode - 1, true_scale=True)
    second, theirs = _counterpart(project, state)
    if second is not None and theirs is not None:
        second.scale(theirs - 1, true_scale=True)


def _counterpart(project: Project, state: State) -> tuple[Study | None, int | None]:
    """The other design of a pair on the stage and its mode, as far as they are known."""
    if not state.compared:
        return None, None
    other = project.study(project.other_of(state.design, state.other))
    theirs = second_mode(project, state)
    return (other, theirs) if other is not None and theirs and theirs <= other.count else (None, None)


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
    size = _size(state, all(s.scale(m - 1).magnification for s, m in ((first, state.mode), (second, theirs))))
    if state.layout == "difference":
        return difference_picture(first, state.mode, second, theirs, **size, **_look(state))
    return pair_picture(
        first,
        state.mode,
        second,
        theirs,
        layout=state.layout,
        energy=state.energy,
        node_lines=state.node_lines,
        findings=(
            _finding(project, state, state.design, state.mode),
            _finding(project, state, other, theirs),
        ),
        **size,
        **_look(state),
    )


def _test(project: Project, state: State) -> Picture:
    """A hammer test over the design's mode, beside it, or alone."""
    name = test_of(project, state)
    if not name:
        raise RefusedError(f"design '{state.design}' has no hammer test", do="add [[tests]] to the dossier")
    tested = project.tested(name)
    if tested is None:
        raise RefusedError(f"test '{name}' has no place beside the design", found=str(project.tests.get(name, "")))
    test_mode = state.test_mode or test_mode_of(tested, state)
    if test_mode is None:
        raise RefusedError(
            f"mode {state.mode} of '{state.design}' has no counterpart in test '{name}'",
            do="choose another mode, or a pair in the pairing picture of the test",
        )
    if state.layout == "test alone":
        return alone_picture(
            tested.placed, test_mode, enlarge=1.0 if state.true_scale else state.enlarge, **_look(state)
        )
    study = _study(project, state.design)
    draw = over_picture if state.layout == "test over" else beside_picture
    return draw(
        study,
        state.mode,
        tested.placed,
        test_mode,
        tested.found.analysis[state.mode - 1],
        labels=_doubted(tested),
        mac=float(tested.correlation.matrix[test_mode - 1, state.mode - 1]),
        **_size(state, study.scale(state.mode - 1).magnification is not None),
        **_look(state),
    )


def _doubted(tested: Tested) -> tuple[str, ...]:
    """The points of channels that seem wrong."""
    proposals = tested.faults.proposals if isinstance(tested.faults, Faults) else ()
    named = [name for p in proposals for name in (p.correction.point, p.correction.other) if name]
    return tuple(dict.fromkeys(name for name in named if name in tested.found.test.labels))


def test_mode_of(tested: Tested, state: State) -> int | None:
    """The test's mode that was paired with the chosen one."""
    pair = tested.pair_of(state.mode)
    return None if pair is None else pair.test


def _size(state: State, known: bool) -> dict[str, Any]:
    """How large it is drawn; without a known size not at true scale."""
    if state.true_scale:
        return {"true_scale": known}
    return {"enlarge": state.enlarge}


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
    if (state.design, state.mode) not in state.named or picture.layout != "single" or state.compared or state.tested:
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
