"""Small structured meshes for tests: boxes of every solid kind, plates of every surface kind.

Distortion moves the inner nodes of the corner mesh only, so that sides stay flat, edges straight (mid-side nodes
are means of their corners) and the groups on the sides whole.
"""

from __future__ import annotations

import numpy as np

from viewer.cells import KINDS
from viewer.model.mesh import CellBlock, Mesh

# Corner cells of a unit brick whose corners are numbered as in hex8 (8: its centre).
SPLITS = {
    "hex": ((0, 1, 2, 3, 4, 5, 6, 7),),
    "wedge": ((0, 1, 2, 4, 5, 6), (0, 2, 3, 4, 6, 7)),
    "tet": ((0, 1, 2, 6), (0, 2, 3, 6), (0, 3, 7, 6), (0, 7, 4, 6), (0, 4, 5, 6), (0, 5, 1, 6)),
    "pyramid": ((0, 1, 2, 3, 8), (7, 6, 5, 4, 8), (4, 5, 1, 0, 8), (5, 6, 2, 1, 8), (6, 7, 3, 2, 8), (7, 4, 0, 3, 8)),
    "quad": ((0, 1, 2, 3),),
    "tri": ((0, 1, 2), (0, 2, 3)),
}


def box_mesh(kind: str, counts, size, distort: float = 0.0, seed: int = 0) -> Mesh:
    """A box from the origin to ``size`` (3,) of ``counts`` (3,) bricks, each cut into cells of the solid ``kind``.

    ``distort`` moves inner corner nodes by up to that share of the spacing. Node groups x0 x1 y0 y1 z0 z1 (sides).
    """
    return _structured(kind, tuple(counts), np.asarray(size, float), distort, seed)


def plate_mesh(kind: str, counts, size, distort: float = 0.0, seed: int = 0) -> Mesh:
    """A plate in the plane z = 0 from the origin to ``size`` (2,), of ``counts`` (2,) cells of the surface ``kind``
    (two triangles a square). Node groups x0 x1 y0 y1 (edges)."""
    return _structured(kind, tuple(counts), np.asarray(size, float), distort, seed)


def distorted_cells(kind: str, count: int = 6, amount: float = 0.15, curved: bool = True, seed: int = 0):
    """(count, n, 3) single solid cells: the reference cell turned, stretched and with every node moved.

    ``curved`` moves mid-side nodes on their own, otherwise only corners move and edges stay straight.
    """
    cell, random = KINDS[kind], np.random.default_rng(seed)
    out = np.empty((count, cell.n_nodes, 3))
    for row in out:
        turn, _ = np.linalg.qr(random.normal(size=(3, 3)))
        turn *= np.sign(np.linalg.det(turn))
        moved = cell.reference + 2 * amount * (random.random((cell.n_nodes, 3)) - 0.5) * (0.3 if curved else 1.0)
        if not curved:
            moved = _means(cell) @ moved[: cell.n_corners]
        row[:] = (moved * (1 + random.random(3))) @ turn + random.normal(size=3)
    return out


def _structured(kind: str, counts: tuple[int, ...], size: np.ndarray, distort: float, seed: int) -> Mesh:
    cell, dim = KINDS[kind], len(counts)
    if cell.dim != dim:
        raise ValueError(f"{kind} has {cell.dim} dimensions, counts {dim}")
    grid = np.stack(np.meshgrid(*[np.arange(n + 1) for n in counts], indexing="ij"), axis=-1).reshape(-1, dim)
    inner = ((grid > 0) & (grid < counts)).all(axis=1)
    spacing = size / np.array(counts)
    points = grid * spacing
    points[inner] += distort * spacing * (2 * np.random.default_rng(seed).random((inner.sum(), dim)) - 1)
    number = np.arange(len(grid)).reshape([n + 1 for n in counts])
    first = np.stack(np.meshgrid(*[np.arange(n) for n in counts], indexing="ij"), axis=-1).reshape(-1, dim)
    brick = ((KINDS["hex8" if dim == 3 else "quad4"].reference + 1) / 2).astype(int)
    bricks = number[tuple((first[:, None] + brick).transpose(2, 0, 1))]
    if cell.family == "pyramid":
        bricks = np.hstack([bricks, np.arange(len(points), len(points) + len(bricks))[:, None]])
        points = np.vstack([points, points[bricks[:, :-1]].mean(axis=1)])
    corners = bricks[:, np.array(SPLITS[cell.family])].reshape(-1, cell.n_corners)
    points, nodes = elevate(cell, points, corners)
    groups = {}
    for axis, name in zip(range(dim), "xyz", strict=False):
        for end, value in enumerate((0.0, size[axis])):
            groups[f"{name}{end}"] = np.nonzero(np.abs(points[:, axis] - value) < 1e-9 * size[axis])[0]
    return Mesh(
        np.pad(points, ((0, 0), (0, 3 - dim))),
        (CellBlock(kind, nodes, np.arange(1, len(nodes) + 1)),),
        node_ids=np.arange(1, len(points) + 1),
        node_groups=groups,
        cell_groups={"all": np.arange(len(nodes))},
        source=f"box of {kind}",
    )


def _means(cell) -> np.ndarray:
    """(n, corners) weights that put every node at the mean of the corners it stands between."""
    linear = next(k for k in KINDS.values() if k.family == cell.family)
    weights = linear.shape(cell.reference)
    return weights / weights.sum(axis=1, keepdims=True)


def elevate(cell, points: np.ndarray, corners: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Add the mid-side and centre nodes of ``cell``, shared between neighbours."""
    columns = [corners[:, i] for i in range(cell.n_corners)]
    for weights in _means(cell)[cell.n_corners :]:
        members = np.nonzero(weights > 1e-9)[0]
        columns.append(np.sort(corners[:, members], axis=1))
    fresh = [c for c in columns if c.ndim == 2]
    nodes = np.empty((len(corners), cell.n_nodes), np.int64)
    nodes[:, : cell.n_corners] = corners
    for width in sorted({c.shape[1] for c in fresh}):
        which = [i for i, c in enumerate(columns) if c.ndim == 2 and c.shape[1] == width]
        unique, inverse = np.unique(np.concatenate([columns[i] for i in which]), axis=0, return_inverse=True)
        nodes[:, which] = len(points) + inverse.reshape(len(which), -1).T
        points = np.vstack([points, points[unique].mean(axis=1)])
    return points, nodes


def line_mesh(points, pairs=None) -> Mesh:
    """Beams of two nodes along the rows of ``points`` (n, 3), or between ``pairs`` of them. Groups x0 and x1: the
    first and the last point."""
    points = np.asarray(points, float)
    nodes = np.stack([np.arange(len(points) - 1), np.arange(1, len(points))], axis=1) if pairs is None else pairs
    return Mesh(
        points,
        (CellBlock("line2", nodes, np.arange(1, len(nodes) + 1)),),
        np.arange(1, len(points) + 1),
        node_groups={"x0": np.array([0]), "x1": np.array([len(points) - 1])},
        source="lines",
    )
