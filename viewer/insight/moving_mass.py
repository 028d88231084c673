"""What moves in a mode: masses and kinetic energies, with one material assumed where none is stated."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np

from viewer.cells import KINDS
from viewer.errors import ModelError, RefusedError
from viewer.insight.effective_mass import EffectiveMasses, effective_masses
from viewer.insight.scale import carried_points
from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import lay_out
from viewer.mechanics.base_motion import mode_vectors
from viewer.mechanics.energy import Energies, energies
from viewer.mechanics.relative import ASSUMED, assume_material, relative_energies, states_no_material
from viewer.mechanics.sums import cell_energies, cell_volumes
from viewer.model.arrays import Array
from viewer.model.design import Assignment, Design, Physics, Property, Section, Strut
from viewer.model.mesh import Mesh
from viewer.model.modes import ArrayShapes, ModeSet


@dataclass(frozen=True, eq=False)
class Moving:
    """Of one mode.

    kinetic, strain  (n_cells,) shares of the mode's whole; strain None when not known or nothing is strained
    masses, lumped   (n_cells,), (m,) kg, in any unit when something is assumed; lumped_kinetic (m,) shares
    springs, lumped_shares   shares of strain and kinetic energy by name
    assumed          for want of materials, in words; empty when nothing is
    """

    kinetic: Array
    strain: Array | None
    masses: Array
    lumped: Array
    lumped_kinetic: Array
    springs: Mapping[str, float]
    lumped_shares: Mapping[str, float]
    assumed: str


def masses_of(
    design: Design, modes: ModeSet, progress: Progress = SILENT, *, indices: list[int] | None = None
) -> EffectiveMasses | None:
    """Effective masses of all modes (or of ``indices``); of one assumed material when none is stated, then marked
    relative; None when not even that is possible, for the reason that ``moving_mass`` gives as a caution."""
    try:
        if states_no_material(design):
            return effective_masses(_assumed(design).design, modes, indices, progress, relative=True)
        return effective_masses(design, modes, indices, progress)
    except (ModelError, RefusedError):
        return None


def moving_mass(
    design: Design, modes: ModeSet, index: int, given: Energies | None = None, progress: Progress = SILENT
) -> tuple[Moving | None, list[str]]:
    """Of mode ``index`` (from 0), by the energies ``given`` when they hold it, None when not known; and cautions."""
    if given is not None and index in given.indices:
        found, j = given, int(np.nonzero(given.indices == index)[0][0])
    else:
        found, j = None, 0
    cautions: list[str] = []
    if found is None or not found.total_kinetic[j] > 0:  # at 0 Hz the shares are those at any other frequency
        try:
            found, j = _formed(design, _alone(modes, index), progress), 0
        except (ModelError, RefusedError) as error:
            return None, [f"energies are not known: {error.problem}"]
    assumed = ""
    if found.relative:
        assumption = _assumed(design)
        assumed = assumption.words
        cautions.append(f"shares are relative only: {assumed} assumed{assumption.left_out}")
    elif found.note(j):
        cautions.append(f"energies are {found.note(j)}")
    kinetic, strain = float(found.total_kinetic[j]), float(found.total_strain[j])
    masses, lumped = _masses(design, found)
    if not (kinetic > 0 and masses.sum() > 0):
        return None, cautions
    return Moving(
        found.kinetic[j] / kinetic,
        found.strain[j] / strain if strain > 0 else None,
        masses,
        lumped,
        found.masses[j] / kinetic,
        _by_name(found.spring_names, found.springs[j], strain),
        _by_name(found.mass_names, found.masses[j], kinetic),
        assumed,
    ), cautions


def weighed_points(design: Design, moving: Moving, shape: Array) -> tuple[Array, Array, Array]:
    """Points, their masses and motions: nodes with an equal part of their cells' masses, and lumped masses."""
    mesh = design.mesh
    weight = np.zeros(mesh.n_nodes)
    for block, start in zip(mesh.blocks, mesh.block_starts[:-1], strict=True):
        count = block.nodes.shape[1]
        part = np.repeat(moving.masses[start : start + len(block)] / count, count)
        weight += np.bincount(block.nodes.ravel(), part, minlength=mesh.n_nodes)
    if not len(moving.lumped):
        return mesh.points, weight, shape
    carried = carried_points(design)[: len(design.physics.masses)]
    places = [(item.position, item.motion(shape)[:3]) for item in carried]
    for strut in _heavy_struts(design):
        for end in (strut.where, strut.other):
            rows = end.rows(mesh, f"strut '{strut.name}'")
            places.append((mesh.points[rows].mean(axis=0), shape[rows].mean(axis=0)))
    where, how = (np.stack(part) for part in zip(*places, strict=True))
    return np.concatenate([mesh.points, where]), np.concatenate([weight, moving.lumped]), np.concatenate([shape, how])


def _heavy_struts(design: Design) -> list[Strut]:
    return [strut for strut in design.physics.struts if strut.mass > 0]


