"""A measured shape on the whole mesh: least squares on analysis modes, and what its channels say about its error.

Expansion with the modes of the analysis as a basis: O'Callahan J., Avitabile P., Riemer R., System equivalent
reduction expansion process (SEREP), IMAC 7 (1989) 29. The measured coordinates give the shape's share of every basis
mode; these shares then hold on all nodes. What the basis cannot show is missing in the expanded shape.

Which modes, and how many, is chosen for every measured mode by its left-out error: each channel is predicted from all
the others, which least squares gives without fitting anew, r / (1 − h) with the leverage h of the channel (Allen
D.M., The relationship between variable selection and data augmentation and a method for prediction, Technometrics 16
(1974) 125; from memory). To its mean square is added what the uncertainty of the coefficients makes of it on the
mesh, so that a mode which the channels hardly see, but which moves elsewhere, must earn its place. Modes are added
one by one as long as the best of them lowers this by more than the best of K unrelated ones would, a share 2 ln K / c
for c channels (Foster D.P., George E.I., The risk inflation criterion for multiple regression, Ann. Stat. 22 (1994)
1947; from memory); never more than half as many as there are channels.

The left-out error tells how far a further reading of the same quality, at a place like the ones measured, would lie
from the expanded shape. Where noise rules, the shape itself is nearer to the truth than that: ``shape_error`` carries
the left-out residuals through the coefficients onto all nodes (the jackknife's variance, in its form HC3: MacKinnon
J.G., White H., J. Econometrics 29 (1985) 305; from memory). Of a region that no channel sees, such as a flap without
a sensor, and of what the basis cannot show, neither knows anything.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
import scipy.sparse as sp

from viewer.errors import InputError, RefusedError
from viewer.jobs import SILENT, Progress
from viewer.model.arrays import Array, frozen
from viewer.model.modes import ArrayShapes, ModeSet
from viewer.model.testset import TestSet

EXACT = 1e-10  # of a mode's rms reading: no error below that is told from rounding
POOR = 0.5  # left-out error, share of the rms reading, from which on a mode counts as hardly explained
_ALONE = 1e-8  # 1 − leverage, below which no other channel says anything about a channel
_SINGULAR = 1e-8  # of the largest singular value of the basis, each mode at unit length


@dataclass(frozen=True)
class Step:
    """One more basis mode for one measured mode: ``number`` (from 1) of the analysis mode, ``error`` then expected on
    the mesh (share of the rms reading), and whether it was ``taken``; the last one of a choice was not worth it."""

    number: int
    error: float
    taken: bool


@dataclass(frozen=True, eq=False)
class Expansion:
    """m measured modes on the mesh.

    modes        on the mesh's nodes, origin "measured", of the size of the test's readings, with their ``caution``
    choice       by measured mode, how its basis was chosen; given: the caller named one basis for all
    used         (c,) bool, the channels expanded from
    coefficients (m, modes of the analysis), 0 for modes outside the basis
    predicted    (m, c) what the other channels say about each; NaN where a channel was not used, or no other one says
                 anything about it
    residual     (m, c) reading − predicted, real or complex
    shape_error  (m,) root mean square error to be expected of the shape over all nodes and directions, share of the
                 mode's rms reading, by the left-out residuals; NaN where a channel stands alone
    """

    test: TestSet
    modes: ModeSet
    choice: tuple[tuple[Step, ...], ...]
    given: bool
    used: Array
    coefficients: Array
    predicted: Array
    residual: Array
    shape_error: Array

    def __post_init__(self) -> None:
        for name in ("used", "coefficients", "predicted", "residual", "shape_error"):
            object.__setattr__(self, name, frozen(getattr(self, name)))

    @property
    def n_channels(self) -> int:
        return int(self.used.sum())

    @property
    def basis(self) -> tuple[int, ...]:
        """Numbers (from 1) of all analysis modes used, ascending."""
        return tuple(sorted({step.number for steps in self.choice for step in steps if step.taken}))

    def basis_of(self, index: int) -> tuple[int, ...]:
        """Numbers of the analysis modes that measured mode ``index`` (from 0) stands on, best first."""
        return tuple(step.number for step in self.choice[index] if step.taken)

    @cached_property
    def residual_by_mode(self) -> Array:
        """(m,) root mean square residual over the channels, share of the mode's rms reading: the left-out error."""
        known = np.isfinite(self.residual)
        square = np.where(known, np.abs(np.where(known, self.residual, 0)) ** 2, 0).sum(axis=1)
        return np.sqrt(square / np.maximum(known.sum(axis=1), 1)) / self._rms

    @cached_property
    def residual_by_channel(self) -> Array:
        """(c,) root mean square over the modes of the residual as a share of the mode's rms reading; NaN as above."""
        return np.sqrt((np.abs(self.residual / self._rms[:, None]) ** 2).mean(axis=0))

    @cached_property
    def _rms(self) -> Array:
        return _rms(self.test.shapes[:, self.used])

    @property
    def sentence(self) -> str:
        return _sentence(self.to_dict())

    def to_dict(self) -> dict[str, Any]:
        by_channel, by_mode = self.residual_by_channel, self.residual_by_mode
        rows = np.flatnonzero(np.isfinite(by_channel))
        worst = rows[np.argsort(-by_channel[rows], kind="stable")[:3]]
        return {
            "test": self.test.name,
            "design": self.modes.source,
            "channels": self.n_channels,
            "most_basis_modes": self.n_channels // 2,
            "basis": list(self.basis),
            "basis_count": len(self.basis),
            "basis_given": self.given,
            "mode_count": self.modes.count,
            "left_out_error": float(np.sqrt(np.mean(by_mode**2))),
            "modes": [
                {
                    "mode": i + 1,
                    "frequency_hz": float(self.modes.freq_hz[i]),
                    "basis": list(self.basis_of(i)),
                    "left_out_error": float(by_mode[i]),
                    "shape_error": float(self.shape_error[i]),
                    "choice": [{"mode": s.number, "error": s.error, "taken": s.taken} for s in self.choice[i]],
                }
                for i in range(self.modes.count)
            ],
            "most_used": max(len(self.basis_of(i)) for i in range(self.modes.count)),
            "hardly_explained": [i + 1 for i in range(self.modes.count) if by_mode[i] >= POOR],
            "hardly_explained_from": POOR,
            "worst_channels": [
                {"channel": self.test.channel_words(int(c)), "left_out_error": float(by_channel[c])} for c in worst
            ],
            "channels_alone": [self.test.channel_words(int(c)) for c in np.flatnonzero(self.used) if c not in rows],
            "caution": self.modes.caution,
        }


