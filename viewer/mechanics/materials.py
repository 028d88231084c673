"""Elastic constants of materials as the element formulations use them; directional sheets: ``laminate.py``.

Voigt order xx yy zz xy yz zx, engineering shear strains (γ = 2ε).
"""

from __future__ import annotations

import math

import numpy as np

from viewer.errors import ModelError
from viewer.model.arrays import Array
from viewer.model.design import Material, Property

_VOIGT = ((0, 0), (1, 1), (2, 2), (0, 1), (1, 2), (2, 0))
_SQUARE = 1e-6  # sine of the angle between direction and orientation below which axis 3 is not told
_ALIKE = 1e-9  # relative difference of constants that count as the same


def check(material: Material) -> Material:
    """The same material; ``ModelError`` when its constants are no stable elastic solid with mass."""
    checks = [("density", material.density, material.density > 0, "above 0 kg/m³")]
    if material.directional is None:
        checks = [
            ("Young's modulus", material.youngs_modulus, material.youngs_modulus > 0, "above 0 Pa"),
            ("Poisson's ratio", material.poisson, -1 < material.poisson < 0.5, "above -1 and below 0.5"),
            *checks,
        ]
    else:
        own = material.directional
        checks += [
            (name, getattr(own, name), getattr(own, name) > 0, "above 0 Pa")
            for name in ("e1", "e2", "g12", "g13", "g23")
        ]
        # else the strain energy of some plane stress would be negative (Jones 1999, § 2.4)
        checks.append(("nu12", own.nu12, own.nu12**2 * own.e2 < own.e1, "below √(e1/e2) in size"))
    for name, value, good, expected in checks:
        if not (good and math.isfinite(value)):
            raise ModelError(
                f"material '{material.name}': {name} cannot be used",
                found=f"{value:g}",
                expected=expected,
                do="correct the material",
            )
    return material


def lame(material: Material) -> tuple[float, float]:
    """Lamé's constants λ and μ (the shear modulus), Pa."""
    check(material)
    if material.directional is not None:
        raise ModelError(
            f"material '{material.name}' is directional and stands on beams",
            expected="directional material on shells and solids only",
            do="give these cells an isotropic material",
        )
    modulus, ratio = material.youngs_modulus, material.poisson
    return modulus * ratio / ((1 + ratio) * (1 - 2 * ratio)), modulus / (2 * (1 + ratio))


def shear_modulus(material: Material) -> float:
    """Shear modulus, Pa."""
    return lame(material)[1]


def solid(material: Material) -> Array:
    """(6, 6) stress per strain of a solid, Pa."""
    first, second = lame(material)
    matrix = np.diag([2 * second] * 3 + [second] * 3)
    matrix[:3, :3] += first
    return matrix


def tensor(prop: Property) -> Array:
    """(3, 3, 3, 3) elasticity of a directional solid in global axes, Pa, stress ij per strain kl.

    Axis 1 lies along the property's direction, axis 3 in the plane of direction and orientation; a material that is
    the same all around axis 1 needs no orientation. Compliance by Jones R.M., Mechanics of Composite Materials, 2nd
    ed., 1999, § 2.3. Raises ``ModelError`` for constants or axes that are missing or impossible.
    """
    own = _stiffness(check(prop.material))
    full = np.empty((3, 3, 3, 3))
    for m, (i, j) in enumerate(_VOIGT):
        for n, (p, q) in enumerate(_VOIGT):
            full[i, j, p, q] = full[j, i, p, q] = full[i, j, q, p] = full[j, i, q, p] = own[m, n]
    axes = _axes(prop)
    return np.einsum("pi,qj,rk,sl,pqrs->ijkl", axes, axes, axes, axes, full)


def voigt(elasticity: Array) -> Array:
    """(6, 6) of an elasticity tensor (3, 3, 3, 3)."""
    return np.array([[elasticity[i, j, p, q] for p, q in _VOIGT] for i, j in _VOIGT])


