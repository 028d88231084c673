"""Families first scored when the search was first finished; looked at since, so they count as development."""

from __future__ import annotations

import numpy as np

from tests.collection.parts import Part, around, family, folded, plate
from tests.collection.sheets import Band, Patch, Sheet


def hatch(rng: np.random.Generator, i: int) -> Sheet:
    """A panel in a frame, cut free all round but for two thinned straps on one side: one hinge line, two straps."""
    s, t, h = plate(rng, (1.2, 1.5))
    share = rng.uniform(0.4, 0.6)
    long, wide = s * share, t * share
    start, low = (s - long) / 2, (t - wide) / 2
    slit, strap = wide * 0.03, wide * rng.uniform(0.2, 0.3)
    end, high = start + long, low + wide
    box = (start - slit, start, low, high)
    band = Band(box, (start - slit - 0.3 * strap, start + 0.3 * strap, low, high))
    thin = h * rng.uniform(0.35, 0.5)
    patches = (
        Patch((start - slit, end + slit, low - slit, low), 0),
        Patch((start - slit, end + slit, high, high + slit), 0),
        Patch((end, end + slit, low, high), 0),
        Patch((start - slit, start, low + strap, high - strap), 0),
        Patch((start - slit, start, low, low + strap), thin),
        Patch((start - slit, start, high - strap, high), thin),
    )
    return Sheet((s, t), h, s / 18, patches, (band,), clamp=around((s, t)) if i % 2 else ((0, 0, 0, t), (s, s, 0, t)))


def windows(rng: np.random.Generator, i: int) -> Sheet:
    """A plate with two large openings: its struts bend over their whole length."""
    s, t, h = plate(rng, (1.3, 1.8))
    edge = t * rng.uniform(0.2, 0.28)
    middle = s * rng.uniform(0.45, 0.55)
    openings = (
        Patch((edge, middle - edge / 2, edge, t - edge), 0),
        Patch((middle + edge / 2, s - edge, edge, t - edge), 0),
    )
    return Sheet((s, t), h, s / 24, openings, clamp=() if i % 2 else ((0, 0, 0, t),))


def angle_tongue(rng: np.random.Generator, i: int) -> Sheet:
    """An angle section with a tongue cut into its free leg, thinned along the tongue's root."""
    a, b, w = rng.uniform(0.08, 0.12), rng.uniform(0.1, 0.15), rng.uniform(0.12, 0.2)
    length, folds, place = folded([(0, 0), (a, 0), (a, b)])
    h = w / rng.uniform(35, 50)
    wide, slit = w * rng.uniform(0.35, 0.5), w * 0.02
    start, low = a + b * rng.uniform(0.3, 0.4), (w - wide) / 2
    width = wide * rng.uniform(0.05, 0.08)
    box = (start, start + width, low, low + wide)
    reach = max(1.2 * h, width)
    band = Band(box, (start - reach, start + width + reach, low, low + wide))
    patches = (
        Patch((start, length, low - slit, low), 0),
        Patch((start, length, low + wide, low + wide + slit), 0),
        Patch(box, h * rng.uniform(0.3, 0.4)),
    )
    return Sheet((length, w), h, length / 22, patches, (band,), place=place, breaks=(folds, ()),
                 clamp=((0.0, 0.0, 0.0, w),))  # fmt: skip


def parts() -> list[Part]:
    """All of them."""
    return [
        *family(hatch, ("quad4", "tri3", "quad8", "hex20")),
        *family(windows, ("quad4", "hex20", "tri3")),
        *family(angle_tongue, ("quad4", "tri3", "hex20")),
    ]
