"""Test against analysis, design against design: MAC, its counterparts by coordinate, products weighted by mass.

Shapes are rows (modes, coordinates), real or complex.
"""

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


def auto_mac(a: Array) -> Array:
    """(modes, modes) MAC of the shapes with one another: what lies beside the diagonal tells how far the coordinates
    can tell two modes apart."""
    return mac(a, a)


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


def ecomac(a: Array, b: Array) -> Array:
    """Enhanced coordinate criterion (coordinates,) of paired shapes, rows of a and b: 0 where they agree.

    Σ|a − b| / 2L over the L pairs, a with its largest component at 1, b brought to a by the modal scale factor.
    Unlike COMAC it sees signs: a coordinate that always moves the other way, at the largest component, has 1.
    Hunt D.L., Application of an enhanced coordinate modal assurance criterion, IMAC 10 (1992) (from memory; the
    scaling of the shapes is ours). 0 everywhere without a pair.
    """
    a, b = np.atleast_2d(a), np.atleast_2d(b)
    out = np.zeros(a.shape[1])
    for one, two in zip(a, b, strict=True):
        size = np.abs(one).max(initial=0.0)
        if size > 0:
            out += np.abs(one - modal_scale_factor(one, two) * two) / (2 * len(a) * size)
    return out


def cross_orthogonality(a: Array, mass: Array, b: Array) -> Array:
    """(modes of a, modes of b) aᴴMb / √(aᴴMa · bᴴMb) with ``mass`` (coordinates, coordinates): signed, complex for
    complex shapes; 0 for a shape without modal mass. Two modes of one structure have 0, whatever their MAC."""
    a, b = np.atleast_2d(a), np.atleast_2d(b)
    cross = a.conj() @ mass @ b.T
    size = np.outer(np.vecdot(a, a @ mass.T).real, np.vecdot(b, b @ mass.T).real)
    return np.divide(cross, np.sqrt(np.maximum(size, 0)), out=np.zeros_like(cross), where=size > 0)
