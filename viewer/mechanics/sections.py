"""Constants of beam sections from their shape.

Shear coefficients: Cowper G.R., The shear coefficient in Timoshenko's beam theory, J. Appl. Mech. 33 (1966) 335.
Torsion of a rectangle: Saint-Venant's series (Timoshenko S.P., Goodier J.N., Theory of Elasticity, 3rd ed., 1970,
art. 109). Circle and circular tube: the polar moment, exact. Every section is taken as doubly symmetric: its axis is
its centroid and its shear centre.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

from viewer.errors import ModelError
from viewer.model.design import Section

_NEEDED = {
    "rectangle": ("width", "height"),
    "round": ("diameter",),
    "tube": ("diameter", "wall"),
    "given": ("area", "iy", "iz", "torsion"),
}


@dataclass(frozen=True)
class SectionConstants:
    """Area m²; iy = ∫ up² dA, iz = ∫ across² dA, torsion constant m⁴; coefficients for shear upwards and across.

    ``symmetric``: bends alike in every direction, so that no orientation is needed.
    """

    area: float
    iy: float
    iz: float
    torsion: float
    shear_up: float
    shear_across: float

    @property
    def symmetric(self) -> bool:
        return math.isclose(self.iy, self.iz, rel_tol=1e-9) and math.isclose(self.shear_up, self.shear_across)


def constants(section: Section, poisson: float) -> SectionConstants:
    """The numbers of a section of material with Poisson's ratio ``poisson``.

    Raises ``ModelError`` for an unknown shape, a measure that is missing or impossible, or one that does not belong.
    """
    needed = _NEEDED.get(section.shape)
    if needed is None:
        raise ModelError(
            f"unknown shape of section '{section.shape}'",
            expected=f"one of: {', '.join(_NEEDED)}",
            do="or give area, iy, iz and torsion",
        )
    measures = {name: getattr(section, name) for names in _NEEDED.values() for name in names}
    for name, value in measures.items():
        if (value is not None) != (name in needed):
            word = "is missing" if name in needed else "does not belong to it"
            raise ModelError(
                f"section '{section.shape}': {name} {word}",
                expected=f"just {', '.join(needed)}",
                do="correct the section",
            )
    for name in (*needed, "shear_up", "shear_across"):
        value = getattr(section, name)
        if value is not None and not 0 < value < math.inf:
            raise ModelError(
                f"section '{section.shape}': {name} is impossible", found=f"{value:g}", expected="above 0"
            )
    area, iy, iz, torsion, up, across = _SHAPES[section.shape](poisson, *(measures[name] for name in needed))
    return SectionConstants(area, iy, iz, torsion, section.shear_up or up, section.shear_across or across)


def _rectangle(poisson: float, width: float, height: float) -> tuple[float, ...]:
    shear = 10 * (1 + poisson) / (12 + 11 * poisson)
    area = width * height
    return area, area * height**2 / 12, area * width**2 / 12, rectangle_torsion(width, height), shear, shear


def rectangle_torsion(width: float, height: float) -> float:
    """Saint-Venant's torsion constant of a rectangle, m⁴."""
    long, short = max(width, height), min(width, height)
    series = sum(math.tanh(n * math.pi * long / (2 * short)) / n**5 for n in range(1, 60, 2))
    return long * short**3 * (1 / 3 - 64 / math.pi**5 * short / long * series)


def _tube(poisson: float, diameter: float, wall: float) -> tuple[float, ...]:
    if wall > diameter / 2:
        raise ModelError(
            "section 'tube': the wall is thicker than half the diameter",
            found=f"{wall:g} m of {diameter:g} m",
            do="give the outer diameter, or shape 'round'",
        )
    inner = diameter - 2 * wall
    ratio = (inner / diameter) ** 2
    second = math.pi / 64 * (diameter**4 - inner**4)
    shear = (
        6 * (1 + poisson) * (1 + ratio) ** 2 / ((7 + 6 * poisson) * (1 + ratio) ** 2 + (20 + 12 * poisson) * ratio)
    )
    return math.pi / 4 * (diameter**2 - inner**2), second, second, 2 * second, shear, shear


_SHAPES: dict[str, Callable[..., tuple[float, ...]]] = {
    "rectangle": _rectangle,
    "round": lambda poisson, diameter: _tube(poisson, diameter, diameter / 2),
    "tube": _tube,
    "given": lambda _, area, iy, iz, torsion: (area, iy, iz, torsion, 5 / 6, 5 / 6),
}
