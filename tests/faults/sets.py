"""Hammer tests of real articles with noise and with 0 to 3 faults that are known."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
import scipy.sparse as sp
from scipy.spatial import cKDTree

from tests.faults.articles import ARTICLES, TESTED, design, modelled, real
from viewer.model.arrays import Array
from viewer.model.testset import Correction, Placement, TestSet

POINTS = {"boom": 22, "fork": 18}
NOISE = 0.02  # standard deviation, of the largest reading of the mode: alike in all channels
KINDS = ("flip", "swap", "exchange", "elsewhere", "dead channel", "dead point")
SEEN = (
    6.0  # a fault is detectable when it changes a reading of its point by so many times the noise (rms of the modes)
)
HERE = Placement(np.eye(3), np.zeros(3))


@dataclass(frozen=True, eq=False)
class Fault:
    """What is wrong, as the correction that would put it right; ``change`` in noise levels."""

    kind: str
    correction: Correction
    change: float
    mute: bool = False  # what was measured elsewhere is noise: the same as a dead point

    @property
    def detectable(self) -> bool:
        return self.change >= SEEN


@dataclass(frozen=True, eq=False)
class Case:
    """A test with faults; ``right`` the same readings without faults, ``true`` without noise too (m, c)."""

    part: str
    seed: int
    article: int
    test: TestSet
    right: TestSet
    true: Array
    sensing: sp.csr_array
    faults: tuple[Fault, ...]


@cache
def free_nodes(part: str) -> Array:
    """Nodes of the skin at least a tenth of the part's size away from its support: nobody measures on a clamp."""
    mesh = design(part).mesh
    rows = mesh.skin.nodes
    away, _ = cKDTree(mesh.points[mesh.node_groups["root"]]).query(mesh.points[rows])
    return rows[away > 0.1 * mesh.diagonal]


@cache
def nodes_of(part: str, count: int | None = None) -> Array:
    """``count`` nodes that carry a sensor (None: as in the study): spread over the skin, each as far from the ones
    before as can be, the first at the node farthest from the support."""
    count = POINTS[part] if count is None else count
    mesh, free = design(part).mesh, free_nodes(part)
    points, root = mesh.points[free], mesh.points[mesh.node_groups["root"]]
    chosen = [int(np.argmax(np.linalg.norm(points - root.mean(axis=0), axis=1)))]
    distance = np.linalg.norm(points - points[chosen[0]], axis=1)
    while len(chosen) < count:
        chosen.append(int(distance.argmax()))
        distance = np.minimum(distance, np.linalg.norm(points - points[chosen[-1]], axis=1))
    return free[chosen]


def sensing_at(part: str, nodes: Array) -> sp.csr_array:
    """Nodal translations to the motion of ``nodes`` along X, Y and Z each."""
    columns, size = (3 * nodes[:, None] + np.arange(3)).ravel(), 3 * design(part).mesh.n_nodes
    return sp.csr_array((np.ones(len(columns)), (np.arange(len(columns)), columns)), shape=(len(columns), size))


def triaxial(part: str, nodes: Array, shapes: Array, freq_hz: Array) -> TestSet:
    """A test with three channels on every node, shapes (m, 3·nodes)."""
    return TestSet(
        name=part,
        labels=tuple(str(i + 1) for i in range(len(nodes))),
        points=design(part).mesh.points[nodes],
        lines=np.empty((0, 2), int),
        sensor=np.repeat(np.arange(len(nodes)), 3),
        directions=np.tile(np.eye(3), (len(nodes), 1)),
        freq_hz=freq_hz,
        shapes=shapes,
    )


@cache
def sparse_channels(part: str) -> Array:
    """Rows of the channels of a test with one direction at most points: the one in which the model's modes move most;
    all three at every fifth point."""
    rows = np.stack([modelled(part).shape(i)[nodes_of(part)].ravel() for i in range(TESTED[part])])
    size = ((rows / np.abs(rows).max(axis=1, keepdims=True)) ** 2).sum(axis=0).reshape(-1, 3)
    kept = size == size.max(axis=1, keepdims=True)
    kept[::5] = True
    return np.flatnonzero(kept.ravel())


def case(part: str, seed: int, count: int | None = None, article: int | None = None, sparse: bool = False) -> Case:
    """``count`` faults at as many different points; None: seed modulo 4. The article goes by the seed too.

    sparse  most points have one channel; where a kind needs channels that are not there, it is a sign instead
    """
    rng = np.random.default_rng([seed, *part.encode()])
    kept = sparse_channels(part) if sparse else np.arange(3 * POINTS[part])
    article = (seed // 4) % ARTICLES if article is None else article
    mesh, modes, nodes = design(part).mesh, real(part, article), nodes_of(part)
    p, m = len(nodes), TESTED[part]
    moved = np.stack([modes.shape(i) for i in range(m)])
    true = moved[:, nodes].reshape(m, 3 * p)
    size = np.abs(true).max(axis=1)
    true = true / size[:, None]
    noise = NOISE * rng.standard_normal(true.shape)
    sensing = sensing_at(part, nodes)
    right = triaxial(part, nodes, true + noise, modes.freq_hz).with_(name=f"{part} {seed}")
    wrong, faults = true.copy(), []
    free = list(range(p))
    for _ in range(seed % 4 if count is None else count):
        at = free.pop(int(rng.integers(len(free))))
        other = free.pop(int(rng.integers(len(free))))
        kind = str(rng.choice(KINDS))
        rows, theirs = 3 * at + np.arange(3), 3 * other + np.arange(3)
        label, axis = str(at + 1), int(rng.integers(3))
        before = wrong.copy()
        if sparse:
            own, others = kept[np.isin(kept, rows)], kept[np.isin(kept, theirs)]
            axis = int(rng.choice(own)) % 3
            if (kind == "swap" and len(own) < 3) or (kind == "exchange" and not np.array_equal(own % 3, others % 3)):
                kind = "flip"
        if kind == "flip":
            wrong[:, rows[axis]] *= -1
            fix = Correction("flip", label, "xyz"[axis])
        elif kind == "swap":
            one, two = sorted(rng.permutation(3)[:2])
            wrong[:, [rows[one], rows[two]]] = wrong[:, [rows[two], rows[one]]]
            fix = Correction("swap axes", label, "xyz"[one], "xyz"[two])
        elif kind == "exchange":
            wrong[:, rows], wrong[:, theirs] = before[:, theirs], before[:, rows]
            fix = Correction("move", label, other=str(other + 1))
        elif kind == "elsewhere":
            node = int(rng.choice(free_nodes(part)))
            wrong[:, rows] = moved[:, node] / size[:, None]
            fix = Correction("move", label, position=tuple(mesh.points[node]))
        elif kind == "dead channel":
            wrong[:, rows[axis]] = 0.0
            fix = Correction("leave out", label, "xyz"[axis])
        else:
            wrong[:, rows] = 0.0
            fix = Correction("leave out", label)
        if kind != "exchange":
            free.append(other)
        change = float(np.sqrt(((wrong - before)[:, kept] ** 2).mean(axis=0)).max() / NOISE)
        left = np.sqrt((wrong[:, kept[np.isin(kept, rows)]] ** 2).mean(axis=0)).max() / NOISE
        faults.append(Fault(kind, fix, change, kind == "elsewhere" and bool(left < SEEN / 2)))
    # noise belongs to the recording: it stays where it is whatever was wrong
    test = right.with_(shapes=wrong + noise)
    return Case(part, seed, article, test.only(kept), right.only(kept), true[:, kept], sensing[kept], tuple(faults))
