"""The camera fit: everything stays in the picture at every phase, and drawn lengths measure."""

import numpy as np
import pytest

from tests.stage.channel import body, channel, nod, picture
from viewer.scene import colour_bar, tokens, view
from viewer.scene.motion import positions
from viewer.scene.picture import View

PHASES = np.linspace(0, 2 * np.pi, 25)


def pixels(scene, camera, boxes, index):
    shown = scene.bodies[index]
    return np.concatenate(
        [camera.project(positions(shown.mesh.points, shown.shape, shown.factor, p), boxes[index]) for p in PHASES]
    )


def travelling():
    mesh = channel()
    return body(mesh, shape=nod(mesh) + 1j * nod(mesh, twist=1.0)[:, [2, 0, 1]])


@pytest.mark.parametrize("eye", [(-0.55, -0.75, 0.42), (1, 0, 0), (0, 0, 1), (0.3, -0.2, -0.9)])
@pytest.mark.parametrize("make", [body, travelling])
def test_both_extremes_fit_tightly(eye, make):
    scene = picture(make(), view=View(eye), width=960, height=720)
    camera, boxes = view.fit(scene, 96)
    xy = pixels(scene, camera, boxes, 0)
    low, high = xy.min(axis=0), xy.max(axis=0)
    assert low[0] >= tokens.MARGIN - 1e-6
    assert high[0] <= 960 - tokens.MARGIN + 1e-6
    assert low[1] >= tokens.TOP - 1e-6
    assert high[1] <= 720 - 96 - tokens.MARGIN + 1e-6
    room = np.array([960 - 2 * tokens.MARGIN, 720 - 96 - tokens.MARGIN - tokens.TOP])
    assert np.max((high - low) / room) == pytest.approx(1.0, abs=0.01)  # 15° phase steps miss little


def test_axes_are_orthonormal_even_looking_along_up():
    for eye in ((0, 0, 1), (0.2, -1, 0.4), (0, 0, -3)):
        axes = np.array(view.axes(View(eye)))
        assert axes @ axes.T == pytest.approx(np.eye(3), abs=1e-12)
        assert np.linalg.det(axes) == pytest.approx(1.0)
        assert axes[2] @ eye > 0


def test_a_length_across_the_view_measures_the_same_in_pixels():
    camera, boxes = view.fit(picture(width=960, height=720), 96)
    ends = np.array([0.1, 0.02, 0.0]) + np.array([[0, 0, 0], 0.05 * camera.right, 0.05 * camera.up])
    xy = camera.project(ends, boxes[0])
    assert xy[1] - xy[0] == pytest.approx([0.05 / camera.metres_per_pixel, 0], abs=1e-9)
    assert xy[2] - xy[0] == pytest.approx([0, -0.05 / camera.metres_per_pixel], abs=1e-9)  # y runs down


def test_compared_designs_share_camera_and_scale():
    small = body(channel(window=0.02), "modified", share=0.02)
    scene = picture(body(), small, layout="side", view=View((-0.4, -0.5, 0.9)), width=960, height=720)
    camera, boxes = view.fit(scene, 120)
    assert len(boxes) == 2
    for index in (0, 1):
        xy = pixels(scene, camera, boxes, index)
        assert xy[:, 0].min() >= boxes[index][0] + tokens.MARGIN - 1e-6
        assert xy[:, 0].max() <= boxes[index][2] - tokens.MARGIN + 1e-6
    same = camera.project(np.zeros((1, 3)), boxes[1]) - camera.project(np.zeros((1, 3)), boxes[0])
    assert same[0] == pytest.approx([boxes[1][0] - boxes[0][0], boxes[1][1] - boxes[0][1]])


def test_wide_bodies_are_stacked():
    side = picture(body(), body(name="modified"), layout="side", view=View((0, -1, 0.05)), width=960, height=720)
    low, high = view.scene_box(side)
    assert (high - low)[0] > 3 * (high - low)[1]
    _, (first, second) = view.fit(side, 96)
    assert first == (0, 0, 960, 312)
    assert second == (0, 312, 960, 624)
    _, (first, second) = view.fit(side.with_(view=View((0.9, -0.3, 0.2))), 96)
    assert first == (0, 0, 480, 624)
    assert second == (480, 0, 960, 624)


@pytest.mark.parametrize("eye", [(0, -1, 0.05), (-0.4, -0.5, 0.9), (0, 0, 1), (-1, 0, 0.1)])
def test_side_by_side_pictures_are_as_high_as_their_bodies_need(eye):
    side = picture(body(), body(name="modified"), layout="side", view=View(eye), width=960)
    height = view.side_height(side, 120)
    assert height % 16 == 0  # video needs it
    camera, boxes = view.fit(side.with_(height=height), 120)
    xy = pixels(side, camera, boxes, 0)
    left, _, right, _ = boxes[0]
    if height < view.TALLEST:  # bodies reach from margin to margin
        assert np.ptp(xy[:, 0]) == pytest.approx(right - left - 2 * tokens.MARGIN, rel=0.02)
    else:  # and else use all the height there is
        top, bottom = view._furniture(side, boxes[0][0] == boxes[1][0])
        assert np.ptp(xy[:, 1]) == pytest.approx(boxes[0][3] - boxes[0][1] - top - bottom, rel=0.02)


def test_the_caution_under_the_bar_has_room():
    plain = picture(width=960, height=720)
    doubtful = plain.with_(energy_caution="energies not trusted")
    tops = []
    for scene in (plain, doubtful):
        camera, boxes = view.fit(scene, 96)
        tops.append(pixels(scene, camera, boxes, 0)[:, 1].min())
        bar = colour_bar.picture_bar(scene, view.frame(scene, camera, boxes), 624)
        assert max(item.box[3] for item in bar) < view._furniture(scene, False)[0]
    assert tops[1] > tops[0]


def test_overlay_and_single_use_the_whole_width():
    assert view.panes(picture(body(), body(), layout="overlay", width=960, height=720), 96) == ((0, 0, 960, 624),) * 2
    assert view.panes(picture(width=1920, height=1080), 96) == ((0, 0, 960, 444),)


def test_nothing_extended_still_has_a_camera():
    shown = body()
    flat = shown.mesh.with_(points=np.zeros_like(shown.mesh.points) + 3.0)
    camera, _ = view.fit(picture(body(flat, share=0.0)), 96)
    assert np.isfinite(camera.metres_per_pixel)
    assert camera.metres_per_pixel > 0


def test_frame_projects_like_the_camera():
    scene = picture(width=960, height=720)
    camera, boxes = view.fit(scene, 96)
    frame = view.frame(scene, camera, boxes)
    assert (frame.width, frame.height) == (960, 720)
    points = scene.bodies[0].mesh.points[:5]
    assert frame.project(points, 0) == pytest.approx(camera.project(points, boxes[0]))
