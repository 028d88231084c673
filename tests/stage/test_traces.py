"""Tests on the screen, checked in pixels: beads where points are, what hides them, ghosts, and what a frame costs."""

from dataclasses import replace

import numpy as np
import pytest

from tests.meshes import box_mesh
from tests.scene.hammered import analysis, placed, plate
from tests.stage.channel import NOTE
from tests.stage.test_stage import byte, near
from viewer.scene import view
from viewer.scene.channel_picture import channel_picture
from viewer.scene.hammer_picture import alone_picture, beside_picture, over_picture
from viewer.scene.note_layout import note_height
from viewer.scene.palette import mix
from viewer.scene.picture import Body, Picture, TestCall, TraceMark, View
from viewer.scene.tokens import THEMES
from viewer.scene.trace_marks import strength
from viewer.stage import Stage

FRONT, BACK = 0, 1


def box(form="solid", theme="light", **changes):
    """A box seen from the front with a point on its front face, one behind it and a line to a third at its side."""
    mesh = box_mesh("hex8", (6, 3, 3), (0.3, 0.1, 0.1))
    points = np.array([[0.15, 0.0, 0.05], [0.06, 0.1, 0.05], [0.24, 0.1, 0.05]])
    shape = np.zeros((mesh.n_nodes, 3))
    motion = changes.pop("motion", np.zeros((3, 3)))
    mark = TraceMark("test: hammer", ("1", "2", "3"), points, [(1, 2)], motion, **changes)
    body = Body("box", mesh, shape, 1.0, 10.0, traces=(mark,), form=form)
    return Picture((body,), NOTE, view=View((0.0, -1.0, 0.0)), theme=theme, ghost=False)


def drawn(picture, phase=0.0):
    """Image, and pixels (n, 2) at which places of a body are drawn."""
    with Stage(picture) as stage:
        image = stage.image(phase)
        _, boxes = view.fit(picture, note_height(picture))
        frame = view.frame(picture, stage.camera(), boxes)
    scale = picture.width / 960
    return image, lambda points, body=0: np.round(frame.project(np.atleast_2d(points), body) * scale).astype(int)


def at(image, pixels):
    return image[pixels[:, 1], pixels[:, 0]]


def coloured(image, pixels, colour, within=20):
    return np.abs(at(image, pixels).astype(int) - byte(colour)).max(axis=1) <= within


@pytest.mark.parametrize("theme", THEMES)
def test_a_bead_on_the_front_is_solid_one_behind_is_a_ring(theme):
    picture = box(theme=theme)
    image, where = drawn(picture)
    tokens, points = THEMES[theme], picture.bodies[0].traces[0].points
    solid = coloured(image, where(points), tokens.test)
    assert solid.tolist() == [True, False, False]
    x, y = where(points)[BACK]
    around = image[y - 12 : y + 13, x - 12 : x + 13]
    assert near(around, tokens.test, 20).sum() > 20  # its rim is seen
    # cased in the halo colour where it stands on the body
    x, y = where(points)[FRONT]
    row = np.abs(image[y, x : x + 16].astype(int) - byte(tokens.halo)).max(axis=1)
    assert row.min() < 60


def test_a_hidden_line_is_dashed_and_a_seen_one_is_not():
    share = np.linspace(0.15, 0.85, 300)[:, None]
    seen = {}
    for side in (-1.0, 1.0):
        picture = box().with_(view=View((0.0, side, 0.0)))
        image, where = drawn(picture)
        a, b = picture.bodies[0].traces[0].points[1:]
        seen[side] = coloured(image, where(a + share * (b - a)), THEMES["light"].test, 30).mean()
    assert seen[1.0] == 1.0
    assert 0.3 < seen[-1.0] < 0.8


def test_a_ghost_hides_no_point_and_draws_no_surface():
    image, where = drawn(box("ghost"))
    points = box().bodies[0].traces[0].points
    assert coloured(image, where(points), THEMES["light"].test).all()
    empty = where(np.array([[0.15, 0.0, 0.08]]))
    assert coloured(image, empty, THEMES["light"].background, 2).all()
    corner = where(np.array([[0.0, 0.0, 0.0], [0.3, 0.0, 0.1]]))
    low, high = corner.min(axis=0), corner.max(axis=0)
    assert near(image[low[1] - 2 : high[1] + 3, low[0] - 2 : high[0] + 3], THEMES["light"].ghost, 60).sum() > 100


