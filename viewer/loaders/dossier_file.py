"""``dossier.toml`` as data in SI: units, references, duplicates, files and plausible values are checked here.

The layout stands in :mod:`viewer.loaders.dossier_schema`.
"""

from __future__ import annotations

import os
from collections.abc import Iterable
from pathlib import Path
from typing import Any

import numpy as np

from viewer.errors import DossierError
from viewer.loaders import dossier_schema as schema
from viewer.loaders.dossier_parse import parsed
from viewer.loaders.dossier_parts import Parts
from viewer.loaders.dossier_test_plans import plan_of_test
from viewer.model.design import (
    DIRECTIONS,
    Assignment,
    Clearance,
    Directional,
    FunctionalPoint,
    Link,
    LumpedMass,
    Material,
    Physics,
    Ply,
    Section,
    Spring,
    Strut,
    Support,
    Tie,
)
from viewer.model.dossier import DesignPlan, Dossier, ModePair, StatedAmplitude, SweepPlan
from viewer.model.matrices import MatrixFiles
from viewer.model.variation import Unit, Variation

DEFAULT_MODE_COUNT = 6
# How units are written to be read, where the dossier's way is meant for typing.
_SIGNS = {"um": "µm", "N/mm2": "N/mm²", "kg/m3": "kg/m³", "g/cm3": "g/cm³", "t/m3": "t/m³", "t/mm3": "t/mm³"}


def read_dossier(path: str | os.PathLike[str]) -> Dossier:
    """Read and check a dossier. Everything returned is SI; meshes stay on disk.

    Raises ``DossierError`` naming the file, the table and key, what was found and what was expected.
    """
    return read_dossier_report(path)[0]


def read_dossier_report(path: str | os.PathLike[str]) -> tuple[Dossier, tuple[str, ...]]:
    """As :func:`read_dossier`, with warnings in words for values that are possible but implausible."""
    path = Path(path)
    _, table = parsed(path)
    reader = _Reader(path, table)
    return reader.dossier(), tuple(reader.warnings)


