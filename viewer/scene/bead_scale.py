"""What the sizes of test points mean: a row of sample beads with their figures, at the top right."""

from __future__ import annotations

from math import isnan

from viewer.scene.palette import mix
from viewer.scene.picture import Picture
from viewer.scene.primitives import Disc, Frame, Primitive, Ring, Text
from viewer.scene.tokens import BAR_TICK, BAR_TITLE, TEST_BEAD, THEMES
from viewer.scene.trace_marks import HOLLOW, RING_LINE, strength, weighted_radius
from viewer.scene.typeface import text_width

SIDE = 24.0
_TITLE, _LEVEL = 28.0, 58.0  # baseline of the words, middle of the beads
_BESIDE, _BETWEEN = 7.0, 18.0  # px between a bead and its figure, and on to the next


def bead_scale_items(picture: Picture, frame: Frame) -> list[Primitive]:
    """The scale of a picture whose beads carry figures; each bead as large and dark as those on the body."""
    if picture.bead_scale is None:
        return []
    tokens = THEMES[picture.theme]
    words, samples = picture.bead_scale
    diagonal = max(body.mesh.diagonal for body in picture.bodies)
    unit = TEST_BEAD * diagonal / frame.metres_per_pixel
    items: list[Primitive] = [
        Text(frame.width - SIDE, _TITLE, words, tokens.ink, BAR_TITLE, anchor="right"),
    ]
    x = frame.width - SIDE
    for weight, said in reversed(samples):
        radius = unit * (HOLLOW if isnan(weight) else float(weighted_radius(weight)))
        x -= text_width(said, BAR_TICK)
        items.append(Text(x, _LEVEL + 5, said, tokens.ink, BAR_TICK))
        x -= _BESIDE + radius
        if not isnan(weight):
            items.append(Disc(x, _LEVEL, radius, mix(tokens.body, tokens.test, strength(weight))))
        items.append(Ring(x, _LEVEL, radius, tokens.test, RING_LINE))
        x -= radius + _BETWEEN
    return items
