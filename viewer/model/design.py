"""What a design is made of beside its mesh: materials, sections, supports, springs, masses, points."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from functools import cached_property

import numpy as np

from viewer.errors import ModelError
from viewer.model.arrays import Array, frozen, frozen_map
from viewer.model.matrices import GivenMatrices
from viewer.model.mesh import Mesh

DIRECTIONS = ("ux", "uy", "uz", "rx", "ry", "rz")


@dataclass(frozen=True)
class Directional:
    """Elastic constants along the axes 1 (grain, fibre), 2 and 3 of an orthotropic material; Pa.

    ``nu12``: contraction along 2 under stress along 1, so that nu21 = nu12 e2 / e1. Sheets need nothing about axis 3
    but its shear moduli; solids need e3, nu13 and nu23 as well.
    """

    e1: float
    e2: float
    nu12: float
    g12: float
    g13: float
    g23: float
    e3: float | None = None
    nu13: float | None = None
    nu23: float | None = None


@dataclass(frozen=True)
class Material:
    """Linear: Young's modulus Pa, Poisson's ratio, density kg/m³.

    Isotropic unless ``directional`` is set; the first two numbers then repeat its e1 and nu12.
    """

    name: str
    youngs_modulus: float
    poisson: float
    density: float
    directional: Directional | None = None


@dataclass(frozen=True)
class Section:
    """Cross-section of beams; m, m², m⁴. "Up" is the assignment's orientation, "across" lies square to it.

    shape  "rectangle" (width across, height up), "round" (diameter), "tube" (diameter outside, wall), or "given"
           (area, iy = ∫ up² dA, iz = ∫ across² dA, torsion = Saint-Venant's constant)
    shear_up, shear_across  shear coefficients when they are not to follow from the shape (given: 5/6)
    """

    shape: str
    width: float | None = None
    height: float | None = None
    diameter: float | None = None
    wall: float | None = None
    area: float | None = None
    iy: float | None = None
    iz: float | None = None
    torsion: float | None = None
    shear_up: float | None = None
    shear_across: float | None = None


@dataclass(frozen=True)
class Ply:
    """A layer of a sheet: the name of its material, thickness m, angle of its axis 1 from the assignment's direction,
    degrees, about the normal."""

    material: str
    thickness: float
    angle: float = 0.0


@dataclass(frozen=True)
class Assignment:
    """Material of the cells that ``target`` names, with the sheet thickness (m) of shells and the section of beams.

    target       a cell group, a cell kind ("quad4"), or "*" for all; later assignments win
    formulation  an element formulation by name; empty takes the default of the kind
    section      of line cells; orientation (3,) points "up" in the section, any length; in solids of directional
                 material axis 3, as far as it is square to ``direction``
    offset       m from the nodes to the middle of the sheet along its normal, or to the axis of the beam upwards;
                 offset_across the same across the beam
    direction    (3,) axis 1 of directional material, in sheets projected on them
    plies        layers of a sheet from its lower side (against the normal) up, instead of material and thickness
    """

    target: str
    material: str = ""
    thickness: float | None = None
    formulation: str = ""
    section: Section | None = None
    orientation: tuple[float, ...] | None = None
    offset: float = 0.0
    offset_across: float = 0.0
    direction: tuple[float, ...] | None = None
    plies: tuple[Ply, ...] = ()


@dataclass(frozen=True, eq=False)
class Selector:
    """Which nodes: exactly one of the fields is set.

    group  node group, or cell group (all its nodes)
    nodes  external node ids
    box    (2, 3) lower and upper corner, m, inclusive
    near   (3,) point, m: the nearest node
    """

    group: str = ""
    nodes: Array | None = None
    box: Array | None = None
    near: Array | None = None

    def __post_init__(self) -> None:
        for name, dtype, shape in (
            ("nodes", np.int64, (None,)),
            ("box", np.float64, (2, 3)),
            ("near", np.float64, (3,)),
        ):
            value = getattr(self, name)
            if value is not None:
                object.__setattr__(self, name, frozen(value, dtype, shape=shape))

    def rows(self, mesh: Mesh, what: str = "selector") -> Array:
        """Ascending node rows in ``mesh``; ``ModelError`` when nothing is found. ``what`` names the asker."""
        if self.group:
            if self.group in mesh.node_groups:
                rows = np.unique(mesh.node_groups[self.group])
            elif self.group in mesh.cell_groups:
                rows = mesh.nodes_of_cells(mesh.cell_groups[self.group])
            else:
                known = ", ".join([*mesh.node_groups, *mesh.cell_groups]) or "none"
                raise ModelError(
                    f"{what}: no group named '{self.group}'", file=mesh.source or None, expected=f"one of: {known}"
                )
        elif self.nodes is not None:
            try:
                rows = np.unique(mesh.node_rows(self.nodes))
            except KeyError as error:
                raise ModelError(f"{what}: no node with id {error}", file=mesh.source or None) from None
        elif self.box is not None:
            tolerance = 1e-9 * mesh.diagonal
            inside = (mesh.points >= self.box[0] - tolerance) & (mesh.points <= self.box[1] + tolerance)
            rows = np.intersect1d(np.nonzero(inside.all(axis=1))[0], mesh.used_nodes)
        else:
            assert self.near is not None
            used = mesh.used_nodes
            rows = used[[np.argmin(np.linalg.norm(mesh.points[used] - self.near, axis=1))]] if len(used) else used
        if len(rows) == 0:
            raise ModelError(
                f"{what}: selects no node", file=mesh.source or None, do="check the group, box or unit of length"
            )
        return rows


@dataclass(frozen=True, eq=False)
class Support:
    """Held displacement directions ("ux" … "rz") of the selected nodes."""

    name: str
    where: Selector
    held: tuple[str, ...] = DIRECTIONS


@dataclass(frozen=True, eq=False)
class Spring:
    """A spring from each selected node to ground, or (``other`` set, both one node) between two nodes.

    stiffness  (6,) N/m along x y z and N·m/rad about x y z, global axes
    axis       when set, (3,) direction: ``axial`` N/m acts along it instead of ``stiffness``
    """

    name: str
    where: Selector
    other: Selector | None = None
    stiffness: Array = field(default_factory=lambda: np.zeros(6))
    axis: Array | None = None
    axial: float = 0.0

    def __post_init__(self) -> None:
        object.__setattr__(self, "stiffness", frozen(self.stiffness, np.float64, shape=(6,)))
        if self.axis is not None:
            axis = np.asarray(self.axis, float)
            object.__setattr__(self, "axis", frozen(axis / np.linalg.norm(axis), np.float64, shape=(3,)))


@dataclass(frozen=True, eq=False)
class Strut:
    """A link between the centres of two footprints, stiff along the line between them and in no other way.

    Each end follows the mean translation of its nodes, so that rigid motions of the whole strain nothing.
    ``stiffness`` N/m along the line; ``mass`` kg, half of it carried by each end.
    """

    name: str
    where: Selector
    other: Selector
    stiffness: float
    mass: float = 0.0


@dataclass(frozen=True, eq=False)
class Clearance:
    """A box that must stay empty, (2, 3) lower and upper corner, m: no strut is proposed through it."""

    name: str
    box: Array

    def __post_init__(self) -> None:
        object.__setattr__(self, "box", frozen(self.box, np.float64, shape=(2, 3)))


@dataclass(frozen=True, eq=False)
class LumpedMass:
    """A rigid body of mass ``mass`` kg whose centre sits at ``position`` and follows the selected nodes.

    The footprint's best rigid motion (equal-weight least squares) carries the body, so no stiffness is
    added to the structure. ``inertia`` (3, 3) kg·m² about its centre. ``position`` None: the footprint's centroid.
    """

    name: str
    where: Selector
    mass: float
    position: Array | None = None
    inertia: Array = field(default_factory=lambda: np.zeros((3, 3)))

    def __post_init__(self) -> None:
        object.__setattr__(self, "inertia", frozen(self.inertia, np.float64, shape=(3, 3)))
        if self.position is not None:
            object.__setattr__(self, "position", frozen(self.position, np.float64, shape=(3,)))


@dataclass(frozen=True, eq=False)
class Link:
    """A rigid link: one node leads, the nodes at the other end move with it as a rigid body does.

    The end that selects a single node leads, ``first`` when both do.
    """

    name: str
    first: Selector
    second: Selector


@dataclass(frozen=True, eq=False)
class Tie:
    """Nodes glued to a surface that does not share nodes with them.

    nodes    the nodes that follow
    surface  the faces that lead: outer faces of solids and shell cells, all of whose nodes are selected
    reach    m, farthest a node may lie from its face; None: half the longest edge of the face
    """

    name: str
    nodes: Selector
    surface: Selector
    reach: float | None = None


@dataclass(frozen=True, eq=False)
class FunctionalPoint:
    """A point whose motion along ``direction`` matters for the product ("image blur", "sideways").

    It moves with the best rigid motion of the footprint ``where``; ``position`` None: the footprint's centroid.
    """

    name: str
    where: Selector
    direction: Array
    position: Array | None = None
    effect: str = ""  # what motion along the direction does: "image blur"
    direction_word: str = ""  # "sideways"

    def __post_init__(self) -> None:
        direction = np.asarray(self.direction, float)
        object.__setattr__(self, "direction", frozen(direction / np.linalg.norm(direction), shape=(3,)))
        if self.position is not None:
            object.__setattr__(self, "position", frozen(self.position, np.float64, shape=(3,)))


@dataclass(frozen=True, eq=False)
class Physics:
    """Everything that turns a mesh into a model. May be empty: an imported mode set can be shown without it."""

    materials: Mapping[str, Material] = field(default_factory=dict)
    assignments: tuple[Assignment, ...] = ()
    supports: tuple[Support, ...] = ()
    springs: tuple[Spring, ...] = ()
    masses: tuple[LumpedMass, ...] = ()
    links: tuple[Link, ...] = ()
    ties: tuple[Tie, ...] = ()
    struts: tuple[Strut, ...] = ()
    matrices: GivenMatrices | None = None  # instead of assignments

    def __post_init__(self) -> None:
        object.__setattr__(self, "materials", frozen_map(self.materials))


@dataclass(frozen=True)
class Layer:
    """A :class:`Ply` with its material looked up."""

    material: Material
    thickness: float
    angle: float = 0.0


@dataclass(frozen=True)
class Property:
    """What one group of cells is made of, resolved: the argument of every element formulation.

    Fields as in :class:`Assignment`. With ``layers``, thickness is their sum and material that of the first.
    """

    material: Material
    thickness: float | None = None
    formulation: str = ""
    section: Section | None = None
    orientation: tuple[float, ...] | None = None
    offset: float = 0.0
    offset_across: float = 0.0
    direction: tuple[float, ...] | None = None
    layers: tuple[Layer, ...] = ()


@dataclass(frozen=True, eq=False)
class Design:
    """A named mesh with its physics, functional points and mode names (mode number → name)."""

    name: str
    mesh: Mesh
    physics: Physics = field(default_factory=Physics)
    points: tuple[FunctionalPoint, ...] = ()
    mode_names: Mapping[int, str] = field(default_factory=dict)
    note: str = ""

    def with_(self, **changes) -> Design:
        """A copy with some fields replaced."""
        return replace(self, **changes)

    @cached_property
    def properties(self) -> tuple[tuple[Property, ...], Array]:
        """The distinct properties in use and, by cell row, the index into them (−1: none assigned)."""
        mesh = self.mesh
        index = np.full(mesh.n_cells, -1, np.int64)
        found: list[Property] = []
        for item in self.physics.assignments:
            rows = self.target_rows(item.target)
            prop = self._property(item)
            if prop not in found:
                found.append(prop)
            index[rows] = found.index(prop)
        return tuple(found), frozen(index)

    def _property(self, item: Assignment) -> Property:
        known = self.physics.materials
        for name in [ply.material for ply in item.plies] or [item.material]:
            if name not in known:
                raise ModelError(
                    f"design '{self.name}': assignment to '{item.target}' names the unknown material '{name}'",
                    expected=f"one of: {', '.join(known) or 'none declared'}",
                )
        layers = tuple(Layer(known[ply.material], ply.thickness, ply.angle) for ply in item.plies)
        return Property(
            layers[0].material if layers else known[item.material],
            sum(layer.thickness for layer in layers) if layers else item.thickness,
            item.formulation,
            item.section,
            item.orientation,
            item.offset,
            item.offset_across,
            item.direction,
            layers,
        )

    def target_rows(self, target: str) -> Array:
        """Cell rows that an assignment's ``target`` names; ``ModelError`` when there are none."""
        mesh = self.mesh
        if target == "*":
            return np.arange(mesh.n_cells)
        if target in mesh.cell_groups:
            return mesh.cell_groups[target]
        rows = [
            np.arange(start, start + len(block))
            for block, start in zip(mesh.blocks, mesh.block_starts[:-1], strict=True)
            if block.kind == target
        ]
        if not rows:
            kinds = sorted({block.kind for block in mesh.blocks})
            raise ModelError(
                f"design '{self.name}': assignment to '{target}' matches no cell group and no cell kind",
                expected=f"a group ({', '.join(mesh.cell_groups) or 'none'}), a kind ({', '.join(kinds)}) or '*'",
            )
        return np.concatenate(rows)