def _formed(design: Design, alone: ModeSet, progress: Progress) -> Energies:
    if not states_no_material(design):
        return energies(design, alone, progress=progress)
    try:
        return relative_energies(design, alone, progress)
    except RefusedError:
        return _kinetic_only(_assumed(design).design, alone, progress)


@dataclass(frozen=True, eq=False)
class _Assumption:
    design: Design
    words: str
    left_out: str


def _assumed(design: Design) -> _Assumption:
    """The design of one material, and of one thickness (or section) when none is stated: then nothing but masses may
    be asked of it. ``RefusedError`` when cells of several dimensions lack sizes: they cannot be weighed together."""
    left = "; springs and lumped masses are left out" if design.physics.springs or design.physics.masses else ""
    try:
        return _Assumption(assume_material(design), "one uniform material", left)
    except RefusedError:
        dims = {KINDS[block.kind].dim for block in design.mesh.blocks if len(block)} - {0}
        if len(dims) != 1 or design.physics.assignments:
            raise
        thin = 1e-3 * design.mesh.diagonal
        section = Section("round", diameter=thin)
        everywhere = Assignment("*", ASSUMED.name, thin, section=section, orientation=_askew(design.mesh))
        physics = Physics({ASSUMED.name: ASSUMED}, (everywhere,))
        words = "one uniform material and one " + ("thickness" if 2 in dims else "section")
        return _Assumption(design.with_(physics=physics), words, left)


def _askew(mesh: Mesh) -> tuple[float, ...] | None:
    """A direction along which no line cell points: "up" of a round section may be anything else."""
    lines = [mesh.points[b.nodes[:, 1]] - mesh.points[b.nodes[:, 0]] for b in mesh.blocks if KINDS[b.kind].dim == 1]
    if not lines:
        return None
    way = np.concatenate(lines)
    way = way / np.maximum(np.linalg.norm(way, axis=1), 1e-300)[:, None]
    tried = np.random.default_rng(0).normal(size=(16, 3))
    tried /= np.linalg.norm(tried, axis=1)[:, None]
    x, y, z = tried[np.argmin(np.abs(way @ tried.T).max(axis=0))].tolist()
    return x, y, z


def _kinetic_only(design: Design, alone: ModeSet, progress: Progress) -> Energies:
    """Shares of kinetic energy; nothing is known of strain."""
    layout = lay_out(design, progress)
    vectors, _ = mode_vectors(layout, alone, np.array([0]))
    kinetic = cell_energies(layout, vectors, "mass", progress)
    if not kinetic.sum() > 0:
        raise ModelError(f"design '{design.name}': the mode moves no mass", file=alone.source or None)
    unknown, none = np.full(1, np.nan), np.zeros((1, 0))
    return Energies(
        indices=np.array([0]),
        freq_hz=alone.freq_hz,
        strain=np.zeros_like(kinetic),
        kinetic=kinetic / kinetic.sum(),
        springs=none,
        masses=none,
        volumes=cell_volumes(layout),
        closure=unknown,
        residual=unknown,
        residual_cells=np.full_like(kinetic, np.nan),
        trusted=np.zeros(1, bool),
        spring_names=(),
        mass_names=(),
        formulations=(),
        cautions=(),
        relative=True,
    )


def _alone(modes: ModeSet, index: int) -> ModeSet:
    """A set of this one mode, at 1 Hz when it has none."""
    turned, frequency = modes.rotations(index), modes.freq_hz[index]
    shapes = ArrayShapes(modes.shape(index)[None], None if turned is None else turned[None])
    alone = replace(modes, freq_hz=np.ones(1), shapes=shapes, damping=None, cell_energy=None)
    return alone.with_(freq_hz=np.array([frequency])) if frequency > 0 else alone


def _masses(design: Design, found: Energies) -> tuple[Array, Array]:
    """Masses (n_cells,) of the cells, kg (or volumes of the one assumed material), and of the lumped masses: those
    stated, then half of each strut at either end, as in ``assembly.Layout``."""
    if found.relative:
        return np.array(found.volumes), np.zeros(0)
    properties, index = design.properties
    density = np.array([*(_density(prop) for prop in properties), 0.0])
    ends = [strut.mass / 2 for strut in _heavy_struts(design) for _ in range(2)]
    return found.volumes * density[index], np.array([*(item.mass for item in design.physics.masses), *ends])


def _density(prop: Property) -> float:
    """kg/m³, of all layers together."""
    if not prop.layers:
        return prop.material.density
    return sum(layer.material.density * layer.thickness for layer in prop.layers) / (prop.thickness or 1.0)


def _by_name(names: tuple[str, ...], values: Array, whole: float) -> dict[str, float]:
    out = dict.fromkeys(names, 0.0)
    for name, value in zip(names, values, strict=True):
        out[name] += float(value / whole) if whole > 0 else 0.0
    return out
