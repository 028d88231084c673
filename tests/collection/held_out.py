"""Families held out of the first tuning; their results have been looked at since, so they count as development."""

from __future__ import annotations

import numpy as np

from tests.collection.parts import Part, family, folded, line_across, plate, rolled, root, slanted
from tests.collection.sheets import Band, Blade, Patch, Sheet


def oblique_groove(rng: np.random.Generator, i: int) -> Sheet:
    """A thinned line askew across the plate."""
    s, t, h = plate(rng)
    at, width = s * rng.uniform(0.4, 0.6), t * rng.uniform(0.03, 0.06)
    band = line_across((s, t), at, width, max(1.5 * h, width))
    place = slanted((s, t), at, (0.25, 0.4, 0.55, 0.35)[i % 4])
    patch = Patch(band.box, h * rng.uniform(0.28, 0.42))
    return Sheet((s, t), h, s / 20, (patch,), (band,), place=place, clamp=() if i % 2 else root((s, t)))


def bowed_groove(rng: np.random.Generator, i: int) -> Sheet:
    """A thinned line that bows across a flat plate."""
    s, t, h = plate(rng)
    at, width = s * rng.uniform(0.4, 0.55), t * rng.uniform(0.04, 0.06)
    bow, straight = t * rng.uniform(0.06, 0.1), slanted((s, t), at, 0.0)
    band = line_across((s, t), at, width, 0, kind="curve", cut=None)

    def place(s_, t_, n):
        share = np.where(s_ < at, s_ / at, (s - s_) / (s - at))
        out = straight(s_, t_, n)
        out[..., 0] += bow * (1 - (2 * t_ / t - 1) ** 2) * share
        return out

    patch = Patch(band.box, h * rng.uniform(0.25, 0.35))
    return Sheet((s, t), h, s / 20, (patch,), (band,), place=place, clamp=() if i % 2 else root((s, t)))


def lengthwise_groove(rng: np.random.Generator, i: int) -> Sheet:
    """A thinned line along the long side, parallel to the clamp."""
    s, t, h = plate(rng, (1.2, 1.7))
    at, width = t * rng.uniform(0.3, 0.6), s * rng.uniform(0.025, 0.045)
    box = (0.0, s, at - width / 2, at + width / 2)
    margin = max(1.5 * h, width)
    band = Band(box, (0.0, s, box[2] - margin, box[3] + margin), along="s")
    held = ((0.0, s, 0.0, 0.0),)
    return Sheet((s, t), h, s / 20, (Patch(box, h * rng.uniform(0.28, 0.42)),), (band,), clamp=held)


def cylinder_groove(rng: np.random.Generator, i: int) -> Sheet:
    """A curved strip thinned along a straight line of its surface."""
    s, t, h = plate(rng)
    at, width = s * rng.uniform(0.35, 0.6), t * rng.uniform(0.04, 0.06)
    band = line_across((s, t), at, width, max(1.5 * h, width))
    place = rolled(s / rng.uniform(0.6, 1.6))
    patch = Patch(band.box, h * rng.uniform(0.28, 0.4))
    return Sheet((s, t), h, s / 24, (patch,), (band,), place=place, clamp=() if i % 2 else root((s, t)))


def even_cylinder(rng: np.random.Generator, i: int) -> Sheet:
    """A curved strip of even thickness."""
    s, t, h = plate(rng)
    place = rolled(s / rng.uniform(0.6, 1.6))
    return Sheet((s, t), h, s / 22, place=place, clamp=() if i % 2 else root((s, t)))


def _channel(rng: np.random.Generator):
    web, leg, long = rng.uniform(0.08, 0.14), rng.uniform(0.05, 0.09), rng.uniform(0.18, 0.3)
    return web, leg, long, folded([(0, leg), (0, 0), (web, 0), (web, leg)])


def even_channel(rng: np.random.Generator, i: int) -> Sheet:
    """A channel of even thickness."""
    web, _, long, (around, folds, place) = _channel(rng)
    held = () if i % 2 else ((0.0, around, 0.0, 0.0),)
    return Sheet((around, long), web / rng.uniform(25, 40), long / 22, place=place, breaks=(folds, ()), clamp=held)


def channel_groove(rng: np.random.Generator, i: int) -> Sheet:
    """A channel thinned along its web, or one leg along its root."""
    web, leg, long, (around, folds, place) = _channel(rng)
    h, width = web / rng.uniform(25, 40), long * rng.uniform(0.02, 0.03)
    at = leg + 0.5 * web if i % 2 == 0 else leg + web + max(3 * h, 1.5 * width)
    band = line_across((around, long), at, width, max(1.3 * h, width))
    patch = Patch(band.box, h * rng.uniform(0.28, 0.4))
    held = () if i % 2 == 0 else ((0.0, leg + web, 0.0, 0.0),)
    return Sheet((around, long), h, long / 20, (patch,), (band,), place=place, breaks=(folds, ()), clamp=held)


