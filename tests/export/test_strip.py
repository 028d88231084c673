"""The phase strip as a picture, and the sheet as VTK draws it: words and knobs where the layout says."""

import numpy as np
import pytest
from PIL import Image

from tests.scene.sheets import frame_of, known, side
from tests.stage.channel import body, channel, nod
from viewer.errors import Cancelled
from viewer.export import save_strip
from viewer.jobs import Progress
from viewer.scene.primitives import Disc, Line, Sheet, Text, overlap
from viewer.scene.sheet import plan_sheet
from viewer.scene.strip_sheet import strip_layout
from viewer.scene.tokens import THEMES, rgb
from viewer.stage.sheet_actors import SheetActors
from viewer.stage.windows import off_screen, pixels

INK = np.round(255 * np.array(rgb(THEMES["light"].ink)))


def near(image, colour, within=30):
    return np.abs(image.astype(int) - colour).max(axis=2) <= within


# ---- layout


def test_words_of_a_standing_mode_that_moves_upright():
    strip = strip_layout(known())
    words = [t.words for t in strip.sheet.items if isinstance(t, Text) and t.anchor == "middle" and t.size == 21]
    assert words[:5] == ["full up", "half up", "rest", "half down", "full down"]  # look/6_phase_strip.png
    assert np.cos(strip.phases) == pytest.approx([-1, -0.5, 0, 0.5, 1], abs=1e-12)


def test_words_of_a_mode_that_does_not_move_upright():
    mesh = channel()
    sideways = known(bodies=(body(mesh, shape=nod(mesh)[:, [0, 2, 1]]),))
    words = [t.words for t in strip_layout(sideways).sheet.items if isinstance(t, Text) and t.size == 21]
    assert words[:5] == ["full one way", "half", "rest", "half", "full the other way"]


def test_a_travelling_mode_never_rests():
    mesh = channel()
    shape = nod(mesh) + 1j * nod(mesh, twist=1.0)
    strip = strip_layout(known(bodies=(body(mesh, shape=shape),)))
    words = [t.words for t in strip.sheet.items if isinstance(t, Text) and t.size == 21]
    assert words[:5] == ["start", "⅛ cycle", "¼ cycle", "⅜ cycle", "½ cycle"]
    assert strip.phases == pytest.approx(np.arange(5) * np.pi / 4)


@pytest.mark.parametrize("make", [known, side])
def test_nothing_overlaps_and_type_is_for_print(make):
    strip = strip_layout(make())
    texts = [item for item in strip.sheet.items if isinstance(item, Text)]
    assert min(t.size for t in texts) == 21  # 14 × 1.5
    for k, text in enumerate(texts):
        left, top, right, foot = text.box
        assert 0 <= left < right <= 1600
        assert 0 <= top < foot <= strip.sheet.height
        assert not any(overlap(text.box, cell) for row in strip.cells for cell in row)
        for other in texts[k + 1 :]:
            assert not overlap((left + 1, top + 3, right - 1, foot - 3), other.box), (text.words, other.words)


def test_the_note_is_whole():
    picture = known()
    words = " · ".join(t.words for t in strip_layout(picture).sheet.items if isinstance(t, Text))
    for statement in (*picture.note.drawing, *picture.note.condition, "84.6\u00a0Hz", "dashed: undeformed"):
        assert statement in words


# ---- drawn


def test_the_strip_is_1600_by_500_with_five_phases(tmp_path):
    picture = known()
    path = save_strip(picture, tmp_path / "strip.png")
    image = np.array(Image.open(path))
    assert image.shape == (500, 1600, 3)
    assert (image[[0, 0, -1, -1], [0, -1, 0, -1]] == 255).all()
    strip = strip_layout(picture)
    knobs = [item for item in strip.sheet.items if isinstance(item, Disc)]
    assert len(knobs) == 5
    for knob in knobs:
        x, y = round(knob.x), round(knob.y)
        rows, columns = np.nonzero(near(image[y - 14 : y + 14, x - 14 : x + 14], INK))
        assert rows.mean() + y - 14 == pytest.approx(knob.y - 0.5, abs=1.0)
        assert columns.mean() + x - 14 == pytest.approx(knob.x - 0.5, abs=1.0)
    # the tip goes down from the first phase to the last: the centre of what is drawn in the outer half sinks
    heights = []
    for left, top, right, foot in strip.cells[0]:
        cell = image[round(top) : round(foot), round((left + right) / 2) : round(right)]
        heights.append(np.nonzero((cell != 255).any(axis=2))[0].mean())
        assert (cell != 255).any(axis=2).mean() > 0.1
    assert heights[0] + 8 < heights[-1]


