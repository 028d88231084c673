"""Where a cloud of points lies on a body: searched from every side, refined by closest places.

From each of many starting positions the points are let down onto the surface by Gauss–Newton steps on their distance
(Chen & Medioni, Image and Vision Computing 10 (1992) 145), all starts at once; the better ones go on. Distances
beyond ``FAR`` count as ``FAR``, so that a point that is not on the body does not pull the others away.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy.spatial.transform import Rotation

from viewer.insight.near_surface import NearSurface
from viewer.jobs import SILENT, Progress
from viewer.model.arrays import Array
from viewer.model.testset import Placement

SURE = (
    0.005  # of the mesh's diagonal: how well the positions of sensors are commonly known (common practice, no source)
)
FAR = 6 * SURE  # farther from the body a point is not on it
SAME_GAP, SAME_TURN = 0.05, 20.0  # of the diagonal, degrees: two placements closer than both are the same
STARTS = 400  # turns: neighbours are about 25° apart
_SLACK = 0.15  # of the diagonal: room around the points, from which on shifted starts are tried
# Steps with the coarse surface, the distance beyond which points weigh little, and how many poses go on.
_ROUNDS = ((4, 0.3, 120), (6, 0.1, 40), (6, 0.03, 16))
_GROUP = 24  # placements of a symmetric body that are told apart at most
_SHAKEN = 6  # of the best placements, so many are looked around for a better one


@dataclass(frozen=True, eq=False)
class Fit:
    """Points (p, 3) m to lie on ``surface``; ``size`` m of the body. Points ``paired`` (k,) rows belong at ``places``
    (k, 3)."""

    surface: NearSurface
    points: Array
    size: float
    paired: Array
    places: Array

    def placed(self, turns: Array, shifts: Array) -> Array:
        """(n, p, 3) the points in each of n poses: ``turns`` (n, 3, 3), ``shifts`` (n, 3)."""
        return np.einsum("nij,pj->npi", turns, self.points) + shifts[:, None]

    def away(self, placed: Array, fine: bool = True) -> tuple[Array, Array]:
        """Distances (n, p) of the points from the surface, or from their partner, and directions (n, p, 3)."""
        distance, direction, _ = self.surface.closest(placed.reshape(-1, 3), fine=fine)
        return distance.reshape(placed.shape[:2]), direction.reshape(placed.shape)

    def cost(self, turns: Array, shifts: Array, fine: bool = True, most: float = FAR) -> Array:
        """(n,) root mean square distance, each no more than ``most`` of the body's size, m."""
        return self._size(self.away(self.placed(turns, shifts), fine)[0], most)

    def step(self, turns: Array, shifts: Array, fine: bool, reach: float) -> tuple[Array, Array, Array]:
        """The poses after one Gauss–Newton step of each, and their costs before it; distances well beyond ``reach``,
        m, weigh little."""
        placed = self.placed(turns, shifts)
        distance, direction = self.away(placed, fine)
        normal, gradient, middle, arm = self._system(placed, distance, direction, reach)
        normal += 1e-6 * np.trace(normal, axis1=1, axis2=2)[:, None, None] * np.eye(6)
        move = -np.linalg.solve(normal, gradient[..., None])[..., 0]
        angle = move[:, :3] / arm[:, None]
        angle /= np.maximum(np.linalg.norm(angle, axis=1, keepdims=True) / 0.5, 1.0)
        return *moved(turns, shifts, middle, angle, move[:, 3:]), self._size(distance, FAR)

    def weakest(self, turn: Array, shift: Array) -> tuple[Array, Array, float]:
        """Small motions (6, 6) of a pose, rows of turns about the middle of the points (times their mean radius) and
        shifts, those that change the distances least first; that middle (3,) and how far a turn of one moves the
        points, m."""
        placed = self.placed(turn[None], shift[None])
        normal, _, middle, arm = self._system(placed, *self.away(placed), FAR * self.size)
        return np.linalg.eigh(normal[0])[1].T, middle[0], float(arm[0])

    def refined(self, turns: Array, shifts: Array, steps: int = 16) -> tuple[Array, Array, Array]:
        """Poses at the fine surface, and their costs; the best of each one's way is kept, unless points are paired:
        then the pairs count too, and the last one is."""
        best, least = (turns, shifts), np.full(len(turns), np.inf)
        for _ in range(steps):
            *after, cost = self.step(turns, shifts, True, 0.3 * FAR * self.size)
            better = cost < least
            settled = not (cost < least - 1e-4 * FAR * self.size).any()
            best = (np.where(better[:, None, None], turns, best[0]), np.where(better[:, None], shifts, best[1]))
            least = np.minimum(least, cost)
            if settled and not len(self.paired):
                break
            turns, shifts = after
        if len(self.paired):
            return turns, shifts, self.cost(turns, shifts)
        return *best, least

    def _size(self, distance: Array, most: float) -> Array:
        return np.sqrt(np.mean(np.minimum(distance, most * self.size) ** 2, axis=1))

    def _system(
        self, placed: Array, distance: Array, direction: Array, reach: float
    ) -> tuple[Array, Array, Array, Array]:
        """Normal matrices (n, 6, 6) and gradients (n, 6) for turns about the points' middle (times their mean radius)
        and shifts; the middles (n, 3) and radii (n,)."""
        middle = placed.mean(axis=1)
        lever = placed - middle[:, None]
        arm = np.sqrt(np.mean(np.sum(lever**2, axis=2), axis=1))
        weight = 1 / (1 + (distance / reach) ** 2)
        weight[:, self.paired] = 0.0
        slope = np.concatenate([np.cross(lever, direction) / arm[:, None, None], direction], axis=2)
        normal = np.einsum("npi,npj->nij", slope * weight[..., None], slope)
        gradient = np.einsum("npi,np->ni", slope, weight * distance)
        for axis in range(3 if len(self.paired) else 0):
            miss = placed[:, self.paired, axis] - self.places[:, axis]
            unit = np.broadcast_to(np.eye(3)[axis], (*miss.shape, 3))
            slope = np.concatenate([np.cross(lever[:, self.paired], unit) / arm[:, None, None], unit], axis=2)
            normal += np.einsum("npi,npj->nij", slope, slope)
            gradient += np.einsum("npi,np->ni", slope, miss)
        return normal, gradient, middle, arm


