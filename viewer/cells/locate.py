"""The place of a mesh nearest to given points: which cell, its reference coordinates, how far.

First every solid cell near a point is asked whether it holds it; the points that none holds are nearest to an outer
face of a solid, or to a surface or line cell. Cells near a point come from a tree of cell centres; a cell is dropped
when the sphere around it lies farther than the best place found. Within a cell |x(ξ) − p|² is minimised by damped
Newton steps; where the minimum of a surface falls outside the cell, its edges are searched in the same way.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cache
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.spatial import cKDTree

from viewer.cells.kinds import KINDS
from viewer.cells.skin import outer_faces

Array = NDArray[Any]
_INSIDE = 1e-9  # in reference coordinates
_STEPS = 40
_PAIRS = 50_000  # point–cell pairs at a time
_BULGE = 1.25  # a curved cell stays within this many times the reach of its nodes from its centre


@dataclass(frozen=True, eq=False)
class Places:
    """The nearest place for each of q points.

    cell      (q,) cell row, counted through the blocks in order; −1 where there is none within reach
    xi        (q, 3) reference coordinates there; columns beyond the kind's dimension are 0
    distance  (q,) m; 0 inside a solid, infinite where there is none within reach
    position  (q, 3) m
    """

    cell: Array
    xi: Array
    distance: Array
    position: Array


def nearest(blocks: Sequence[tuple[str, Array]], points: Array, queries: Array, reach: float = np.inf) -> Places:
    """The nearest place of the cells in ``blocks`` (kind, nodes (n, nodes per cell)) of ``points`` (p, 3), m, to each
    of the ``queries`` (q, 3), m; places beyond ``reach``, m, need not be found. ``ValueError`` when there is no
    cell."""
    points, queries = np.asarray(points, float), np.asarray(queries, float).reshape(-1, 3)
    starts = np.cumsum([0, *(len(nodes) for _, nodes in blocks)])
    if starts[-1] == 0:
        raise ValueError("no cell to search")
    best = Places(
        np.full(len(queries), -1),
        np.zeros((len(queries), 3)),
        np.full(len(queries), np.inf),
        np.zeros((len(queries), 3)),
    )
    rows = [
        (kind, np.asarray(nodes), np.arange(start, start + len(nodes)))
        for (kind, nodes), start in zip(blocks, starts[:-1], strict=True)
        if len(nodes)
    ]
    solids = [part for part in rows if KINDS[part[0]].dim == 3]
    if solids:
        _sweep(solids, points, queries, best, within=True)
    outside = np.isinf(best.distance)
    if outside.any():
        thin = [part for part in rows if KINDS[part[0]].dim < 2]
        # surface cells come out with the faces of solids
        _sweep([*outer_faces(blocks), *thin], points, queries, best, reach)
    _into_solids(solids, points, best, outside)
    return best


def _sweep(
    parts: list[tuple[str, Array, Array]],
    points: Array,
    queries: Array,
    best: Places,
    reach: float = np.inf,
    *,
    within: bool = False,
) -> None:
    """Improve ``best`` of the queries without a place by the cells ``parts`` (kind, nodes, cell rows) up to ``reach``
    away; ``within``: only solids that hold the query count."""
    spheres = [_spheres(points[nodes]) for _, nodes, _ in parts if len(nodes)]
    centre, radius = (np.concatenate(part) for part in zip(*spheres, strict=True))
    tree, largest = cKDTree(centre), radius.max()
    open_rows = np.nonzero(np.isinf(best.distance))[0]
    bounded = lambda distance: np.minimum(distance, reach)  # noqa: E731
    count, done = 4, 0
    while len(open_rows):
        count = min(count, len(centre))
        away, cells = tree.query(queries[open_rows], k=count)
        away, cells = away.reshape(len(open_rows), -1), cells.reshape(len(open_rows), -1)
        for column in range(done, count):  # nearest centre first, so that most others can be dropped
            bound = (
                np.where(np.isinf(best.distance[open_rows]), 0, -1) if within else bounded(best.distance[open_rows])
            )
            wanted = away[:, column] - radius[cells[:, column]] <= bound
            _improve(best, parts, points, queries, open_rows[wanted], cells[wanted, column], within)
        bound = np.zeros(len(open_rows)) if within else bounded(best.distance[open_rows])
        settled = (bound <= away[:, -1] - largest) | (best.distance[open_rows] == 0)
        open_rows = open_rows[~settled] if count < len(centre) else open_rows[:0]
        done, count = count, 2 * count


def _into_solids(solids: list[tuple[str, Array, Array]], points: Array, best: Places, outside: Array) -> None:
    """Reference coordinates in the solid cell for the places of ``outside`` (q,) found on its faces."""
    for kind, nodes, cells in solids:
        mine = np.nonzero((best.cell >= cells[0]) & (best.cell <= cells[-1]) & outside)[0]
        if len(mine):
            xyz = points[nodes[best.cell[mine] - cells[0]]]
            best.xi[mine] = closest(kind, xyz, best.position[mine])[0]


def interpolation(blocks: Sequence[tuple[str, Array]], places: Places) -> Iterator[tuple[Array, Array, Array]]:
    """Per block: rows of the queries that lie in it, their nodes (k, n) and the weights (k, n) that carry nodal
    values over."""
    start = 0
    for kind, nodes in blocks:
        mine = np.nonzero((places.cell >= start) & (places.cell < start + len(nodes)))[0]
        if len(mine):
            yield mine, nodes[places.cell[mine] - start], KINDS[kind].shape(places.xi[mine, : KINDS[kind].dim])
        start += len(nodes)


def _spheres(xyz: Array) -> tuple[Array, Array]:
    centre = xyz.mean(axis=1)
    return centre, _BULGE * np.linalg.norm(xyz - centre[:, None], axis=2).max(axis=1)


def _improve(
    best: Places,
    parts: list[tuple[str, Array, Array]],
    points: Array,
    queries: Array,
    rows: Array,
    cells: Array,
    within: bool,
) -> None:
    """Try one cell (counted through ``parts``) for each of the query ``rows`` and keep what is nearer."""
    start = 0
    for kind, nodes, names in parts:
        mine = np.nonzero((cells >= start) & (cells < start + len(nodes)))[0]
        for at in range(0, len(mine), _PAIRS):
            pick = mine[at : at + _PAIRS]
            local = cells[pick] - start
            xi, position, distance = closest(kind, points[nodes[local]], queries[rows[pick]], within=within)
            nearer = distance < best.distance[rows[pick]]
            where = rows[pick][nearer]
            best.cell[where], best.distance[where] = names[local[nearer]], distance[nearer]
            best.xi[where], best.position[where] = 0.0, position[nearer]
            best.xi[where, : xi.shape[1]] = xi[nearer]
        start += len(nodes)


def closest(kind: str, xyz: Array, query: Array, *, within: bool = False) -> tuple[Array, Array, Array]:
    """Reference coordinates (m, dim), position (m, 3) and distance (m,) of the place of cell ``xyz`` (m, n, 3) that
    is nearest to ``query`` (m, 3), pair by pair; ``within``: distance is infinite where a solid does not hold it."""
    cell = KINDS[kind]
    if cell.dim == 0:
        return np.zeros((len(xyz), 0)), xyz[:, 0], np.linalg.norm(xyz[:, 0] - query, axis=1)
    xi, settled = _descend(kind, xyz, query)
    normals, offsets = half_spaces(kind)
    inside = settled & (xi @ normals.T <= offsets + _INSIDE).all(axis=1)
    position = np.einsum("mn,mni->mi", cell.shape(xi), xyz)
    distance = np.linalg.norm(position - query, axis=1)
    if cell.dim == 3:
        reached = distance <= 1e-9 * np.ptp(xyz, axis=1).max(axis=1)
        inside &= reached
        distance[inside] = 0.0
    distance[~inside] = np.inf
    outside = np.nonzero(~inside)[0]
    if len(outside) and not within:
        for part_kind, local in _boundary(kind):
            part_xi, place, gap = closest(part_kind, xyz[outside][:, list(local)], query[outside])
            nearer = gap < distance[outside]
            where = outside[nearer]
            distance[where], position[where] = gap[nearer], place[nearer]
            xi[where] = KINDS[part_kind].shape(part_xi[nearer]) @ cell.reference[list(local)]
    return xi, position, distance


def _boundary(kind: str) -> tuple[tuple[str, tuple[int, ...]], ...]:
    cell = KINDS[kind]
    if cell.dim == 3:
        return cell.faces
    if cell.dim == 2:
        return tuple((f"line{len(edge)}", edge) for edge in cell.edges)
    return (("vertex1", (0,)), ("vertex1", (1,)))


def _descend(kind: str, xyz: Array, query: Array) -> tuple[Array, Array]:
    """Stationary points (m, dim) of the distance, sought from the nearest of nodes and centre; whether found."""
    cell = KINDS[kind]
    middle = cell.reference[: cell.n_corners].mean(axis=0)
    # nodes are drawn a little inwards: at the apex of a pyramid the shape functions have no derivative
    trials = np.vstack([middle, middle + 0.9 * (cell.reference - middle)])
    start = np.linalg.norm(np.einsum("tn,mni->mti", cell.shape(trials), xyz) - query[:, None], axis=2).argmin(axis=1)
    xi = trials[start].copy()
    open_rows, settled = np.arange(len(xyz)), np.zeros(len(xyz), bool)
    for _ in range(_STEPS):
        here, target, at = xyz[open_rows], query[open_rows], xi[open_rows]
        miss = target - np.einsum("mn,mni->mi", cell.shape(at), here)
        slopes = np.einsum("mnd,mni->mid", cell.gradient(at), here)
        gram = np.einsum("mid,mie->mde", slopes, slopes)
        if cell.family == "quad" or (cell.dim < 3 and cell.degree > 1):
            curved = gram - _bend(kind, here, at, miss)
            convex = np.linalg.eigvalsh(curved)[:, 0] > 1e-3 * np.trace(gram, axis1=1, axis2=2)
            gram[convex] = curved[convex]
        gram += 1e-14 * np.trace(gram, axis1=1, axis2=2)[:, None, None] * np.eye(cell.dim) + 1e-300 * np.eye(cell.dim)
        step = np.linalg.solve(gram, np.einsum("mid,mi->md", slopes, miss)[..., None])[..., 0]
        step /= np.maximum(np.abs(step).max(axis=1, keepdims=True), 1.0)  # at most half a cell
        before = np.sum(miss**2, axis=1)
        for _ in range(6):
            moved = target - np.einsum("mn,mni->mi", cell.shape(at + step), here)
            worse = np.sum(moved**2, axis=1) > before * (1 + 1e-12)
            if not worse.any():
                break
            step[worse] *= 0.5
        xi[open_rows] = np.clip(at + step, -3, 3)
        still = np.abs(step).max(axis=1) <= 1e-11
        settled[open_rows[still]] = True
        open_rows = open_rows[~still]
        if not len(open_rows):
            break
    return xi, settled


def _bend(kind: str, xyz: Array, xi: Array, miss: Array) -> Array:
    """(m, dim, dim) miss · ∂²x/∂ξ²: what Newton's step adds to that of Gauss. Central differences of gradients are
    exact, since these are quadratic at most."""
    cell, h = KINDS[kind], 0.25
    out = np.empty((len(xyz), cell.dim, cell.dim))
    weights = np.einsum("mni,mi->mn", xyz, miss)
    for d in range(cell.dim):
        reach = h * np.eye(cell.dim)[d]
        second = (cell.gradient(xi + reach) - cell.gradient(xi - reach)) / (2 * h)
        out[:, d] = np.einsum("mnd,mn->md", second, weights)
    return 0.5 * (out + np.swapaxes(out, 1, 2))


@cache
def half_spaces(kind: str) -> tuple[Array, Array]:
    """Normals (f, dim) and offsets (f,) of the reference cell's sides: ξ is inside when normals · ξ ≤ offsets."""
    cell = KINDS[kind]
    corners = cell.reference[: cell.n_corners]
    if cell.dim == 1:
        return np.array([[-1.0], [1.0]]), np.array([-corners.min(), corners.max()])
    normals = []
    for _, local in _boundary(kind):
        side = cell.reference[list(local)]
        if cell.dim == 3:
            normals.append(np.cross(side[1] - side[0], side[2] - side[0]))
        else:
            along = side[1] - side[0]
            normals.append(np.array([along[1], -along[0]]))
    found = np.array(normals)
    found /= np.linalg.norm(found, axis=1, keepdims=True)
    at = np.array([cell.reference[local[0]] for _, local in _boundary(kind)])
    offsets = np.sum(found * at, axis=1)
    flip = found @ corners.mean(axis=0) > offsets
    found[flip], offsets[flip] = -found[flip], -offsets[flip]
    return found, offsets