def _stiffness(material: Material) -> Array:
    """(6, 6) stress per strain along the axes of a directional material, Pa."""
    own = material.directional
    assert own is not None
    if own.e3 is None or own.nu13 is None or own.nu23 is None:
        raise ModelError(
            f"material '{material.name}' is directional and stands on solids",
            found="no " + ", ".join(name for name in ("e3", "nu13", "nu23") if getattr(own, name) is None),
            do="give e3, nu13 and nu23: how it behaves along axis 3",
        )
    compliance = np.diag([1 / own.e1, 1 / own.e2, 1 / own.e3, 1 / own.g12, 1 / own.g23, 1 / own.g13])
    compliance[0, 1] = compliance[1, 0] = -own.nu12 / own.e1
    compliance[0, 2] = compliance[2, 0] = -own.nu13 / own.e1
    compliance[1, 2] = compliance[2, 1] = -own.nu23 / own.e2
    scale = np.sqrt(np.diag(compliance))
    least = np.linalg.eigvalsh(compliance / np.outer(scale, scale))[0]
    if not (own.e3 > 0 and least > 0):
        raise ModelError(
            f"material '{material.name}': some stress would give energy back",
            found=f"e1 {own.e1:g}, e2 {own.e2:g}, e3 {own.e3:g}, nu12 {own.nu12:g}, nu13 {own.nu13:g}, "
            f"nu23 {own.nu23:g}",
            expected="nu12² < e1/e2, nu13² < e1/e3, nu23² < e2/e3, and all three small enough together",
            do="correct the material; nu12 is the contraction along 2 under stress along 1",
        )
    return np.linalg.inv(compliance)


def _axes(prop: Property) -> Array:
    """(3, 3) rows: the material's axes 1, 2, 3."""
    name = prop.material.name
    if prop.direction is None or not np.linalg.norm(prop.direction) > 0:
        raise ModelError(
            f"a solid of directional material '{name}' has no direction",
            do="give 'direction = [x, y, z]', axis 1 of the material, in the assignment of these cells",
        )
    first = np.asarray(prop.direction, float) / np.linalg.norm(prop.direction)
    up = prop.orientation
    if up is None:
        if not _same_around(prop.material):
            raise ModelError(
                f"a solid of directional material '{name}' has no orientation",
                found="different constants along axes 2 and 3",
                do="give 'orientation = [x, y, z]', axis 3 of the material, in the assignment of these cells",
            )
        up = tuple(np.eye(3)[np.argmin(np.abs(first))])
    third = np.asarray(up, float) / max(float(np.linalg.norm(up)), 1e-300)
    third = third - (third @ first) * first
    if not np.linalg.norm(third) > _SQUARE:
        raise ModelError(
            f"direction and orientation of directional material '{name}' are parallel",
            found=f"{list(prop.direction)} and {list(up)}",
            expected="axis 1 and axis 3 of the material",
            do="give these cells another orientation",
        )
    third /= np.linalg.norm(third)
    return np.stack([first, np.cross(third, first), third])


def _same_around(material: Material) -> bool:
    """Whether a directional material is the same in all directions square to axis 1."""
    own = material.directional
    assert own is not None and own.e3 is not None and own.nu13 is not None and own.nu23 is not None
    pairs = [(own.e2, own.e3), (own.g12, own.g13), (own.nu12, own.nu13), (own.g23, own.e2 / (2 * (1 + own.nu23)))]
    return all(math.isclose(one, other, rel_tol=_ALIKE) for one, other in pairs)


def plane_stress(material: Material) -> Array:
    """(3, 3) stress per strain (xx yy xy) in a sheet free of stress through its thickness, Pa."""
    check(material)
    ratio = material.poisson
    factor = material.youngs_modulus / (1 - ratio**2)
    return factor * np.array([[1, ratio, 0], [ratio, 1, 0], [0, 0, (1 - ratio) / 2]])
