"""Solid formulations: isoparametric elements with three displacements a node, integrated over batches of cells.

Every kind goes through one class; what differs is the quadrature and whether the incompatible modes of the
8-node hexahedron are added:

- Stiffness of an isotropic solid: K[a i, b j] = ∫ λ ∂ᵢNₐ ∂ⱼN_b + μ ∂ⱼNₐ ∂ᵢN_b + μ δᵢⱼ ∇Nₐ·∇N_b dV
  (Zienkiewicz & Taylor, The Finite Element Method, vol. 1), so that one product of gradients per cell serves all.
- Incompatible modes 1 − ξ², 1 − η², 1 − ζ² in each displacement (Wilson, Taylor, Doherty & Ghaboussi 1973), condensed
  cell by cell, with the gradients of Taylor, Beresford & Wilson (1976, "A non-conforming element for stress
  analysis", Int. J. Numer. Meth. Engng 10:1211–1219): Jacobian of the centre, scaled by det J₀ / det J, so that
  they do no work on constant stress and the patch test holds on every shape.
- Consistent mass ρ ∫ Nₐ N_b dV, the same for the three directions and therefore given once (b, n, n). Incompatible
  modes carry no mass.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from viewer.cells import KINDS, jacobians
from viewer.errors import ModelError
from viewer.mechanics import materials
from viewer.model.arrays import Array
from viewer.model.design import Property

_WORK = 1 << 17      # doubles in the gradients of one chunk of cells: stays in the processor's cache


@dataclass(frozen=True)
class SolidFormulation:
    """One solid element formulation.

    ``stiffness_order`` and ``mass_order`` are degrees of quadrature (``CellKind.rule``); ``incompatible`` adds the
    condensed modes above. ``caution`` is not empty when the element is known to be poor in bending.
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
        first, second = materials.lame(prop.material)
        points, weights = KINDS[self.kind].rule(self.stiffness_order)
        kept = 3 * xyz.shape[1]
        out = np.empty((len(xyz), kept, kept))
        for part in _chunks(len(xyz), len(points) * kept):
            slopes, volume = self._slopes(xyz[part], points, weights)
            matrix = _elastic(slopes, volume, first, second)
            if self.incompatible:
                inner = matrix[:, kept:]
                freed = np.linalg.solve(inner[:, :, kept:], inner[:, :, :kept])
                matrix = matrix[:, :kept, :kept] - matrix[:, :kept, kept:] @ freed
            out[part] = matrix
        return out

    def mass(self, xyz: Array, prop: Property) -> Array:
        """(b, n, n) consistent mass, kg, of cells ``xyz`` (b, n, 3) m; errors as in ``stiffness``."""
        xyz = np.asarray(xyz, float)
        density = materials.check(prop.material).density
        points, weights = KINDS[self.kind].rule(self.mass_order)
        values = KINDS[self.kind].shape(points)
        n = xyz.shape[1]
        pairs = (density * weights[:, None, None] * values[:, :, None] * values[:, None, :]).reshape(-1, n * n)
        out = np.empty((len(xyz), n * n))
        for part in _chunks(len(xyz), 9 * len(points)):
            out[part] = self._determinants(jacobians(self.kind, xyz[part], points)) @ pairs
        return out.reshape(-1, n, n)

    def _slopes(self, xyz: Array, points: Array, weights: Array) -> tuple[Array, Array]:
        """Global gradients (b, q, modes, 3) of the shape functions (and incompatible modes); volumes (b, q)."""
        cell = KINDS[self.kind]
        jacobian = jacobians(self.kind, xyz, points)
        determinant = self._determinants(jacobian)
        inverse = _cofactors(jacobian) / determinant[..., None, None]
        slopes = _mapped(cell.gradient(points), inverse)
        if self.incompatible:
            centre = jacobians(self.kind, xyz, np.zeros((1, 3)))
            ratio = 1 / determinant[..., None, None]           # det J₀ / det J over det J₀ of the inverse
            bubbles = -2 * points[:, :, None] * np.eye(3)      # ∂(1 − ξ²)/∂ξ, in each direction
            slopes = np.concatenate([slopes, _mapped(bubbles, _cofactors(centre) * ratio)], axis=2)
        return slopes, determinant * weights

    def _determinants(self, jacobian: Array) -> Array:
        determinant = np.einsum("bqi,bqi->bq", jacobian[..., 0], _cross(jacobian[..., 1], jacobian[..., 2]))
        smallest = determinant.min(initial=np.inf)
        if not smallest > 0:
            count = int((~(determinant.min(axis=1) > 0)).sum())
            raise ModelError(
                f"{count} {self.kind} cell{'s are' if count > 1 else ' is'} inside out or collapsed",
                found=f"a Jacobian determinant of {smallest:.3g} at an integration point",
                expected="above 0 everywhere in the cell", do="repair the mesh there",
            )
        return determinant


