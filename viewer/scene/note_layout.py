"""The scale note: its sentences, and their place in the band at the foot of every picture (DESIGN §7 rule 1)."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import cos

import numpy as np

from viewer.insight.scale import Scale
from viewer.model.cycle import cycle_peaks
from viewer.scene.figures import digits, hertz, length, times
from viewer.scene.picture import Note, Picture
from viewer.scene.primitives import Disc, Frame, Line, Polygon, Primitive, Text, sheet_size
from viewer.scene.tokens import BAND_HEIGHT, BASELINES, OVERFLOW_LINE, TEXT, TEXT_NAME, THEMES, Tokens
from viewer.scene.typeface import descent, text_width, wrap

EXAGGERATED = "exaggerated: may seem to touch"
UNKNOWN = "real size needs a measured point or a service condition"

# LOOK.md's 36, 60 and 83 are the lower edges of the lines, descenders included
_FIRST, _SECOND, _THIRD = (y - descent(s) for y, s in zip(BASELINES, (TEXT_NAME, TEXT, TEXT), strict=True))
SIDE = 22  # left and right edge of the note's text
SWING = 110  # length of the swing gauge
FROM_FOOT = 26  # of the gauge above the band's lower edge
_RAGGED = 16  # least free room to the right of a line
_CLEAR = 14  # between the last line and the gauge
_AT_TRUE_SCALE = 1e-9  # a magnification this close to 1 is true scale


# ---- sentences


def scale_note(
    mode: int | tuple[int, int],
    name: str,
    freq_hz: float | None,
    scales: Scale | tuple[Scale, Scale],
    condition: str | Sequence[str] = (),
    *,
    names: tuple[str, str] = ("baseline", "modified"),
    one_colour_scale: bool = False,
    size_basis: str = "modal mass",
) -> Note:
    """The note of one mode, or of one mode compared in two designs.

    mode              number from 1; the two numbers of a compared pair when they differ
    name              of the mode; may be empty
    freq_hz           None when comparing: the title keys carry both frequencies
    scales            one finding, or two in the order of ``names``
    condition         what the picture holds for, after the conditions that the findings themselves state
    one_colour_scale  compared bodies are coloured, on one scale
    size_basis        what is made equal when compared sizes are unknown
    """
    stated = [condition] if isinstance(condition, str) else list(condition)
    if isinstance(scales, Scale):
        drawing = _single(scales)
        stated = [scales.condition, *stated]
    else:
        drawing = _compared(scales, names, one_colour_scale, size_basis)
        stated = [scales[0].condition, scales[1].condition, *stated]
    parts = [part.strip() for text in stated for part in text.split(" · ")]
    kept = tuple(dict.fromkeys(part for part in parts if part))
    frequency = "" if freq_hz is None else hertz(freq_hz)
    return Note(mode_title(mode, name), frequency, tuple(drawing), kept)


def mode_title(mode: int | tuple[int, int], name: str = "") -> str:
    """ "Mode 1 · boom nods", or "Modes 1 and 2 · …" for a pair whose numbers differ."""
    if isinstance(mode, tuple) and mode[0] == mode[1]:
        mode = mode[0]
    number = f"Modes {mode[0]} and {mode[1]}" if isinstance(mode, tuple) else f"Mode {mode}"
    return f"{number} · {name}" if name else number


def is_true(magnification: float | None) -> bool:
    """Whether motion is drawn as large as it really is."""
    return magnification is not None and abs(magnification - 1) < _AT_TRUE_SCALE


def _single(scale: Scale) -> list[str]:
    if scale.magnification is None:
        percent = digits(scale.drawn_percent, trim=True)
        drawn = f"size arbitrary, peak ({scale.largest_place}) drawn at {percent} % of the diagonal"
        return [drawn, UNKNOWN, EXAGGERATED]
    largest = f"largest real motion {_real(scale)}, {_where(scale)}"
    if is_true(scale.magnification):
        return ["true scale, ×1", largest]
    return [f"drawn {_larger(scale.magnification)}", largest, *([EXAGGERATED] if scale.magnification > 1 else [])]


def _compared(
    scales: tuple[Scale, Scale], names: tuple[str, str], one_colour_scale: bool, size_basis: str
) -> list[str]:
    first, second = (scale.magnification for scale in scales)
    if first is None and second is None:
        return [
            f"size arbitrary, both drawn at equal {size_basis}, "
            "sign and phase by the modal scale factor, same camera",
            *(["one colour scale"] if one_colour_scale else []),
            EXAGGERATED,
        ]
    together = "same phase, same camera" + (", one colour scale" if one_colour_scale else "")
    exaggerated = [EXAGGERATED] if any(m is None or m > 1 + _AT_TRUE_SCALE for m in (first, second)) else []
    if first is None or second is None:
        drawn = [
            f"{name} size arbitrary" if m is None else f"{name} {times(m)}"
            for m, name in zip((first, second), names, strict=True)
        ]
        said = [f"DIFFERENT magnifications: {', '.join(drawn)}", together]
    elif is_true(first) and is_true(second):
        said = [f"both at true scale, ×1, {together}"]
    elif abs(first - second) <= 1e-6 * first:
        said = [f"both drawn {_larger(first)}, {together}"]
    else:
        shown = next(
            (pair for n in range(2, 7) if len(set(pair := (times(first, n), times(second, n)))) == 2),
            (times(first, 7), times(second, 7)),
        )
        said = [f"DIFFERENT magnifications: {names[0]} {shown[0]}, {names[1]} {shown[1]}", together]
    return [*said, *_largest_of_two(scales, names), *exaggerated]


def _largest_of_two(scales: tuple[Scale, Scale], names: tuple[str, str]) -> list[str]:
    known = [(scale, name) for scale, name in zip(scales, names, strict=True) if scale.largest_real is not None]
    if len({_where(scale) for scale, _ in known}) == 1:
        sizes = ", ".join(f"{_real(scale)} ({name})" for scale, name in known)
        return [f"largest real motion {sizes}, {_where(known[0][0])}"]
    return [f"largest real motion of {name} {_real(scale)}, {_where(scale)}" for scale, name in known]


def _larger(magnification: float) -> str:
    if magnification < 1:
        return f"{times(1 / magnification)} smaller than real"
    return f"{times(magnification)} larger than real"


def _real(scale: Scale) -> str:
    return (
        length(scale.largest_real or 0.0)
        + statistic_words(scale)
        + (" relative to the base" if scale.relative else "")
    )


def statistic_words(scale: Scale) -> str:
    """The statistic of real figures as it stands behind one: "", " rms", " 3σ"."""
    return {"peak": "", "3 sigma": " 3σ"}.get(scale.statistic, f" {scale.statistic}")


def _where(scale: Scale) -> str:
    return ", ".join(part for part in (scale.largest_place, scale.largest_word) if part)


def below_pixel(metres: float) -> str:
    """The statement of a true-scale picture whose motion is smaller than a pixel of ``metres``."""
    return f"one pixel here is {length(metres)}: the motion cannot show"


# ---- layout


@dataclass(frozen=True)
class _Lines:
    title: list[str]
    drawing: list[str]
    condition: list[str]

    @property
    def height(self) -> float:
        count = len(self.title) + len(self.drawing) + len(self.condition)
        return BAND_HEIGHT + OVERFLOW_LINE * max(count - len(BASELINES), 0)


def note_height(picture: Picture) -> float:
    """Height of the note's band in sheet pixels. A true-scale picture reserves the room of its pixel statement,
    since the size of a pixel is known only once the camera has been fitted above the band."""
    return _lines(picture, below_pixel(440e-6) if is_true(picture.magnification) else "").height


def note_items(picture: Picture, frame: Frame) -> list[Primitive]:
    """Band, rule, texts and the gauge's line; the knob moves: :func:`knob`."""
    tokens = THEMES[picture.theme]
    height = note_height(picture)
    top = frame.height - height
    lines = _lines(picture, _pixel_statement(picture, frame))
    right = frame.width - SIDE
    band = ((0.0, top), (frame.width, top), (frame.width, frame.height), (0.0, frame.height))
    items: list[Primitive] = [
        Polygon(band, tokens.band),
        Line(((0.0, top + 0.5), (frame.width, top + 0.5)), tokens.rule),
    ]
    if picture.note.frequency:
        items.append(Text(right, top + _FIRST, picture.note.frequency, tokens.ink, TEXT_NAME, True, "right"))
    y = top + _FIRST
    for words in lines.title:
        items.append(Text(SIDE, y, words, tokens.ink, TEXT_NAME, True))
        y += OVERFLOW_LINE
    y += _SECOND - _FIRST - OVERFLOW_LINE
    for words, colour in (*((w, tokens.ink) for w in lines.drawing), *((w, tokens.soft) for w in lines.condition)):
        items.append(Text(SIDE, y, words, colour, TEXT))
        y += _THIRD - _SECOND
    return items + (gauge(right - SWING, right, frame.height - FROM_FOOT, tokens) if swings(picture) else [])


