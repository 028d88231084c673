"""The search for what is wrong in a test: hypotheses, each weighed by what all modes say about it.

The channels that agree with one another and with the analysis modes say what every other channel ought to read
(``mixed_fit.py``). A channel that reads something else is suspected. For each suspected point every simple cause is
tried: a sign, two axes, two points, a place somewhere else, nothing measured; weighed by how far it brings the
readings to what is expected, in standard deviations squared, summed over modes (twice the logarithm of a likelihood
ratio). The best one is taken if it explains the readings, the fit is made anew, and so on until nothing is left.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from viewer.insight.corrections import axis_of, exchanged
from viewer.insight.mixed_fit import Mixture, bound, expected_sizes, own_modes, robust_fit, settled
from viewer.jobs import Progress
from viewer.model.arrays import Array
from viewer.model.testset import Correction, TestSet

GAIN = 40.0  # least gain of a hypothesis: 2 ln of the odds, over every cause that is tried
SEARCH = 10.0  # more is asked of a place found among thousands when it stands against a simple cause
PLACE = 150.0  # least gain of a place: a model off by a third of its thickness makes up to 100 of a right point
MARGIN = 12.0  # two causes whose gains differ by less explain equally well
PART = 0.2  # a cause that leaves more than this share of the surprise explains nothing by itself
WIDE = 0.15  # of the size of the part: places that fit equally well may not lie farther apart
TRIED = 8  # causes that are tried on all channels
MOST = 40  # corrections tried: no test is wrong in more and still a test


@dataclass(frozen=True, eq=False)
class Hypothesis:
    """A cause and what it explains. ``columns`` (n,) the channels concerned, their readings become ``readings``
    (m, n); None where the channels are left out or their predictions change (``rows`` (k, n) of a new place).
    ``gain``: surprise taken away; ``left``: surprise per channel that remains."""

    correction: Correction
    columns: Array
    gain: float
    left: float
    before: float
    readings: Array | None = None
    rows: Array | None = None
    reach: float | None = None  # m, how far places that fit equally well lie from this one
    others: tuple[Correction, ...] = ()

    @property
    def explains(self) -> bool:
        return self.gain >= GAIN and self.left <= PART * self.before

    @property
    def complete(self) -> bool:
        """Whether nothing is left to explain in its channels."""
        return self.left <= 0

    def made(self, y: Array, phi: Array, allowed: Array) -> tuple[Array, Array, Array]:
        """Readings (m, c), analysis modes (k, c) and channels in use (c,) with the cause put right."""
        y, phi, allowed = y.copy(), phi.copy(), allowed.copy()
        if self.readings is not None:
            y[:, self.columns] = self.readings
        elif self.rows is not None:
            phi[:, self.columns] = self.rows
        else:
            allowed[self.columns] = False
        return y, phi, allowed


@dataclass(frozen=True, eq=False)
class Places:
    """Places of the structure where a point may really lie: ``points`` (n, 3) m in the test's axes, ``motion``
    (k, n, 3) of the analysis modes there along the test's axes; ``size`` m of the part."""

    points: Array
    motion: Array
    size: float


@dataclass(frozen=True, eq=False)
class Found:
    """What the search ends with: the hypotheses taken, in order, and readings, analysis rows, and fit afterwards."""

    taken: tuple[Hypothesis, ...]
    y: Array
    phi: Array
    allowed: Array
    mixture: Mixture


def search(
    test: TestSet, y: Array, phi: Array, freq_hz: Array, allowed: Array, places: Places, progress: Progress
) -> Found:
    """``y`` (m, c) readings, each mode at rms 1, ``phi`` (k, c) analysis modes, ``allowed`` (c,) channels in use."""
    sizes = expected_sizes(y[:, allowed], phi[:, allowed], freq_hz, own_modes(y[:, allowed], phi[:, allowed]))
    mixture = robust_fit(y, phi, sizes, test.sensor, allowed)
    taken: list[Hypothesis] = []
    while len(taken) < MOST:
        progress.tick("looking for wrong channels")
        believed = mixture.weights > 0
        sizes = expected_sizes(y[:, believed], phi[:, believed], freq_hz, own_modes(y[:, believed], phi[:, believed]))
        mixture = robust_fit(y, phi, sizes, test.sensor, allowed, mixture)
        best = _best(test, y, phi, allowed, sizes, mixture, places, taken)
        if best is None:
            break
        y, phi, allowed = best.made(y, phi, allowed)
        taken.append(best)
        mixture = settled(y, phi, sizes, np.where(allowed, mixture.weights, 0.0), mixture.spread, allowed)
    return Found(tuple(taken), y, phi, allowed, mixture)