def even_zed(rng: np.random.Generator, i: int) -> Sheet:
    """A Z section of even thickness."""
    a, b, c, w = (*rng.uniform(0.06, 0.12, 3), rng.uniform(0.12, 0.25))
    length, folds, place = folded([(0, 0), (a, 0), (a, b), (a + c, b)])
    held = () if i % 2 else root((length, w))
    return Sheet((length, w), w / rng.uniform(35, 60), length / 26, place=place, breaks=(folds, ()), clamp=held)


def zed_groove(rng: np.random.Generator, i: int) -> Sheet:
    """A Z section thinned across its middle or its free flange."""
    a, b, c, w = (*rng.uniform(0.06, 0.12, 3), rng.uniform(0.12, 0.25))
    length, folds, place = folded([(0, 0), (a, 0), (a, b), (a + c, b)])
    h, width = w / rng.uniform(40, 60), w * rng.uniform(0.03, 0.045)
    at = a + 0.5 * b if i % 2 else a + b + 0.4 * c
    band = line_across((length, w), at, width, max(1.5 * h, width))
    patch, held = Patch(band.box, h * rng.uniform(0.28, 0.4)), root((length, w))
    return Sheet((length, w), h, length / 24, (patch,), (band,), place=place, breaks=(folds, ()), clamp=held)


def close_grooves(rng: np.random.Generator, i: int) -> Sheet:
    """Two thinned lines 5 % of the size apart."""
    s, t, h = plate(rng)
    apart = 0.05 * float(np.hypot(s, t))
    at, width = s * rng.uniform(0.35, 0.55), min(t * rng.uniform(0.02, 0.03), 0.35 * apart)
    margin = min(1.5 * h, 0.4 * (apart - width))
    bands = tuple(line_across((s, t), at + side * apart / 2, width, margin) for side in (-1, 1))
    patches = tuple(Patch(band.box, h * rng.uniform(0.28, 0.36)) for band in bands)
    return Sheet((s, t), h, s / 20, patches, bands, clamp=() if i % 2 else root((s, t)))


def _narrowing(size: tuple[float, float], share: float):
    def place(s, t, n):
        return np.stack([s, (t - size[1] / 2) * (1 - share * s / size[0]), n], axis=-1)

    return place


def even_taper(rng: np.random.Generator, i: int) -> Sheet:
    """A blade that grows thinner and narrower towards its tip."""
    s, t, h = plate(rng)
    thin, narrow = rng.uniform(0.3, 0.6), rng.uniform(0.2, 0.5)
    scale = lambda at, _: 1 - thin * at / s  # noqa: E731
    place = _narrowing((s, t), narrow)
    return Sheet((s, t), h, s / 22, place=place, scale=scale, clamp=() if i % 2 else root((s, t)))


def taper_groove(rng: np.random.Generator, i: int) -> Sheet:
    """A blade that grows thinner and narrower, thinned across."""
    s, t, h = plate(rng)
    at, width = s * rng.uniform(0.3, 0.5), t * rng.uniform(0.03, 0.05)
    thin, narrow = rng.uniform(0.2, 0.5), rng.uniform(0.1, 0.4)
    band = line_across((s, t), at, width, max(1.5 * h, width))
    patch, scale = Patch(band.box, h * rng.uniform(0.25, 0.35)), lambda at, _: 1 - thin * at / s
    place = _narrowing((s, t), narrow)
    return Sheet((s, t), h, s / 20, (patch,), (band,), place=place, scale=scale, clamp=() if i % 2 else root((s, t)))


def perforated_plate(rng: np.random.Generator, i: int) -> Sheet:
    """Square holes all over: no row is weaker than another."""
    s, t, h = plate(rng, (1.3, 1.6))
    rows, pitch = 5, t / 5
    columns, open_ = int(s / pitch), rng.uniform(0.4, 0.6)
    s = columns * pitch
    half = open_ * pitch / 2
    holes = tuple(
        Patch(
            ((a + 0.5) * pitch - half, (a + 0.5) * pitch + half, (b + 0.5) * pitch - half, (b + 0.5) * pitch + half),
            0,
        )
        for a in range(columns)
        for b in range(rows)
    )
    return Sheet((s, t), h, pitch / 4, holes, clamp=() if i % 2 else root((s, t)))


def even_ribs(rng: np.random.Generator, i: int) -> Sheet:
    """A plate with ribs along its whole length."""
    s, t, h = plate(rng)
    blades = tuple(Blade(t * place, (0.0, s), h * rng.uniform(4, 8), h) for place in (0.25, 0.5, 0.75))
    return Sheet((s, t), h, s / 22, blades=blades, clamp=() if i % 2 else root((s, t)))


def rib_gap(rng: np.random.Generator, i: int) -> Sheet:
    """Ribs (blades on shells, thick strips on solids) that stop short of a thinned line."""
    s, t, h = plate(rng)
    at, width = s * rng.uniform(0.4, 0.6), t * rng.uniform(0.035, 0.055)
    band = line_across((s, t), at, width, max(1.2 * h, 0.5 * width))
    stop = 1.5 * width
    spans, places = ((0.0, at - stop), (at + stop, s)), (0.25, 0.5, 0.75)
    patches, blades = [Patch(band.box, h * rng.uniform(0.35, 0.5))], ()
    if i % 3 == 2:
        patches += [Patch((*span, t * (p - 0.03), t * (p + 0.03)), 2.5 * h) for span in spans for p in places]
    else:
        blades = tuple(Blade(t * p, span, h * rng.uniform(3, 6), h) for span in spans for p in places)
    return Sheet((s, t), h, s / 20, tuple(patches), (band,), blades, clamp=() if i % 2 else root((s, t)))


