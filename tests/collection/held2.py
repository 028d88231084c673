"""Families of the scored half: nobody looks at single results of these while the search changes."""

from __future__ import annotations

import numpy as np

from tests.collection.parts import Part, around, family, folded, line_across, plate, rolled, root, slanted
from tests.collection.sheets import Band, Blade, Patch, Sheet


def _thin(rng: np.random.Generator, h: float, low: float = 0.28, high: float = 0.4) -> float:
    return h * rng.uniform(low, high)


def lid(rng: np.random.Generator, i: int) -> Sheet:
    """Bottom, back and lid of a box: a living hinge across the lid behind the fold."""
    a, b, w = rng.uniform(0.1, 0.16), rng.uniform(0.05, 0.09), rng.uniform(0.15, 0.25)
    length, folds, place = folded([(0, 0), (a, 0), (a, b), (0.1 * a, b)])
    h, width = w / rng.uniform(40, 60), w * rng.uniform(0.025, 0.04)
    at = a + b + max(3 * h, 2 * width)
    band = line_across((length, w), at, width, max(1.3 * h, width))
    patch = Patch(band.box, _thin(rng, h))
    held = ((0.0, a, 0.0, w),) if i % 2 else root((length, w))
    return Sheet((length, w), h, length / 24, (patch,), (band,), place=place, breaks=(folds, ()), clamp=held,
                 least=3, layers=3)  # fmt: skip


def scored_fold(rng: np.random.Generator, i: int) -> Sheet:
    """An angle bent along a score line: thin at the fold itself, with or without reliefs at its ends."""
    a, b, w = rng.uniform(0.08, 0.14), rng.uniform(0.08, 0.14), rng.uniform(0.12, 0.22)
    turn = rng.uniform(0.6, 1.2)
    length, folds, place = folded([(0, 0), (a, 0), (a + b * np.cos(turn), b * np.sin(turn))])
    h, width = w / rng.uniform(40, 60), w * rng.uniform(0.03, 0.05)
    relief = (0.0, 0.08, 0.12)[i % 3] * w
    margin = max(1.5 * h, width)
    band = line_across((length, w), a, width, margin, (relief, w - relief),
                       cut=(a - width / 2 - margin, a + width / 2 + margin, 0, w))  # fmt: skip
    notches = (Patch((*band.box[:2], 0, relief), 0), Patch((*band.box[:2], w - relief, w), 0)) if relief else ()
    patches = (Patch(band.box, _thin(rng, h)), *notches)
    return Sheet((length, w), h, length / 24, patches, (band,), place=place, breaks=(folds, ()),
                 clamp=root((length, w)), least=3, layers=2)  # fmt: skip


def thin_rim(rng: np.random.Generator, i: int) -> Sheet:
    """A thick panel held on two sides through its thin edges."""
    s, t, h = plate(rng)
    widths = t * rng.uniform(0.06, 0.08, 2)
    first = line_across((s, t), widths[0] / 2, widths[0], max(1.5 * h, widths[0]), root=True)
    last = line_across((s, t), s - widths[1] / 2, widths[1], max(1.5 * h, widths[1]))
    bands = (first, last)
    patches = tuple(Patch(band.box, _thin(rng, h, 0.28, 0.4)) for band in bands)
    return Sheet((s, t), h, s / 20, patches, bands, clamp=((0, 0, 0, t), (s, s, 0, t)), least=3)


def flexure(rng: np.random.Generator, i: int) -> Sheet:
    """A thick plate with a round notch from both faces."""
    s, t, _ = plate(rng, (1.4, 1.9))
    at, half, h = s * rng.uniform(0.35, 0.6), t * rng.uniform(0.036, 0.046), t / rng.uniform(12, 16)
    deep = h * rng.uniform(0.34, 0.4)
    radius = (half**2 + deep**2) / (2 * deep)
    band = line_across((s, t), at, 2 * half, 1.5 * h)

    def scale(s_, _):
        away = np.minimum(np.abs(s_ - at), half)
        return 1 - 2 * (deep - radius + np.sqrt(radius**2 - away**2)) / h

    return Sheet((s, t), h, s / 18, (), (band,), scale=scale, clamp=() if i % 2 else root((s, t)), least=6, layers=2)


