"""Which channels of a test are wrong, and what would put them right: proposed with its effect, never done silently.

One correction holds for all modes. A proposal is numbered and says what the mean MAC of the paired modes becomes when
it alone is made; the finding says what all of them together do.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.sparse as sp

from viewer.errors import RefusedError
from viewer.insight.corrections import fault_words
from viewer.insight.correlate import mac
from viewer.insight.fault_search import Found, Hypothesis, Places, search, suspected
from viewer.insight.mixed_fit import KNOWN, bound, own_modes
from viewer.jobs import SILENT, Progress
from viewer.model.arrays import Array, frozen
from viewer.model.mesh import Mesh
from viewer.model.modes import ModeSet
from viewer.model.testset import Correction, Placement, TestSet

LEAST = 8  # channels, below which the others cannot tell that one is wrong


@dataclass(frozen=True, eq=False)
class Proposal:
    """One thing that seems wrong.

    number        from 1, the clearest first
    alternatives  corrections that explain the readings equally well; () when there is one cause only
    before, after (n,) MAC of the pairs as measured, and with this correction alone
    evidence      2 ln of how much likelier the readings are with the correction, over all modes
    reach         m: where a point belongs somewhere else, how far off that place may be; None otherwise
    """

    number: int
    correction: Correction
    words: str
    alternatives: tuple[Correction, ...]
    before: Array
    after: Array
    evidence: float
    reach: float | None = None

    @property
    def certain(self) -> bool:
        return not self.alternatives

    @property
    def sentence(self) -> str:
        return _proposal_words(self.to_dict())

    def to_dict(self) -> dict[str, Any]:
        return {
            "number": self.number,
            **correction_dict(self.correction),
            "words": self.words,
            "alternatives": [{**correction_dict(a), "words": fault_words(a)} for a in self.alternatives],
            "pairs": len(self.before),
            "mac_before": self.before.tolist(),
            "mac_after": self.after.tolist(),
            "mean_mac_before": _mean(self.before),
            "mean_mac_after": _mean(self.after),
            "evidence": self.evidence,
            "reach": self.reach,
        }


@dataclass(frozen=True, eq=False)
class Faults:
    """What is wrong in the test ``test``.

    pairs        (test mode, analysis mode) from 0 by which the effect is measured
    before       (n,) their MAC as measured; after: with every certain proposal made
    noise        (m,) how far right readings lie from the analysis modes, share of each mode's rms reading
    unexplained  rows of channels that read something else than the others say, for no cause that was tried
    unseen       rows of channels that move too little in every mode for a wrong sign to be seen
    unknown      numbers of test modes that are like no analysis mode: they say little
    """

    test: TestSet
    design: str
    proposals: tuple[Proposal, ...]
    pairs: tuple[tuple[int, int], ...]
    before: Array
    after: Array
    noise: Array
    unexplained: tuple[int, ...]
    unseen: tuple[int, ...]
    unknown: tuple[int, ...]
    checked: int

    def __post_init__(self) -> None:
        for name in ("before", "after", "noise"):
            object.__setattr__(self, name, frozen(getattr(self, name), float))

    @property
    def corrections(self) -> tuple[Correction, ...]:
        """Every certain proposal, in the order in which they are to be made."""
        return tuple(p.correction for p in self.proposals if p.certain)

    @property
    def sentence(self) -> str:
        return _sentence(self.to_dict())

    def to_dict(self) -> dict[str, Any]:
        words = self.test.channel_words
        return {
            "test": self.test.name,
            "design": self.design,
            "channels_checked": self.checked,
            "proposals": [p.to_dict() for p in self.proposals],
            "certain": sum(p.certain for p in self.proposals),
            "pairs": [{"test_mode": i + 1, "analysis_mode": j + 1} for i, j in self.pairs],
            "pair_count": len(self.pairs),
            "mac_before": self.before.tolist(),
            "mac_after": self.after.tolist(),
            "mean_mac_before": _mean(self.before),
            "mean_mac_after": _mean(self.after),
            "noise": self.noise.tolist(),
            "unexplained": [words(c) for c in self.unexplained],
            "unexplained_count": len(self.unexplained),
            "unseen": [words(c) for c in self.unseen],
            "unseen_count": len(self.unseen),
            "modes_like_none": list(self.unknown),
        }


def find_faults(
    test: TestSet,
    sensing: sp.csr_array,
    modes: ModeSet,
    *,
    mesh: Mesh,
    placement: Placement,
    used: Array | None = None,
    pairs: Sequence[tuple[int, int]] | None = None,
    design: str = "",
    progress: Progress = SILENT,
) -> Faults:
    """Channels of a registered test with the wrong sign, exchanged axes, exchanged or misplaced points, dead ones.

    sensing    (c, 3·nodes) nodal translations to motion along each channel; placement: the test's axes in the mesh
    modes      of the design; about twice as many as the test has, so that shapes a little off can be told from faults
    used       (c,) bool, channels on the mesh; None: all
    pairs      (test mode, analysis mode) from 0 to measure the effect by; None: nearest modes after all corrections
    Raises ``RefusedError`` when there are too few channels or no mode of the test is like any of the analysis.
    """
    allowed = np.ones(test.n_channels, bool) if used is None else np.asarray(used, bool).copy()
    allowed &= np.isfinite(test.shapes).all(axis=0)
    rms = np.sqrt((np.abs(test.shapes[:, allowed]) ** 2).mean(axis=1)) if allowed.any() else np.zeros(test.count)
    picked = np.flatnonzero(rms > 0)  # a mode without motion says nothing
    if allowed.sum() < LEAST or not len(picked):
        raise RefusedError(
            f"test '{test.name}': wrong channels show only where the others contradict them",
            found=f"{int(allowed.sum())} channels in use, {len(picked)} modes that move",
            expected=f"at least {LEAST} channels and one mode",
            do="measure at more points",
        )
    y = np.where(allowed, test.shapes[picked], 0) / rms[picked, None]
    moved = np.stack([modes.shape(i).real for i in range(modes.count)])
    phi = moved.reshape(modes.count, -1) @ sensing.T
    if (own_modes(y[:, allowed], phi[:, allowed]) < 0).all():
        raise RefusedError(
            f"test '{test.name}': no mode of the test is like any mode of the design, so no channel can be judged",
            expected=f"a MAC of {KNOWN:g} at least for one of them",
            do="check the placement and the design of the test, or compute more modes",
        )
    places = _places(mesh, moved, placement)
    found = search(test, y, phi, modes.freq_hz, allowed, places, progress)
    if pairs is None:
        own = own_modes(found.y[:, found.allowed], found.phi[:, found.allowed])
        pairs = [(int(picked[i]), int(j)) for i, j in enumerate(own) if j >= 0]
    row = {int(i): n for n, i in enumerate(picked)}
    told = tuple((int(i), int(j)) for i, j in pairs if int(i) in row)
    effect = _Effect(y, phi, allowed, np.array([row[i] for i, _ in told], int), np.array([j for _, j in told], int))
    proposals = tuple(
        Proposal(
            number=n + 1,
            correction=h.correction,
            words=fault_words(h.correction, test),
            alternatives=h.others,
            before=effect.of(()),
            after=effect.of((h,)),
            evidence=h.gain,
            reach=h.reach,
        )
        for n, h in enumerate(found.taken)
    )
    doubtful = suspected(found.mixture, found.y, found.allowed)
    like_none = own_modes(found.y[:, found.allowed], found.phi[:, found.allowed]) < 0
    return Faults(
        test=test,
        design=design,
        proposals=proposals,
        pairs=told,
        before=effect.of(()),
        after=effect.of(tuple(h for h in found.taken if not h.others)),
        noise=found.mixture.spread,
        unexplained=tuple(int(c) for c in np.flatnonzero(doubtful)),
        unseen=tuple(int(c) for c in np.flatnonzero(_unseen(found))),
        unknown=tuple(int(i) + 1 for i in picked[like_none]),
        checked=int(allowed.sum()),
    )


@dataclass(frozen=True, eq=False)
class _Effect:
    """MAC of pairs with some hypotheses made."""

    y: Array
    phi: Array
    allowed: Array
    tests: Array
    analyses: Array

    def of(self, made: tuple[Hypothesis, ...]) -> Array:
        y, phi, allowed = self.y, self.phi, self.allowed
        for hypothesis in made:
            y, phi, allowed = hypothesis.made(y, phi, allowed)
        if not len(self.tests):
            return np.empty(0)
        return np.diag(mac(y[self.tests][:, allowed], phi[self.analyses][:, allowed])).copy()


def _places(mesh: Mesh, moved: Array, placement: Placement) -> Places:
    """The nodes of the skin."""
    rows = mesh.skin.nodes
    back = (mesh.points[rows] - placement.shift) @ placement.rotation / placement.scale
    return Places(back, moved[:, rows] @ placement.rotation, mesh.diagonal / placement.scale)


def _unseen(found: Found) -> Array:
    """(c,) bool: a wrong sign would not stand out."""
    predicted = found.mixture.coefficients @ found.phi
    shown = (4 * np.abs(predicted) ** 2 / found.mixture.reach(found.phi)).mean(axis=0)
    return found.allowed & (shown <= bound(len(predicted)))


def correction_dict(correction: Correction) -> dict[str, Any]:
    """The fields of a correction as the dossier writes them, empty ones left out."""
    position = None if correction.position is None else list(correction.position)
    given = {
        "kind": correction.kind,
        "point": correction.point,
        "axis": correction.axis,
        "other_axis": correction.other_axis,
        "other": correction.other,
        "position": position,
    }
    return {key: value for key, value in given.items() if value}


def _mean(values: Array) -> float | None:
    return float(np.mean(values)) if len(values) else None


def _count(number: int, word: str) -> str:
    return f"{number} {word}{'' if number == 1 else 's'}"


def _rise(facts: dict[str, Any], pairs: int) -> str:
    before, after = facts["mean_mac_before"], facts["mean_mac_after"]
    if before is None:
        return ""
    whose = f"the mean MAC of the {pairs} pairs" if pairs > 1 else "the MAC of the pair"
    way = "rises" if after > before + 0.005 else "falls" if after < before - 0.005 else "stays"
    return f"{whose} {way} from {before:.2f} to {after:.2f}" if way != "stays" else f"{whose} stays at {after:.2f}"


def _proposal_words(facts: dict[str, Any]) -> str:
    text = facts["words"]
    if facts["reach"] is not None:
        where = ", ".join(f"{axis} = {1e3 * v:.0f} mm" for axis, v in zip("xyz", facts["position"], strict=True))
        text += f", its readings belong near {where} in the test's axes"
        if facts["reach"] >= 1e-3:
            text += f", within {1e3 * facts['reach']:.0f} mm"
    text += "; " + _rise(facts, facts["pairs"]) if facts["pairs"] else ""
    if facts["alternatives"]:
        text += "; as likely: " + " or ".join(a["words"] for a in facts["alternatives"][:3])
    return text + "."


def _sentence(facts: dict[str, Any]) -> str:
    """Plain words about the whole test."""
    head = f"Test {facts['test']}: "
    many = len(facts["proposals"])
    if not many:
        text = f"none of {_count(facts['channels_checked'], 'channel')} contradicts the others"
        if facts["unexplained_count"]:
            text = (
                f"{_count(facts['unexplained_count'], 'channel')} contradict the others for no cause that was tried"
            )
    else:
        listed = "; ".join(f"({p['number']}) {p['words']}" for p in facts["proposals"])
        text = f"{_count(many, 'thing')} {'seems' if many == 1 else 'seem'} wrong: {listed}"
        if facts["certain"] and facts["pair_count"]:
            text += f"; put right, {_rise(facts, facts['pair_count'])}"
        if facts["certain"] < many:
            text += f"; {_count(many - facts['certain'], 'proposal')} could as well have another cause"
        if facts["unexplained_count"]:
            text += f"; no cause was found for {_count(facts['unexplained_count'], 'channel')} more"
    if facts["modes_like_none"]:
        listed = ", ".join(map(str, facts["modes_like_none"]))
        one = len(facts["modes_like_none"]) == 1
        text += f"; mode{'' if one else 's'} {listed} {'is' if one else 'are'} like none of the design and say little"
    if facts["unseen_count"]:
        text += f"; {_count(facts['unseen_count'], 'channel')} move too little for a fault to be seen"
    return head + text + "."
