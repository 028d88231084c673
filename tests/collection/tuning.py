"""Families on which the search may be tuned."""

from __future__ import annotations

import numpy as np

from tests.collection.parts import Part, around, family, fan, folded, line_across, plate, root
from tests.collection.sheets import Band, Patch, Sheet

SHELLS = ("quad4", "tri3", "quad8")


def even(rng: np.random.Generator, i: int) -> Sheet:
    """A plain flat plate: free, held along one edge, held all round."""
    s, t, h = plate(rng)
    return Sheet((s, t), h, s / 22, clamp=((), root((s, t)), around((s, t)))[i % 3])


def even_angle(rng: np.random.Generator, i: int) -> Sheet:
    """An angle section of even thickness: its fold is stiff and no hinge."""
    a, b, w = rng.uniform(0.1, 0.2), rng.uniform(0.08, 0.15), rng.uniform(0.1, 0.25)
    length, folds, place = folded([(0, 0), (a, 0), (a, b)])
    held = () if i % 2 else root((length, w))
    return Sheet((length, w), w / rng.uniform(30, 60), length / 22, place=place, breaks=(folds, ()), clamp=held)


def stepped(rng: np.random.Generator, i: int) -> Sheet:
    """Thick at one end, thin at the other: the thin half bends, but over its whole length."""
    s, t, h = plate(rng)
    at = s * rng.uniform(0.4, 0.6)
    thin = Patch((at, s, 0, t), h * rng.uniform(0.45, 0.65))
    return Sheet((s, t), h, s / 22, (thin,), clamp=() if i % 2 else root((s, t)))


def groove(rng: np.random.Generator, i: int) -> Sheet:
    """A thinned line across the whole plate."""
    s, t, h = plate(rng)
    at, width, depth = s * rng.uniform(0.3, 0.7), t * rng.uniform(0.03, 0.07), rng.uniform(0.3, 0.5)
    band = line_across((s, t), at, width, max(1.5 * h, width))
    patch = Patch(band.box, h * depth)
    return Sheet((s, t), h, s / 20, (patch,), (band,), clamp=() if i % 2 else root((s, t)))


def shallow_groove(rng: np.random.Generator, i: int) -> Sheet:
    """A thinned line that is barely one."""
    s, t, h = plate(rng)
    at, width, depth = s * rng.uniform(0.3, 0.7), t * rng.uniform(0.03, 0.07), rng.uniform(0.55, 0.75)
    band = line_across((s, t), at, width, max(1.5 * h, width))
    return Sheet((s, t), h, s / 20, (Patch(band.box, h * depth),), (band,), clamp=root((s, t)))


def root_groove(rng: np.random.Generator, i: int) -> Sheet:
    """Thinned along the clamp."""
    s, t, h = plate(rng)
    width = t * rng.uniform(0.04, 0.08)
    band = line_across((s, t), width / 2, width, max(1.5 * h, width), root=True)
    return Sheet((s, t), h, s / 20, (Patch(band.box, h * rng.uniform(0.3, 0.45)),), (band,), clamp=root((s, t)))


def two_grooves(rng: np.random.Generator, i: int) -> Sheet:
    """Two thinned lines well apart."""
    s, t, h = plate(rng, (1.6, 2.6))
    places = s * rng.uniform(0.2, 0.35), s * rng.uniform(0.55, 0.75)
    bands = tuple(line_across((s, t), at, t * rng.uniform(0.03, 0.06), 1.5 * h) for at in places)
    patches = tuple(Patch(band.box, h * rng.uniform(0.3, 0.45)) for band in bands)
    return Sheet((s, t), h, s / 24, patches, bands, clamp=() if i % 2 else root((s, t)))


def slit_neck(rng: np.random.Generator, i: int) -> Sheet:
    """Two slits from the sides leave a neck."""
    s, t, h = plate(rng)
    at, gap, neck = s * rng.uniform(0.35, 0.65), t * rng.uniform(0.015, 0.02), t * (0.4, 0.15, 0.25)[i % 3]
    low, high = (t - neck) / 2, (t + neck) / 2
    reach = 0.5 * neck
    band = line_across(
        (s, t), at, gap, 0, (low, high), cut=(at - gap / 2 - reach, at + gap / 2 + reach, 0, t),
    )  # fmt: skip
    slits = (Patch((*band.box[:2], 0, low), 0), Patch((*band.box[:2], high, t), 0))
    return Sheet((s, t), h, s / 22, slits, (band,), clamp=() if i % 2 else root((s, t)))


def tab(rng: np.random.Generator, i: int) -> Sheet:
    """A tongue cut free on three sides inside a plate, thinned along its root."""
    s, t, h = plate(rng)
    share = (0.45, 0.25, 0.6, 0.35)[i % 4]
    long, wide, slit = s * share, t * share * rng.uniform(0.9, 1.1), t * 0.02
    start, low = s * 0.25, (t - wide) / 2
    width = wide * rng.uniform(0.05, 0.09)
    band = Band(
        (start, start + width, low, low + wide),
        (start - 0.1 * wide, start + width + 0.1 * wide, low, low + wide),
    )
    end = start + long
    patches = (
        Patch((start, end + slit, low - slit, low), 0),
        Patch((start, end + slit, low + wide, low + wide + slit), 0),
        Patch((end, end + slit, low, low + wide), 0),
        Patch(band.box, h * rng.uniform(0.3, 0.45)),
    )
    return Sheet((s, t), h, s / 20, patches, (band,), clamp=((0, 0, 0, t), (s, s, 0, t)))


