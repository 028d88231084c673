"""What the stage puts on the screen, checked in pixels."""

import numpy as np
import pytest
import pyvista as pv

from tests.meshes import box_mesh, plate_mesh
from tests.stage.channel import body, channel, nod, picture
from viewer.model.mesh import CellBlock, Mesh
from viewer.scene import palette, tokens, view
from viewer.scene.note_layout import note_height
from viewer.scene.picture import Body, NodeLines, PointMark, View
from viewer.scene.section import Plane
from viewer.scene.showing import Showing
from viewer.scene.tokens import THEMES, rgb
from viewer.stage import Stage
from viewer.stage.stage import reduce


def render(scene, phase=0.0):
    with Stage(scene) as stage:
        return stage.image(phase)


def byte(colour):
    return np.round(np.array(rgb(colour)) * 255).astype(int)


def near(image, colour, within=6):
    """(h, w) bool: pixels of a colour."""
    return np.abs(image.astype(int) - byte(colour)).max(axis=2) <= within


def plain(mesh, **changes):
    """A still body without colour."""
    return Body("plate", mesh, np.zeros((mesh.n_nodes, 3)), 0.0, 1.0, **changes)


def above_note(image):
    return image[: image.shape[0] - round(image.shape[1] * 120 / 960) - 2]  # the note of channel.NOTE is lower


def test_same_input_same_pixels():
    scene = picture()
    assert render(scene, 0.4).tobytes() == render(scene, 0.4).tobytes()


def test_pixels_do_not_depend_on_what_was_drawn_before():
    scene = picture()
    with Stage(scene) as stage:
        first = stage.image(0.4).tobytes()
        stage.image(2.0)
        assert stage.image(0.4).tobytes() == first


@pytest.mark.parametrize("theme", THEMES)
def test_size_and_background(theme):
    image = render(picture(theme=theme, width=480, height=360))
    assert image.shape == (360, 480, 3)
    assert image.dtype == np.uint8
    assert np.all(image[100, 3] == byte(THEMES[theme].background))


def test_a_standing_mode_looks_the_same_going_and_coming():
    with Stage(picture()) as stage:
        assert stage.image(0.9).tobytes() == stage.image(-0.9).tobytes()
        assert stage.image(0.9).tobytes() != stage.image(0.9 + np.pi).tobytes()


def test_a_travelling_mode_does_not():
    mesh = channel()
    moving = body(mesh, shape=nod(mesh) + 1j * nod(mesh, twist=1.0)[:, [2, 0, 1]])
    with Stage(picture(moving)) as stage:
        assert stage.image(0.9).tobytes() != stage.image(-0.9).tobytes()


def test_the_mesh_itself_is_never_touched():
    shown = body()
    before = shown.mesh.points.copy()
    render(picture(shown), 1.0)
    assert np.array_equal(shown.mesh.points, before)
    assert not shown.mesh.points.flags.writeable


@pytest.mark.parametrize("eye", [(0, 0, 1), (0.6, 0, 0.8), (0, -0.6, 0.8), (-0.5, -0.5, 0.7), (0, 0, -1)])
@pytest.mark.parametrize("theme", THEMES)
def test_brightness_stays_near_the_colour_bar(theme, eye):
    # LOOK: the drawn colour stays between .70 and 1.02 of the colour bar, from any side
    scene = picture(plain(plate_mesh("quad4", (4, 4), (1.0, 1.0))), view=View(eye), theme=theme, ghost=False)
    _, boxes = view.fit(scene, note_height(scene))
    with Stage(scene) as stage:
        image = stage.image(0.0)
        x, y = view.frame(scene, stage.camera(), boxes).project(np.array([[0.5, 0.5, 0.0]]), 0)[0] / 2
    found = image[round(y), round(x)] / byte(THEMES[theme].body)
    assert found.min() >= 0.69
    assert found.max() <= 1.03


