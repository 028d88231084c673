"""Stiffness and mass per area of sheets: one material or layers, isotropic or directional.

Classical lamination (Jones R.M., Mechanics of Composite Materials, 2nd ed., 1999, ch. 2 and 4): membrane A,
coupling B and bending D about the middle of the sheet. Transverse shear is energy-based: in each of the two
directions the shear flow that equilibrium gives in cylindrical bending holds the same energy as the averaged shear
strain (Whitney J.M., Shear correction factors for orthotropic laminates under static load, J. Appl. Mech. 40 (1973)
302). For a sheet of one material this is Reissner's 5/6; in a sandwich it leaves the shear to the core.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from viewer.errors import ModelError
from viewer.mechanics.materials import check, plane_stress, shear_modulus
from viewer.model.arrays import Array
from viewer.model.design import Layer, Material, Property

REISSNER = 5 / 6
_GAUSS = np.polynomial.legendre.leggauss(3)  # exact for the square of a parabola
_FLAT = 1e-6  # sine of the angle to the normal below which a direction says nothing


@dataclass(frozen=True, eq=False)
class Sheet:
    """Matrices per area, for strains (xx yy xy), curvatures and shear strains (xz yz): (3, 3) and (2, 2), or with a
    leading axis over cells. ``coupling`` is None where membrane and bending do not meet."""

    membrane: Array
    bending: Array
    shear: Array
    coupling: Array | None = None

    def turned(self, angle: Array) -> Sheet:
        """The same sheet in axes from which its own stand at ``angle`` (b,) rad counter-clockwise."""
        strain, slip = strain_turn(angle), slip_turn(angle)
        coupling = None if self.coupling is None else np.swapaxes(strain, 1, 2) @ self.coupling @ strain
        return Sheet(
            np.swapaxes(strain, 1, 2) @ self.membrane @ strain,
            np.swapaxes(strain, 1, 2) @ self.bending @ strain,
            np.swapaxes(slip, 1, 2) @ self.shear @ slip,
            coupling,
        )


def layers_of(prop: Property) -> tuple[Layer, ...]:
    """The layers, bottom first; a sheet of one material is one layer. ``ModelError`` without thickness."""
    layers = prop.layers or (Layer(prop.material, prop.thickness or 0.0),)
    for layer in layers:
        if not 0 < layer.thickness < math.inf:
            raise ModelError(
                f"a sheet of material '{layer.material.name}' needs a thickness",
                found=f"{layer.thickness:g} m",
                expected="above 0 m",
                do="give 'thickness' in the assignment or its layers",
            )
    return layers


def needs_direction(prop: Property) -> bool:
    """Whether the sheet is stiffer one way than another, so that a direction must be given."""
    return any(layer.material.directional is not None for layer in layers_of(prop))


def sheet(prop: Property, shear_factor: float = REISSNER) -> Sheet:
    """The sheet in the axes of its direction. ``shear_factor`` of a uniform sheet; layers keep its ratio to 5/6."""
    layers = layers_of(prop)
    heights = np.concatenate([[0.0], np.cumsum([layer.thickness for layer in layers])])
    heights -= heights[-1] / 2
    low, high = heights[:-1, None, None], heights[1:, None, None]
    moduli = np.stack([reduced(layer.material, layer.angle) for layer in layers])
    shear = np.stack([transverse(layer.material, layer.angle) for layer in layers])
    membrane, coupling, bending = ((moduli * (high**power - low**power) / power).sum(axis=0) for power in (1, 2, 3))
    if len(layers) == 1:  # the cube of halves loses digits that the closed form keeps
        bending = moduli[0] * layers[0].thickness ** 3 / 12
    total = (shear * (high - low)).sum(axis=0)
    factors = [_shear_factor(heights, moduli[:, i, i], shear[:, i, i]) for i in (0, 1)]
    scale = np.sqrt(np.array(factors) * shear_factor / REISSNER)
    touching = np.abs(coupling).max() > 1e-12 * np.abs(membrane).max() * heights[-1]
    return Sheet(membrane, bending, total * np.outer(scale, scale), coupling if touching else None)


def mass_moments(prop: Property) -> tuple[float, float, float]:
    """∫ρ dz kg/m², ∫ρz dz kg/m and ∫ρz² dz kg about the middle of the sheet."""
    layers = layers_of(prop)
    heights = np.concatenate([[0.0], np.cumsum([layer.thickness for layer in layers])])
    heights -= heights[-1] / 2
    density = np.array([check(layer.material).density for layer in layers])
    if len(layers) == 1:
        return density[0] * layers[0].thickness, 0.0, density[0] * layers[0].thickness ** 3 / 12
    zero, one, two = (
        float((density * (heights[1:] ** power - heights[:-1] ** power) / power).sum()) for power in (1, 2, 3)
    )
    return zero, one, two


def reduced(material: Material, angle: float) -> Array:
    """(3, 3) plane-stress stiffness, Pa, in axes from which the material's stand at ``angle`` degrees."""
    constants = check(material).directional
    if constants is None:
        return plane_stress(material)
    back = constants.nu12 * constants.e2 / constants.e1
    own = np.array(
        [
            [constants.e1, back * constants.e1, 0],
            [back * constants.e1, constants.e2, 0],
            [0, 0, 0],
        ]
    ) / (1 - constants.nu12 * back)
    own[2, 2] = constants.g12
    turn = strain_turn(np.radians([angle]))[0]
    return turn.T @ own @ turn


