"""Pure actions: each takes a state (and what is known of the project where it must) and returns the next one."""

from __future__ import annotations

from viewer.scene.picture import View
from viewer.session.project import Project
from viewer.session.state import DESIGN_LAYOUTS, LAYOUTS, PAGES, SUBJECTS, TEST_LAYOUTS, Band, Picked, State

LEAST_ENLARGED, MOST_ENLARGED = 1e-9, 5.0

VIEWS = {
    "usual": View(),
    "front": View((0.0, -1.0, 0.0)),
    "back": View((0.0, 1.0, 0.0)),
    "left": View((-1.0, 0.0, 0.0)),
    "right": View((1.0, 0.0, 0.0)),
    "top": View((0.0, 0.0, 1.0), (0.0, 1.0, 0.0)),
    "below": View((0.0, 0.0, -1.0), (0.0, 1.0, 0.0)),
}


# ---- what is chosen


def choose_mode(state: State, mode: int, project: Project | None = None) -> State:
    """Show mode ``mode``; a hinge, a picked point and a stated partner were the last mode's."""
    count = project.count(state.design) if project is not None else 0
    if mode == state.mode or not 1 <= mode <= (count or mode):
        return state
    return state.with_(
        mode=mode, hinge=0, other_mode=None, test_mode=None, subject=_kept_subject(state), page="stage"
    )


def step_mode(state: State, step: int, shown: tuple[int, ...]) -> State:
    """To the mode ``step`` places further among the numbers ``shown``; stops at the ends."""
    if not shown:
        return state
    at = shown.index(state.mode) if state.mode in shown else (0 if step < 0 else -1)
    return choose_mode(state, shown[min(max(at + step, 0), len(shown) - 1)])


def choose_design(state: State, design: str, project: Project | None = None) -> State:
    """Show one design alone: the mode that the present one became there, where that is known."""
    if design == state.design:
        return compare(state, "single")
    mode = state.mode
    if project is not None:
        mode = project.partner(state.design, state.mode, design) or min(mode, project.count(design) or mode)
    return state.with_(
        design=design,
        mode=mode,
        other="",
        other_mode=None,
        test="",
        test_mode=None,
        layout="single",
        page="stage",
        hinge=0,
        picked=None,
        subject=_kept_subject(state),
    )


def _kept_subject(state: State) -> str:
    return "" if state.subject in ("redesign", "change") else state.subject


def compare(state: State, layout: str) -> State:
    """Put the other design, or a hammer test, beside this one or over it, or take it away (``single``)."""
    return state if layout not in LAYOUTS else state.with_(layout=layout, page="stage")


def next_layout(state: State) -> State:
    """The next of single, side by side, overlay and difference."""
    return compare(state, _next(("single", *DESIGN_LAYOUTS), state.layout))


def next_test_layout(state: State) -> State:
    """The next of single, the test over the design, beside it, and alone."""
    return compare(state, _next(("single", *TEST_LAYOUTS), state.layout))


def _next(layouts: tuple[str, ...], now: str) -> str:
    at = layouts.index(now) if now in layouts else 0
    return layouts[(at + 1) % len(layouts)]


def put_pair(state: State, first: int | None, second: int | None, layout: str = "side") -> State:
    """Put a pair of the pairing picture on the stage; a mode without counterpart is shown alone."""
    if first is None:
        return state if second is None or not state.other else choose_design(state, state.other).with_(mode=second)
    shown = choose_mode(state, first)
    if second is None:
        return compare(shown, "single")
    return compare(shown, layout).with_(other_mode=second)


def put_test_pair(state: State, test_mode: int | None, mode: int | None) -> State:
    """Put a test mode and a mode of the design on the stage; one without counterpart is shown alone."""
    if mode is None:
        return compare(state, "test alone").with_(test_mode=test_mode)
    shown = choose_mode(state, mode)
    if test_mode is None:
        return compare(shown, "single")
    layout = shown.layout if shown.layout in ("test over", "test beside") else "test over"
    return compare(shown, layout).with_(test_mode=test_mode)


