"""How much energy a residual r holds in large models: rᵀA⁻¹r with A = K + αM, from below and without factorising A.

Conjugate gradients (Hestenes M.R., Stiefel E., J. Res. NBS 49 (1952) 409) raise 2xᵀr − xᵀAx with every step, to
rᵀA⁻¹r in the end; by how much is known at each step, and from how fast the gains fall what is still to come is
estimated (after Strakoš Z., Tichý P., ETNA 13 (2002) 56). The search ends when that matters no more.

The preconditioner adds two corrections: every triple by its own 3 × 3 block, and rigid motions of some thousand
zones of neighbouring nodes, whose matrix is factorised. The zones carry what reaches across the whole body, which
blocks alone would pass on by one cell a step (rigid motions as coarse space: Bulgakov V.E., Kuhn G., Int. J. Numer.
Meth. Engng 38 (1995) 3529).
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp

from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import Layout
from viewer.mechanics.factor import factorise
from viewer.mechanics.lean import LeanMatrices
from viewer.mechanics.patch import cross_matrix
from viewer.model.arrays import Array

STEPS = 400  # at most
_WINDOW = 8  # fewest steps whose gains are compared with those of as many before
_ENOUGH = 0.02  # of the energy found that may still be missing
_ZONES, _LEAST = 2000, 30  # most zones, and fewest nodes in one (connected parts of them may be smaller)
_SEEN = 1e-8  # of the strongest rigid motion of a zone, squared: what a zone hardly shows is left out

Columns = Callable[[Array], Array]


@dataclass(frozen=True, eq=False)
class Found:
    """x (n_free, k), the energies 2xᵀr − xᵀAx (k,) of the columns, and an estimate (k,) of what they lack."""

    columns: Array
    energy: Array
    missing: Array


def search(push: Columns, correct: Columns, right: Array, enough: Array, progress: Progress = SILENT) -> Found:
    """A⁻¹ of the columns ``right`` (n, k) from products ``push`` by A and corrections ``correct`` towards A⁻¹, until
    what is missing of the energy of each is below ``enough`` (k,) or 2 % of what is found, or for ``STEPS`` steps:
    ``missing`` tells."""
    found, rest = np.zeros_like(right), right.copy()
    gains: list[Array] = []
    turned = correct(rest)
    way, size = turned.copy(), np.sum(rest * turned, axis=0)
    missing = np.full(right.shape[1], np.inf)
    for step in range(STEPS):
        progress.tick("residual", step, STEPS)
        pushed = push(way)
        work = np.sum(way * pushed, axis=0)
        length = np.divide(size, work, out=np.zeros_like(size), where=work > 0)
        found += way * length
        rest -= pushed * length
        del pushed
        gains.append(length * size)
        missing = _still_to_come(gains)
        if (missing <= np.maximum(enough, _ENOUGH * np.sum(gains, axis=0))).all():
            break
        turned = correct(rest)
        last, size = size, np.sum(rest * turned, axis=0)
        way *= np.divide(size, last, out=np.zeros_like(size), where=last > 0)
        way += turned
    return Found(found, np.sum(gains, axis=0), missing)


class Zones:
    """The preconditioner of one layout: blocks of triples and rigid motions of zones, for any α."""

    def __init__(self, layout: Layout, matrices: LeanMatrices, progress: Progress = SILENT) -> None:
        self._layout = layout
        progress.tick("zones")
        triple_node = np.empty(layout.n_dof // 3, np.int64)
        for numbers in layout.dof[:, ::3].T:
            triple_node[numbers[numbers >= 0] // 3] = np.nonzero(numbers >= 0)[0]
        zone = matrices.parts(_boxes(layout.points, triple_node)[triple_node])
        self._motions, self._mixed = _rigid_motions(layout, zone, triple_node)
        self._stiffness, self._mass = (
            self._mixed.T @ matrix @ self._mixed for matrix in matrices.onto(_lifted(layout, self._motions))
        )

    def correction(self, matrices: LeanMatrices, alpha: float, progress: Progress = SILENT) -> Columns:
        """What brings columns (n_free, k) near A⁻¹ of them."""
        progress.tick("factorising zones")
        coarse = sp.csr_array(self._stiffness + alpha * self._mass)
        coarse.sort_indices()
        factor = factorise(coarse, definite=True)
        local, place = _local_inverses(self._layout, matrices, alpha)
        motions, mixed = self._motions, self._mixed

        def correct(rest: Array) -> Array:
            padded = np.zeros((3 * len(local), rest.shape[1]), np.float32)
            padded[place] = rest
            out = np.matmul(local, padded.reshape(len(local), 3, -1)).reshape(padded.shape)[place].astype(float)
            out += motions @ (mixed @ factor.solve(mixed.T @ (motions.T @ rest)).reshape(coarse.shape[0], -1))
            return out

        return correct


def _still_to_come(gains: list[Array]) -> Array:
    """(k,) what further steps will add, were the gains to fall on as they fell over the last two quarters."""
    window = max(_WINDOW, len(gains) // 4)
    if len(gains) < 2 * window:
        return np.where(gains[-1] > 0, np.inf, 0.0)
    late, early = np.sum(gains[-window:], axis=0), np.sum(gains[-2 * window : -window], axis=0)
    ratio = np.divide(late, early, out=np.zeros_like(late), where=early > 0)
    return np.where(ratio < 1, late / np.maximum(1 - ratio, 1e-12), np.inf) * (late > 0)


def _local_inverses(layout: Layout, matrices: LeanMatrices, alpha: float) -> tuple[Array, Array]:
    """Inverses (t, 3, 3), in single precision, of the diagonal blocks of K + αM of the triples with a free direction,
    unit blocks where held or following, and the place of every free direction among them. What follows a triple is
    left out of its block."""
    triples, which = np.unique(layout.free // 3, return_inverse=True)
    place = 3 * which + layout.free % 3
    free = np.zeros((len(triples), 3), bool)
    free[which, layout.free % 3] = True
    blocks, heavy = matrices.blocks()
    blocks += alpha * heavy
    blocks = blocks[triples] * (free[:, :, None] & free[:, None, :])
    least = blocks[:, range(3), range(3)].max(initial=0.0) or 1.0
    idle = free & (blocks[:, range(3), range(3)] <= 0)  # moved by followers only
    blocks[:, range(3), range(3)] += least * (idle | ~free)
    return np.linalg.inv(blocks).astype(np.float32), place


def _boxes(points: Array, used: Array) -> Array:
    """(n_nodes,) labels of sets of neighbouring nodes: halved across their longest extent until small enough."""
    nodes = np.unique(used)
    most = max(_LEAST, -(-len(nodes) // _ZONES))
    label = np.zeros(len(points), np.int32)
    waiting, count = [nodes], 0
    while waiting:
        rows = waiting.pop()
        if len(rows) <= most:
            label[rows] = count
            count += 1
            continue
        own = points[rows]
        axis = int(np.argmax(np.ptp(own, axis=0)))
        order = np.argpartition(own[:, axis], len(rows) // 2)
        waiting += [rows[order[: len(rows) // 2]], rows[order[len(rows) // 2 :]]]
    return label


def _rigid_motions(layout: Layout, zone: Array, triple_node: Array) -> tuple[sp.csr_array, sp.csr_array]:
    """(n_free, 6 · zones) the rigid motions of every zone (triples,) about its centre on its free directions, and
    (6 · zones, c) what makes them orthonormal, as far as the zone shows them."""
    zones, free = int(zone.max()) + 1, layout.free
    where = zone[free // 3]
    points = layout.points[triple_node]
    count = np.bincount(zone, minlength=zones)
    centre = np.stack([np.bincount(zone, points[:, i], zones) for i in range(3)], axis=1) / count[:, None]
    arms = points - centre[zone]
    radius = np.sqrt(np.bincount(zone, (arms**2).sum(axis=1), zones) / count)
    radius = np.maximum(radius, 1e-12 * max(float(np.abs(points).max(initial=0.0)), 1e-300))
    turning = np.zeros(layout.n_dof // 3, bool)
    turning[layout.dof[:, 3][layout.dof[:, 3] >= 0] // 3] = True
    spins = np.where(turning[:, None, None], np.eye(3), -cross_matrix(arms)) / radius[zone][:, None, None]
    rows = np.concatenate([np.zeros((len(free), 3)), spins.reshape(-1, 3)[free]], axis=1)  # (n_free, 6)
    rows[np.arange(len(free)), free % 3] = ~turning[free // 3]
    gram = np.empty((zones, 6, 6))
    for i in range(6):
        for j in range(6):
            gram[:, i, j] = np.bincount(where, rows[:, i] * rows[:, j], zones)
    strength, axes = np.linalg.eigh(gram)
    shown = strength > _SEEN * np.maximum(strength[:, -1:], 1e-300)
    axes = np.where(shown[:, None, :], axes / np.sqrt(np.where(shown, strength, 1.0))[:, None, :], 0.0)
    del spins, arms
    column = (6 * where[:, None] + np.arange(6)).astype(np.int32)
    filled = rows != 0
    ends = np.append(0, np.cumsum(filled.sum(axis=1))).astype(np.int32)
    plain = sp.csr_array((rows[filled], column[filled], ends), shape=(len(free), 6 * zones))
    mixed = sp.bsr_array((axes, np.arange(zones), np.arange(zones + 1))).tocsr()[:, np.nonzero(shown.ravel())[0]]
    return plain, sp.csr_array(mixed)


def _lifted(layout: Layout, basis: sp.csr_array) -> sp.csr_array:
    """The sparse basis (n_free, c) on all directions."""
    if layout.follow is not None:
        return sp.csr_array(layout.follow[:, layout.free] @ basis)
    lengths = np.zeros(layout.n_dof + 1, np.int32)
    lengths[layout.free + 1] = np.diff(basis.indptr)
    return sp.csr_array(
        (basis.data, basis.indices, np.cumsum(lengths, dtype=np.int32)), shape=(layout.n_dof, basis.shape[1])
    )