def test_energy_colour_is_the_bars():
    mesh = plate_mesh("quad4", (4, 4), (1.0, 1.0))
    scene = picture(
        plain(mesh, density=np.full(mesh.n_cells, 4.0)), view=View((0, 0, 1)), ghost=False, energy_top=16.0
    )
    lit = render(scene)[200, 240] / render(scene.with_(bodies=(plain(mesh),)))[200, 240]
    wanted = palette.energy_ramp("light")[[127, 128]].mean(axis=0) / byte(THEMES["light"].body)
    assert lit == pytest.approx(wanted, rel=0.03)


def test_projected_points_are_where_they_are_drawn():
    mesh = plate_mesh("quad4", (4, 4), (1.0, 1.0))
    scene = picture(plain(mesh), view=View((0.2, -0.4, 0.9)), ghost=False)
    with Stage(scene) as stage:
        image = stage.image(0.0)[: 360 - round(note_height(scene) / 2) - 1]
        corners = stage.camera().project(mesh.points, view.fit(scene, note_height(scene))[1][0]) / 2
    drawn = np.argwhere(~near(image[45:], THEMES["light"].background, 3)) + np.array([45, 0])
    assert drawn[:, 1].min() == pytest.approx(corners[:, 0].min(), abs=1.5)
    assert drawn[:, 1].max() == pytest.approx(corners[:, 0].max(), abs=1.5)
    assert drawn[:, 0].max() == pytest.approx(corners[:, 1].max(), abs=1.5)


def test_far_off_coordinates_look_the_same():
    near_by = body()
    shift = np.array([4.0e5, -2.0e5, 1.0e5])
    moved = near_by.mesh.with_(points=near_by.mesh.points + shift)
    far = body(moved, shape=near_by.shape, density=near_by.density)
    one, other = render(picture(near_by), 0.5).astype(int), render(picture(far), 0.5).astype(int)
    assert np.mean(np.abs(one - other).max(axis=2) > 2) < 1e-3


def test_ghost_is_dashed_and_can_be_left_out():
    scene = picture(body(share=0.1))
    with_ghost, without = above_note(render(scene)), above_note(render(scene.with_(ghost=False)))
    ghost = np.abs(with_ghost.astype(int) - without).max(axis=2) > 10
    assert 300 < ghost.sum() < 8000
    still = picture(plain(channel()))
    assert np.abs(render(still).astype(int) - render(still.with_(ghost=False))).max(axis=2).mean() < 1


def test_mesh_edges_only_where_they_can_be_told_apart():
    coarse, fine = plate_mesh("quad4", (6, 6), (1.0, 1.0)), plate_mesh("quad4", (150, 150), (1.0, 1.0))
    for mesh, visible in ((coarse, True), (fine, False)):
        scene = picture(plain(mesh), view=View((0, 0, 1)), ghost=False)
        changed = np.abs(render(scene).astype(int) - render(scene.with_(mesh_edges=True))).max() > 10
        assert changed == visible


def test_beams_are_drawn_as_lines():
    points = np.array([[0, 0, 0], [1, 0, 0], [1, 1, 0], [0, 1, 0.0]])
    mesh = Mesh(points, (CellBlock("line2", np.array([[0, 1], [1, 2], [2, 3]]), np.arange(3)),), np.arange(4))
    scene = picture(plain(mesh), view=View((0, 0, 1)), ghost=False)
    assert near(above_note(render(scene))[50:], THEMES["light"].body_edge, 12).sum() > 300
    hot = picture(plain(mesh, density=np.full(3, 9.0)), view=View((0, 0, 1)), ghost=False)
    assert near(above_note(render(hot))[50:], THEMES["light"].energy[-1], 12).sum() > 300


def test_overlay_shows_both_designs():
    scene = picture(
        body(name="baseline"),
        body(channel(window=0.02), "modified", share=0.05),
        layout="overlay",
        energy_top=None,
        width=960,
        height=720,
    )
    for theme in THEMES:
        image = above_note(render(scene.with_(theme=theme)))[70:]
        assert near(image, THEMES[theme].baseline, 12).sum() > 300
        assert near(image, THEMES[theme].modified, 12).sum() > 300


