"""Jacobians, volumes, areas, lengths and the orientation of cells."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from viewer.cells.kinds import KINDS

Array = NDArray[Any]
_CHUNK = 500  # cells at a time: what the processor's cache holds


def jacobian_components(xyz: Array, gradient: Array) -> Array:
    """(3, dim, b, q) derivatives of position by reference coordinate, of cells ``xyz`` (b, n, 3) where their shape
    functions have the ``gradient`` (q, n, dim).

    Component first: every entry is one contiguous (b, q) array, on which the algebra of 3 × 3 matrices is quick.
    """
    return np.ascontiguousarray(np.moveaxis(xyz, 2, 0))[:, None] @ np.ascontiguousarray(gradient.transpose(2, 1, 0))


def jacobians(kind: str, xyz: Array, xi: Array) -> Array:
    """(b, q, 3, dim) derivatives of position by reference coordinate; cells ``xyz`` (b, n, 3), at ``xi`` (q, dim)."""
    return np.moveaxis(jacobian_components(xyz, KINDS[kind].gradient(xi)), (0, 1), (2, 3))


def cofactors(j: Array) -> Array:
    """(3, 3, …) cofactors of 3 × 3 matrices given component first: [i, d] = det J · ∂ξ_d/∂x_i."""
    out = np.empty(j.shape)
    for d in range(3):
        _cross_into(out[:, d], j[:, (d + 1) % 3], j[:, (d + 2) % 3])
    return out


def cross(a: Array, b: Array) -> Array:
    """Cross product over the first axis (3, …)."""
    out = np.empty(a.shape)
    _cross_into(out, a, b)
    return out


def _cross_into(out: Array, a: Array, b: Array) -> None:
    for i in range(3):
        j, k = (i + 1) % 3, (i + 2) % 3
        np.multiply(a[j], b[k], out=out[i])
        out[i] -= a[k] * b[j]


def determinants(j: Array) -> Array:
    """(…) determinants of 3 × 3 matrices given component first."""
    first = cross(j[:, 1], j[:, 2])
    return j[0, 0] * first[0] + j[1, 0] * first[1] + j[2, 0] * first[2]


def _densities(xyz: Array, gradient: Array) -> Array:
    """(b, q) measure per unit of reference measure; signed for solids. Arguments as ``jacobian_components``."""
    j = jacobian_components(xyz, gradient)
    dim = j.shape[1]
    if dim == 3:
        return determinants(j)
    side = cross(j[:, 0], j[:, 1]) if dim == 2 else j[:, 0]
    return np.sqrt((side**2).sum(axis=0))


def _order(kind: str) -> int:
    """Degree that integrates a solid's Jacobian exactly; curved surfaces and lines, whose root is no polynomial,
    take five more."""
    cell = KINDS[kind]
    simplex = cell.family in ("line", "tri", "tet")
    exact = cell.dim * (cell.degree - 1) if simplex else cell.dim * cell.degree - 1
    return exact if cell.dim == 3 or exact == 0 else exact + 5


def measures(kind: str, xyz: Array) -> Array:
    """(b,) volume (m³, negative when inside out), area (m²) or length (m) of cells ``xyz`` (b, n, 3); 0 for vertices.

    Exact for solids and straight-sided flat cells, quadrature for curved surfaces and lines.
    """
    xyz = np.asarray(xyz, float)
    if KINDS[kind].dim == 0:
        return np.zeros(len(xyz))
    points, weights = KINDS[kind].rule(_order(kind))
    gradient = KINDS[kind].gradient(points)
    out = np.empty(len(xyz))
    for start in range(0, len(xyz), _CHUNK):
        part = slice(start, start + _CHUNK)
        out[part] = _densities(xyz[part], gradient) @ weights
    return out


def inverted(kind: str, xyz: Array) -> Array:
    """Rows of the solid cells ``xyz`` (b, n, 3) whose Jacobian is not positive at some point of a 3-point rule.

    Positive means above 1e-12 of the largest in the same cell. For surfaces and lines: cells of no measure.
    """
    xyz = np.asarray(xyz, float)
    if KINDS[kind].dim == 0:
        return np.empty(0, np.int64)
    gradient = KINDS[kind].gradient(KINDS[kind].rule(4)[0])
    bad = np.zeros(len(xyz), bool)
    for start in range(0, len(xyz), _CHUNK):
        part = slice(start, start + _CHUNK)
        density = _densities(xyz[part], gradient)
        bad[part] = ~(density.min(axis=1) > 1e-12 * np.abs(density).max(axis=1))
    return np.nonzero(bad)[0]


def repair_orientation(kind: str, points: Array, nodes: Array) -> tuple[Array, int]:
    """Turn solid cells of negative volume right side out by mirroring their node order.

    points (p, 3), nodes (b, n) rows of points. Returns the nodes (a copy when anything changed) and the number
    of cells turned. Files in the wild carry wedges of both windings; the sign of the volume decides.
    Surfaces and lines come back as they are: their side is a matter of choice.
    """
    nodes = np.asarray(nodes)
    if KINDS[kind].dim < 3 or len(nodes) == 0:
        return nodes, 0
    turned = np.zeros(len(nodes), bool)
    for start in range(0, len(nodes), _CHUNK):
        part = slice(start, start + _CHUNK)
        turned[part] = measures(kind, points[nodes[part]]) < 0
    if not turned.any():
        return nodes, 0
    nodes = nodes.copy()
    nodes[turned] = nodes[turned][:, KINDS[kind].mirror]
    return nodes, int(turned.sum())
