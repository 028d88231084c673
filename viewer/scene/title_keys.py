"""Which body is which when two designs are compared: name, frequency and change, in the design's colour and dash."""

from __future__ import annotations

from viewer.scene.figures import change, hertz
from viewer.scene.picture import Picture
from viewer.scene.primitives import Frame, Line, Primitive, Text
from viewer.scene.tokens import BASE_WIDTH, THEMES, Tokens
from viewer.scene.typeface import wrap

SIZE, SMALL = 17.0, 16.0
LEFT, SAMPLE, TEXT_AT = 22.0, 32.0, 64.0
_FIRST, _LINE = 30.0, 24.0
_DASH = (13.0, 6.0)


def title_key_items(picture: Picture, frame: Frame) -> list[Primitive]:
    """One key at the top left of each viewport (name, frequency below); in an overlay one line for each body."""
    if picture.layout == "single":
        return []
    tokens = THEMES[picture.theme]
    if picture.layout == "overlay":
        items: list[Primitive] = []
        y = frame.boxes[0][1] + _FIRST
        for index in range(len(picture.bodies)):
            found = key(picture, index, LEFT, y)
            items += found
            y += _LINE * (len(found) - 1) + 1
        return items
    items = []
    for index, body in enumerate(picture.bodies):
        left, top, right, _ = frame.boxes[index]
        lines = wrap((body.name,), right - left - TEXT_AT - LEFT, SIZE, True)
        items += _key(tokens, index, left + LEFT, top + _FIRST, lines, 1.0)
        frequency = frequency_words(picture, index)
        items.append(Text(left + TEXT_AT, top + _FIRST + _LINE * len(lines), frequency, tokens.ink, SMALL))
    left, top, right, foot = frame.boxes[1]
    rule = ((left, top), (left, foot)) if left > frame.boxes[0][0] else ((left, top), (right, top))
    return [Line(rule, tokens.rule), *items]


def key(picture: Picture, index: int, left: float, y: float, scale: float = 1.0) -> list[Primitive]:
    """The key of one body with its frequency in the same line: the sample, then the lines of text."""
    words = f"{picture.bodies[index].name}  {frequency_words(picture, index)}"
    lines = wrap((words,), BASE_WIDTH - TEXT_AT - LEFT, SIZE, True)
    return _key(THEMES[picture.theme], index, left, y, lines, scale)


def frequency_words(picture: Picture, index: int) -> str:
    """ "84.6 Hz"; for the second body with the change: "104.1 Hz  (+23 %)"."""
    freq_hz = picture.bodies[index].freq_hz
    shift = change(freq_hz, picture.bodies[0].freq_hz) if index else ""
    return hertz(freq_hz) + (f"  ({shift})" if shift else "")


def _key(tokens: Tokens, index: int, left: float, y: float, lines: list[str], scale: float) -> list[Primitive]:
    colour = (tokens.baseline, tokens.modified)[index]
    level = y - 4.5 * scale
    dash = tuple(part * scale for part in _DASH) if index == 0 else ()
    at = left + (TEXT_AT - LEFT) * scale
    return [
        Line(((left, level), (left + SAMPLE * scale, level)), colour, 4.0 * scale, dash),
        *(Text(at, y + _LINE * scale * k, words, colour, SIZE * scale, True) for k, words in enumerate(lines)),
    ]
