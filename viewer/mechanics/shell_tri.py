"""The three-node flat shell in its own plane: stiffness by parts, batched over elements.

Membrane: the optimal triangle with drilling freedoms (Felippa C.A., A study of optimal membrane triangles with
drilling freedoms, Comput. Meth. Appl. Mech. Eng. 192 (2003) 2125): a basic stiffness that alone passes the patch
test and a higher-order stiffness tuned for bending in the plane. Its drilling freedoms need no penalty, so the
part "drilling" is zero.

Bending and shear: the discrete Kirchhoff–Mindlin triangle (Katili I., A new discrete Kirchhoff–Mindlin element
based on Mindlin–Reissner plate theory and assumed shear strain fields, part I, Int. J. Numer. Meth. Eng. 36 (1993)
1859): a quadratic rotation along each edge, fixed by the edge's own mean shear strain, so that thin plates do not
lock and thick ones keep their shear. Since that rotation depends on thickness over edge length, the energy of this
element follows the thickness's cube in bending only up to terms of that ratio squared.
"""

from __future__ import annotations

import numpy as np

from viewer.cells import KINDS
from viewer.mechanics.laminate import Sheet
from viewer.mechanics.shell_quad import RX, RY, integrate
from viewer.model.arrays import Array

TRIANGLE = KINDS["tri3"]
POINTS = TRIANGLE.shape(TRIANGLE.rule(2)[0])  # area coordinates of the rule exact for quadratics
EDGES = ((0, 1), (1, 2), (2, 0))
BASIC = 1.5  # α_b of the optimal triangle
PATTERN = np.array(
    [
        [(1, 2, 1), (0, 1, -1), (-1, -1, -2)],
        [(-2, -1, -1), (1, 1, 2), (-1, 0, 1)],
        [(1, -1, 0), (-1, -2, -1), (2, 1, 1)],
    ],
    float,
)  # β1…β9 as the three corners see them


def determinants(xy: Array) -> Array:
    """(b, 1) twice the area, positive for counter-clockwise corners ``xy`` (b, 3, 2), m²."""
    return np.linalg.det(xy[:, 1:] - xy[:, :1])[:, None]


def flat_parts(xy: Array, sheet: Sheet) -> dict[str, Array]:
    """Stiffness (b, 18, 18) of the flat element, by parts, in its own axes (u v w rx ry rz per node).

    xy     (b, 3, 2) corners in the element's plane, m, counter-clockwise
    sheet  stiffness per area in the element's axes
    """
    area = determinants(xy)[:, 0] / 2
    weights = np.repeat(area[:, None] / 3, 3, axis=1)
    curvature, slip = _bending(xy, area, sheet)
    basic, in_plane = _optimal_triangle(xy, area, sheet.membrane)
    parts = {
        "membrane": in_plane,
        "bending": integrate(curvature, sheet.bending, weights),
        "shear": integrate(slip, sheet.shear, weights),
        "drilling": np.zeros_like(in_plane),
    }
    if sheet.coupling is not None:  # between the means of membrane strain, basicᵀ / area, and curvature
        half = basic @ sheet.coupling @ curvature.mean(axis=1)
        parts["coupling"] = half + np.swapaxes(half, 1, 2)
    return parts


