"""More of the same: what the forms φᵢᴴAφⱼ of every cell become when it is given more of its own material.

How a cell grows, its nodes and the shape held:

sheet  thicker, all plies alike, the middle of the sheet (``offset``) where it is
beam   a similar section, its area larger: moments of area with the square of the area
solid  denser and stiffer alike, as a fill or a lattice of which there is more

Element matrices of sheets and beams are polynomials of that factor s without a constant, of the third degree at
most (membrane, stretching and mass ∝ s, bending ∝ s³ or s²), but for the small part that transverse shear takes in
some elements. With q = E/s the derivative at s = 1 is E + (q(1 + h) − q(1 − h)) / 2h, exact for such polynomials
whatever the step, so that the step may be large and rounding stays small.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any

import numpy as np

from viewer.cells import KINDS
from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import ElementGroup, Layout
from viewer.mechanics.constraints import Attachment
from viewer.mechanics.laminate import mass_moments
from viewer.mechanics.sums import strain_and_kinetic
from viewer.model.arrays import Array
from viewer.model.design import Property, Section

_STEP = 0.01
_LENGTHS, _MOMENTS = ("width", "height", "diameter", "wall"), ("iy", "iz", "torsion")


Forms = tuple[Array, Array]


def cell_forms(layout: Layout, bases: Sequence[Array], progress: Progress = SILENT) -> list[Forms]:
    """φᵢᴴKₑφⱼ and φᵢᴴMₑφⱼ, (n_cells, m, m) each, of every basis (m, n_dof) of real or complex vectors; one pass over
    the cells for all of them.

    The products off the diagonal come from the energies of sums: aᴴAb = E(a + b) − E(a) − E(b), E = ½vᴴAv."""
    stacked = [_with_sums(basis) for basis in bases]
    both = strain_and_kinetic(layout, np.concatenate(stacked), progress)
    ends = np.cumsum([len(part) for part in stacked])[:-1]
    strain, moving = (np.split(energy, ends) for energy in both)
    return [
        (_products(one, basis), _products(two, basis)) for one, two, basis in zip(strain, moving, bases, strict=True)
    ]


def _phases(basis: Array) -> list[complex]:
    return [1.0, 1.0j] if np.iscomplexobj(basis) and len(basis) > 1 else [1.0]


def _with_sums(basis: Array) -> Array:
    """The vectors, then the sums of all pairs, then those with the second turned by a quarter if complex."""
    first, second = np.triu_indices(len(basis), 1)
    return np.concatenate([basis, *(basis[first] + phase * basis[second] for phase in _phases(basis))])


def _products(energy: Array, basis: Array) -> Array:
    """(n_cells, m, m) Hermitian products from the energies (…, n_cells) of :func:`_with_sums`."""
    count, phases = len(basis), len(_phases(basis))
    first, second = np.triu_indices(count, 1)
    out = np.zeros((energy.shape[1], count, count), float if phases == 1 else complex)
    out[:, np.arange(count), np.arange(count)] = 2 * energy[:count].T
    if len(first):
        crossed = energy[count:].reshape(phases, len(first), -1) - energy[first] - energy[second]
        # Re aᴴA(ib) = −Im aᴴAb
        products = (crossed[0] if phases == 1 else crossed[0] - 1j * crossed[1]).T
        out[:, first, second], out[:, second, first] = products, products.conj()
    return out


def attached_forms(items: Sequence[Attachment], vectors: Array) -> Array:
    """φᵢᴴAφⱼ, (n_items, m, m), of springs or lumped masses and the vectors (m, n_dof)."""
    motions = [item.operator @ vectors[:, item.dofs].T for item in items]
    forms = [motion.conj().T @ (item.core @ motion) for item, motion in zip(items, motions, strict=True)]
    return np.stack(forms) if forms else np.zeros((0, len(vectors), len(vectors)), vectors.dtype)


def centre_forms(masses: Sequence[Attachment], vectors: Array) -> Array:
    """As :func:`attached_forms` for one kilogram without inertia at the centre of each lumped mass."""
    motions = [(item.operator @ vectors[:, item.dofs].T)[:3] for item in masses]  # translations first, then turns
    forms = [motion.conj().T @ motion for motion in motions]
    return np.stack(forms) if forms else np.zeros((0, len(vectors), len(vectors)), vectors.dtype)


def growth_forms(
    layout: Layout, bases: Sequence[Array], forms: Sequence[Forms], progress: Progress = SILENT
) -> list[Forms]:
    """Derivatives of the ``forms`` of the ``bases`` (:func:`cell_forms`) by the factor by which each cell grows."""
    slopes = [(stiffness.copy(), mass.copy()) for stiffness, mass in forms]
    thin = [group for group in layout.blocks if _dim(group) < 3]
    if thin:
        for factor in (1 + _STEP, 1 - _STEP):
            grown = tuple(replace(group, prop=grown_property(group.prop, _dim(group), factor)) for group in thin)
            ends = cell_forms(replace(layout, blocks=grown), bases, progress)
            weight = np.sign(factor - 1) / (2 * _STEP * factor)
            for slope, end in zip(slopes, ends, strict=True):
                for part, value in zip(slope, end, strict=True):
                    part += weight * value  # zero in solids, which are in neither
    return slopes


def cell_masses(layout: Layout) -> Array:
    """(n_cells,) kg of the cells that carry stiffness, 0 for the others."""
    out = np.zeros(layout.design.mesh.n_cells)
    for group in layout.blocks:
        density = group.prop.material.density
        if _dim(group) == 2:
            density = mass_moments(group.prop)[0] / (group.prop.thickness or 1.0)
        out[group.cells] = density * group.volumes(layout.points)
    return out


def dimensions(layout: Layout) -> Array:
    """(n_cells,) 1 beams, 2 sheets, 3 solids, 0 cells that carry no stiffness."""
    out = np.zeros(layout.design.mesh.n_cells, np.int8)
    for group in layout.blocks:
        out[group.cells] = _dim(group)
    return out


def grown_property(prop: Property, dim: int, factor: float) -> Property:
    """The property of a sheet ``factor`` times as thick, or of a beam with ``factor`` times the area."""
    if dim == 2:
        layers = tuple(replace(layer, thickness=factor * layer.thickness) for layer in prop.layers)
        return replace(prop, thickness=factor * (prop.thickness or 0.0), layers=layers)
    return replace(prop, section=None if prop.section is None else _grown_section(prop.section, factor))


def _grown_section(section: Section, factor: float) -> Section:
    powers = dict.fromkeys(_LENGTHS, 0.5) | {"area": 1.0} | dict.fromkeys(_MOMENTS, 2.0)
    stated = {name: getattr(section, name) for name in powers if getattr(section, name) is not None}
    changes: dict[str, Any] = {name: value * factor ** powers[name] for name, value in stated.items()}
    return replace(section, **changes)


def _dim(group: ElementGroup) -> int:
    return KINDS[group.kind].dim
