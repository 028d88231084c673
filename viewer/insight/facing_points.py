"""Places on the surface between which a strut could stand: footprints, and pairs with a clear line between them.

Footprints are patches of one side of the surface, spread by farthest-point sampling over place and direction; each
sends a line along its normal, and where that meets another surface a footprint is set opposite. A pair *faces* when
the line between the centres leaves both surfaces outward. Pairs whose line crosses the part or a forbidden box are
left out and counted; only where no pair faces, pairs along open edges are taken as well.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.sparse as sp
from scipy.sparse.csgraph import connected_components
from scipy.spatial import cKDTree

from viewer.cells import KINDS
from viewer.jobs import SILENT, Progress
from viewer.model.arrays import Array, frozen, frozen_map
from viewer.model.design import Clearance
from viewer.model.mesh import Mesh

COUNT = 200  # footprints, those set opposite included
RADIUS = 0.02  # of the diagonal
ELEMENTS = 1.5  # a footprint's radius in mesh lines, at least
SLANT = 0.26  # sine of the angle, 15°, at which a line must leave a facing surface at least
_FLAT = np.cos(np.radians(30.0))  # a footprint's faces turn no further from its middle
_SEEDS = 50_000  # triangles to choose from
_SAMPLES = 20_000  # points along lines at a time


@dataclass(frozen=True, eq=False)
class Footprint:
    """A patch of surface: node rows, centre (3,) m (mean of the nodes), unit normal (3,) outward, zero on beams.

    two_sided  a sheet: a line may leave on either side
    group      the smallest named group that holds all its nodes, or empty
    """

    nodes: Array
    centre: Array
    normal: Array
    two_sided: bool
    group: str = ""

    def __post_init__(self) -> None:
        for name in ("nodes", "centre", "normal"):
            object.__setattr__(self, name, frozen(getattr(self, name)))


@dataclass(frozen=True, eq=False)
class Candidates:
    """Footprints, pairs (p, 2) of them, which of these face (p,), and how many pairs were left out, by reason."""

    footprints: tuple[Footprint, ...]
    pairs: Array
    facing: Array
    left_out: Mapping[str, int]
    radius: float  # m, of the footprints

    def __post_init__(self) -> None:
        object.__setattr__(self, "pairs", frozen(self.pairs, np.int64, shape=(None, 2)))
        object.__setattr__(self, "facing", frozen(self.facing, bool, shape=(len(self.pairs),)))
        object.__setattr__(self, "left_out", frozen_map(self.left_out))

    @cached_property
    def lines(self) -> Array:
        """(p, 3) m, from the first centre to the second."""
        centres = np.array([each.centre for each in self.footprints]).reshape(-1, 3)
        return centres[self.pairs[:, 1]] - centres[self.pairs[:, 0]]

    def only(self, rows: Array) -> Candidates:
        """The same footprints with the pairs ``rows`` alone."""
        return Candidates(self.footprints, self.pairs[rows], self.facing[rows], self.left_out, self.radius)


def candidate_pairs(
    mesh: Mesh,
    usable: Array | None = None,
    *,
    count: int = COUNT,
    radius: float | None = None,
    clearances: Sequence[Clearance] = (),
    margin: float = 0.0,
    progress: Progress = SILENT,
) -> Candidates:
    """Footprints of ``mesh`` and the pairs between which a line is clear.

    usable  (n_nodes,) nodes a strut may end on, None: all
    radius  m, of a footprint; None: 2 % of the diagonal, or 1.5 mesh lines where those are longer
    margin  m by which the forbidden boxes are grown on every side
    """
    progress.tick("footprints")
    surface = _Surface(mesh, np.ones(mesh.n_nodes, bool) if usable is None else np.asarray(usable, bool))
    radius = surface.radius() if radius is None else radius
    footprints = surface.footprints(count, radius, progress)
    first, second = np.triu_indices(len(footprints), 1)
    centres = np.array([each.centre for each in footprints]).reshape(-1, 3)
    lines = centres[second] - centres[first]
    length = np.linalg.norm(lines, axis=1)
    long = length > 2 * radius
    first, second, lines, length = (part[long] for part in (first, second, lines, length))
    leaving = _leaving(footprints, first, lines, length), _leaving(footprints, second, -lines, length)
    facing = (leaving[0] >= SLANT) & (leaving[1] >= SLANT)
    if facing.any():
        kept = facing
    else:
        along = (leaving[0] > -SLANT) & (leaving[1] > -SLANT)
        kept = along & ~surface.runs_along(centres[first], lines, radius)
    first, second, facing = first[kept], second[kept], facing[kept]
    barred = _barred(centres[first], centres[second], clearances, margin)
    crossing = np.zeros(len(first), bool)
    open_rows = np.nonzero(~barred)[0]
    crossing[open_rows] = surface.crossed(footprints, first[open_rows], second[open_rows], progress)
    clear = ~(barred | crossing)
    return Candidates(
        tuple(footprints),
        np.stack([first, second], axis=1)[clear],
        facing[clear],
        {"crosses the part": int(crossing.sum()), "passes a forbidden volume": int(barred.sum())},
        radius,
    )


class _Surface:
    """The skin's triangles and segments between usable nodes, with what searches need."""

    def __init__(self, mesh: Mesh, usable: Array) -> None:
        skin, points = mesh.skin, mesh.points
        self.mesh, self.points = mesh, points
        there = usable[skin.faces].all(axis=1)
        self.faces = skin.faces[there]
        sheet = np.repeat([KINDS[b.kind].dim == 2 for b in mesh.blocks], [len(b) for b in mesh.blocks]).astype(bool)
        self.sheet = sheet[skin.cell[there]]
        corners = points[self.faces]
        self.middles = corners.mean(axis=1)
        normals = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
        self.normals = normals / np.maximum(np.linalg.norm(normals, axis=1, keepdims=True), 1e-300)
        self.edges = skin.edges[usable[skin.edges].all(axis=1)]
        sides = skin.outline if len(skin.outline) else skin.edges
        self.side = float(np.median(np.linalg.norm(np.diff(points[sides], axis=1), axis=2))) if len(sides) else 0.0
        self.tree = cKDTree(self.middles) if len(self.faces) else None
        # Triangles of one size in one tree: how many lie near a point is bounded then, whatever the mesh's grading.
        reach = np.linalg.norm(corners - self.middles[:, None], axis=2).max(axis=1) * (1 + 1e-9)
        size = np.floor(np.log2(np.maximum(reach, 1e-300)) / 2)
        self.sizes = [
            (cKDTree(self.middles[rows]), rows, float(reach[rows].max()))
            for rows in (np.nonzero(size == value)[0] for value in np.unique(size))
        ]

    def radius(self) -> float:
        share = RADIUS * self.mesh.diagonal
        return max(share, ELEMENTS * self.side) if len(self.faces) else share  # a node of a beam is no bare point

    def footprints(self, count: int, radius: float, progress: Progress) -> list[Footprint]:
        """Half of ``count`` spread over the surface, the rest where their normals meet another surface."""
        if not len(self.faces):
            return self._on_lines(count, radius)
        every = len(self.faces) // _SEEDS + 1
        seeds = np.arange(0, len(self.faces), every)
        spread = np.hstack([self.middles[seeds], radius * self.normals[seeds]])
        seeds = seeds[_farthest(spread, max(2, count // 2))]
        found = [self._patch(int(seed), radius) for seed in seeds]
        found = _apart(found, radius)
        opposite = [self._patch(seed, radius) for seed in self._met(found, progress)]
        return self._named(_apart([*found, *opposite], radius)[:count])

    def _patch(self, seed: int, radius: float) -> Footprint:
        """Connected triangles around triangle ``seed`` that lie on the same side."""
        assert self.tree is not None
        near = np.array(self.tree.query_ball_point(self.middles[seed], radius))
        normal = self.normals[seed]
        turned = self.normals[near] @ normal
        near = near[(np.abs(turned) if self.sheet[seed] else turned) >= _FLAT]
        near = np.unique(np.append(near, seed))
        nodes, local = np.unique(self.faces[near], return_inverse=True)
        local = local.reshape(-1, 3)
        link = sp.coo_array(
            (np.ones(local.size), (np.repeat(np.arange(len(near)), 3), len(near) + local.ravel())),
            shape=(len(near) + len(nodes),) * 2,
        )
        _, part = connected_components(link, directed=False)
        mine = part[len(near) :] == part[np.searchsorted(near, seed)]
        rows = nodes[mine]
        return Footprint(rows, self.points[rows].mean(axis=0), normal, bool(self.sheet[seed]))

    def _met(self, footprints: list[Footprint], progress: Progress) -> list[int]:
        """Triangles that the normals of the footprints meet first."""
        starts, directions, owner = [], [], []
        for number, each in enumerate(footprints):
            for side in (1.0, -1.0) if each.two_sided else (1.0,):
                starts.append(each.centre)
                directions.append(side * each.normal)
                owner.append(number)
        begin = np.array(starts)
        line, triangle, along = self.hits(begin, begin + self.mesh.diagonal * np.array(directions), progress)
        own = self._touches(footprints, np.array(owner)[line], triangle)
        line, triangle, along = line[~own], triangle[~own], along[~own]
        order = np.lexsort((along, line))
        _, nearest = np.unique(line[order], return_index=True)
        return list(dict.fromkeys(triangle[order][nearest].tolist()))

    def _on_lines(self, count: int, radius: float) -> list[Footprint]:
        """Beams alone: nodes with their neighbours in reach, without a normal."""
        nodes = np.unique(self.edges)
        if not len(nodes):
            return []
        tree = cKDTree(self.points[nodes])
        found = []
        for seed in _farthest(self.points[nodes], count):
            rows = nodes[np.sort(tree.query_ball_point(self.points[nodes[seed]], radius))]
            found.append(Footprint(rows, self.points[rows].mean(axis=0), np.zeros(3), True))
        return self._named(found)

    def _named(self, footprints: list[Footprint]) -> list[Footprint]:
        mesh, groups = self.mesh, []
        for name, rows in (
            *mesh.node_groups.items(),
            *((n, mesh.nodes_of_cells(c)) for n, c in mesh.cell_groups.items()),
        ):
            mask = np.zeros(mesh.n_nodes, bool)
            mask[rows] = True
            if not mask[mesh.used_nodes].all():  # the whole body is no place
                groups.append((int(mask.sum()), name, mask))
        groups.sort(key=lambda item: item[:2])
        return [
            Footprint(
                each.nodes,
                each.centre,
                each.normal,
                each.two_sided,
                next((name for _, name, mask in groups if mask[each.nodes].all()), ""),
            )
            for each in footprints
        ]

    def hits(self, start: Array, end: Array, progress: Progress = SILENT) -> tuple[Array, Array, Array]:
        """Where lines (l, 3) to (l, 3) pass triangles: line, triangle and the share of the way there, each (h,).

        Triangles near points along the lines are tried (Möller T., Trumbore B., Fast, minimum storage ray–triangle
        intersection, J. Graphics Tools 2 (1997) 21).
        """
        way = end - start
        found = [(np.empty(0, np.int64), np.empty(0, np.int64), np.empty(0))]
        for tree, rows, reach in self.sizes:
            steps = np.ceil(np.linalg.norm(way, axis=1) / (2 * reach)).astype(int) + 1
            line = np.repeat(np.arange(len(start)), steps)
            step = np.arange(len(line)) - np.repeat(np.cumsum(steps) - steps, steps)
            share = (step + 0.5) / steps[line]
            for at in range(0, len(line), _SAMPLES):
                progress.tick("clear lines", at, len(line))
                which = line[at : at + _SAMPLES]
                near = tree.query_ball_point(start[which] + share[at : at + _SAMPLES, None] * way[which], 2 * reach)
                triangle = rows[np.concatenate([np.asarray(each, np.int64) for each in near])]
                which = np.repeat(which, [len(each) for each in near])
                key = np.unique(which * len(self.faces) + triangle)
                found.append(self._met_by(key // len(self.faces), key % len(self.faces), start, way))
        lines, triangles, along = (np.concatenate(part) for part in zip(*found, strict=True))
        return lines, triangles, along

    def _met_by(self, line: Array, triangle: Array, start: Array, way: Array) -> tuple[Array, Array, Array]:
        a, b, c = np.moveaxis(self.points[self.faces[triangle]], 1, 0)
        direction, one, two = way[line], b - a, c - a
        across = np.cross(direction, two)
        turn = np.einsum("ni,ni->n", one, across)
        size = np.linalg.norm(direction, axis=1) * np.linalg.norm(np.cross(one, two), axis=1)
        safe = np.where(np.abs(turn) > 1e-9 * size, turn, np.inf)  # a line within the plane does not cross it
        gap = start[line] - a
        u = np.einsum("ni,ni->n", gap, across) / safe
        turned = np.cross(gap, one)
        v = np.einsum("ni,ni->n", direction, turned) / safe
        along = np.einsum("ni,ni->n", two, turned) / safe
        inside = np.isfinite(safe) & (u >= -1e-9) & (v >= -1e-9) & (u + v <= 1 + 1e-9) & (along > 0) & (along < 1)
        return line[inside], triangle[inside], along[inside]

    def _touches(self, footprints: Sequence[Footprint], owner: Array, triangle: Array) -> Array:
        """(h,) whether each triangle has a node in the footprint ``owner`` beside it."""
        rows = np.concatenate([each.nodes for each in footprints])
        number = np.repeat(np.arange(len(footprints)), [len(each.nodes) for each in footprints])
        known = np.sort(number * self.mesh.n_nodes + rows)
        asked = owner[:, None] * self.mesh.n_nodes + self.faces[triangle]
        at = np.minimum(np.searchsorted(known, asked), len(known) - 1)
        return (known[at] == asked).any(axis=1)

    def crossed(self, footprints: Sequence[Footprint], first: Array, second: Array, progress: Progress) -> Array:
        """(p,) whether the line between two footprints passes the surface anywhere but at the footprints."""
        out = np.zeros(len(first), bool)
        if not len(first):
            return out
        centres = np.array([each.centre for each in footprints])
        line, triangle, _ = self.hits(centres[first], centres[second], progress)
        own = self._touches(footprints, first[line], triangle) | self._touches(footprints, second[line], triangle)
        out[line[~own]] = True
        return out

    def runs_along(self, start: Array, way: Array, radius: float) -> Array:
        """(p,) whether the middle of a line lies on the part: it would strengthen what is there, not bridge a gap."""
        marks = [self.points[np.unique(self.faces)]]
        if len(self.edges):
            span = np.diff(self.points[self.edges], axis=1)[:, 0]
            pieces = int(np.ceil(np.linalg.norm(span, axis=1).max() / radius)) + 1
            share = np.linspace(0, 1, min(pieces, 200))
            marks.append((self.points[self.edges[:, 0], None] + share[:, None] * span[:, None]).reshape(-1, 3))
        tree = cKDTree(np.concatenate(marks))
        near = [tree.query(start + part * way)[0] < radius for part in (0.3, 0.5, 0.7)]
        return np.logical_and.reduce(near)


def _leaving(footprints: Sequence[Footprint], which: Array, lines: Array, length: Array) -> Array:
    """(p,) sine of the angle at which a line leaves the surface outward."""
    normals = np.array([each.normal for each in footprints]).reshape(-1, 3)
    sheet = np.array([each.two_sided for each in footprints], bool)
    sine = np.einsum("pi,pi->p", normals[which], lines) / length
    return np.where(sheet[which], np.abs(sine), sine)


def _farthest(places: Array, count: int) -> Array:
    """Rows of up to ``count`` places, each the farthest from those before; the first lies farthest from the mean."""
    chosen = [int(np.argmax(np.sum((places - places.mean(axis=0)) ** 2, axis=1)))]
    distance = np.sum((places - places[chosen[0]]) ** 2, axis=1)
    while len(chosen) < min(count, len(places)):
        farthest = int(np.argmax(distance))
        if distance[farthest] <= 0:
            break
        chosen.append(farthest)
        np.minimum(distance, np.sum((places - places[farthest]) ** 2, axis=1), out=distance)
    return np.array(chosen)


def _apart(footprints: list[Footprint], radius: float) -> list[Footprint]:
    """Without those whose centre and side are nearly those of an earlier one."""
    kept: list[Footprint] = []
    for each in footprints:
        same = (
            np.linalg.norm(each.centre - other.centre) < 0.25 * radius
            and (abs if each.two_sided else float)(each.normal @ other.normal) > _FLAT
            for other in kept
        )
        if not any(same):
            kept.append(each)
    return kept


def _barred(start: Array, end: Array, clearances: Sequence[Clearance], margin: float) -> Array:
    """(p,) whether a line meets one of the boxes, grown by ``margin``: it stays between the two planes of every axis
    for a common share of its way."""
    out = np.zeros(len(start), bool)
    way = end - start
    for each in clearances:
        low, high = each.box[0] - margin - start, each.box[1] + margin - start
        with np.errstate(divide="ignore", invalid="ignore"):
            one, two = low / way, high / way
        still = way == 0
        between = (low <= 0) & (high >= 0)
        enter = np.where(still, np.where(between, -np.inf, np.inf), np.minimum(one, two)).max(axis=1)
        leave = np.where(still, np.where(between, np.inf, -np.inf), np.maximum(one, two)).min(axis=1)
        out |= np.maximum(enter, 0) <= np.minimum(leave, 1)
    return out
