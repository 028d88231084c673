"""Quadrature rules on the reference cells.

Lines, quads and hexahedra take Gauss–Legendre products, wedges triangle × line. Triangles and tetrahedra take
the symmetric rules of low order (Stroud 1971; Radon 1948 for the 7-point triangle; Walkington 2000 for the
14-point tetrahedron), above that Stroud's conical products with Gauss–Jacobi points, as do pyramids.
"""

from __future__ import annotations

import functools
import itertools
from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[Any]
Rule = tuple[Array, Array]


@functools.cache
def rule(family: str, order: int) -> Rule:
    """Points (q, dim) and positive weights (q,) exact to degree ``order`` on the family's reference cell."""
    n = max(order, 0) // 2 + 1
    gauss = _jacobi(n, 0)
    if family == "vertex":
        points, weights = np.zeros((1, 0)), np.ones(1)
    elif family in ("line", "quad", "hex"):
        points, weights = _product(*[gauss] * {"line": 1, "quad": 2, "hex": 3}[family])
    elif family == "tri":
        points, weights = _triangle(order, n)
    elif family == "tet":
        points, weights = _tetrahedron(order, n)
    elif family == "wedge":
        points, weights = _product(rule("tri", order), gauss)
    elif family == "pyramid":
        points, weights = _product(gauss, gauss, _unit(_jacobi(n, 2), 2))
        points[:, :2] *= 1.0 - points[:, 2:]
    else:
        raise KeyError(family)
    points.flags.writeable = weights.flags.writeable = False
    return points, weights


def _jacobi(n: int, alpha: int) -> Rule:
    """Gauss points (n, 1) on [−1, 1] for the weight (1 − x)^alpha, by Golub and Welsch (1969)."""
    k = np.arange(n, dtype=float)
    twice = 2 * k + alpha
    diagonal = np.where(twice > 0, -(alpha**2) / np.where(twice > 0, twice * (twice + 2), 1.0), 0.0)
    if alpha:
        diagonal[0] = -alpha / (alpha + 2.0)
    j = k[1:]
    twice = 2 * j + alpha
    off = np.sqrt(4 * j**2 * (j + alpha) ** 2 / (twice**2 * (twice + 1) * (twice - 1)))
    points, vectors = np.linalg.eigh(np.diag(diagonal) + np.diag(off, 1) + np.diag(off, -1))
    return points[:, None], vectors[0] ** 2 * 2.0 ** (alpha + 1) / (alpha + 1)


def _unit(line: Rule, alpha: int) -> Rule:
    """The rule moved from [−1, 1] to [0, 1], its weight function to (1 − x)^alpha there."""
    return (line[0] + 1) / 2, line[1] / 2.0 ** (alpha + 1)


def _product(*rules: Rule) -> Rule:
    """Tensor product; the first rule's points vary fastest."""
    points, weights = rules[0]
    for more, factor in rules[1:]:
        count = len(points)
        points = np.hstack([np.tile(points, (len(more), 1)), np.repeat(more, count, axis=0)])
        weights = (factor[:, None] * weights).ravel()
    return points, weights


def _orbit(*coordinates: float) -> list[tuple[float, ...]]:
    """The points whose barycentric coordinates are the permutations of ``coordinates``."""
    return [p[1:] for p in sorted(set(itertools.permutations(coordinates)), reverse=True)]


def _orbits(measure: float, *orbits: tuple[float, list[tuple[float, ...]]]) -> Rule:
    points = np.array([p for _, orbit in orbits for p in orbit])
    return points, measure * np.array([w for w, orbit in orbits for _ in orbit])


def _triangle(order: int, n: int) -> Rule:
    if order <= 1:
        return _orbits(0.5, (1.0, _orbit(1 / 3, 1 / 3, 1 / 3)))
    if order == 2:
        return _orbits(0.5, (1 / 3, _orbit(2 / 3, 1 / 6, 1 / 6)))
    if order <= 5:
        root = np.sqrt(15.0)
        a, b = (6 - root) / 21, (6 + root) / 21
        return _orbits(
            0.5,
            (9 / 40, _orbit(1 / 3, 1 / 3, 1 / 3)),
            ((155 - root) / 1200, _orbit(1 - 2 * a, a, a)),
            ((155 + root) / 1200, _orbit(1 - 2 * b, b, b)),
        )
    points, weights = _product(_unit(_jacobi(n, 0), 0), _unit(_jacobi(n, 1), 1))
    points[:, :1] *= 1.0 - points[:, 1:]
    return points, weights


def _tetrahedron(order: int, n: int) -> Rule:
    if order <= 1:
        return _orbits(1 / 6, (1.0, _orbit(0.25, 0.25, 0.25, 0.25)))
    if order == 2:
        a = (5 - np.sqrt(5.0)) / 20
        return _orbits(1 / 6, (0.25, _orbit(1 - 3 * a, a, a, a)))
    if order <= 5:
        a, b, c = 0.31088591926330060980, 0.092735250310891226402, 0.045503704125649649492
        return _orbits(
            1 / 6,
            (0.11268792571801585080, _orbit(1 - 3 * a, a, a, a)),
            (0.073493043116361949544, _orbit(1 - 3 * b, b, b, b)),
            (0.042546020777081466438, _orbit(0.5 - c, 0.5 - c, c, c)),
        )
    points, weights = _product(_unit(_jacobi(n, 0), 0), _unit(_jacobi(n, 1), 1), _unit(_jacobi(n, 2), 2))
    points[:, :2] *= 1.0 - points[:, 2:]
    points[:, :1] *= 1.0 - points[:, 1:2] / (1.0 - points[:, 2:])
    return points, weights
