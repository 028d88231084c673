"""Test against analysis, design against design: MAC, its counterpart by coordinate, and the modal scale factor."""

from __future__ import annotations

import numpy as np

from viewer.model.arrays import Array


def mac(a: Array, b: Array) -> Array:
    """Modal assurance criterion, (modes of a, modes of b), of shapes given as rows (modes, coordinates).

    |aᴴb|² / (aᴴa · bᴴb) with the complex-conjugate transpose. Allemang & Brown, IMAC 1 (1982) 110.
    """
    a, b = np.atleast_2d(a), np.atleast_2d(b)
    cross = np.abs(a.conj() @ b.T) ** 2
    size = np.outer(np.vecdot(a, a).real, np.vecdot(b, b).real)
    return np.divide(cross, size, out=np.zeros(cross.shape), where=size > 0)


def comac(a: Array, b: Array) -> Array:
    """Coordinate modal assurance criterion (coordinates,) of paired shapes, rows of a and b (modes, coordinates).

    (Σ|a b*|)² / (Σ|a|² Σ|b|²) over the pairs; 0 where one of the two does not move.
    Lieven & Ewins, IMAC 6 (1988) 690.
    """
    a, b = np.atleast_2d(a), np.atleast_2d(b)
    size = (np.abs(a) ** 2).sum(axis=0) * (np.abs(b) ** 2).sum(axis=0)
    cross = np.abs(a * b.conj()).sum(axis=0) ** 2
    return np.divide(cross, size, out=np.zeros(cross.shape), where=size > 0)


def modal_scale_factor(a: Array, b: Array) -> complex:
    """bᴴa / bᴴb: what ``b`` is multiplied by to come closest to ``a`` (Allemang & Brown 1982)."""
    size = np.vdot(b, b)
    return complex(np.vdot(b, a) / size) if size != 0 else 0j
