"""Labels: beside the body, off each other, still; the same every time."""

import numpy as np
import pytest

from tests.scene.sheets import frame_of, known, overlay, side, true
from viewer.scene.cover import CELL, Cover, cover
from viewer.scene.labels import Wish, choose_place, leader, leader_start, picture_labels
from viewer.scene.motion import positions
from viewer.scene.primitives import Line, overlap
from viewer.scene.sheet import plan_sheet

NOTHING = Cover(np.zeros((121, 161)))
ROOM = (0.0, 0.0, 960.0, 624.0)


def covering(*boxes) -> Cover:
    grid = np.zeros((120, 160), bool)
    for left, top, right, foot in boxes:
        grid[top // CELL : foot // CELL, left // CELL : right // CELL] = True
    return Cover(np.pad(np.cumsum(np.cumsum(grid, axis=0), axis=1), ((1, 0), (1, 0))))


def test_cover_counts_cells_in_boxes():
    boxes = np.array([[0, 0, 960, 720], [60, 60, 66, 66], [0, 0, 60, 60], [114, 84, 200, 200]])
    found = covering((60, 60, 120, 90)).cells(boxes)
    assert found.tolist() == [50, 1, 0, 1]


@pytest.mark.parametrize("make", [known, overlay])
def test_the_cover_is_where_the_body_is(make):
    picture = make()
    frame = frame_of(picture)
    grid = cover(picture, frame).map
    inside = 0
    for index, body in enumerate(picture.bodies):
        for phase in (0, np.pi):
            quads = body.mesh.blocks[0].nodes
            middle = positions(body.mesh.points, body.shape, body.factor, phase)[quads].mean(axis=1)
            column, row = np.floor(frame.project(middle, index) / CELL).astype(int).T
            assert grid[row, column].all()  # every cell's middle is covered …
            inside += len(middle)
    assert inside > 1000
    assert grid.mean() < 0.6  # … and not simply everything


def test_a_label_stands_near_its_mark_below_it_when_nothing_is_in_the_way():
    left, top, right, foot = choose_place(Wish((120, 15), (480, 300), 15), ROOM, NOTHING, [], [])
    assert (right - left, foot - top) == pytest.approx((120, 15))
    assert 300 < top < 380
    assert 300 < (left + right) / 2 < 660


def test_a_label_goes_where_body_and_taken_boxes_are_not():
    body = (300, 200, 660, 420)
    wish = Wish((120, 15), (480, 400), 15)
    free = choose_place(wish, ROOM, covering(body), [], [])
    assert not overlap(free, body)
    next_to = choose_place(wish, ROOM, covering(body), [free], [])
    assert not overlap(next_to, body)
    assert not overlap(next_to, free)


def test_leaders_do_not_cross():
    wall = Line(((480.0, 330.0), (480.0, 600.0)), "#000000")
    target = (470.0, 400.0)
    box = choose_place(Wish((100, 15), target, 5), ROOM, covering((0, 320, 476, 620)), [], [wall])
    start = leader_start(np.array([box]), target)[0]
    assert start[0] < 480 or min(start[1], target[1]) < 330


def test_places_stay_in_their_region():
    region = (480.0, 0.0, 960.0, 400.0)
    box = choose_place(Wish((150, 15), (485, 390), 10), region, NOTHING, [], [])
    assert box[0] >= 480
    assert box[2] <= 960
    assert box[3] <= 400


def test_a_leader_ends_at_the_rim_and_is_left_out_beside_it():
    line = leader((0.0, 0.0), (100.0, 0.0), 15.0, "#000000")
    assert line.points == ((0.0, 0.0), (85.0, 0.0))
    assert leader((0.0, 0.0), (18.0, 0.0), 15.0, "#000000") is None


@pytest.mark.parametrize("make", [known, side, overlay, true])
def test_labels_stand_still_while_leaders_follow(make):
    picture = make()
    plan = plan_sheet(picture, frame_of(picture))
    first, second = plan.at(0.0), plan.at(np.pi)
    assert first.fixed is second.fixed
    for placed in plan.labels:
        one, other = placed.leader(plan.frame, 0.0), placed.leader(plan.frame, np.pi)
        if one is not None and other is not None:
            assert one.points[0] == other.points[0]
            if picture.magnification != 1:
                assert np.hypot(*np.subtract(one.points[1], other.points[1])) > 5
    again = plan_sheet(picture, frame_of(picture))
    assert [p.box for p in again.labels] == [p.box for p in plan.labels]


def test_labels_of_the_boom_are_clear_of_all_it_sweeps_over():
    picture = known()
    plan = plan_sheet(picture, frame_of(picture))
    assert [label.lines[0][0] for label in picture_labels(picture, plan.frame)] == ["image blur: sideways", "camera"]
    boxes = np.array([placed.box for placed in plan.labels])
    assert cover(picture, plan.frame).cells(boxes).tolist() == [0, 0]


def test_an_anchor_is_seen_where_its_point_moves():
    picture = known()
    frame = frame_of(picture)
    body = picture.bodies[0]
    anchor = picture_labels(picture, frame)[0].anchor
    point = body.points[0]
    at = point.position + body.factor * np.cos(1.0) * point.motion[:3]
    assert anchor.seen(frame, 1.0) == pytest.approx(frame.project(at[None], 0)[0])
