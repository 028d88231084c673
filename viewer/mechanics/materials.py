"""Elastic constants of materials as the element formulations use them; directional sheets: ``laminate.py``.

Voigt order xx yy zz xy yz zx, engineering shear strains (γ = 2ε).
"""

from __future__ import annotations

import math

import numpy as np

from viewer.errors import ModelError
from viewer.model.arrays import Array
from viewer.model.design import Material


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
            f"material '{material.name}' is directional and stands on solids or beams",
            expected="directional material on shells only",
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


def plane_stress(material: Material) -> Array:
    """(3, 3) stress per strain (xx yy xy) in a sheet free of stress through its thickness, Pa."""
    check(material)
    ratio = material.poisson
    factor = material.youngs_modulus / (1 - ratio**2)
    return factor * np.array([[1, ratio, 0], [ratio, 1, 0], [0, 0, (1 - ratio) / 2]])
