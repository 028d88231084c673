"""Facing surfaces: do two surfaces with empty space between them spread, slide or move together?

Rays leave the surface along its normal (both ways from shells) and look for the first surface they meet; where that
one looks back, the two places face each other. Rays march through empty space: the distance to the nearest surface
sample tells how far none can be met, and the triangles of the nearest samples are met exactly (Möller and Trumbore
1997). Places are gathered into pairs of smooth patches of the surface.

Of two facing places with motions a and b, |a|² + |b|² = ½|a + b|² + ½|b − a|²; the second part is split into motion
along the ray (the gap opens and closes) and across it (the two slide past each other).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.sparse as sp
from scipy.sparse.csgraph import connected_components, dijkstra
from scipy.spatial import cKDTree

from viewer.cells import KINDS
from viewer.jobs import SILENT, Progress
from viewer.model.arrays import Array
from viewer.model.cycle import cycle_peaks, steadiest_turn
from viewer.model.mesh import Mesh

_RAYS = 3000
_SAMPLES = 60_000
_NEAR = 12  # samples whose triangles a ray is tried against at each step
_SMOOTH = np.cos(np.radians(35))  # between neighbours of one patch
_BACK = 0.6  # cosine at which the surface met looks back
_LEAST_SHARE = 0.02  # of all rays, for a pair to be told
_PAIRS = 5
_APART = 2.2  # way along the surface ÷ gap from which the two are arms of their own (walls of a box stay below 2)


@dataclass(frozen=True, eq=False)
class FacingPair:
    """Two facing surfaces and their motion in one mode. ``opens + slides + together`` = 1, shares of |a|² + |b|².

    names      a cell group each, "" where none fits
    cells      cell rows on both sides
    area       m², of one side; gap (3 figures) m: least, mean; direction (3,) unit, mean of the rays from A to B
    straight   0 … 1, length of that mean: 1 for parallel rays
    slide_direction  (3,) unit, along which most of the sliding goes
    one_way    0 … 1: 1 when the gap opens everywhere at once, 0 when as much closes as opens
    motion     rms motion of both sides ÷ the body's largest
    opening    in units of the shape, largest change of the gap
    apart      whether the two are arms of their own: the way along the surface is long against the gap
    """

    names: tuple[str, str]
    cells: tuple[Array, Array]
    area: float
    gap_least: float
    gap: float
    direction: Array
    straight: float
    opens: float
    slides: float
    together: float
    slide_direction: Array
    one_way: float
    motion: float
    opening: float
    apart: bool

    def to_dict(self) -> dict[str, Any]:
        return {
            "surfaces": [name or None for name in self.names],
            "area_m2": self.area,
            "gap_least_m": self.gap_least,
            "gap_m": self.gap,
            "gap_direction": self.direction.tolist(),
            "straight": self.straight,
            "opens_share": self.opens,
            "slides_share": self.slides,
            "together_share": self.together,
            "slide_direction": self.slide_direction.tolist(),
            "one_way": self.one_way,
            "motion_to_largest": self.motion,
            "opening_per_shape_unit": self.opening,
            "arms": self.apart,
        }


@dataclass(frozen=True, eq=False)
class _Places:
    """Rays that found a facing place: triangles (r,) on both sides, weights (r, 3) of the nodes, directions, gaps."""

    first: Array
    second: Array
    from_weights: Array
    to_weights: Array
    ray: Array
    gap: Array


@dataclass(frozen=True, eq=False)
class FacingSurfaces:
    """What faces what in a mesh; found once, asked for every mode."""

    mesh: Mesh
    places: _Places
    pairs: tuple[tuple[Array, Array, bool], ...]  # rows of the rays, +1 or −1 where a ray runs from A to B, arms
    area: float  # m² for which a ray stands

    def pair_motions(self, shape: Array) -> tuple[FacingPair, ...]:
        """The largest pairs first; shape (n_nodes, 3), real or complex."""
        largest = float(cycle_peaks(shape[self.mesh.used_nodes]).max(initial=0.0))
        return tuple(self._pair(pair, shape, largest) for pair in self.pairs)

    def _pair(self, pair: tuple[Array, Array, bool], shape: Array, largest: float) -> FacingPair:
        rows, way, apart = pair
        faces, found = self.mesh.skin.faces, self.places
        a = np.einsum("rk,rki->ri", found.from_weights[rows], shape[faces[found.first[rows]]])
        b = np.einsum("rk,rki->ri", found.to_weights[rows], shape[faces[found.second[rows]]])
        ray = found.ray[rows]
        opening = np.einsum("ri,ri->r", b - a, ray)  # the same seen from either side
        whole = float((np.abs(a) ** 2).sum() + (np.abs(b) ** 2).sum()) or 1.0
        opens = 0.5 * float((np.abs(opening) ** 2).sum()) / whole
        together = 0.5 * float((np.abs(a + b) ** 2).sum()) / whole
        direction = (way[:, None] * ray).mean(axis=0)
        past = b - a - opening[:, None] * ray
        _, axes = np.linalg.eigh((past.T @ past.conj()).real)
        straight = float(np.linalg.norm(direction))
        swing = (opening * steadiest_turn(opening)).real
        cells = self.mesh.skin.cell
        sides = [
            np.where(way > 0, found.first[rows], found.second[rows]),
            np.where(way > 0, found.second[rows], found.first[rows]),
        ]
        first, second = (np.unique(cells[side]) for side in sides)
        return FacingPair(
            names=_names(self.mesh, cells[sides[0]], cells[sides[1]]),
            cells=(first, second),
            area=self.area * len(rows) / 2,
            gap_least=float(found.gap[rows].min()),
            gap=float(found.gap[rows].mean()),
            direction=direction / (straight or 1.0),
            straight=straight,
            opens=opens,
            slides=max(1 - opens - together, 0.0),
            together=together,
            slide_direction=axes[:, -1] * np.sign(axes[np.argmax(np.abs(axes[:, -1])), -1]),
            one_way=float(abs(swing.sum()) / (np.abs(swing).sum() or 1.0)),
            motion=float(np.sqrt(whole / (2 * len(rows)))) / (largest or 1.0),
            opening=float(np.abs(opening).max()),
            apart=apart,
        )


def facing_surfaces(mesh: Mesh, progress: Progress = SILENT) -> FacingSurfaces:
    """Find the facing surfaces of a mesh: the largest pairs first, none in a mesh without surface.

    Time grows with the number of rays (3 000), not of triangles; gaps narrower than 1e-6 of the body are contacts.
    """
    faces = mesh.skin.faces
    corners = mesh.points[faces]
    normal = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    area = 0.5 * np.linalg.norm(normal, axis=1)
    if not area.sum() > 0:
        return FacingSurfaces(mesh, _no_places(), (), 0.0)
    normal = normal / np.maximum(2 * area, 1e-300)[:, None]
    two_sided = _two_sided(mesh)[mesh.skin.cell]
    progress.tick("facing surfaces")
    reach = np.where(two_sided, 2.0, 1.0) * area  # what rays are shared out by
    ends = np.cumsum(reach)
    count = min(_RAYS, 4 * len(faces))
    spot = (np.arange(count) + 0.5) / count * ends[-1]
    first = np.minimum(np.searchsorted(ends, spot), len(faces) - 1)
    back = two_sided[first] & (spot - (ends[first] - reach[first]) > area[first])
    ray = normal[first] * np.where(back, -1.0, 1.0)[:, None]
    weights = _spread_weights(count)
    found = _march(mesh, corners, normal, two_sided, first, weights, ray, progress)
    patches = _patches(faces, normal)
    return FacingSurfaces(mesh, found, _gather(mesh, found, patches, count), float(ends[-1] / count))


def _two_sided(mesh: Mesh) -> Array:
    """(n_cells,) True for cells that are sheets."""
    return np.concatenate([np.full(len(block), KINDS[block.kind].dim < 3) for block in mesh.blocks])


def _spread_weights(count: int) -> Array:
    """(count, 3) places spread over a triangle: the golden-ratio sequence, folded into it."""
    number = np.arange(count)[:, None]
    pair = np.modf(0.5 + number * np.array([0.7548776662466927, 0.5698402909980532]))[0]  # R₂ sequence
    pair = np.where(pair.sum(axis=1, keepdims=True) > 1, 1 - pair, pair)
    pair = 0.05 + 0.85 * pair  # off the edges
    return np.column_stack([1 - pair.sum(axis=1), pair])


def _no_places() -> _Places:
    none, nothing = np.empty(0, np.int64), np.empty((0, 3))
    return _Places(none, none, nothing, nothing, nothing, np.empty(0))


def _march(
    mesh: Mesh,
    corners: Array,
    normal: Array,
    two_sided: Array,
    first: Array,
    weights: Array,
    ray: Array,
    progress: Progress,
) -> _Places:
    samples, owner, spacing = _samples(corners)
    tree = cKDTree(samples)
    start = np.einsum("rk,rki->ri", weights, corners[first])
    faces = mesh.skin.faces
    best, met = np.full(len(first), np.inf), np.full(len(first), -1)
    to_weights = np.zeros((len(first), 3))
    travelled = np.full(len(first), 1e-6 * mesh.diagonal)
    open_rows, size = np.arange(len(first)), mesh.diagonal
    near = min(_NEAR, len(samples))
    while len(open_rows):
        progress.tick("facing surfaces")
        at = start[open_rows] + travelled[open_rows, None] * ray[open_rows]
        away, nearest = tree.query(at, k=near)
        away, nearest = away.reshape(len(at), near), nearest.reshape(len(at), near)
        hits, where = _meet(start[open_rows], ray[open_rows], corners, owner[nearest])
        shared = (faces[owner[nearest]][:, :, :, None] == faces[first[open_rows]][:, None, None, :]).any(axis=(2, 3))
        hits = np.where(shared | (hits <= 1e-6 * size), np.inf, hits)
        column = np.argmin(hits, axis=1)
        line = np.arange(len(at))
        better = hits[line, column] < best[open_rows]
        rows = open_rows[better]
        best[rows], met[rows] = hits[line, column][better], owner[nearest][line, column][better]
        to_weights[rows] = where[line, column][better]
        travelled[open_rows] += np.maximum(away[:, 0] - spacing, 0.5 * spacing)
        open_rows = open_rows[travelled[open_rows] < np.minimum(best[open_rows] + spacing, size)]
    seen = np.nonzero(met >= 0)[0]
    facing = np.einsum("ri,ri->r", normal[met[seen]], ray[seen])
    good = np.where(two_sided[met[seen]], np.abs(facing), -facing) >= _BACK
    seen = seen[good]
    return _Places(first[seen], met[seen], weights[seen], to_weights[seen], ray[seen], best[seen])


def _samples(corners: Array) -> tuple[Array, Array, float]:
    """Points spread over the triangles so that none is farther from its nearest than the spacing returned."""
    longest = np.sqrt(((corners - np.roll(corners, 1, axis=1)) ** 2).sum(axis=2).max(axis=1))
    area = 0.5 * np.linalg.norm(np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]), axis=1)
    spacing = max(float(np.sqrt(2 * area.sum() / _SAMPLES)), float(np.median(longest)) * 0.5)
    cuts = np.clip(np.ceil(longest / spacing).astype(int), 1, 60)
    points, owners = [], []
    for n in np.unique(cuts):
        rows = np.nonzero(cuts == n)[0]
        i, j = (grid.ravel() for grid in np.meshgrid(np.arange(n), np.arange(n), indexing="ij"))
        up = i + j < n
        lattice = [np.column_stack([i[up] + 1 / 3, j[up] + 1 / 3])]
        down = i + j < n - 1
        lattice.append(np.column_stack([i[down] + 2 / 3, j[down] + 2 / 3]))
        pair = np.concatenate(lattice) / n
        weights = np.column_stack([1 - pair.sum(axis=1), pair])
        points.append(np.einsum("wk,tki->twi", weights, corners[rows]).reshape(-1, 3))
        owners.append(np.repeat(rows, len(weights)))
    reach = float((longest / cuts).max())
    return np.concatenate(points), np.concatenate(owners), reach


def _meet(start: Array, ray: Array, corners: Array, triangles: Array) -> tuple[Array, Array]:
    """Distances (r, k) at which the rays meet the triangles (r, k), inf where they do not, and weights (r, k, 3)."""
    a, b, c = np.moveaxis(corners[triangles], 2, 0)
    one, two = b - a, c - a
    lift = np.cross(ray[:, None], two)
    steep = np.einsum("rki,rki->rk", one, lift)
    with np.errstate(divide="ignore", invalid="ignore"):
        away = start[:, None] - a
        u = np.einsum("rki,rki->rk", away, lift) / steep
        turned = np.cross(away, one)
        v = np.einsum("rki,ri->rk", turned, ray) / steep
        distance = np.einsum("rki,rki->rk", turned, two) / steep
        slack = 1e-9
        inside = (u >= -slack) & (v >= -slack) & (u + v <= 1 + slack) & np.isfinite(distance)
        weights = np.stack([1 - u - v, u, v], axis=-1)
    return np.where(inside, distance, np.inf), weights


def _patches(faces: Array, normal: Array) -> Array:
    """(t,) number of the smooth patch of each triangle."""
    sides = np.concatenate([faces[:, [0, 1]], faces[:, [1, 2]], faces[:, [2, 0]]])
    owner = np.tile(np.arange(len(faces)), 3)
    key = np.sort(sides, axis=1) @ np.array([int(faces.max()) + 1, 1])
    order = np.argsort(key, kind="stable")
    key, owner = key[order], owner[order]
    pairs = []
    for step in (1, 2):  # three sheets may meet at an edge
        same = np.nonzero(key[step:] == key[:-step])[0]
        pairs.append(np.column_stack([owner[same], owner[same + step]]))
    joined = np.concatenate(pairs)
    smooth = np.abs(np.einsum("ei,ei->e", normal[joined[:, 0]], normal[joined[:, 1]])) >= _SMOOTH
    joined = joined[smooth]
    graph = sp.coo_array((np.ones(len(joined), bool), joined.T), shape=(len(faces), len(faces)))
    return connected_components(graph, directed=False)[1]


def _gather(mesh: Mesh, found: _Places, patches: Array, count: int) -> tuple[tuple[Array, Array, bool], ...]:
    """The largest pairs of patches: rows of their rays and the way of each."""
    if len(found.first) == 0:
        return ()
    ends = np.column_stack([patches[found.first], patches[found.second]])
    key = np.sort(ends, axis=1) @ np.array([int(patches.max()) + 1, 1])
    _, inverse, counts = np.unique(key, return_inverse=True, return_counts=True)
    pairs = []
    for number in np.argsort(-counts, kind="stable")[:_PAIRS]:
        if counts[number] < max(_LEAST_SHARE * count, 8):
            break
        rows = np.nonzero(inverse == number)[0]
        if (ends[rows, 0] == ends[rows, 1]).all():  # a patch that faces itself: told apart by the way of the rays
            _, axes = np.linalg.eigh(found.ray[rows].T @ found.ray[rows])
            way = np.where(found.ray[rows] @ axes[:, -1] >= 0, 1.0, -1.0)
        else:
            way = np.where(ends[rows, 0] <= ends[rows, 1], 1.0, -1.0)
        pairs.append((rows, way, _arms(mesh, found, rows)))
    return tuple(pairs)


def _arms(mesh: Mesh, found: _Places, rows: Array) -> bool:
    """Whether the way along the surface between facing places is long against the gap, in the middle of several."""
    faces = mesh.skin.faces
    sides = np.concatenate([faces[:, [0, 1]], faces[:, [1, 2]], faces[:, [2, 0]]])
    length = np.linalg.norm(mesh.points[sides[:, 0]] - mesh.points[sides[:, 1]], axis=1)
    graph = sp.coo_array((length, sides.T), shape=(mesh.n_nodes, mesh.n_nodes)).tocsr()
    graph.data = np.maximum(graph.data, 1e-300)
    tried = rows[np.linspace(0, len(rows) - 1, 7).astype(int)]
    ratios = []
    for row in np.unique(tried):
        limit = 1.5 * _APART * found.gap[row]
        ways = dijkstra(graph, directed=False, indices=faces[found.first[row], 0], limit=limit)
        ratios.append(min(ways[faces[found.second[row]]].min(), limit) / found.gap[row])
    return bool(np.median(ratios) >= _APART)


def _names(mesh: Mesh, first: Array, second: Array) -> tuple[str, str]:
    return _name(mesh, first), _name(mesh, second)


def _name(mesh: Mesh, cells: Array) -> str:
    """The smallest cell group that holds most of the given cells (one per ray), "" when none does."""
    fitting = [
        (len(rows), name)
        for name, rows in mesh.cell_groups.items()
        if len(rows) < 0.9 * mesh.n_cells and np.isin(cells, rows).mean() >= 0.6
    ]
    return min(fitting)[1] if fitting else ""
