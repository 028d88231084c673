"""Two studies side by side: which mode became which, and what changed in each."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from viewer.errors import InputError
from viewer.insight.outcome import Outcome, outcome
from viewer.insight.pairing import ModePair, Pairing, alone, pair
from viewer.jobs import SILENT, Progress
from viewer.workspace.explanation import asked
from viewer.workspace.study import Study
from viewer.workspace.workspace import OpenDossier

STATED, BY_SHAPE = "paired by the dossier", "paired by shape"


@dataclass(frozen=True, eq=False)
class Comparison:
    """``pairing`` by shape; ``outcomes`` in the same order, but for pairs that the dossier states; ``stated`` numbers
    of modes of the first design whose partner was stated."""

    first: Study
    second: Study
    pairing: Pairing
    outcomes: tuple[Outcome, ...]
    stated: frozenset[int] = frozenset()

    @property
    def sentence(self) -> str:
        return self.pairing.sentence

    def paired_by(self, item: Outcome) -> str:
        return STATED if item.pair.first in self.stated else BY_SHAPE

    def to_dict(self) -> dict[str, Any]:
        return {
            **self.pairing.to_dict(),
            "sentence": self.sentence,
            "support_sentence": self.pairing.support.sentence,
            "outcomes": [
                {**o.to_dict(), "paired_by": self.paired_by(o), "sentence": o.sentence} for o in self.outcomes
            ],
        }


def compare(
    first: Study,
    second: Study,
    stated: Sequence[tuple[int, int]] = (),
    progress: Progress = SILENT,
    *,
    explain: bool = True,
) -> Comparison:
    """Pair the modes of two studies by shape; pairs ``stated`` (numbers of first and second) stand as they are.

    explain  look also for what changed in hinges and character, which takes longer
    Raises ``RefusedError`` when the two share no common support.
    """
    support = first.support_with(second, progress)
    found = pair(first.design, first.modes, second.design, second.modes, support, progress)
    pairs = _with_stated(found, stated)
    outcomes = tuple(_outcome(first, second, p, explain, progress) for p in pairs)
    return Comparison(first, second, replace(found, pairs=pairs), outcomes, frozenset(one for one, _ in stated))


def partner(opened: OpenDossier, first: Study, mode: int, second: Study, progress: Progress = SILENT) -> int:
    """Number of the mode of ``second`` that mode ``mode`` of ``first`` became: as the dossier states, else by shape.

    ``InputError`` when none looks like it.
    """
    first.index_of(mode)
    stated = opened.stated_pairs(first.design.name, second.design.name)
    found = dict(stated).get(mode) or compare(first, second, stated, progress, explain=False).pairing.partner(mode)
    if found is None:
        raise InputError(
            f"mode {mode} of '{first.design.name}' has no counterpart among the modes of '{second.design.name}'",
            do=f"name one: {second.design.name}:NUMBER",
        )
    return found


def _with_stated(found: Pairing, stated: Sequence[tuple[int, int]]) -> tuple[ModePair, ...]:
    """The pairs with the stated ones put in; a mode that thereby loses its partner has none."""
    first = {p.first: p.first_hz or 0.0 for p in found.pairs if p.first}
    second = {p.second: p.second_hz or 0.0 for p in found.pairs if p.second}
    first_hz, second_hz = (np.array([*hz.values()]) for hz in (first, second))
    wanted = {one: two for one, two in stated if one in first and two in second}
    out = []
    for p in found.pairs:
        if p.first in wanted:
            if p.second != wanted[p.first]:
                two = wanted[p.first]
                mac = float(found.matrix[p.first - 1, two - 1])
                p = ModePair("paired", p.first, two, p.first_hz, second[two], mac)
        elif p.second in wanted.values():
            if p.first is None:
                continue
            p = alone(p.first, None, first[p.first], second_hz, found.matrix[p.first - 1])
        out.append(p)
    taken = {p.second for p in out}
    for j in sorted(second.keys() - taken):
        out.append(alone(None, j, second[j], first_hz, found.matrix[:, j - 1]))
    return tuple(out)


def _outcome(first: Study, second: Study, p: ModePair, explain: bool, progress: Progress) -> Outcome:
    ignored: list[str] = []
    one = None if p.first is None else p.first - 1
    two = None if p.second is None else p.second - 1
    looked = [(s, i) for s, i in ((first, one), (second, two)) if explain and i is not None]
    characters = {s.design.name: asked(lambda s=s, i=i: s.character(i, progress), ignored) for s, i in looked}  # type: ignore[misc]
    hinges = {s.design.name: asked(lambda s=s, i=i: s.hinges(i, progress), ignored) for s, i in looked}  # type: ignore[misc]
    names = (first.design.name, second.design.name)
    return outcome(
        names,
        p,
        ("" if one is None else first.name(one), "" if two is None else second.name(two)),
        (characters.get(names[0]), characters.get(names[1])),
        (hinges.get(names[0]), hinges.get(names[1])),
        min(first.design.mesh.diagonal, second.design.mesh.diagonal),
    )
