"""Dashes and dots along edges: the undeformed ghost, and the dashed contour of a compared design.

Edges are chained into curves, and the pattern runs along each curve with a whole number of dashes, both ends
drawn. A dash remembers the edge it lies on and where, so that it moves with the body.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from viewer.model.arrays import Array


@dataclass(frozen=True, eq=False)
class Dashes:
    """Pieces of edges: ``nodes`` (m, 2), ``span`` (m, 2) start and end as shares of the edge."""

    nodes: Array
    span: Array

    def segments(self, points: Array) -> Array:
        """(m, 2, 3) end points at ``points`` (s, 3)."""
        a, b = points[self.nodes[:, 0]], points[self.nodes[:, 1]]
        span = self.span.astype(points.dtype)
        return a[:, None, :] + span[:, :, None] * (b - a)[:, None, :]


def chains(pairs: Array) -> list[list[int]]:
    """Curves of nodes through the edges ``pairs`` (k, 2), each edge once; they end where other than two edges meet.

    Open curves start from the lowest end node and closed ones from their lowest node: the same edges give the
    same curves.
    """
    beside: dict[int, list[tuple[int, int]]] = {}
    for edge, (a, b) in enumerate(pairs.tolist()):
        beside.setdefault(a, []).append((b, edge))
        beside.setdefault(b, []).append((a, edge))
    used = [False] * len(pairs)
    found: list[list[int]] = []

    def walk(start: int, step: tuple[int, int]) -> None:
        node, edge = step
        curve = [start, node]
        used[edge] = True
        while len(beside[node]) == 2 and node != start:
            follow = next((s for s in beside[node] if not used[s[1]]), None)
            if follow is None:
                break
            node, edge = follow
            used[edge] = True
            curve.append(node)
        found.append(curve)

    nodes = sorted(beside)
    for ends in (True, False):
        for node in nodes:
            if (len(beside[node]) != 2) == ends:
                for step in beside[node]:
                    if not used[step[1]]:
                        walk(node, step)
    return found


def once(points: Array, pairs: Array, near: float) -> Array:
    """The edges ``pairs`` (k, 2) with each place of an edge kept once: where the rim of a cut face and the clipped
    skin lie on one another, two patterns of dashes would close each other's gaps. ``near`` m is the same place."""
    nodes, where = np.unique(pairs, return_inverse=True)
    if len(nodes) == 0:
        return pairs
    places = np.round((points[nodes] - points[nodes].min(axis=0)) / near).astype(np.int64)
    _, first, group = np.unique(places, axis=0, return_index=True, return_inverse=True)
    merged = np.sort(nodes[first][group.reshape(-1)][where.reshape(pairs.shape)], axis=1)
    merged = np.unique(merged[merged[:, 0] != merged[:, 1]], axis=0)
    beside: dict[int, set[int]] = {}
    for one, other in merged.tolist():
        beside.setdefault(one, set()).add(other)
        beside.setdefault(other, set()).add(one)

    def doubled(one: int, other: int) -> bool:
        """Whether two shorter edges cover this one: it passes a node that is joined to both its ends."""
        whole = np.linalg.norm(points[other] - points[one])
        return any(
            np.linalg.norm(points[m] - points[one]) + np.linalg.norm(points[other] - points[m]) - whole < near
            for m in beside[one] & beside[other]
        )

    return merged[[not doubled(one, other) for one, other in merged.tolist()]]


def cut(points: Array, pairs: Array, dash: float, gap: float) -> Dashes:
    """Dashes of about ``dash`` m with gaps of ``gap`` m along the edges ``pairs`` (k, 2) at ``points``."""
    if len(pairs) == 0:
        return Dashes(np.empty((0, 2), np.int64), np.empty((0, 2)))
    nodes, start, scale = [], [], []
    for curve in chains(pairs):
        track = np.asarray(curve)
        lengths = np.linalg.norm(np.diff(points[track], axis=0), axis=1)
        total = float(lengths.sum())
        whole = max(round((total + gap) / (dash + gap)), 1)
        nodes.append(np.stack([track[:-1], track[1:]], axis=1))
        start.append(np.concatenate([[0.0], np.cumsum(lengths)[:-1]]))
        scale.append(np.full(len(lengths), total / (whole * dash + (whole - 1) * gap)))
    edges, begin, stretch = np.concatenate(nodes), np.concatenate(start), np.concatenate(scale)
    length = np.linalg.norm(points[edges[:, 1]] - points[edges[:, 0]], axis=1)
    edges, begin, stretch, length = (v[length > 0] for v in (edges, begin, stretch, length))
    period, on = stretch * (dash + gap), stretch * dash
    first = np.floor(begin / period).astype(np.int64)
    number = np.floor((begin + length) / period).astype(np.int64) - first + 1
    edge = np.repeat(np.arange(len(edges)), number)
    turn = np.arange(len(edge)) - np.repeat(np.cumsum(number) - number, number) + first[edge]
    low = np.maximum(turn * period[edge], begin[edge])
    high = np.minimum(turn * period[edge] + on[edge], begin[edge] + length[edge])
    keep = high - low > 1e-9 * period[edge]
    edge, low, high = edge[keep], low[keep], high[keep]
    span = (np.stack([low, high], axis=1) - begin[edge, None]) / length[edge, None]
    return Dashes(edges[edge], span)
