"""The layout of ``dossier.toml``: which tables and keys exist and of what type. Units and references come later.

Every number is in the units that ``[units]`` declares, SI when it says nothing; turning is always SI: inertia kg·m²,
turning springs N·m/rad::

    title = "Camera boom"
    condition = "clamped root, camera 1.2 kg"

    [units]                     # all optional
    length = "mm"               # thickness, positions, boxes
    amplitude = "um"            # stated amplitudes; default: as length
    modulus = "GPa"
    density = "kg/m3"
    mass = "kg"
    stiffness = "N/mm"          # springs

    [materials.aluminium]
    youngs_modulus = 70
    poisson = 0.33
    density = 2700              # of a directional material: e1, e2, nu12, g12, g13, g23, density, and for solids also
                                # e3, nu13, nu23 (nu12: contraction along 2 under stress along 1)

    [[designs]]
    name = "baseline"
    mesh = "boom.vtu"           # relative to this file
    length_unit = "mm"          # of the mesh and mode files; default "m"
    solve = 8                   # number of modes to compute, or: modes = "boom_modes.vtu"
    assign = [{target = "*", material = "aluminium", thickness = 2}]
    supports = [{name = "root", group = "root"}]          # held = ["ux", "uy", "uz"]; default: all six
    springs = [{name = "strap", group = "eye", stiffness = [100, 0, 0]}]
    masses = [{name = "camera", group = "pad", mass = 1.2, position = [0, 0, 500]}]
    links = [{name = "bracket", from = {near = [0, 0, 500]}, to = {group = "pad"}}]    # rigid; the one node leads
    # (near and box find nodes of cells only: name a node of no cell by nodes = [id] or by its group)
    ties = [{name = "seam", nodes = {group = "edge"}, surface = {group = "block"}}]    # glued; reach = 2 if far off
    struts = [{name = "brace", group = "left pad", to = {group = "right pad"}, stiffness = 2000}]    # mass = 0.1
    mode_names = {1 = "boom nods"}
    # instead of assign, matrices of another program (their numbers in the units of stiffness and mass above), which
    # contain all but the supports: stiffness = "K.mtx", mass_matrix = "M.mtx", matrix_order = "by node" (ux uy uz of
    # the lowest node number, then the next), "by direction", or a table (columns node, direction; a line a row)

    # more of what an entry of assign may say:
    #   beams (line cells): section = {shape = "rectangle", width = 20, height = 40}, {shape = "round", diameter = 8},
    #     {shape = "tube", diameter = 30, wall = 2}, {area = 300, iy = 1e4, iz = 2e4, torsion = 900}; orientation =
    #     [0, 0, 1] points along the height ("up": iy is ∫ up² dA), offset = 5 lifts the axis off the nodes,
    #     offset_across = 5 shifts it sideways
    #   shells: offset = 5 moves the sheet off its nodes along the normal; direction = [1, 0, 0] is axis 1 of
    #     directional material; layers = [{material = "ply", thickness = 0.2, angle = 45}, …] stand for both material
    #     and thickness; thickness or section without any material are enough for relative energies of given modes
    #   solids of directional material: direction is axis 1, orientation shows where axis 3 points

    [[points]]                  # of all designs; a design's own `points` add to them or replace by name
    name = "camera lens"
    group = "pad"               # or: nodes = [12, 13]; box = [[…], […]]; near = [x, y, z]
    direction = "+y"            # or [0, 1, 0]
    effect = "image blur"

    [[clearances]]              # boxes that no proposed strut may pass
    name = "belt"
    box = [[-50, 0, 200], [50, 80, 900]]
    designs = ["baseline"]      # default: all

    [[amplitudes]]
    design = "baseline"
    mode = 1
    point = "camera lens"       # or a place of its own: group, nodes, box, near, and direction
    value = 180
    statistic = "peak"          # "rms", "3 sigma"
    condition = "belt drive at 12 Hz"

    [[pairs]]
    first = {design = "baseline", mode = 1}
    second = {design = "modified", mode = 2}

    [[sweeps]]                  # followed by the command lineage
    name = "sheet"
    design = "baseline"         # default: the first
    what = "thickness"          # "youngs_modulus", "density", "mass"; factors: "spring" (stiffness), "scale" (size)
    target = "*"                # as in assign; the name of a material, mass, spring; of axes to scale: "x", "xy", …
    values = [1.5, 2, 2.5]      # or: from = 1.5, to = 2.5, steps = 3
    count = 8                   # modes; default: as the design's
    insert = true               # further steps where modes pass one another too fast for these

    [[tests]]                   # hammer tests; their layout: viewer/loaders/dossier_test_tables.py
    name = "hammer"
    file = "hammer.unv"
"""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import Field, model_validator

