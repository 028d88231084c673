"""Fixing what an eigen-solver leaves open: the basis of repeated frequencies, rigid-body modes, signs."""

from __future__ import annotations

from itertools import pairwise
from typing import Any

import numpy as np
import scipy.linalg as sl

from viewer.model.arrays import Array

REPEATED = 1e-6  # relative gap of frequencies below which modes count as repeated
_TIE = 1e-6  # relative difference below which two components are equally large
_ROUNDING = 200 * np.finfo(float).eps


def settle_modes(
    values: Array, vectors: Array, stiffness: Any, mass: Any, rigid: Array, wanted: int
) -> tuple[Array, Array]:
    """At most ``wanted`` eigenpairs in a form that does not depend on the solver.

    values (m,), vectors (n, m) from the solver, somewhat more than wanted; rigid (n, 6) the rigid motions.
    One Rayleigh–Ritz step makes the vectors M-orthonormal and the values Rayleigh quotients. A value within
    rounding of its own evaluation, φᵀKφ ≤ 200 ε |φ|ᵀ|K||φ|, is a rigid-body mode and becomes 0. Each set of
    repeated frequencies gets the basis that :func:`_aligned` fixes; signs make the largest component positive.
    """
    values, vectors = _ritz(vectors, stiffness, mass)
    values = np.where(values <= rounding_of(stiffness, vectors), 0.0, values)
    out = np.empty_like(vectors)
    for members in clusters(np.sqrt(values)):
        block = vectors[:, members]
        out[:, members] = _aligned(block, mass, rigid) if block.shape[1] > 1 else block
    out = out[:, :wanted]
    return values[:wanted], out * _signs(out)


def rounding_of(stiffness: Any, vectors: Array) -> Array:
    """(m,) bounds on the rounding of φᵀKφ, 200 ε |φ|ᵀ|K||φ|, of the columns of ``vectors``."""
    size = np.abs(vectors)
    return _ROUNDING * np.einsum("nm,nm->m", size, abs(stiffness) @ size)


def clusters(frequencies: Array, gap: float = REPEATED) -> list[slice]:
    """Runs of ascending frequencies whose neighbours differ by less than ``gap`` of their value; zeros are one."""
    apart = np.diff(frequencies) > gap * frequencies[1:]
    edges = [0, *(np.nonzero(apart)[0] + 1).tolist(), len(frequencies)]
    return [slice(a, b) for a, b in pairwise(edges)]


def _ritz(vectors: Array, stiffness: Any, mass: Any) -> tuple[Array, Array]:
    reduced_mass, reduced = vectors.T @ (mass @ vectors), vectors.T @ (stiffness @ vectors)
    values, turn = sl.eigh(0.5 * (reduced + reduced.T), 0.5 * (reduced_mass + reduced_mass.T))
    return values, vectors @ turn


def _aligned(block: Array, mass: Any, rigid: Array) -> Array:
    """The basis of span(block) (M-orthonormal, (n, r)) that depends on the span alone.

    First, as far as the span holds any of them, the rigid motions in the order given, each made M-orthogonal to
    those before. Then, repeatedly: the member that is largest at the component where the span reaches furthest,
    made M-orthogonal to the rest; among equal components the first one counts.
    """
    rank = block.shape[1]
    chosen: list[Array] = []  # unit coordinates in the given basis

    def rest(coordinates: Array) -> Array:
        for other in chosen + chosen:
            coordinates = coordinates - other * (other @ coordinates)
        return coordinates

    if rigid.size:
        inside = block.T @ (mass @ rigid)
        whole = np.sqrt(np.abs(np.einsum("nr,nr->r", rigid, mass @ rigid)))
        for column, length in zip(inside.T, whole, strict=True):
            left = rest(column)
            if len(chosen) < rank and np.linalg.norm(left) > 1e-3 * length > 0:
                chosen.append(left / np.linalg.norm(left))
    while len(chosen) < rank:
        remaining = block.copy()
        for other in chosen:
            remaining -= np.outer(block @ other, other)
        reach = np.linalg.norm(remaining, axis=1)
        first = int(np.argmax(reach >= (1 - _TIE) * reach.max()))
        left = rest(block[first].copy())
        chosen.append(left / np.linalg.norm(left))
    return block @ np.stack(chosen, axis=1)


def _signs(vectors: Array) -> Array:
    """±1 a column that makes the first of its largest components positive."""
    size = np.abs(vectors)
    first = np.argmax(size >= (1 - _TIE) * size.max(axis=0), axis=0)
    return np.where(vectors[first, np.arange(vectors.shape[1])] < 0, -1.0, 1.0)
