"""Test against analysis, design against design: MAC and the modal scale factor."""

from __future__ import annotations

import numpy as np

from viewer.model.arrays import Array


def mac(a: Array, b: Array) -> Array:
    """Modal assurance criterion, (modes of a, modes of b), of shapes given as rows (modes, coordinates).

    |aᴴb|² / (aᴴa · bᴴb) with the complex-conjugate transpose. Allemang & Brown, IMAC 1 (1982) 110.
    """
    a, b = np.atleast_2d(a), np.atleast_2d(b)
    cross = np.abs(a.conj() @ b.T) ** 2
    aa, bb = (np.abs(a) ** 2).sum(axis=1), (np.abs(b) ** 2).sum(axis=1)
    size = np.outer(aa, bb)
    return np.divide(cross, size, out=np.zeros(cross.shape), where=size > 0)


def modal_scale_factor(a: Array, b: Array) -> complex:
    """bᴴa / bᴴb: what ``b`` is multiplied by to come closest to ``a`` (Allemang & Brown 1982)."""
    size = np.vdot(b, b)
    return complex(np.vdot(b, a) / size) if size != 0 else 0j
