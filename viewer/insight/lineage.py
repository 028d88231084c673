"""One mode followed through a sequence of designs (DESIGN §6 "Lineage").

Between two neighbouring steps modes are paired by shape; how they pass one another stands in
:mod:`viewer.insight.encounters`. Modes of equal frequency may come out in any mixture: their shapes are turned among
themselves until they are like those of the neighbouring step.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from math import ceil, log10
from types import MappingProxyType
from typing import Any

import numpy as np
from scipy.optimize import linear_sum_assignment

from viewer.insight.encounters import NIL, Encounter, encounters, swaps
from viewer.insight.pairing import CLOSE, PAIRED, close_groups
from viewer.model.arrays import Array, frozen
from viewer.model.variation import PLAIN, Unit
from viewer.model.written import GAP, digits

Pairs = Sequence[tuple[int, int]]  # numbers of modes of a step and of the next


@dataclass(frozen=True, eq=False)
class LineageLine:
    """One mode through the steps: its number at each step, 0 where it is not there; freq_hz (steps,), NaN there."""

    number: int
    name: str
    modes: tuple[int, ...]
    freq_hz: Array

    def __post_init__(self) -> None:
        object.__setattr__(self, "freq_hz", frozen(self.freq_hz, np.float64, shape=(None,)))


@dataclass(frozen=True, eq=False)
class LineageFinding:
    """All lineages of a sequence and their encounters.

    parameter  its words; unit: what it is told in, None for designs without a parameter
    values     (steps,) of the parameter, SI; 1, 2, 3 … for designs; labels: by step
    """

    parameter: str
    values: Array
    labels: tuple[str, ...]
    lines: tuple[LineageLine, ...]
    encounters: tuple[Encounter, ...]
    unit: Unit | None = PLAIN

    def __post_init__(self) -> None:
        object.__setattr__(self, "values", frozen(self.values, np.float64, shape=(None,)))

    def called(self, line: LineageLine) -> str:
        """A lineage's name, or its number where it begins."""
        start = next((s for s, number in enumerate(line.modes) if number), 0)
        at = "" if start == 0 else f" of {self.labels[start]}"
        return line.name or f"mode {line.modes[start]}{at}"

    @property
    def sentence(self) -> str:
        return sentence_of(self.to_dict())

    def to_dict(self) -> dict[str, Any]:
        number = lambda value: float(value) if np.isfinite(value) else None  # noqa: E731
        return {
            "parameter": self.parameter,
            "unit": self.unit.name if self.unit else None,
            "si_per_unit": self.unit.si if self.unit else None,
            "steps": len(self.values),
            "values": self.values.tolist(),
            "labels": list(self.labels),
            "followed_throughout": sum(all(line.modes) for line in self.lines),
            "lineages": [
                {
                    "number": line.number,
                    "name": line.name or None,
                    "called": self.called(line),
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
                    "gap_hz": number(e.gap_hz),
                    "gap_lambda": number(e.gap_lambda),
                    "turned_deg": number(e.turned_deg),
                    "proposed_step": e.step,
                }
                for e in self.encounters
            ],
        }


def sentence_of(facts: dict[str, Any]) -> str:
    """The plain sentence made of the figures of ``LineageFinding.to_dict``."""
    names = {line["number"]: line["called"] for line in facts["lineages"]}
    steps = f"{facts['steps']} {'steps' if facts['si_per_unit'] else 'designs'}"
    words = f"{facts['followed_throughout']} of {len(names)} modes are followed through all {steps}"
    if facts["followed_throughout"] < len(names):
        words += ", the others come from or go beyond the modes compared"
    for e in facts["encounters"]:
        both = f"{names[e['first']]} and {names[e['second']]}"
        if e["kind"] == "swapped":
            one, two = (facts["labels"][facts["values"].index(value)] for value in e["between"])
            words += f"; {both} change places from {one} to {two}"
            continue
        where = f"{facts['parameter']} {_place(e['at'], facts)}"
        if e["kind"] == "crossing":
            words += f"; {both} cross at {where}"
        elif e["kind"] == "veering":
            gap = f"{digits(e['gap_hz'], 3)}{GAP}Hz"
            words += f"; {both} veer at {where}, never closer than {gap}, and trade shapes"
        else:
            step = digits(e["proposed_step"] / facts["si_per_unit"], 2)
            words += f"; how {both} pass near {where} is unresolved: try steps of {_with_unit(step, facts)}"
    return words + "."


def _place(value: float, facts: dict[str, Any]) -> str:
    """A value of the parameter in its unit, to a thousandth of the range or finer."""
    si = facts["si_per_unit"]
    span = abs(facts["values"][-1] - facts["values"][0]) / si
    text = f"{value / si:.{max(0, ceil(-log10(span / 1000)))}f}"
    text = text.rstrip("0").rstrip(".") if "." in text else text
    return _with_unit("0" if text == "-0" else text.replace("-", "−"), facts)


