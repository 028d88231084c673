"""Shell formulations: flat elements placed in space, six freedoms a node (ux uy uz rx ry rz, global axes).

One material or layers (``laminate.py``), of the thickness in ``Property``. A warped quadrilateral is computed in its
mean plane; each node is joined to the corner of the plane by a rigid offset along the normal, displacement of the
corner = u + θ × offset, so that every rigid motion is free of strain whatever the warp. ``Property.offset`` moves the
sheet off its nodes by the same arms.

Mass is consistent: ∫ρ on the translations and ∫ρz² on the rotations about the two axes in the surface, on the
true (also warped) surface, with ∫ρz joining them for offset or unsymmetric sheets. The rotation about the normal
carries ``SPIN_INERTIA`` of ∫ρz², no physical quantity: it keeps the mass matrix regular and lies far above any
frequency of use.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from viewer.cells import KINDS
from viewer.cells.measures import jacobians
from viewer.errors import ModelError
from viewer.mechanics import shell_quad, shell_tri
from viewer.mechanics.laminate import REISSNER, Sheet, directions, mass_moments, needs_direction, sheet
from viewer.mechanics.patch import cross_matrix
from viewer.model.arrays import Array
from viewer.model.design import Property

SPIN_INERTIA = 1e-4
PARTS = ("membrane", "bending", "shear", "drilling")
SHEAR_MINDLIN = np.pi**2 / 12


@dataclass(frozen=True)
class ShellFormulation:
    """One shell element formulation; see the modules ``shell_quad`` and ``shell_tri`` for the sources.

    ``kappa`` is the shear correction factor: 5/6 (Reissner) or π²/12 (Mindlin's choice for thick plates).
    """

    name: str
    kind: str
    _flat: Callable[[Array, Sheet], dict[str, Array]]
    kappa: float = REISSNER
    caution: str = ""
    rotations: bool = True
    scalar_mass: bool = False

    def parts(self, xyz: Array, prop: Property) -> dict[str, Array]:
        """Stiffness (b, nd, nd) of cells ``xyz`` (b, n, 3) m as ``{part: matrix}`` over ``PARTS``; they sum to all.
        Layers that couple membrane and bending add the part "coupling".

        At a fixed shape, membrane, shear and drilling energies go with the thickness, bending with its cube.
        Raises ``ModelError`` for a missing thickness and for cells without area.
        """
        flat, turn = self._local(xyz, prop)
        return {part: _symmetric(np.swapaxes(turn, 1, 2) @ matrix @ turn) for part, matrix in flat.items()}

    def stiffness(self, xyz: Array, prop: Property) -> Array:
        """(b, nd, nd) stiffness of cells ``xyz`` (b, n, 3) m, N/m with rotations in rad."""
        flat, turn = self._local(xyz, prop)
        return _symmetric(np.swapaxes(turn, 1, 2) @ sum(flat.values()) @ turn)

    def mass(self, xyz: Array, prop: Property) -> Array:
        """(b, nd, nd) consistent mass of cells ``xyz`` (b, n, 3) m, kg and kg·m²."""
        _require_thickness(self.kind, prop)
        whole, first, second = mass_moments(prop)
        across = second + 2 * prop.offset * first + prop.offset**2 * whole
        first = first + prop.offset * whole
        values, area, normal = _surface(self.kind, xyz)
        pairs = np.einsum("bq,qi,qj->bqij", area, values, values)
        flat = normal[..., :, None] * normal[..., None, :]
        turning = across * (np.eye(3) - flat) + SPIN_INERTIA * second * flat
        batch, n = xyz.shape[:2]
        mass = np.zeros((batch, n, 6, n, 6))
        mass[:, :, :3, :, :3] = np.einsum("bij,kl->bikjl", whole * pairs.sum(axis=1), np.eye(3))
        mass[:, :, 3:, :, 3:] = np.einsum("bqij,bqkl->bikjl", pairs, turning)
        if first:
            # u · (θ × n) = −u · (n × θ)
            arm = np.einsum("bqij,bqkl->bikjl", pairs, -first * cross_matrix(normal))
            mass[:, :, :3, :, 3:] = arm
            mass[:, :, 3:, :, :3] = np.swapaxes(np.swapaxes(arm, 1, 3), 2, 4)
        return mass.reshape(batch, 6 * n, 6 * n)

    def _local(self, xyz: Array, prop: Property) -> tuple[dict[str, Array], Array]:
        """Parts in element axes and the operator (b, nd, nd) from global freedoms to them."""
        xyz = np.asarray(xyz, float)
        _require_thickness(self.kind, prop)
        axes, corners = _mean_plane(xyz)
        _reject_flat(self.kind, xyz, corners[..., :2])
        stiff = sheet(prop, self.kappa)
        if needs_direction(prop):
            stiff = stiff.turned(directions(prop, axes))
        return self._flat(corners[..., :2], stiff), _placing(axes, corners[..., 2] - prop.offset)


def _require_thickness(kind: str, prop: Property) -> None:
    if prop.thickness is None or not prop.thickness > 0:
        raise ModelError(
            f"{kind} cells of material '{prop.material.name}' are sheet and need a thickness",
            found="none" if prop.thickness is None else f"{prop.thickness:g} m",
            expected="a thickness above zero",
            do="give 'thickness' in the assignment of these cells",
        )


def _mean_plane(xyz: Array) -> tuple[Array, Array]:
    """Element axes (b, 3, 3), rows e1 e2 n, and corners (b, n, 3) in them from the centroid.

    The normal of a quadrilateral is that of both diagonals, so that its corners lie alternately above and below.
    """
    if xyz.shape[1] == 4:
        one, two = xyz[:, 2] - xyz[:, 0], xyz[:, 3] - xyz[:, 1]
    else:
        one, two = xyz[:, 1] - xyz[:, 0], xyz[:, 2] - xyz[:, 0]
    with np.errstate(invalid="ignore", divide="ignore"):
        normal = np.cross(one, two)
        normal /= np.linalg.norm(normal, axis=1, keepdims=True)
        first = one / np.linalg.norm(one, axis=1, keepdims=True)
    axes = np.stack([first, np.cross(normal, first), normal], axis=1)
    return axes, (xyz - xyz.mean(axis=1, keepdims=True)) @ np.swapaxes(axes, 1, 2)


def _reject_flat(kind: str, xyz: Array, xy: Array) -> None:
    with np.errstate(invalid="ignore"):
        area = (shell_quad if kind == "quad4" else shell_tri).determinants(xy)
    bad = np.nonzero(~(area > 0).all(axis=1))[0]
    if len(bad):
        x, y, z = xyz[bad[0]].mean(axis=0)
        raise ModelError(
            f"{len(bad)} {kind} cell(s) have no area or are folded over",
            found=f"the first near ({x:g}, {y:g}, {z:g}) m",
            expected="convex cells with an area",
            do="repair the mesh there",
        )


def _placing(axes: Array, offset: Array) -> Array:
    """(b, nd, nd) from global freedoms to those of the plane's corners in element axes; ``offset`` (b, n) m is how
    high the nodes stand above these corners."""
    batch, n = offset.shape
    turn = np.zeros((batch, n, 6, n, 6))
    for node in range(n):
        height = offset[:, node, None]
        turn[:, node, :3, node, :3] = axes
        turn[:, node, 3:, node, 3:] = axes
        turn[:, node, 0, node, 3:] = -height * axes[:, 1]
        turn[:, node, 1, node, 3:] = height * axes[:, 0]
    return turn.reshape(batch, 6 * n, 6 * n)


def _surface(kind: str, xyz: Array) -> tuple[Array, Array, Array]:
    """Shape functions (q, n), area weights (b, q) and unit normals (b, q, 3) of the true surface."""
    points, weights = KINDS[kind].rule(2)
    tangents = jacobians(kind, xyz, points)
    normal = np.cross(tangents[..., 0], tangents[..., 1])
    length = np.linalg.norm(normal, axis=-1)
    return KINDS[kind].shape(points), weights * length, normal / length[..., None]


def _symmetric(matrix: Array) -> Array:
    return 0.5 * (matrix + np.swapaxes(matrix, 1, 2))


SHELLS: tuple[ShellFormulation, ...] = (
    ShellFormulation("quad4-mitc4", "quad4", shell_quad.flat_parts),
    ShellFormulation("quad4-mitc4-mindlin", "quad4", shell_quad.flat_parts, kappa=SHEAR_MINDLIN),
    ShellFormulation("tri3-dkmt", "tri3", shell_tri.flat_parts),
    ShellFormulation("tri3-dkmt-mindlin", "tri3", shell_tri.flat_parts, kappa=SHEAR_MINDLIN),
)