def _chunks(count: int, doubles_per_cell: int):
    size = max(1, _WORK // doubles_per_cell)
    return (slice(start, start + size) for start in range(0, count, size))


def _cross(a: Array, b: Array) -> Array:
    """Cross product over the last axis; ``np.cross`` spends most of its time on moving axes."""
    out = np.empty(np.broadcast_shapes(a.shape, b.shape))
    for i, j, k in ((0, 1, 2), (1, 2, 0), (2, 0, 1)):
        np.multiply(a[..., j], b[..., k], out=out[..., i])
        out[..., i] -= a[..., k] * b[..., j]
    return out


def _cofactors(jacobian: Array) -> Array:
    """(…, dim, 3) rows of the inverse times the determinant: [d, i] = det J · ∂ξ_d/∂x_i."""
    columns = [jacobian[..., d] for d in range(3)]
    return np.stack([_cross(columns[(d + 1) % 3], columns[(d + 2) % 3]) for d in range(3)], axis=-2)


def _mapped(reference: Array, inverse: Array) -> Array:
    """Global gradients (b, q, n, 3) from reference gradients (q, n, 3) and ∂ξ/∂x (b, q, 3, 3)."""
    out = reference[:, :, 0, None] * inverse[:, :, 0, None, :]
    for d in (1, 2):
        out += reference[:, :, d, None] * inverse[:, :, d, None, :]
    return out


def _elastic(slopes: Array, volume: Array, first: float, second: float) -> Array:
    """(b, 3m, 3m) isotropic stiffness from gradients (b, q, m, 3), volumes (b, q) and Lamé's constants."""
    batch, _, modes, _ = slopes.shape
    flat = (slopes * np.sqrt(volume)[..., None, None]).reshape(batch, -1, 3 * modes)
    product = (np.swapaxes(flat, 1, 2) @ flat).reshape(batch, modes, 3, modes, 3)
    trace = second * (product[:, :, 0, :, 0] + product[:, :, 1, :, 1] + product[:, :, 2, :, 2])
    matrix = first * product
    product *= second
    matrix += np.swapaxes(product, 2, 4)
    for i in range(3):
        matrix[:, :, i, :, i] += trace
    return matrix.reshape(batch, 3 * modes, 3 * modes)


_STIFF = (
    "{} cells are too stiff in bending: frequencies of thin parts come out high however fine the sheet is meshed; "
    "use {}"
)

SOLIDS: tuple[SolidFormulation, ...] = (
    SolidFormulation("tet4-constant", "tet4", 0, 2, caution=_STIFF.format("4-node tetrahedra", "tet10")),
    SolidFormulation("tet10-full", "tet10", 2, 5),
    SolidFormulation("hex8-incompatible", "hex8", 3, 5, incompatible=True),
    SolidFormulation("hex8-full", "hex8", 3, 5, caution=_STIFF.format("plain 8-node hexahedra", "hex8-incompatible")),
    SolidFormulation("hex20-full", "hex20", 5, 7),
    SolidFormulation("hex20-reduced", "hex20", 3, 7),
    SolidFormulation("hex27-full", "hex27", 5, 7),
    SolidFormulation("wedge6-full", "wedge6", 2, 4, caution=_STIFF.format("6-node wedges", "wedge15 or hex8")),
    SolidFormulation("wedge15-full", "wedge15", 4, 6),
    SolidFormulation("pyramid5-full", "pyramid5", 3, 5, caution=_STIFF.format("5-node pyramids", "pyramid13")),
    SolidFormulation("pyramid13-full", "pyramid13", 5, 7),
)
