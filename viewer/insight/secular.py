"""Modes after one spring more: the secular equation of a rank-one change.

In mass-normalised modes with eigenvalues λ_i, a spring of stiffness k that mode i stretches by a_i turns the problem
into diag(λ) + k a aᵀ, whose determinant vanishes where

    1 + k Σ a_i² / (λ_i − λ) = 0

(Golub G.H., Some modified matrix eigenvalue problems, SIAM Rev. 15 (1973) 318). The roots are taken as eigenvalues of
that small matrix, which also copes with modes the spring does not stretch and with repeated ones.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from viewer.model.arrays import Array

_RIGID = 1e6  # times the largest eigenvalue: k a·a of a spring that stands for a rigid one


@dataclass(frozen=True, eq=False)
class Raised:
    """Modes of p systems after the change: roots (p, n) ascending and shares (p, n, n) of each old mode (last but
    one axis) in each new one (last axis); the shares of an old mode add up to 1. A rigid spring takes one mode away:
    its root is ∞, its shares 0."""

    roots: Array
    shares: Array

    def followed(self, index: int) -> tuple[Array, Array]:
        """(p,) position of the new mode that holds most of old mode ``index``, and that share."""
        which = self.shares[:, index].argmax(axis=1)
        return which, self.shares[np.arange(len(which)), index, which]


def raised(poles: Array, stretch: Array, stiffness: Array) -> Raised:
    """Eigenvalues and vectors after springs ``stiffness`` (p,) N/m, ∞ for rigid ones, one in each of p systems.

    poles (p, n) or (n,) eigenvalues, s⁻², stretch (p, n) of the spring by each mode, 1/√kg.
    """
    stretch = np.atleast_2d(stretch)
    poles = np.broadcast_to(poles, stretch.shape)
    size = np.einsum("pi,pi->p", stretch, stretch)
    top = np.abs(poles).max(axis=1)
    rigid = _RIGID * np.divide(top, size, out=np.zeros(len(size)), where=size > 0)
    gone = np.isinf(np.broadcast_to(stiffness, size.shape)) & (size > 0)
    stiffness = np.minimum(np.broadcast_to(stiffness, size.shape), rigid)
    matrices = stiffness[:, None, None] * stretch[:, :, None] * stretch[:, None, :]
    diagonal = np.arange(stretch.shape[1])
    matrices[:, diagonal, diagonal] += poles
    roots, vectors = np.linalg.eigh(matrices)
    shares = vectors**2
    roots[gone, -1], shares[gone, :, -1] = np.inf, 0.0
    return Raised(roots, shares)
