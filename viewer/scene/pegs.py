"""Support pegs: cubes that bite held edges on the side where the body is not."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from scipy.spatial import cKDTree

from viewer.cells import KINDS
from viewer.model.arrays import Array
from viewer.model.mesh import Mesh
from viewer.scene.forms import Piece, axes
from viewer.scene.surface import cross_of

PEG = 0.018  # edge of a peg's cube
PEG_STEP = 0.028  # least distance between pegs
PEG_BITE = 0.2  # share of a peg's edge that lies in the body

_ONE_SIDED = 0.6  # share in which the cells around held nodes agree on the side where the body is
_FEW = 4  # neighbours that a point is seen among at least
_MANY = 4000  # held nodes above which one in each cube of a grid is enough
_GRAIN = 0.25  # edge of these cubes, in peg steps
_WORLD = np.eye(3)


def peg_places(mesh: Mesh, rows: Array, diagonal: float) -> list[tuple[Array, Array]]:
    """(centre, outward unit vector) of each peg along held nodes, spread by at least ``PEG_STEP``.

    Of a held area only the outline gets pegs. Held nodes are thinned by farthest-point selection, so that corners
    and ends of an edge get their peg first and the rest fall evenly between. A peg stands square on held faces of
    solids; else on the side of the held nodes where no cell is, found from the cells around; a line held within a
    sheet has none, and its pegs all sit on the sheet's lower side.
    """
    rows = np.unique(np.asarray(rows, np.int64))
    outline, normals = _held_faces(mesh, rows)
    if len(rows) > _MANY:
        grid = np.floor(mesh.points[rows] / (_GRAIN * PEG_STEP * diagonal)).astype(np.int64)
        some = np.sort(np.unique(np.column_stack([grid, outline]), axis=0, return_index=True)[1])
        rows, outline, normals = rows[some], outline[some], normals[some]
    size, held = PEG * diagonal, mesh.points[rows]
    corner = _cornered(held, PEG_STEP * diagonal)
    inward, count = _inward(mesh, rows)
    centres: list[Array] = []
    found = []
    edge = np.nonzero(outline)[0]
    for k in edge[spread(held[edge], PEG_STEP * diagonal, favour=corner[edge])]:
        near = np.linalg.norm(held - held[k], axis=1) <= 1.2 * size
        at = _middle_of_thickness(held, k, 0.5 * size)
        outward = normals[near].sum(axis=0)
        if np.linalg.norm(outward) <= _ONE_SIDED * np.linalg.norm(normals[near], axis=1).sum():
            outward = -inward[near].sum(axis=0)
        if not normals[near].any() and np.linalg.norm(outward) < _ONE_SIDED * max(float(count[near].sum()), 1e-300):
            outward = _lower_side(mesh, rows[near])
        outward = outward / np.linalg.norm(outward)
        centre = at + (0.5 - PEG_BITE) * size * outward
        if all(np.linalg.norm(centre - other) >= 1.05 * size for other in centres):
            centres.append(centre)
            found.append((centre, outward))
    return found


def spread(points: Array, step: float, most: int = 160, favour: Array | None = None) -> list[int]:
    """Rows of ``points`` chosen one by one, each the farthest from those before, until all lie within ``step``.

    The first is the farthest from the centroid; ties go to the lower row (differences below 1e-9 of the extent
    count as ties, so that rounding does not choose). Distances are stretched by 1 + ``favour`` (n,) when given."""
    if len(points) == 0:
        return []
    grain = 1e-9 * max(float(np.ptp(points, axis=0).max()), 1e-300)
    stretch = np.ones(len(points)) if favour is None else 1 + favour
    distance = np.linalg.norm(points - points.mean(axis=0), axis=1)
    chosen = [int(np.argmax(np.round(distance * stretch / grain)))]
    distance = np.linalg.norm(points - points[chosen[0]], axis=1)
    while len(chosen) < most and distance.max() >= step:
        chosen.append(int(np.argmax(np.round(distance * stretch / grain) * (distance >= step))))
        distance = np.minimum(distance, np.linalg.norm(points - points[chosen[-1]], axis=1))
    return chosen


def _held_faces(mesh: Mesh, rows: Array) -> tuple[Array, Array]:
    """By held node: whether it is on the outline of the held faces, or on none of them (then it is its own outline);
    and the sum (n, 3) of the outward normals of the held faces of solids around it, m²."""
    held = np.zeros(mesh.n_nodes, bool)
    held[rows] = True
    skin = mesh.skin
    mine = held[skin.faces].all(axis=1)
    faces = skin.faces[mine]
    sides = np.sort(faces[:, [[0, 1], [1, 2], [2, 0]]].reshape(-1, 2), axis=1)
    pairs, beside = np.unique(sides, axis=0, return_counts=True)
    inner = np.zeros(mesh.n_nodes, bool)
    if len(faces):
        inner |= ~np.isin(np.arange(mesh.n_nodes), skin.nodes)  # nodes within a solid
        inner[faces] = True
        inner[pairs[beside == 1]] = False
    outline = ~inner[rows]
    solid = np.zeros(mesh.n_cells, bool)
    for block, start in zip(mesh.blocks, mesh.block_starts[:-1], strict=True):
        solid[start : start + len(block)] = KINDS[block.kind].dim == 3
    of_solids = faces[solid[skin.cell[mine]]]
    normals = np.zeros((mesh.n_nodes, 3))
    for corner in of_solids.T:
        np.add.at(normals, corner, cross_of(mesh.points, of_solids))
    return outline if outline.any() else ~outline, normals[rows]


def _cornered(points: Array, reach: float) -> Array:
    """(n,) distance from the middle of those within ``reach``, or further where points are few, in ``reach``: 0 along
    a straight line, about ⅓ at a right angle, ½ at an end."""
    n = len(points)
    tree = cKDTree(points)
    if n > _FEW:
        reach = max(reach, 1.5 * float(np.median(tree.query(points, [_FEW + 1])[0])))
    pairs = tree.query_pairs(reach, output_type="ndarray")
    a, b = np.concatenate([pairs, pairs[:, ::-1]]).T
    away = points[b] - points[a]
    count = 1 + np.bincount(a, minlength=n)  # the point itself is one of those around
    total = np.stack([np.bincount(a, part, n) for part in away.T], axis=1)
    return np.linalg.norm(total / count[:, None], axis=1) / reach


def _inward(mesh: Mesh, rows: Array) -> tuple[Array, Array]:
    """By held node: the sum of vectors from the held nodes of each cell around to that cell's middle, and the sum of
    their lengths. Cells whose nodes are all held say nothing about the side where the body is."""
    place = np.full(mesh.n_nodes, -1, np.int64)
    place[rows] = np.arange(len(rows))
    total, lengths = np.zeros((len(rows), 3)), np.zeros(len(rows))
    for block in mesh.blocks:
        at = place[block.nodes]
        some = (at >= 0).any(axis=1) & (at < 0).any(axis=1)
        at, xyz = at[some], mesh.points[block.nodes[some]]
        held = at >= 0
        middle = (xyz * held[..., None]).sum(axis=1) / held.sum(axis=1, keepdims=True)
        vector = xyz.mean(axis=1) - middle
        cell, corner = np.nonzero(held)
        np.add.at(total, at[cell, corner], vector[cell])
        np.add.at(lengths, at[cell, corner], np.linalg.norm(vector, axis=1)[cell])
    return total, lengths


def _middle_of_thickness(held: Array, k: int, reach: float) -> Array:
    """Mean of the held nodes around node ``k``: the middle of a wall several nodes thick."""
    return held[np.linalg.norm(held - held[k], axis=1) <= reach].mean(axis=0)


def _lower_side(mesh: Mesh, rows: Array) -> Array:
    """Unit normal of the sheet around ``rows`` that points down (or, for an upright sheet, to lower x, y)."""
    around = [b.nodes[np.isin(b.nodes, rows).any(axis=1)].ravel() for b in mesh.blocks]
    points = mesh.points[np.unique(np.concatenate([*around, rows]))]
    _, spreads, axes = np.linalg.svd(points - points.mean(axis=0), full_matrices=True)
    normal = axes[2] if len(points) > 2 and spreads[1] > 1e-9 * max(spreads[0], 1e-300) else -_WORLD[2]
    weight = normal @ np.array([1e-6, 1e-3, 1.0])
    return -normal if weight > 0 else normal


def pegs(places: Sequence[tuple[Array, Array]], size: float) -> Piece:
    corners = np.array([[x, y, z] for z in (-1, 1) for y in (-1, 1) for x in (-1, 1)]) * (size / 2)
    faces = np.array([[0, 2, 3, 1], [4, 5, 7, 6], [0, 1, 5, 4], [2, 6, 7, 3], [0, 4, 6, 2], [1, 3, 7, 5]])
    edges = np.array([[0, 1], [2, 3], [4, 5], [6, 7], [0, 2], [1, 3], [4, 6], [5, 7], [0, 4], [1, 5], [2, 6], [3, 7]])
    triangles = np.concatenate([faces[:, [0, 1, 2]], faces[:, [0, 2, 3]]])
    points = np.concatenate([centre + corners @ axes(outward) for centre, outward in places])
    shift = 8 * np.arange(len(places))[:, None, None]
    return Piece(
        points,
        np.zeros_like(points),
        (triangles + shift).reshape(-1, 3),
        (edges + shift).reshape(-1, 2),
        "mass",
        "body_edge",
        1.0,
    )
