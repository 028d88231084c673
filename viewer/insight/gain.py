"""Where to stiffen and where to lighten: what more or less material does to one natural frequency (DESIGN §6).

First-order derivatives of λ = ω² with the shape held (Fox R.L., Kapoor M.P., Rates of change of eigenvalues and
eigenvectors, AIAA J. 6 (1968) 2426), relative to λ and formed from our own energies, U strain and T kinetic:

by stiffness   ∂ln λ/∂ln k = U_e/U, so that all cells and springs add up to 1: twice the stiffness, twice λ
by mass        ∂ln λ/∂ln m = −T_e/T, all cells and lumped masses add up to −1
by thickness   of sheets, ∂ln λ/∂ln t: (3 U_bending + U_membrane + U_shear)/U − (T_e, rotary inertia thrice)/T for a
               plain sheet; formed from the element energies themselves (``mechanics/growth.py``), so that it holds
               for layers, offsets and every element as the solver has it
by growth      the same for "more of the same material here": sheets by thickness, beams by the area of a similar
               section, solids by stiffness and mass alike. Over the mass of the cell this is what the map shows

A relative change of λ by x changes the frequency by half of it; Hz are that times the frequency given.

**Modes of equal frequency** have no shape of their own: any mix of them is one as well. Those within ``REPEATED`` of
one another are taken together. Derivatives are then small Hermitian matrices over a basis of unit modal mass, and a
change at one place moves the frequencies by their eigenvalues (Courant R., Hilbert D., Methods of Mathematical
Physics I, 1953, ch. V §13; Friswell M.I., J. Vib. Acoust. 118 (1996) 390). Figures by cell, and their sums, are the
mean of the eigenvalues, which no choice of basis changes and which adds up; ``split`` has the eigenvalues themselves
for a change of that cell, group or place alone, which do not add up.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from viewer.errors import RefusedError
from viewer.insight.gain_finding import GainMap, MassGain, Place, SpringGain
from viewer.insight.places import Patch, cell_centres, nearest_cell, peak_patches
from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import Layout, lay_out
from viewer.mechanics.energy import RELATIVE, Energies, shape_vectors
from viewer.mechanics.energy import energies as form_energies
from viewer.mechanics.given_matrices import NO_CELLS
from viewer.mechanics.growth import (
    Forms,
    attached_forms,
    cell_forms,
    cell_masses,
    centre_forms,
    dimensions,
    growth_forms,
)
from viewer.mechanics.relative import assume_material, relative_energies, states_no_material
from viewer.mechanics.settle import clusters
from viewer.model.arrays import Array
from viewer.model.design import Design
from viewer.model.modes import ModeSet

__all__ = ["CLOSE", "REPEATED", "GainMap", "gain_map", "gain_maps"]

REPEATED = 1e-3  # relative difference of frequencies below which modes are taken together
CLOSE = 0.02  # and below which the nearest other mode is named, since a larger change mixes the two
_INDEPENDENT = 1e-6  # smallest eigenvalue of the shapes' cross-products at unit modal mass, else they are one shape


def gain_map(
    design: Design, modes: ModeSet, number: int, energies: Energies | None = None, progress: Progress = SILENT
) -> GainMap:
    """What stiffening, lightening and thickening every cell does to mode ``number`` (from 1); see :func:`gain_maps`,
    which takes hardly longer for many modes of sheets than this for one."""
    return gain_maps(design, modes, [number], energies, progress)[0]


def gain_maps(
    design: Design,
    modes: ModeSet,
    numbers: Sequence[int] | None = None,
    energies: Energies | None = None,
    progress: Progress = SILENT,
) -> list[GainMap]:
    """The gain maps of the modes ``numbers`` (from 1; None: all).

    energies  of this design and mode set, when they are known already; formed otherwise
    Raises ``InputError`` for a mode that is not there, ``RefusedError`` when the design has no cells to change (its
    matrices were given) and as ``relative_energies``, ``ModelError`` as ``energies``. Memory: for every set of m
    modes of equal frequency five arrays (n_cells, m, m), and chunks of element matrices.
    """
    numbers = list(range(1, modes.count + 1)) if numbers is None else list(numbers)
    if not numbers:
        return []
    for number in numbers:
        modes.index_of(number, design.name)
    if design.physics.matrices is not None:
        raise RefusedError(
            f"design '{design.name}': {NO_CELLS}, and where to change it cannot be told",
            do="give materials and assignments instead of matrices",
        )
    relative = states_no_material(design)
    members = [_members(modes.freq_hz, number - 1) for number in numbers]
    wanted = np.unique(np.concatenate(members))
    if energies is None or not np.isin(wanted, energies.indices).all():
        energies = (
            relative_energies(design, modes, progress)
            if relative
            else form_energies(design, modes, wanted.tolist(), progress)
        )
    layout = lay_out(assume_material(design) if relative else design, progress)
    row = {int(i): j for j, i in enumerate(energies.indices)}
    rigid = np.array([_is_rigid(energies, row[number - 1]) for number in numbers])
    vectors, doubts = shape_vectors(layout, modes, wanted, progress)
    together = [_independent(vectors, wanted, each, n - 1) for each, n in zip(members, numbers, strict=True)]
    sets = list(dict.fromkeys(tuple(each) for each, still in zip(together, rigid, strict=True) if not still))
    bases = [vectors[np.isin(wanted, each)] for each in sets]
    found = dict(zip(sets, _derivatives(layout, bases, sets, energies, progress), strict=True))
    maps = []
    for number, each, still in zip(numbers, together, rigid, strict=True):
        if still:
            maps.append(_finding(layout, modes, number, np.array([number - 1]), None, False, energies.cautions))
            continue
        absolute = not relative and bool(energies.trusted[[row[i] for i in each]].all())
        cautions = (*energies.cautions, *doubts, *_cautions(modes.freq_hz, np.array(each), relative, absolute))
        distinct = tuple(dict.fromkeys(cautions))
        maps.append(_finding(layout, modes, number, np.array(each), found[tuple(each)], absolute, distinct))
    return maps


@dataclass(frozen=True, eq=False)
class _Derivatives:
    """∂ln λ as Hermitian matrices (…, m, m): by stiffness, mass and growth of the cells (n_cells), of springs by
    stiffness, of lumped masses as a whole and per kg at their centres."""

    stiffness: Array
    mass: Array
    growth: Array
    springs: Array
    masses: Array
    per_mass: Array


def _derivatives(
    layout: Layout, bases: list[Array], sets: list[tuple[int, ...]], energies: Energies, progress: Progress
) -> list[_Derivatives]:
    """Of every basis (m, n_dof), the shapes of the modes in ``sets`` (indices)."""
    if not bases:
        return []
    known = [_known_forms(energies, each, layout) for each in sets]
    unknown = [basis for basis, forms in zip(bases, known, strict=True) if forms is None]
    formed = iter(cell_forms(layout, unknown, progress) if unknown else [])
    forms = [one if one is not None else next(formed) for one in known]
    slopes = growth_forms(layout, bases, forms, progress)
    return [_settled(layout, *parts) for parts in zip(bases, forms, slopes, strict=True)]


def _settled(layout: Layout, vectors: Array, forms: Forms, slopes: Forms) -> _Derivatives:
    springs, masses = attached_forms(layout.springs, vectors), attached_forms(layout.masses, vectors)
    # φ' = φ L⁻ᴴ with L Lᴴ = M has unit modal mass; a form F becomes L⁻¹ F L⁻ᴴ
    turn = np.linalg.inv(np.linalg.cholesky(forms[1].sum(axis=0) + masses.sum(axis=0)))
    stiffness, springs, grown, mass, grown_mass, masses, centres = (
        turn @ form @ turn.conj().T
        for form in (forms[0], springs, slopes[0], forms[1], slopes[1], masses, centre_forms(layout.masses, vectors))
    )
    square = np.trace(stiffness.sum(axis=0) + springs.sum(axis=0)).real / len(vectors)  # λ, mean over the modes
    return _Derivatives(stiffness / square, -mass, grown / square - grown_mass, springs / square, -masses, -centres)


def _known_forms(energies: Energies, members: tuple[int, ...], layout: Layout) -> Forms | None:
    """Forms of a mode of its own from its energies, when these are of the same elements and in joules."""
    elements = {group.formulation.name for group in layout.blocks}
    if len(members) > 1 or energies.relative or set(energies.formulations) != elements:
        return None
    j = int(np.nonzero(energies.indices == members[0])[0][0])
    square = (2 * np.pi * energies.freq_hz[j]) ** 2
    return 2 * energies.strain[j][:, None, None], 2 * energies.kinetic[j][:, None, None] / square


def _nothing(layout: Layout) -> _Derivatives:
    """Of a rigid-body mode: its frequency stays zero."""
    cells = np.zeros((layout.design.mesh.n_cells, 1, 1))
    springs, masses = np.zeros((len(layout.springs), 1, 1)), np.zeros((len(layout.masses), 1, 1))
    return _Derivatives(cells, cells, cells, springs, masses, masses)


def _members(freq_hz: Array, index: int) -> Array:
    """Indices, ascending, of the modes whose frequencies are as good as that of mode ``index``, itself included."""
    if not freq_hz[index] > 0:
        return np.array([index])
    elastic = np.nonzero(freq_hz > 0)[0]
    order = elastic[np.argsort(freq_hz[elastic], kind="stable")]
    runs = [order[part] for part in clusters(freq_hz[order], REPEATED)]
    return np.sort(next(run for run in runs if index in run))


def _is_rigid(energies: Energies, j: int) -> bool:
    return not energies.total_strain[j] > 0 if energies.relative else bool(np.isnan(energies.closure[j]))


def _independent(vectors: Array, indices: Array, members: Array, index: int) -> list[int]:
    """``members``, or mode ``index`` alone when their shapes are one given twice."""
    unit = vectors[np.isin(indices, members)]
    unit = unit / np.linalg.norm(unit, axis=1, keepdims=True)
    several = np.linalg.eigvalsh(unit @ unit.conj().T)[0] > _INDEPENDENT
    return [int(i) for i in members] if several else [index]


def _cautions(freq_hz: Array, members: Array, relative: bool, absolute: bool) -> list[str]:
    words = []
    if relative:
        words.append(f"energies are {RELATIVE}, springs and lumped masses left out: shares only, no Hz")
    elif not absolute:
        words.append("the energies are not trusted (closure, residual): shares only, no Hz")
    own = freq_hz[members].mean()
    others = np.delete(np.arange(len(freq_hz)), members)
    others = others[np.abs(freq_hz[others] - own) <= CLOSE * own]
    if len(others):
        near = others[np.argmin(np.abs(freq_hz[others] - own))]
        words.append(
            f"mode {near + 1} lies only {abs(freq_hz[near] - own):.2g} Hz away: the figures hold for changes that "
            "move the frequency by much less, larger ones mix the two shapes"
        )
    if freq_hz[members].max() >= np.nanmax(freq_hz):
        words.append(
            "no mode above this one is known: if the next has nearly the same frequency, the figures by place "
            "hold for neither"
        )
    return words


def _finding(
    layout: Layout,
    modes: ModeSet,
    number: int,
    members: Array,
    found: _Derivatives | None,
    absolute: bool,
    cautions: tuple[str, ...],
) -> GainMap:
    rigid, found = found is None, found or _nothing(layout)
    mesh, masses, dimension = layout.design.mesh, cell_masses(layout), dimensions(layout)
    mean = lambda forms: np.trace(forms, axis1=-2, axis2=-1).real / len(members)  # noqa: E731
    growth, freq_hz = mean(found.growth), float(modes.freq_hz[members].mean())
    per_kg, split = np.full(mesh.n_cells, np.nan), None
    if absolute:
        there = masses > 0
        per_kg[there] = 0.5 * freq_hz * growth[there] / masses[there]
        if len(members) > 1:
            split = np.full((mesh.n_cells, len(members)), np.nan)
            split[there] = 0.5 * freq_hz * np.linalg.eigvalsh(found.growth[there]) / masses[there, None]
    density = np.divide(growth, masses, out=np.zeros_like(growth), where=masses > 0)
    place = _Places(found, masses, dimension, cell_centres(mesh))
    groups = [(name, np.unique(cells)) for name, cells in mesh.cell_groups.items()]
    return GainMap(
        mode=number,
        freq_hz=freq_hz,
        modes=tuple(int(i) + 1 for i in members),
        stiffness=mean(found.stiffness),
        mass=mean(found.mass),
        thickness=np.where(dimension == 2, growth, np.nan),
        growth=growth,
        cell_mass=masses,
        per_kg=per_kg,
        split=split,
        dimension=dimension,
        springs=tuple(
            SpringGain(item.name, float(share))
            for item, share in zip(layout.springs, mean(found.springs), strict=True)
        ),
        masses=tuple(
            MassGain(item.name, float(item.core[0, 0]), -float(share), float(per_mass))
            for item, share, per_mass in zip(layout.masses, mean(found.masses), mean(found.per_mass), strict=True)
        ),
        groups=tuple(place.of_group(name, cells) for name, cells in groups if masses[cells].any()),
        stiffen=() if rigid else tuple(place.of_patch(patch) for patch in peak_patches(mesh, density, masses)),
        lighten=() if rigid else tuple(place.of_patch(patch) for patch in peak_patches(mesh, -density, masses)),
        absolute=absolute,
        rigid=rigid,
        cautions=cautions,
    )


@dataclass(frozen=True, eq=False)
class _Places:
    """Figures of cells taken together."""

    found: _Derivatives
    masses: Array
    dimension: Array
    centres: Array

    def of_patch(self, patch: Patch) -> Place:
        return self._place(patch.name, patch.cells, patch.position)

    def of_group(self, name: str, cells: Array) -> Place:
        return self._place(name, cells, self.centres[nearest_cell(cells, self.masses, self.centres)])

    def _place(self, name: str, cells: Array, position: Array) -> Place:
        together = lambda forms, rows: np.linalg.eigvalsh(forms[rows].sum(axis=0))  # noqa: E731
        sheets = cells[self.dimension[cells] == 2]
        return Place(
            name=name,
            cells=cells,
            position=position,
            mass=float(self.masses[cells].sum()),
            mass_share=float(self.masses[cells].sum() / self.masses.sum()),
            stiffness=together(self.found.stiffness, cells),
            mass_gain=together(self.found.mass, cells),
            growth=together(self.found.growth, cells),
            thickness=together(self.found.growth, sheets) if len(sheets) else None,
        )
