"""``dossier.toml`` as data in SI: units, references, duplicates, files and plausible values are checked here.

The layout stands in :mod:`viewer.loaders.dossier_schema`.
"""

from __future__ import annotations

import difflib
import os
from collections.abc import Iterable
from pathlib import Path
from typing import Any

import numpy as np

from viewer.errors import DossierError
from viewer.loaders import dossier_schema as schema
from viewer.loaders.dossier_parse import parsed, short
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
    Selector,
    Spring,
    Strut,
    Support,
    Tie,
)
from viewer.model.dossier import DesignPlan, Dossier, ModePair, StatedAmplitude
from viewer.model.matrices import MatrixFiles

DEFAULT_MODE_COUNT = 6
# Outside these bounds a value is no error but is flagged: most often a unit was mixed up. Softest foams lie near
# 1e4 Pa and 10 kg/m³, diamond near 1.2e12 Pa, osmium near 22 600 kg/m³ (handbook values, rounded outwards).
_PLAUSIBLE = {
    "youngs_modulus": (1e4, 1.3e12, "Pa"),
    "density": (5.0, 23_000.0, "kg/m³"),
    "thickness": (1e-5, 0.2, "m"),
    "mass": (1e-6, 1e5, "kg"),
    "radius_of_gyration": (1e-4, 20.0, "m"),
    "amplitude": (1e-12, 0.1, "m"),
}


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


class _Reader:
    """One pass over the tables; collects warnings."""

    def __init__(self, path: Path, table: schema.DossierTable) -> None:
        self.path, self.table, self.warnings = path, table, []  # type: ignore[var-annotated]
        units = table.units
        self.length = schema.LENGTHS[units.length]
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
        return Dossier(table.title, self.path, plans, amplitudes, pairs, table.condition)

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

    def inertia(self, given: Any, place: str) -> np.ndarray:
        values = np.zeros(3) if given is None else np.asarray(given, float)
        matrix = np.diag(values) if values.shape == (3,) else values
        if matrix.shape != (3, 3):
            raise DossierError(
                "wrong number of values",
                file=self.path,
                place=place,
                found=short(given),
                expected="three values about x, y, z, or a 3 × 3 matrix",
            )
        moments = np.linalg.eigvalsh((matrix + matrix.T) / 2)
        if not np.allclose(matrix, matrix.T) or moments[0] < -1e-9 * max(moments[-1], 0.0) or moments[0] < -1e-300:
            raise DossierError(
                "is no inertia of a real body",
                file=self.path,
                place=place,
                found=short(given),
                expected="a symmetric matrix without negative principal moments",
            )
        return matrix

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

    # --- parts ---

    def selector(self, item: schema.Place, place: str) -> Selector:
        box = None if item.box is None else self.box(item.box, place)
        near = None if item.near is None else np.array(item.near) * self.length
        return Selector(item.group or "", item.nodes, box, near)  # type: ignore[arg-type]

    def box(self, given: list[list[float]], place: str) -> np.ndarray:
        box = np.array(given) * self.length
        if (box[0] > box[1]).any():
            raise DossierError(
                "the lower corner of the box lies above the upper one",
                file=self.path,
                place=f"{place}, box",
                found=short(given),
                expected="[[xmin, ymin, zmin], [xmax, ymax, zmax]]",
            )
        return box

    def position(self, given: list[float] | None) -> np.ndarray | None:
        return None if given is None else np.array(given) * self.length

    def direction(self, given: Any, place: str) -> np.ndarray:
        if isinstance(given, str):
            word = given.strip().lower()
            sign, axis = (-1.0 if word[:1] == "-" else 1.0), word.lstrip("+-")
            if axis not in ("x", "y", "z") or len(word) - len(axis) > 1:
                raise DossierError(
                    "is no direction",
                    file=self.path,
                    place=place,
                    found=short(given),
                    expected='three components, or a word such as "x", "-z"',
                )
            return sign * np.eye(3)["xyz".index(axis)]
        vector = np.asarray(given, float)
        size = float(np.linalg.norm(vector))
        if not size > 0 or not np.isfinite(size):
            raise DossierError("a direction has no length", file=self.path, place=place, found=short(given))
        return vector / size

    def vector(self, given: list[float] | None, place: str) -> tuple[float, ...] | None:
        return None if given is None else tuple(self.direction(given, place).tolist())

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

    def existing(self, name: str, place: str) -> Path:
        path = self.path.parent / name
        if not path.is_file():
            raise DossierError(
                "is a folder" if path.is_dir() else "there is no such file",
                file=self.path,
                place=place,
                found=str(path),
                expected="a file; paths are relative to the dossier",
                do="check the path",
            )
        return path

    def known(self, word: str, name: str, among: Iterable[str], place: str) -> None:
        among = list(among)
        if name not in among:
            close = difflib.get_close_matches(name, among, 1)
            raise DossierError(
                f"no {word} named '{name}'",
                file=self.path,
                place=place,
                expected=f"one of: {', '.join(among)}" if among else f"a {word}, none is declared",
                do=f"did you mean '{close[0]}'?" if close else "",
            )

    def no_duplicates(self, place: str, names: list[str]) -> None:
        for i, name in enumerate(names):
            if name in names[:i]:
                raise DossierError(
                    f"'{name}' is given twice",
                    file=self.path,
                    place=place,
                    expected="each once",
                    do="rename one",
                )

    def plausible(self, what: str, value: float, place: str) -> float:
        low, high, unit = _PLAUSIBLE[what]
        if not low <= value <= high:
            self.warnings.append(
                f"{place}: {what.replace('_', ' ')} of {value:.3g} {unit} is implausible "
                f"(usual: {low:.3g} to {high:.3g} {unit}); check [units]"
            )
        return value
