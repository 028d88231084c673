"""What the modes left out of a mode set still give way between two footprints.

The flexibility seen by a pair of equal and opposite forces in the line between two footprints is Σ a_i² / (λ_i − λ)
over all modes. Of the modes not known the sum is had from one static solution: with A = K + αM and x = A⁻¹ b,

    R = bᵀx − Σ_known a_i² / (λ_i + α),        S = xᵀMx − Σ_known a_i² / (λ_i + α)²

(residual flexibility: MacNeal R.H., A hybrid method of component mode synthesis, Computers & Structures 1 (1971) 581;
from memory). The small α > 0 makes A regular for free bodies: such forces balance, so that no rigid motion takes part
and what is left is their inertia relief. With both R and S the unknown modes act, to second order in λ + α, as one
mode more at λ* = R/S − α whose stretch is a* = R / √S.
"""

from __future__ import annotations

from copy import copy

import numpy as np
import scipy.sparse as sp

from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import System
from viewer.mechanics.factor import Factor, factorise
from viewer.model.arrays import Array

_ALPHA = 0.1  # of the first elastic eigenvalue
_RIGID = 1e-6  # of the highest known eigenvalue, below which a given mode is taken as rigid
_COLUMNS = 48  # right-hand sides at a time
_NOTHING = 1e-9  # share of the flexibility below which nothing is left


class Truncation:
    """The residual flexibility of a system beyond known modes.

    poles (m,) eigenvalues s⁻² of the known modes, rigid-body modes as 0.
    """

    def __init__(self, system: System, poles: Array, progress: Progress = SILENT) -> None:
        progress.tick("factorising")
        self.system, self.poles = system, poles
        self.alpha = _ALPHA * float(poles[poles > _RIGID * poles.max()].min())
        self.mass = system.restrict(system.M)
        matrix = sp.csr_array(system.restrict(system.K) + self.alpha * self.mass)
        self.factor: Factor = factorise(matrix, definite=True)

    def knowing(self, poles: Array) -> Truncation:
        """The same system beyond other known modes."""
        other = copy(self)
        other.poles = poles
        return other

    def between_all(self, nodes: list[Array], known: Array, progress: Progress = SILENT) -> Array:
        """(3f, 3f) residual flexibility, m/N, of the mean translations of f footprints under forces spread evenly
        over their nodes; ``known`` (m, f, 3) their mean translations in the known modes."""
        loads = self._loads([(rows, axis) for rows in nodes for axis in np.eye(3)])
        whole = np.empty((loads.shape[0], loads.shape[0]))
        for at in range(0, loads.shape[0], _COLUMNS):
            progress.tick("flexibility", at, loads.shape[0])
            part = slice(at, at + _COLUMNS)
            whole[:, part] = loads @ self._solve(loads[part])
        flat = known.reshape(len(known), -1)
        return whole - (flat / (self.poles + self.alpha)[:, None]).T @ flat

    def of_pairs(self, ends: list[tuple[Array, Array]], directions: Array, known: Array) -> tuple[Array, Array]:
        """Eigenvalue λ* (p,) and stretch a* (p,) of the mode that stands for the unknown ones, for struts between the
        footprints ``ends`` along unit ``directions`` (p, 3); ``known`` (p, m) their stretch in the known modes.
        Where nothing is left, a* is 0 and λ* the largest known eigenvalue."""
        loads = sp.csr_array(
            self._loads([(second, axis) for (_, second), axis in zip(ends, directions, strict=True)])
            - self._loads([(first, axis) for (first, _), axis in zip(ends, directions, strict=True)])
        )
        found = self._solve(loads)  # (n_free, p)
        whole = np.asarray(loads.multiply(found.T).sum(axis=1)).ravel()
        spread = np.einsum("np,np->p", found, self.mass @ found)
        shifted = self.poles + self.alpha
        residual = whole - (known**2 / shifted).sum(axis=1)
        second = spread - (known**2 / shifted**2).sum(axis=1)
        top = float(self.poles.max())
        # λ* is a mean of eigenvalues not known, weighted: it cannot lie below the known ones but for rounding
        left = (residual > _NOTHING * whole) & (second > 0)
        pole = np.where(left, residual / np.where(left, second, 1.0) - self.alpha, top)
        pole = np.maximum(pole, top)
        return pole, np.where(left, np.sqrt(np.maximum(residual, 0) * (pole + self.alpha)), 0.0)

    def _loads(self, items: list[tuple[Array, Array]]) -> sp.csr_array:
        """(k, n_free) a unit force along an axis, spread evenly over the nodes of a footprint, for each item."""
        dof = self.system.dof
        rows = np.concatenate([np.full(3 * len(nodes), row) for row, (nodes, _) in enumerate(items)])
        columns = np.concatenate([dof[nodes, :3].ravel() for nodes, _ in items])
        values = np.concatenate([np.tile(axis / len(nodes), len(nodes)) for nodes, axis in items])
        forces = sp.csr_array((values, (rows, columns)), shape=(len(items), self.system.n_dof))
        return sp.csr_array(self.system.force(forces))

    def _solve(self, loads: sp.csr_array) -> Array:
        return self.factor.solve(np.asfortranarray(loads.T.toarray())).reshape(loads.shape[::-1])