def moved(turns: Array, shifts: Array, middle: Array, angle: Array, shift: Array) -> tuple[Array, Array]:
    """Poses turned by the rotation vectors ``angle`` (n, 3) about ``middle`` (n, 3) and moved by ``shift`` (n, 3)."""
    turn = Rotation.from_rotvec(angle).as_matrix()
    return turn @ turns, np.einsum("nij,nj->ni", turn, shifts - middle) + middle + shift


def search(fit: Fit, progress: Progress = SILENT) -> tuple[Array, Array, Array]:
    """Turns (n, 3, 3), shifts (n, 3) and costs (n,) of the distinct placements found, best first."""
    turns, shifts = _starts(fit)
    for steps, reach, kept in _ROUNDS:
        for _ in range(steps):
            progress.tick("placing the test's points")
            turns, shifts, _before = fit.step(turns, shifts, False, reach * fit.size)
        turns, shifts, _cost = distinct(fit, turns, shifts, fit.cost(turns, shifts, False), kept)
    found = distinct(fit, *fit.refined(turns, shifts), len(turns))
    good = found[2][:_SHAKEN] <= 2 * found[2][0] + SURE * fit.size
    near = _shaken(fit, found[0][:_SHAKEN][good], found[1][:_SHAKEN][good])
    both = [np.concatenate(part) for part in zip(found, fit.refined(*near), strict=True)]
    return distinct(fit, both[0], both[1], both[2], len(turns))


def with_symmetries(
    fit: Fit, turns: Array, shifts: Array, cost: Array, as_good: Callable[[Array], Array]
) -> tuple[Array, Array, Array]:
    """The poses with those added that a symmetry of the body turns the best ones into: what one of them does to the
    first, and quarter and half turns about the body's axes, are tried on all until nothing new fits ``as_good``."""
    places, _ = fit.surface.strewn(2_000)
    middle = (places.max(axis=0) + places.min(axis=0)) / 2
    axes = np.linalg.svd(places - places.mean(axis=0), full_matrices=False)[2]
    axes[2] *= np.linalg.det(axes)
    group = Rotation.create_group("O").as_matrix()
    turned = [frame.T @ turn @ frame for frame in (axes, np.eye(3)) for turn in group]
    moves = [(turn, middle - turn @ middle) for turn in turned]
    known = 0
    while True:
        fitting = np.flatnonzero(as_good(cost))[:_GROUP]
        if len(fitting) <= known:
            return turns, shifts, cost
        known = len(fitting)
        moves += [(turns[i] @ turns[0].T, shifts[i] - turns[i] @ turns[0].T @ shifts[0]) for i in fitting[1:]]
        tried = [(turn @ turns[i], turn @ shifts[i] + shift) for turn, shift in moves for i in fitting]
        fresh_turns, fresh_shifts = (np.array(part) for part in zip(*tried, strict=True))
        raw = fit.cost(fresh_turns, fresh_shifts)
        close = raw <= 3 * cost[0] + 2 * SURE * fit.size  # a symmetry leaves little to refine
        fresh = distinct(fit, fresh_turns[close], fresh_shifts[close], raw[close], 2 * _GROUP)
        both = [np.concatenate(part) for part in zip((turns, shifts, cost), fit.refined(*fresh[:2]), strict=True)]
        turns, shifts, cost = distinct(fit, both[0], both[1], both[2], len(both[0]))
        moves = []


