"""The colour bar of strain energy: a square-root scale with its ticks at perfect squares."""

from __future__ import annotations

from math import sqrt

import numpy as np

from viewer.scene.figures import digits
from viewer.scene.palette import energy_ramp, energy_share
from viewer.scene.picture import Picture
from viewer.scene.primitives import Frame, GradientBar, Line, Polygon, Primitive, Text
from viewer.scene.tokens import BAR_HEIGHT, BAR_TICK, BAR_TITLE, BAR_WIDTH, THEMES
from viewer.scene.typeface import wrap

ROOM = 84.0  # height that the bar takes, free space beside the body included
SIDE = 24.0  # right edge to the arrow tip
TIP = 10.0
COMPARED_WIDTH = 200.0
_TITLE, _BAR, _TICKS = 28.0, 39.0, 68.0  # title baseline, top of the bar, tick baseline
_CAUTION_LINE = 19.0
CAUTION_ROOM = 370.0
_MOST_STEPS = 7


def squares(top: float) -> list[float]:
    """Ticks at perfect squares from 0 to ``top``, at most eight, evenly spaced on the root scale.

    Steps of the root that do not divide that of ``top`` leave their last interval shorter or longer; the top
    itself is always a tick, for it says where the scale ends.
    """
    root = round(sqrt(top))
    step = next(s for s in range(1, root + 1) if root // s <= _MOST_STEPS)
    roots = [r for r in range(0, root, step) if root - r >= max(step, 1)]
    return [float(r * r) for r in (*roots, root)]


def colour_bar_items(
    title: str,
    top: float,
    caution: str,
    theme: str,
    right: float,
    y: float,
    width: float,
    scale: float = 1.0,
    caution_room: float = CAUTION_ROOM,
) -> list[Primitive]:
    """The bar with its tip ending at ``right`` and its title's line beginning at ``y``; ``scale`` sizes all.
    ``caution_room`` is the width in which the caution is broken into lines."""
    tokens = THEMES[theme]
    bar, foot, tip = y + (_BAR - 14) * scale, y + (_BAR - 14 + BAR_HEIGHT) * scale, TIP * scale
    left, edge = right - tip - width, right - tip
    colours = energy_ramp(theme)
    r, g, b = (int(c) for c in colours[-1])
    arrow = ((edge, bar), (right, (bar + foot) / 2), (edge, foot))
    outline = ((edge, foot), (left, foot), (left, bar), (edge, bar), arrow[1], (edge, foot))
    items: list[Primitive] = [
        Text(right, y + (_TITLE - 14) * scale, title, tokens.ink, BAR_TITLE * scale, anchor="right"),
        GradientBar(left, bar, width, foot - bar, colours),
        Polygon(arrow, f"#{r:02X}{g:02X}{b:02X}"),
        Line(outline, tokens.soft, scale),
    ]
    for value in squares(top):
        x = left + float(energy_share(np.array(value), top)) * width
        items.append(Line(((x, foot), (x, foot + 4 * scale)), tokens.soft, scale))
        baseline = y + (_TICKS - 14) * scale
        items.append(Text(x, baseline, digits(value, 4, trim=True), tokens.ink, BAR_TICK * scale, anchor="middle"))
    lines = wrap((caution,), caution_room, BAR_TICK * scale) if caution else []
    for k, words in enumerate(lines):
        baseline = y + (_TICKS - 14 + _CAUTION_LINE * (k + 1)) * scale
        items.append(Text(right, baseline, words, tokens.ink, BAR_TICK * scale, anchor="right"))
    return items


def caution_room(picture: Picture) -> float:
    """Height that the caution under the bar takes, sheet px."""
    if picture.energy_top is None or not picture.energy_caution:
        return 0.0
    return _CAUTION_LINE * len(wrap((picture.energy_caution,), CAUTION_ROOM, BAR_TICK))


def picture_bar(picture: Picture, frame: Frame, band_top: float) -> list[Primitive]:
    """The bar of a picture: top right; of bodies left and right, at the foot of the last, right above the note."""
    if picture.energy_top is None:
        return []
    right, words, caution = frame.width - SIDE, picture.energy_words, picture.energy_caution
    if frame.boxes[0][0] == frame.boxes[-1][0]:
        return colour_bar_items(words, picture.energy_top, caution, picture.theme, right, 14.0, float(BAR_WIDTH))
    y = band_top - ROOM + 16.0 - caution_room(picture)
    return colour_bar_items(words, picture.energy_top, caution, picture.theme, right, y, COMPARED_WIDTH)
