"""Hinges, flaps, struts and gain on the screen, checked in pixels."""

from dataclasses import replace

import numpy as np
import pytest

from tests.meshes import plate_mesh
from tests.scene.findings import FOLD_AT, marked
from tests.scene.sheets import known, scale
from tests.stage.channel import WIDTH
from tests.stage.test_stage import byte, near, plain
from viewer.scene import palette, view
from viewer.scene.note_layout import note_height
from viewer.scene.picture import FlapMark, View
from viewer.scene.strut_marks import strut_marks
from viewer.scene.tokens import THEMES
from viewer.stage import Stage


def found(theme="light", width=480, body=None, **changes):
    shown = marked(scale(), **changes) if body is None else body
    shown = replace(shown, supports=(), masses=(), points=())
    return known(bodies=(shown,), theme=theme, width=width, height=width * 3 // 4, ghost=False)


def drawn(picture, phase=0.0):
    """Image and the pixels at which points of the first body are drawn."""
    with Stage(picture) as stage:
        image = stage.image(phase)
        _, boxes = view.fit(picture, note_height(picture))
        frame = view.frame(picture, stage.camera(), boxes)
    return image, lambda points: np.round(frame.project(np.atleast_2d(points), 0) * picture.width / 960).astype(int)


def at(image, pixels):
    return image[pixels[:, 1], pixels[:, 0]]


AXIS = np.array([[FOLD_AT, WIDTH * share, -0.03] for share in np.linspace(0.1, 0.9, 9)])


@pytest.mark.parametrize("theme", THEMES)
@pytest.mark.parametrize("chosen", [0, 1])
def test_the_pin_is_seen_through_the_part_with_its_casing(theme, chosen):
    picture = found(theme, chosen=chosen)
    image, where = drawn(picture, np.pi / 2)
    colour = byte(THEMES[theme].accent if chosen else THEMES[theme].ink)
    assert np.abs(at(image, where(AXIS)).astype(int) - colour).max() < 30
    # across the pin: casing in the halo colour on both sides within 1.7 radii and a pixel
    y, x = where(AXIS[4:5])[0][::-1]
    column = image[y - 8 : y + 9, x].astype(int)
    halo = np.abs(column - byte(THEMES[theme].halo)).max(axis=1) < 60
    assert halo[:8].any()
    assert halo[9:].any()


def test_the_pin_moves_with_the_part():
    picture = found()
    (body,) = picture.bodies
    for phase in (0.0, np.pi):
        image, where = drawn(picture, phase)
        moved = AXIS + body.factor * np.cos(phase) * np.array([0, 0, -0.03])
        assert np.abs(at(image, where(moved)).astype(int) - byte(THEMES["light"].ink)).max() < 30
    assert np.abs(where(moved) - where(AXIS)).max() >= 1


def test_the_fan_darkens_what_lies_beneath_and_closes_at_rest():
    picture = found()
    bare = found(body=replace(picture.bodies[0], hinges=(replace(picture.bodies[0].hinges[0], reach=0.0),)))
    changed = []
    for phase in (0.0, np.pi / 2):
        one, other = (drawn(p, phase)[0].astype(int) for p in (picture, bare))
        changed.append((np.abs(one - other).max(axis=2) > 10).sum())
    assert changed[0] > 3 * changed[1] > 0


def test_a_flap_is_tinted_by_three_tenths_and_outlined():
    mesh = plate_mesh("quad4", (8, 8), (1.0, 1.0))
    x, y = mesh.points[mesh.blocks[0].nodes].mean(axis=1)[:, :2].T
    flap = FlapMark("flap 1", (), np.nonzero((x > 0.5) & (y > 0.25))[0])
    pair = [plain(mesh), plain(mesh, flaps=(flap,))]
    look = {"view": View((0, 0, 1), (0, 1, 0)), "width": 960, "height": 720, "ghost": False, "energy_top": None}
    scenes = [known(bodies=(shown,), **look) for shown in pair]
    (before, where), (after, _) = (drawn(scene) for scene in scenes)
    inside, outside = (at(image, where([0.9, 0.6, 0]))[0].astype(float) for image in (before, after))
    lit = inside / byte(THEMES["light"].body)  # the tint is lit as the body is
    assert outside == pytest.approx(0.7 * inside + 0.3 * byte(THEMES["light"].flap) * lit, abs=6)
    assert at(after, where([0.2, 0.6, 0])).tolist() == at(before, where([0.2, 0.6, 0])).tolist()
    # outlined along its free edge x = 1 from end to end, dashed along the border x = 0.5
    accent = near(after, THEMES["light"].accent, 40)

    def share(column):
        top, foot = sorted(y for _, y in where([[column, 0.95, 0], [column, 0.3, 0]]))
        x = where([[column, 0.5, 0]])[0][0]
        return accent[top:foot, x - 2 : x + 3].any(axis=1).mean()

    assert share(1.0) == 1.0
    assert 0.3 < share(0.5) < 0.9


def test_a_flap_behind_the_part_is_not_seen():
    picture = found(body=replace(marked(scale()), hinges=()))
    seen = []
    for side in (-1.0, 1.0):
        with Stage(picture.with_(view=View((0.1, side, 0.1))), bare=1.0) as stage:
            seen.append(near(stage.image(0.0), THEMES["light"].accent, 40).sum())
    assert seen[0] > 100
    assert seen[1] == 0


def test_a_strut_is_seen_from_end_to_end_in_dashes():
    body = replace(marked(scale()), hinges=(), flaps=())
    start, end = np.array([0.25, 0.0, -0.06]), np.array([0.55, 0.0, -0.02])
    image, where = drawn(found(body=replace(body, struts=strut_marks(body, [(start, end, ("strut",))]))), np.pi / 2)
    line = at(image, where(start + np.linspace(0.0, 1.0, 200)[:, None] * (end - start))).astype(int)
    teal = np.abs(line - byte(THEMES["light"].modified)).max(axis=1) < 30
    assert teal[2]
    assert teal[-3]
    assert 0.4 < teal.mean() < 0.9


@pytest.mark.parametrize("theme", THEMES)
def test_gain_is_coloured_by_its_own_diverging_scale(theme):
    mesh = plate_mesh("quad4", (4, 4), (1.0, 1.0))
    values = (-9.0, 0.0, 9.0)
    images = []
    for value in values:
        body = plain(mesh, gain=np.full(mesh.n_cells, value))
        scene = known(bodies=(body,), view=View((0, 0, 1)), width=480, height=360, theme=theme, energy_top=None)
        images.append(drawn(scene.with_(gain_top=9.0, ghost=False)))
    ramp = palette.gain_ramp(theme)[[0, 128, 255]].astype(float)
    spots = np.array([at(image, where([0.5, 0.5, 0]))[0] for image, where in images], float)
    assert spots / spots[1] == pytest.approx(ramp / ramp[1], rel=0.05)
