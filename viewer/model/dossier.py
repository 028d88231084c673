"""The dossier as data: what the TOML file says, checked, in SI, with meshes still on disk."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import TypeVar

import numpy as np

from viewer.errors import DossierError
from viewer.model.arrays import Array, frozen, frozen_map
from viewer.model.design import Clearance, Design, FunctionalPoint, Physics, Selector
from viewer.model.matrices import GivenMatrices, MatrixFiles
from viewer.model.mesh import Mesh
from viewer.model.testset import Correction, Placement
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
class Landmark:
    """A point of a test and where it lies on the mesh: at ``near`` (3,) m, or at the node with the id ``node``."""

    point: str
    near: Array | None = None
    node: int | None = None

    def __post_init__(self) -> None:
        if self.near is not None:
            object.__setattr__(self, "near", frozen(self.near, float, shape=(3,)))

    def place(self, mesh: Mesh) -> Array:
        """(3,) m. ``DossierError`` when the mesh has no such node."""
        if self.near is not None:
            return self.near
        try:
            return mesh.points[mesh.node_rows(np.array([self.node]))[0]]
        except KeyError:
            raise DossierError(
                f"the landmark of point {self.point} names a node that does not exist",
                found=f"node {self.node}",
                expected="an id of a node of the mesh",
            ) from None


@dataclass(frozen=True, eq=False)
class TestPlan:
    """One hammer test before its files are read; with several ``files`` they are runs of one test.

    length_unit  metres per unit of length in the files; None: they say it themselves
    design       the design that the test is set beside
    landmarks    named places for laying the test onto the mesh; () finds the placement from the geometry
    placement    an accepted placement, which stands instead of the landmarks
    corrections  what was accepted as wrong in the test, in the order in which it is put right
    """

    name: str
    files: tuple[Path, ...]
    length_unit: float | None = None
    design: str = ""
    landmarks: tuple[Landmark, ...] = ()
    placement: Placement | None = None
    corrections: tuple[Correction, ...] = ()

    __test__ = False  # not a test case of pytest's


_Plan = TypeVar("_Plan", SweepPlan, TestPlan)


@dataclass(frozen=True, eq=False)
class Dossier:
    """One product's designs, functional points, stated amplitudes, pairs of modes, sweeps and hammer tests."""

    title: str
    path: Path
    plans: tuple[DesignPlan, ...]
    amplitudes: tuple[StatedAmplitude, ...] = ()
    pairs: tuple[ModePair, ...] = ()
    condition: str = ""  # words for pictures that state no size: "clamped root, camera 1.2 kg"
    sweeps: tuple[SweepPlan, ...] = ()
    tests: tuple[TestPlan, ...] = ()
    length_unit: float = 1.0  # m per unit of length in the file

    def plan(self, name: str) -> DesignPlan:
        for plan in self.plans:
            if plan.name == name:
                return plan
        raise DossierError(
            f"no design named '{name}'", file=self.path, expected=f"one of: {', '.join(p.name for p in self.plans)}"
        )

    def sweep(self, name: str) -> SweepPlan:
        return self._named(self.sweeps, name, "sweep", "sweeps")

    def test(self, name: str) -> TestPlan:
        return self._named(self.tests, name, "test", "tests")

    def _named(self, among: tuple[_Plan, ...], name: str, word: str, table: str) -> _Plan:
        for plan in among:
            if plan.name == name:
                return plan
        names = ", ".join(plan.name for plan in among)
        raise DossierError(
            f"no {word} named '{name}'",
            file=self.path,
            expected=f"one of: {names}" if names else f"a {word}, none is declared",
            do="" if names else f"add [[{table}]] to the dossier",
        )