def compare_with(state: State, other: str) -> State:
    """Compare with the design ``other``."""
    return state if other == state.design else state.with_(other=other, other_mode=None)


def choose_test(state: State, test: str) -> State:
    """Set the hammer test ``test`` beside the design."""
    return state.with_(test=test, test_mode=None)


def set_beside(state: State, name: str) -> State:
    """Have ``name`` beside the design: a test where tests are shown, else another design."""
    return choose_test(state, name) if state.tested else compare_with(state, name)


def turn_page(state: State, page: str) -> State:
    """Show the stage or one of the charts; the same chart again goes back to the stage."""
    if page not in PAGES:
        return state
    return state.with_(page="stage" if page == state.page else page)


# ---- how it is drawn


def true_scale(state: State) -> State:
    return state.with_(true_scale=True)


def drawn_scale(state: State) -> State:
    """Back to the size that is drawn by itself."""
    return state.with_(true_scale=False, enlarge=1.0)


def enlarge(state: State, factor: float) -> State:
    """Draw motion ``factor`` times as large as it is drawn by itself."""
    return state.with_(true_scale=False, enlarge=min(max(factor, LEAST_ENLARGED), MOST_ENLARGED))


def switch(state: State, what: str) -> State:
    """Turn one of energy, ghost, hinges, mesh_edges, node_lines on or off."""
    return state.with_(**{what: not getattr(state, what)})


def toggle_theme(state: State) -> State:
    return state.with_(theme="dark" if state.theme == "light" else "light")


def set_theme(state: State, theme: str) -> State:
    return state.with_(theme=theme)


# ---- what is lit


def light(state: State, subject: str, hinges: int = 0, tested: bool = False) -> State:
    """Light up what a sentence speaks of; the lit one again: the next of its ``hinges``, then none. ``tested``: the
    design has a hammer test, which stands beside it while that is spoken of."""
    if subject not in SUBJECTS:
        return state
    if subject == "folds":
        chosen = 1 if state.subject != "folds" else state.hinge + 1
        if chosen > max(hinges, 1):
            return unlight(state)
        lit = state.with_(subject=subject, hinge=chosen if hinges else 0, layout="single", page="stage")
        return lit.with_(energy=True, hinges=True)
    if state.subject == subject:
        return unlight(state)
    lit = state.with_(subject=subject, hinge=0, page="stage")
    if subject == "redesign":
        return lit.with_(layout=state.layout if state.compared else "side")
    if subject == "model" and tested:
        return lit.with_(layout=state.layout if state.tested else "test over")
    return lit.with_(layout="single")


def unlight(state: State) -> State:
    single = state.subject == "redesign" or (state.subject == "model" and state.tested)
    return state.with_(subject="", hinge=0, picked=None, layout="single" if single else state.layout)


def pick(state: State, row: int = -1, name: str = "") -> State:
    """Pick a node row or a named point; neither: none."""
    return state.with_(picked=Picked(row, name) if row >= 0 or name else None)


# ---- the gallery


def set_band(state: State, band: Band) -> State:
    return state.with_(band=band)


def rename(state: State, design: str, mode: int, name: str) -> State:
    """The user's name of a mode, kept until it is saved."""
    return state.with_(named={**state.named, (design, mode): name.strip()})


def saved(state: State) -> State:
    """Names are in the dossier now."""
    return state.with_(named={})


# ---- looking and playing


def look_from(state: State, name: str) -> State:
    """Look from one of ``VIEWS`` and see everything."""
    return state.with_(view=VIEWS[name], fits=state.fits + 1)


def turn(state: State, view: View) -> State:
    """The eye went elsewhere."""
    return state.with_(view=view)


def fit(state: State) -> State:
    """See everything from where the eye stands."""
    return state.with_(fits=state.fits + 1)


def play(state: State) -> State:
    """Play, or stand still."""
    return state.with_(playing=not state.playing)


def stand_at(state: State, phase: float) -> State:
    """Stand still at a phase (rad)."""
    return state.with_(playing=False, phase=phase)
