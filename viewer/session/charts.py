"""The charts of the window: the sheets that exports show, and what a click on a spot of them does."""

from __future__ import annotations

from dataclasses import replace
from math import hypot

from viewer.insight.lineage import LineageFinding
from viewer.scene.correlation_charts import correlation_field, correlation_ladder
from viewer.scene.ladder_chart import ladder_chart
from viewer.scene.lineage_chart import lineage_chart
from viewer.scene.mac_chart import mac_chart
from viewer.scene.primitives import Point, Sheet, Spot
from viewer.session import actions
from viewer.session.pictures import name_of, test_mode_of, test_of
from viewer.session.project import Project, Tested
from viewer.session.state import TEST_PAGES, State
from viewer.workspace.comparison import Comparison


def chart_of(project: Project, state: State) -> Sheet | str:
    """The sheet of the state's page, or in words why there is none (yet)."""
    if state.page == "lineage":
        found = project.lineage
        if isinstance(found, LineageFinding):
            return lineage_chart(found, theme=state.theme)
        return "following the modes through all designs …" if found is None else found
    if state.page in TEST_PAGES:
        return _test_chart(project, state)
    other = project.other_of(state.design, state.other)
    if not other:
        return "There is one design only, so nothing to compare. To do: add another [[designs]] to the dossier."
    paired = project.comparisons.get((state.design, other))
    if not isinstance(paired, Comparison):
        return f"pairing the modes of {state.design} and {other} …" if paired is None else paired
    one, two = (
        [name_of(project, state, design, mode) for mode in range(1, project.count(design) + 1)]
        for design in (state.design, other)
    )
    chart = mac_chart if state.page == "pairing" else ladder_chart
    return chart(paired.pairing, one, two, state.theme)


def _test_chart(project: Project, state: State) -> Sheet | str:
    """A test against the design; spots of modes beyond those that the window shows lead nowhere and are left out."""
    name = test_of(project, state)
    if not name:
        return "This design has no hammer test. To do: add [[tests]] with name and file to the dossier."
    tested = project.tests.get(name)
    if not isinstance(tested, Tested):
        return f"laying test {name} beside {state.design} …" if tested is None else tested
    count = project.count(state.design)
    names = [name_of(project, state, state.design, mode) for mode in range(1, count + 1)]
    chart = correlation_field if state.page == "test pairing" else correlation_ladder
    sheet = chart(tested.correlation, names, state.theme)
    return replace(sheet, spots=tuple(spot for spot in sheet.spots if (_number(spot.what[1]) or 0) <= count))


def shown_spot(project: Project, state: State, sheet: Sheet) -> int:
    """Which spot stands for what is on the stage; −1: none."""
    if isinstance(project.lineage, LineageFinding) and state.page == "lineage":
        wish: tuple[object, ...] = (project.lineage.labels.index(state.design), state.mode)
    elif state.page in TEST_PAGES:
        tested = project.tested(test_of(project, state))
        own = None if tested is None else test_mode_of(tested, state)
        wish = (state.test_mode or own, None if state.layout == "test alone" else state.mode)
    else:
        other = project.other_of(state.design, state.other)
        wish = (state.mode, state.other_mode or project.partner(state.design, state.mode, other))
    return next((i for i, spot in enumerate(sheet.spots) if spot.what == wish), -1)


def put_spot(state: State, project: Project, spot: Spot) -> State:
    """On the stage what the spot stands for: a mode of a design, or a pair."""
    first, second = spot.what
    if isinstance(project.lineage, LineageFinding) and state.page == "lineage":
        design = project.lineage.labels[int(str(first))]
        shown = state if design == state.design else actions.choose_design(state, design)
        return actions.choose_mode(actions.compare(shown, "single"), int(str(second)))
    if state.page in TEST_PAGES:
        return actions.put_test_pair(state, _number(first), _number(second))
    chosen = state.with_(other=project.other_of(state.design, state.other))
    return actions.put_pair(chosen, _number(first), _number(second))


def _number(value: object) -> int | None:
    return None if value is None else int(str(value))


def spot_at(sheet: Sheet, point: Point) -> int:
    """The spot that holds ``point`` (sheet pixels); −1: none. Of several the one whose middle is nearest."""
    holding = [i for i, spot in enumerate(sheet.spots) if _inside(spot.outline, point)]
    return min(holding, key=lambda i: _far(_middle(sheet.spots[i]), point), default=-1)


def next_spot(sheet: Sheet, spot: int, step: Point) -> int:
    """The spot that lies next in the direction ``step`` ((±1, 0) or (0, ±1)); the same one at the edge. Nearest along
    the way, twice as far counts what lies aside."""
    if not 0 <= spot < len(sheet.spots):
        return 0 if sheet.spots else -1
    x, y = _middle(sheet.spots[spot])
    costs = {}
    for i, each in enumerate(sheet.spots):
        dx, dy = _middle(each)[0] - x, _middle(each)[1] - y
        along = dx * step[0] + dy * step[1]
        aside = abs(dx * step[1]) + abs(dy * step[0])
        if i != spot and along > 1e-6:
            costs[i] = along + 2 * aside
    return min(costs, key=lambda i: costs[i], default=spot)


def _middle(spot: Spot) -> Point:
    left, top, right, foot = spot.box
    return (left + right) / 2, (top + foot) / 2


def _far(one: Point, two: Point) -> float:
    return hypot(one[0] - two[0], one[1] - two[1])


def _inside(outline: tuple[Point, ...], point: Point) -> bool:
    """Whether a convex outline holds a point."""
    turns = [
        (bx - ax) * (point[1] - ay) - (by - ay) * (point[0] - ax)
        for (ax, ay), (bx, by) in zip(outline, (*outline[1:], outline[0]), strict=True)
    ]
    return all(turn >= 0 for turn in turns) or all(turn <= 0 for turn in turns)