def finger_bank(rng: np.random.Generator, i: int) -> Sheet:
    """Cantilevers of unlike length side by side, each thinned along its root."""
    s, t, h = plate(rng, (1.0, 1.3))
    count, base, slit = 3, s * 0.35, t * 0.02
    wide = (t - (count - 1) * slit) / count
    bands, patches = [], []
    for j, share in enumerate(rng.permutation([0.6, 0.8, 1.0])):
        low, end = j * (wide + slit), base + (s - base) * share
        width = wide * rng.uniform(0.06, 0.09)
        box = (base, base + width, low, low + wide)
        reach = max(1.2 * h, width)
        bands.append(Band(box, (base - reach, base + width + reach, low, low + wide)))
        patches.append(Patch(box, _thin(rng, h)))
        if share < 1:
            patches.append(Patch((end, s, low, low + wide), 0))
        if j:
            patches.append(Patch((base, s, low - slit, low), 0))
    return Sheet((s, t), h, s / 20, tuple(patches), tuple(bands), clamp=root((s, t)))


def louvre(rng: np.random.Generator, i: int) -> Sheet:
    """A tongue cut free on three sides and bent out of its plate, thinned beside the bend."""
    s, t, h = plate(rng)
    start, low, slit = s * rng.uniform(0.25, 0.35), t * rng.uniform(0.2, 0.3), t * 0.025
    long, wide = s * rng.uniform(0.25, 0.4), t * rng.uniform(0.4, 0.5)
    end, high, turn = start + long, low + wide, rng.uniform(0.35, 0.6)
    width = wide * rng.uniform(0.05, 0.08)
    reach = max(1.2 * h, width)
    box = (start, start + width, low, high)
    band = Band(box, (start - reach, start + width + reach, low, high))

    def place(s_, t_, n):
        s_, t_, n = np.broadcast_arrays(s_, t_, n)
        tongue = (t_ > low - slit / 2) & (t_ < high + slit / 2) & (s_ < end + slit / 2) & (s_ >= start)
        beyond = np.where(tongue, s_ - start, 0.0)
        lean = np.where(tongue, np.where(beyond > 0, np.sin(turn), np.tan(turn / 2)), 0.0)
        up = np.where(tongue & (beyond > 0), np.cos(turn), 1.0)
        x = np.where(tongue, start + beyond * np.cos(turn), s_) - n * lean
        return np.stack([x, t_, beyond * np.sin(turn) + n * up], axis=-1)

    patches = (
        Patch((start, end + slit, low - slit, low), 0),
        Patch((start, end + slit, high, high + slit), 0),
        Patch((end, end + slit, low, high), 0),
        Patch(box, _thin(rng, h)),
    )
    held = around((s, t)) if i % 2 else root((s, t))
    return Sheet((s, t), h, s / 20, patches, (band,), place=place, clamp=held, layers=2)


def ring_of_shell(rng: np.random.Generator, i: int) -> Sheet:
    """Part of a cylinder thinned along a ring."""
    s, t, h = plate(rng, (1.0, 1.4))
    at, width = t * rng.uniform(0.35, 0.55), s * rng.uniform(0.03, 0.045)
    band = Band((0.0, s, at - width / 2, at + width / 2), None, along="s", kind="curve")
    patch, place = Patch(band.box, _thin(rng, h, 0.16, 0.22)), rolled(s / rng.uniform(0.2, 0.45))
    return Sheet((s, t), h, s / 22, (patch,), (band,), place=place, clamp=((0, s, 0, 0),) if i % 2 == 0 else ())


def _cone(size: tuple[float, float], first: float, last: float):
    """How to place a sheet as part of a cone: s along its generators, t around from radius ``first`` to ``last``."""
    lean = (last - first) / size[0]
    rise = np.sqrt(1 - lean**2)

    def place(s, t, n):
        turn, radius = (t - size[1] / 2) / first, first + lean * s
        out = radius + rise * n
        return np.stack([rise * s - lean * n, out * np.sin(turn), out * np.cos(turn) - first], axis=-1)

    return place


def cone_groove(rng: np.random.Generator, i: int) -> Sheet:
    """Part of a cone thinned along a generator, held beside it."""
    s, t, h = plate(rng, (0.9, 1.2))
    at, width = t * rng.uniform(0.35, 0.5), s * rng.uniform(0.035, 0.055)
    margin = max(1.5 * h, width)
    box = (0.0, s, at - width / 2, at + width / 2)
    band = Band(box, (0.0, s, box[2] - margin, box[3] + margin), along="s")
    first = t / rng.uniform(0.8, 1.4)
    place = _cone((s, t), first, first * rng.uniform(0.65, 0.8))
    held = ((0, s, 0, 0),) if i % 2 == 0 else ()
    return Sheet((s, t), h, s / 20, (Patch(box, _thin(rng, h)),), (band,), place=place, clamp=held, least=3)


