"""Families of the scored half that were never searched before the search was finished."""

from __future__ import annotations

import numpy as np

from tests.collection.parts import Part, family, folded, line_across, plate, root
from tests.collection.sheets import Band, Patch, Sheet


def _portal(rng: np.random.Generator):
    wide, tall, deep = rng.uniform(0.12, 0.2), rng.uniform(0.1, 0.16), rng.uniform(0.1, 0.18)
    length, folds, place = folded([(0, 0), (0, tall), (wide, tall), (wide, 0)])
    return wide, tall, deep, length, folds, place


def portal(rng: np.random.Generator, i: int) -> Sheet:
    """Two legs and a platform between them, each leg thinned at foot and head: it sways about four lines."""
    wide, tall, deep, length, folds, place = _portal(rng)
    h, width = deep / rng.uniform(30, 45), deep * rng.uniform(0.035, 0.05)
    off = 0.5 * width + max(2.0 * h, width)
    size = (length, deep)
    places = (off, tall - off, tall + wide + off, length - off)
    bands = tuple(line_across(size, at, width, max(1.2 * h, 0.8 * width)) for at in places)
    thin = h * rng.uniform(0.3, 0.4)
    patches = tuple(Patch(band.box, thin) for band in bands)
    held = ((0, 0, 0, deep), (length, length, 0, deep))
    return Sheet(size, h, length / 26, patches, bands, place=place, breaks=(folds, ()), clamp=held, layers=2)


def even_portal(rng: np.random.Generator, i: int) -> Sheet:
    """The same without thin lines."""
    *_, deep, length, folds, place = _portal(rng)
    held = ((0, 0, 0, deep), (length, length, 0, deep))
    return Sheet((length, deep), deep / rng.uniform(30, 45), length / 26, place=place, breaks=(folds, ()), clamp=held)


def twisted(rng: np.random.Generator, i: int) -> Sheet:
    """A blade with twist; every second one of even thickness, the others thinned across."""
    s, t, h = plate(rng, (1.8, 2.6))
    rate = rng.uniform(0.4, 1.0) / s
    at, width = s * rng.uniform(0.25, 0.45), t * rng.uniform(0.035, 0.055)

    def place(s_, t_, n):
        turn, y = rate * s_, t_ - t / 2
        lean = rate * y
        size = np.sqrt(1 + lean**2)
        sin, cos = np.sin(turn), np.cos(turn)
        return np.stack([s_ - n * lean / size, y * cos - n * sin / size, y * sin + n * cos / size], axis=-1)

    if i % 2:
        return Sheet((s, t), h, s / 24, place=place, clamp=root((s, t)))
    band = line_across((s, t), at, width, max(1.5 * h, width))
    patch = Patch(band.box, h * rng.uniform(0.28, 0.4))
    return Sheet((s, t), h, s / 24, (patch,), (band,), place=place, clamp=root((s, t)), least=3)


def wings(rng: np.random.Generator, i: int) -> Sheet:
    """A stiff body with a wing on either side, each hung on a thinned line that ends short of the edges in slots."""
    s, t, h = plate(rng, (0.9, 1.2))
    lines, width = (t * rng.uniform(0.28, 0.34), t * rng.uniform(0.66, 0.72)), s * rng.uniform(0.03, 0.045)
    short = s * (0.0, 0.1, 0.06)[i % 3]
    margin, thin = max(1.5 * h, width), h * rng.uniform(0.3, 0.38)
    bands, patches = [], [Patch((0, s, lines[0], lines[1]), 1.5 * h)]
    for at in lines:
        box = (short, s - short, at - width / 2, at + width / 2)
        bands.append(Band(box, (0.0, s, box[2] - margin, box[3] + margin), along="s"))
        patches.append(Patch(box, thin))
        if short:
            patches += [Patch((0, short, *box[2:]), 0), Patch((s - short, s, *box[2:]), 0)]
    held = ((0, 0, lines[0] + width, lines[1] - width),) if i % 2 == 0 else ()
    return Sheet((s, t), h, s / 20, tuple(patches), tuple(bands), clamp=held, least=3)


def ladder(rng: np.random.Generator, i: int) -> Sheet:
    """Two rails and rungs between them."""
    s, t, h = plate(rng, (1.8, 2.4))
    rail, count = t * rng.uniform(0.18, 0.25), 4
    pitch = s / count
    rung = pitch * rng.uniform(0.42, 0.52)
    spans = ((j * pitch + rung / 2, (j + 1) * pitch - rung / 2) for j in range(count))
    openings = tuple(Patch((*span, rail, t - rail), 0) for span in spans)
    return Sheet((s, t), h, s / 28, openings, clamp=() if i % 2 else root((s, t)))


def parts() -> list[Part]:
    """All of them."""
    return [
        *family(portal, ("quad4", "hex20", "quad8")),
        *family(even_portal, ("quad4", "hex20")),
        *family(twisted, ("quad4", "quad8", "hex20", "tri3", "tri3")),
        *family(wings, ("quad4", "tri3", "hex20")),
        *family(ladder, ("quad4", "hex20")),
    ]
