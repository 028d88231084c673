"""The 8-node hexahedron as a piece of thin wall: strains across the wall are tied, so that it bends without locking.

Incompatible modes free a thin brick only as long as curvature is constant in it and its sides are parallel: one
layer of cells 20 times as long as thick gives the second mode of a cantilever plate 7 % too high on 16 × 16 squares,
and every mode about twice as high as it is once their corners are moved by a fifth. The remedies are those of solid
shells, in natural (covariant) strains with ζ across the wall:

- Transverse shear ξζ and ηζ are taken at the middles of the mid-surface's edges and interpolated between opposite
  ones (Dvorkin & Bathe 1984, Eng. Comput. 1:77–88; for bricks Hauptmann & Schweizerhof 1998, Int. J. Numer. Meth.
  Engng 42:49–69).
- Thickness strain ζζ is taken at the mid-surface's corners, against locking where the wall is curved or tapers
  (Betsch & Stein 1995, Commun. Numer. Meth. Engng 11:899–909).
- From the strain so found its error on linear displacements is taken, times the cell's mean strain: every cell, of
  any shape, stores exactly ½ ε D ε V in a constant strain.
- Condensed cell by cell: in-plane displacements 1 − ξ², 1 − η² and thickness strains ζ, ζξ, ζη, ζξη, which let the
  wall become thinner where it is stretched (Poisson's effect in bending). Gradients by the Jacobian of the centre
  (Taylor, Beresford & Wilson 1976; Simo & Rifai 1990, Int. J. Numer. Meth. Engng 29:1595–1638).

On a flat plate this is our 4-node shell (``shell_quad``) to a few digits, at any outline of the cells. The patch test
holds where the four edges through the wall are parallel: whatever the outline, lean, warp and number of layers.
Where they are not, or where a flat layer of crooked outline lies on thick cells, the nodal forces of neighbours in a
constant stress do not quite cancel. That is the price of bending freely: a distorted cell whose only freedoms are
displacements of its corners cannot have both (MacNeal 1987, Int. J. Numer. Meth. Engng 24:1793–1799). Giving every
cell its exact mean strain back passes the patch test, and makes the modes of the crooked plate 49 % to 73 % too high.
Measured in tests/mechanics/test_flat_brick.py.
"""

from __future__ import annotations

import numpy as np

from viewer.cells import KINDS, jacobians
from viewer.mechanics import materials
from viewer.model.arrays import Array
from viewer.model.design import Material

HEX = KINDS["hex8"]
POINTS, WEIGHTS = HEX.rule(3)
CENTRE = np.zeros((1, 3))
FLAT, THICK = 0.25, 0.5  # thickness over width up to which a cell is all wall, and from which it is none

FIRST, SECOND = np.array([0, 1, 2, 0, 1, 2]), np.array([0, 1, 2, 1, 2, 0])  # Voigt order xx yy zz xy yz zx
_ENGINEERING = np.where(FIRST == SECOND, 0.5, 1.0)
EVERY = np.arange(6)


def _tying() -> tuple[Array, Array, Array]:
    """Strains that are tied, by place where one is taken (8,); these places (8, 3); weights (q, 8) at POINTS."""
    x, y = POINTS[:, 0, None], POINTS[:, 1, None]
    along, across = np.array([[0, -1, 0], [0, 1, 0]]), np.array([[-1, 0, 0], [1, 0, 0]])
    corners = np.array([[-1, -1, 0], [1, -1, 0], [1, 1, 0], [-1, 1, 0]])
    weights = [
        (1 + y * along[:, 1]) / 2,
        (1 + x * across[:, 0]) / 2,
        (1 + x * corners[:, 0]) * (1 + y * corners[:, 1]) / 4,
    ]
    return np.repeat([5, 4, 2], [2, 2, 4]), np.concatenate([along, across, corners]), np.hstack(weights)


def _inner_strains() -> Array:
    """(q, 6, 8) natural strains of the condensed modes at POINTS, each without mean."""
    x, y, z = POINTS.T
    out = np.zeros((len(POINTS), 6, 8))
    out[:, 0, 0], out[:, 3, 1], out[:, 3, 2], out[:, 1, 3] = x, x, y, y
    for column, values in enumerate((z, z * x, z * y, z * x * y), start=4):
        out[:, 2, column] = values
    return out


TAKEN, PLACES, SHARES = _tying()
TIED = (5, 4, 2)
INNER = _inner_strains()
# Local nodes when direction 0, 1, 2 of the cell takes the place of ζ: coordinates move round, right side out.
TURNS = [
    np.array(
        [
            int(np.argmin(np.abs(HEX.reference[:, np.roll(range(3), -1 - thin)] - node).sum(axis=1)))
            for node in HEX.reference
        ]
    )
    for thin in range(3)
]


