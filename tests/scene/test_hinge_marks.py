"""Pins, fans, balls and struts: where they are, how large, how they move (LOOK.md, marks)."""

from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest

from tests.scene.findings import FOLD_AT, TURN, finding, hinge, marked
from tests.scene.sheets import scale, unknown
from tests.stage.channel import LENGTH, WIDTH, channel
from viewer.scene.finding_marks import hinge_marks
from viewer.scene.forms import tube
from viewer.scene.hinge_marks import fans, head_radius, near_head, pin_radius, pins
from viewer.scene.strut_marks import bars, strut_marks

EYE = np.array([-0.55, -0.75, 0.42]) / np.linalg.norm([-0.55, -0.75, 0.42])
MESH = channel()


def from_line(points, start, direction):
    """(along, radius) of points from a line."""
    away = points - start
    along = away @ direction
    return along, np.linalg.norm(away - along[:, None] * direction, axis=1)


def shown(**changes):
    """A body with a straight hinge ten times as long as the slim ones."""
    body = marked(scale())
    return replace(body, hinges=tuple(replace(mark, **changes) for mark in body.hinges))


def test_a_pin_is_a_tube_with_flat_heads_that_stands_over_at_both_ends():
    casing, pin = pins(shown(), 0.5)  # m; a diagonal for which the axis is not short
    along, radius = from_line(pin.points, np.array([FOLD_AT, 0, -0.03]), np.array([0.0, 1.0, 0.0]))
    full = 0.0042 * 0.5
    assert sorted(set(np.round(radius / full, 6))) == [0.0, 1.0, 2.5]
    over = min(0.15 * WIDTH, 0.045 * 0.5)
    assert (along.min(), along.max()) == pytest.approx((-over, WIDTH + over))
    tube_ends = along[np.isclose(radius, full)]
    assert along[np.isclose(radius, 2.5 * full)].min() < tube_ends.min()
    cased = from_line(casing.points, np.array([FOLD_AT, 0, -0.03]), np.array([0.0, 1.0, 0.0]))[1]
    assert sorted(set(np.round(cased / full, 6))) == [0.0, 1.7, 3.2]
    assert casing.inside_out
    assert not pin.inside_out
    assert (casing.fill, pin.fill) == ("halo", "ink")
    assert pin.on_top
    assert casing.on_top


def test_surfaces_of_pins_look_outward():
    # volume of a closed surface by the divergence theorem: positive when its triangles look outward
    straight, bent = [[0, 0, 0], [0, 0, 2.0]], [[0, 0, 0], [1.0, 0, 0], [1.7, 0.7, 0], [1.7, 1.7, 0]]
    for path, least in ((straight, 0.99), (bent, 0.92)):  # round rings across a bend make it narrower there
        points, triangles, _ = tube(np.array(path, float), [(0.0, 0.0), (0.0, 0.1), (2.0, 0.1), (2.0, 0.0)], 48)
        a, b, c = points[triangles].transpose(1, 0, 2)
        volume = np.einsum("ij,ij->i", a, np.cross(b, c)).sum() / 6
        assert least < volume / (np.pi * 0.1**2 * 2.0) < 1


def test_a_chosen_pin_is_set_off_and_an_unsure_one_is_slim_and_soft():
    diagonal = 0.5
    (mark,) = shown(chosen=True).hinges
    assert pins(shown(chosen=True), diagonal)[1].fill == "accent"
    weak = shown(sure=False)
    assert pins(weak, diagonal)[1].fill == "soft"
    assert pin_radius(weak.hinges[0], diagonal) < 0.7 * pin_radius(mark, diagonal)


def test_a_short_hinge_has_a_slimmer_pin():
    (mark,) = marked(scale()).hinges
    assert pin_radius(mark, 0.5) == pytest.approx(0.0021)
    assert 0.5 * 0.0042 * 4 < pin_radius(mark, 4.0) < 0.0042 * 4


def test_the_pin_of_a_narrow_band_leaves_its_glow_in_sight():
    for width, rod in ((0.1, 1.0), (0.005, 0.0015 / 0.0021), (0.001, 0.4)):
        _, pin = pins(shown(width=width), 0.5)
        _, radius = from_line(pin.points, np.array([FOLD_AT, 0, -0.03]), np.array([0.0, 1.0, 0.0]))
        assert sorted(set(np.round(radius / 0.0021, 6))) == pytest.approx([0.0, rod, 2.5], abs=1e-6)


