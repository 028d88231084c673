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

from dataclasses import dataclass

import numpy as np

from viewer.errors import InputError, RefusedError
from viewer.insight.gain_finding import GainMap, MassGain, Place, SpringGain
from viewer.insight.places import Patch, cell_centres, nearest_cell, peak_patches
from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import Layout, lay_out
from viewer.mechanics.energy import RELATIVE, Energies, shape_vectors
from viewer.mechanics.energy import energies as form_energies
from viewer.mechanics.given_matrices import NO_CELLS
from viewer.mechanics.growth import (
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

__all__ = ["CLOSE", "REPEATED", "GainMap", "gain_map"]

REPEATED = 1e-3  # relative difference of frequencies below which modes are taken together
CLOSE = 0.02  # and below which the nearest other mode is named, since a larger change mixes the two
_INDEPENDENT = 1e-6  # smallest eigenvalue of the shapes' cross-products at unit modal mass, else they are one shape


def gain_map(
    design: Design, modes: ModeSet, number: int, energies: Energies | None = None, progress: Progress = SILENT
) -> GainMap:
    """What stiffening, lightening and thickening every cell does to mode ``number`` (from 1).

    energies  of this design and mode set, when they are known already; formed for the mode otherwise
    Raises ``InputError`` for a mode that is not there, ``RefusedError`` when the design has no cells to change (its
    matrices were given) and as ``relative_energies``, ``ModelError`` as ``energies``. Memory: for m modes of equal
    frequency five arrays (n_cells, m, m), and chunks of element matrices.
    """
    if not 1 <= number <= modes.count:
        raise InputError(
            f"design '{design.name}' has no mode {number}", expected=f"1 to {modes.count}", do="choose another mode"
        )
    if design.physics.matrices is not None:
        raise RefusedError(
            f"design '{design.name}': {NO_CELLS}, and where to change it cannot be told",
            do="give materials and assignments instead of matrices",
        )
    index, relative = number - 1, states_no_material(design)
    members = _members(modes.freq_hz, index)
    if energies is None or not np.isin(members, energies.indices).all():
        energies = (
            relative_energies(design, modes, progress)
            if relative
            else form_energies(design, modes, members.tolist(), progress)
        )
    rows = np.array([int(np.nonzero(energies.indices == i)[0][0]) for i in members])
    own = rows[members == index][0]
    rigid = not energies.total_strain[own] > 0 if relative else bool(np.isnan(energies.closure[own]))
    absolute = not relative and not rigid and bool(energies.trusted[rows].all())
    layout = lay_out(assume_material(design) if relative else design, progress)
    if rigid:
        return _finding(layout, modes, number, members[members == index], _nothing(layout), False, energies.cautions)
    vectors, doubts = shape_vectors(layout, modes, members, progress)
    if not _independent(layout, vectors):
        members, vectors = members[members == index], vectors[members == index]
    known = None
    if len(members) == 1 and not relative and _same_elements(energies, layout):
        square = (2 * np.pi * energies.freq_hz[own]) ** 2
        known = 2 * energies.strain[own][:, None, None], 2 * energies.kinetic[own][:, None, None] / square
    found = _derivatives(layout, vectors, known or cell_forms(layout, vectors, progress), progress)
    cautions = (*energies.cautions, *doubts, *_cautions(modes.freq_hz, members, relative, absolute))
    return _finding(layout, modes, number, members, found, absolute, tuple(dict.fromkeys(cautions)))


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


def _derivatives(layout: Layout, vectors: Array, forms: tuple[Array, Array], progress: Progress) -> _Derivatives:
    """From the vectors (m, n_dof) and the forms of the cells in stiffness and mass, (n_cells, m, m) each."""
    stiffness, mass = forms
    grown_stiffness, grown_mass = growth_forms(layout, vectors, stiffness, mass, progress)
    springs, masses = attached_forms(layout.springs, vectors), attached_forms(layout.masses, vectors)
    # φ' = φ L⁻ᴴ with L Lᴴ = M has unit modal mass; a form F becomes L⁻¹ F L⁻ᴴ
    turn = np.linalg.inv(np.linalg.cholesky(mass.sum(axis=0) + masses.sum(axis=0)))
    settled = lambda forms: turn @ forms @ turn.conj().T  # noqa: E731
    stiffness, springs, grown_stiffness = settled(stiffness), settled(springs), settled(grown_stiffness)
    square = np.trace(stiffness.sum(axis=0) + springs.sum(axis=0)).real / len(vectors)  # λ, mean over the modes
    return _Derivatives(
        stiffness / square,
        -settled(mass),
        grown_stiffness / square - settled(grown_mass),
        springs / square,
        -settled(masses),
        -settled(centre_forms(layout.masses, vectors)),
    )


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


def _same_elements(energies: Energies, layout: Layout) -> bool:
    return set(energies.formulations) == {group.formulation.name for group in layout.blocks}


def _independent(layout: Layout, vectors: Array) -> bool:
    """Whether shapes are several and not one given twice."""
    if len(vectors) == 1:
        return True
    unit = vectors / np.linalg.norm(vectors, axis=1, keepdims=True)
    return bool(np.linalg.eigvalsh(unit @ unit.conj().T)[0] > _INDEPENDENT)


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
    found: _Derivatives,
    absolute: bool,
    cautions: tuple[str, ...],
) -> GainMap:
    mesh, masses, dimension = layout.design.mesh, cell_masses(layout), dimensions(layout)
    mean = lambda forms: np.trace(forms, axis1=-2, axis2=-1).real / len(members)  # noqa: E731
    growth, freq_hz = mean(found.growth), float(modes.freq_hz[members].mean())
    rigid = not found.stiffness.any() and not found.springs.any()
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
