"""The whole sheet: legible, inside the frame, nothing over anything; flat drawing as triangles."""

import numpy as np
import pytest

from tests.scene.sheets import ALL, frame_of, known, side, true
from viewer.scene.flatten import line_quads, triangulate
from viewer.scene.primitives import overlap
from viewer.scene.sheet import (
    Disc,
    GradientBar,
    Line,
    Polygon,
    Ring,
    Text,
    compose_sheet,
    note_height,
    plan_sheet,
)
from viewer.scene.tokens import THEMES, rgb
from viewer.scene.typeface import text_width, wrap

SIZES = [(960, 720), (960, 540), (1920, 1080), (640, 480)]


def sheets(name, theme="light", size=None):
    picture = ALL[name]().with_(theme=theme)
    if size is not None:
        picture = picture.with_(width=size[0], height=size[1])
    return picture, compose_sheet(picture, 0.7, frame_of(picture))


@pytest.mark.parametrize("name", ALL)
@pytest.mark.parametrize("size", SIZES)
def test_texts_are_legible_inside_and_apart(name, size):
    _, sheet = sheets(name, size=size)
    texts = [item for item in sheet.items if isinstance(item, Text)]
    assert len(texts) > 4
    for text in texts:
        assert text.size >= 14  # LOOK.md: "No text below 14"
    for item in sheet.items:
        left, top, right, foot = item.box
        assert left >= 0
        assert right <= sheet.width
        assert top >= 0
        assert foot <= sheet.height
    for k, one in enumerate(texts):
        for other in texts[k + 1 :]:
            inner = [(t.box[0] + 1, t.box[1] + 2, t.box[2] - 1, t.box[3] - 2) for t in (one, other)]
            assert not overlap(*inner), (one.words, other.words)
    knob = next(item for item in sheet.moving if isinstance(item, Disc) and item.radius == 6)
    assert not any(overlap(knob.box, (t.box[0], t.box[1] + 2, t.box[2], t.box[3] - 2)) for t in texts)


@pytest.mark.parametrize("name", ALL)
def test_only_the_band_holds_the_note(name):
    picture, sheet = sheets(name)
    top = sheet.height - note_height(picture)
    for text in (item for item in sheet.items if isinstance(item, Text)):
        assert text.box[3] <= top or text.box[1] >= top


def luminance(colour):
    """Relative luminance, W3C Web Content Accessibility Guidelines 2.1."""
    c = np.array(rgb(colour))
    return np.where(c <= 0.03928, c / 12.92, ((c + 0.055) / 1.055) ** 2.4) @ [0.2126, 0.7152, 0.0722]


@pytest.mark.parametrize("theme", ["light", "dark"])
@pytest.mark.parametrize("name", ALL)
def test_text_reaches_a_contrast_of_4_5(name, theme):
    """WCAG 2.1, success criterion 1.4.3: 4.5:1 for text; texts lie on the background, the band or the disc."""
    picture, sheet = sheets(name, theme)
    tokens = THEMES[theme]
    top = sheet.height - note_height(picture)
    for text in (item for item in sheet.items if isinstance(item, Text)):
        grounds = [tokens.band] if text.box[1] >= top or picture.magnified else [tokens.background]
        for ground in grounds:
            light, dark = sorted((luminance(text.colour), luminance(ground)), reverse=True)
            assert (light + 0.05) / (dark + 0.05) >= 4.5, text


def test_the_title_keys_carry_colour_and_dash():
    _, sheet = sheets("side")
    tokens = THEMES["light"]
    samples = [item for item in sheet.fixed if isinstance(item, Line) and item.width == 4]
    assert [(line.colour, bool(line.dash)) for line in samples] == [(tokens.baseline, True), (tokens.modified, False)]
    words = [item.words.replace("\u00a0", " ") for item in sheet.fixed if isinstance(item, Text)]
    assert "modified: narrow window" in words
    assert "84.6 Hz" in words


def test_the_magnifier_shows_value_place_and_phase():
    picture = true()
    plan = plan_sheet(picture, frame_of(picture))
    texts = [item.words for item in plan.fixed if isinstance(item, Text)]
    for words in ("magnified", "camera lens", "±3.9", "µm"):
        assert words in texts
    assert plan.magnifier is not None
    dots = [plan.magnifier.dot(phase) for phase in (0, np.pi / 2, np.pi)]
    x, y = plan.magnifier.centre
    assert dots[0].y > y  # the motion at phase 0 is down, and down is drawn down
    assert dots[0].y - dots[1].y == pytest.approx(dots[1].y - dots[2].y)
    assert dots[1].y == pytest.approx(y)
    for dot in dots:
        assert np.hypot(dot.x - x, dot.y - y) < 74 - dot.radius
    target = frame_of(picture).project(picture.magnified.position[None], 0)[0]
    assert plan.magnifier.target == pytest.approx(tuple(target))