def tiny_tab(rng: np.random.Generator, i: int) -> Sheet:
    """A thin tongue of 4 to 8 % of a thick plate's size, thinner still along its root, on a mesh that grows away."""
    s, t, _ = plate(rng)
    long = s * (0.06, 0.04, 0.08)[i % 3]
    wide, slit = long * rng.uniform(0.7, 1.0), long * 0.12
    start, low = s * rng.uniform(0.45, 0.6), t * rng.uniform(0.3, 0.6)
    width, h, thin = wide * rng.uniform(0.06, 0.09), s / rng.uniform(22, 30), long / rng.uniform(22, 30)
    box = (start, start + width, low, low + wide)
    band = Band(box, (start - 0.5 * width, start + 1.5 * width, low, low + wide))
    end = start + long
    patches = (
        Patch((start, end + slit, low - slit, low), 0),
        Patch((start, end + slit, low + wide, low + wide + slit), 0),
        Patch((end, end + slit, low, low + wide), 0),
        Patch((start, end, low, low + wide), thin),
        Patch(box, thin * rng.uniform(0.28, 0.4)),
    )
    return Sheet((s, t), h, s / 14, patches, (band,), clamp=root((s, t)))


def point_joint(rng: np.random.Generator, i: int) -> Sheet:
    """Two plates that hang together by a point: a neck of 3 % of their width, and shorter."""
    s, t, h = plate(rng)
    at, neck = s * rng.uniform(0.4, 0.6), t * rng.uniform(0.025, 0.04)
    low = (t - neck) / 2
    gap = 0.7 * neck
    box = (at - gap / 2, at + gap / 2, low, low + neck)
    band = Band(box, (at - 2 * neck, at + 2 * neck, 0.0, t), kind="joint")
    gaps = (Patch((*box[:2], 0, low), 0), Patch((*box[:2], low + neck, t), 0))
    return Sheet((s, t), h, s / 20, gaps, (band,), clamp=() if i % 2 else root((s, t)))


def slit_line(rng: np.random.Generator, i: int) -> Sheet:
    """Slits in a row leave two short necks and the ends closed: one line."""
    s, t, h = plate(rng)
    at, gap, neck = s * rng.uniform(0.35, 0.6), t * rng.uniform(0.02, 0.03), t * rng.uniform(0.05, 0.08)
    band = line_across((s, t), at, gap, 0.2 * t)
    edges = [0.0, t * 0.2, t * 0.2 + neck, t * 0.8 - neck, t * 0.8, t]
    slits = tuple(Patch((*band.box[:2], a, b), 0) for a, b in zip(edges[::2], edges[1::2], strict=True))
    return Sheet((s, t), h, s / 20, slits, (band,), clamp=() if i % 2 else root((s, t)))


def step_groove(rng: np.random.Generator, i: int) -> Sheet:
    """A thick and a thinner half with a thinned line between them."""
    s, t, h = plate(rng)
    at, width = s * rng.uniform(0.35, 0.6), t * rng.uniform(0.03, 0.05)
    thin = h * rng.uniform(0.65, 0.8)
    band = line_across((s, t), at, width, max(1.5 * h, width))
    patches = (Patch((at, s, 0, t), thin), Patch(band.box, thin * rng.uniform(0.3, 0.42)))
    return Sheet((s, t), h, s / 20, patches, (band,), clamp=() if i % 2 else root((s, t)))


def parts() -> list[Part]:
    """All of them."""
    return [
        *family(oblique_groove, ("quad4", "tri3", "hex20", "quad8")),
        *family(bowed_groove, ("quad4", "tri3", "hex20")),
        *family(lengthwise_groove, ("quad4", "hex20")),
        *family(cylinder_groove, ("quad4", "quad8", "hex20", "tri3")),
        *family(even_cylinder, ("quad4", "hex20", "tri3")),
        *family(even_channel, ("quad4", "hex20")),
        *family(channel_groove, ("quad4", "hex20", "tri3")),
        *family(even_zed, ("quad4", "hex8")),
        *family(zed_groove, ("quad8", "hex20")),
        *family(close_grooves, ("quad4", "quad8", "hex20")),
        *family(even_taper, ("quad8", "tet10", "quad4")),
        *family(taper_groove, ("quad4", "hex20")),
        *family(perforated_plate, ("quad4", "hex20")),
        *family(even_ribs, ("quad4", "tri3")),
        *family(rib_gap, ("quad4", "quad8", "hex20")),
        *family(tiny_tab, ("quad4", "tri3", "quad8"), modes=10),
        *family(point_joint, ("quad4", "hex20")),
        *family(slit_line, ("quad4", "tri3")),
        *family(step_groove, ("quad4", "hex8")),
    ]