@pytest.mark.parametrize("phase", [0.0, 0.7, np.pi])
def test_a_straight_pin_moves_with_its_axis_and_stays_straight(phase):
    turn = np.array([0.3, 0.0, -0.2])  # small rotation about its start
    axis = np.array([[0.1, 0.0, 0.0], [0.1, 0.4, 0.1]])
    motion = np.array([0.0, 0.0, 0.01]) + np.cross(turn, axis - axis[0])
    body = shown(axis=axis, motion=motion)
    _, pin = pins(body, 0.5)
    direction = (axis[1] - axis[0]) / np.linalg.norm(axis[1] - axis[0])
    along, _ = from_line(pin.points, axis[0], direction)
    wanted = body.factor * np.cos(phase) * (np.array([0, 0, 0.01]) + np.cross(turn, along[:, None] * direction))
    assert pin.at(phase) - pin.points == pytest.approx(wanted, abs=1e-12)


def test_a_curved_hinge_gets_a_bent_pin_that_moves_as_its_points_do():
    angle = np.linspace(0, 2.0, 21)
    axis = 0.1 * np.stack([np.cos(angle), np.sin(angle), 0 * angle], axis=1)
    motion = np.stack([0 * angle, 0 * angle, angle], axis=1)
    body = shown(axis=axis, motion=motion)
    casing, pin = pins(body, 0.4)
    away = np.linalg.norm(pin.points[:, None] - axis[None], axis=2)
    inner = np.linalg.norm(pin.points - axis[0], axis=1) > 0.02
    inner &= np.linalg.norm(pin.points - axis[-1], axis=1) > 0.02
    assert away.min(axis=1)[inner].max() < 0.0042 * 0.4 + 0.006
    nearest = away.argmin(axis=1)
    moved = (pin.at(0.0) - pin.points)[:, 2] / body.factor
    assert moved[inner] == pytest.approx(angle[nearest][inner], abs=0.06)
    assert np.isfinite(casing.points).all()


def test_a_joint_is_a_ball_on_a_short_pin_along_its_turn():
    place = np.array([[0.2, 0.05, 0.0]])
    pieces = pins(shown(axis=place, motion=np.array([[0.0, 0.0, -0.1]])), 0.5)
    assert [piece.inside_out for piece in pieces] == [True, True, False, False]
    _, _, pin, ball = pieces
    assert np.linalg.norm(ball.points - place, axis=1) == pytest.approx(2.7 * 0.0042 * 0.5)
    along, radius = from_line(pin.points, place[0], TURN / 2)
    assert (along.min(), along.max()) == pytest.approx((-0.02, 0.02))
    assert radius.max() < np.linalg.norm(ball.points - place, axis=1).max()


@pytest.mark.parametrize("factor", [0.02, 0.04])
def test_the_fan_opens_from_the_arm_at_rest_to_the_arm_as_drawn(factor):
    body = replace(shown(), factor=factor)
    (fan,) = fans(body, MESH.diagonal, EYE)

    def arms(phase):
        points = fan.at(phase)
        return points[1] - points[0], points[-1] - points[0]

    for phase, sign in ((0.0, 1), (np.pi, -1)):
        rest, drawn = arms(phase)
        angle = np.arctan2(np.linalg.norm(np.cross(rest, drawn)), rest @ drawn)
        assert angle == pytest.approx(2 * factor, rel=0.01)  # 2 rad per unit of the shape
        assert np.sign(drawn[2]) == -sign  # the free part goes down at phase 0
        assert rest / np.linalg.norm(rest) == pytest.approx([1, 0, 0])
    assert np.linalg.norm(np.subtract(*arms(np.pi / 2))) < 1e-12
    assert fan.opacity == 0.22
    assert np.linalg.norm(arms(0.0)[0]) <= 0.19 * MESH.diagonal + 1e-12


def test_the_fan_is_as_long_as_the_folding_side_when_that_is_short():
    (fan,) = fans(shown(reach=0.08), MESH.diagonal, EYE)
    assert np.linalg.norm(fan.points[1] - fan.points[0]) == pytest.approx(0.08)


def test_a_fold_too_small_to_see_has_no_fan():
    assert not fans(replace(shown(), factor=0.001), MESH.diagonal, EYE)


@pytest.mark.parametrize(("eye", "y"), [(EYE, 0.0), (np.array([0.0, 1.0, 0.0]), WIDTH)])
def test_fan_and_label_are_at_the_head_nearer_to_the_eye(eye, y):
    body = shown()
    place, move = near_head(body.hinges[0], body.factor, MESH.diagonal, eye)
    assert abs(place[1] - y) < 0.2 * WIDTH
    assert move == pytest.approx(body.factor * np.array([0, 0, -0.03]))
    (fan,) = fans(body, MESH.diagonal, eye)
    assert fan.points[0] == pytest.approx(place)
    assert head_radius(body.hinges[0], MESH.diagonal) < 0.02 * MESH.diagonal


