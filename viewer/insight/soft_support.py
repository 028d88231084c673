"""Whether the support of a free test was soft enough to leave the elastic modes alone.

A part that hangs in cords or lies on foam moves as one piece at low frequencies. These motions are known by their
shapes: measured ones that the six rigid motions of the points account for. The highest of them should lie at no more
than a tenth of the first elastic mode (common practice, no source).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from viewer.insight.hammer_words import numbers
from viewer.mechanics.patch import rigid_fields
from viewer.model.arrays import Array, frozen
from viewer.model.testset import TestSet
from viewer.model.written import hertz

LIMIT = 0.1  # highest rigid frequency over the first elastic one, at most (common practice, no source)
RIGID = 0.95  # share of a measured shape that rigid motions account for, from which on it is one of them
_SEEN = 1e-3  # of the rigid motion the channels see best, below which one is not seen
_SPARE = 2  # channels for each rigid motion seen: with fewer, elastic shapes look rigid too


@dataclass(frozen=True, eq=False)
class SoftSupport:
    """A finding about the support of a test.

    rigid_share  (m,) of each measured shape; seen: how many of the six rigid motions the channels can see
    rigid        numbers of the measured modes that are motions of the whole body, from 1
    elastic      number of the first mode above them, None when there is none
    freq_hz      (m,) Hz
    reason       why nothing can be said of the support, "" when it can
    """

    test: str
    freq_hz: Array
    rigid_share: Array
    seen: int
    rigid: tuple[int, ...] = ()
    elastic: int | None = None
    reason: str = ""

    def __post_init__(self) -> None:
        object.__setattr__(self, "freq_hz", frozen(self.freq_hz, float))
        object.__setattr__(self, "rigid_share", frozen(self.rigid_share, float))

    @property
    def ratio(self) -> float | None:
        """Highest rigid frequency over the first elastic one."""
        if self.reason or self.elastic is None:
            return None
        return float(self.freq_hz[self.rigid[-1] - 1] / self.freq_hz[self.elastic - 1])

    @property
    def soft(self) -> bool | None:
        """Whether the support is soft enough; None when that cannot be told."""
        return None if self.ratio is None else self.ratio <= LIMIT

    @property
    def sentence(self) -> str:
        facts = self.to_dict()
        if facts["ratio"] is None:
            return f"Whether the support of {facts['test']} was soft enough is not known: {facts['reason']}."
        verdict = (
            "was soft enough" if facts["soft"] else "was too stiff, so that it may raise the elastic frequencies"
        )
        return (
            f"The support of {facts['test']} {verdict}: the part moves on it as one piece at up to "
            f"{hertz(facts['highest_rigid_hz'])}, {facts['ratio']:.1%} of the first elastic mode at "
            f"{hertz(facts['first_elastic_hz'])} (at most {facts['limit']:.0%} is common practice)."
        )

    def to_dict(self) -> dict[str, Any]:
        known = self.ratio is not None
        return {
            "test": self.test or "the test",
            "soft": self.soft,
            "ratio": self.ratio,
            "limit": LIMIT,
            "highest_rigid_hz": float(self.freq_hz[self.rigid[-1] - 1]) if known else None,
            "first_elastic_hz": float(self.freq_hz[self.elastic - 1]) if known and self.elastic else None,
            "rigid_modes": list(self.rigid),
            "first_elastic_mode": self.elastic,
            "rigid_share": self.rigid_share.tolist(),
            "rigid_motions_seen": self.seen,
            "reason": self.reason or None,
        }


def soft_support(test: TestSet, *, free: bool | None = None, used: Array | None = None) -> SoftSupport:
    """How the support of a free test compares with its first elastic mode.

    free  False when the part is held, as in a model with supports: then there is nothing to ask. None: not known;
          the tip of a held part may then be taken for a free body
    used  (c,) bool: channels to look at, None: all
    """
    mask = np.ones(test.n_channels, bool) if used is None else np.asarray(used, bool)
    fields = _fields(test, mask)
    left, strength, _ = np.linalg.svd(fields, full_matrices=False)
    basis = left[:, strength > _SEEN * strength.max(initial=0.0)]
    seen, shapes = basis.shape[1], test.shapes[:, mask]
    size = (np.abs(shapes) ** 2).sum(axis=1)
    inside = (np.abs(shapes @ basis) ** 2).sum(axis=1)
    share = np.divide(inside, size, out=np.zeros(len(shapes)), where=size > 0)

    run = int(np.argmin(np.append(share >= RIGID, False)))  # how many of the lowest modes are rigid
    rigid = tuple(range(1, run + 1))
    elastic = run + 1 if run < test.count else None
    reason = _reason(test, free, int(mask.sum()), seen, rigid, elastic)
    return SoftSupport(test.name, test.freq_hz, share, seen, rigid, elastic, reason)


def _reason(
    test: TestSet, free: bool | None, channels: int, seen: int, rigid: tuple[int, ...], elastic: int | None
) -> str:
    if free is False:
        return "the part is held, not free"
    if channels < _SPARE * seen or not seen:
        return "there are too few channels to tell a motion of the whole body from an elastic one"
    if len(rigid) > seen:
        return f"{numbers(rigid)} all look like motions of the whole body, more than there can be"
    if not rigid:
        return "none of the lowest measured modes is a motion of the whole body"
    if elastic is None:
        return "no elastic mode was measured"
    return ""


def _fields(test: TestSet, mask: Array) -> Array:
    """(u, 6) what the channels in use see of the rigid motions, turning scaled to the size of the set of points."""
    where, along = test.points[test.sensor[mask]], test.directions[mask]
    centre = where.mean(axis=0) if len(where) else np.zeros(3)
    radius = float(np.sqrt(((where - centre) ** 2).sum(axis=1).mean())) if len(where) else 1.0
    return np.einsum("ca,caf->cf", along, rigid_fields((where - centre) / max(radius, 1e-300), np.zeros(3)))
