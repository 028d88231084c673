"""What a mode does: which parts move, how and where to; whether it is rigid motion, bending, twisting or spreading.

Every statement carries its figure (DESIGN §6 "Character"). Without materials one uniform material is assumed, and
shares hold for that; springs, lumped masses, links and ties are then left out.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from viewer.errors import InputError, ModelError, RefusedError
from viewer.insight.character_parts import (
    Concentration,
    GroupShare,
    PointMotion,
    concentration,
    group_shares,
    out_of_plane,
    point_motions,
)
from viewer.insight.character_words import sentence_of, suggestion
from viewer.insight.effective_mass import EffectiveMasses, effective_masses
from viewer.insight.facing import FacingPair, FacingSurfaces, facing_surfaces
from viewer.insight.scale import Scale, carried_points
from viewer.insight.twisting import LongAxis, long_axis
from viewer.jobs import SILENT, Progress
from viewer.mechanics.energy import RELATIVE, Energies, energies
from viewer.mechanics.relative import assume_material, relative_energies, states_no_material
from viewer.model.arrays import Array
from viewer.model.design import Design
from viewer.model.modes import ArrayShapes, ModeSet


@dataclass(frozen=True, eq=False)
class Character:
    """What one mode does.

    mode       number from 1; freq_hz as given; name: the user's, empty when none was given
    held       whether supports hold anything
    masses     effective masses and shares of kinetic energy and rigid motion (a dictionary of figures), None when
               no mass is known
    groups     energy by cell group; springs and lumped masses hold the shares ``springs`` and ``lumped`` by name
    facing     the largest pairs of facing surfaces; long: sections along the long axis, None for a stocky body
    local      how local the mode is; sheets: (share of motion square to the sheets, all one flat sheet)
    points     the functional points
    """

    mode: int
    freq_hz: float
    name: str
    held: bool
    masses: Mapping[str, Any] | None
    groups: tuple[GroupShare, ...]
    springs: Mapping[str, float]
    lumped: Mapping[str, float]
    facing: tuple[FacingPair, ...]
    long: LongAxis | None
    local: Concentration | None
    sheets: tuple[float, bool] | None
    points: tuple[PointMotion, ...]
    relative: bool = False
    cautions: tuple[str, ...] = ()
    scale: Scale | None = None

    def with_scale(self, scale: Scale | None) -> Character:
        """The same, its real motions at another scale."""
        return replace(self, scale=scale)

    def with_name(self, name: str) -> Character:
        """The same under the user's name."""
        return replace(self, name=name)

    @property
    def suggested_name(self) -> str | None:
        """A name that the figures suggest, None when they suggest none; only ever a suggestion."""
        return suggestion(self._figures())[0]

    @property
    def sentence(self) -> str:
        return sentence_of(self.to_dict())

    def to_dict(self) -> dict[str, Any]:
        facts = self._figures()
        name, reason = suggestion(facts)
        return {**facts, "suggested_name": name, "suggested_because": reason}

    def _figures(self) -> dict[str, Any]:
        real = None if self.scale is None else self.scale.real_per_shape
        return {
            "mode": self.mode,
            "frequency_hz": self.freq_hz,
            "name": self.name or None,
            "held": self.held,
            "relative": self.relative,
            **{key: None if self.masses is None else self.masses[key] for key in _MASS_KEYS},
            "groups": [group.to_dict() for group in self.groups],
            "springs_strain_share": dict(self.springs),
            "lumped_kinetic_share": dict(self.lumped),
            "facing": [pair.to_dict() for pair in self.facing],
            "long_axis": None if self.long is None else self.long.to_dict(),
            "half_of_kinetic_in_mass_share": None if self.local is None else self.local.half_in,
            "participation": None if self.local is None else self.local.participation,
            "out_of_plane_share": None if self.sheets is None else self.sheets[0],
            "flat_sheet": None if self.sheets is None else self.sheets[1],
            "points": [point.to_dict(real) for point in self.points],
            "cautions": list(self.cautions),
        }


_MASS_KEYS = (
    "about_m",
    "effective",
    "effective_share",
    "support_share",
    "modal_mass",
    "rigid_share",
    "rigid_by_motion",
    "kinetic_share",
)


def describe(
    design: Design,
    modes: ModeSet,
    number: int,
    energies: Energies | None = None,
    scale: Scale | None = None,
    progress: Progress = SILENT,
    *,
    effective: EffectiveMasses | None = None,
    facing: FacingSurfaces | None = None,
) -> Character:
    """The character of mode ``number`` (from 1).

    energies   of a set that holds the mode, formed here when None
    effective  of a set that holds the mode (:func:`masses_of`)
    facing     (:func:`viewer.insight.facing.facing_surfaces`). Give both when several modes are described: most of
               the work is the same for all
    scale      gives motions in m where the real size is known
    Raises ``InputError`` for a mode that is not there. What cannot be known is None, with a caution that says why.
    """
    if not 1 <= number <= modes.count:
        raise InputError(f"design '{design.name}' has no mode {number}", expected=f"1 to {modes.count}")
    index, shape = number - 1, modes.shape(number - 1)
    cautions: list[str] = []
    if effective is None or effective.row(number) is None:
        effective = masses_of(design, modes, progress, indices=[index], why=cautions)
    found, j = _energies(design, modes, index, energies, cautions, progress)
    masses, lumped = _mass_by_cell(design, found)
    if facing is None:
        facing = facing_surfaces(design.mesh, progress)
    row = None if effective is None else effective.row(number)
    if effective is not None:
        cautions += effective.cautions
    known = found is not None and masses.sum() > 0
    return Character(
        mode=number,
        freq_hz=float(modes.freq_hz[index]),
        name=design.mode_names.get(number, ""),
        held=bool(design.physics.supports),
        masses=None if effective is None or row is None else effective.to_dict(row),
        groups=group_shares(design, found, j, masses, lumped) if found is not None and known else (),
        springs=_shares(found.spring_names, found.springs[j], found.total_strain[j]) if found is not None else {},
        lumped=_shares(found.mass_names, found.masses[j], found.total_kinetic[j]) if found is not None else {},
        facing=facing.pair_motions(shape),
        long=long_axis(*_weighed_points(design, shape, masses, lumped)) if known else None,
        local=_local(found, j, masses, lumped) if found is not None and known else None,
        sheets=out_of_plane(design.mesh, shape, masses) if known else None,
        points=point_motions(design, shape),
        relative=found is not None and found.relative,
        cautions=tuple(dict.fromkeys(cautions)),
        scale=scale,
    )