def expand(
    test: TestSet,
    sensing: sp.csr_array,
    modes: ModeSet,
    *,
    used: Array | None = None,
    basis: Sequence[int] | None = None,
    progress: Progress = SILENT,
) -> Expansion:
    """The shapes of a registered test on the nodes of ``modes``.

    sensing  (c, 3·nodes) nodal translations to motion along each channel; used (c,) bool, None: all
    modes    of the design: the basis is chosen among them, or the numbers (from 1) in ``basis`` are taken as they are
    Rotations come along where the analysis modes have them. Raises ``RefusedError`` when there are too few channels:
    two for every basis mode, and when the basis is chosen for every mode that the analysis has up to the test's
    highest frequency, since any of these may be in any measured shape; ``InputError`` for a basis that is unusable.
    """
    where = np.ones(test.n_channels, bool) if used is None else np.asarray(used, bool).copy()
    where &= np.isfinite(test.shapes).all(axis=0)
    readings = test.shapes[:, where]
    _refuse_few(test, modes, int(where.sum()), basis)
    rms = _rms(readings)
    if not (rms > 0).all():
        raise RefusedError(
            f"test '{test.name}': mode {int(np.argmin(rms > 0)) + 1} does not move at any channel in use",
            do="leave the mode out of the test",
        )
    moved = np.stack([modes.shape(i) for i in range(modes.count)])
    rows = moved.reshape(modes.count, -1) @ sensing[np.flatnonzero(where)].T
    gram = _gram(moved)
    named = None if basis is None else _named(test, modes, rows, basis)
    coefficients = np.zeros((test.count, modes.count), np.result_type(readings, rows))
    predicted = np.full(test.shapes.shape, np.nan, coefficients.dtype)
    choice = []
    shape_error = np.zeros(test.count)
    for i in range(test.count):
        progress.tick("expanding measured shapes", i, test.count)
        y = readings[i] / rms[i]
        steps = _choose(y, rows, gram) if named is None else tuple(Step(j + 1, np.nan, True) for j in named)
        taken = [step.number - 1 for step in steps if step.taken]
        left, weights = _left_out(y, rows[taken])
        if named is not None:
            steps = tuple(Step(s.number, float(np.sqrt(np.nanmean(np.abs(left) ** 2))), True) for s in steps)
        shape_error[i] = _error_on_mesh(rows[taken], left, gram[np.ix_(taken, taken)])
        coefficients[i, taken] = weights * rms[i]
        predicted[i, where] = readings[i] - left * rms[i]
        choice.append(steps)
    turned = None
    if modes.shapes.has_rotations:
        turned = np.stack([np.asarray(modes.rotations(i)) for i in range(modes.count)])
        turned = np.tensordot(coefficients, turned, 1)
    found = {step.number for steps in choice for step in steps if step.taken}
    caution = (
        f"expanded from {int(where.sum())} channels on {len(found)} analysis mode{'s' if len(found) > 1 else ''}: "
        "what the basis cannot show is missing"
    )
    expanded = ModeSet(
        node_ids=modes.node_ids,
        freq_hz=test.freq_hz,
        shapes=ArrayShapes(np.tensordot(coefficients, moved, 1), turned),
        damping=test.damping,
        origin="measured",
        source=modes.source,
        caution=caution,
    )
    residual = test.shapes - predicted
    return Expansion(
        test, expanded, tuple(choice), basis is not None, where, coefficients, predicted, residual, shape_error
    )


