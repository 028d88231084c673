"""The two-node beam in space: six freedoms a node (ux uy uz rx ry rz, global axes), batched over elements.

Stiffness: exact for end loads with shear flexibility (Przemieniecki J.S., Theory of Matrix Structural Analysis, 1968,
ch. 5), so that nothing locks however slender the beam. Mass: consistent with the same deflections, rotary inertia
included (Friedman Z., Kosmatka J.B., An improved two-node Timoshenko beam finite element, Comput. Struct. 47 (1993)
473). Stretching and torsion (Saint-Venant, warping free) are linear along the element.

Section axes: x along the element, z ("up") the orientation made square to x, y = z × x ("across"). Offsets join the
beam's axis to the nodes by rigid arms.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from viewer.errors import ModelError
from viewer.mechanics import materials
from viewer.mechanics.patch import cross_matrix
from viewer.mechanics.sections import SectionConstants, constants
from viewer.model.arrays import Array
from viewer.model.design import Property

_PARALLEL = 1e-6  # sine of the angle between beam and orientation below which "up" is undefined
# one plane of bending: deflection and slope at both ends; the slope of z is minus the turn about y
_PLANES = ((1, 5, 7, 11), 1.0), ((2, 4, 8, 10), -1.0)
_POINTS, _WEIGHTS = np.polynomial.legendre.leggauss(4)  # exact for the sixth power


@dataclass(frozen=True)
class BeamFormulation:
    """``slender`` True leaves out shear flexibility and rotary inertia of bending (Euler and Bernoulli's beam)."""

    name: str
    kind: str = "line2"
    slender: bool = False
    caution: str = ""
    rotations: bool = True
    scalar_mass: bool = False

    def stiffness(self, xyz: Array, prop: Property) -> Array:
        """(b, 12, 12) stiffness of beams ``xyz`` (b, 2, 3) m, N/m with rotations in rad.

        Raises ``ModelError`` for a missing section or orientation and for beams without length.
        """
        section, turn, length = _local(np.asarray(xyz, float), prop)
        modulus, shear = prop.material.youngs_modulus, materials.shear_modulus(prop.material)
        local = np.zeros((len(length), 12, 12))
        for pair, value in (((0, 6), modulus * section.area), ((3, 9), shear * section.torsion)):
            local[np.ix_(range(len(length)), pair, pair)] = (value / length)[:, None, None] * np.array(
                [[1, -1], [-1, 1]]
            )
        for (where, sign), (inertia, slip) in zip(_PLANES, self._bending(section, prop, length), strict=True):
            one, size = np.ones_like(length), length
            bend = (
                np.array(
                    [
                        [12 * one, 6 * size, -12 * one, 6 * size],
                        [6 * size, (4 + slip) * size**2, -6 * size, (2 - slip) * size**2],
                        [-12 * one, -6 * size, 12 * one, -6 * size],
                        [6 * size, (2 - slip) * size**2, -6 * size, (4 + slip) * size**2],
                    ]
                ).transpose(2, 0, 1)
                * (modulus * inertia / (length**3 * (1 + slip)))[:, None, None]
            )
            flip = np.array([1, sign, 1, sign])
            local[np.ix_(range(len(length)), where, where)] = bend * np.outer(flip, flip)
        return _symmetric(np.swapaxes(turn, 1, 2) @ local @ turn)

    def mass(self, xyz: Array, prop: Property) -> Array:
        """(b, 12, 12) consistent mass of beams ``xyz`` (b, 2, 3) m, kg and kg·m²."""
        section, turn, length = _local(np.asarray(xyz, float), prop)
        density = materials.check(prop.material).density
        local = np.zeros((len(length), 12, 12))
        for pair, value in (((0, 6), section.area), ((3, 9), section.iy + section.iz)):
            local[np.ix_(range(len(length)), pair, pair)] = (density * value * length / 6)[:, None, None] * np.array(
                [[2, 1], [1, 2]]
            )
        for (where, sign), (inertia, slip) in zip(_PLANES, self._bending(section, prop, length), strict=True):
            moved, turned = _shapes(length, slip)
            rotary = 0.0 if self.slender else inertia
            weights = density * 0.5 * np.outer(length, _WEIGHTS)
            bend = np.einsum("bq,bqi,bqj->bij", weights * section.area, moved, moved)
            bend += np.einsum("bq,bqi,bqj->bij", weights * rotary, turned, turned)
            flip = np.array([1, sign, 1, sign])
            local[np.ix_(range(len(length)), where, where)] = bend * np.outer(flip, flip)
        return _symmetric(np.swapaxes(turn, 1, 2) @ local @ turn)

    def _bending(self, section: SectionConstants, prop: Property, length: Array) -> list[tuple[float, Array]]:
        """Second moment and 12 EI / (κGA L²) for deflection across and up."""
        ratio = prop.material.youngs_modulus / materials.shear_modulus(prop.material)
        pairs = ((section.iz, section.shear_across), (section.iy, section.shear_up))
        return [
            (inertia, 0 * length if self.slender else 12 * ratio * inertia / (shear * section.area * length**2))
            for inertia, shear in pairs
        ]


def _shapes(length: Array, slip: Array) -> tuple[Array, Array]:
    """Deflection and slope (b, 4 points, 4) under unit end deflections and slopes."""
    x, size, phi = 0.5 * (_POINTS + 1), length[:, None], slip[:, None]
    moved = np.stack(
        np.broadcast_arrays(
            2 * x**3 - 3 * x**2 - phi * x + 1 + phi,
            size * (x**3 - (2 + phi / 2) * x**2 + (1 + phi / 2) * x),
            -(2 * x**3 - 3 * x**2 - phi * x),
            size * (x**3 - (1 - phi / 2) * x**2 - phi / 2 * x),
        ),
        axis=-1,
    )
    turned = np.stack(
        np.broadcast_arrays(
            6 / size * (x**2 - x),
            3 * x**2 - (4 + phi) * x + 1 + phi,
            -6 / size * (x**2 - x),
            3 * x**2 - (2 - phi) * x,
        ),
        axis=-1,
    )
    scale = (1 + phi)[..., None]
    return moved / scale, turned / scale


def _local(xyz: Array, prop: Property) -> tuple[SectionConstants, Array, Array]:
    """Section, operator (b, 12, 12) from nodal freedoms to those of the axis in section axes, and lengths (b,)."""
    if prop.section is None:
        raise ModelError(
            f"line2 cells of material '{prop.material.name}' are beams and need a section",
            do="give 'section' in the assignment of these cells",
        )
    materials.lame(prop.material)  # refuses what is no isotropic solid
    section = constants(prop.section, prop.material.poisson)
    axes, length = section_axes(xyz, prop, section)
    arm = prop.offset * axes[:, 2] + prop.offset_across * axes[:, 1]
    turn = np.zeros((len(xyz), 2, 6, 2, 6))
    for end in range(2):
        turn[:, end, :3, end, :3] = turn[:, end, 3:, end, 3:] = axes
        turn[:, end, :3, end, 3:] = -axes @ cross_matrix(arm)  # u + θ × arm
    return section, turn.reshape(-1, 12, 12), length


def section_axes(xyz: Array, prop: Property, section: SectionConstants) -> tuple[Array, Array]:
    """Axes (b, 3, 3), rows along, across, up, of beams ``xyz`` (b, 2, 3), and their lengths (b,)."""
    along = xyz[:, 1] - xyz[:, 0]
    length = np.linalg.norm(along, axis=1)
    if not (length > 0).all():
        raise ModelError(f"{int((~(length > 0)).sum())} line2 cell(s) have no length", do="repair the mesh there")
    along = along / length[:, None]
    if prop.orientation is not None:
        up = np.broadcast_to(np.asarray(prop.orientation, float), along.shape)
        up = up / max(float(np.linalg.norm(prop.orientation)), 1e-300)
    elif section.symmetric and not (prop.offset or prop.offset_across):
        up = np.eye(3)[np.abs(along).argmin(axis=1)]
    else:
        raise ModelError(
            f"beams with section '{prop.section.shape if prop.section else ''}' need an orientation",
            found="a section that is stiffer one way than the other, or an offset, and no direction of 'up'",
            do="give 'orientation = [x, y, z]' in the assignment of these cells",
        )
    up = up - np.sum(up * along, axis=1, keepdims=True) * along
    size = np.linalg.norm(up, axis=1, keepdims=True)
    if not (size > _PARALLEL).all():
        x, y, z = xyz[int(np.argmin(size))].mean(axis=0)
        raise ModelError(
            f"{int((size <= _PARALLEL).sum())} beam(s) run along their own orientation",
            found=f"one near ({x:g}, {y:g}, {z:g}) m, orientation {list(prop.orientation or ())}",
            expected="a direction that lies across the beam",
            do="give these cells another orientation",
        )
    up = up / size
    return np.stack([along, np.cross(up, along), up], axis=1), length


def _symmetric(matrix: Array) -> Array:
    return 0.5 * (matrix + np.swapaxes(matrix, 1, 2))


BEAMS: tuple[BeamFormulation, ...] = (
    BeamFormulation("line2-timoshenko"),
    BeamFormulation(
        "line2-slender",
        slender=True,
        caution=(
            "line2-slender leaves out shear and rotary inertia: frequencies of deep beams and of high modes come out "
            "high; use line2-timoshenko"
        ),
    ),
)