def swings(picture: Picture) -> bool:
    """Whether anything moves; a picture drawn at rest has no swing gauge."""
    return any(body.factor != 0 for body in picture.bodies)


def gauge(left: float, right: float, y: float, tokens: Tokens, scale: float = 1.0) -> list[Primitive]:
    """The swing gauge without its knob: a line with a tick at each end and at rest."""
    tick = 4.5 * scale
    width, stops = 1.4 * scale, (left, (left + right) / 2, right)
    ticks = [Line(((x, y - tick), (x, y + tick)), tokens.soft, width) for x in stops]
    return [Line(((left, y), (right, y)), tokens.soft, width), *ticks]


def knob(left: float, right: float, y: float, phase: float, tokens: Tokens, scale: float = 1.0) -> Disc:
    """The gauge's knob: at the right end at phase 0, at the left half a cycle later."""
    return Disc((left + right) / 2 + (right - left) / 2 * cos(phase), y, 6.0 * scale, tokens.ink)


def note_knob(picture: Picture, frame: Frame, phase: float) -> Disc:
    """The knob of the note's gauge at a phase."""
    right = frame.width - SIDE
    return knob(right - SWING, right, frame.height - FROM_FOOT, phase, THEMES[picture.theme])


def _pixel_statement(picture: Picture, frame: Frame) -> str:
    if not is_true(picture.magnification):
        return ""
    pixel = frame.metres_per_pixel * frame.width / picture.width
    moved = max(float(np.max(cycle_peaks(body.shape), initial=0.0)) * abs(body.factor) for body in picture.bodies)
    if picture.magnified is not None:
        moved = max(moved, picture.magnified.amplitude)
    return below_pixel(pixel) if moved < pixel else ""


def _lines(picture: Picture, statement: str) -> _Lines:
    """Statements broken into lines; the last line stays clear of the swing gauge, the title of the frequency."""
    note = picture.note
    width, _ = sheet_size(picture.width, picture.height)
    full = width - SIDE - _RAGGED
    narrow = width - 2 * SIDE - SWING - _CLEAR
    beside = text_width(note.frequency, TEXT_NAME, True) + 24 if note.frequency else 0.0
    title = wrap(tuple(note.title.split(" · ")), width - 2 * SIDE - beside, TEXT_NAME, True)
    condition = wrap((*note.condition, *([statement] if statement else [])), narrow, TEXT)
    drawing = wrap(note.drawing, full, TEXT)
    if not condition and drawing and text_width(drawing[-1], TEXT) > narrow:
        drawing = wrap(note.drawing, narrow, TEXT)
    return _Lines(title, drawing, condition)
