"""What a sweep changes: a design with one quantity at another value."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from viewer.errors import ModelError
from viewer.model.design import Design, Material, Physics, Selector

WHAT = ("thickness", "youngs_modulus", "density", "spring", "mass", "scale")
_WORDS = {"youngs_modulus": "Young's modulus", "spring": "stiffness factor"}
_KINDS = {
    "thickness": "sheet assignment",
    "youngs_modulus": "material",
    "density": "material",
    "spring": "spring",
    "mass": "lumped mass",
    "scale": "axes",
}
_AXES = ("x", "y", "z", "xy", "xz", "yz", "xyz")


@dataclass(frozen=True)
class Unit:
    """What values are told in: ``name``, empty for a plain number, of ``si`` of the SI unit each."""

    name: str = ""
    si: float = 1.0


PLAIN = Unit()


@dataclass(frozen=True)
class Variation:
    """One quantity of a design.

    what    "thickness" (m) of the sheets that an assignment's ``target`` names; "youngs_modulus" (Pa) or "density"
            (kg/m³) of the material ``target``; "mass" (kg) of the lumped mass, "spring" (factor on all stiffnesses)
            of the spring ``target``; "scale": factor on the coordinates that ``target`` names ("x", "xy", "xyz"),
            about the origin
    unit    what the user tells values in
    """

    what: str
    target: str
    unit: Unit = PLAIN

    @property
    def words(self) -> str:
        """The quantity in words: "thickness of web"."""
        if self.what == "scale":
            return f"scale along {' and '.join(self.target)}"
        name = _WORDS.get(self.what, self.what)
        return name if self.target == "*" else f"{name} of {self.target}"

    @property
    def kind(self) -> str:
        """What ``target`` is the name of."""
        return _KINDS[self.what]

    def targets(self, physics: Physics) -> tuple[str, ...]:
        """What can be swept."""
        if self.what == "thickness":
            return tuple(a.target for a in physics.assignments if a.thickness is not None)
        if self.what == "youngs_modulus":
            return tuple(n for n, material in physics.materials.items() if material.directional is None)
        if self.what == "density":
            return tuple(physics.materials)
        if self.what == "scale":
            return _AXES
        return tuple(item.name for item in (physics.masses if self.what == "mass" else physics.springs))

    def own_value(self, design: Design) -> float:
        """What the quantity is in ``design`` as it stands; 1 for factors."""
        physics = design.physics
        if self.what in ("spring", "scale"):
            return 1.0
        if self.what == "thickness":
            return next(a.thickness for a in physics.assignments if a.target == self.target and a.thickness)
        if self.what == "mass":
            return next(m.mass for m in physics.masses if m.name == self.target)
        return float(getattr(physics.materials[self.target], self.what))

    def apply(self, design: Design, value: float) -> Design:
        """The design with the quantity at ``value``. ``ModelError`` when it has no such thing, or ``value`` is not
        above zero."""
        if not value > 0 or not np.isfinite(value):
            raise ModelError(
                f"design '{design.name}': {self.what} of '{self.target}' cannot be {value:g}", expected="above zero"
            )
        if self.target not in (known := self.targets(design.physics)):
            raise ModelError(
                f"design '{design.name}': there is no {self.kind} '{self.target}' to sweep",
                expected=f"one of: {', '.join(known) or 'there is none'}",
            )
        if self.what == "scale":
            return self._scaled(design, value)
        return design.with_(physics=self._changed(design.physics, value))

    def _changed(self, physics: Physics, value: float) -> Physics:
        if self.what in ("youngs_modulus", "density"):
            material = self._other(physics.materials[self.target], value)
            return replace(physics, materials={**physics.materials, self.target: material})
        if self.what == "thickness":
            assignments = (
                replace(a, thickness=value) if a.target == self.target and a.thickness is not None else a
                for a in physics.assignments
            )
            return replace(physics, assignments=tuple(assignments))
        if self.what == "mass":
            masses = (
                replace(m, mass=value, inertia=m.inertia * value / m.mass) if m.name == self.target else m
                for m in physics.masses
            )
            return replace(physics, masses=tuple(masses))
        springs = (
            replace(s, stiffness=s.stiffness * value, axial=s.axial * value) if s.name == self.target else s
            for s in physics.springs
        )
        return replace(physics, springs=tuple(springs))

    def _other(self, material: Material, value: float) -> Material:
        if self.what == "density":
            return replace(material, density=value)
        return replace(material, youngs_modulus=value)

    def _scaled(self, design: Design, value: float) -> Design:
        """Points of the mesh; what is given by position (boxes, centres of masses) goes with them."""
        factor = np.array([value if axis in self.target else 1.0 for axis in "xyz"])
        physics = design.physics
        things = [
            *physics.supports, *physics.springs, *physics.masses, *physics.links, *physics.ties, *physics.struts,
            *design.points,
        ]  # fmt: skip
        placed = [where for item in things for where in vars(item).values() if isinstance(where, Selector)]
        if any(w.box is not None or w.near is not None for w in placed):
            raise ModelError(
                f"design '{design.name}': a sweep of scale needs everything picked by group or node ids",
                found="a box or a nearest point",
                do="name groups in the mesh",
            )
        move = lambda item: item if item.position is None else replace(item, position=item.position * factor)  # noqa: E731
        return design.with_(
            mesh=replace(design.mesh, points=design.mesh.points * factor),
            physics=replace(physics, masses=tuple(move(m) for m in physics.masses)),
            points=tuple(move(p) for p in design.points),
        )