def _optimal_triangle(xy: Array, area: Array, moduli: Array) -> tuple[Array, Array]:
    """Mean membrane strains times area (b, 18, 3) transposed, and membrane stiffness (b, 18, 18)."""
    batch = len(xy)
    dx = xy[:, :, None, 0] - xy[:, None, :, 0]  # x_ij = x_i − x_j
    dy = xy[:, :, None, 1] - xy[:, None, :, 1]
    basic = np.zeros((batch, 18, 3))
    theta = np.zeros((batch, 3, 18))  # hierarchical rotations: nodal minus that of the linear field
    for i, j, k in ((0, 1, 2), (1, 2, 0), (2, 0, 1)):
        u, v, r = 6 * i, 6 * i + 1, 6 * i + 5
        basic[:, u, 0] = basic[:, v, 2] = dy[:, j, k]
        basic[:, v, 1] = basic[:, u, 2] = dx[:, k, j]
        basic[:, r, 0] = BASIC / 6 * dy[:, j, k] * (dy[:, i, k] - dy[:, j, i])
        basic[:, r, 1] = BASIC / 6 * dx[:, k, j] * (dx[:, k, i] - dx[:, i, j])
        basic[:, r, 2] = BASIC / 3 * (dx[:, k, i] * dy[:, i, k] - dx[:, i, j] * dy[:, j, i])
        theta[:, :, u] = (dx[:, k, j] / (4 * area))[:, None]
        theta[:, :, v] = (dy[:, k, j] / (4 * area))[:, None]
        theta[:, i, r] = 1
    basic *= 0.5

    sides = np.stack([dx[:, j, i] ** 2 + dy[:, j, i] ** 2 for i, j in EDGES], axis=1)  # l21² l32² l13²
    others = ((0, 1, 2), (1, 2, 0), (2, 0, 1))
    natural = (
        np.stack(
            [  # strains along the sides → strains xx, yy, xy
                np.stack(
                    [
                        dy[:, j, k] * dy[:, i, k],
                        dx[:, j, k] * dx[:, i, k],
                        dy[:, j, k] * dx[:, k, i] + dx[:, k, j] * dy[:, i, k],
                    ],
                    axis=1,
                )
                * sides[:, n, None]
                for n, (i, j, k) in enumerate(others)
            ],
            axis=2,
        )
        / (4 * area**2)[:, None, None]
    )
    side_moduli = np.swapaxes(natural, 1, 2) @ moduli @ natural
    corner = (2 / 3 * area)[:, None, None, None] * PATTERN / sides[:, None, :, None]  # (b, corner, side, turn)
    middle = 0.5 * (corner + np.roll(corner, -1, axis=1))
    higher = np.einsum("bcsi,bst,bctj->bij", middle, side_moduli, middle) * area[:, None, None]

    # Poisson's ratio of the isotropic part, by the invariants of Tsai and Pagano (Jones 1999, § 2.7): the same
    # whatever corner the element's axes start from
    stiff = (3 * (moduli[..., 0, 0] + moduli[..., 1, 1]) + 2 * moduli[..., 0, 1] + 4 * moduli[..., 2, 2]) / 8
    poisson = (moduli[..., 0, 0] + moduli[..., 1, 1] + 6 * moduli[..., 0, 1] - 4 * moduli[..., 2, 2]) / 8 / stiff
    share = np.maximum(0.5 * (1 - 4 * poisson**2), 0.01)[..., None, None]
    return basic, (basic @ moduli @ np.swapaxes(basic, 1, 2)) / area[:, None, None] + 0.75 * share * np.swapaxes(
        theta, 1, 2
    ) @ higher @ theta


def _bending(xy: Array, area: Array, sheet: Sheet) -> tuple[Array, Array]:
    """Curvature (b, 3 points, 3, 18) and transverse shear strain (b, 3, 2, 18).

    An edge's φ is 12 × bending over shear stiffness along the edge, over its length squared.
    """
    batch = len(xy)
    natural = TRIANGLE.gradient(np.zeros((1, 2)))[0]
    slopes = np.einsum("bji,ni->bnj", np.linalg.inv(xy[:, 1:] - xy[:, :1]), natural)
    curvature = np.zeros((batch, 3, 3, 18))
    curvature[..., 0, RY] = slopes[:, None, :, 0]
    curvature[..., 1, RX] = -slopes[:, None, :, 1]
    curvature[..., 2, RY] = slopes[:, None, :, 1]
    curvature[..., 2, RX] = -slopes[:, None, :, 0]

    tangents, mean_slip = [], []
    for i, j in EDGES:
        edge = xy[:, j] - xy[:, i]
        length = np.linalg.norm(edge, axis=1)
        c, s = (edge / length[:, None]).T
        bent, sheared = np.stack([c * c, s * s, 2 * c * s], axis=-1), np.stack([c, s], axis=-1)
        stiff = _along(bent, sheet.bending)
        phi = 12 * stiff / _along(sheared, sheet.shear) / length**2
        gap = np.zeros((batch, 18))  # w_j − w_i + L/2 (β_i + β_j) along the edge
        gap[:, 6 * i + 2], gap[:, 6 * j + 2] = -1.0, 1.0
        for node in (i, j):
            gap[:, 6 * node + 4], gap[:, 6 * node + 3] = 0.5 * edge[:, 0], -0.5 * edge[:, 1]
        bulge = -1.5 / (length * (1 + phi))[:, None] * gap
        bump = 4 * (POINTS[:, i, None] * slopes[:, None, j] + POINTS[:, j, None] * slopes[:, None, i])
        strain = np.stack(
            [
                bump[..., 0] * c[:, None],
                bump[..., 1] * s[:, None],
                bump[..., 1] * c[:, None] + bump[..., 0] * s[:, None],
            ],
            axis=2,
        )
        curvature += strain[..., None] * bulge[:, None, None, :]
        tangents.append(np.stack([c, s], axis=1))
        mean_slip.append(-2 / 3 * phi[:, None] * bulge)

    slip = np.zeros((batch, 3, 2, 18))
    for node in range(3):  # the corner's shear has the mean slip of both its edges
        before, after = (node + 2) % 3, node
        directions = np.stack([tangents[before], tangents[after]], axis=1)
        at_corner = np.linalg.solve(directions, np.stack([mean_slip[before], mean_slip[after]], axis=1))
        slip += POINTS[:, node, None, None] * at_corner[:, None]
    return curvature, slip


def _along(vector: Array, matrix: Array) -> Array:
    """(b,) vᵀ A v for vectors (b, n) and a matrix (n, n) or (b, n, n)."""
    return np.sum(vector * np.einsum("...ij,...j->...i", matrix, vector), axis=-1)
