"""The colour bar: strain energy or gain on a square-root scale, its ticks at perfect squares."""

from __future__ import annotations

from dataclasses import dataclass
from math import sqrt

import numpy as np

from viewer.model.arrays import Array
from viewer.scene.figures import digits
from viewer.scene.palette import energy_ramp, energy_share, gain_ramp, gain_share
from viewer.scene.picture import Picture
from viewer.scene.primitives import Frame, GradientBar, Line, Polygon, Primitive, Text
from viewer.scene.tokens import BAR_HEIGHT, BAR_TICK, BAR_TITLE, BAR_WIDTH, THEMES
from viewer.scene.typeface import text_width, wrap

ROOM = 84.0  # height that the bar takes, free space beside the body included
SIDE = 24.0  # right edge to the arrow tip
TIP = 10.0
COMPARED_WIDTH = 200.0
GAIN_WIDTH = 270.0
ENDS = ("lighten", "stiffen")
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


@dataclass(frozen=True, eq=False)
class BarScale:
    """What a bar shows.

    colours  (n, 3) uint8, from left to right
    ticks    (place 0 … 1, words, empty for a tick alone)
    ends     words below the left and the right end, or none
    """

    colours: Array
    ticks: tuple[tuple[float, str], ...]
    ends: tuple[str, ...] = ()


def energy_scale(top: float, theme: str) -> BarScale:
    """Strain energy from zero to ``top``."""
    ticks = ((float(energy_share(np.array(v), top)), digits(v, 4, trim=True)) for v in squares(top))
    return BarScale(energy_ramp(theme), tuple(ticks))


def gain_scale(top: float, theme: str, width: float = GAIN_WIDTH) -> BarScale:
    """Gain from −``top`` over zero to ``top`` (``palette.gain_top``), worded so that its ends differ without colour.

    Of the ticks, all ``top`` · (k/n)², those are labelled from the ends inward that leave room for one another on a
    bar ``width`` px wide.
    """
    decade = 10.0 ** _decade(top)
    count = round(sqrt(top / decade))
    ticks: list[tuple[float, str]] = [(0.5, "0")]
    last = np.inf
    for k in range(count, 0, -1):
        value = float(k * k * decade)
        words = digits(value, 4, trim=True)
        share = float(gain_share(np.array(value), top))
        need = text_width(f"−{words}", BAR_TICK) + 8
        fits = (last - share) * width >= need and (share - 0.5) * width >= need
        last = share if fits else last
        ticks += [(share, words if fits else ""), (1 - share, f"−{words}" if fits else "")]
    return BarScale(gain_ramp(theme), tuple(sorted(ticks)), ENDS)


def _decade(top: float) -> int:
    """The power of ten of which ``top`` is 4, 9 or 16 times."""
    return next(k for k in range(-30, 31) if round(top / 10.0**k, 6) in (4, 9, 16))


def colour_bar_items(
    title: str,
    bar: BarScale,
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
    top, foot, tip = y + (_BAR - 14) * scale, y + (_BAR - 14 + BAR_HEIGHT) * scale, TIP * scale
    left, edge, middle = right - tip - width, right - tip, y + (_BAR - 14 + BAR_HEIGHT / 2) * scale
    items: list[Primitive] = [
        Text(right, y + (_TITLE - 14) * scale, title, tokens.ink, BAR_TITLE * scale, anchor="right"),
        GradientBar(left, top, width, foot - top, bar.colours),
        Polygon(((edge, top), (right, middle), (edge, foot)), _hex(bar.colours[-1])),
    ]
    far = left - tip if bar.ends else left
    outline = ((edge, foot), (left, foot), (far, middle), (left, top), (edge, top), (right, middle), (edge, foot))
    if bar.ends:
        items.append(Polygon(((left, top), (far, middle), (left, foot)), _hex(bar.colours[0])))
    items.append(Line(outline, tokens.soft, scale))
    baseline = y + (_TICKS - 14) * scale
    for share, words in bar.ticks:
        x = left + share * width
        items.append(Line(((x, foot), (x, foot + 4 * scale)), tokens.soft, scale))
        if words:
            items.append(Text(x, baseline, words, tokens.ink, BAR_TICK * scale, anchor="middle"))
    if bar.ends:
        baseline += _CAUTION_LINE * scale
        items.append(Text(far, baseline, bar.ends[0], tokens.ink, BAR_TICK * scale, True))
        items.append(Text(right, baseline, bar.ends[1], tokens.ink, BAR_TICK * scale, True, "right"))
    lines = wrap((caution,), caution_room, BAR_TICK * scale) if caution else []
    for k, words in enumerate(lines, 1):
        place = baseline + _CAUTION_LINE * k * scale
        items.append(Text(right, place, words, tokens.ink, BAR_TICK * scale, anchor="right"))
    return items


def _hex(colour: Array) -> str:
    r, g, b = (int(c) for c in colour)
    return f"#{r:02X}{g:02X}{b:02X}"


def caution_room(picture: Picture) -> float:
    """Height that the caution under the bar, and words at the bar's ends, take, sheet px."""
    ends = _CAUTION_LINE if picture.gain_top else 0.0
    if not _has_bar(picture) or not picture.energy_caution:
        return ends
    return ends + _CAUTION_LINE * len(wrap((picture.energy_caution,), CAUTION_ROOM, BAR_TICK))


def _has_bar(picture: Picture) -> bool:
    return picture.energy_top is not None or bool(picture.gain_top)


def picture_bar(picture: Picture, frame: Frame, band_top: float) -> list[Primitive]:
    """The bar of a picture: top right; of bodies left and right, at the foot of the last, right above the note."""
    right, words, caution, theme = frame.width - SIDE, picture.energy_words, picture.energy_caution, picture.theme
    if picture.gain_top:
        bar = gain_scale(picture.gain_top, theme)
        return colour_bar_items(words, bar, caution, theme, right, 14.0, GAIN_WIDTH)
    if picture.energy_top is None:
        return []
    bar = energy_scale(picture.energy_top, theme)
    if frame.boxes[0][0] == frame.boxes[-1][0]:
        return colour_bar_items(words, bar, caution, theme, right, 14.0, float(BAR_WIDTH))
    y = band_top - ROOM + 16.0 - caution_room(picture)
    return colour_bar_items(words, bar, caution, theme, right, y, COMPARED_WIDTH)
