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


def cell_forms(layout: Layout, vectors: Array, progress: Progress = SILENT) -> tuple[Array, Array]:
    """φᵢᴴKₑφⱼ and φᵢᴴMₑφⱼ, (n_cells, m, m) each, of the vectors (m, n_dof), real or complex.

    The products off the diagonal come from the energies of sums: aᴴAb = E(a + b) − E(a) − E(b), E = ½vᴴAv."""
    count = len(vectors)
    first, second = np.triu_indices(count, 1)
    phases = [1.0, 1.0j] if np.iscomplexobj(vectors) else [1.0]
    sums = [vectors[first] + phase * vectors[second] for phase in phases]
    both = strain_and_kinetic(layout, np.concatenate([vectors, *sums]), progress)
    return _products(both[0], count, len(phases)), _products(both[1], count, len(phases))


def _products(energy: Array, count: int, phases: int) -> Array:
    """(n_cells, m, m) Hermitian products from energies (m + pairs, n_cells) of vectors, sums and turned sums."""
    first, second = np.triu_indices(count, 1)
    out = np.zeros((energy.shape[1], count, count), float if phases == 1 or count == 1 else complex)
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
    layout: Layout, vectors: Array, stiffness: Array, mass: Array, progress: Progress = SILENT
) -> tuple[Array, Array]:
    """Derivatives of the forms ``stiffness`` and ``mass`` (n_cells, m, m; :func:`cell_forms`) by the factor by which
    each cell grows."""
    thin = [group for group in layout.blocks if KINDS[group.kind].dim < 3]
    slopes = stiffness.copy(), mass.copy()
    if thin:
        ends = []
        for factor in (1 + _STEP, 1 - _STEP):
            grown = tuple(replace(group, prop=grown_property(group.prop, _dim(group), factor)) for group in thin)
            forms = cell_forms(replace(layout, blocks=grown), vectors, progress)
            ends.append([form / factor for form in forms])
        for slope, above, below in zip(slopes, *ends, strict=True):
            slope += (above - below) / (2 * _STEP)  # zero in solids, which are in neither
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
