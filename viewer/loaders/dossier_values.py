"""What the tables of a dossier have in common: kinds of values, units, strictness, places."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import BaseModel, ConfigDict, Field, model_validator

Name = Annotated[str, Field(min_length=1)]
Positive = Annotated[float, Field(gt=0)]
NotNegative = Annotated[float, Field(ge=0)]
Vector = Annotated[list[float], Field(min_length=3, max_length=3)]
ModeNumber = Annotated[int, Field(ge=1)]
Held = Literal["ux", "uy", "uz", "rx", "ry", "rz"]

LENGTHS = {"m": 1.0, "cm": 1e-2, "mm": 1e-3, "um": 1e-6, "in": 0.0254, "ft": 0.3048}
MODULI = {"Pa": 1.0, "kPa": 1e3, "MPa": 1e6, "N/mm2": 1e6, "GPa": 1e9}
DENSITIES = {"kg/m3": 1.0, "g/cm3": 1e3, "t/m3": 1e3, "t/mm3": 1e12}
MASSES = {"kg": 1.0, "g": 1e-3, "t": 1e3}
STIFFNESSES = {"N/m": 1.0, "kN/m": 1e3, "N/mm": 1e3, "kN/mm": 1e6}

Length = Literal["m", "cm", "mm", "um", "in", "ft"]


class Table(BaseModel):
    """Strict: unknown keys, wrong types, NaN and infinities are errors."""

    model_config = ConfigDict(extra="forbid", strict=True, allow_inf_nan=False, frozen=True)


class Units(Table):
    length: Length = "m"
    amplitude: Length | None = None
    modulus: Literal["Pa", "kPa", "MPa", "N/mm2", "GPa"] = "Pa"
    density: Literal["kg/m3", "g/cm3", "t/m3", "t/mm3"] = "kg/m3"
    mass: Literal["kg", "g", "t"] = "kg"
    stiffness: Literal["N/m", "kN/m", "N/mm", "kN/mm"] = "N/m"


class Place(Table):
    """Which nodes: at most one of the four; the tables that need one say so."""

    group: Name | None = None
    nodes: Annotated[list[int], Field(min_length=1)] | None = None
    box: Annotated[list[Vector], Field(min_length=2, max_length=2)] | None = None
    near: Vector | None = None

    @model_validator(mode="after")
    def _one_place(self):
        given = self.given_places()
        if len(given) > 1:
            raise ValueError(f"says {' and '.join(given)}, expected only one of group, nodes, box, near")
        if not given and self._needs_place:
            raise ValueError("says no place, expected one of group, nodes, box, near")
        return self

    @property
    def _needs_place(self) -> bool:
        return True

    def given_places(self) -> list[str]:
        return [name for name in ("group", "nodes", "box", "near") if getattr(self, name) is not None]


class OtherPlace(Place):
    """A place in a table of its own: the second end of a spring, an end of a link, a side of a tie."""
