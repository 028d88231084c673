"""Runs of one test, in which the hammer or the sensors moved on, merged into one set on their common channels.

Two runs share a channel where they measured at the same point in the same or the opposite direction. The first run
leads: a mode of another run belongs to that mode of the first whose frequency lies nearest (all at once, by the
least sum of squared relative differences, so that close modes keep their order, none above 10 %: common practice, no
source); modes that a run lacks are left out. The shapes of a run are multiplied by the factor, complex when shapes
are, by which they come closest, in the sense of least squares, to what the runs merged before it have on the shared
channels (modal scale factor, Allemang & Brown 1982); there the mean of all runs is kept. Frequencies and damping
ratios are means over the runs. How far the runs differ is reported in the remarks.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from scipy.optimize import linear_sum_assignment

from viewer.errors import LoadError
from viewer.insight.correlate import modal_scale_factor
from viewer.model.arrays import Array
from viewer.model.testset import TestSet

_SAME_MODE = 0.1
_SAME_PLACE = 1e-3  # of the size of the test
_SAME_DIRECTION = 1 - 1e-4  # cosine, 0.8°
_FAINT, _APART = 0.05, 0.1


def merge_runs(sets: Sequence[TestSet]) -> TestSet:
    """One set of several runs; names are those of the first. Raises ``LoadError`` when a run shares no channel with
    the others, points of one label lie apart, or no mode is in all runs."""
    first, *rest = sets
    if not rest:
        return first
    for number, run in enumerate(sets, 1):
        if run.corrections:
            raise ValueError(f"run {number} has corrections: they belong to the merged set")
    found = [_modes_of(first, run) for run in rest]
    kept = np.flatnonzero((np.array(found) >= 0).all(axis=0))
    if not len(kept):
        raise LoadError(
            "the runs have no mode in common",
            file=_sources(sets),
            found="; ".join(f"{', '.join(f'{f:.4g}' for f in run.freq_hz)} Hz" for run in sets),
            expected=f"frequencies within {_SAME_MODE:.0%} of one another",
        )
    modes = [kept, *(partners[kept] for partners in found)]
    merged = _Merged(sets, modes)
    pending = list(range(1, len(sets)))
    while pending:
        ready = [number for number in pending if merged.shares(number)]
        if not ready:
            raise LoadError(
                f"run {pending[0] + 1} has no channel in common with the others",
                file=_sources(sets),
                found=f"points {_some(sets[pending[0]])}",
                expected="the same point, in the same direction, in both",
                do="measure a reference point in every run, or give the runs as tests of their own",
            )
        pending.remove(ready[0])
        merged.add(ready[0])
    return merged.result()


class _Merged:
    """The runs merged so far. Channels have a sum over the runs that measured them, and how many those are."""

    def __init__(self, sets: Sequence[TestSet], modes: Sequence[Array]) -> None:
        self.sets, self.modes, self.remarks = sets, modes, [f"{len(sets)} runs were merged on their common channels"]
        self.labels, points, self.rows = _points(sets)
        self.points = points
        first = sets[0]
        self.sensor = self.rows[0][first.sensor]
        self.directions = np.array(first.directions)
        is_complex = any(run.is_complex for run in sets)
        self.sums = first.shapes[modes[0]].astype(complex if is_complex else float)
        self.counts = np.ones(first.n_channels)

    def _partners(self, number: int) -> tuple[Array, Array]:
        """For each channel of run ``number`` the merged one like it, or −1, and its sign there."""
        run = self.sets[number]
        same = self.sensor[None, :] == self.rows[number][run.sensor][:, None]
        cosine = np.where(same, run.directions @ self.directions.T, 0.0)
        at = np.abs(cosine).argmax(axis=1)
        best = cosine[np.arange(len(at)), at]
        return np.where(np.abs(best) > _SAME_DIRECTION, at, -1), np.sign(best)

    def shares(self, number: int) -> bool:
        return bool((self._partners(number)[0] >= 0).any())

    def add(self, number: int) -> None:
        run, (at, sign) = self.sets[number], self._partners(number)
        mine = np.flatnonzero(at >= 0)
        new = np.flatnonzero(at < 0)
        shapes = run.shapes[self.modes[number]].astype(self.sums.dtype)
        known = (self.sums / self.counts)[:, at[mine]]
        for mode, (shape, wanted) in enumerate(zip(shapes, known, strict=True)):
            given = shape[mine] * sign[mine]
            self._check_size(number, mode, given, shape)
            factor = modal_scale_factor(wanted, given)
            shapes[mode] *= factor if np.iscomplexobj(shapes) else factor.real
            apart = float(np.linalg.norm(shapes[mode, mine] * sign[mine] - wanted) / np.linalg.norm(wanted))
            if apart > _APART:
                self.remarks.append(
                    f"run {number + 1} differs from the others by {apart:.0%} on the channels that they share "
                    f"in {self._mode_words(mode)}"
                )
        np.add.at(self.sums.T, at[mine], (shapes[:, mine] * sign[mine]).T)
        np.add.at(self.counts, at[mine], 1)
        self.sensor = np.concatenate([self.sensor, self.rows[number][run.sensor[new]]])
        self.directions = np.concatenate([self.directions, run.directions[new]])
        self.sums = np.hstack([self.sums, shapes[:, new]])
        self.counts = np.concatenate([self.counts, np.ones(len(new))])

    def _check_size(self, number: int, mode: int, shared: Array, shape: Array) -> None:
        share = np.abs(shared).max() / np.abs(shape).max() if shape.any() else 0.0
        if not share > 1e-9:
            raise LoadError(
                f"the shared channels of run {number + 1} do not move in {self._mode_words(mode)}",
                file=_sources(self.sets),
                expected="motion in every mode, by which the runs are scaled",
                do="choose a reference point that moves in all modes",
            )
        if share < _FAINT:
            self.remarks.append(
                f"the shared channels of run {number + 1} hardly move in {self._mode_words(mode)} ({share:.1%} of "
                "the largest motion): the run is scaled by little more than noise there"
            )

    def _mode_words(self, mode: int) -> str:
        """By frequency: numbers change as modes are left out."""
        return f"the mode at {self.sets[0].freq_hz[self.modes[0][mode]]:.4g} Hz"

    def result(self) -> TestSet:
        sets, first = self.sets, self.sets[0]
        freq = np.array([run.freq_hz[modes] for run, modes in zip(sets, self.modes, strict=True)])
        means = freq.mean(axis=0)
        spread = np.ptp(freq, axis=0) / means
        worst = int(np.argmax(spread))
        remarks = [
            f"frequencies are means over the runs, which differ by at most {spread[worst]:.2%} in "
            f"{self._mode_words(worst)}"
        ]
        for number, (run, modes) in enumerate(zip(sets, self.modes, strict=True), 1):
            lost = np.setdiff1d(np.arange(run.count), modes)
            if len(lost):
                listed = ", ".join(f"{f:.4g}" for f in run.freq_hz[lost])
                remarks.append(f"modes of run {number} that are not in every run were left out: {listed} Hz")
        lines = np.concatenate([rows[run.lines] for run, rows in zip(sets, self.rows, strict=True)])
        own = [f"run {n}: {remark}" for n, run in enumerate(sets, 1) for remark in run.remarks]
        idle = [remark for remark in own if "points without a channel" not in remark]
        return first.with_(
            labels=self.labels,
            points=self.points,
            lines=np.unique(np.sort(lines, axis=1), axis=0),
            sensor=self.sensor,
            directions=self.directions,
            freq_hz=means,
            shapes=self.sums / self.counts,
            damping=self._damping(),
            source=_sources(sets),
            remarks=(*self.remarks, *remarks, *idle),
        )

    def _damping(self) -> Array | None:
        """(m,) means of what the runs know."""
        nothing = np.full(len(self.modes[0]), np.nan)
        given = np.array(
            [
                nothing if run.damping is None else run.damping[modes]
                for run, modes in zip(self.sets, self.modes, strict=True)
            ]
        )
        known = np.isfinite(given)
        if not known.any():
            return None
        count = known.sum(axis=0)
        return np.where(count > 0, np.where(known, given, 0.0).sum(axis=0) / np.maximum(count, 1), np.nan)


def _modes_of(first: TestSet, run: TestSet) -> Array:
    """(m,) the mode of ``run`` that belongs to each mode of ``first``, or −1."""
    apart = np.abs(np.log(run.freq_hz[None, :] / first.freq_hz[:, None]))
    rows, columns = linear_sum_assignment(np.minimum(apart, 10.0) ** 2)
    out = np.full(first.count, -1)
    near = apart[rows, columns] <= np.log1p(_SAME_MODE)
    out[rows[near]] = columns[near]
    return out


def _points(sets: Sequence[TestSet]) -> tuple[tuple[str, ...], Array, list[Array]]:
    """Labels and places of all points, and the row of each run's points among them."""
    at: dict[str, int] = {}
    points: list[Array] = []
    rows = []
    size = max(run.size for run in sets)
    for number, run in enumerate(sets, 1):
        for label, point in zip(run.labels, run.points, strict=True):
            row = at.setdefault(label, len(points))
            if row == len(points):
                points.append(point)
            elif not np.linalg.norm(points[row] - point) <= _SAME_PLACE * size:
                raise LoadError(
                    f"point {label} lies at two places",
                    file=_sources(sets),
                    place=f"run {number}",
                    found=f"{_written(points[row])} and {_written(point)} m",
                    expected="one place for each label in all runs",
                )
        rows.append(np.array([at[label] for label in run.labels], np.int64))
    return tuple(at), np.array(points), rows


def _written(point: Array) -> str:
    return "(" + ", ".join(f"{v:.6g}" for v in point) + ")"


def _sources(sets: Sequence[TestSet]) -> str:
    return "; ".join(dict.fromkeys(run.source for run in sets))


def _some(run: TestSet) -> str:
    labels = [run.labels[row] for row in np.unique(run.sensor)]
    return ", ".join(labels[:10]) + (" …" if len(labels) > 10 else "")
