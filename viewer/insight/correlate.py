"""Test against analysis, design against design: MAC and the modal scale factor on a common support."""

from __future__ import annotations

import numpy as np
from scipy.spatial import cKDTree

from viewer.errors import RefusedError
from viewer.model.arrays import Array
from viewer.model.mesh import Mesh

NEAR = 0.02  # points further apart than this share of the diagonal are not the same place


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


def common_support(first: Mesh, second: Mesh) -> tuple[Array, Array]:
    """Node rows of ``first`` and of ``second`` that lie at the same place: (k,) and (k,).

    Nearest used nodes within 2 % of the smaller diagonal. Good for signs and phases of designs that differ little;
    ``RefusedError`` when fewer than three places are shared.
    """
    mine, theirs = first.used_nodes, second.used_nodes
    distance, nearest = cKDTree(second.points[theirs]).query(first.points[mine])
    close = distance <= NEAR * min(first.diagonal, second.diagonal)
    if close.sum() < 3:
        raise RefusedError(
            "the two designs share no common support: their meshes do not lie at the same place",
            do="give both meshes in the same coordinate system and the right unit of length",
        )
    return mine[close], theirs[nearest[close]]


def shared_turn(first: Mesh, shape_a: Array, second: Mesh, shape_b: Array) -> complex:
    """The unit complex factor that brings ``shape_b`` (on ``second``) into sign and phase with ``shape_a``."""
    mine, theirs = common_support(first, second)
    factor = modal_scale_factor(shape_a[mine].ravel(), shape_b[theirs].ravel())
    return factor / abs(factor) if abs(factor) > 0 else 1.0 + 0.0j
