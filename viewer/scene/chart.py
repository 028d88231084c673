"""What the flat charts share: the sheet with its note band, blending of colours, and labels that keep apart."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from viewer.model.arrays import Array
from viewer.scene.primitives import Box, Point, Polygon, Primitive, Sheet, Spot, Text
from viewer.scene.tokens import (
    BAND_HEIGHT,
    BASE_WIDTH,
    BASELINES,
    MARGIN,
    OVERFLOW_LINE,
    TEXT,
    TEXT_NAME,
    TEXT_SMALL,
    Tokens,
    rgb,
)
from viewer.scene.typeface import text_width

HEIGHT = 720.0


def chart_sheet(
    tokens: Tokens,
    title: str,
    notes: Sequence[str],
    items: Sequence[Primitive],
    height: float = HEIGHT,
    spots: Sequence[Spot] = (),
) -> Sheet:
    """A sheet 960 wide: ``items`` above the note band that every picture has, with its title and notes, the first in
    ink. ``height`` is meant for two lines of notes; each further one adds a line below."""
    top = height - BAND_HEIGHT
    lines = [(line, tokens.soft if k else tokens.ink) for k, words in enumerate(notes) for line in _broken(words)]
    height += OVERFLOW_LINE * max(len(lines) - 2, 0)
    band: list[Primitive] = [
        rectangle((0, 0, BASE_WIDTH, height), tokens.background),
        rectangle((0, top, BASE_WIDTH, height), tokens.band),
        rectangle((0, top, BASE_WIDTH, top + 1), tokens.rule),
        Text(MARGIN, top + BASELINES[0], title, tokens.ink, TEXT_NAME, True),
    ]
    for k, (words, colour) in enumerate(lines):
        band.append(Text(MARGIN, top + BASELINES[1] + (BASELINES[2] - BASELINES[1]) * k, words, colour, TEXT))
    return Sheet(BASE_WIDTH, height, (*band, *items), spots=tuple(spots))


def _broken(words: str) -> list[str]:
    """Lines no wider than the band, broken at spaces."""
    lines = [""]
    for word in words.split(" "):
        longer = f"{lines[-1]} {word}".strip()
        if lines[-1] and text_width(longer, TEXT) > BASE_WIDTH - 2 * MARGIN:
            lines.append(word)
        else:
            lines[-1] = longer
    return lines


def rectangle(box: Box, colour: str) -> Polygon:
    return Polygon(corners(box), colour)


def corners(box: Box) -> tuple[Point, ...]:
    """The four corners of a box, around it."""
    left, top, right, foot = box
    return (left, top), (right, top), (right, foot), (left, foot)


def blend(low: str, high: str, share: float) -> str:
    """The colour at ``share`` (0 … 1) from ``low`` to ``high``, both ``#RRGGBB``."""
    mixed = [round(255 * ((1 - share) * a + share * b)) for a, b in zip(rgb(low), rgb(high), strict=True)]
    return "#{:02X}{:02X}{:02X}".format(*mixed)


def readable_on(colour: str, tokens: Tokens) -> str:
    """Ink or background, whichever stands out more against ``colour``."""
    return max((tokens.ink, tokens.background), key=lambda text: contrast(text, colour))


def contrast(one: str, other: str) -> float:
    """Contrast ratio of two colours (WCAG 2.2)."""
    light, dark = sorted((_luminance(one), _luminance(other)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


def _luminance(colour: str) -> float:
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in rgb(colour)]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def fitted(words: str, width: float, size: float = TEXT_SMALL, bold: bool = False) -> str:
    """``words``, cut with an ellipsis where they are wider than ``width``."""
    if text_width(words, size, bold) <= width:
        return words
    while words and text_width(words.rstrip() + "…", size, bold) > width:
        words = words[:-1]
    return words.rstrip() + "…"


def apart(wished: Sequence[float], gap: float, low: float, high: float) -> Array:
    """Places as near as can be to the ascending ``wished`` ones, at least ``gap`` apart, within ``low`` … ``high``.

    Least squares under the order of the list (pool adjacent violators, Barlow et al. 1972)."""
    wish = np.asarray(wished, float)
    if not len(wish):
        return wish
    gap = min(gap, (high - low) / max(len(wish) - 1, 1))
    pools: list[list[float]] = []  # mean, count
    for value in wish - gap * np.arange(len(wish)):
        pools.append([value, 1])
        while len(pools) > 1 and pools[-2][0] > pools[-1][0]:
            mean, count = pools.pop()
            pools[-1] = [(pools[-1][0] * pools[-1][1] + mean * count) / (pools[-1][1] + count), pools[-1][1] + count]
    flat = np.concatenate([np.full(int(count), mean) for mean, count in pools])
    return np.clip(flat, low, high - gap * (len(wish) - 1)) + gap * np.arange(len(wish))


def ticks(low: float, high: float, count: int = 6) -> list[float]:
    """Round values within a range, about ``count`` of them."""
    raw = (high - low) / max(count, 1)
    power = 10.0 ** np.floor(np.log10(raw)) if raw > 0 else 1.0
    step = next(power * m for m in (1, 2, 2.5, 5, 10) if power * m >= raw * (1 - 1e-9))
    first = np.ceil(low / step - 1e-9)
    # + 0.0: what is rounded up from just below nothing is no negative nothing
    return [float(step * k) + 0.0 for k in np.arange(first, np.floor(high / step + 1e-9) + 1)]
