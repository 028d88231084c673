"""Which body is which when two designs are compared: name, frequency and change, in the design's colour and dash."""

from __future__ import annotations

from viewer.scene.figures import change, hertz
from viewer.scene.picture import Picture
from viewer.scene.primitives import Frame, Line, Primitive, Text
from viewer.scene.tokens import THEMES, Tokens
from viewer.scene.typeface import wrap

SIZE, SMALL = 17.0, 16.0
LEFT, SAMPLE, TEXT_AT = 22.0, 32.0, 64.0
_FIRST, _LINE = 30.0, 24.0
_DASH = (13.0, 6.0)


def title_key_items(picture: Picture, frame: Frame) -> list[Primitive]:
    """One key at the top left of each viewport (name, frequency below); in an overlay one line for each body."""
    if picture.layout == "single":
        return []
    first, second = picture.bodies
    tokens = THEMES[picture.theme]
    shift = change(second.freq_hz, first.freq_hz)
    said = [hertz(first.freq_hz), hertz(second.freq_hz) + (f"  ({shift})" if shift else "")]
    items: list[Primitive] = []
    if picture.layout == "overlay":
        y = frame.boxes[0][1] + _FIRST
        for index, body in enumerate(picture.bodies):
            words = f"{body.name}  {said[index]}"
            lines = wrap((words,), frame.width - TEXT_AT - LEFT, SIZE, True)
            items += _key(tokens, index, LEFT, y, lines)
            y += _LINE * len(lines) + 1
        return items
    for index, body in enumerate(picture.bodies):
        left, top, right, _ = frame.boxes[index]
        lines = wrap((body.name,), right - left - TEXT_AT - LEFT, SIZE, True)
        items += _key(tokens, index, left + LEFT, top + _FIRST, lines)
        items.append(Text(left + TEXT_AT, top + _FIRST + _LINE * len(lines), said[index], tokens.ink, SMALL))
    left, top, right, foot = frame.boxes[1]
    rule = ((left, top), (left, foot)) if left > frame.boxes[0][0] else ((left, top), (right, top))
    return [Line(rule, tokens.rule), *items]


def _key(tokens: Tokens, index: int, left: float, y: float, lines: list[str]) -> list[Primitive]:
    colour = (tokens.baseline, tokens.modified)[index]
    sample = ((left, y - 4.5), (left + SAMPLE, y - 4.5))
    return [
        Line(sample, colour, 4.0, _DASH if index == 0 else ()),
        *(Text(left + TEXT_AT - LEFT, y + _LINE * k, words, colour, SIZE, True) for k, words in enumerate(lines)),
    ]