def test_a_level_motion_is_magnified_level():
    picture = true()
    glass = type(picture.magnified)("lens", picture.magnified.position, np.array([1.0, 0.0, 0.0]), 2e-6)
    view = type(picture.view)((0.0, -1.0, 0.2))
    plan = plan_sheet(picture.with_(magnified=glass, view=view), frame_of(picture.with_(view=view)))
    one, other = plan.magnifier.dot(0.0), plan.magnifier.dot(np.pi)
    assert one.y == other.y
    assert one.x > other.x  # seen from −y, x runs to the right


def test_side_by_side_has_a_rule_between_the_viewports():
    picture = side()
    frame = frame_of(picture)
    rules = [i for i in plan_sheet(picture, frame).fixed if isinstance(i, Line) and i.colour == THEMES["light"].rule]
    assert ((480.0, 0.0), (480.0, frame.boxes[0][3])) in [line.points for line in rules]


# ---- type


def test_lines_break_at_statements_then_words():
    lines = wrap(("aaa bbb", "ccc", "a very long statement of many words"), 150, 16)
    assert lines[0] == "aaa bbb · ccc"
    assert " ".join(lines[1:]) == "a very long statement of many words"
    assert all(text_width(line, 16) <= 150 for line in lines)
    assert wrap((), 100, 16) == []


def test_widths_are_those_of_the_face():
    """hmtx table of DejaVu Sans 2.37: "m" advances 1995 of 2048 units per em, "i" 569, the space 651."""
    for letter, advance in (("m", 1995), ("i", 569), (" ", 651)):
        assert text_width(letter, 2048) == pytest.approx(advance, rel=0.006)
    assert text_width("mm", 32, True) > text_width("mm", 32)


# ---- flat drawing


def area(items):
    points, triangles, _ = triangulate(items)
    a, b, c = points[triangles].transpose(1, 0, 2)
    u, v = b - a, c - a
    return np.abs(u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0]).sum() / 2


def test_areas_of_primitives():
    assert area([Disc(5, 5, 10, "#000000")]) == pytest.approx(np.pi * 100, rel=0.002)
    assert area([Ring(5, 5, 10, "#000000", 2.0)]) == pytest.approx(np.pi * (11**2 - 9**2), rel=0.002)
    assert area([Line(((0, 0), (30, 40)), "#000000", 3.0)]) == pytest.approx(150)
    assert area([Polygon(((0, 0), (4, 0), (4, 3), (0, 3)), "#000000")]) == pytest.approx(12)
    assert area([GradientBar(1, 2, 230, 13, np.zeros((256, 3), np.uint8))]) == pytest.approx(230 * 13)
    assert len(triangulate([])[1]) == 0


def test_dashes_cover_their_share_over_corners():
    line = Line(((0, 0), (50, 0), (50, 31)), "#000000", 2.0, (13.0, 6.0))
    sides = sum(np.linalg.norm(quad[1] - quad[0]) for quad in line_quads(line))
    assert sides == pytest.approx(4 * 13 + 5)  # 81 = 4 · 19 + 5: four whole dashes, and 5 of the fifth


def test_thin_lines_keep_a_least_width():
    (quad,) = line_quads(Line(((0, 0), (10, 0)), "#000000", 0.4), least_width=1.0)
    assert np.ptp(quad[:, 1]) == pytest.approx(1.0)


def test_colours_and_order_follow_the_list():
    _, triangles, colours = triangulate([Polygon(((0, 0), (1, 0), (0, 1)), "#102030"), Disc(0, 0, 1, "#FFFFFF")])
    assert colours[0].tolist() == [16, 32, 48]
    assert colours[-1].tolist() == [255, 255, 255]
    assert len(colours) == len(triangles)


def test_the_plan_is_the_composed_sheet():
    picture = known()
    frame = frame_of(picture)
    plan, sheet = plan_sheet(picture, frame).at(1.0), compose_sheet(picture, 1.0, frame)
    assert [type(i) for i in plan.items] == [type(i) for i in sheet.items]
    assert [i.box for i in plan.items] == [i.box for i in sheet.items]
