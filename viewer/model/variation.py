"""What a sweep changes: a design with one quantity at another value."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from viewer.errors import ModelError
from viewer.model.design import Design, Material, Physics

WHAT = ("thickness", "youngs_modulus", "density", "spring", "mass", "scale")


@dataclass(frozen=True)
class Variation:
    """One quantity of a design.

    what    "thickness" (m) of the sheets that an assignment's ``target`` names; "youngs_modulus" (Pa) or "density"
            (kg/m³) of the material ``target``; "mass" (kg) of the lumped mass, "spring" (factor on all stiffnesses)
            of the spring ``target``; "scale": factor on the coordinates that ``target`` names ("x", "xy", "xyz"),
            about the origin
    """

    what: str
    target: str

    def apply(self, design: Design, value: float) -> Design:
        """The design with the quantity at ``value``. ``ModelError`` when it has no such thing, or ``value`` is not
        above zero."""
        if not value > 0 or not np.isfinite(value):
            raise ModelError(
                f"design '{design.name}': {self.what} of '{self.target}' cannot be {value:g}", expected="above zero"
            )
        if self.what == "scale":
            return self._scaled(design, value)
        return design.with_(physics=self._changed(design.name, design.physics, value))

    def _changed(self, name: str, physics: Physics, value: float) -> Physics:
        if self.what in ("youngs_modulus", "density"):
            if self.target not in physics.materials:
                raise self._unknown(name, "material", list(physics.materials))
            known = physics.materials[self.target]
            if known.directional is not None and self.what == "youngs_modulus":
                raise ModelError(
                    f"design '{name}': '{self.target}' is directional and has no single modulus to sweep"
                )
            return replace(physics, materials={**physics.materials, self.target: self._stiffer(known, value)})
        if self.what == "thickness":
            mine = [a for a in physics.assignments if a.target == self.target and a.thickness is not None]
            if not mine:
                sheets = [a.target for a in physics.assignments if a.thickness is not None]
                raise self._unknown(name, "sheet assignment", sheets)
            changed = tuple(replace(a, thickness=value) if a in mine else a for a in physics.assignments)
            return replace(physics, assignments=changed)
        if self.what == "mass":
            if self.target not in [m.name for m in physics.masses]:
                raise self._unknown(name, "lumped mass", [m.name for m in physics.masses])
            masses = (
                replace(m, mass=value, inertia=m.inertia * value / m.mass) if m.name == self.target else m
                for m in physics.masses
            )
            return replace(physics, masses=tuple(masses))
        if self.target not in [s.name for s in physics.springs]:
            raise self._unknown(name, "spring", [s.name for s in physics.springs])
        springs = (
            replace(s, stiffness=s.stiffness * value, axial=s.axial * value) if s.name == self.target else s
            for s in physics.springs
        )
        return replace(physics, springs=tuple(springs))

    def _stiffer(self, material: Material, value: float) -> Material:
        if self.what == "density":
            return replace(material, density=value)
        return replace(material, youngs_modulus=value)

    def _scaled(self, design: Design, value: float) -> Design:
        """Points of the mesh; what is given by position (boxes, centres of masses) goes with them."""
        if not self.target or set(self.target) - set("xyz"):
            raise self._unknown(design.name, "axes", ["x", "y", "z", "xy", "xyz"])
        factor = np.array([value if axis in self.target else 1.0 for axis in "xyz"])
        physics = design.physics
        placed = (
            [s.where for s in physics.supports]
            + [s.where for s in physics.springs]
            + [m.where for m in physics.masses]
        )
        if any(w.box is not None or w.near is not None for w in placed + [p.where for p in design.points]):
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

    def _unknown(self, name: str, kind: str, known: list[str]) -> ModelError:
        return ModelError(
            f"design '{name}': there is no {kind} '{self.target}' to sweep",
            expected=f"one of: {', '.join(known) or 'there is none'}",
        )
