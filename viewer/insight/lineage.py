"""One mode followed through a sequence of designs; crossings told from veerings (DESIGN §6 "Lineage").

Between two neighbouring steps modes are paired by shape. How two lineages pass one another is read off a model of
two modes: at the first step their matrix is diag(λa, λb); at the second it has the eigenvalues found there, turned by
the rotation between the two pairs of shapes; between the steps it changes evenly. What stands beside the diagonal is
the coupling φaᵀ(K′ − λM′)φb times the step, and twice that, where the diagonal entries meet, is the least gap:

crossing    the diagonal changes places and the coupling is nil: identities swap order
veering     the frequencies turn away from one another and the shapes mix, over several steps
unresolved  the diagonal changes places within one step with a coupling that is not nil: a veering narrower than the
            step, in which a finer step would see the shapes mix
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.optimize import linear_sum_assignment

from viewer.insight.pairing import PAIRED
from viewer.model.arrays import Array, frozen

NIL = 1e-5  # coupling ÷ mean λ up to which it is rounding
MIXED = np.radians(20)  # shapes of two lineages that turn into one another by more than this have mixed
WITHIN = 3.0  # steps that a veering should have within its width to be seen


@dataclass(frozen=True, eq=False)
class LineageLine:
    """One mode through the steps: its number at each step, 0 where it is not there; freq_hz (steps,), NaN there."""

    number: int
    name: str
    modes: tuple[int, ...]
    freq_hz: Array

    def __post_init__(self) -> None:
        object.__setattr__(self, "freq_hz", frozen(self.freq_hz, np.float64, shape=(None,)))


@dataclass(frozen=True)
class Encounter:
    """Two lineages that come close.

    kind           "crossing", "veering", "unresolved"
    first, second  numbers of the lineages
    between        parameter values of the steps around it; at: where the gap is least
    gap_hz         least gap, Hz; gap_lambda: the same of λ = ω², (rad/s)²; both 0 for a crossing
    turned_deg     by how much the two shapes turn into one another over the encounter
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


@dataclass(frozen=True, eq=False)
class LineageFinding:
    """All lineages of a sequence and their encounters. ``values`` (steps,) of the parameter, ``labels`` by step."""

    parameter: str
    values: Array
    labels: tuple[str, ...]
    lines: tuple[LineageLine, ...]
    encounters: tuple[Encounter, ...]

    def __post_init__(self) -> None:
        object.__setattr__(self, "values", frozen(self.values, np.float64, shape=(None,)))

    @property
    def sentence(self) -> str:
        return sentence_of(self.to_dict())

    def to_dict(self) -> dict[str, Any]:
        number = lambda value: None if np.isnan(value) else float(value)  # noqa: E731
        return {
            "parameter": self.parameter,
            "values": self.values.tolist(),
            "labels": list(self.labels),
            "followed_throughout": sum(all(line.modes) for line in self.lines),
            "lineages": [
                {
                    "number": line.number,
                    "name": line.name,
                    "modes": [m or None for m in line.modes],
                    "frequency_hz": [number(f) for f in line.freq_hz],
                }
                for line in self.lines
            ],
            "encounters": [
                {
                    "kind": e.kind,
                    "first": e.first,
                    "second": e.second,
                    "between": list(e.between),
                    "at": e.at,
                    "gap_hz": e.gap_hz,
                    "gap_lambda": e.gap_lambda,
                    "turned_deg": e.turned_deg,
                    "proposed_step": e.step,
                }
                for e in self.encounters
            ],
        }


def sentence_of(facts: dict[str, Any]) -> str:
    """The plain sentence made of the figures of ``LineageFinding.to_dict``."""
    names = {line["number"]: line["name"] or f"lineage {line['number']}" for line in facts["lineages"]}
    words = (
        f"{facts['followed_throughout']} of {len(names)} modes are followed through all {len(facts['values'])} steps"
    )
    for e in facts["encounters"]:
        both = f"{names[e['first']]} and {names[e['second']]}"
        where = f"{facts['parameter']} {e['at']:.4g}"
        if e["kind"] == "crossing":
            words += f"; {both} cross at {where}"
        elif e["kind"] == "veering":
            words += f"; {both} veer at {where}, never closer than {e['gap_hz']:.3g} Hz, and trade shapes"
        else:
            words += f"; how {both} pass near {where} is unresolved: try steps of {e['proposed_step']:.2g}"
    return words + "."


def follow(
    values: Sequence[float],
    freq_hz: Sequence[Array],
    crosses: Sequence[Array],
    *,
    parameter: str = "step",
    labels: Sequence[str] = (),
    names: Sequence[str] = (),
) -> LineageFinding:
    """Follow modes through steps.

    values   (s,) of the parameter; freq_hz by step (m,)
    crosses  by interval (m of the step, m of the next) products φaᵀWφb of shapes that are normalised, so that their
             squares are MAC; real for real shapes
    names    of the modes of the first step
    """
    chains = _chains([len(f) for f in freq_hz], [np.asarray(c) for c in crosses])
    lines = []
    for number, chain in enumerate(chains, 1):
        hz = np.array([np.nan if i < 0 else float(f[i]) for i, f in zip(chain, freq_hz, strict=True)])
        name = names[chain[0]] if 0 <= chain[0] < len(names) else ""
        lines.append(LineageLine(number, name, tuple(i + 1 for i in chain), hz))
    found = [
        encounter
        for a in range(len(chains))
        for b in range(a + 1, len(chains))
        for encounter in _encounters(a, b, chains, np.asarray(values, float), freq_hz, crosses)
    ]
    found.sort(key=lambda e: (e.at, e.first))
    given = tuple(labels) or tuple(f"{v:g}" for v in values)
    return LineageFinding(parameter, np.asarray(values, float), given, tuple(lines), tuple(found))