def suspected(mixture: Mixture, y: Array, allowed: Array) -> Array:
    """(c,) bool: channels that read something else than the others say."""
    return allowed & (mixture.surprise(y) > bound(len(y)))


def _best(
    test, y, phi, allowed, sizes, mixture: Mixture, places: Places, taken: list[Hypothesis]
) -> Hypothesis | None:
    """The cause that explains most, with those that explain it equally well. The likeliest ones are tried: each is
    made, and all channels are fitted anew."""
    suspects = suspected(mixture, y, allowed)
    done = {h.correction for h in taken}
    found: list[Hypothesis] = []
    for point in np.unique(test.sensor[suspects]):
        own = [h for h in _causes(test, y, allowed, mixture, suspects, int(point)) if h.explains]
        simple = max((h.gain for h in own if h.complete), default=0.0)
        place = _elsewhere(test, y, allowed, mixture, int(point), places)
        if (
            place is not None
            and place.explains
            and place.complete
            and place.gain >= max(PLACE, simple + SEARCH + MARGIN)
        ):
            own.append(place)
        found += [h for h in own if h.correction not in done]
    found.sort(key=lambda h: (h.complete, h.gain), reverse=True)
    tried = [(h, _cost_with(h, y, phi, allowed, sizes, mixture)) for h in found[:TRIED]]
    if not tried:
        return None
    best, _ = min(tried, key=lambda pair: pair[1])
    about = {best.correction.point, best.correction.other} - {""}
    others = {
        h.correction: None
        for h, _ in sorted(tried, key=lambda pair: pair[1])
        if abs(h.gain - best.gain) < MARGIN
        and h.complete == best.complete
        and about & {h.correction.point, h.correction.other}
        and h.correction != best.correction
    }
    return replace(best, others=tuple(others))


def _cost_with(made: Hypothesis, y, phi, allowed, sizes, mixture: Mixture) -> float:
    """What the readings cost when the cause is put right. A dead channel reads noise about nothing."""
    y, phi, still = made.made(y, phi, allowed)
    weights = np.where(still, mixture.weights, 0.0)
    weights[made.columns[still[made.columns]]] = 1.0
    fitted = settled(y, phi, sizes, weights, mixture.spread, still)
    dead = y[:, allowed & ~still]
    noise = (np.abs(dead) ** 2 / fitted.spread[:, None] ** 2 + 2 * np.log(fitted.spread[:, None])).sum()
    search = SEARCH if made.rows is not None else 0.0
    return fitted.cost(y, still) + float(noise) + search


def _causes(test, y, allowed, mixture: Mixture, suspects: Array, point: int) -> Iterator[Hypothesis]:
    """The simple causes at one point."""
    label = test.labels[point]
    rows = test.channels_of(point)
    rows = rows[allowed[rows]]
    wrong = rows[suspects[rows]]
    for c in wrong:
        yield _weighed(Correction("flip", label, axis_of(test, c)), y, mixture, np.array([c]), -y[:, [c]])
    if len(wrong) > 1:
        yield _weighed(Correction("flip", label), y, mixture, rows, -y[:, rows])
    axes = [axis_of(test, c) for c in rows]
    for i, one in enumerate(rows):
        for j in range(i + 1, len(rows)):
            pair = np.array([one, rows[j]])
            if suspects[pair].any() and axes.count(axes[i]) == axes.count(axes[j]) == 1:
                fix = Correction("swap axes", label, axes[i], axes[j])
                yield _weighed(fix, y, mixture, pair, y[:, pair[::-1]])
    for other in np.unique(test.sensor[allowed]):
        first, second = exchanged(test, point, int(other))
        if other == point or not len(first) == len(second) == len(test.channels_of(int(other))) == len(rows):
            continue
        if not allowed[second].all():
            continue
        both = np.concatenate([first, second])
        fix = Correction("move", test.labels[min(point, other)], other=test.labels[max(point, other)])
        yield _weighed(fix, y, mixture, both, y[:, np.concatenate([second, first])])
    yield from _dead(test, y, mixture, rows, wrong)


