"""How far a measured mode moves all at once: each channel's value in the complex plane, at the best common phase."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from viewer.model.arrays import Array
from viewer.scene.chart import apart, blend, chart_sheet
from viewer.scene.figures import digits
from viewer.scene.primitives import Disc, Line, Polygon, Primitive, Ring, Sheet, Text
from viewer.scene.tokens import BAND_HEIGHT, BASE_WIDTH, MARGIN, TEXT_SMALL, THEMES, Tokens

HEIGHT = 620.0
CENTRE, RADIUS = (480.0, 268.0), 216.0  # of the outermost circle
CIRCLES = (1.0, 0.5)  # of the largest channel
WEDGE = 10.0  # degrees beside the line that count as in phase
TOLD, LEAST = 5, 0.1  # channels named: so many of those that leave the wedge and have this share of the largest
_LINE = 21.0
# first baselines of names above and below the words at the ends of the common line
_ABOVE, _BELOW = (MARGIN + 30.0, CENTRE[1] - 34.0), (CENTRE[1] + 28.0, HEIGHT - BAND_HEIGHT - 24.0)


def phase_chart(
    values: Array,
    channels: Sequence[str],
    collinearity: float,
    deviation_deg: float,
    *,
    title: str = "",
    told: int = TOLD,
    theme: str = "light",
) -> Sheet:
    """The channels of one test mode in the complex plane.

    values        (c,) complex or real, turned so that the line closest to all of them is the real axis
                  (``insight.phase.turned_real``); NaN for channels that are not used
    channels      (c,) in words
    collinearity  0 … 1, ``deviation_deg`` the mean deviation, for the note
    """
    tokens = THEMES[theme]
    values = np.asarray(values, complex)
    known: list[int] = np.flatnonzero(np.isfinite(values)).tolist()
    largest = float(np.abs(values[known]).max(initial=0.0)) or 1.0
    at = np.zeros((len(values), 2))
    at[known] = np.array(CENTRE) + RADIUS / largest * np.stack([values[known].real, -values[known].imag], axis=1)
    away = np.degrees(np.arctan2(np.abs(values.imag), np.abs(values.real)))
    telling = [k for k in known if away[k] > WEDGE and np.abs(values[k]) >= LEAST * largest]
    telling.sort(key=lambda k: -abs(values[k].imag))
    ringed = set(telling[:told])
    items = _plane(tokens)
    for k in known:
        items.append(Line((CENTRE, (float(at[k, 0]), float(at[k, 1]))), _thread(tokens), 1.2))
    for k in known:
        x, y = (float(v) for v in at[k])
        if k in ringed:
            items += [Disc(x, y, 7.5, tokens.halo), Disc(x, y, 6.0, tokens.test), Ring(x, y, 10.5, tokens.ink, 2.0)]
        else:
            items += [Disc(x, y, 6.0, tokens.halo), Disc(x, y, 4.5, tokens.test)]
    items += _names(telling[:told], at, away, channels, tokens)
    said = f"collinearity {collinearity:.2f} (1: all in phase), mean deviation {digits(deviation_deg)}°"
    counted = f"{len(telling)} of {len(known)} channels are more than {WEDGE:g}° off the common line"
    more = len(telling) - told
    counted += f", the {told} farthest from it named" if more > 0 else ", ringed and named" if telling else ""
    drawn = (
        "each bead is a channel, its distance from the middle its motion; in the band: in phase or in counter-phase"
    )
    return chart_sheet(tokens, title or "Phases of a measured mode", (said, f"{counted} · {drawn}"), items, HEIGHT)


def _thread(tokens: Tokens) -> str:
    return blend(tokens.background, tokens.test, 0.45)


def _plane(tokens: Tokens) -> list[Primitive]:
    """Circles, the wedge of what counts as in phase, the common line and words for the directions."""
    x, y = CENTRE
    angle = np.radians(WEDGE)
    tip, rise = RADIUS * np.cos(angle), RADIUS * np.sin(angle)
    band = blend(tokens.background, tokens.test, 0.14)
    items: list[Primitive] = [
        Polygon(((x, y), (x + side * tip, y - rise), (x + side * RADIUS, y), (x + side * tip, y + rise)), band)
        for side in (-1, 1)
    ]
    for share in CIRCLES:
        items.append(Ring(x, y, share * RADIUS, tokens.rule, 1.2))
    items.append(Line(((x, y - RADIUS), (x, y + RADIUS)), tokens.rule, 1.2))
    items.append(Line(((x - RADIUS - 16, y), (x + RADIUS + 16, y)), tokens.soft, 1.4))
    size = TEXT_SMALL
    return [
        *items,
        Text(x + RADIUS + 22, y + 5, "in phase", tokens.soft, size),
        Text(x - RADIUS - 22, y + 5, "in counter-phase", tokens.soft, size, False, "right"),
        Text(x, y - RADIUS - 10, "a quarter cycle ahead", tokens.soft, size, False, "middle"),
        Text(x, y + RADIUS + 20, "a quarter cycle behind", tokens.soft, size, False, "middle"),
    ]


def _names(rows: Sequence[int], at: Array, away: Array, channels: Sequence[str], tokens: Tokens) -> list[Primitive]:
    """Names of outlying channels at the side they lie on, kept apart, with leaders."""
    items: list[Primitive] = []
    for side, below in ((-1, False), (-1, True), (1, False), (1, True)):
        here = [k for k in rows if (at[k, 0] >= CENTRE[0]) == (side > 0) and (at[k, 1] > CENTRE[1]) == below]
        mine = sorted(here, key=lambda k: at[k, 1])
        x = BASE_WIDTH - MARGIN - 200 if side > 0 else MARGIN + 200
        room = _BELOW if below else _ABOVE
        for k, level in zip(mine, apart([float(at[k, 1]) for k in mine], 2 * _LINE, *room), strict=True):
            place = float(at[k, 0]), float(at[k, 1])
            end = (x - 6 * side, float(level) - 4)
            long = float(np.hypot(end[0] - place[0], end[1] - place[1])) or 1.0
            share = min(12.0 / long, 1.0)
            start = place[0] + share * (end[0] - place[0]), place[1] + share * (end[1] - place[1])
            anchor = "left" if side > 0 else "right"
            items.append(Line((start, end), tokens.ink, 1.2))
            items.append(Text(x, float(level), channels[k], tokens.ink, TEXT_SMALL, True, anchor))
            items.append(
                Text(x, float(level) + 17, f"{digits(away[k])}° off", tokens.soft, TEXT_SMALL, False, anchor)
            )
    return items