def _refuse_few(test: TestSet, modes: ModeSet, channels: int, basis: Sequence[int] | None) -> None:
    if basis is not None:
        needed, why = 2 * len(basis), f"{len(basis)} basis modes"
    else:
        band = max(int((modes.freq_hz <= test.freq_hz.max(initial=0.0)).sum()), test.count, 1)
        needed = 2 * band
        why = f"the {band} modes that may be in the measured shapes"
    if channels < needed or not test.count:
        raise RefusedError(
            f"test '{test.name}' cannot be expanded: too few channels for {why}",
            found=f"{channels} channels in use, {test.count} modes",
            expected=f"at least {needed} channels, two for each",
            do="measure in more places or directions, or keep fewer modes"
            if basis is None
            else "name fewer modes for the basis",
        )


def _named(test: TestSet, modes: ModeSet, rows: Array, basis: Sequence[int]) -> list[int]:
    """Indices of the modes named, checked."""
    picked = [modes.index_of(int(number), modes.source or "analysis") for number in basis]
    if not picked or len(set(picked)) != len(picked):
        raise InputError("the basis of an expansion names no mode, or one twice", found=f"{list(basis)}")
    unit = rows[picked] / np.maximum(np.linalg.norm(rows[picked], axis=1, keepdims=True), 1e-300)
    size = np.linalg.svd(unit, compute_uv=False)
    if size[-1] <= _SINGULAR * size[0]:
        raise RefusedError(
            f"test '{test.name}': its channels cannot tell the basis modes {', '.join(map(str, basis))} apart",
            do="name fewer modes for the basis, or measure in more places",
        )
    return picked