@pytest.mark.parametrize("phase", [0.0, np.pi / 2, 2.0])
def test_points_travel_with_their_phases(phase):
    motion = np.zeros((3, 3), complex)
    motion[0] = [0.01, 0, 0.01j]  # a circle
    picture = box("ghost", motion=motion)
    image, where = drawn(picture, phase)
    now = picture.bodies[0].traces[0].points[0] + [0.01 * np.cos(phase), 0, -0.01 * np.sin(phase)]
    assert coloured(image, where(now), THEMES["light"].test).all()
    assert not picture.bodies[0].standing


def test_beads_carry_figures_in_size_and_darkness_before_everything():
    values = np.full(17, 1.0)
    values[placed().test.channels_of(6)] = 0.0
    picture = channel_picture(plate(), placed(), values, "comac", told=0)
    image, where = drawn(picture)
    tokens = THEMES["light"]
    worst, fine = where(placed().points)[[6, 8]]
    assert coloured(image, worst[None], tokens.test).all()
    assert coloured(image, fine[None], mix(tokens.body, tokens.test, strength(0.0))).all()

    def dark(x, y):
        return near(image[y - 30 : y + 31, x - 30 : x + 31], tokens.test, 30).sum()

    assert dark(*worst) > 4 * dark(*fine)


def test_a_ring_and_a_line_set_off_what_may_be_wrong():
    call = TestCall(FRONT, ("point 1, +X: sign flipped?",), True, np.array([0.27, 0.0, 0.05]))
    picture = box(calls=(call,))
    image, where = drawn(picture)
    bare, _ = drawn(box())
    ink = near(image, THEMES["light"].ink, 60) & ~near(bare, THEMES["light"].ink, 60)
    x, y = where(picture.bodies[0].traces[0].points)[FRONT]
    ring = ink[y - 22 : y + 23, x - 22 : x + 23]
    assert all(part.any() for part in (ring[:20], ring[25:], ring[:, :20], ring[:, 25:]))
    line = at(ink, where(np.linspace([0.18, 0, 0.05], [0.265, 0, 0.05], 120)))
    assert 0.3 < line.mean() < 0.9  # dashed


@pytest.mark.parametrize(
    "make",
    [
        lambda: over_picture(plate(), 1, placed(30), 1, analysis(1), labels="all"),
        lambda: beside_picture(plate(), 1, placed(30), 1, analysis(1)),
        lambda: alone_picture(placed(30), 2, labels="all"),
    ],
)
def test_frames_are_drawn_without_building_anything_anew(make):
    picture = make().with_(width=480, height=360)
    with Stage(picture) as stage:
        first = stage.image(0.3).tobytes()
        actors = [item for renderer in stage._window.GetRenderers() for item in renderer.GetViewProps()]
        for phase in (1.0, 2.0, 4.0):
            assert stage.image(phase).tobytes() != first
        again = [item for renderer in stage._window.GetRenderers() for item in renderer.GetViewProps()]
        assert stage.image(0.3).tobytes() == first
    assert actors == again


def test_the_test_stays_left_and_the_analysis_right():
    picture = beside_picture(plate(), 1, placed(), 1, analysis(1))
    image, _ = drawn(picture)
    foot = image.shape[0] - round(note_height(picture))
    test = near(image[70:foot], THEMES["light"].test, 12)
    half = image.shape[1] // 2
    assert test[:, :half].sum() > 500
    assert test[:, half:].sum() == 0


def test_a_design_without_tests_is_drawn_as_ever():
    picture = over_picture(plate(), 1, placed(), 1, analysis(1))
    bare = picture.with_(bodies=(replace(picture.bodies[0], traces=()),))
    image, _ = drawn(bare)
    assert near(image, THEMES["light"].test, 12).sum() == 0


def test_a_ghost_on_white_paper_stays_white():
    picture = box("ghost")
    with Stage(picture, bare=1.0) as stage:
        image = stage.image(0.0)
    assert near(image, THEMES["light"].background, 2).sum() == 0
    assert near(image, "#FFFFFF", 0).mean() > 0.8
