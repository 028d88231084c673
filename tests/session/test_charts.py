"""Charts of the window: what a place of them stands for, and what it puts on the stage."""

from __future__ import annotations

import pytest

from viewer.scene.primitives import Sheet, Spot
from viewer.session import Project, State, actions
from viewer.session.charts import chart_of, next_spot, put_spot, shown_spot, spot_at


def square(x: float, y: float, what: tuple) -> Spot:
    return Spot(((x, y), (x + 10, y), (x + 10, y + 10), (x, y + 10)), what, f"{what}")


GRID = Sheet(100, 100, (), spots=tuple(square(20 * i, 20 * j, (j, i)) for j in range(3) for i in range(4)))


def test_a_point_finds_its_spot():
    assert spot_at(GRID, (25, 5)) == 1 and spot_at(GRID, (65, 45)) == 11
    assert spot_at(GRID, (15, 5)) == -1, "between two"
    turned = Sheet(100, 100, (), spots=(Spot(((0, 0), (0, 10), (10, 10), (10, 0)), (1,), ""),))
    assert spot_at(turned, (5, 5)) == 0, "either way round"


def test_keys_travel_by_place():
    """Every spot is reached from every other by the four ways."""
    assert next_spot(GRID, 0, (1, 0)) == 1 and next_spot(GRID, 0, (0, 1)) == 4
    assert next_spot(GRID, 0, (-1, 0)) == 0, "the edge holds"
    assert next_spot(GRID, -1, (1, 0)) == 0, "the first, when none is chosen"
    reached, new = {0}, {0}
    while new:
        new = {next_spot(GRID, s, way) for s in new for way in ((1, 0), (-1, 0), (0, 1), (0, -1))} - reached
        reached |= new
    assert reached == set(range(12))


@pytest.mark.parametrize("page", ["pairing", "ladder"])
def test_a_spot_puts_its_pair_on_the_stage(project, state, page):
    shown = actions.turn_page(state, page)
    sheet = chart_of(project, shown)
    assert isinstance(sheet, Sheet)
    partner = project.partner("thin", 2, "thick")
    spot = next(s for s in sheet.spots if s.what == (2, partner))
    after = put_spot(shown, project, spot)
    assert (after.mode, after.other_mode, after.layout, after.page) == (2, partner, "side", "stage")
    again = actions.turn_page(after, page)
    assert sheet.spots[shown_spot(project, again, sheet)].what == (2, partner)


def test_the_pairing_picture_has_a_cell_for_every_two(project, state):
    sheet = chart_of(project, actions.turn_page(state, "pairing"))
    assert sorted(s.what for s in sheet.spots) == [(i, j) for i in range(1, 5) for j in range(1, 5)]
    other = put_spot(actions.turn_page(state, "pairing"), project, next(s for s in sheet.spots if s.what == (1, 3)))
    assert (other.mode, other.other_mode) == (1, 3), "also two that are no pair"


def test_a_lineage_puts_one_mode_on_the_stage(project, state):
    from viewer.session.loading import follow

    known = project.with_lineage(follow(project.opened))
    shown = actions.turn_page(state, "lineage")
    sheet = chart_of(known, shown)
    spot = next(s for s in sheet.spots if s.what == (known.lineage.labels.index("thick"), 3))
    after = put_spot(shown, known, spot)
    assert (after.design, after.mode, after.layout, after.page) == ("thick", 3, "single", "stage")


def test_charts_say_what_they_wait_for(project, state):
    empty = Project(project.opened, studies=project.studies)
    assert "pairing the modes of thin and thick" in chart_of(empty, actions.turn_page(state, "pairing"))
    assert "following" in chart_of(empty, actions.turn_page(state, "lineage"))
    refused = empty.with_comparison(("thin", "thick"), "they share nothing")
    assert chart_of(refused, actions.turn_page(state, "ladder")) == "they share nothing"
    assert "[[tests]]" in chart_of(project, actions.turn_page(state, "test pairing"))
    assert actions.turn_page(actions.turn_page(State(), "ladder"), "ladder").page == "stage"
