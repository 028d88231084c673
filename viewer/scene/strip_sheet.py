"""The phase strip's sheet: five phases in a row, a gauge and a word under each, note and colour bar below.

Here one sheet pixel is one pixel of a strip 1600 wide; type is 1.5 times that of other pictures, for print.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import ceil

import numpy as np

from viewer.model.arrays import Array
from viewer.model.cycle import cycle_peaks
from viewer.scene import view
from viewer.scene.colour_bar import colour_bar_items, energy_scale
from viewer.scene.note_layout import gauge, is_true, knob
from viewer.scene.picture import Picture
from viewer.scene.primitives import Box, Line, Primitive, Sheet, Text
from viewer.scene.title_keys import key, keys_of_test
from viewer.scene.tokens import BAR_WIDTH, TEXT, TEXT_NAME, TEXT_SMALL, THEMES
from viewer.scene.typeface import wrap

TYPE = 1.5
WIDTH, HEIGHT = 1600, 500
ROW, LEAST_ROW = 262.0, 222.0  # height of a row of bodies; less, when that keeps the strip 500 high
LEAST_COMPARED, _BESIDE = 110.0, 32.0  # the same of compared bodies, as high as they need; free beside a body
_WORD, _GAUGE, _RULE = 35.0, 58.0, 88.0  # baseline, line and rule below the last row
_FIRST, _SECOND, _STEP = 44.0, 86.0, 38.0  # baselines below the rule, distance of further lines
_FOOT = 26.0  # below the last baseline
_KEY, _KEY_LINE = 33.0, 42.0  # baseline and height of a title key
_SIDE = 22.0
_BAR_ROOM = 400.0
_SWING = 164.0
_UPRIGHT = 0.9  # share of the largest motion along "up" that earns "up" and "down"
GHOST_WORDS = "dashed: undeformed"


@dataclass(frozen=True, eq=False)
class Strip:
    """Where everything of a strip stands.

    phases  rad, from left to right
    cells   by row and phase: the box that the drawing goes into
    sheet   everything else; its height is the strip's
    """

    phases: tuple[float, ...]
    cells: tuple[tuple[Box, ...], ...]
    sheet: Sheet


def strip_layout(picture: Picture) -> Strip:
    """The strip of a picture: one row, or one for each body when they are compared side by side. Always light."""
    picture = picture.with_(theme="light")
    tokens = THEMES["light"]
    rows = len(picture.bodies) if picture.layout == "side" else 1
    compared = picture.layout != "single"
    phases, words = strip_phases(picture)
    wide = WIDTH / len(phases)
    tested = keys_of_test(picture, _SIDE, _KEY, _KEY_LINE, TYPE)
    keys = _KEY_LINE * (1 if picture.layout == "side" else len(picture.bodies) if compared else 2 * bool(tested))
    note_height = _note(picture, 0.0, [])
    if compared:
        low, high = view.scene_box(picture)
        drawn = _BESIDE + (wide - _BESIDE) * float(high[1] - low[1]) / max(float(high[0] - low[0]), 1e-300)
        tall = float(round(min(max(drawn, LEAST_COMPARED), ROW)))
    else:
        tall = min(max(HEIGHT - _RULE - note_height, LEAST_ROW), ROW)
    items: list[Primitive] = [*tested]
    cells = []
    y = 0.0
    for row in range(rows):
        if compared:
            for k in (row,) if rows > 1 else range(len(picture.bodies)):
                items += key(picture, k, _SIDE, y + _KEY + _KEY_LINE * (0 if rows > 1 else k), TYPE)
        y += keys
        cells.append(tuple((k * wide, y, (k + 1) * wide, y + tall) for k in range(len(phases))))
        y += tall
    for k, (phase, word) in enumerate(zip(phases, words, strict=True)):
        middle = (k + 0.5) * wide
        ends = middle - _SWING / 2, middle + _SWING / 2
        items.append(Text(middle, y + _WORD, word, tokens.soft, TEXT_SMALL * TYPE, anchor="middle"))
        items += gauge(*ends, y + _GAUGE, tokens, TYPE)
        items.append(knob(*ends, y + _GAUGE, phase, tokens, TYPE))
    rule = y + _RULE
    items.append(Line(((0.0, rule), (float(WIDTH), rule)), tokens.rule, TYPE))
    _note(picture, rule, items)
    height = float(ceil(rule + max(note_height, HEIGHT - ROW - _RULE)))
    return Strip(phases, tuple(cells), Sheet(float(WIDTH), height, tuple(items)))


def strip_phases(picture: Picture) -> tuple[tuple[float, ...], tuple[str, ...]]:
    """Phases and their words. A standing mode goes from one extreme over rest to the other, at even steps of swing;
    a travelling one never rests: half a cycle at even steps of time."""
    if all(body.standing for body in picture.bodies):
        one, other = _ways(picture)
        phases = tuple(float(np.arccos(share)) for share in (-1.0, -0.5, 0.0, 0.5, 1.0))
        return phases, (
            f"full {one}",
            "half" if " " in one else f"half {one}",
            "rest",
            "half" if " " in one else f"half {other}",
            f"full {other}",
        )
    return tuple(float(k * np.pi / 4) for k in range(5)), ("start", "⅛ cycle", "¼ cycle", "⅜ cycle", "½ cycle")


def _ways(picture: Picture) -> tuple[str, str]:
    """Words for the extremes half a cycle after phase 0, and at phase 0."""
    body = picture.bodies[0]
    motion: Array = np.real(body.shape[int(np.argmax(cycle_peaks(body.shape)))]) * body.factor
    up = np.asarray(picture.view.up, float)
    share = float(motion @ up) / max(float(np.linalg.norm(motion) * np.linalg.norm(up)), 1e-300)
    if abs(share) < _UPRIGHT:
        return "one way", "the other way"
    return ("down", "up") if share > 0 else ("up", "down")


def _note(picture: Picture, rule: float, items: list[Primitive]) -> float:
    """Add note and colour bar below ``rule``; returns the height they take."""
    tokens, note = THEMES["light"], picture.note
    width = WIDTH - 2 * _SIDE - (_BAR_ROOM if picture.energy_top is not None else 0.0)
    titled = (*note.title.split(" · "), *([note.frequency] if note.frequency else []))
    titles = wrap(titled, width, TEXT_NAME * TYPE, True)
    ghosted = picture.ghost and not is_true(picture.magnification) and picture.layout != "overlay"
    ghost = [GHOST_WORDS] if ghosted else []
    y = rule + _FIRST
    for words in titles:
        items.append(Text(_SIDE, y, words, tokens.ink, TEXT_NAME * TYPE, True))
        y += _STEP
    y += _SECOND - _FIRST - _STEP
    for pieces, colour in ((note.drawing, tokens.ink), ((*note.condition, *ghost), tokens.soft)):
        for words in wrap(pieces, width, TEXT * TYPE):
            items.append(Text(_SIDE, y, words, colour, TEXT * TYPE))
            y += _STEP
    if picture.energy_top is not None:
        items += colour_bar_items(
            picture.energy_words,
            energy_scale(picture.energy_top, "light"),
            picture.energy_caution,
            "light",
            WIDTH - 28.0,
            rule + 20.0,
            BAR_WIDTH * TYPE,
            TYPE,
            caution_room=BAR_WIDTH * TYPE,
        )
    return y - _STEP + _FOOT - rule
