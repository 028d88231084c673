"""How far given shapes are from being modes of our matrices, and where: the residual of Kφ − λMφ.

With r that residual on the free directions and A = K + αM, the residual share is rᵀA⁻¹r / φᵀAφ. Written in the
model's own modes, φ = Σ cᵢφᵢ, this is Σ cᵢ²(λᵢ − λ)²/(λᵢ + α) over Σ cᵢ²(λᵢ + α): the share of energy that does not
belong to a mode of that frequency. It does not depend on the size of the shape, is second order in small errors,
and cannot cancel, as closure can. The inverse is needed: weighed by the diagonal of K instead, the residual of a
smooth wrong shape shrinks with the mesh. The term αM makes A regular for free bodies; with α about λ no part of the
spectrum counts for more than its own share (were α small, a trace of a low mode in a high one would count manifold).
α is λ rounded to a power of 4, so that a few factorisations serve many modes and a mode's figure does not depend on
which others are asked for.

x = A⁻¹r is the displacement by which the shape misses being a mode; the energy of x by cell shows where. In models
too large to factorise A, x is searched for and the share is found from below (``descent.py``).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Protocol

import numpy as np
import scipy.sparse as sp

from viewer.jobs import SILENT, Progress, in_child
from viewer.mechanics.assembly import Layout, System, assemble_layout
from viewer.mechanics.constraints import some_ids
from viewer.mechanics.descent import STEPS, Found, Zones, search
from viewer.mechanics.factor import AT_ONCE, factorise
from viewer.mechanics.lean import LeanMatrices, room
from viewer.mechanics.patch import rigid_fields
from viewer.mechanics.sums import real_parts, strain_and_kinetic
from viewer.model.arrays import Array

FACTOR_LIMIT = 200_000  # free directions up to which A is factorised; beyond, x is searched for
MOST_ROOM = 4 * 10**9  # bytes of the matrices for that search
_NUMBERS = 8_000_000  # in the vectors searched for at a time; each takes the room of nine
_NODES = 1 << 17  # nodes whose rigid motions are formed at a time
_ENOUGH = 2e-4  # of the whole energy: what a search may leave open


def flexible_share(layout: Layout, vectors: Array) -> Array:
    """(k,) share of the mean square translation of the nodes that is beyond their best rigid motion.

    From sums over the nodes alone: with F their rigid motions, the rigid share takes FᵀF and Fᵀv.
    """
    nodes = np.nonzero((layout.dof[:, :3] >= 0).any(axis=1))[0]
    centre = layout.points[nodes].mean(axis=0)
    radius = max(float(np.sqrt(((layout.points[nodes] - centre) ** 2).sum(axis=1).mean())), 1e-300)
    gram, pushed, whole = np.zeros((6, 6)), np.zeros((6, len(vectors)), vectors.dtype), np.zeros(len(vectors))
    for start in range(0, len(nodes), _NODES):
        rows = nodes[start : start + _NODES]
        places = layout.dof[rows, :3].ravel()
        fields = rigid_fields((layout.points[rows] - centre) / radius, np.zeros(3)).reshape(-1, 6)[places >= 0]
        moved = vectors[:, places[places >= 0]]
        gram += fields.T @ fields
        pushed += fields.T @ moved.T
        whole += np.sum(np.abs(moved) ** 2, axis=1)
    strength, axes = np.linalg.eigh(gram)
    seen = strength > 1e-12 * strength[-1]
    rigid = np.sum(np.abs(axes[:, seen].T @ pushed) ** 2 / strength[seen, None], axis=0)
    return np.maximum(1 - rigid / np.maximum(whole, 1e-300), 0.0)


@dataclass(frozen=True, eq=False)
class Residuals:
    """Residuals of k vectors.

    share    (k,) of the energy: what belongs to no mode of that frequency; NaN where the model is too large
    missing  (k,) by how much the share may be too low: 0 in factorised models, infinite where ``share`` is NaN
    by_cell  (k, n_cells) the share by cell: adds up to it but for what springs and lumped masses hold
    """

    share: Array
    missing: Array
    by_cell: Array

    def cautions(self, indices: Array, bound: float) -> tuple[str, ...]:
        """What leaves open whether modes ``indices`` (k,) keep to the bound of trust; nothing when all is told."""
        unknown, share = np.isnan(self.share), np.nan_to_num(self.share)
        words = []
        if unknown.any():
            words.append(
                f"the model is too large to judge modes {some_ids(indices[unknown] + 1)} by their residual: their "
                "energies are shown and not trusted; judge the design on a coarser mesh"
            )
        for at in np.nonzero(~unknown & (share <= bound) & (share + self.missing > bound))[0]:
            words.append(
                f"the residual of mode {indices[at] + 1} is at least {self.share[at]:.2%}; how much more was not "
                f"found in {STEPS} steps, so that its energies are not trusted"
            )
        return tuple(words)


def residuals(layout: Layout, vectors: Array, omega: Array, progress: Progress = SILENT) -> Residuals:
    """Residuals of the vectors (k, n_dof) as elastic modes of ω (k,) rad/s.

    Up to 200 000 free directions A is factorised, in a process that can be killed unless that takes an instant.
    Beyond, shares are lower bounds, and ``missing`` estimates from how fast the search gains what they lack. The
    search ends when that is 2 % of the share or 0.02 % of the whole; against factorised models bodies and bars came
    within 4 % of the share or 0.02 % of the whole after 16 to 40 steps, walls of single flat cells within 8 % after
    some hundred. Models whose matrices take more than ``MOST_ROOM`` are not judged.
    """
    small = len(layout.free) <= FACTOR_LIMIT
    if small and len(layout.free) > AT_ONCE:
        return in_child(_factorised, layout, vectors, omega, progress=progress, stage="residual")
    if small:
        return _factorised(layout, vectors, omega, progress)
    if not isinstance(layout, System) and room(layout) > MOST_ROOM:
        unknown = np.full(len(vectors), np.nan)
        cells = layout.design.mesh.n_cells
        return Residuals(unknown, np.full(len(vectors), np.inf), np.broadcast_to(np.nan, (len(vectors), cells)))
    if isinstance(layout, System):
        return _by_cell(layout, _missed(layout, _Assembled(layout), vectors, omega, progress), progress)
    return _by_cell(layout, _missed(layout, _Lean(layout, progress), vectors, omega, progress), progress)


def _factorised(layout: Layout, vectors: Array, omega: Array, progress: Progress = SILENT) -> Residuals:
    system = layout if isinstance(layout, System) else assemble_layout(layout, progress)
    return _by_cell(layout, _missed(layout, _Assembled(system), vectors, omega, progress), progress)


Solver = Callable[[Array, Array], Found]  # of columns (n_free, k), and energies (k,) that may stay missing


class _Matrices(Protocol):
    def stiffness(self, columns: Array) -> Array: ...

    def mass(self, columns: Array) -> Array: ...

    def solver(self, alpha: float, progress: Progress) -> Solver: ...


@dataclass
class _Assembled:
    system: System

    def stiffness(self, columns: Array) -> Array:
        return self.system.K @ columns

    def mass(self, columns: Array) -> Array:
        return self.system.M @ columns

    def solver(self, alpha: float, progress: Progress) -> Solver:
        inner = self.system.restrict(sp.csr_array(self.system.K + alpha * self.system.M))
        progress.tick("residual")
        if len(self.system.free) > FACTOR_LIMIT:
            scale = 1 / inner.diagonal()[:, None]
            return lambda right, enough: search(
                lambda way: inner @ way, lambda rest: scale * rest, right, enough, progress
            )
        factor = factorise(inner, definite=True)

        def solve(right: Array, enough: Array) -> Found:
            found = factor.solve(right).reshape(right.shape)
            # 2xᵀr − xᵀAx: equal to rᵀA⁻¹r for the exact x and below it for any other.
            energy = 2 * np.sum(right * found, axis=0) - np.sum(found * (inner @ found), axis=0)
            return Found(found, energy, np.zeros(len(energy)))

        return solve


class _Lean(LeanMatrices):
    def __init__(self, layout: Layout, progress: Progress) -> None:
        super().__init__(layout, progress)
        self._layout, self._zones = layout, Zones(layout, self, progress)

    def solver(self, alpha: float, progress: Progress) -> Solver:
        correct = self._zones.correction(self, alpha, progress)

        def push(way: Array) -> Array:
            return self._layout.force(self.shifted(self._layout.extend(way.T).T, alpha).T).T

        return lambda right, enough: search(push, correct, right, enough, progress)


@dataclass(frozen=True, eq=False)
class _Missed:
    """α (k,); energies (p, k) of vectors, of their residuals, and what these may lack; x (p, k, n_dof)."""

    alpha: Array
    whole: Array
    energy: Array
    missing: Array
    x: Array


def _missed(layout: Layout, matrices: _Matrices, vectors: Array, omega: Array, progress: Progress) -> _Missed:
    # A shape that moves where the design is held, or apart from what it follows, cannot be its mode: that motion is
    # taken away, and what it leaves behind shows as residual beside the place.
    parts = real_parts(layout.extend(vectors[:, layout.free]))  # (p, k, n_dof)
    alpha = 4.0 ** np.rint(np.log(omega**2) / np.log(4.0))
    whole, energy, missing = np.zeros((3, len(parts), len(vectors)))
    x = np.empty_like(parts)
    for shift in np.unique(alpha):
        same = np.nonzero(alpha == shift)[0]
        solve = matrices.solver(shift, progress)
        most = max(1, _NUMBERS // layout.n_dof)
        for start in range(0, len(same), most):
            which = same[start : start + most]
            for part in range(len(parts)):
                moved = parts[part, which].T
                right, heavy = matrices.stiffness(moved), matrices.mass(moved)
                whole[part, which] = np.sum(moved * (right + shift * heavy), axis=0)
                right = layout.force((right - heavy * omega[which] ** 2).T).T
                del moved, heavy
                found = solve(np.ascontiguousarray(right), _ENOUGH * np.sum(whole[:, which], axis=0))
                energy[part, which], missing[part, which] = found.energy, found.missing
                x[part, which] = layout.extend(found.columns.T)
    return _Missed(alpha, whole, energy, missing, x)


def _by_cell(layout: Layout, missed: _Missed, progress: Progress) -> Residuals:
    whole, shape = missed.whole.sum(axis=0), missed.x.shape[:2]
    strain, moving = strain_and_kinetic(layout, missed.x.reshape(-1, layout.n_dof), progress)
    by_cell = sum((strain + np.tile(missed.alpha, shape[0])[:, None] * moving).reshape(*shape, -1))
    return Residuals(
        missed.energy.sum(axis=0) / whole, missed.missing.sum(axis=0) / whole, 2 * by_cell / whole[:, None]
    )