def test_side_by_side_draws_each_design_in_its_own_half():
    one, other = body(name="baseline"), body(channel(window=0.02), "modified", share=0.02)
    both = render(picture(one, other, layout="side", width=960, height=720))[60:500]
    left, right = both[:, 5:475], both[:, 485:955]
    swapped = render(picture(other, one, layout="side", width=960, height=720))[60:500]
    # single pixels may round otherwise where a viewport begins elsewhere
    assert np.mean(left != swapped[:, 485:955]) < 1e-4
    assert np.mean(right != swapped[:, 5:475]) < 1e-4
    assert np.mean(left != right) > 0.01


def test_a_given_plotter_is_drawn_into_and_left_open():
    plotter = pv.Plotter(off_screen=True, window_size=[480, 360])
    stage = Stage(picture(), plotter)
    assert stage.image(0.0).shape == (360, 480, 3)
    stage.close()
    assert plotter.render_window.GetRenderers().GetNumberOfItems() >= 1
    plotter.close()


def test_showing_another_picture_equals_a_new_stage():
    first, second = picture(), picture(body(share=0.03), theme="dark")
    with Stage(first) as stage:
        stage.image(0.0)
        stage.show(second)
        assert stage.image(0.3).tobytes() == render(second, 0.3).tobytes()


def test_a_turned_camera_is_kept_and_followed():
    scene = picture(plain(box_mesh("hex8", (2, 2, 2), (1.0, 1.0, 1.0))))
    with Stage(scene) as stage:
        before = stage.camera()
        fitted = view.fit(scene, 96)[0]
        assert before.toward_eye == pytest.approx(fitted.toward_eye)
        stage.plotter.renderer.GetActiveCamera().Azimuth(40)
        stage.show(scene.with_(ghost=False), keep_camera=True)
        after = stage.camera()
        assert not before.same_as(after)
        assert after.metres_per_pixel == pytest.approx(before.metres_per_pixel)
        assert np.arccos(np.clip(after.toward_eye @ before.toward_eye, -1, 1)) > np.radians(30)


def test_rings_face_a_turned_camera():
    shown = body()
    shown = Body(
        shown.name,
        shown.mesh,
        shown.shape,
        shown.factor,
        84.6,
        points=(PointMark("blur", np.array([0.3, -0.1, 0.1]), np.array([0.0, 0.0, 1.0]), np.zeros(6)),),
    )
    first, turned = View((0.0, -1.0, 0.3)), View((1.0, -0.2, 0.3))
    scene = picture(shown, view=first)
    with Stage(scene) as stage, Stage(scene.with_(view=turned)) as other:
        stage.image(0.0)
        stage.aim(other.camera())
        assert stage.image(0.0).tobytes() == other.image(0.0).tobytes()