def _choose(y: Array, rows: Array, gram: Array) -> tuple[Step, ...]:
    """The basis of one shape y (c,) of rms 1 among ``rows`` (k, c); the last step is the one not taken, if any."""
    worth = np.exp(-2 * np.log(max(len(rows), 2)) / len(y))
    chosen: list[int] = []
    steps: list[Step] = []
    least = 1.0
    while len(chosen) < min(len(y) // 2, len(rows)) and least > EXACT**2:
        tried = [(_expected(y, rows, [*chosen, j], gram), j) for j in range(len(rows)) if j not in chosen]
        square, best = min(tried)
        taken = not chosen or square <= worth * least  # a shape like no mode stands on the nearest one all the same
        if np.isfinite(square):
            steps.append(Step(best + 1, float(np.sqrt(square)), bool(taken)))
        if not taken or not np.isfinite(square):
            break
        chosen.append(best)
        least = square
    if not chosen:  # not even one mode can be left-out tested: take the nearest
        like = np.abs(rows.conj() @ y) / np.maximum(np.linalg.norm(rows, axis=1), 1e-300)
        steps = [Step(int(like.argmax()) + 1, np.inf, True)]
    return tuple(steps)


def _expected(y: Array, rows: Array, chosen: list[int], gram: Array) -> float:
    """Mean square error expected on the mesh of y on the rows ``chosen``; infinite for what cannot be told apart."""
    part = rows[chosen]
    product = part.conj() @ part.T
    scale = 1 / np.sqrt(np.maximum(np.diag(product).real, 1e-300))
    strength, axes = np.linalg.eigh(product * np.outer(scale, scale))
    if strength[0] <= _SINGULAR**2 * strength[-1]:
        return np.inf
    left, _ = _left_out(y, part)
    if np.isnan(left).any():
        return np.inf
    turned = scale[:, None] * axes / np.sqrt(strength)
    spread = np.einsum("ka,kl,la->", turned.conj(), gram[np.ix_(chosen, chosen)], turned).real
    return float(np.mean(np.abs(left) ** 2) * (1 + spread))


def _left_out(y: Array, part: Array) -> tuple[Array, Array]:
    """(c,) y minus what the other channels predict by the modes ``part`` (k, c), NaN where they say nothing; and (k,)
    the coefficients from all channels."""
    scale = 1 / np.maximum(np.linalg.norm(part, axis=1), 1e-300)
    axes, upper = np.linalg.qr((part * scale[:, None]).T)
    along = axes.conj().T @ y
    free = 1 - (np.abs(axes) ** 2).sum(axis=1)
    alone = free <= _ALONE
    left = np.where(alone, np.nan, (y - axes @ along) / np.where(alone, 1.0, free))
    return left, scale * np.linalg.solve(upper, along)


def _error_on_mesh(part: Array, left: Array, gram: Array) -> float:
    """Root mean square on the mesh of what the left-out residuals ``left`` (c,) say of the error of the coefficients
    of the modes ``part`` (k, c); ``gram`` (k, k) as of ``_gram``."""
    moved = np.linalg.pinv(part.T) * left  # (k, c): by how much the coefficients change when a channel is left out
    return float(np.sqrt(max(np.einsum("kc,kl,lc->", moved.conj(), gram, moved).real, 0.0)))


def _gram(moved: Array) -> Array:
    """(k, k) mean product of the modes' components over all nodes and directions: what the coefficients' uncertainty
    becomes on the mesh."""
    flat = moved.reshape(len(moved), -1)
    return (flat.conj() @ flat.T) / flat.shape[1]


def _rms(readings: Array) -> Array:
    return np.sqrt((np.abs(readings) ** 2).mean(axis=1)) if readings.shape[1] else np.zeros(len(readings))


def _sentence(facts: dict[str, Any]) -> str:
    one = facts["basis_count"] == 1
    modes = "analysis mode" + ("" if one else "s")
    how = "named" if facts["basis_given"] else f"chosen one by one, at most {facts['most_used']} for a shape"
    text = (
        f"Test {facts['test']}: {facts['mode_count']} measured shapes are expanded from {facts['channels']} channels "
        f"on {facts['basis_count']} {modes} ({how}; {facts['most_basis_modes']} would be allowed); a channel left "
        f"out is predicted to within {facts['left_out_error']:.1%} of the mode's typical reading"
    )
    if facts["worst_channels"]:
        worst = facts["worst_channels"][0]
        text += f", worst at {worst['channel']} ({worst['left_out_error']:.1%})"
    if facts["hardly_explained"]:
        listed = ", ".join(map(str, facts["hardly_explained"]))
        text += (
            f"; mode {listed} is hardly explained by the basis"
            if len(facts["hardly_explained"]) == 1
            else (f"; modes {listed} are hardly explained by the basis")
        )
    return text + "; what the basis cannot show is missing."


__all__ = ["Expansion", "Step", "expand"]