def masses_of(
    design: Design,
    modes: ModeSet,
    progress: Progress = SILENT,
    *,
    indices: list[int] | None = None,
    why: list[str] | None = None,
) -> EffectiveMasses | None:
    """Effective masses of all modes (or of ``indices``); of one assumed material when none is stated, and then marked
    relative. None when not even that is possible; ``why`` is given the reason."""
    try:
        if states_no_material(design):
            return effective_masses(assume_material(design), modes, indices, progress, relative=True)
        return effective_masses(design, modes, indices, progress)
    except (ModelError, RefusedError) as error:
        if why is not None:
            why.append(f"masses are not known: {error.problem}")
        return None


def _energies(
    design: Design, modes: ModeSet, index: int, given: Energies | None, cautions: list[str], progress: Progress
) -> tuple[Energies | None, int]:
    """Energies that hold the mode, and its row in them."""
    if given is not None and index in given.indices:
        found, j = given, int(np.nonzero(given.indices == index)[0][0])
    else:
        found, j = None, 0
    if found is None or not found.total_kinetic[j] > 0:  # at 0 Hz the shares are those at any other frequency
        alone, j = _alone(modes, index), 0
        form = relative_energies if states_no_material(design) else _energies_of
        try:
            found = form(design, alone, progress=progress)
        except (ModelError, RefusedError) as error:
            cautions.append(f"energies are not known: {error.problem}")
            return None, 0
    note = found.note(j)
    if found.relative:
        cautions.append(f"shares are {RELATIVE}; springs and lumped masses are left out")
    elif note:
        cautions.append(f"energies are {note}")
    return found, j


def _energies_of(design: Design, modes: ModeSet, progress: Progress) -> Energies:
    return energies(design, modes, progress=progress)


def _alone(modes: ModeSet, index: int) -> ModeSet:
    """A set of this one mode, at 1 Hz when it has none."""
    turned = modes.rotations(index)
    shapes = ArrayShapes(modes.shape(index)[None], None if turned is None else turned[None])
    frequency = modes.freq_hz[index]
    return ModeSet(
        modes.node_ids,
        np.array([frequency if frequency > 0 else 1.0]),
        shapes,
        origin=modes.origin,
        source=modes.source,
    )


def _mass_by_cell(design: Design, found: Energies | None) -> tuple[Array, Array]:
    """Masses (n_cells,) of the cells, kg (or m³ of the one assumed material), and of the lumped ones."""
    if found is None:
        return np.zeros(design.mesh.n_cells), np.zeros(0)
    if found.relative:
        return np.array(found.volumes), np.zeros(0)
    properties, index = design.properties
    density = np.array([_density(prop) for prop in properties] + [0.0])
    return found.volumes * density[index], np.array([item.mass for item in design.physics.masses])


def _density(prop) -> float:
    """kg/m³, of all layers together."""
    if not prop.layers:
        return prop.material.density
    return sum(layer.material.density * layer.thickness for layer in prop.layers) / prop.thickness


def _weighed_points(design: Design, shape: Array, masses: Array, lumped: Array) -> tuple[Array, Array, Array]:
    """Points with their masses and motions: nodes with an equal part of their cells' mass, and lumped masses."""
    mesh = design.mesh
    weight = np.zeros(mesh.n_nodes)
    for block, start in zip(mesh.blocks, mesh.block_starts[:-1], strict=True):
        part = np.repeat(masses[start : start + len(block)] / block.nodes.shape[1], block.nodes.shape[1])
        weight += np.bincount(block.nodes.ravel(), part, minlength=mesh.n_nodes)
    carried = carried_points(design)[: len(lumped)]
    points = np.concatenate([mesh.points, *(item.position[None] for item in carried)])
    motion = np.concatenate([shape, *(item.motion(shape)[None, :3] for item in carried)])
    return points, np.concatenate([weight, lumped]), motion


def _local(found: Energies, j: int, masses: Array, lumped: Array) -> Concentration | None:
    kinetic = np.concatenate([found.kinetic[j], found.masses[j][: len(lumped)]])
    if not kinetic.sum() > 0:
        return None
    return concentration(kinetic, np.concatenate([masses, lumped]))


def _shares(names: tuple[str, ...], values: Array, whole: float) -> dict[str, float]:
    out = dict.fromkeys(names, 0.0)
    for name, value in zip(names, values, strict=True):
        out[name] += float(value / whole) if whole > 0 else 0.0
    return out
