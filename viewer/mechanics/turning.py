"""How far each cell turns: the rotation of its best rigid motion."""

from __future__ import annotations

import numpy as np

from viewer.model.arrays import Array
from viewer.model.mesh import Mesh


def cell_rotations(mesh: Mesh, shape: Array) -> Array:
    """(n_cells, 3) small rotation, rad per unit of ``shape`` (n_nodes, 3, real or complex), of every cell.

    Least squares over the cell's nodes with equal weights about their centroid: J ω = Σ r × u with
    J = Σ(|r|² I − r rᵀ). A cell whose nodes lie on one line has no rotation about that line: taken as zero.
    """
    turned = np.zeros((mesh.n_cells, 3), shape.dtype)
    for block, start in zip(mesh.blocks, mesh.block_starts[:-1], strict=True):
        if block.nodes.shape[1] < 2:
            continue
        points = mesh.points[block.nodes]
        arm = points - points.mean(axis=1, keepdims=True)
        move = shape[block.nodes]
        square = np.einsum("bni,bni->b", arm, arm)
        inertia = square[:, None, None] * np.eye(3) - np.einsum("bni,bnj->bij", arm, arm)
        moment = np.cross(arm, move).sum(axis=1)
        turned[start : start + len(block)] = np.einsum(
            "bij,bj->bi", np.linalg.pinv(inertia, rcond=1e-10, hermitian=True), moment
        )
    return turned