def _weighed(correction: Correction, y: Array, mixture: Mixture, columns: Array, readings: Array) -> Hypothesis:
    predicted, variance = mixture.without(y, columns)
    before = (np.abs(y[:, columns] - predicted) ** 2 / variance).sum(axis=0)
    after = (np.abs(readings - predicted) ** 2 / variance).sum(axis=0)
    modes = len(y)
    return Hypothesis(
        correction,
        columns,
        float(before.sum() - after.sum()),
        max(float(after.max()) / modes - bound(modes), 0.0),
        float(before.max()) / modes,
        readings=readings,
    )


def _dead(test, y, mixture: Mixture, rows: Array, wrong: Array) -> Iterator[Hypothesis]:
    """Channels that read nothing where there is something to read; the whole point when none of it is alive."""
    predicted, variance = mixture.without(y, rows)
    quiet = _quiet(y[:, rows], mixture)
    gain = (np.abs(y[:, rows] - predicted) ** 2 / variance - np.abs(y[:, rows]) ** 2 / variance).sum(axis=0)
    dead = quiet & np.isin(rows, wrong)
    label = test.labels[test.sensor[rows[0]]]
    if dead.sum() > 1 and quiet.all():
        yield Hypothesis(Correction("leave out", label), rows, float(gain[dead].sum()), 0.0, 1.0)
        return
    for i in np.flatnonzero(dead):
        fix = Correction("leave out", label, axis_of(test, rows[i]))
        yield Hypothesis(fix, rows[[i]], float(gain[i]), 0.0, 1.0)


def _quiet(readings: Array, mixture: Mixture) -> Array:
    """(n,) bool: readings (m, n) are no larger than noise."""
    return (np.abs(readings) ** 2 / mixture.spread[:, None] ** 2).mean(axis=0) <= bound(len(readings))


def _elsewhere(test, y, allowed, mixture: Mixture, point: int, places: Places) -> Hypothesis | None:
    """The place of the structure that the point's readings fit best; None when they fit in too many."""
    rows = test.channels_of(point)
    rows = rows[allowed[rows]]
    modes = len(y)
    if _quiet(y[:, rows], mixture).all():
        return None  # a place that does not move and a dead point read the same
    predicted, variance = mixture.without(y, rows)
    before = (np.abs(y[:, rows] - predicted) ** 2 / variance).sum(axis=0)
    after = np.zeros((len(rows), len(places.points)))
    for i, c in enumerate(rows):
        there = places.motion @ test.directions[c]  # (k, n)
        miss = np.abs(y[:, [c]] - mixture.coefficients @ there) ** 2
        after[i] = (miss / mixture.reach(there)).sum(axis=0)
    whole = after.sum(axis=0)
    best = int(whole.argmin())
    alike = whole <= whole[best] + MARGIN
    far = np.linalg.norm(places.points[alike] - places.points[best], axis=1).max()
    if far > WIDE * places.size:
        return None
    return Hypothesis(
        Correction("move", test.labels[point], position=_three(places.points[best])),
        rows,
        float(before.sum() - whole[best]),
        max(float(after[:, best].max()) / modes - bound(modes), 0.0),
        float(before.max()) / modes,
        rows=np.stack([places.motion[:, best] @ test.directions[c] for c in rows], axis=1),
        reach=float(far),
    )


def _three(point: Array) -> tuple[float, float, float]:
    return float(point[0]), float(point[1]), float(point[2])
