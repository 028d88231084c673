"""Where to look: connected sets of cells with dense strain energy, at every level and bridged over gaps.

Levels rise in powers of two from twice the mean up to where no set holds enough energy any more, once for the density
itself and once for the density relative to its neighbourhood, so that a groove in a quiet place and a tiny tab on a
graded mesh both show. Sets are connected through common sides, and again through boxes of a few per cent of the size,
so that the ligaments of a perforated line come as one.
"""

from __future__ import annotations

import numpy as np
import scipy.sparse as sp
from scipy import ndimage
from scipy.sparse.csgraph import connected_components

from viewer.insight.hinges.field import Field
from viewer.jobs import Progress
from viewer.model.arrays import Array

LEAST_SHARE = 0.025  # of the strain energy of the whole, for a set to be looked at
MOST_VOLUME = 0.3  # share of the volume: no band is larger
BRIDGES = (0.0, 0.03, 0.07)  # of the size: gaps within one band
_ALIKE = 0.85  # share of energy in common from which two sets are one candidate
_ROOM = 0.5  # and share of the volume in common
_LEVELS = 12
_NEAR = 0.08  # of the size: boxes of the neighbourhood


def candidates(field: Field, progress: Progress) -> list[Array]:
    """Sets of cell rows, each once, the densest levels first."""
    found: list[tuple[Array, Array]] = []
    whole = field.volume.sum()
    for measure, first in ((field.density, 2.0), (_local(field), 2.0)):
        for level in first * 2.0 ** np.arange(_LEVELS):
            progress.tick("dense energy")
            rows = np.nonzero(measure >= level)[0]
            if field.strain[rows].sum() < LEAST_SHARE:
                break
            for bridge in BRIDGES:
                piece = field.pieces(rows) if bridge == 0 else _bridged(field.middle[rows], bridge * field.size)
                strain = np.bincount(piece, field.strain[rows])
                volume = np.bincount(piece, field.volume[rows])
                for number in np.nonzero((strain >= LEAST_SHARE) & (volume <= MOST_VOLUME * whole))[0]:
                    _add(found, field, rows[piece == number])
    return [cells for cells, _ in found][::-1]


def _add(found: list[tuple[Array, Array]], field: Field, cells: Array) -> None:
    """Keep a set unless it is nearly one of those kept: in energy, and in volume too, since the energy of a tongue is
    that of its root whether the whole tongue is taken or the root alone."""
    whole, room = field.strain[cells].sum(), field.volume[cells].sum()
    for other, inside in found:
        common = cells[inside[cells]]
        alike = field.strain[common].sum() > _ALIKE * max(whole, field.strain[other].sum())
        if alike and field.volume[common].sum() > _ROOM * max(room, field.volume[other].sum()):
            return
    inside = np.zeros(len(field.strain), bool)
    inside[cells] = True
    found.append((cells, inside))


def _bridged(points: Array, box: float) -> Array:
    """Piece of every point when points in the same or adjoining boxes are connected."""
    places, index = _boxes(points, box)
    reach = places.max(axis=0) + 3
    flat = np.ravel_multi_index(tuple(places.T + 1), reach)
    order = np.argsort(flat)
    pairs = []
    for step in np.ndindex(3, 3, 3):
        wanted = np.ravel_multi_index(tuple((places + np.array(step)).T), reach)
        at = np.minimum(np.searchsorted(flat[order], wanted), len(flat) - 1)
        hit = np.nonzero(flat[order][at] == wanted)[0]
        pairs.append(np.stack([hit, order[at[hit]]]))
    row, column = np.concatenate(pairs, axis=1)
    graph = sp.csr_array((np.ones(len(row), np.int8), (row, column)), shape=(len(places), len(places)))
    return connected_components(graph, directed=False)[1][index]


def _boxes(points: Array, box: float) -> tuple[Array, Array]:
    """Distinct boxes (k, 3) of whole numbers and the box of every point."""
    place = np.floor((points - points.min(axis=0)) / box).astype(np.int64)
    shape = tuple(place.max(axis=0) + 1)
    flat, index = np.unique(np.ravel_multi_index(tuple(place.T), shape), return_inverse=True)
    return np.stack(np.unravel_index(flat, shape), axis=1), index


def _local(field: Field) -> Array:
    """(n_cells,) density relative to the mean of the neighbourhood, boxes of ``_NEAR`` of the size and those next to
    them."""
    box = _NEAR * field.size
    place = np.floor((field.middle - field.middle.min(axis=0)) / box).astype(np.int64)
    shape = tuple(place.max(axis=0) + 1)
    flat = np.ravel_multi_index(tuple(place.T), shape)
    sums = [np.bincount(flat, v, minlength=int(np.prod(shape))).reshape(shape) for v in (field.strain, field.volume)]
    near = [ndimage.uniform_filter(s, 3, mode="constant").ravel()[flat] for s in sums]
    mean = np.divide(near[0], near[1], out=np.full(len(flat), np.inf), where=near[1] > 0)
    own = np.divide(field.strain, field.volume, out=np.zeros(len(flat)), where=field.volume > 0)
    return np.divide(own, mean, out=np.zeros(len(flat)), where=mean > 0)