def test_reduce_is_the_rounded_mean_of_boxes():
    image = np.random.default_rng(0).integers(0, 256, (8, 12, 3), dtype=np.uint8)
    mean = image.reshape(4, 2, 6, 2, 3).astype(int).sum(axis=(1, 3))
    assert np.array_equal(reduce(image), (mean + 2) // 4)


def test_tokens_of_the_contour_width():
    # a contour of 1.5 px at 960 wide covers about that much on the screen
    scene = picture(
        plain(plate_mesh("quad4", (2, 2), (1.0, 1.0))), view=View((0, 0, 1)), ghost=False, width=960, height=720
    )
    row = render(scene)[350, :, 0].astype(int)
    body_red, edge_red = byte(THEMES["light"].body)[0], byte(THEMES["light"].body_edge)[0]
    dark = np.clip((body_red - row) / (body_red - edge_red), 0, 1)
    assert dark[dark > 0.1].sum() / 2 == pytest.approx(tokens.CONTOUR, abs=0.4)


def halves(mesh):
    middle = mesh.points[mesh.blocks[0].nodes].mean(axis=1)
    return mesh.with_(cell_groups={"left": np.flatnonzero(middle[:, 0] < 0.5)}), middle


def test_hidden_groups_are_not_drawn_and_the_rest_is_not_changed():
    mesh, _ = halves(plate_mesh("quad4", (4, 4), (1.0, 1.0)))
    whole = picture(plain(mesh), view=View((0, 0, 1)), ghost=False)
    part = whole.with_(bodies=Showing(hide=("left",)).parts(whole.bodies, (0, 0, 1)))
    with Stage(whole) as stage:
        before, camera = stage.image(0.0), stage.camera()
        stage.show(part, keep_camera=True)
        after = stage.image(0.0)
    box = view.fit(whole, note_height(whole))[1][0]
    ends = camera.project(np.array([[0.25, 0.3, 0.0], [0.75, 0.3, 0.0]]), box) / 2
    left, right = np.round(ends[:, ::-1]).astype(int)
    assert not near(before, THEMES["light"].background)[tuple(left)]
    assert near(after, THEMES["light"].background)[tuple(left)]
    assert np.array_equal(before[tuple(right)], after[tuple(right)])


def test_the_cut_face_shows_the_energy_of_the_cells_inside():
    # hot cells in the middle of a solid are seen only when it is cut open
    mesh = box_mesh("hex8", (5, 5, 5), (1.0, 1.0, 1.0))
    middle = mesh.points[mesh.blocks[0].nodes].mean(axis=1)
    hot = np.abs(middle - 0.5).max(axis=1) < 0.2
    whole = picture(plain(mesh, density=np.where(hot, 16.0, 0.0)), view=View((1, 0, 0)), ghost=False, energy_top=16.0)
    cut = whole.with_(bodies=Showing(plane=Plane((1, 0, 0), 0.47)).parts(whole.bodies, (1, 0, 0)))
    for scene, seen in ((whole, False), (cut, True)):
        with Stage(scene) as stage:
            image, box = stage.image(0.0), view.fit(scene, note_height(scene))[1][0]
            at = stage.camera().project(np.array([[0.47, 0.5, 0.5]]), box)[0] / 2
        red, _, blue = image[round(at[1]), round(at[0])].astype(int)
        assert (red - blue > 30) == seen


@pytest.mark.parametrize("theme", THEMES)
def test_node_lines_are_drawn_with_their_casing(theme):
    mesh = plate_mesh("quad4", (20, 20), (1.0, 1.0))
    shape = np.stack([0 * mesh.points[:, 0], 0 * mesh.points[:, 0], mesh.points[:, 0] - 0.42], axis=1)
    bare = Body("plate", mesh, shape, 0.05, 1.0)
    lined = Body("plate", mesh, shape, 0.05, 1.0, node_lines=NodeLines(None))
    options = {
        "view": View((0, 0, 1), (0, 1, 0)),
        "ghost": False,
        "theme": theme,
        "width": 960,
        "height": 720,
    }
    before, after = render(picture(bare, **options), 1.0), render(picture(lined, **options), 1.0)
    scene = picture(lined, **options)
    camera, boxes = view.fit(scene, note_height(scene))
    (x, y), (_, top), (_, foot) = camera.project(np.array([[0.42, y, 0.0] for y in (0.5, 0.9, 0.1)]), boxes[0])
    changed = np.flatnonzero(np.abs(before.astype(int) - after).max(axis=2)[round(y)] > 10)
    assert changed.mean() == pytest.approx(x, abs=1.0)
    assert np.ptp(changed) + 1 == pytest.approx(tokens.NODE_CASING, abs=1.5)
    dark = near(after, THEMES[theme].ink, 12)[round(top) : round(foot), round(x) - 2 : round(x) + 2]
    assert dark.any(axis=1).all(), "the line has gaps"
    assert near(after, THEMES[theme].halo, 12)[round(y), changed.min() : changed.max() + 1].any()
