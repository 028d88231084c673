"""The four-node flat shell in its own plane: stiffness by parts, batched over elements.

Bending and shear: Reissner–Mindlin with the transverse shear strains tied at the middle of the edges
(Dvorkin E.N., Bathe K.J., A continuum mechanics based four-node shell element for general non-linear
analysis, Eng. Comput. 1 (1984) 77). Membrane: four incompatible modes with the gradients corrected so that
the patch test holds (Taylor R.L., Beresford P.J., Wilson E.L., A non-conforming element for stress analysis,
Int. J. Numer. Meth. Eng. 10 (1976) 1211). Drilling: the misfit between the nodal rotation about the normal and
the in-plane rotation of the membrane, integrated with the shear modulus (Hughes T.J.R., Brezzi F., On drilling
degrees of freedom, Comput. Meth. Appl. Mech. Eng. 72 (1989) 105). The incompatible modes enter the drilling
misfit too; without them a long element bent in its plane would be stiffened by its drilling term. The modes are
condensed against membrane and drilling alone; the coupling of unsymmetric layers is formed with the strains that
result.
"""

from __future__ import annotations

import numpy as np

from viewer.cells import KINDS
from viewer.mechanics.laminate import Sheet
from viewer.model.arrays import Array

QUAD = KINDS["quad4"]
POINTS = QUAD.rule(2)[0]  # the 2 × 2 Gauss rule, all weights 1
U, V, _, RX, RY, RZ = (slice(i, None, 6) for i in range(6))


def determinants(xy: Array) -> Array:
    """(b, 4) Jacobian determinants at the Gauss points of corners ``xy`` (b, 4, 2), m²."""
    return np.linalg.det(np.einsum("qni,bnj->bqij", QUAD.gradient(POINTS), xy))


def flat_parts(xy: Array, sheet: Sheet) -> dict[str, Array]:
    """Stiffness (b, 24, 24) of the flat element, by parts, in its own axes (u v w rx ry rz per node).

    xy     (b, 4, 2) corners in the element's plane, m, counter-clockwise
    sheet  stiffness per area in the element's axes
    """
    values, gradient = QUAD.shape(POINTS), QUAD.gradient(POINTS)
    jacobian = np.einsum("qni,bnj->bqij", gradient, xy)
    area = np.linalg.det(jacobian)
    inverse = np.linalg.inv(jacobian)
    slopes = np.einsum("bqji,qni->bqnj", inverse, gradient)

    b_membrane, b_drill = _in_plane(xy, values, slopes, area, sheet.membrane)
    b_bending = np.zeros((*area.shape, 3, 24))
    b_bending[..., 0, RY] = slopes[..., 0]
    b_bending[..., 1, RX] = -slopes[..., 1]
    b_bending[..., 2, RY] = slopes[..., 1]
    b_bending[..., 2, RX] = -slopes[..., 0]

    parts = {
        "membrane": integrate(b_membrane, sheet.membrane, area),
        "bending": integrate(b_bending, sheet.bending, area),
        "shear": integrate(inverse @ _tied_shear(xy), sheet.shear, area),
        "drilling": integrate(b_drill, sheet.membrane[..., 2:, 2:], area),
    }
    if sheet.coupling is not None:
        half = integrate(b_membrane, sheet.coupling, area, b_bending)
        parts["coupling"] = half + np.swapaxes(half, 1, 2)
    return parts


def integrate(strain: Array, moduli: Array, area: Array, other: Array | None = None) -> Array:
    """Σ over points of area · Bᵀ D B': ``strain`` B and ``other`` B' (the same when None) (b, q, s, n), ``moduli``
    (s, s) or (b, s, s), ``area`` (b, q)."""
    batch, points, rows, columns = strain.shape
    if moduli.ndim == 3:
        moduli = moduli[:, None]
    weighted = area[..., None, None] * (moduli @ (strain if other is None else other))
    weighted = weighted.reshape(batch, points * rows, columns)
    return np.swapaxes(strain.reshape(batch, points * rows, columns), 1, 2) @ weighted


def _in_plane(xy: Array, values: Array, slopes: Array, area: Array, moduli: Array) -> tuple[Array, Array]:
    """Membrane strain (b, q, 3, 24) and drilling misfit (b, q, 1, 24), incompatible modes condensed."""
    strain = np.zeros((*area.shape, 3, 24))
    strain[..., 0, U] = slopes[..., 0]
    strain[..., 1, V] = slopes[..., 1]
    strain[..., 2, U] = slopes[..., 1]
    strain[..., 2, V] = slopes[..., 0]
    misfit = np.zeros((*area.shape, 1, 24))
    misfit[..., 0, U] = 0.5 * slopes[..., 1]
    misfit[..., 0, V] = -0.5 * slopes[..., 0]
    misfit[..., 0, RZ] = values

    # modes 1 − ξ² and 1 − η², gradients through the Jacobian at the centre: constant stress does no work on them
    centre = np.einsum("ni,bnj->bij", QUAD.gradient(np.zeros((1, 2)))[0], xy)
    natural = np.zeros((4, 2, 2))
    natural[:, 0, 0], natural[:, 1, 1] = -2 * POINTS[:, 0], -2 * POINTS[:, 1]
    extra = np.einsum("bji,qmi->bqmj", np.linalg.inv(centre), natural)
    extra *= (np.linalg.det(centre)[:, None] / area)[..., None, None]
    extra_strain = np.zeros((*area.shape, 3, 4))
    extra_strain[..., 0, :2] = extra[..., 0]
    extra_strain[..., 1, 2:] = extra[..., 1]
    extra_strain[..., 2, :2] = extra[..., 1]
    extra_strain[..., 2, 2:] = extra[..., 0]
    extra_misfit = np.zeros((*area.shape, 1, 4))
    extra_misfit[..., 0, :2] = 0.5 * extra[..., 1]
    extra_misfit[..., 0, 2:] = -0.5 * extra[..., 0]

    both = np.zeros((*moduli.shape[:-2], 4, 4))
    both[..., :3, :3], both[..., 3, 3] = moduli, moduli[..., 2, 2]
    full = np.concatenate(
        [np.concatenate([strain, misfit], axis=2), np.concatenate([extra_strain, extra_misfit], axis=2)], axis=3
    )
    stiffness = integrate(full, both, area)
    follow = -np.linalg.solve(stiffness[:, 24:, 24:], stiffness[:, 24:, :24])[:, None]
    return strain + extra_strain @ follow, misfit + extra_misfit @ follow


def _tied_shear(xy: Array) -> Array:
    """Covariant shear strains (b, 4 points, 2, 24), interpolated between the middles of opposite edges."""

    def along(i: int, j: int) -> Array:
        """Half the edge's mean of w,s + (rotation of the normal along s), times its length."""
        row = np.zeros((len(xy), 24))
        edge = xy[:, j] - xy[:, i]
        row[:, 6 * i + 2], row[:, 6 * j + 2] = -0.5, 0.5
        for node in (i, j):
            row[:, 6 * node + 4], row[:, 6 * node + 3] = 0.25 * edge[:, 0], -0.25 * edge[:, 1]
        return row[:, None]

    xi, eta = 0.5 * POINTS[:, 0, None], 0.5 * POINTS[:, 1, None]
    first = (0.5 - eta) * along(0, 1) + (0.5 + eta) * along(3, 2)
    second = (0.5 - xi) * along(0, 3) + (0.5 + xi) * along(1, 2)
    return np.stack([first, second], axis=2)