def even_cone(rng: np.random.Generator, i: int) -> Sheet:
    """Part of a cone of even thickness."""
    s, t, h = plate(rng, (0.9, 1.2))
    first = t / rng.uniform(0.8, 1.4)
    place = _cone((s, t), first, first * rng.uniform(0.65, 0.8))
    return Sheet((s, t), h, s / 20, place=place, clamp=((0, s, 0, 0),) if i % 2 else ((0, 0, 0, t),))


def rib_break(rng: np.random.Generator, i: int) -> Sheet:
    """A panel of even thickness whose stiffeners (blades on shells, thick strips else) leave a gap between them."""
    s, t, h = plate(rng)
    at, width = s * rng.uniform(0.4, 0.6), t * rng.uniform(0.05, 0.07)
    band = line_across((s, t), at, width, 0.0, cut=(at - 2.5 * width, at + 2.5 * width, 0, t))
    spans = ((0.0, at - width / 2), (at + width / 2, s))
    if i % 3 == 2:
        places = (0.1, 0.3, 0.5, 0.7, 0.9)
        pads = tuple(Patch((*span, t * (p - 0.07), t * (p + 0.07)), 3.2 * h) for span in spans for p in places)
        return Sheet((s, t), h, s / 18, pads, (band,), clamp=root((s, t)), layers=2)
    places = (0.04, 0.27, 0.5, 0.73, 0.96)
    blades = tuple(Blade(t * p, span, h * rng.uniform(6, 8), 1.5 * h) for span in spans for p in places)
    return Sheet((s, t), h, s / 20, (), (band,), blades, clamp=() if i % 2 else root((s, t)), least=3)


def half_cut(rng: np.random.Generator, i: int) -> Sheet:
    """A thick plate sawn into from one face, the cut no wider than the plate is thick."""
    s, t, _ = plate(rng, (1.4, 1.9))
    h = t / rng.uniform(16, 24)
    at, width = s * rng.uniform(0.3, 0.6), h * rng.uniform(0.55, 1.0)
    band = line_across((s, t), at, width, 2 * h)
    patch = Patch(band.box, _thin(rng, h, 0.25, 0.35))
    return Sheet((s, t), h, s / 13, (patch,), (band,), clamp=() if i % 2 else root((s, t)), least=3, layers=2)


def stitched_taper(rng: np.random.Generator, i: int) -> Sheet:
    """A blade that narrows towards its tip, with a row of slots across."""
    s, t, h = plate(rng)
    at, gap, count = s * rng.uniform(0.15, 0.3), t * rng.uniform(0.035, 0.05), 4 + i % 3
    narrow, ligament, pitch = rng.uniform(0.25, 0.45), rng.uniform(0.13, 0.18), t / count
    half = pitch * ligament / 2
    band = line_across((s, t), at, gap, 0.8 * pitch)
    slots = tuple(Patch((*band.box[:2], j * pitch + half, (j + 1) * pitch - half), 0.0) for j in range(count))

    def place(s_, t_, n):
        return np.stack([s_, (t_ - t / 2) * (1 - narrow * s_ / s), n], axis=-1)

    return Sheet((s, t), h, s / 20, slots, (band,), place=place, clamp=root((s, t)), least=6 if i == 2 else 4)


def swept_fin(rng: np.random.Generator, i: int) -> Sheet:
    """A swept fin that narrows to its tip, thinned along a line askew to its root; the last one of even thickness."""
    s, t, h = plate(rng, (1.0, 1.4))
    at, width = s * rng.uniform(0.25, 0.45), t * rng.uniform(0.03, 0.05)
    narrow, sweep, askew = rng.uniform(0.4, 0.7), rng.uniform(0.2, 0.5), slanted((s, t), at, rng.uniform(0.15, 0.3))

    def place(s_, t_, n):
        out = askew(s_, t_, n)
        out[..., 1] = (t_ - t / 2) * (1 - narrow * s_ / s) + sweep * s_
        return out

    if i == 3:
        return Sheet((s, t), h, s / 20, place=place, clamp=root((s, t)))
    band = line_across((s, t), at, width, max(1.5 * h, width))
    patch = Patch(band.box, _thin(rng, h))
    cell, layers = (s / 17, 3) if i == 1 else (s / 20, 1)
    held = root((s, t))
    return Sheet((s, t), h, cell, (patch,), (band,), place=place, clamp=held, least=3, layers=layers)