def _with_unit(text: str, facts: dict[str, Any]) -> str:
    return f"{text}{GAP}{facts['unit']}" if facts["unit"] else text


def follow(
    values: Sequence[float],
    freq_hz: Sequence[Array],
    crosses: Sequence[Array],
    *,
    parameter: str = "step",
    unit: Unit | None = PLAIN,
    labels: Sequence[str] = (),
    names: Sequence[Mapping[int, str]] = (),
    stated: Sequence[Pairs] = (),
) -> LineageFinding:
    """Follow modes through steps.

    values   (s,) of the parameter, SI; freq_hz by step (m,), ascending
    crosses  by interval (m of the step, m of the next) products φaᵀWφb of shapes that are normalised, so that their
             squares are MAC; real for real shapes
    unit     what the parameter is told in; None when the steps are designs without a parameter
    names    by step those of its modes by number: a lineage has the first one found along it
    stated   by interval pairs that stand as they are
    """
    hz = [np.asarray(f, float) for f in freq_hz]
    crosses = _aligned(hz, [np.asarray(c) for c in crosses])
    chains = _chains(hz, crosses, stated)
    at = np.asarray(values, float)
    found = []
    for a in range(len(chains)):
        for b in range(a + 1, len(chains)):
            both = (chains[a], chains[b])
            pair = (a + 1, b + 1)
            found += swaps(pair, both, at, hz) if unit is None else encounters(pair, both, at, hz, crosses)
    found.sort(key=lambda e: (e.at, e.first))
    given = tuple(labels) or tuple(f"{v / (unit or PLAIN).si:g}" for v in at)
    lines = tuple(_line(number, chain, hz, names) for number, chain in enumerate(chains, 1))
    return LineageFinding(parameter, at, given, lines, tuple(found), unit)


def _line(number: int, chain: list[int], freq_hz: list[Array], names: Sequence[Mapping[int, str]]) -> LineageLine:
    hz = np.array([np.nan if i < 0 else float(f[i]) for i, f in zip(chain, freq_hz, strict=True)])
    known = (step[i + 1] for i, step in zip(chain, names, strict=False) if step.get(i + 1))
    return LineageLine(number, next(known, ""), tuple(i + 1 for i in chain), hz)


def _aligned(freq_hz: list[Array], crosses: list[Array]) -> list[Array]:
    """The products with modes of equal frequency turned among themselves to what they are like at the step before,
    or after where there is none before (orthogonal Procrustes problem; Schönemann, Psychometrika 31 (1966) 1)."""
    out = [cross.copy() for cross in crosses]
    for s, hz in enumerate(freq_hz if out else ()):
        for group in {g for g in close_groups(hz, NIL / 2) if len(g) > 1}:  # of ω: half of what it is of λ
            mine = list(group)
            seen = out[s - 1][:, mine] if s else out[0][mine].conj().T
            like = np.sort(np.argsort(-np.linalg.norm(seen, axis=1), kind="stable")[: len(mine)])
            u, _, vh = np.linalg.svd(seen[like], full_matrices=False)
            turn = vh.conj().T @ u.conj().T
            if s:
                out[s - 1][:, mine] = out[s - 1][:, mine] @ turn
            if s < len(out):
                out[s][mine] = turn.conj().T @ out[s][mine]
    return out


def _chains(freq_hz: list[Array], crosses: list[Array], stated: Sequence[Pairs]) -> list[list[int]]:
    """By lineage the mode index at each step, −1 where it is not there."""
    chains = [[i] for i in range(len(freq_hz[0]))]
    for step, cross in enumerate(crosses):
        given = {i - 1: j - 1 for i, j in stated[step]} if step < len(stated) else {}
        to = successors(cross, freq_hz[step], freq_hz[step + 1], given)
        for chain in chains:
            chain.append(to.get(chain[-1], -1) if chain[-1] >= 0 else -1)
        new = sorted(set(range(len(freq_hz[step + 1]))) - set(to.values()))
        chains += [[-1] * (step + 1) + [j] for j in new]
    return chains


def successors(
    cross: Array, one_hz: Array, two_hz: Array, given: Mapping[int, int] = MappingProxyType({})
) -> dict[int, int]:
    """By mode (index) of a step that of the next, ``given`` ones as they are. cross (m, n) as for :func:`follow`.
    Modes of close company are told by what they span together."""
    rows, columns = linear_sum_assignment(-(np.abs(cross) ** 6))
    one, two = close_groups(one_hz, CLOSE), close_groups(two_hz, CLOSE)
    to = {i: j for i, j in given.items() if i < len(one_hz) and j < len(two_hz)}
    taken = set(to.values())
    for i, j in zip(rows.tolist(), columns.tolist(), strict=True):
        spanned = np.linalg.svd(cross[np.ix_(one[i], two[j])], compute_uv=False).min() ** 2
        if i not in to and j not in taken and max(abs(cross[i, j]) ** 2, spanned) >= PAIRED:
            to[i] = j
    return to