def transverse(material: Material, angle: float) -> Array:
    """(2, 2) transverse shear stiffness, Pa, in the same axes."""
    constants = check(material).directional
    if constants is None:
        return shear_modulus(material) * np.eye(2)
    turn = slip_turn(np.radians([angle]))[0]
    return turn.T @ np.diag([constants.g13, constants.g23]) @ turn


def strain_turn(angle: Array) -> Array:
    """(b, 3, 3) strains (xx yy, engineering xy) in axes turned by ``angle`` (b,) rad from strains in the old ones."""
    c, s = np.cos(angle), np.sin(angle)
    return np.stack(
        [
            np.stack([c * c, s * s, c * s], axis=-1),
            np.stack([s * s, c * c, -c * s], axis=-1),
            np.stack([-2 * c * s, 2 * c * s, c * c - s * s], axis=-1),
        ],
        axis=-2,
    )


def slip_turn(angle: Array) -> Array:
    """(b, 2, 2) shear strains (xz yz) in axes turned by ``angle`` (b,) rad."""
    c, s = np.cos(angle), np.sin(angle)
    return np.stack([np.stack([c, s], axis=-1), np.stack([-s, c], axis=-1)], axis=-2)


def directions(prop: Property, axes: Array) -> Array:
    """(b,) angle, rad, of the sheet's direction in the element axes (b, 3, 3), rows e1 e2 n.

    ``ModelError`` when it is missing or points along the normal.
    """
    if prop.direction is None:
        raise ModelError(
            f"a sheet of directional material '{prop.material.name}' has no direction",
            do="give 'direction = [x, y, z]', axis 1 of the material, in the assignment of these cells",
        )
    along = axes @ (np.asarray(prop.direction, float) / max(float(np.linalg.norm(prop.direction)), 1e-300))
    flat = np.hypot(along[:, 0], along[:, 1])
    if not (flat > _FLAT).all():
        raise ModelError(
            f"the direction of material '{prop.material.name}' stands square to {int((flat <= _FLAT).sum())} cells",
            found=f"direction {list(prop.direction)}",
            expected="a direction that lies in the sheet, or nearly",
            do="give these cells another direction",
        )
    return np.arctan2(along[:, 1], along[:, 0])


def _shear_factor(heights: Array, moduli: Array, shear: Array) -> float:
    """Shear stiffness by energy over ∫G dz, in cylindrical bending with moduli and shear moduli by layer."""
    low, high = heights[:-1], heights[1:]
    neutral = (moduli * (high**2 - low**2)).sum() / (2 * (moduli * (high - low)).sum())
    rigidity = (moduli * ((high - neutral) ** 3 - (low - neutral) ** 3)).sum() / 3
    at = 0.5 * (low + high)[:, None] + 0.5 * (high - low)[:, None] * _GAUSS[0]
    steps = moduli * ((high - neutral) ** 2 - (low - neutral) ** 2) / 2
    below = np.concatenate([[0.0], np.cumsum(steps)])[:-1, None]
    flow = (below + moduli[:, None] * ((at - neutral) ** 2 - (low[:, None] - neutral) ** 2) / 2) / rigidity
    energy = (0.5 * (high - low)[:, None] * _GAUSS[1] * flow**2 / shear[:, None]).sum()
    return float(1 / energy / (shear * (high - low)).sum())