def _saddle(size: tuple[float, float], rise: float):
    def place(s, t, n):
        x, y = s - size[0] / 2, t - size[1] / 2
        c = 4 * rise / (size[0] * size[1])
        slope = np.sqrt(1 + (c * x) ** 2 + (c * y) ** 2)
        return np.stack([x - n * c * y / slope, y - n * c * x / slope, c * x * y + n / slope], axis=-1)

    return place


def saddle_groove(rng: np.random.Generator, i: int) -> Sheet:
    """A warped sheet (a hyperbolic paraboloid) thinned along one of its straight lines."""
    s, t, h = plate(rng)
    at, width = s * rng.uniform(0.35, 0.6), t * rng.uniform(0.03, 0.05)
    band = line_across((s, t), at, width, max(1.5 * h, width))
    place = _saddle((s, t), t * rng.uniform(0.04, 0.08))
    patch = Patch(band.box, _thin(rng, h))
    held = () if i % 2 else root((s, t))
    return Sheet((s, t), h, s / 20, (patch,), (band,), place=place, clamp=held, least=3)


def even_saddle(rng: np.random.Generator, i: int) -> Sheet:
    """A warped sheet of even thickness."""
    s, t, h = plate(rng)
    place = _saddle((s, t), t * rng.uniform(0.04, 0.12))
    return Sheet((s, t), h, s / 20, place=place, clamp=() if i % 2 else root((s, t)))


def two_tongues(rng: np.random.Generator, i: int) -> Sheet:
    """A large and a small tongue in one plate, each thinned along its root."""
    s, t, h = plate(rng)
    bands, patches = [], []
    for start, long, low, wide in (
        (0.12 * s, 0.32 * s, 0.25 * t, rng.uniform(0.4, 0.5) * t),
        (0.62 * s, rng.uniform(0.12, 0.18) * s, 0.4 * t, rng.uniform(0.16, 0.22) * t),
    ):
        end, high, slit, width = start + long, low + wide, 0.05 * wide, wide * rng.uniform(0.06, 0.09)
        box = (start, start + width, low, high)
        reach = max(h, width)
        bands.append(Band(box, (start - reach, start + width + reach, low, high)))
        patches += [
            Patch((start, end + slit, low - slit, low), 0),
            Patch((start, end + slit, high, high + slit), 0),
            Patch((end, end + slit, low, high), 0),
            Patch(box, _thin(rng, h, 0.3, 0.4)),
        ]
    return Sheet((s, t), h, s / 18, tuple(patches), tuple(bands), clamp=around((s, t)), least=2)


def edge_slit(rng: np.random.Generator, i: int) -> Sheet:
    """A slot sawn from one side leaves a bridge as long as wide at the other."""
    s, t, h = plate(rng)
    at, bridge = s * rng.uniform(0.4, 0.6), t * rng.uniform(0.06, 0.1)
    band = line_across(
        (s, t), at, bridge, 0, (t - bridge, t), kind="joint", cut=(at - 2 * bridge, at + 2 * bridge, 0, t)
    )
    slot = Patch((*band.box[:2], 0, t - bridge), 0)
    return Sheet((s, t), h, s / 20, (slot,), (band,), clamp=root((s, t)))


def doubler(rng: np.random.Generator, i: int) -> Sheet:
    """A plate with a thick pad on its middle."""
    s, t, h = plate(rng)
    box = (s * rng.uniform(0.25, 0.35), s * rng.uniform(0.6, 0.75), t * 0.2, t * 0.8)
    pad = Patch(box, h * rng.uniform(1.5, 2.0))
    return Sheet((s, t), h, s / 20, (pad,), clamp=((), root((s, t)), around((s, t)))[i % 3])


def pocket(rng: np.random.Generator, i: int) -> Sheet:
    """A plate with a large pocket milled into it."""
    s, t, h = plate(rng)
    box = (s * rng.uniform(0.2, 0.3), s * rng.uniform(0.65, 0.8), t * 0.2, t * 0.8)
    return Sheet((s, t), h, s / 20, (Patch(box, h * rng.uniform(0.5, 0.7)),), clamp=() if i % 2 else root((s, t)))


def corrugated(rng: np.random.Generator, i: int) -> Sheet:
    """A sheet folded to and fro, all folds alike."""
    pitch, tall, w = rng.uniform(0.03, 0.045), rng.uniform(0.012, 0.02), rng.uniform(0.12, 0.2)
    corners, x = [(0.0, 0.0)], 0.0
    for j in range(8):
        x += pitch
        corners.append((x, tall * ((j + 1) % 2)))
    length, folds, place = folded(corners)
    held = ((0, length, 0, 0),) if i % 2 else root((length, w))
    return Sheet((length, w), w / rng.uniform(70, 100), length / 32, place=place, breaks=(folds, ()), clamp=held)