def _chains(counts: list[int], crosses: list[Array]) -> list[list[int]]:
    """By lineage the mode index at each step, −1 where it is not there."""
    chains = [[i] for i in range(counts[0])]
    for step, cross in enumerate(crosses):
        mac = np.abs(cross) ** 2
        rows, columns = linear_sum_assignment(-(mac**3))
        to = {int(i): int(j) for i, j in zip(rows, columns, strict=True) if mac[i, j] >= PAIRED}
        for chain in chains:
            chain.append(to.get(chain[-1], -1) if chain[-1] >= 0 else -1)
        new = sorted(set(range(counts[step + 1])) - set(to.values()))
        chains += [[-1] * (step + 1) + [j] for j in new]
    return chains


@dataclass(frozen=True)
class _Passage:
    """The model of two modes over one interval: d the difference of the diagonal at both ends, o the coupling at the
    second one; t where the gap is least (0 … 1), gap there; turn the rotation of the shapes."""

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
    d0, d1, o = squares[0][1] - squares[0][0], second[1, 1] - second[0, 0], second[0, 1]
    slope = d1 - d0
    t = float(np.clip(-d0 * slope / max(slope**2 + 4 * o**2, 1e-300), 0.0, 1.0))
    gap = float(np.hypot(d0 + t * slope, 2 * t * o))
    angle = float(np.arctan2(abs(turn[0, 1]), abs(turn[0, 0])))
    return _Passage((float(d0), float(d1)), float(o), t, gap, angle, float(np.mean(squares)))


def _encounters(
    a: int, b: int, chains: list[list[int]], values: Array, freq_hz: Sequence[Array], crosses: Sequence[Array]
) -> list[Encounter]:
    passages: list[_Passage | None] = []
    for s in range(len(crosses)):
        i, j, k, m = chains[a][s], chains[b][s], chains[a][s + 1], chains[b][s + 1]
        if min(i, j, k, m) < 0:
            passages.append(None)
            continue
        squares = tuple(
            (2 * np.pi * np.asarray(f)[[p, q]]) ** 2 for f, p, q in ((freq_hz[s], i, j), (freq_hz[s + 1], k, m))
        )
        passages.append(_passage((squares[0], squares[1]), np.asarray(crosses[s])[np.ix_([i, j], [k, m])]))
    found = []
    for s, p in enumerate(passages):
        if p is not None and p.d[0] * p.d[1] < 0:
            found.append(_swapped(a, b, p, values[s], values[s + 1]))
    found += [v for run in _turning(passages) if (v := _veered(a, b, run, passages, values)) is not None]
    return found


def _swapped(a: int, b: int, p: _Passage, start: float, end: float) -> Encounter:
    at = float(start + p.t * (end - start))
    between, turned = (float(start), float(end)), float(np.degrees(p.turn))
    if abs(p.o) <= NIL * p.mean:
        return Encounter("crossing", a + 1, b + 1, between, at, 0.0, 0.0, turned)
    # the width of a veering: where the diagonal's difference is as large as the gap itself
    width = abs(end - start) * p.gap / max(abs(p.d[1] - p.d[0]), 1e-300)
    if width >= abs(end - start):  # as wide as the step: the mixed shapes have been seen
        return Encounter("veering", a + 1, b + 1, between, at, _hz(p), p.gap, turned)
    return Encounter("unresolved", a + 1, b + 1, between, at, _hz(p), p.gap, turned, width / WITHIN)


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


def _veered(a: int, b: int, run: range, passages: Sequence[_Passage | None], values: Array) -> Encounter | None:
    """The veering of a run; None when the frequencies do not turn away from one another within it: shapes also change
    into one another slowly, far apart in frequency."""
    inside = [(s, p) for s in run if (p := passages[s]) is not None]
    s, p = min(inside, key=lambda item: item[1].gap)
    if (s == run.start and p.t == 0.0) or (s == run.stop - 1 and p.t == 1.0):
        return None
    at = float(values[s] + p.t * (values[s + 1] - values[s]))
    turned = float(np.degrees(sum(q.turn for _, q in inside)))
    between = (float(values[run.start]), float(values[run.stop]))
    return Encounter("veering", a + 1, b + 1, between, at, _hz(p), p.gap, turned)


def _hz(p: _Passage) -> float:
    """The gap of λ as one of frequencies about the mean."""
    return float(p.gap / (2 * np.sqrt(max(p.mean, 1e-300))) / (2 * np.pi))
