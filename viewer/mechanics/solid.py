"""Solid formulations: isoparametric elements with three displacements a node, integrated over batches of cells.

Every kind goes through one class; what differs is the quadrature and whether the incompatible modes of the
8-node hexahedron are added:

- Stiffness of an isotropic solid: K[a i, b j] = ∫ λ ∂ᵢNₐ ∂ⱼN_b + μ ∂ⱼNₐ ∂ᵢN_b + μ δᵢⱼ ∇Nₐ·∇N_b dV
  (Zienkiewicz & Taylor, The Finite Element Method, vol. 1), so that one product of gradients per cell serves all.
- Directional material the same way: K[a i, b j] = ∫ C_ikjl ∂ₖNₐ ∂ₗN_b dV, C in global axes.
- Incompatible modes 1 − ξ², 1 − η², 1 − ζ² in each displacement (Wilson, Taylor, Doherty & Ghaboussi 1973), condensed
  cell by cell, with the gradients of Taylor, Beresford & Wilson (1976, "A non-conforming element for stress
  analysis", Int. J. Numer. Meth. Engng 10:1211–1219): Jacobian of the centre, scaled by det J₀ / det J, so that
  they do no work on constant stress and the patch test holds on every shape. Cells flatter than two to one are
  pieces of thin wall, whose strains across are tied as well: ``flat_brick`` (isotropic material only).
- Consistent mass ρ ∫ Nₐ N_b dV, the same for the three directions and therefore given once (b, n, n). Incompatible
  modes carry no mass.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import cache, partial

import numpy as np

from viewer.cells import KINDS, cofactors, determinants, jacobian_components
from viewer.errors import ModelError
from viewer.mechanics import flat_brick, materials
from viewer.model.arrays import Array
from viewer.model.design import Material, Property

_WORK = 1 << 17  # doubles in gradients and matrices of one chunk of cells: about what the processor's cache holds


@dataclass(frozen=True)
class SolidFormulation:
    """One solid element formulation.

    ``stiffness_order`` and ``mass_order`` are degrees of quadrature (``CellKind.rule``); ``incompatible`` adds the
    condensed modes above and ties the strains across flat cells. ``caution`` is not empty when the element has a
    weakness to warn of, above all in bending.
    """

    name: str
    kind: str
    stiffness_order: int
    mass_order: int
    incompatible: bool = False
    caution: str = ""
    rotations: bool = False
    scalar_mass: bool = True

    def stiffness(self, xyz: Array, prop: Property) -> Array:
        """(b, 3n, 3n) stiffness, N/m, of cells ``xyz`` (b, n, 3) m; order ux uy uz by node.

        ``ModelError`` for an unusable material or a cell that is inside out or collapsed.
        """
        xyz = np.asarray(xyz, float)
        combine = _combination(prop)
        points, weights, _, gradient = _tables(self.kind, self.stiffness_order)
        kept = 3 * xyz.shape[1]
        out = np.empty((len(xyz), kept, kept))
        for part in _chunks(len(xyz), (len(points) + kept) * kept):
            matrix = combine(self._slopes(xyz[part], gradient, points, weights))
            if self.incompatible:
                inner = matrix[:, kept:]
                freed = np.linalg.solve(inner[:, :, kept:], inner[:, :, :kept])
                matrix = matrix[:, :kept, :kept] - matrix[:, :kept, kept:] @ freed
                matrix = (matrix + np.swapaxes(matrix, 1, 2)) / 2  # symmetric to the last digit, as the others
                if prop.material.directional is None:
                    _thin_walls(matrix, xyz[part], prop.material)
            out[part] = matrix
        return out

    def mass(self, xyz: Array, prop: Property) -> Array:
        """(b, n, n) consistent mass, kg, of cells ``xyz`` (b, n, 3) m.

        ``ModelError`` for an unusable material or a cell without positive volume. A fold that no point of the
        stiffness sees is let pass: its mass is still right in sum.
        """
        xyz = np.asarray(xyz, float)
        density = materials.check(prop.material).density
        points, weights, values, gradient = _tables(self.kind, self.mass_order)
        n = xyz.shape[1]
        pairs = ((values[:, :, None] * values[:, None, :]) * (density * weights[:, None, None])).reshape(-1, n * n)
        out = np.empty((len(xyz), n * n))
        for part in _chunks(len(xyz), 9 * len(points)):
            stretch = determinants(jacobian_components(xyz[part], gradient))
            self._require_positive(stretch @ weights, "a volume")
            out[part] = stretch @ pairs
        return out.reshape(-1, n, n)

    def strain_energy(self, xyz: Array, prop: Property, moved: Array) -> Array:
        """(b, k) J, ½ uᵀ K u of the displacements ``moved`` (b, 3n, k) m of cells ``xyz`` (b, n, 3) m.

        From the strains at the integration points; K itself, which would cost more, is not formed. Not for
        ``incompatible``, whose condensed modes are known by their stiffness only.
        """
        points, weights, _, gradient = _tables(self.kind, self.stiffness_order)
        shape = len(xyz), 3 * len(points), gradient.shape[1]
        slopes = np.swapaxes(self._slopes(xyz, gradient, points, weights), 0, 1).reshape(shape)
        slopes = (slopes @ moved.reshape(len(xyz), shape[2], -1)).reshape(len(xyz), 3, len(points), 3, -1)
        if prop.material.directional is not None:
            return _directional_energy(slopes, materials.voigt(materials.tensor(prop)))
        first, second = materials.lame(prop.material)
        trace = slopes[:, 0, :, 0] + slopes[:, 1, :, 1] + slopes[:, 2, :, 2]
        energy = first / 2 * _squares(trace)
        for i in range(3):
            energy += second * _squares(slopes[:, i, :, i])
            energy += second / 2 * _squares(slopes[:, i - 1, :, i] + slopes[:, i, :, i - 1])
        return energy

    def _slopes(self, xyz: Array, gradient: Array, points: Array, weights: Array) -> Array:
        """(3, b, q, modes) global gradients, times the root of the volume of each integration point, of the shape
        functions and, behind them, the incompatible modes."""
        jacobian = jacobian_components(xyz, gradient)
        inverse = cofactors(jacobian)
        determinant = (jacobian[:, 0] * inverse[:, 0]).sum(axis=0)
        self._require_positive(determinant.min(axis=1), "a Jacobian determinant at an integration point")
        scale = np.sqrt(weights / determinant)  # √(w det J) over the determinant of the inverse
        inverse *= scale
        slopes = _mapped(gradient, inverse)
        if not self.incompatible:
            return slopes
        centre = jacobian_components(xyz, _tables(self.kind, 1)[3])
        bubbles = -2 * points[:, :, None] * np.eye(3)  # ∂(1 − ξ²)/∂ξ in each direction
        return np.concatenate([slopes, _mapped(bubbles, cofactors(centre) * scale)], axis=-1)

    def _require_positive(self, smallest: Array, what: str) -> None:
        """``ModelError`` unless every cell's value in ``smallest`` (b,) is above 0 (and a number)."""
        count = int((~(smallest > 0)).sum())
        if count:
            raise ModelError(
                f"{count} {self.kind} cell{'s are' if count > 1 else ' is'} inside out or collapsed",
                found=f"{what} of {smallest.min():.3g}",
                expected="above 0",
                do="repair the mesh there",
            )


