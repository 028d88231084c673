"""The twin ruler: one bar that says what it measures of the body, and what of the motion as drawn."""

from __future__ import annotations

from math import floor, log10

from viewer.scene.figures import length
from viewer.scene.note_layout import is_true
from viewer.scene.picture import Picture
from viewer.scene.primitives import Frame, Line, Polygon, Primitive, Text
from viewer.scene.tokens import TEXT_SMALL, THEMES

LEFT, MIDDLE = 22.0, 37.5  # of the bar, sheet pixels
THICK = 5.0
LONGEST = 130.0  # px that the bar may take
_FIELDS = 5
_LINES = (32.0, 50.0)  # baselines


def round_length(longest: float) -> float:
    """The largest of 1, 2, 5 times a power of ten that is not above ``longest`` > 0."""
    decade = 10.0 ** floor(log10(longest) + 1e-12)
    return max(step * decade for step in (1, 2, 5) if step * decade <= longest * (1 + 1e-9))


def ruler_items(picture: Picture, frame: Frame) -> list[Primitive]:
    """The ruler at the top left; its second line only when the real size is known."""
    tokens = THEMES[picture.theme]
    measured = round_length(LONGEST * frame.metres_per_pixel)
    right = LEFT + measured / frame.metres_per_pixel
    top, foot = MIDDLE - THICK / 2, MIDDLE + THICK / 2
    step = (right - LEFT) / _FIELDS
    items: list[Primitive] = [_bar(LEFT, right, top, foot, tokens.halo)]
    items += [_bar(LEFT + k * step, LEFT + (k + 1) * step, top, foot, tokens.ink) for k in range(0, _FIELDS, 2)]
    outline = ((LEFT, top), (right, top), (right, foot), (LEFT, foot), (LEFT, top))
    items.append(Line(outline, tokens.ink, 1.0))
    said = [(f"{length(measured, 1)} of body", tokens.soft)]
    if picture.magnification is not None:
        motion = length(measured, 1) if is_true(picture.magnification) else length(measured / picture.magnification)
        said.append((f"{motion} of motion", tokens.ink))
    baselines = _LINES if len(said) == 2 else (MIDDLE + 5,)
    return items + [
        Text(right + 10, y, words, colour, TEXT_SMALL) for y, (words, colour) in zip(baselines, said, strict=True)
    ]


def _bar(left: float, right: float, top: float, foot: float, colour: str) -> Polygon:
    return Polygon(((left, top), (right, top), (right, foot), (left, foot)), colour)
