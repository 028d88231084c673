"""Pieces of one line: bands that lie end to end, fold by one angle and join the same two sides.

A panel on two straps, a row of necks with long slits between, or a groove whose energy fades in the middle shows as
several dense places, each too short to be a line or measured apart from the others. What makes them one hinge is the
motion: both sides turn as wholes about one axis, so that the pieces lie on one line, and fold alike.
"""

from __future__ import annotations

import numpy as np
import scipy.sparse as sp
from scipy.sparse.csgraph import connected_components

from viewer.insight.hinges.band import Draft
from viewer.insight.hinges.field import Field
from viewer.model.arrays import Array

_ASKEW = np.cos(np.radians(15))  # between the folds, and between either fold and the way from piece to piece
_UNLIKE = 2.5  # ratio of the folds; widths may differ more, since short pieces are measured worse
_WIDER = 4.0
_ENERGY = 0.02  # of the whole in a piece
_MOST = 12  # pieces looked at, those of the most energy


def unions(field: Field, drafts: list[Draft]) -> list[Array]:
    """Cell rows of every set of two or more of the ``drafts`` that may be one line."""
    pieces: list[Draft] = []
    for draft in sorted((d for d in drafts if d.strain >= _ENERGY), key=lambda d: -d.strain * min(d.jump, 5.0)):
        if all(_overlap(field, draft, other) < 0.5 for other in pieces) and len(pieces) < _MOST:
            pieces.append(draft)
    pairs = [
        (i, j)
        for i in range(len(pieces))
        for j in range(i + 1, len(pieces))
        if _in_line(field, pieces[i], pieces[j]) and _same_sides(field, pieces[i], pieces[j])
    ]
    if not pairs:
        return []
    row, column = np.array(pairs).T
    graph = sp.csr_array((np.ones(len(row), np.int8), (row, column)), shape=(len(pieces), len(pieces)))
    number = connected_components(graph, directed=False)[1]
    groups = [np.nonzero(number == n)[0] for n in np.unique(number[row])]
    return [np.unique(np.concatenate([pieces[i].cells for i in group])) for group in groups]


def _overlap(field: Field, one: Draft, other: Draft) -> float:
    common = field.strain[np.intersect1d(one.cells, other.cells, assume_unique=True)].sum()
    return float(common / min(one.strain, other.strain))


def _in_line(field: Field, one: Draft, other: Draft) -> bool:
    folds = [d.fold if d.across @ one.across > 0 else -d.fold for d in (one, other)]
    sizes = [np.linalg.norm(fold) for fold in folds]
    widths = one.width, other.width
    way = other.position - one.position
    apart = np.linalg.norm(way)
    if min(sizes) <= 0 or max(sizes) > _UNLIKE * min(sizes) or max(widths) > _WIDER * min(widths) or apart <= 0:
        return False
    if folds[0] @ folds[1] < _ASKEW * sizes[0] * sizes[1]:
        return False
    axis = folds[0] / sizes[0] + folds[1] / sizes[1]
    along = abs(way @ axis) / np.linalg.norm(axis)
    off = np.sqrt(max(apart**2 - along**2, 0.0))
    return bool(off <= max(widths) and along > 0.25 * (one.length + other.length) and along > _ASKEW * apart)


def _same_sides(field: Field, one: Draft, other: Draft) -> bool:
    """Whether each side of one hangs together with the same side of the other when both bands are taken out."""
    swap = one.across @ other.across < 0
    free = field.volume > 0
    free[one.cells] = free[other.cells] = False
    rows = np.nonzero(free)[0]
    number = np.full(len(free), -1)
    number[rows] = field.pieces(rows)
    for i in (0, 1):
        first, second = one.sides[i].cells, other.sides[1 - i if swap else i].cells
        if len(first) and len(second) and not np.intersect1d(number[first], number[second]).size:
            return False
    return True
