"""How two lineages pass one another: crossing, veering, or too fast to tell (DESIGN §6 "Lineage").

Between two neighbouring steps it is read off a model of two modes: at the first step their matrix is diag(λa, λb); at
the second it has the eigenvalues found there, turned by the rotation between the two pairs of shapes; between the
steps it changes evenly. What stands beside the diagonal is the coupling φaᵀ(K′ − λM′)φb times the step, and twice
that, where the diagonal entries meet, is the least gap:

crossing    the diagonal changes places and the coupling is nil: identities swap order
veering     the frequencies turn away from one another and the shapes mix, over several steps
unresolved  the diagonal changes places within one step with a coupling that is not nil: a veering narrower than the
            step, in which a finer step would see the shapes mix
swapped     the order changes from one design to the next, with nothing in between that could tell which
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from viewer.model.arrays import Array

NIL = 1e-5  # coupling, or difference of λ, ÷ mean λ up to which it is rounding
MIXED = np.radians(20)  # shapes of two lineages that turn into one another by more than this have mixed
WITHIN = 3.0  # steps that a veering should have within its width to be seen


@dataclass(frozen=True)
class Encounter:
    """Two lineages that come close.

    kind           "crossing", "veering", "unresolved"; "swapped" between designs without a parameter
    first, second  numbers of the lineages
    between        parameter values of the steps around it; at: where the gap is least
    gap_hz         least gap, Hz; gap_lambda: the same of λ = ω², (rad/s)²; both 0 for a crossing, NaN for swapped
    turned_deg     by how much the two shapes turn into one another over the encounter; NaN for swapped
    step           for "unresolved": the step of the parameter that would resolve it
    """

    kind: str
    first: int
    second: int
    between: tuple[float, float]
    at: float
    gap_hz: float
    gap_lambda: float
    turned_deg: float
    step: float | None = None


def encounters(
    pair: tuple[int, int],
    chains: tuple[Sequence[int], Sequence[int]],
    values: Array,
    freq_hz: Sequence[Array],
    crosses: Sequence[Array],
) -> list[Encounter]:
    """All encounters of two lineages: their numbers ``pair``, by step the index of the mode in ``chains`` (−1 where
    it is not there), and what :func:`viewer.insight.lineage.follow` is given."""
    passages: list[_Passage | None] = []
    for s in range(len(crosses)):
        i, j, k, m = (chain[t] for t in (s, s + 1) for chain in chains)
        if min(i, j, k, m) < 0:
            passages.append(None)
            continue
        one, two = ((2 * np.pi * f[[p, q]]) ** 2 for f, p, q in ((freq_hz[s], i, j), (freq_hz[s + 1], k, m)))
        passages.append(_passage((one, two), crosses[s][np.ix_([i, j], [k, m])]))
    found = [_swapped(pair, run, passages, values) for run in _changes(passages)]
    found += [v for run in _turning(passages) if (v := _veered(pair, run, passages, values)) is not None]
    return found


def swaps(
    pair: tuple[int, int], chains: tuple[Sequence[int], Sequence[int]], values: Array, freq_hz: Sequence[Array]
) -> list[Encounter]:
    """Changes of order between designs without a parameter."""
    found = []
    for s in range(len(freq_hz) - 1):
        i, j, k, m = (chain[t] for t in (s, s + 1) for chain in chains)
        if min(i, j, k, m) < 0:
            continue
        before, after = float(freq_hz[s][j] - freq_hz[s][i]), float(freq_hz[s + 1][m] - freq_hz[s + 1][k])
        if before * after < 0:
            ends = float(values[s]), float(values[s + 1])
            at = ends[0] + before / (before - after) * (ends[1] - ends[0])
            found.append(Encounter("swapped", *pair, ends, at, np.nan, np.nan, np.nan))
    return found


@dataclass(frozen=True)
class _Passage:
    """The model of two modes over one interval: d the difference of the diagonal at both ends, 0 when it is rounding;
    o the coupling at the second one; t where the gap is least (0 … 1), gap there; turn the rotation of the shapes."""

    d: tuple[float, float]
    o: float
    t: float
    gap: float
    turn: float
    mean: float


def _passage(squares: tuple[Array, Array], cross: Array) -> _Passage:
    """squares: λ of both lineages at the first and the second step; cross (2, 2)."""
    u, _, vh = np.linalg.svd(np.real(cross))
    turn = u @ vh  # nearest rotation (or reflection: signs of shapes are free)
    second = turn @ np.diag(squares[1]) @ turn.T
    mean = float(np.mean(squares))
    d0, d1 = (d if abs(d) > NIL * mean else 0.0 for d in (squares[0][1] - squares[0][0], second[1, 1] - second[0, 0]))
    o, slope = second[0, 1], d1 - d0
    t = float(np.clip(-d0 * slope / max(slope**2 + 4 * o**2, 1e-300), 0.0, 1.0))
    gap = float(np.hypot(d0 + t * slope, 2 * t * o))
    angle = float(np.arctan2(abs(turn[0, 1]), abs(turn[0, 0])))
    return _Passage((float(d0), float(d1)), float(o), t, gap, angle, mean)


def _changes(passages: Sequence[_Passage | None]) -> list[range]:
    """Runs of intervals over which the diagonal changes its order: one interval, or several when the two agree at the
    steps in between."""
    runs, start, sign = [], 0, 0.0
    for s, p in enumerate(passages):
        if p is None:
            sign = 0.0
            continue
        if p.d[0]:
            start, sign = s, np.sign(p.d[0])
        if p.d[1] and sign * p.d[1] < 0:
            runs.append(range(start, s + 1))
    return runs


def _swapped(pair: tuple[int, int], run: range, passages: Sequence[_Passage | None], values: Array) -> Encounter:
    inside = [p for s in run if (p := passages[s]) is not None]
    start, end = float(values[run.start]), float(values[run.stop])
    turned = float(np.degrees(sum(p.turn for p in inside)))
    if len(run) > 1:  # the two agree at a step: no gap that a finer step could find
        return Encounter(
            "crossing", *pair, (start, end), float(values[(run.start + 1 + run.stop) // 2]), 0, 0, turned
        )
    (p,) = inside
    at = start + p.t * (end - start)
    if abs(p.o) <= NIL * p.mean:
        return Encounter("crossing", *pair, (start, end), at, 0.0, 0.0, turned)
    # the width of a veering: where the diagonal's difference is as large as the gap itself
    width = abs(end - start) * p.gap / max(abs(p.d[1] - p.d[0]), 1e-300)
    if width >= abs(end - start):  # as wide as the step: the mixed shapes have been seen
        return Encounter("veering", *pair, (start, end), at, _hz(p), p.gap, turned)
    return Encounter("unresolved", *pair, (start, end), at, _hz(p), p.gap, turned, width / WITHIN)


def _turning(passages: Sequence[_Passage | None]) -> list[range]:
    """Runs of intervals in which two shapes turn into one another by more than ``MIXED`` in all, while their order
    on the diagonal stays."""
    runs, start = [], None
    for s, p in enumerate([*passages, None]):
        turns = p is not None and p.d[0] * p.d[1] > 0 and p.turn > np.radians(1.0)
        if turns and start is None:
            start = s
        if not turns and start is not None:
            if sum(q.turn for q in passages[start:s] if q is not None) > MIXED:
                runs.append(range(start, s))
            start = None
    return runs


def _veered(
    pair: tuple[int, int], run: range, passages: Sequence[_Passage | None], values: Array
) -> Encounter | None:
    """The veering of a run; None when the frequencies do not turn away from one another within it: shapes also change
    into one another slowly, far apart in frequency."""
    inside = [(s, p) for s in run if (p := passages[s]) is not None]
    s, p = min(inside, key=lambda item: item[1].gap)
    if (s == run.start and p.t == 0.0) or (s == run.stop - 1 and p.t == 1.0):
        return None
    at = float(values[s] + p.t * (values[s + 1] - values[s]))
    turned = float(np.degrees(sum(q.turn for _, q in inside)))
    between = (float(values[run.start]), float(values[run.stop]))
    return Encounter("veering", *pair, between, at, _hz(p), p.gap, turned)


def _hz(p: _Passage) -> float:
    """The gap of λ as one of frequencies about the mean."""
    return float(p.gap / (2 * np.sqrt(max(p.mean, 1e-300))) / (2 * np.pi))
