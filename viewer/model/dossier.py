"""The dossier as data: what the TOML file says, checked, in SI, with meshes still on disk."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from pathlib import Path

import numpy as np

from viewer.errors import DossierError
from viewer.model.arrays import Array, frozen, frozen_map
from viewer.model.design import Clearance, Design, FunctionalPoint, Physics, Selector
from viewer.model.matrices import GivenMatrices, MatrixFiles
from viewer.model.mesh import Mesh
from viewer.model.variation import Variation


@dataclass(frozen=True, eq=False)
class StatedAmplitude:
    """A real displacement somebody states for one mode of one design: the only source of size.

    value      m, along ``direction`` (unit vector), at the functional point ``point`` or the nodes ``where``
    statistic  "peak", "rms" or "3 sigma"
    relative   True when measured relative to the base, False when absolute
    condition  the words of the circumstance: "belt drive at 12 Hz"
    """

    design: str
    mode: int  # number from 1
    value: float
    direction: Array
    point: str = ""
    where: Selector | None = None
    statistic: str = "peak"
    relative: bool = False
    condition: str = ""
    place: str = ""  # words for the place when it is not a named point

    def __post_init__(self) -> None:
        direction = np.asarray(self.direction, float)
        object.__setattr__(self, "direction", frozen(direction / np.linalg.norm(direction), shape=(3,)))


@dataclass(frozen=True, eq=False)
class DesignPlan:
    """One design before its mesh and matrices are read: ``build(mesh, matrices)`` gives the design."""

    name: str
    mesh_file: Path
    length_unit: float = 1.0  # metres per unit of length in the mesh file
    modes_file: Path | None = None  # None: solve
    mode_count: int = 6
    physics: Physics = field(default_factory=Physics)
    points: tuple[FunctionalPoint, ...] = ()
    mode_names: Mapping[int, str] = field(default_factory=dict)
    note: str = ""
    matrices: MatrixFiles | None = None  # stiffness and mass instead of assignments
    clearances: tuple[Clearance, ...] = ()  # boxes that no strut may pass

    def __post_init__(self) -> None:
        object.__setattr__(self, "mode_names", frozen_map(self.mode_names))

    def build(self, mesh: Mesh, matrices: GivenMatrices | None = None) -> Design:
        physics = replace(self.physics, matrices=matrices)
        return Design(self.name, mesh, physics, self.points, self.mode_names, self.note)


@dataclass(frozen=True, eq=False)
class ModePair:
    """Two modes that the user says correspond: numbers from 1."""

    first_design: str
    first_mode: int
    second_design: str
    second_mode: int


@dataclass(frozen=True)
class SweepPlan:
    """A design to be solved at several ``values`` (SI, ascending) of one of its quantities, ``count`` modes each.

    insert  put further steps where modes pass one another too fast for the given ones
    """

    name: str
    design: str
    variation: Variation
    values: tuple[float, ...]
    count: int
    insert: bool = False


@dataclass(frozen=True, eq=False)
class Dossier:
    """One product's designs, functional points, stated amplitudes, pairs of modes and sweeps."""

    title: str
    path: Path
    plans: tuple[DesignPlan, ...]
    amplitudes: tuple[StatedAmplitude, ...] = ()
    pairs: tuple[ModePair, ...] = ()
    condition: str = ""  # words for pictures that state no size: "clamped root, camera 1.2 kg"
    sweeps: tuple[SweepPlan, ...] = ()

    def plan(self, name: str) -> DesignPlan:
        for plan in self.plans:
            if plan.name == name:
                return plan
        raise DossierError(
            f"no design named '{name}'", file=self.path, expected=f"one of: {', '.join(p.name for p in self.plans)}"
        )

    def sweep(self, name: str) -> SweepPlan:
        for sweep in self.sweeps:
            if sweep.name == name:
                return sweep
        names = ", ".join(s.name for s in self.sweeps)
        raise DossierError(
            f"no sweep named '{name}'",
            file=self.path,
            expected=f"one of: {names}" if names else "a sweep, none is declared",
            do="" if names else "add [[sweeps]] to the dossier",
        )
