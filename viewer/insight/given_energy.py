"""Strain energies that a solver wrote beside its modes: as densities to show, and against ours.

They are in the solver's own unit, so that only shares are compared.
"""

from __future__ import annotations

import numpy as np

from viewer.cells import KINDS, measures
from viewer.errors import RefusedError
from viewer.model.arrays import Array
from viewer.model.mesh import Mesh
from viewer.model.modes import ModeSet


def given_density(mesh: Mesh, modes: ModeSet, index: int, volumes: Array | None = None) -> Array:
    """(n_cells,) given strain-energy density of mode ``index`` relative to its mean, 0 where none was given.

    volumes  (n_cells,) m³; None takes the cells' own measure, which needs cells of one dimension
    Raises ``RefusedError`` when nothing was given, or nothing can be said about volumes.
    """
    energy = None if modes.cell_energy is None else modes.cell_energy[index]
    if energy is None or not np.nansum(energy) > 0:
        raise RefusedError(
            f"no strain energies were given with mode {index + 1}", file=modes.source or None,
            do="leave the given energies out, or write them as cell arrays strain_energy_001, strain_energy_002 … "
            "beside the modes",
        )  # fmt: skip
    volumes = _measures(mesh) if volumes is None else volumes
    there = np.isfinite(energy) & (volumes > 0)
    density = np.zeros(len(energy))
    density[there] = energy[there] / volumes[there] * (volumes[there].sum() / energy[there].sum())
    return density


def agreement(own: Array, given: Array) -> float:
    """Correlation (Pearson) of two sets of element energies (n,), over elements for which both are known; NaN when
    either does not vary. 1: alike up to a factor."""
    both = np.isfinite(own) & np.isfinite(given)
    own, given = own[both], given[both]
    if len(own) < 2 or not own.std() > 1e-12 * abs(own).max() or not given.std() > 1e-12 * abs(given).max():
        return float("nan")
    return float(np.corrcoef(own, given)[0, 1])


def _measures(mesh: Mesh) -> Array:
    if len({KINDS[block.kind].dim for block in mesh.blocks}) > 1:
        raise RefusedError(
            "given energies cannot be shown as densities: the volumes of shells and beams are unknown",
            file=mesh.source or None, do="assign materials and thicknesses",
        )  # fmt: skip
    return np.concatenate([measures(block.kind, mesh.points[block.nodes]) for block in mesh.blocks])