from viewer.loaders.dossier_test_tables import TestTable
from viewer.loaders.dossier_values import (
    DENSITIES,
    LENGTHS,
    MASSES,
    MODULI,
    STIFFNESSES,
    Held,
    Length,
    ModeNumber,
    Name,
    NotNegative,
    OtherPlace,
    Place,
    Positive,
    Table,
    Units,
    Vector,
)

__all__ = ["DENSITIES", "LENGTHS", "MASSES", "MATRIX_ORDERS", "MODULI", "STIFFNESSES", "DossierTable", "Place"]

MATRIX_ORDERS = ("by node", "by direction")
_ISOTROPIC, _DIRECTIONAL = ("youngs_modulus", "poisson"), ("e1", "e2", "nu12", "g12", "g13", "g23")
_ACROSS = ("e3", "nu13", "nu23")  # of directional material that solids are made of


class MaterialTable(Table):
    density: Positive | None = None
    youngs_modulus: Positive | None = None
    poisson: Annotated[float, Field(ge=0, lt=0.5)] | None = None
    e1: Positive | None = None
    e2: Positive | None = None
    nu12: float | None = None
    g12: Positive | None = None
    g13: Positive | None = None
    g23: Positive | None = None
    e3: Positive | None = None
    nu13: float | None = None
    nu23: float | None = None

    @property
    def directional(self) -> bool:
        return self.e1 is not None

    @model_validator(mode="after")
    def _one_kind(self):
        directional = {name for name in (*_DIRECTIONAL, *_ACROSS) if getattr(self, name) is not None}
        if directional and any(getattr(self, name) is not None for name in _ISOTROPIC):
            raise ValueError(f"mixes two kinds of material, expected {_said(_ISOTROPIC)}, or {_said(_DIRECTIONAL)}")
        wanted: tuple[str, ...] = _DIRECTIONAL if directional else _ISOTROPIC
        if directional & set(_ACROSS):
            wanted += _ACROSS
        missing = [name for name in (*wanted, "density") if getattr(self, name) is None]
        if missing:
            more = f" (and {len(missing) - 1} more)" if missing[1:] else ""
            raise ValueError(f"'{missing[0]}' is missing{more}, expected {_said((*wanted, 'density'))}")
        return self


def _said(names) -> str:
    return ", ".join(f"'{name}'" for name in names)


class SectionTable(Table):
    shape: Literal["rectangle", "round", "tube", "given"] = "given"
    width: Positive | None = None
    height: Positive | None = None
    diameter: Positive | None = None
    wall: Positive | None = None
    area: Positive | None = None
    iy: Positive | None = None
    iz: Positive | None = None
    torsion: Positive | None = None
    shear_up: Positive | None = None
    shear_across: Positive | None = None


class LayerTable(Table):
    material: Name
    thickness: Positive
    angle: float = 0.0


_NO_MATERIAL = 'no material, expected material = "NAME", or for sheets layers = [{material = …}]'


class AssignTable(Table):
    target: Name = "*"
    material: Name | None = None
    thickness: Positive | None = None
    formulation: str = ""
    section: SectionTable | None = None
    orientation: Vector | None = None
    offset: float = 0.0
    offset_across: float = 0.0
    direction: Vector | None = None
    layers: Annotated[list[LayerTable], Field(min_length=1)] | None = None

    @model_validator(mode="after")
    def _what(self):
        if self.layers is None and self.material is None and self.thickness is None and self.section is None:
            raise ValueError(f"says {_NO_MATERIAL}")
        if self.layers is not None and (self.material is not None or self.thickness is not None):
            raise ValueError("says layers beside material or thickness, expected layers alone: each names its own")
        return self


class SupportTable(Place):
    name: Name | None = None
    held: Annotated[list[Held], Field(min_length=1)] | None = None


class SpringTable(Place):
    name: Name | None = None
    to: OtherPlace | None = None
    stiffness: Annotated[list[NotNegative], Field(min_length=3, max_length=6)] | None = None
    axis: Vector | None = None
    axial: Positive | None = None

    @model_validator(mode="after")
    def _stiffness(self):
        if (self.axis is None) != (self.axial is None):
            raise ValueError("says only one of axis and axial, expected both together")
        if (self.stiffness is None) == (self.axis is None):
            raise ValueError("expected either stiffness = [kx, ky, kz] or axis = [x, y, z] with axial = k")
        if self.stiffness is not None and len(self.stiffness) not in (3, 6):
            raise ValueError("stiffness has 4 or 5 numbers, expected 3 (x y z) or 6 (x y z and turning about x y z)")
        return self


class StrutTable(Place):
    name: Name | None = None
    to: OtherPlace
    stiffness: Positive
    mass: NotNegative = 0.0


class MassTable(Place):
    name: Name | None = None
    mass: Positive
    position: Vector | None = None
    inertia: list[float] | list[Vector] | None = None


class LinkTable(Table):
    name: Name | None = None
    from_: Annotated[OtherPlace, Field(alias="from")]
    to: OtherPlace


class TieTable(Table):
    name: Name | None = None
    nodes: OtherPlace
    surface: OtherPlace
    reach: Positive | None = None