@cache
def _tables(kind: str, order: int) -> tuple[Array, ...]:
    """Points, weights, shape functions and reference gradients of a rule; asked for with every chunk of cells."""
    points, weights = KINDS[kind].rule(order)
    out = points, weights, KINDS[kind].shape(points), KINDS[kind].gradient(points)
    for array in out:
        array.flags.writeable = False
    return out


def _thin_walls(matrix: Array, xyz: Array, material: Material) -> None:
    """Replace the stiffness of flat cells by that of a wall, to the share that they are one."""
    thin, share = flat_brick.wall(xyz)
    flat = np.nonzero(share)[0]
    if len(flat):
        weight = share[flat, None, None]
        matrix[flat] = (1 - weight) * matrix[flat] + weight * flat_brick.stiffness(xyz[flat], thin[flat], material)


def _chunks(count: int, doubles_per_cell: int) -> Iterator[slice]:
    size = max(1, _WORK // doubles_per_cell)
    return (slice(start, start + size) for start in range(0, count, size))


def _squares(values: Array) -> Array:
    return np.einsum("bqk,bqk->bk", values, values)


def _mapped(reference: Array, inverse: Array) -> Array:
    """(3, b, q, n) global gradients from reference gradients (q, n, 3) and ∂ξ_d/∂x_i (i, d, b, q)."""
    out = inverse[:, 0, :, :, None] * reference[:, :, 0]
    for d in (1, 2):
        out += inverse[:, d, :, :, None] * reference[:, :, d]
    return out


def _combination(prop: Property) -> Callable[[Array], Array]:
    """From weighted gradients (3, b, q, m) to stiffness (b, 3m, 3m)."""
    if prop.material.directional is not None:
        return partial(_directional, elasticity=materials.tensor(prop))
    first, second = materials.lame(prop.material)
    return partial(_elastic, first=first, second=second)


def _directional(slopes: Array, elasticity: Array) -> Array:
    """(b, 3m, 3m) stiffness from weighted gradients (3, b, q, m) and the elasticity tensor."""
    _, batch, _, modes = slopes.shape
    out = np.zeros((batch, modes, 3, modes, 3))
    turned = np.swapaxes(slopes, 2, 3)
    for k in range(3):
        for m in range(k + 1):
            product = turned[k] @ slopes[m]
            for i in range(3):
                for j in range(3):
                    out[:, :, i, :, j] += elasticity[i, k, j, m] * product
                    if m < k:
                        out[:, :, i, :, j] += elasticity[i, m, j, k] * np.swapaxes(product, 1, 2)
    return out.reshape(batch, 3 * modes, 3 * modes)


def _directional_energy(slopes: Array, moduli: Array) -> Array:
    """(b, k) J from weighted displacement gradients (b, direction, q, displacement, k) and (6, 6) moduli."""
    strains = [slopes[:, i, :, i] for i in range(3)]
    strains += [slopes[:, i, :, j] + slopes[:, j, :, i] for i, j in ((0, 1), (1, 2), (2, 0))]
    energy = np.zeros((len(slopes), slopes.shape[-1]))
    for m, strain in enumerate(strains):
        for n in range(m + 1):
            energy += (0.5 if n == m else 1.0) * moduli[m, n] * np.einsum("bqk,bqk->bk", strain, strains[n])
    return energy


def _elastic(slopes: Array, first: float, second: float) -> Array:
    """(b, 3m, 3m) isotropic stiffness from weighted gradients (3, b, q, m) and Lamé's constants.

    Direction by direction, since NumPy is slow on axes of length three.
    """
    _, batch, _, modes = slopes.shape
    out = np.empty((batch, modes, 3, modes, 3))
    turned = np.swapaxes(slopes, 2, 3)
    squares = [turned[i] @ slopes[i] for i in range(3)]
    trace = second * (squares[0] + squares[1] + squares[2])
    for i in range(3):
        out[:, :, i, :, i] = (first + second) * squares[i] + trace
        for j in range(i):
            product = turned[i] @ slopes[j]
            block = first * product + second * np.swapaxes(product, 1, 2)
            out[:, :, i, :, j] = block
            out[:, :, j, :, i] = np.swapaxes(block, 1, 2)
    return out.reshape(batch, 3 * modes, 3 * modes)


_STIFF = (
    "{} cells are too stiff in bending: frequencies of thin parts come out high however fine the sheet is meshed; "
    "use {}"
)
_LOOSE = (
    "hex20-reduced: a row of single cells keeps motions that store no energy; mesh two cells wide in two directions "
    "or use hex20-full"
)

SOLIDS: tuple[SolidFormulation, ...] = (
    SolidFormulation("tet4-constant", "tet4", 0, 2, caution=_STIFF.format("4-node tetrahedra", "tet10")),
    SolidFormulation("tet10-full", "tet10", 2, 5),
    SolidFormulation("hex8-incompatible", "hex8", 3, 5, incompatible=True),
    SolidFormulation("hex8-full", "hex8", 3, 5, caution=_STIFF.format("plain 8-node hexahedra", "hex8-incompatible")),
    SolidFormulation("hex20-full", "hex20", 5, 7),
    SolidFormulation("hex20-reduced", "hex20", 3, 7, caution=_LOOSE),
    SolidFormulation("hex27-full", "hex27", 5, 7),
    SolidFormulation("wedge6-full", "wedge6", 2, 4, caution=_STIFF.format("6-node wedges", "wedge15 or hex8")),
    SolidFormulation("wedge15-full", "wedge15", 4, 6),
    SolidFormulation("pyramid5-full", "pyramid5", 3, 5, caution=_STIFF.format("5-node pyramids", "pyramid13")),
    SolidFormulation("pyramid13-full", "pyramid13", 5, 7),
)