def perforated_line(rng: np.random.Generator, i: int) -> Sheet:
    """A row of slots across the plate; ligaments of 20, 30, 40 % of the pitch."""
    s, t, h = plate(rng)
    at, gap, count = s * rng.uniform(0.35, 0.65), t * rng.uniform(0.03, 0.05), 5
    pitch, ligament = t / count, (0.2, 0.3, 0.4)[i % 3]
    band = line_across((s, t), at, gap, pitch)
    half = pitch * ligament / 2
    slots = [Patch((*band.box[:2], j * pitch + half, (j + 1) * pitch - half), 0.0) for j in range(count)]
    return Sheet((s, t), h, s / 20, tuple(slots), (band,), clamp=() if i % 2 else root((s, t)))


def fold_groove(rng: np.random.Generator, i: int) -> Sheet:
    """An angle section thinned across one leg, near its fold or half-way."""
    a, b, w = rng.uniform(0.12, 0.2), rng.uniform(0.08, 0.15), rng.uniform(0.1, 0.2)
    length, folds, place = folded([(0, 0), (a, 0), (a, b)])
    h, width = w / rng.uniform(30, 45), w * rng.uniform(0.04, 0.07)
    at = a + (0.5 * b if i % 2 else max(3 * h, width))
    band = line_across((length, w), at, width, max(1.2 * h, width) if i % 2 else width)
    patch = Patch(band.box, h * rng.uniform(0.3, 0.45))
    held = root((length, w))
    return Sheet((length, w), h, length / 22, (patch,), (band,), place=place, breaks=(folds, ()), clamp=held)


def part_groove(rng: np.random.Generator, i: int) -> Sheet:
    """A thinned line over part of the width, the rest slit open or left thick."""
    s, t, h = plate(rng)
    at, width = s * rng.uniform(0.3, 0.6), t * rng.uniform(0.03, 0.05)
    end = t * rng.uniform(0.5, 0.75)
    band = line_across((s, t), at, width, max(1.5 * h, width), (0, end))
    rest = Patch((*band.box[:2], end, t), 0.0)
    patches = (Patch(band.box, h * rng.uniform(0.3, 0.45)), rest)[: 2 - i % 2]
    return Sheet((s, t), h, s / 20, patches, (band,), clamp=root((s, t)))


def arc_groove(rng: np.random.Generator, i: int) -> Sheet:
    """A sector of a ring thinned along an arc."""
    inner, long = rng.uniform(0.15, 0.3), rng.uniform(0.12, 0.2)
    angle = rng.uniform(0.5, 0.9)
    wide = angle * (inner + long / 2)
    h, width = wide / rng.uniform(40, 60), wide * rng.uniform(0.04, 0.06)
    at = long * rng.uniform(0.4, 0.6)
    band = line_across((long, wide), at, width, 0, kind="curve", cut=None)
    patch = Patch(band.box, h * rng.uniform(0.25, 0.4))
    held = root((long, wide))
    return Sheet((long, wide), h, long / 16, (patch,), (band,), place=fan(inner, angle, wide), clamp=held)


def square_neck(rng: np.random.Generator, i: int) -> Sheet:
    """Two plates joined by a neck as long as wide."""
    s, t, h = plate(rng)
    at, neck = s * rng.uniform(0.4, 0.6), t * rng.uniform(0.08, 0.14)
    low, high = (t - neck) / 2, (t + neck) / 2
    cut = (at - 2 * neck, at + 2 * neck, 0, t)
    band = line_across((s, t), at, neck, 0, (low, high), kind="joint", cut=cut)
    gaps = (Patch((*band.box[:2], 0, low), 0), Patch((*band.box[:2], high, t), 0))
    return Sheet((s, t), h, s / 20, gaps, (band,), clamp=() if i % 2 else root((s, t)))


def parts() -> list[Part]:
    """All of them."""
    return [
        *family(even, ("quad4", "tri3", "quad8", "hex20")),
        *family(even_angle, ("quad4", "hex8", "tet10")),
        *family(stepped, ("quad4", "hex20", "tri3")),
        *family(groove, ("quad4", "hex20", "tri3", "hex8", "quad8", "tet10")),
        *family(shallow_groove, ("quad4", "hex20")),
        *family(root_groove, ("quad4", "hex20")),
        *family(two_grooves, ("quad4", "hex20", "quad8")),
        *family(slit_neck, ("quad4", "hex20", "tri3")),
        *family(tab, ("quad4", "tri3", "hex20", "quad8")),
        *family(perforated_line, ("quad4", "quad8", "tri3", "hex20")),
        *family(fold_groove, ("quad4", "hex20", "tri3")),
        *family(part_groove, ("quad4", "tri3", "hex20")),
        *family(arc_groove, ("quad4", "quad8", "hex20")),
        *family(square_neck, ("quad4", "hex20")),
    ]
