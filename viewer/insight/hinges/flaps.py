"""Regions left when the bands are taken out, and which of them flap."""

from __future__ import annotations

import numpy as np

from viewer.insight.hinges.field import Field
from viewer.insight.hinges.finding import Flap, Hinge
from viewer.model.arrays import Array

KINETIC, FIT = 0.15, 0.99  # least share of the kinetic energy and of motion that is rigid


def regions(field: Field, bands: list[Array]) -> Array:
    """(n_cells,) number of the connected region without the ``bands``; −1 in them and where there is no volume."""
    out = np.full(len(field.volume), -1)
    free = field.volume > 0
    for band in bands:
        free[band] = False
    rows = np.nonzero(free)[0]
    if len(rows):
        out[rows] = field.pieces(rows)
    return out


def rigid_fit(field: Field, cells: Array) -> float:
    """Share of the kinetic energy of ``cells`` that their best rigid motion explains: mass-weighted fit to the
    motion of the cells' middles."""
    mass, move = field.mass[cells], field.shift[cells]
    if mass.sum() <= 0:
        return 0.0
    arm = field.middle[cells] - mass @ field.middle[cells] / mass.sum()
    mean = mass @ move / mass.sum()
    rest = move - mean
    inertia = (mass @ (arm**2).sum(axis=1)) * np.eye(3) - np.einsum("n,ni,nj->ij", mass, arm, arm)
    spin = np.linalg.pinv(inertia, rcond=1e-10, hermitian=True) @ (mass @ np.cross(arm, rest))
    whole = mass @ (move**2).sum(axis=1)
    left = mass @ ((rest - np.cross(spin, arm)) ** 2).sum(axis=1)
    return float(1 - left / whole) if whole > 0 else 0.0


def find_flaps(field: Field, hinges: tuple[Hinge, ...], region: Array) -> tuple[Flap, ...]:
    """Flaps by falling kinetic energy. A region that holds a support is none."""
    if not hinges:
        return ()
    held = set(np.unique(region[field.clamped]).tolist())
    found = []
    for number in range(region.max() + 1):
        if number in held:
            continue
        cells = np.nonzero(region == number)[0]
        kinetic = float(field.kinetic[cells].sum())
        if kinetic < KINETIC or len(cells) == len(region):
            continue
        touching = tuple(h.number for h in hinges if any(number in region[side] for side in h.sides if len(side)))
        fit = rigid_fit(field, cells)
        if touching and fit >= FIT:
            size = float(np.linalg.norm(np.ptp(field.points[field.corners[cells].ravel()], axis=0)))
            found.append((kinetic, touching, cells, float(field.strain[cells].sum()), fit, size))
    found.sort(key=lambda item: -item[0])
    return tuple(Flap(i + 1, t, c, k, s, f, z) for i, (k, t, c, s, f, z) in enumerate(found))