# ---- words


def lines(found, size, chosen=0, **changes):
    return [(mark.title, mark.lines) for mark in hinge_marks(found, size, size.turn, MESH, chosen, **changes)]


def test_a_label_says_how_far_it_folds_and_what_it_holds():
    size = scale(factor=0.04, magnification=8342.0)  # 2 rad per unit · 0.04 m = 4.58°
    assert lines(finding(MESH), size) == [("hinge 1", ("folds 0.00055° real, 4.6° drawn", "61\u00a0% of the energy"))]


def test_a_real_angle_is_said_only_when_it_is_known():
    assert lines(finding(MESH), unknown(factor=0.04))[0][1][0] == "folds 4.6° as drawn"
    assert lines(finding(MESH), scale(factor=0.04, magnification=1.0))[0][1][0] == "folds 4.6° real"
    assert lines(finding(MESH), scale(factor=0.04, statistic="3 sigma"))[0][1][0].startswith("folds 0.00055° real 3σ")


def test_doubt_is_said_and_unknown_energy_is_not():
    found = finding(MESH, hinge(MESH, label="weak", strain_share=float("nan"), kind="joint"))
    assert lines(found, unknown(factor=0.04)) == [("joint 1 (weak)", ("folds 4.6° as drawn",))]


def test_with_one_chosen_the_others_are_named_only():
    found = finding(MESH, hinge(MESH), hinge(MESH, number=2))
    first, second = lines(found, scale(), chosen=2)
    assert first == ("hinge 1", ())
    assert len(second[1]) == 2
    assert all(not said for _, said in lines(found, scale(), brief=True))


def test_marks_turn_with_the_shape():
    straight, reversed_ = (hinge_marks(finding(MESH), scale(), turn, MESH)[0] for turn in (1.0, -1.0))
    assert reversed_.motion == pytest.approx(-straight.motion)
    assert reversed_.fold == pytest.approx(-TURN)
    found = finding(MESH, hinge(MESH, motion=np.full((2, 3), 1 + 1j), fold=1j * TURN))
    (mark,) = hinge_marks(found, scale(), 1j, MESH)
    assert mark.fold == pytest.approx(-TURN)
    assert mark.motion == pytest.approx(np.full((2, 3), -1 + 1j))


def test_the_folding_side_reaches_to_its_end():
    (mark,) = hinge_marks(finding(MESH), scale(), 1.0, MESH)
    assert mark.reach == pytest.approx(LENGTH - FOLD_AT, rel=0.05)


# ---- struts


def test_a_strut_is_a_dashed_bar_whose_ends_move_with_the_body():
    body = marked(scale())
    start, end = np.array([0.2, 0.0, -0.07]), np.array([0.5, 0.0, -0.01])
    body = replace(body, struts=strut_marks(body, [(start, end, ("strut", "231 → 398 Hz re-solved"))]))
    (mark,) = body.struts
    assert (mark.title, mark.lines) == ("strut", ("231 → 398 Hz re-solved",))
    near = [np.argmin(np.linalg.norm(body.mesh.points - place, axis=1)) for place in (start, end)]
    assert mark.motion == pytest.approx(body.shape[near])
    pieces = [piece for piece in bars(body, MESH.diagonal) if not piece.inside_out]
    direction = (end - start) / np.linalg.norm(end - start)
    spans = sorted(
        (float(along.min()), float(along.max()))
        for along, radius in (from_line(piece.points, start, direction) for piece in pieces)
        if radius.max() < 0.0037 * MESH.diagonal
    )
    assert len(spans) >= 5
    assert spans[0][0] == pytest.approx(0, abs=1e-9)
    assert spans[-1][1] == pytest.approx(np.linalg.norm(end - start))
    gaps = [after[0] - before[1] for before, after in pairwise(spans)]
    assert min(gaps) > 0.25 * (spans[0][1] - spans[0][0])
    long = np.linalg.norm(end - start)
    for piece in pieces:
        share = np.clip((piece.points - start) @ direction / long, 0, 1)[:, None]
        wanted = body.factor * ((1 - share) * body.shape[near[0]] + share * body.shape[near[1]])
        assert piece.at(0.0) - piece.points == pytest.approx(wanted, abs=1e-12)