@pytest.mark.parametrize("width", [400, 900])
def test_a_strip_of_another_width_is_the_same_drawing_at_another_size(tmp_path, width):
    found = [np.array(Image.open(save_strip(known(), tmp_path / f"{w}.png", width=w))) for w in (1600, width)]
    assert found[1].shape[:2] == (round(500 * width / 1600), width)
    boxes = []
    for image, scale in zip(found, (1.0, width / 1600), strict=True):
        for left, top, right, foot in (np.array(cell) * scale for cell in strip_layout(known()).cells[0]):
            cell = image[round(top) : round(foot), round(left) : round(right)]
            rows, columns = np.nonzero((cell != 255).any(axis=2))
            boxes.append(np.array([columns.min(), rows.min(), columns.max(), rows.max()]) / scale)
    assert np.array(boxes[5:]) == pytest.approx(np.array(boxes[:5]), abs=3 * 1600 / width)


def test_compared_designs_get_a_row_each(tmp_path):
    picture = side()
    strip = strip_layout(picture)
    assert len(strip.cells) == 2
    image = np.array(Image.open(save_strip(picture, tmp_path / "strip.png")))
    assert image.shape == (strip.sheet.height, 1600, 3)
    drawn = []
    for row in strip.cells:
        left, top, right, foot = row[2]
        drawn.append((image[round(top) : round(foot), round(left) : round(right)] != 255).any(axis=2).mean())
    assert min(drawn) > 0.1
    assert drawn[0] == pytest.approx(drawn[1], rel=0.1)  # one camera, one scale


def test_a_cancelled_strip_leaves_nothing(tmp_path):
    with pytest.raises(Cancelled):
        save_strip(known(), tmp_path / "strip.png", Progress(stop=lambda: True))
    assert list(tmp_path.iterdir()) == []


# ---- VTK draws what the sheet says


def drawn(sheet: Sheet, scale: int = 2):
    plotter = off_screen(scale * round(sheet.width), scale * round(sheet.height))
    try:
        plotter.set_background("white")
        plotter.render_window.SetMultiSamples(0)
        actors = SheetActors(plotter.renderer)
        actors.show(sheet)
        first = pixels(plotter.render_window)
        actors.show(Sheet(sheet.width, sheet.height, sheet.fixed[:1]))
        return first, pixels(plotter.render_window)
    finally:
        plotter.close()


def ink_box(image, box, scale, pad=14):
    left, top, right, foot = (round(scale * v) for v in (box[0] - pad, box[1] - pad, box[2] + pad, box[3] + pad))
    rows, columns = np.nonzero((image[top:foot, left:right] < 128).all(axis=2))
    return (
        (columns.min() + left) / scale,
        (rows.min() + top) / scale,
        (columns.max() + 1 + left) / scale,
        (rows.max() + 1 + top) / scale,
    )


@pytest.mark.parametrize("scale", [1, 2])
def test_words_stand_where_the_layout_puts_them(scale):
    texts = (
        Text(40, 60, "Hxgp largest real motion 3.9 µm", "#000000", 21, True),
        Text(560, 110, "8\u202f300× Hgp", "#000000", 16, anchor="right"),
        Text(300, 160, "φ 3σ ÷ Hpq", "#000000", 14, anchor="middle"),
    )
    image, fewer = drawn(Sheet(600, 200, texts), scale)
    for text in texts:
        left, top, right, foot = ink_box(image, text.box, scale)
        slack = 2.5 + 0.015 * (text.box[2] - text.box[0])  # side bearings, and hinted advances
        assert left == pytest.approx(text.box[0], abs=slack)
        assert right == pytest.approx(text.box[2], abs=slack)
        assert text.box[1] - 1 <= top <= text.box[1] + 0.12 * text.size + 1
        assert foot == pytest.approx(text.y + 0.21 * text.size, abs=1.2)  # descender of g, p, q
    assert (fewer[scale * 90 :] == 255).all()  # unused actors are hidden


def test_shapes_stand_where_the_layout_puts_them():
    shapes = (Line(((20, 30), (120, 30)), "#000000", 4.0), Disc(200, 100, 12, "#000000"))
    image, _ = drawn(Sheet(300, 200, shapes))
    for shape in shapes:
        assert ink_box(image, shape.box, 2, 5) == pytest.approx(shape.box, abs=0.6)


def test_a_plan_moves_only_what_moves():
    picture = known()
    plan = plan_sheet(picture, frame_of(picture))
    plotter = off_screen(picture.width, picture.height)
    try:
        plotter.set_background("white")
        plotter.render_window.SetMultiSamples(0)
        actors = SheetActors(plotter.renderer)
        shown = []
        for phase in (0.0, np.pi, 0.0):
            actors.show(plan.at(phase))
            shown.append(pixels(plotter.render_window))
    finally:
        plotter.close()
    assert np.array_equal(shown[0], shown[2])
    changed = (shown[0] != shown[1]).any(axis=2)
    assert changed.any()
    moving = [item.box for phase in (0.0, np.pi) for item in plan.at(phase).moving]
    rows, columns = np.nonzero(changed)
    for x, y in zip(columns, rows, strict=True):
        assert any(b[0] - 2 <= x <= b[2] + 2 and b[1] - 2 <= y <= b[3] + 2 for b in moving)