def _shaken(fit: Fit, turns: Array, shifts: Array) -> tuple[Array, Array]:
    """Poses around each of the given ones: closest places leave poses in hollows beside the deepest one."""
    angle = np.radians(8.0) * np.concatenate([np.eye(3), -np.eye(3), np.zeros((6, 3))])
    move = 0.02 * fit.size * np.concatenate([np.zeros((6, 3)), np.eye(3), -np.eye(3)])
    many = len(angle)
    middle = fit.placed(turns, shifts).mean(axis=1)
    repeated = [np.repeat(part, many, axis=0) for part in (turns, shifts, middle)]
    angles, moves = np.tile(angle, (len(turns), 1)), np.tile(move, (len(turns), 1))
    return moved(repeated[0], repeated[1], repeated[2], angles, moves)


def distinct(fit: Fit, turns: Array, shifts: Array, cost: Array, most: int) -> tuple[Array, Array, Array]:
    """At most ``most`` of the poses, best first; of poses that are the same the best one alone."""
    placed = fit.placed(turns, shifts)
    kept: list[int] = []
    for i in np.argsort(cost, kind="stable"):
        gaps = np.sqrt(np.mean(np.sum((placed[kept] - placed[i]) ** 2, axis=2), axis=1))
        cosine = (np.einsum("nij,ij->n", turns[kept], turns[i]) - 1) / 2
        if not ((gaps < SAME_GAP * fit.size) & (cosine > np.cos(np.radians(SAME_TURN)))).any():
            kept.append(int(i))
        if len(kept) == most:
            break
    return turns[kept], shifts[kept], cost[kept]


def _starts(fit: Fit) -> tuple[Array, Array]:
    """Starting poses: turns all over, and those that lay the points' principal axes on the body's; the boxes' middles
    on one another, and moved aside where there is room."""
    places, _ = fit.surface.strewn(2_000)
    turns = np.concatenate([covering(STARTS), _axes_on_axes(fit.points, places)])
    turned = np.einsum("nij,pj->npi", turns, fit.points)
    low, high = turned.min(axis=1), turned.max(axis=1)
    base = (places.max(axis=0) + places.min(axis=0)) / 2 - (low + high) / 2
    room = np.ptp(places, axis=0) - (high - low)
    aside = [np.zeros((len(turns), 3)), places.mean(axis=0) - turned.mean(axis=1) - base]
    for axis in range(3):
        for sign in (-1.0, 1.0):
            move = np.zeros((len(turns), 3))
            move[:, axis] = sign * 0.35 * np.where(room[:, axis] > _SLACK * fit.size, room[:, axis], np.nan)
            aside.append(move)
    rows = np.arange(len(turns))
    costs = []
    for move in aside:
        known = np.isfinite(move).all(axis=1)
        costs.append(np.full(len(turns), np.inf))
        costs[-1][known] = fit.cost(turns[known], (base + move)[known], False, 1.0)
    return turns, base + np.array(aside)[np.argmin(costs, axis=0), rows]


def covering(count: int) -> Array:
    """(count, 3, 3) turns spread evenly over all there are: Alexa, Super-Fibonacci spirals, CVPR 2022."""
    at = np.arange(count) + 0.5
    inner, outer = np.sqrt(at / count), np.sqrt(1 - at / count)
    one, two = 2 * np.pi * at / np.sqrt(2), 2 * np.pi * at / 1.533751168755204288118041
    quaternions = np.stack(
        [inner * np.sin(one), inner * np.cos(one), outer * np.sin(two), outer * np.cos(two)], axis=1
    )
    return Rotation.from_quat(quaternions).as_matrix()


def _axes_on_axes(points: Array, places: Array) -> Array:
    """(24 + 32, 3, 3) turns that lay the principal axes of ``points`` on those of ``places`` in every way, and the
    longest on the longest with every roll about it: that is what fixes slender bodies."""
    own, other = (np.linalg.svd(p - p.mean(axis=0), full_matrices=False)[2] for p in (points, places))
    own[2] *= np.linalg.det(own)
    other[2] *= np.linalg.det(other)
    ends = Rotation.from_rotvec([[0, 0, 0], [0, np.pi, 0]])
    rolls = [(Rotation.from_rotvec([a, 0, 0]) * end).as_matrix() for a in np.arange(16) * np.pi / 8 for end in ends]
    return np.array([other.T @ turn @ own for turn in [*Rotation.create_group("O").as_matrix(), *rolls]])


def placement_of(turn: Array, shift: Array, scale: float) -> Placement:
    """The pose as a placement, its turn made exact again after many small steps."""
    left, _, right = np.linalg.svd(turn)
    return Placement(left @ right, shift, scale)
