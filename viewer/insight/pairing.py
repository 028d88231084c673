"""Which mode of one design became which mode of another (DESIGN §6 "Correlate").

Modes are assigned so that the sum of their MAC, weighted by mass over the common support, is largest. A pair below
``PAIRED`` is no pair: the mode has vanished, or is new. Two modes whose frequencies nearly coincide may come out in
any mixture; such groups are compared as subspaces, and the pair says so.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.optimize import linear_sum_assignment

from viewer.insight.common_support import CommonSupport, common_support
from viewer.insight.correlate import mac
from viewer.jobs import SILENT, Progress
from viewer.model.arrays import Array, frozen
from viewer.model.design import Design
from viewer.model.modes import ModeSet

KINDS = ("paired", "vanished", "new", "merged", "beyond")
PAIRED = 0.5  # MAC: less than half of the shape in common is another mode
CLOSE = 0.02  # relative difference of frequencies up to which modes of one design count as a group
EDGE = 0.9  # of the other design's highest frequency compared: a partner of a mode from there on may lie beyond it
_WITHIN = 0.3  # weight of the single shapes' agreement where groups agree equally well
MERGED = 0.25  # least MAC with the mode that took a mode up, when that mode lies in the span of both


@dataclass(frozen=True)
class ModePair:
    """What became of one mode. Numbers from 1; None where there is no partner.

    kind      "paired", "vanished", "new", "merged" (taken up by a mode that has another partner), "beyond" (without
              partner, but so near the upper end of the modes compared that it may lie beyond them)
    mac       of the two shapes, weighted by mass; of the best candidate where there is no partner, 0 without any
    subspace  least cos² of the angles between the groups of close modes that both belong to; None when neither has
              close company
    group     numbers of the modes of the first and of the second design in that comparison
    into      for "merged": number of the second design's mode that took this one up
    """

    kind: str
    first: int | None
    second: int | None
    first_hz: float | None
    second_hz: float | None
    mac: float
    subspace: float | None = None
    group: tuple[tuple[int, ...], tuple[int, ...]] = ((), ())
    into: int | None = None

    @property
    def agreement(self) -> float:
        """MAC, or the comparison of subspaces where the modes have close company."""
        return self.mac if self.subspace is None else self.subspace

    def to_dict(self) -> dict[str, Any]:
        change = None
        if self.first_hz and self.second_hz:  # a rigid motion has no frequency to change
            change = 100 * (self.second_hz / self.first_hz - 1)
        return {
            "kind": self.kind,
            "first_mode": self.first,
            "second_mode": self.second,
            "first_hz": self.first_hz,
            "second_hz": self.second_hz,
            "change_percent": change,
            "mac": self.mac,
            "subspace_agreement": self.subspace,
            "close_modes_first": list(self.group[0]),
            "close_modes_second": list(self.group[1]),
            "merged_into": self.into,
        }


@dataclass(frozen=True, eq=False)
class Pairing:
    """Two mode sets compared: ``matrix`` (modes of first, modes of second) MAC, and what became of each mode, first
    the modes of the first design in order, then what is new."""

    first: str
    second: str
    support: CommonSupport
    matrix: Array
    pairs: tuple[ModePair, ...]

    def __post_init__(self) -> None:
        object.__setattr__(self, "matrix", frozen(self.matrix, np.float64, shape=(None, None)))

    def partner(self, first: int) -> int | None:
        """Number of the mode of the second design that mode ``first`` became."""
        return next((p.second for p in self.pairs if p.first == first), None)

    @property
    def sentence(self) -> str:
        return sentence_of(self.to_dict())

    def to_dict(self) -> dict[str, Any]:
        count = {kind: sum(p.kind == kind for p in self.pairs) for kind in KINDS}
        return {
            "first_design": self.first,
            "second_design": self.second,
            "counts": count,
            "pairs": [p.to_dict() for p in self.pairs],
            "mac_matrix": self.matrix.tolist(),
            "support": self.support.to_dict(),
        }


def sentence_of(facts: dict[str, Any]) -> str:
    """The plain sentence made of the figures of ``Pairing.to_dict``."""
    one, two = facts["first_design"], facts["second_design"]

    def modes(kind: str, which: str) -> list[int]:
        return [p[f"{which}_mode"] for p in facts["pairs"] if p["kind"] == kind and p[f"{which}_mode"]]

    words = f"From {one} to {two}, {facts['counts']['paired']} modes are found again"
    for kind, said in (("vanished", "have no counterpart"), ("merged", "are taken up by others")):
        if lost := modes(kind, "first"):
            words += f"; of {one}, {_modes(lost)} {said if len(lost) > 1 else _singular(said)}"
    if new := modes("new", "second"):
        words += f"; {_modes(new)} of {two} {'are' if len(new) > 1 else 'is'} new among those compared"
    ends = [
        f"{_modes(listed)} of {design}"
        for which, design in (("first", one), ("second", two))
        if (listed := modes("beyond", which))
    ]
    if ends:
        what = "counterparts" if facts["counts"]["beyond"] > 1 else "the counterpart"
        words += f"; {what} of {' and of '.join(ends)} may lie beyond the modes compared"
    return words + "."


def pair(
    first: Design,
    first_modes: ModeSet,
    second: Design,
    second_modes: ModeSet,
    support: CommonSupport | None = None,
    progress: Progress = SILENT,
) -> Pairing:
    """Pair the modes of two designs, whose meshes need not be alike. Raises what ``common_support`` raises."""
    support = common_support(first, second, progress) if support is None else support
    one, two = _vectors(first_modes, support, 0, progress), _vectors(second_modes, support, 1, progress)
    matrix, pairs = pair_vectors(one, two, first_modes.freq_hz, second_modes.freq_hz)
    return Pairing(first.name, second.name, support, matrix, tuple(_mergers(pairs, matrix, one, two)))


def pair_vectors(one: Array, two: Array, one_hz: Array, two_hz: Array) -> tuple[Array, list[ModePair]]:
    """MAC (a, b) of shapes given as rows of ``one`` (a, n) and ``two`` (b, n), and their pairs by optimal assignment:
    first the modes of ``one`` in order, then what is left of ``two``."""
    matrix, groups = mac(one, two), (close_groups(one_hz), close_groups(two_hz))
    # within a group the shapes are any mixture: what counts first is how much of a mode the other side's group holds
    held = np.maximum(_held(one, two, groups[1]), _held(two, one, groups[0]).T)
    # the cube sharpens: one excellent pair and one poor are better than two middling ones
    rows, columns = linear_sum_assignment(-(held**3) - _WITHIN * matrix**3)
    partner = {int(i): int(j) for i, j in zip(rows, columns, strict=True)}
    pairs = [_became(i, partner.get(i), matrix, groups, (one, two), (one_hz, two_hz)) for i in range(len(one))]
    taken = {p.second for p in pairs}
    pairs += [alone(None, j + 1, two_hz[j], one_hz, matrix[:, j]) for j in range(len(two)) if j + 1 not in taken]
    return matrix, pairs


def group_shares(shapes: Array, others: Array, groups: list[tuple[int, ...]]) -> Array:
    """(a, b) share of each of the ``shapes`` (a, n) in the span of the group to which each of the ``others`` (b, n)
    belongs: MAC where it is alone."""
    out = mac(shapes, others)
    size = np.maximum((np.abs(shapes) ** 2).sum(axis=1), 1e-300)
    for members in (list(m) for m in set(groups) if len(m) > 1):
        left, strength, _ = np.linalg.svd(others[members].T, full_matrices=False)
        basis = left[:, strength > 1e-9 * strength.max(initial=0.0)]
        out[:, members] = ((np.abs(shapes @ basis.conj()) ** 2).sum(axis=1) / size)[:, None]
    return out


def _held(shapes: Array, others: Array, groups: list[tuple[int, ...]]) -> Array:
    """The same, less what any shape has in a span of that size by chance; at least MAC."""
    chance = np.array([len(m) if len(m) > 1 else 0 for m in groups]) / shapes.shape[1]
    share = group_shares(shapes, others, groups)
    rest = np.where(chance < 1, 1 - chance, np.inf)
    return np.maximum(mac(shapes, others), (share - chance) / rest)


def cross_products(
    first: Design,
    first_modes: ModeSet,
    second: Design,
    second_modes: ModeSet,
    support: CommonSupport | None = None,
    progress: Progress = SILENT,
) -> Array:
    """(modes of first, modes of second) products of shapes over the common support, weighted by mass, of shapes of
    unit size: their squares are MAC, their signs tell how the shapes turn into one another."""
    support = common_support(first, second, progress) if support is None else support
    one, two = _vectors(first_modes, support, 0, progress), _vectors(second_modes, support, 1, progress)
    one, two = (v / np.maximum(np.linalg.norm(v, axis=1, keepdims=True), 1e-300) for v in (one, two))
    return np.asarray(one.conj() @ two.T)


def subspace_agreement(one: Array, two: Array) -> float:
    """Least cos² of the principal angles between the spans of the rows of ``one`` (a, n) and ``two`` (b, n): 1 when
    the smaller span lies in the larger. Björck & Golub, Math. Comp. 27 (1973) 579."""
    first, second = np.linalg.qr(one.T)[0], np.linalg.qr(two.T)[0]
    cosines = np.linalg.svd(first.conj().T @ second, compute_uv=False)
    return float(min(cosines.min(), 1.0) ** 2)


def alone(first: int | None, second: int | None, hz: float, others_hz: Array, mac_with: Array) -> ModePair:
    """A mode without partner, number ``first`` or ``second``; the frequencies of the other design's modes and the MAC
    with each."""
    best, hz = float(np.max(mac_with, initial=0.0)), float(hz)
    beyond = hz >= EDGE * np.max(others_hz, initial=0.0)
    if second is None:
        return ModePair("beyond" if beyond else "vanished", first, None, hz, None, best)
    return ModePair("beyond" if beyond else "new", None, second, None, hz, best)


def _vectors(modes: ModeSet, support: CommonSupport, which: int, progress: Progress) -> Array:
    carry = support.values_of_second if which else support.values_of_first
    out = []
    for index in range(modes.count):
        progress.tick("shapes to the common support", index, modes.count)
        out.append(carry(modes.shape(index)))
    return np.array(out)


def close_groups(freq_hz: Array, near: float = CLOSE) -> list[tuple[int, ...]]:
    """By mode the modes (indices) that lie within a relative difference of ``near`` in frequency of it or of others
    that do, itself included; in whatever order the modes are given."""
    freq_hz, order = np.asarray(freq_hz), np.argsort(freq_hz, kind="stable")
    ascending = freq_hz[order]
    out = np.zeros(len(freq_hz), int)
    out[order[1:]] = np.cumsum(np.diff(ascending) > near * np.maximum(ascending[1:], 1e-300))
    return [tuple(int(j) for j in np.nonzero(out == out[i])[0]) for i in range(len(freq_hz))]


def _became(
    i: int,
    j: int | None,
    matrix: Array,
    groups: tuple[list[tuple[int, ...]], list[tuple[int, ...]]],
    vectors: tuple[Array, Array],
    freq_hz: tuple[Array, Array],
) -> ModePair:
    one_hz = float(freq_hz[0][i])
    if j is None:
        return alone(i + 1, None, one_hz, freq_hz[1], matrix[i])
    value, subspace = float(matrix[i, j]), None
    named: tuple[tuple[int, ...], tuple[int, ...]] = ((), ())
    mine, theirs = groups[0][i], groups[1][j]
    if len(mine) > 1 or len(theirs) > 1:
        # the side with fewer modes must lie in the span of the other
        subspace = subspace_agreement(vectors[0][list(mine)], vectors[1][list(theirs)])
        named = (tuple(k + 1 for k in mine), tuple(k + 1 for k in theirs))
    if max(value, subspace or 0.0) < PAIRED:
        return alone(i + 1, None, one_hz, freq_hz[1], matrix[i])
    return ModePair("paired", i + 1, j + 1, one_hz, float(freq_hz[1][j]), value, subspace, named)


def _mergers(pairs: list[ModePair], matrix: Array, one: Array, two: Array) -> list[ModePair]:
    """Vanished modes that a paired mode of the second design took up: it has a good part of them, and lies in the
    span of its partner and them far better than in its partner alone."""
    by_second = {p.second: p for p in pairs if p.kind == "paired"}
    out = []
    for p in pairs:
        if p.kind in ("vanished", "beyond") and p.first is not None and matrix.shape[1]:
            best = int(np.argmax(matrix[p.first - 1]))
            host = by_second.get(best + 1)
            if host is not None and host.first is not None and matrix[p.first - 1, best] >= MERGED:
                both = subspace_agreement(one[[p.first - 1, host.first - 1]], two[[best]])
                if both >= max(PAIRED, host.mac + 0.5 * MERGED):
                    p = ModePair("merged", p.first, None, p.first_hz, None, p.mac, into=best + 1)
        out.append(p)
    return out


def _modes(numbers: list[int]) -> str:
    if len(numbers) == 1:
        return f"mode {numbers[0]}"
    return f"modes {', '.join(str(n) for n in numbers[:-1])} and {numbers[-1]}"


def _singular(words: str) -> str:
    return words.replace("have", "has").replace("are taken", "is taken").replace("by others", "by another")
