"""Flaps on a surface, labels of what was found, and what hiding does to both."""

from dataclasses import replace

import numpy as np
import pytest

from tests.scene.findings import FOLD_AT, finding, marked, middles
from tests.scene.sheets import frame_of, known, scale, side
from tests.stage.channel import channel
from viewer.scene.figures import GAP
from viewer.scene.finding_marks import flap_marks
from viewer.scene.flap_outline import flap_outline
from viewer.scene.hinge_marks import near_head
from viewer.scene.labels import picture_labels
from viewer.scene.picture import CallOut, FlapMark
from viewer.scene.primitives import Disc, Line, Text, overlap
from viewer.scene.section import Plane
from viewer.scene.sheet import plan_sheet
from viewer.scene.showing import Showing
from viewer.scene.surface import surface_of
from viewer.scene.tokens import THEMES

MESH = channel()
SURFACE = surface_of(MESH)


def lengths(pairs):
    a, b = MESH.points[SURFACE.nodes][pairs].transpose(1, 0, 2)
    return float(np.linalg.norm(b - a, axis=1).sum())


def test_a_flap_has_its_triangles_its_own_edges_and_a_border():
    # the outer 0.05 m of the near flange (0.075 m) between x = 0.3625 and 0.5375 m: it hangs on three sides
    x, y, z = middles(MESH).T
    cells = np.nonzero((y < 1e-9) & (z < -0.025) & (np.abs(x - 0.45) < 0.09))[0]
    outline = flap_outline(SURFACE, (FlapMark("flap 1", (), cells),))
    assert np.array_equal(outline.inside, np.isin(SURFACE.cells, cells))
    wide, deep = np.ptp(MESH.points[MESH.nodes_of_cells(cells)], axis=0)[[0, 2]]
    assert lengths(outline.border) == pytest.approx(wide + 2 * deep)
    edges = SURFACE.edges
    drawn = outline.owned & edges.feature
    assert lengths(edges.nodes[drawn]) == pytest.approx(wide)  # its free edge
    assert not (
        outline.owned & (edges.faces[:, 1] >= 0) & ~np.isin(edges.faces, np.nonzero(outline.inside)).all(1)
    ).any()


def test_without_flaps_nothing_is_outlined():
    outline = flap_outline(SURFACE, ())
    assert not outline.inside.any()
    assert not outline.owned.any()
    assert not len(outline.border)


def test_flap_words():
    (mark,) = flap_marks(finding(MESH))
    assert (mark.title, mark.lines) == ("flap 1", (f"42{GAP}% of the kinetic energy",))
    assert flap_marks(finding(MESH), brief=True)[0].lines == ()


# ---- labels


def found_picture(**changes):
    return known(bodies=(marked(scale(), **changes),))


def test_hinge_and_flap_are_labelled_at_head_and_inside():
    picture = found_picture()
    frame = frame_of(picture)
    flap, hinge = picture_labels(picture, frame)
    body = picture.bodies[0]
    assert hinge.lines[0] == ("hinge 1", True)
    assert (hinge.colour, hinge.further) == (THEMES["light"].ink, THEMES["light"].ink)
    place, move = near_head(body.hinges[0], body.factor, MESH.diagonal, frame.toward_eye)
    assert hinge.anchor.at == pytest.approx(place)
    assert hinge.anchor.move == pytest.approx(move)
    assert flap.lines[0] == ("flap 1", True)
    assert (flap.colour, flap.end) == (THEMES["light"].accent, "dot")
    row = int(np.argmin(np.linalg.norm(MESH.points - flap.anchor.at, axis=1)))
    assert row in MESH.nodes_of_cells(body.flaps[0].cells)
    assert flap.anchor.move == pytest.approx(body.factor * body.shape[row])


def test_a_chosen_hinge_has_its_name_in_the_accent():
    picture = found_picture(chosen=1)
    _, hinge = picture_labels(picture, frame_of(picture))
    assert (hinge.colour, hinge.further) == (THEMES["light"].accent, THEMES["light"].ink)


@pytest.mark.parametrize("theme", THEMES)
def test_labels_stand_still_clear_of_pins_while_leaders_and_dots_move(theme):
    picture = found_picture().with_(theme=theme)
    plan = plan_sheet(picture, frame_of(picture))
    texts = [item for item in plan.fixed if isinstance(item, Text)]
    for words in ("hinge 1", "flap 1"):
        (text,) = (item for item in texts if item.words == words)
        assert not any(other is not text and overlap(text.box, other.box) for other in texts)
    first, later = plan.at(0.0), plan.at(np.pi)
    assert first.fixed is later.fixed
    dots = [next(i for i in sheet.moving if isinstance(i, Disc) and i.radius == 3.0) for sheet in (first, later)]
    assert abs(dots[0].y - dots[1].y) > 10
    assert sum(isinstance(item, Line) for item in first.moving) >= 2


def test_signs_tell_call_outs_apart_without_colour():
    body = found_picture().bodies[0]
    rows = np.array([0])
    calls = tuple(
        CallOut((words, "+3 Hz per kg"), place, np.zeros(3), sign, rows)
        for words, place, sign in (("add here", MESH.points[5], 1), ("remove here", MESH.points[-9], -1))
    )
    picture = known(bodies=(replace(body, hinges=(), flaps=(), call_outs=calls, factor=0.0),))
    plan = plan_sheet(picture, frame_of(picture))
    bars = [item for item in plan.at(0.0).moving if isinstance(item, Line) and item.width == 2.4]
    assert len(bars) == 3  # a plus has two, a minus one
    assert {label.label.end for label in plan.labels} == {"+", "−"}
    assert not any(isinstance(item, Disc) and item.radius == 6.0 for item in plan.at(0.0).moving)  # at rest: no gauge


def test_both_designs_side_by_side_are_labelled_by_name_alone():
    pair = tuple(replace(marked(scale()), flaps=()) for _ in range(2))
    pair = tuple(replace(body, hinges=tuple(replace(m, lines=()) for m in body.hinges)) for body in pair)
    picture = side(bodies=pair)
    plan = plan_sheet(picture, frame_of(picture))
    assert [label.label.lines for label in plan.labels] == [(("hinge 1", True),)] * 2
    for placed, box in zip(plan.labels, plan.frame.boxes, strict=True):
        assert box[0] <= placed.box[0] < placed.box[2] <= box[2]


# ---- what is shown


def test_marks_of_hidden_cells_vanish():
    body = marked(scale())
    mesh = body.mesh.with_(cell_groups={"fold": body.hinges[0].cells, "flap": body.flaps[0].cells})
    body = replace(body, mesh=mesh)
    (left,) = Showing(hide=("flap",)).parts([body], (0, -1, 0))
    assert (len(left.hinges), len(left.flaps)) == (1, 0)
    (left,) = Showing(hide=("fold",)).parts([body], (0, -1, 0))
    assert (len(left.hinges), len(left.flaps)) == (0, 1)


def test_a_cut_leaves_the_marks_of_the_side_that_is_kept():
    body = marked(scale())
    (left,) = Showing(plane=Plane((1.0, 0.0, 0.0), FOLD_AT + 0.07)).parts([body], (-1, 0, 0))
    assert (len(left.hinges), len(left.flaps)) == (0, 1)
    (left,) = Showing(plane=Plane((1.0, 0.0, 0.0), 0.45)).parts([body], (-1, 0, 0))
    assert 0 < len(left.flaps[0].cells) < len(body.flaps[0].cells)
