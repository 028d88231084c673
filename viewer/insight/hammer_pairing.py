"""Which measured mode is which mode of the model, how well they agree, and which ones the points cannot tell apart.

Shapes are compared at the channels of the test, where nothing weighs them by mass unless a reduced mass is given, so
that different modes may look alike there. Such modes are named, since no comparison at these points can decide
between them (DESIGN §6 "Correlate").
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.sparse.csgraph import connected_components

from viewer.errors import InputError
from viewer.insight.correlate import auto_mac, comac, cross_orthogonality, ecomac, modal_scale_factor
from viewer.insight.hammer_words import sentence_of
from viewer.insight.pairing import ModePair, close_groups, group_shares, pair_vectors
from viewer.insight.phase import collinearity, phase_deviation_deg
from viewer.model.arrays import Array, frozen
from viewer.model.testset import TestSet

# MAC of two modes of the model at the channels from which on the points cannot tell them apart: a measured shape must
# then be within 9° of the right one, half the angle between the two, to be nearer to it for certain
ALIKE = 0.9
RUNNER_UP = 0.9  # of the agreement with the partner: another mode that agrees so well makes the pair doubtful
_RIGID = 1e-3  # of the highest computed frequency, below which a computed mode is a motion of the whole body
# of the scale on which 1 is the other way at full size, and times the median: a channel that stands out
_POOR, _OUTSTANDING = 0.1, 4.0
CLEAN = 0.1  # product through the reduced mass between different modes, at most (common practice, no source)


@dataclass(frozen=True)
class TestPair:
    """One mode, measured or computed, and its counterpart. Numbers from 1; None where there is none.

    kind        "paired", "unpaired", or "beyond" (unpaired, near or above the highest frequency of the other side)
    mac         of the two at the channels used; of the best candidate where there is no counterpart
    subspace    least cos² of the angles between the groups of close modes both belong to, None without close company
    group       numbers of the measured and of the computed modes in that comparison
    scale       what the computed shape is multiplied by to come closest to the measured one (modal scale factor)
    mixture     computed modes (number, factor) that come closest together: those of the group; the partner alone else
    runner_up   number of the next computed mode and its MAC, None when there is none
    cross       product through the reduced mass, 0…1, None without one
    alike       numbers of the computed modes that look like the partner at these points
    collinearity, phase_deviation_deg  of the measured shape
    """

    kind: str
    test: int | None
    analysis: int | None
    test_hz: float | None
    analysis_hz: float | None
    mac: float
    name: str = ""
    damping: float | None = None
    subspace: float | None = None
    group: tuple[tuple[int, ...], tuple[int, ...]] = ((), ())
    scale: complex = 0j
    mixture: tuple[tuple[int, complex], ...] = ()
    runner_up: tuple[int, float] | None = None
    cross: float | None = None
    alike: tuple[int, ...] = ()
    collinearity: float | None = None
    phase_deviation_deg: float | None = None

    __test__ = False

    @property
    def agreement(self) -> float:
        """MAC, or the comparison of subspaces where the modes have close company."""
        return self.mac if self.subspace is None else self.subspace

    @property
    def doubtful(self) -> bool:
        """Whether these points could as well speak for another computed mode."""
        close = self.runner_up is not None and self.runner_up[1] >= RUNNER_UP * max(self.mac, 1e-300)
        return self.kind == "paired" and (bool(self.alike) or close)

    def to_dict(self) -> dict[str, Any]:
        change = None
        if self.test_hz and self.analysis_hz:  # a rigid motion of the model has no frequency to compare
            change = 100 * (self.analysis_hz / self.test_hz - 1)
        paired = self.kind == "paired"
        return {
            "kind": self.kind,
            "test_mode": self.test,
            "analysis_mode": self.analysis,
            "name": self.name or None,
            "test_hz": self.test_hz,
            "analysis_hz": self.analysis_hz,
            "change_percent": change,
            "damping_ratio": self.damping,
            "mac": self.mac,
            "agreement": self.agreement,
            "subspace_agreement": self.subspace,
            "close_modes_test": list(self.group[0]),
            "close_modes_analysis": list(self.group[1]),
            "scale": abs(self.scale) if paired else None,
            "scale_phase_deg": float(np.degrees(np.angle(self.scale))) if paired else None,
            "next_best_mode": None if self.runner_up is None else self.runner_up[0],
            "next_best_mac": None if self.runner_up is None else self.runner_up[1],
            "cross_orthogonality": self.cross,
            "doubtful": self.doubtful,
            "looks_like": list(self.alike),
            "phase_collinearity": self.collinearity,
            "phase_deviation_deg": self.phase_deviation_deg,
        }


@dataclass(frozen=True, eq=False)
class TestCorrelation:
    """A test of m modes and c channels beside k modes of a design.

    matrix         (m, k) MAC at the channels used; test_auto (m, m), analysis_auto (k, k) of each side with itself
    pairs          what became of each measured mode in order, then the computed ones without counterpart
    comac, ecomac  (c,) of the pairs, NaN for channels not used or without a pair; 1 and 0 where all agree
    channels       (c,) in words; used (c,) bool
    alike          groups of computed modes, numbers from 1, that the points cannot tell apart
    orthogonality  (m, k) size of the products through the reduced mass; test_orthogonality (m, m) and
                   self_orthogonality (k, k) of each side with itself, the last a check of the reduction; None without
    """

    test: str
    design: str
    matrix: Array
    test_auto: Array
    analysis_auto: Array
    pairs: tuple[TestPair, ...]
    comac: Array
    ecomac: Array
    channels: tuple[str, ...]
    used: Array
    alike: tuple[tuple[int, ...], ...] = ()
    orthogonality: Array | None = None
    test_orthogonality: Array | None = None
    self_orthogonality: Array | None = None

    __test__ = False

    def __post_init__(self) -> None:
        for name in ("matrix", "test_auto", "analysis_auto", "comac", "ecomac"):
            object.__setattr__(self, name, frozen(getattr(self, name), float))
        object.__setattr__(self, "used", frozen(self.used, bool))
        for name in ("orthogonality", "test_orthogonality", "self_orthogonality"):
            if getattr(self, name) is not None:
                object.__setattr__(self, name, frozen(getattr(self, name), float))

    def partner(self, test: int) -> int | None:
        """Number of the computed mode that measured mode ``test`` was paired with."""
        return next((p.analysis for p in self.pairs if p.test == test), None)

    @property
    def paired(self) -> tuple[TestPair, ...]:
        return tuple(p for p in self.pairs if p.kind == "paired")

    @property
    def sentence(self) -> str:
        return sentence_of(self.to_dict())

    def to_dict(self) -> dict[str, Any]:
        pairs = [p.to_dict() for p in self.pairs]
        paired = [p for p in pairs if p["kind"] == "paired"]
        changes = [p["change_percent"] for p in paired if p["change_percent"] is not None]
        number = lambda v: None if np.isnan(v) else float(v)  # noqa: E731
        lonely = [p for p in self.pairs if p.test is None]
        top = max((p.analysis_hz for p in self.pairs if p.analysis_hz), default=0.0)
        rigid = [p for p in lonely if p.analysis_hz is not None and p.analysis_hz < _RIGID * top]
        scatter = [p.phase_deviation_deg for p in self.pairs if p.phase_deviation_deg is not None]
        reduction_error = _beside_the_diagonal(self.self_orthogonality, self.paired)
        worst = None if np.isnan(self.ecomac).all() else int(np.nanargmax(self.ecomac))
        return {
            "test": self.test,
            "design": self.design,
            "measured_modes": len(self.matrix),
            "computed_modes": self.matrix.shape[1],
            "channels": len(self.channels),
            "channels_used": int(self.used.sum()),
            "paired": len(paired),
            "least_agreement": min((p["agreement"] for p in paired), default=None),
            "largest_change_percent": max(changes, key=abs, default=None),
            "mean_change_percent": float(np.mean(changes)) if changes else None,
            "measured_without_counterpart": [p.test for p in self.pairs if p.kind != "paired" and p.test],
            "computed_without_counterpart": [p.analysis for p in lonely if p not in rigid and p.kind == "unpaired"],
            "computed_beyond": [p.analysis for p in lonely if p not in rigid and p.kind == "beyond"],
            "computed_rigid_not_measured": [p.analysis for p in rigid],
            "doubtful": [p.test for p in self.pairs if p.doubtful],
            "looking_alike": [list(group) for group in self.alike],
            "alike_limit": ALIKE,
            "measured_looking_alike": [list(group) for group in _groups(self.test_auto > ALIKE)],
            "worst_channel": None if worst is None else self.channels[worst],
            "worst_channel_stands_out": worst is not None
            and bool(self.ecomac[worst] >= max(_POOR, _OUTSTANDING * float(np.nanmedian(self.ecomac)))),
            "worst_channel_ecomac": None if worst is None else float(self.ecomac[worst]),
            "largest_phase_deviation_deg": max(scatter, default=None),
            "worst_cross_orthogonality": _beside_the_pairs(self.orthogonality, self.paired),
            "reduction_error": reduction_error,
            "reduction_error_limit": CLEAN,
            "reduction_is_fair": None if reduction_error is None else reduction_error <= CLEAN,
            "pairs": pairs,
            "mac_matrix": self.matrix.tolist(),
            "test_auto_mac": self.test_auto.tolist(),
            "analysis_auto_mac": self.analysis_auto.tolist(),
            "comac": [number(v) for v in self.comac],
            "ecomac": [number(v) for v in self.ecomac],
            "channel_names": list(self.channels),
            "cross_orthogonality": None if self.orthogonality is None else self.orthogonality.tolist(),
            "test_orthogonality": None if self.test_orthogonality is None else self.test_orthogonality.tolist(),
            "analysis_orthogonality": None if self.self_orthogonality is None else self.self_orthogonality.tolist(),
        }


def correlate_test(
    test: TestSet,
    analysis: Array,
    analysis_hz: Array,
    *,
    design: str = "",
    names: Sequence[str] = (),
    used: Array | None = None,
    reduced_mass: Array | None = None,
) -> TestCorrelation:
    """A test beside the modes of a design, ``analysis`` (k, c): their motion along the test's channels.

    names  (k,) of the computed modes, empty where there is none; used (c,) bool: channels to compare, None: all;
    reduced_mass  (u, u) kg of the channels used (``mechanics.reduced``)
    Raises ``InputError`` when arrays do not fit together or nothing is left to compare.
    """
    mask = np.ones(test.n_channels, bool) if used is None else np.asarray(used, bool)
    analysis, analysis_hz = np.atleast_2d(analysis), np.atleast_1d(np.asarray(analysis_hz, float))
    _check(test, analysis, analysis_hz, mask, reduced_mass)
    measured, computed = np.asarray(test.shapes)[:, mask], analysis[:, mask]
    matrix, found = pair_vectors(measured, computed, test.freq_hz, analysis_hz)
    twins = _groups(look_alike(computed, analysis_hz) > ALIKE)
    cross = _products(measured, reduced_mass, computed)
    figures = collinearity(measured), phase_deviation_deg(measured)
    pairs, beside = [], []
    for p in found:
        own = None if p.first is None else p.first - 1
        pair = TestPair(
            p.kind if p.kind in ("paired", "beyond") else "unpaired",
            p.first,
            p.second,
            p.first_hz,
            p.second_hz,
            p.mac,
            name=names[p.second - 1] if len(names) and p.second else "",
            damping=_known(test.damping, own),
            collinearity=None if own is None else float(figures[0][own]),
            phase_deviation_deg=None if own is None else float(figures[1][own]),
            **({} if p.kind != "paired" else _partnership(p, measured, computed, matrix, cross, twins)),
        )
        pairs.append(pair)
        if pair.kind == "paired":
            factors = np.array([factor for _, factor in pair.mixture])
            beside.append((measured[own], factors @ computed[[number - 1 for number, _ in pair.mixture]]))
    by_channel = np.full((2, test.n_channels), np.nan)
    if beside:
        one, two = (np.array(shapes) for shapes in zip(*beside, strict=True))
        by_channel[:, mask] = comac(_unit(one), _unit(two)), ecomac(one, two)
    itself = [_products(shapes, reduced_mass, shapes) for shapes in (measured, computed)]
    return TestCorrelation(
        test.name,
        design,
        matrix,
        auto_mac(measured),
        auto_mac(computed),
        tuple(pairs),
        by_channel[0],
        by_channel[1],
        tuple(test.channel_words(c) for c in range(test.n_channels)),
        mask,
        twins,
        cross,
        itself[0],
        itself[1],
    )


def look_alike(shapes: Array, freq_hz: Array) -> Array:
    """(k, k) how far each mode looks like another at these coordinates, 0…1: MAC, or the share of it that a group of
    close modes it does not belong to can take on between them; 0 on the diagonal."""
    groups = close_groups(freq_hz)
    out = auto_mac(shapes)
    shares = group_shares(shapes, shapes, groups)
    outside = np.array([[i not in members for members in groups] for i in range(len(shapes))])
    out = np.where(outside, np.maximum(out, shares), out)
    out = np.maximum(out, out.T)
    # a mode that does not move these points looks like any other
    still = ~(np.abs(shapes) > 0).any(axis=1)
    out[still] = out[:, still] = 1
    np.fill_diagonal(out, 0)
    return out


def _products(a: Array, mass: Array | None, b: Array) -> Array | None:
    return None if mass is None else np.abs(cross_orthogonality(a, mass, b))


def _partnership(
    p: ModePair,
    measured: Array,
    computed: Array,
    matrix: Array,
    cross: Array | None,
    twins: tuple[tuple[int, ...], ...],
) -> dict[str, Any]:
    """What is known of a pair beyond the two numbers."""
    assert p.first is not None and p.second is not None
    i, j = p.first - 1, p.second - 1
    company = p.group[1] or (p.second,)
    others = [k for k in range(matrix.shape[1]) if k + 1 not in company]
    best = max(others, key=lambda k: matrix[i, k], default=None)
    members = [k - 1 for k in company]
    factors = np.linalg.lstsq(computed[members].T, measured[i], rcond=1e-9)[0]
    return {
        "subspace": p.subspace,
        "group": p.group,
        "scale": modal_scale_factor(measured[i], computed[j]),
        "mixture": tuple((k, complex(f)) for k, f in zip(company, factors, strict=True)),
        "runner_up": None if best is None else (best + 1, float(matrix[i, best])),
        "cross": None if cross is None else float(cross[i, j]),
        "alike": next((tuple(k for k in group if k != p.second) for group in twins if p.second in group), ()),
    }


def _check(test: TestSet, analysis: Array, analysis_hz: Array, mask: Array, reduced_mass: Array | None) -> None:
    wrong = [
        (analysis.shape[1], test.n_channels, "channels of the computed shapes"),
        (len(analysis_hz), len(analysis), "frequencies of the computed shapes"),
        (len(mask), test.n_channels, "channels said to be used or not"),
    ]
    if reduced_mass is not None:
        wrong += [(n, int(mask.sum()), "rows of the reduced mass") for n in np.shape(reduced_mass)]
    for found, expected, what in wrong:
        if found != expected:
            raise InputError(f"test '{test.name}': {what} do not fit", found=str(found), expected=str(expected))
    if not mask.any() or not test.count or not len(analysis):
        raise InputError(
            f"test '{test.name}': nothing to compare",
            found=f"{test.count} measured modes, {len(analysis)} computed ones, {int(mask.sum())} channels in use",
            do="check the placement of the points on the mesh",
        )


def _groups(linked: Array) -> tuple[tuple[int, ...], ...]:
    """Numbers, from 1, of rows that hang together; alone ones left out."""
    linked = linked & ~np.eye(len(linked), dtype=bool)
    count, label = connected_components(linked, directed=False)
    groups = [tuple(int(i) + 1 for i in np.nonzero(label == g)[0]) for g in range(count)]
    return tuple(sorted(group for group in groups if len(group) > 1))


def _unit(shapes: Array) -> Array:
    """Rows of length 1: each pair counts alike."""
    return shapes / np.maximum(np.linalg.norm(shapes, axis=1, keepdims=True), 1e-300)


def _known(values: Array | None, row: int | None) -> float | None:
    return None if values is None or row is None or np.isnan(values[row]) else float(values[row])


def _beside_the_pairs(products: Array | None, pairs: tuple[TestPair, ...]) -> float | None:
    """Largest product of a measured mode with a computed one that is the partner of another, its own group aside."""
    if products is None or not pairs:
        return None
    worst = [
        float(products[p.test - 1, q.analysis - 1])
        for p in pairs
        for q in pairs
        if p is not q and p.test and q.analysis and q.analysis not in p.group[1] and p.test not in q.group[0]
    ]
    return max(worst, default=None)


def _beside_the_diagonal(products: Array | None, pairs: tuple[TestPair, ...]) -> float | None:
    """Largest product of two computed modes that have counterparts."""
    rows = [p.analysis - 1 for p in pairs if p.analysis]
    if products is None or len(rows) < 2:
        return None
    return float(np.max(products[np.ix_(rows, rows)][~np.eye(len(rows), dtype=bool)]))
