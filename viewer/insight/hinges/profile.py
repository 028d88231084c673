"""How energy density runs across a band, and where the band's two edges are."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from viewer.model.arrays import Array

_BINS = 160
_POWER = 0.75
_STEP = 1.5  # of the levels, at either edge: a line that only falls from its neighbour's level is no band
_CLEARLY = 0.5  # of the squares that a level leaves: a slope that leaves no less than this share is not believed
_SLOPED = 4  # strips from which a band's own slope is looked at


@dataclass(frozen=True, eq=False)
class Profile:
    """Density in strips of equal width: centres (b,) m, density (b,) NaN where there is no material."""

    centres: Array
    density: Array
    step: float


@dataclass(frozen=True)
class Edges:
    """The step in a profile.

    low, high  m, its two edges
    filled     least density inside over the mean there
    jump       density just inside over just outside, the smaller of the two edges
    """

    low: float
    high: float
    filled: float
    jump: float


def profile(low: Array, high: Array, strain: Array, volume: Array, span: tuple[float, float]) -> Profile:
    """Every cell spreads its energy and volume evenly over its extent ``low`` to ``high`` across the band."""
    edges = np.linspace(*span, _BINS + 1)
    step = edges[1] - edges[0]
    width = np.maximum(high - low, 1e-3 * step)

    def spread(values: Array) -> Array:
        # Cumulative amount up to each edge: a ramp per cell, summed through its two kinks.
        out = np.zeros(_BINS + 1)
        rate = values / width
        for ends, sign in ((low, 1.0), (low + width, -1.0)):
            index = np.searchsorted(edges, ends)  # edges from here on lie beyond the kink
            slope = np.bincount(index, sign * rate, minlength=_BINS + 2)[: _BINS + 1].cumsum()
            const = np.bincount(index, -sign * rate * ends, minlength=_BINS + 2)[: _BINS + 1].cumsum()
            out += slope * edges + const
        return np.maximum(np.diff(out), 0)

    energy, matter = spread(strain), spread(volume)
    least = 1e-3 * matter.max(initial=0)
    density = np.divide(energy, matter, out=np.full(_BINS, np.nan), where=matter > least)
    return Profile((edges[1:] + edges[:-1]) / 2, density, float(step))


def edges_of(found: Profile) -> Edges | None:
    """The densest step in the profile, None when there is none upwards.

    Density to a power is fitted by three levels: before, in and after the band; the breaks with the least squares of
    deviations win. The root, which goes as curvature, takes the crowded surroundings of a short neck for part of it;
    density itself cuts grooves across a skew mesh too narrow: 3/4 found the true edges of most tuning parts.
    """
    there = np.isfinite(found.density)
    if there.sum() < 8:
        return None
    x, y = found.centres[there], found.density[there] ** _POWER
    density = found.density[there]
    n = len(y)
    total = np.concatenate([[0.0], np.cumsum(y)])
    start, stop = np.triu_indices(n + 1, 1)
    inside = (total[stop] - total[start]) / (stop - start)
    with np.errstate(invalid="ignore", divide="ignore"):
        before = np.where(start > 0, total[start] / start, 0.0)
        after = np.where(stop < n, (total[n] - total[stop]) / (n - stop), 0.0)
    count = stop - start
    flat = count * inside**2 + start * before**2 + (n - stop) * after**2
    place = np.arange(n) + 0.5
    moment = np.concatenate([[0.0], np.cumsum(y * place)])
    spread = count * (count**2 - 1.0) / 12
    first = moment[stop] - moment[start] - inside * count * (start + stop) / 2
    slope = np.where(count >= _SLOPED, first / np.maximum(spread, 1.0), 0.0)
    rise = slope * count / 2
    usable = count < 0.9 * n
    best, left = _best(flat, usable & (inside > before) & (inside > after), y)
    other, less = _best(
        flat + slope**2 * spread, usable & (inside - rise > _STEP * before) & (inside + rise > _STEP * after), y
    )
    if less < _CLEARLY * left:
        best = other
    if best < 0:
        return None
    a, b = int(start[best]), int(stop[best])
    inner = density[a:b]
    width, edge = max(1, (b - a) // 6), max(1, (b - a) // 4)
    smooth = np.convolve(inner, np.ones(width) / width, mode="valid")
    jumps = [
        inner[part].mean() / max(density[outer].mean(), 1e-300)
        for part, outer in ((slice(0, edge), slice(max(0, a - edge), a)), (slice(-edge, None), slice(b, b + edge)))
        if len(density[outer]) >= max(1, edge // 2)
    ]
    half = found.step / 2
    return Edges(
        float(x[a] - half),
        float(x[b - 1] + half),
        float(smooth.min() / max(inner.mean(), 1e-300)),
        float(min(jumps, default=np.inf)),
    )


def _best(gain: Array, good: Array, y: Array) -> tuple[int, float]:
    """The fit of most gain among the good ones and the squares it leaves; −1 when there is none."""
    if not good.any():
        return -1, np.inf
    best = int(np.argmax(np.where(good, gain, -np.inf)))
    return best, float(y @ y - gain[best])
