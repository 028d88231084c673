"""Which body is which when two designs are compared: name, frequency and change, in the design's colour and dash."""

from __future__ import annotations

from viewer.scene.figures import change, hertz
from viewer.scene.picture import Picture
from viewer.scene.primitives import Disc, Frame, Line, Polygon, Primitive, Text
from viewer.scene.tokens import BASE_WIDTH, CONTOUR, THEMES, TOP, TRACE, Tokens
from viewer.scene.typeface import wrap

SIZE, SMALL = 17.0, 16.0
LEFT, SAMPLE, TEXT_AT = 22.0, 32.0, 64.0
_FIRST, _LINE = 30.0, 24.0
_DASH = (13.0, 6.0)
_TEST_FIRST = 82.0  # baseline of a test's key, below the ruler


def title_key_items(picture: Picture, frame: Frame) -> list[Primitive]:
    """One key at the top left of each viewport (name, frequency below); in an overlay one line for each body."""
    tokens = THEMES[picture.theme]
    if picture.layout == "single":
        return keys_of_test(picture, LEFT, _TEST_FIRST, _LINE)
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
        items += _key(tokens, picture.roles[index], left + LEFT, top + _FIRST, lines, 1.0)
        frequency = frequency_words(picture, index)
        items.append(Text(left + TEXT_AT, top + _FIRST + _LINE * len(lines), frequency, tokens.ink, SMALL))
    left, top, right, foot = frame.boxes[1]
    rule = ((left, top), (left, foot)) if left > frame.boxes[0][0] else ((left, top), (right, top))
    return [Line(rule, tokens.rule), *items]


def key(picture: Picture, index: int, left: float, y: float, scale: float = 1.0) -> list[Primitive]:
    """The key of one body with its frequency in the same line: the sample, then the lines of text."""
    words = f"{picture.bodies[index].name}  {frequency_words(picture, index)}"
    lines = wrap((words,), BASE_WIDTH - TEXT_AT - LEFT, SIZE, True)
    return _key(THEMES[picture.theme], picture.roles[index], left, y, lines, scale)


def frequency_words(picture: Picture, index: int) -> str:
    """ "84.6 Hz"; for the second body with the change: "104.1 Hz  (+23 %)"."""
    freq_hz = picture.bodies[index].freq_hz
    shift = change(freq_hz, picture.bodies[0].freq_hz) if index else ""
    return hertz(freq_hz) + (f"  ({shift})" if shift else "")


def key_room_of_test(picture: Picture) -> float:
    """Height that the keys of a test and the body it moves on take below the ruler, sheet px."""
    return _TEST_FIRST + _LINE - TOP + 12.0 if _test_rows(picture) else 0.0


def keys_of_test(picture: Picture, left: float, y: float, step: float, scale: float = 1.0) -> list[Primitive]:
    """Of a test that moves on a body: its key with ``y`` for a baseline, then, ``step`` below, that of the body with
    its frequency against the test's. Empty for other pictures."""
    tokens = THEMES[picture.theme]
    rows = enumerate(_test_rows(picture))
    return [item for k, (role, words) in rows for item in _key(tokens, role, left, y + step * k, [words], scale)]


def _test_rows(picture: Picture) -> list[tuple[str, str]]:
    """Role and words of the keys of the first test that moves on a body that is drawn itself."""
    for body in picture.bodies if picture.layout == "single" else ():
        for test in body.traces if body.form == "solid" else ():
            if test.freq_hz is not None:
                shift = change(body.freq_hz, test.freq_hz) if body.freq_hz != test.freq_hz else ""
                own = f"{body.name}  {hertz(body.freq_hz)}" + (f"  ({shift})" if shift else "")
                return [("test", f"{test.name}  {hertz(test.freq_hz)}"), ("ink", own)]
    return []


def _key(tokens: Tokens, role: str, left: float, y: float, lines: list[str], scale: float) -> list[Primitive]:
    """Sample and words in the colour ``role`` of ``tokens``: dashed for a first design, a line with beads for a
    test, a patch of the body where the words are in ink."""
    colour = getattr(tokens, role)
    level, end = y - 5.5 * scale, left + SAMPLE * scale
    dash = tuple(part * scale for part in _DASH) if role == "baseline" else ()
    sample: list[Primitive] = [Line(((left, level), (end, level)), colour, 4.0 * scale, dash)]
    if role == "test":
        sample = [Line(((left, level), (end, level)), colour, TRACE * scale)]
        sample += [Disc(x, level, 5.0 * scale, colour) for x in (left + 5 * scale, end - 5 * scale)]
    elif role == "ink":
        half = 7.0 * scale
        box = ((left, level - half), (end, level - half), (end, level + half), (left, level + half))
        sample = [Polygon(box, tokens.body), Line((*box, box[0]), tokens.body_edge, CONTOUR * scale)]
    at = left + (TEXT_AT - LEFT) * scale
    return [
        *sample,
        *(Text(at, y + _LINE * scale * k, words, colour, SIZE * scale, True) for k, words in enumerate(lines)),
    ]