class PointTable(Place):
    name: Name
    direction: Vector | str
    position: Vector | None = None
    effect: str = ""
    direction_word: str = ""


class DesignTable(Table):
    name: Name
    mesh: Name
    length_unit: Length | Positive = "m"
    modes: Name | None = None
    solve: ModeNumber | None = None
    assign: list[AssignTable] = []
    stiffness: Name | None = None
    mass_matrix: Name | None = None
    matrix_order: Name | None = None
    supports: list[SupportTable] = []
    springs: list[SpringTable] = []
    masses: list[MassTable] = []
    links: list[LinkTable] = []
    ties: list[TieTable] = []
    struts: list[StrutTable] = []
    points: list[PointTable] = []
    mode_names: dict[str, Name] = {}
    note: str = ""

    @model_validator(mode="after")
    def _one_origin(self):
        if self.modes is not None and self.solve is not None:
            raise ValueError(
                "says both modes and solve, expected one: a file of modes, or a number of modes to compute"
            )
        matrices = {key: getattr(self, key) for key in ("stiffness", "mass_matrix", "matrix_order")}
        if any(matrices.values()):
            self._only_matrices(matrices)
        elif self.modes is None and not self.assign:
            raise ValueError(
                'says neither modes nor assign, expected modes = "FILE", or '
                'assign = [{target = "*", material = "NAME"}] so that modes can be computed'
            )
        # Thickness or section alone are enough for relative energies of given modes, if no entry has a material.
        bare = [n for n, item in enumerate(self.assign, 1) if item.material is None and item.layers is None]
        if bare and (self.modes is None or len(bare) < len(self.assign)):
            raise ValueError(f"assign {bare[0]} says {_NO_MATERIAL}")
        return self

    def _only_matrices(self, matrices: dict[str, str | None]) -> None:
        missing = [key for key, value in matrices.items() if value is None]
        if missing:
            raise ValueError(
                f"says no {missing[0]}, expected stiffness, mass_matrix and matrix_order together; matrix_order is "
                '"by node", "by direction" or a table with the columns node, direction'
            )
        own = ("assign", "springs", "masses", "links", "ties", "struts")
        others = [key for key in own if getattr(self, key)]
        if others:
            raise ValueError(f"says both stiffness and {others[0]}, expected one: matrices contain everything")


class AmplitudeTable(Place):
    design: Name
    mode: ModeNumber
    value: Positive
    point: Name | None = None
    direction: Vector | str | None = None
    statistic: Literal["peak", "rms", "3 sigma"] = "peak"
    relative: bool = False
    condition: str = ""
    place: str = ""

    @property
    def _needs_place(self) -> bool:
        return False

    @model_validator(mode="after")
    def _where(self):
        if (self.point is None) == (not self.given_places()):
            raise ValueError('expected either point = "NAME" or a place of its own: one of group, nodes, box, near')
        if self.point is None and self.direction is None:
            raise ValueError("says no direction, expected one, since no functional point gives it")
        return self


class ModeReference(Table):
    design: Name
    mode: ModeNumber


class PairTable(Table):
    first: ModeReference
    second: ModeReference


_SPAN = ("from_", "to", "steps")


class SweepTable(Table):
    name: Name
    design: Name | None = None
    what: Literal["thickness", "youngs_modulus", "density", "spring", "mass", "scale"]
    target: Name
    values: Annotated[list[Positive], Field(min_length=2, max_length=1000)] | None = None
    from_: Annotated[Positive | None, Field(alias="from")] = None
    to: Positive | None = None
    steps: Annotated[int, Field(ge=2, le=1000)] | None = None
    count: ModeNumber | None = None
    insert: bool = False

    @model_validator(mode="after")
    def _one_list(self):
        span = [getattr(self, key) for key in _SPAN]
        given = sum(value is not None for value in span)
        if (self.values is None) == (given == 0) or 0 < given < len(span):
            raise ValueError("expected either values = [a, b, c], or from = a, to = b and steps = n")
        if given and self.from_ == self.to:
            raise ValueError("from and to are the same, expected two ends")
        if self.values is not None and len(set(self.values)) < len(self.values):
            raise ValueError("a value is given twice, expected each once")
        return self


class ClearanceTable(Table):
    name: Name | None = None
    box: Annotated[list[Vector], Field(min_length=2, max_length=2)]
    designs: Annotated[list[Name], Field(min_length=1)] | None = None


class DossierTable(Table):
    title: Name
    condition: str = ""
    units: Units = Units()
    materials: dict[str, MaterialTable] = {}
    designs: Annotated[list[DesignTable], Field(min_length=1)]
    points: list[PointTable] = []
    clearances: list[ClearanceTable] = []
    amplitudes: list[AmplitudeTable] = []
    pairs: list[PairTable] = []
    sweeps: list[SweepTable] = []
    tests: list[TestTable] = []
