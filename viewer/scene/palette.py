"""Colour of energy and of gain: ramps linear in OKLab, the square-root scale and its top.

OKLab: B. Ottosson, "A perceptual color space for image processing", 2020 (matrices as published there);
sRGB transfer function: IEC 61966-2-1.
"""

from __future__ import annotations

from collections.abc import Sequence
from math import ceil, log10

import numpy as np

from viewer.model.arrays import Array
from viewer.scene.tokens import THEMES, rgb

_LMS = np.array(
    [
        [0.4122214708, 0.5363325363, 0.0514459929],
        [0.2119034982, 0.6806995451, 0.1073969566],
        [0.0883024619, 0.2817188376, 0.6299787005],
    ]
)
_LAB = np.array(
    [
        [0.2104542553, 0.7936177850, -0.0040720468],
        [1.9779984951, -2.4285922050, 0.4505937099],
        [0.0259040371, 0.7827717662, -0.8086757660],
    ]
)
ENTRIES = 256
PERCENTILE = 99.5


def to_oklab(colours: Array) -> Array:
    """(n, 3) sRGB components in 0…1 → OKLab (L, a, b)."""
    c = np.asarray(colours, float)
    linear = np.where(c <= 0.04045, c / 12.92, ((c + 0.055) / 1.055) ** 2.4)
    return np.cbrt(linear @ _LMS.T) @ _LAB.T


def from_oklab(lab: Array) -> Array:
    """(n, 3) OKLab → sRGB components, clipped to 0…1."""
    linear = (np.asarray(lab, float) @ np.linalg.inv(_LAB).T) ** 3 @ np.linalg.inv(_LMS).T
    linear = np.clip(linear, 0.0, 1.0)
    return np.where(linear <= 0.0031308, 12.92 * linear, 1.055 * linear ** (1 / 2.4) - 0.055)


def ramp(stops: Sequence[str], entries: int = ENTRIES) -> Array:
    """(entries, 3) uint8: evenly spaced ``#RRGGBB`` stops joined by straight lines in OKLab."""
    lab = to_oklab(np.array([rgb(stop) for stop in stops]))
    at = np.linspace(0.0, len(stops) - 1.0, entries)
    mixed = np.stack([np.interp(at, np.arange(len(stops)), lab[:, k]) for k in range(3)], axis=1)
    return np.round(from_oklab(mixed) * 255).astype(np.uint8)


def energy_ramp(theme: str) -> Array:
    """(256, 3) uint8 from zero energy (body base) to the top of the scale."""
    return ramp(THEMES[theme].energy)


def gain_ramp(theme: str) -> Array:
    """(256, 3) uint8 from "lighten" over zero (body base) to "stiffen"."""
    return ramp(THEMES[theme].gain)


def energy_top(densities: Sequence[Array], areas: Sequence[Array]) -> float:
    """Top of the colour scale for all compared designs: a perfect square, at least 1.

    densities  per design (n,) strain-energy density ÷ mean
    areas      per design (n,) drawn area of the same cells, m²; cells that are not drawn have zero

    The area-weighted 99.5th percentile over everything drawn, rounded up; a peak of a few small cells
    (a re-entrant corner) therefore does not wash out the rest.
    """
    return float(max(np.ceil(np.sqrt(max(_high(densities, areas), 0.0)) - 1e-9), 1.0) ** 2)


def gain_top(gain: Array, areas: Array) -> float:
    """End of the gain scale on both sides: 4, 9 or 16 times a power of ten, from the same percentile of the size of
    ``gain`` (n,); 0.0 when there is none."""
    high = _high([np.abs(gain)], [areas])
    if not high > 0:
        return 0.0
    decade = 10.0 ** (ceil(log10(high) - 1e-9) - 1)
    return float(max(np.ceil(np.sqrt(high / decade) - 1e-9), 2.0) ** 2 * decade)


def _high(values: Sequence[Array], areas: Sequence[Array]) -> float:
    """The value that ``PERCENTILE`` % of the drawn area do not exceed."""
    value = np.concatenate([np.asarray(v, float).ravel() for v in values])
    weight = np.concatenate([np.asarray(a, float).ravel() for a in areas])
    good = np.isfinite(value) & (weight > 0)
    if not good.any():
        return 0.0
    order = np.argsort(value[good])
    value, weight = value[good][order], np.cumsum(weight[good][order])
    return float(value[min(np.searchsorted(weight, PERCENTILE / 100 * weight[-1]), len(value) - 1)])


def energy_share(density: Array, top: float) -> Array:
    """Place of a density on the bar, 0…1 up to ``top`` and beyond: √(density ÷ top); unknown counts as zero."""
    return np.sqrt(np.clip(np.nan_to_num(density), 0.0, None) / top)


def gain_share(gain: Array, top: float) -> Array:
    """Place of a signed gain on its bar: 0 at −top, ½ at zero, 1 at +top, by signed root."""
    gain = np.nan_to_num(gain)
    return 0.5 + 0.5 * np.sign(gain) * np.sqrt(np.abs(gain) / top)


def pick(colours: Array, share: Array) -> Array:
    """(n, 3) uint8 of a ramp at ``share`` (n,) in 0…1."""
    return colours[np.clip(np.round(np.asarray(share) * (len(colours) - 1)), 0, len(colours) - 1).astype(np.intp)]


def mix(base: str, tint: str, amount: float) -> str:
    """``base`` with ``amount`` (0…1) of ``tint`` laid over it, as a pane of that opacity would: ``#RRGGBB``."""
    r, g, b = (round(255 * ((1 - amount) * x + amount * y)) for x, y in zip(rgb(base), rgb(tint), strict=True))
    return f"#{r:02X}{g:02X}{b:02X}"