def waffle(rng: np.random.Generator, i: int) -> Sheet:
    """A plate with thick strips both ways, evenly spread."""
    s, t, h = plate(rng, (1.3, 1.6))
    thick, half = h * rng.uniform(1.8, 2.4), 0.05
    across = [Patch((s * (p - half), s * (p + half), 0, t), thick) for p in (0.05, 0.275, 0.5, 0.725, 0.95)]
    along = [Patch((0, s, t * (p - half), t * (p + half)), thick) for p in (0.05, 0.35, 0.65, 0.95)]
    return Sheet((s, t), h, s / 18, (*across, *along), clamp=() if i % 2 else root((s, t)))


def comb(rng: np.random.Generator, i: int) -> Sheet:
    """Fingers of even thickness and unlike length on a common back."""
    s, t, h = plate(rng, (1.0, 1.3))
    count, back, slit = 4, s * rng.uniform(0.22, 0.32), t * 0.03
    wide = (t - (count - 1) * slit) / count
    patches = []
    for j, share in enumerate(rng.uniform(0.7, 1.0, count)):
        low = j * (wide + slit)
        patches.append(Patch((back + (s - back) * share, s, low, low + wide), 0))
        if j:
            patches.append(Patch((back, s, low - slit, low), 0))
    return Sheet((s, t), h, s / 20, tuple(patches), clamp=root((s, t)))


def bracket(rng: np.random.Generator, i: int) -> Sheet:
    """An angle of even thickness with square bend reliefs at the ends of its fold."""
    a, b, w = rng.uniform(0.1, 0.16), rng.uniform(0.08, 0.12), rng.uniform(0.12, 0.2)
    length, folds, place = folded([(0, 0), (a, 0), (a, b)])
    h = w / rng.uniform(35, 55)
    relief = w * rng.uniform(0.06, 0.1)
    box = (a - relief / 2, a + relief / 2)
    notches = (Patch((*box, 0, relief), 0), Patch((*box, w - relief, w), 0))
    return Sheet((length, w), h, length / 22, notches, place=place, breaks=(folds, ()), clamp=root((length, w)))


def wedge(rng: np.random.Generator, i: int) -> Sheet:
    """Thick at both ends, smoothly thinner towards the middle, without any narrow place."""
    s, t, h = plate(rng)
    waist = rng.uniform(0.3, 0.5)
    return Sheet((s, t), h, s / 24, scale=lambda at, _: 1 - waist * np.sin(np.pi * at / s) ** 2,
                 clamp=() if i % 2 else root((s, t)))  # fmt: skip


def parts() -> list[Part]:
    """All of them."""
    return [
        *family(lid, ("quad4", "hex20", "quad8")),
        *family(scored_fold, ("quad4", "tri3", "hex20", "quad8")),
        *family(thin_rim, ("quad8", "hex20", "tri3")),
        *family(flexure, ("hex20", "quad4", "hex20", "tet10")),
        *family(finger_bank, ("quad4", "tri3", "hex20")),
        *family(louvre, ("quad4", "quad8", "hex20")),
        *family(ring_of_shell, ("quad4", "quad8", "hex20")),
        *family(cone_groove, ("tri3", "quad4", "hex20")),
        *family(even_cone, ("quad4", "hex20")),
        *family(rib_break, ("quad4", "tri3", "hex20", "quad8")),
        *family(half_cut, ("hex20", "tet10", "hex20")),
        *family(stitched_taper, ("quad4", "quad8", "tri3")),
        *family(swept_fin, ("quad4", "hex20", "tri3", "quad8")),
        *family(saddle_groove, ("quad8", "quad4", "hex20")),
        *family(even_saddle, ("quad4", "tet10")),
        *family(two_tongues, ("quad4", "tri3"), modes=10),
        *family(edge_slit, ("quad4", "hex20")),
        *family(doubler, ("quad4", "hex8", "tri3")),
        *family(pocket, ("hex20", "quad4", "hex8")),
        *family(corrugated, ("quad4", "hex20")),
        *family(waffle, ("hex20", "quad4")),
        *family(comb, ("quad4", "hex20")),
        *family(bracket, ("quad4", "hex20", "tri3")),
        *family(wedge, ("quad8", "tet10")),
    ]