def wall(xyz: Array) -> tuple[Array, Array]:
    """(b,) direction 0, 1, 2 that is shortest between mid-points of opposite faces, and share 0 … 1 to which the cell
    is a piece of wall across it: 1 up to a thickness of ``FLAT`` of the next longer, 0 from ``THICK`` on.

    Between, the share is smooth, so that frequencies are a smooth function of a wall's thickness. Thick cells keep a
    patch test without exception and gain little. Measured on six modes of a plate of 10 × 10 cells in one layer, by
    how much they come out higher without tying: at twice as wide as thick up to 0.4 % (2.5 % with corners moved by a
    fifth of a cell), at four times 3.5 % (8.5 %), at ten times 18 % (38 %).
    """
    lengths = np.linalg.norm(jacobians("hex8", xyz, CENTRE)[:, 0], axis=1)
    order = np.argsort(lengths, axis=1, kind="stable")
    shortest, next_longer = np.take_along_axis(lengths, order[:, :2], axis=1).T
    step = np.clip((THICK - shortest / next_longer) / (THICK - FLAT), 0.0, 1.0)
    return order[:, 0], step**2 * (3 - 2 * step)


def stiffness(xyz: Array, thin: Array, material: Material) -> Array:
    """(b, 24, 24) stiffness of cells ``xyz`` (b, 8, 3) whose wall is crossed by direction ``thin`` (b,), N/m."""
    out, moduli = np.empty((len(xyz), 24, 24)), materials.solid(material)
    for direction, nodes in enumerate(TURNS):
        rows = np.nonzero(thin == direction)[0]
        places = (3 * nodes[:, None] + np.arange(3)).ravel()
        out[rows[:, None, None], places[:, None], places] = _across_zeta(xyz[rows][:, nodes], moduli)
    return out


def _across_zeta(xyz: Array, moduli: Array) -> Array:
    axes = jacobians("hex8", xyz, POINTS)  # (b, q, 3 of space, 3 natural)
    volume = np.linalg.det(axes)  # all weights are 1
    back = _turned(np.linalg.inv(axes))
    natural = _natural(axes, HEX.gradient(POINTS), EVERY)
    strain = np.empty((*volume.shape, 6, 32))
    strain[..., :24] = back @ natural
    mean = np.einsum("bq,bqin->bin", volume / volume.sum(axis=1, keepdims=True), strain[..., :24])
    taken_axes = jacobians("hex8", xyz, PLACES)
    taken = _natural(taken_axes, HEX.gradient(PLACES), TAKEN[:, None])[:, :, 0]
    linear, taken_linear = _turned(axes), _turned(taken_axes)[:, np.arange(8), TAKEN]  # of constant strains
    for tied in TIED:
        at = tied == TAKEN
        change = SHARES[:, at] @ taken[:, at] - natural[:, :, tied]
        change -= (SHARES[:, at] @ taken_linear[:, at] - linear[:, :, tied]) @ mean
        strain[..., :24] += back[..., tied, None] * change[:, :, None]
    centre = jacobians("hex8", xyz, CENTRE)[:, 0]
    strain[..., 24:] = _turned(np.linalg.inv(centre))[:, None] @ INNER
    strain[..., 24:] *= (np.linalg.det(centre)[:, None] / volume)[..., None, None]
    stress = volume[..., None, None] * (moduli @ strain)
    whole = np.swapaxes(strain.reshape(-1, 48, 32), 1, 2) @ stress.reshape(-1, 48, 32)
    freed = np.linalg.solve(whole[:, 24:, 24:], whole[:, 24:, :24])
    matrix = whole[:, :24, :24] - whole[:, :24, 24:] @ freed
    return (matrix + np.swapaxes(matrix, 1, 2)) / 2


def _natural(axes: Array, gradient: Array, strains: Array) -> Array:
    """(b, q, s, 24) natural ``strains`` (Voigt, engineering shear) by nodal displacement, where the Jacobian is
    ``axes`` (b, q, 3, 3) and the reference gradients are (q, 8, 3); ``strains`` (s,), or (q, s) by point."""
    axes, slopes = np.swapaxes(axes, 2, 3), np.swapaxes(gradient, 1, 2)
    point = np.arange(len(gradient))[:, None]
    first, second = FIRST[strains], SECOND[strains]
    pairs = axes[:, point, first][:, :, :, None] * slopes[point, second][..., None]
    pairs += axes[:, point, second][:, :, :, None] * slopes[point, first][..., None]
    return (_ENGINEERING[strains][..., None, None] * pairs).reshape(*pairs.shape[:3], 24)


def _turned(matrix: Array) -> Array:
    """(…, 6, 6) that takes strains (Voigt, engineering shear) to Aᵀ ε A for the ``matrix`` A (…, 3, 3)."""
    first, second = FIRST[:, None], SECOND[:, None]
    pairs = matrix[..., FIRST, first] * matrix[..., SECOND, second]
    return _ENGINEERING[:, None] * (pairs + matrix[..., SECOND, first] * matrix[..., FIRST, second])
