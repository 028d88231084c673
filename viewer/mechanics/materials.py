"""Elastic constants of isotropic materials as the element formulations use them.

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
    for name, value, good, expected in (
        ("Young's modulus", material.youngs_modulus, material.youngs_modulus > 0, "above 0 Pa"),
        ("Poisson's ratio", material.poisson, -1 < material.poisson < 0.5, "above -1 and below 0.5"),
        ("density", material.density, material.density > 0, "above 0 kg/m³"),
    ):
        if not (good and math.isfinite(value)):
            raise ModelError(
                f"material '{material.name}': {name} cannot be used", found=f"{value:g}", expected=expected,
                do="correct the material",
            )
    return material


def lame(material: Material) -> tuple[float, float]:
    """Lamé's constants λ and μ (the shear modulus), Pa."""
    check(material)
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