class _Reader(Parts):
    """One pass over the tables."""

    def __init__(self, path: Path, table: schema.DossierTable) -> None:
        units = table.units
        super().__init__(path, schema.LENGTHS[units.length])
        self.table = table
        self.amplitude_unit = schema.LENGTHS[units.amplitude or units.length]
        self.mass_unit = schema.MASSES[units.mass]
        self.stiffness_unit = schema.STIFFNESSES[units.stiffness]

    def dossier(self) -> Dossier:
        table = self.table
        self.no_duplicates("designs", [design.name for design in table.designs])
        self.no_duplicates("points", [point.name for point in table.points])
        materials = {name: self.material(name, item) for name, item in table.materials.items()}
        points = {
            item.name: self.point(item, f'points {n} ("{item.name}")') for n, item in enumerate(table.points, 1)
        }
        plans = tuple(
            self.plan(item, f'designs {n} ("{item.name}")', materials, points)
            for n, item in enumerate(table.designs, 1)
        )
        amplitudes = tuple(
            self.amplitude(item, f"amplitudes {n}", plans) for n, item in enumerate(table.amplitudes, 1)
        )
        self.no_duplicates("amplitudes", [f"{a.design}, mode {a.mode}" for a in amplitudes])
        pairs = tuple(self.pair(item, f"pairs {n}", plans) for n, item in enumerate(table.pairs, 1))
        self.no_duplicates("sweeps", [sweep.name for sweep in table.sweeps])
        sweeps = tuple(
            self.sweep(item, f'sweeps {n} ("{item.name}")', plans) for n, item in enumerate(table.sweeps, 1)
        )
        self.no_duplicates("tests", [test.name for test in table.tests])
        tests = tuple(
            plan_of_test(self, item, f'tests {n} ("{item.name}")', plans) for n, item in enumerate(table.tests, 1)
        )
        return Dossier(table.title, self.path, plans, amplitudes, pairs, table.condition, sweeps, tests, self.length)

    def plan(
        self, item: schema.DesignTable, place: str, materials: dict[str, Material], points: dict[str, FunctionalPoint]
    ) -> DesignPlan:
        self.no_duplicates(f"{place}, points", [point.name for point in item.points])
        own = {p.name: self.point(p, f'{place}, points {n} ("{p.name}")') for n, p in enumerate(item.points, 1)}
        unit = item.length_unit
        return DesignPlan(
            item.name,
            self.existing(item.mesh, f"{place}, mesh"),
            float(schema.LENGTHS[unit] if isinstance(unit, str) else unit),
            None if item.modes is None else self.existing(item.modes, f"{place}, modes"),
            item.solve or DEFAULT_MODE_COUNT,
            self.physics(item, place, materials),
            tuple({**points, **own}.values()),
            self.mode_names(item, place),
            item.note,
            self.matrices(item, place),
            self.clearances(item.name),
        )

    def clearances(self, design: str) -> tuple[Clearance, ...]:
        """The boxes that must stay empty in ``design``."""
        found = []
        for number, item in enumerate(self.table.clearances, 1):
            place = f"clearances {number}"
            for name in item.designs or ():
                self.known("design", name, [each.name for each in self.table.designs], f"{place}, designs")
            if item.designs is None or design in item.designs:
                found.append(Clearance(item.name or f"clearance {number}", self.box(item.box, place)))
        return tuple(found)

    def matrices(self, item: schema.DesignTable, place: str) -> MatrixFiles | None:
        if item.stiffness is None or item.mass_matrix is None or item.matrix_order is None:
            return None
        named = item.matrix_order in schema.MATRIX_ORDERS
        order = item.matrix_order if named else self.existing(item.matrix_order, f"{place}, matrix_order")
        return MatrixFiles(
            self.existing(item.stiffness, f"{place}, stiffness"),
            self.existing(item.mass_matrix, f"{place}, mass_matrix"),
            order,
            self.stiffness_unit,
            self.mass_unit,
        )

    def physics(self, item: schema.DesignTable, place: str, materials: dict[str, Material]) -> Physics:
        assignments = tuple(
            self.assignment(a, f"{place}, assign {n}", materials) for n, a in enumerate(item.assign, 1)
        )
        supports = tuple(self.support(s, f"{place}, supports {n}", n) for n, s in enumerate(item.supports, 1))
        springs = tuple(self.spring(s, f"{place}, springs {n}", n) for n, s in enumerate(item.springs, 1))
        masses = tuple(self.mass(m, f"{place}, masses {n}", n) for n, m in enumerate(item.masses, 1))
        links = tuple(self.link(m, f"{place}, links {n}", n) for n, m in enumerate(item.links, 1))
        ties = tuple(self.tie(m, f"{place}, ties {n}", n) for n, m in enumerate(item.ties, 1))
        struts = tuple(self.strut(s, f"{place}, struts {n}", n) for n, s in enumerate(item.struts, 1))
        named: dict[str, Iterable[Any]] = {
            "supports": supports,
            "springs": springs,
            "masses": masses,
            "links": links,
            "ties": ties,
            "struts": struts,
        }
        for word, things in named.items():
            self.no_duplicates(f"{place}, {word}", [thing.name for thing in things])
        used = {a.material for a in assignments} | {ply.material for a in assignments for ply in a.plies}
        kept = {n: m for n, m in materials.items() if n in used}
        return Physics(kept, assignments, supports, springs, masses, links, ties, struts)

    def material(self, name: str, item: schema.MaterialTable) -> Material:
        place = f"materials.{name}"
        units = self.table.units
        assert item.density is not None
        density = self.plausible("density", item.density * schema.DENSITIES[units.density], place)
        unit = schema.MODULI[units.modulus]
        if not item.directional:
            assert item.youngs_modulus is not None and item.poisson is not None
            modulus = self.plausible("youngs_modulus", item.youngs_modulus * unit, place)
            return Material(name, modulus, item.poisson, density)
        e1, e2, g12, g13, g23 = (float(getattr(item, key) or 0) * unit for key in ("e1", "e2", "g12", "g13", "g23"))
        for modulus in (e1, e2):
            self.plausible("youngs_modulus", modulus, place)
        e3 = None if item.e3 is None else self.plausible("youngs_modulus", item.e3 * unit, place)
        directional = Directional(e1, e2, item.nu12 or 0.0, g12, g13, g23, e3, item.nu13, item.nu23)
        return Material(name, e1, directional.nu12, density, directional)

    def assignment(self, item: schema.AssignTable, place: str, materials: dict[str, Material]) -> Assignment:
        single = [] if item.material is None else [item.material]
        for name in single if item.layers is None else [layer.material for layer in item.layers]:
            where = place if item.layers is None else f"{place}, layers"
            self.known("material", name, materials, f"{where}, material")
        plies = tuple(Ply(layer.material, layer.thickness * self.length, layer.angle) for layer in item.layers or ())
        thickness = None
        if item.thickness is not None or plies:
            total = sum(ply.thickness for ply in plies) or (item.thickness or 0.0) * self.length
            thickness = self.plausible("thickness", total, place)
        return Assignment(
            item.target,
            item.material or "",
            None if plies else thickness,
            item.formulation,
            None if item.section is None else self.section(item.section),
            self.vector(item.orientation, f"{place}, orientation"),
            item.offset * self.length,
            item.offset_across * self.length,
            self.vector(item.direction, f"{place}, direction"),
            plies,
        )

    def section(self, item: schema.SectionTable) -> Section:
        power = {"area": 2, "iy": 4, "iz": 4, "torsion": 4, "shear_up": 0, "shear_across": 0}
        given = {name: value for name, value in item.model_dump().items() if value is not None and name != "shape"}
        return Section(item.shape, **{key: value * self.length ** power.get(key, 1) for key, value in given.items()})

    def link(self, item: schema.LinkTable, place: str, number: int) -> Link:
        return Link(
            item.name or f"link {number}",
            self.selector(item.from_, f"{place}, from"),
            self.selector(item.to, f"{place}, to"),
        )

    def tie(self, item: schema.TieTable, place: str, number: int) -> Tie:
        return Tie(
            item.name or f"tie {number}",
            self.selector(item.nodes, f"{place}, nodes"),
            self.selector(item.surface, f"{place}, surface"),
            None if item.reach is None else item.reach * self.length,
        )

    def support(self, item: schema.SupportTable, place: str, number: int) -> Support:
        held = DIRECTIONS if item.held is None else tuple(name for name in DIRECTIONS if name in item.held)
        return Support(item.name or item.group or f"support {number}", self.selector(item, place), held)

    def spring(self, item: schema.SpringTable, place: str, number: int) -> Spring:
        stiffness = np.zeros(6)
        for i, value in enumerate(item.stiffness or ()):
            stiffness[i] = value * (self.stiffness_unit if i < 3 else 1.0)
        return Spring(
            item.name or f"spring {number}",
            self.selector(item, place),
            None if item.to is None else self.selector(item.to, f"{place}, to"),
            stiffness,
            None if item.axis is None else self.direction(item.axis, f"{place}, axis"),
            (item.axial or 0.0) * self.stiffness_unit,
        )

    def strut(self, item: schema.StrutTable, place: str, number: int) -> Strut:
        return Strut(
            item.name or f"strut {number}",
            self.selector(item, place),
            self.selector(item.to, f"{place}, to"),
            item.stiffness * self.stiffness_unit,
            item.mass * self.mass_unit,
        )

    def mass(self, item: schema.MassTable, place: str, number: int) -> LumpedMass:
        value = self.plausible("mass", item.mass * self.mass_unit, place)
        inertia = self.inertia(item.inertia, f"{place}, inertia")
        if inertia.any():
            self.plausible("radius_of_gyration", float(np.sqrt(np.trace(inertia) / 3 / value)), place)
        return LumpedMass(
            item.name or item.group or f"mass {number}",
            self.selector(item, place),
            value,
            self.position(item.position),
            inertia,
        )

    def point(self, item: schema.PointTable, place: str) -> FunctionalPoint:
        return FunctionalPoint(
            item.name,
            self.selector(item, place),
            self.direction(item.direction, f"{place}, direction"),
            self.position(item.position),
            item.effect,
            item.direction_word,
        )

    def amplitude(self, item: schema.AmplitudeTable, place: str, plans: tuple[DesignPlan, ...]) -> StatedAmplitude:
        plan = self.mode_of(item.design, item.mode, plans, place)
        direction: Any = item.direction
        if item.point is not None:
            points = {point.name: point for point in plan.points}
            self.known("functional point", item.point, points, f"{place}, point")
            if direction is None:
                direction = points[item.point].direction
        value = self.plausible("amplitude", item.value * self.amplitude_unit, place)
        return StatedAmplitude(
            item.design,
            item.mode,
            value,
            self.direction(direction, f"{place}, direction"),
            item.point or "",
            self.selector(item, place) if item.given_places() else None,
            item.statistic,
            item.relative,
            item.condition,
            item.place,
        )

    def pair(self, item: schema.PairTable, place: str, plans: tuple[DesignPlan, ...]) -> ModePair:
        for word, end in (("first", item.first), ("second", item.second)):
            self.mode_of(end.design, end.mode, plans, f"{place}, {word}")
        return ModePair(item.first.design, item.first.mode, item.second.design, item.second.mode)

    def sweep(self, item: schema.SweepTable, place: str, plans: tuple[DesignPlan, ...]) -> SweepPlan:
        known = {plan.name: plan for plan in plans}
        name = item.design or plans[0].name
        self.known("design", name, known, f"{place}, design")
        plan = known[name]
        if not any(a.material or a.plies for a in plan.physics.assignments):
            raise DossierError(
                f"design '{name}' cannot be solved anew: it has no material that is assigned to its cells",
                file=self.path,
                place=f"{place}, design",
                do="give it assign with materials, or sweep another design",
            )
        variation = Variation(item.what, item.target, self.unit(item.what))
        self.known(variation.kind, item.target, variation.targets(plan.physics), f"{place}, target")
        values = item.values or np.linspace(item.from_ or 0, item.to or 0, item.steps or 0).tolist()
        values = sorted(value * variation.unit.si for value in values)
        if variation.unit.name:
            for value in (values[0], values[-1]):
                self.plausible(item.what, value, place)
        return SweepPlan(item.name, name, variation, tuple(values), item.count or plan.mode_count, item.insert)

    def unit(self, what: str) -> Unit:
        """The unit that the dossier gives a swept quantity in; none for factors."""
        units = self.table.units
        names = {
            "thickness": units.length,
            "youngs_modulus": units.modulus,
            "density": units.density,
            "mass": units.mass,
        }
        sizes = {**schema.LENGTHS, **schema.MODULI, **schema.DENSITIES, **schema.MASSES}
        return Unit(_SIGNS.get(names[what], names[what]), sizes[names[what]]) if what in names else Unit()

    def mode_names(self, item: schema.DesignTable, place: str) -> dict[int, str]:
        names = {}
        for key, name in item.mode_names.items():
            if not key.isascii() or not key.isdigit() or int(key) < 1:
                raise DossierError(
                    "a mode is named by its number from 1",
                    file=self.path,
                    place=f"{place}, mode_names",
                    found=f"'{key}'",
                    expected='1 = "name"',
                )
            names[int(key)] = name
        return names

    def mode_of(self, design: str, mode: int, plans: tuple[DesignPlan, ...], place: str) -> DesignPlan:
        known = {plan.name: plan for plan in plans}
        self.known("design", design, known, f"{place}, design")
        plan = known[design]
        if plan.modes_file is None and mode > plan.mode_count:
            raise DossierError(
                f"design '{design}' has no mode {mode}",
                file=self.path,
                place=f"{place}, mode",
                expected=f"1 to {plan.mode_count}",
                do=f"raise solve in that design to {mode} or more",
            )
        return plan
