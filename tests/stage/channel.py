"""An invented part for drawing tests: a folded channel with a window, nodding and twisting as formulas say."""

from __future__ import annotations

import numpy as np

from viewer.model.mesh import CellBlock, Mesh
from viewer.scene.picture import Body, Note, Picture

LENGTH, WIDTH, FLANGE = 0.6, 0.11, 0.075


def channel(along: int = 48, across: int = 8, down: int = 6, window: float = 0.035) -> Mesh:
    """Shell of quad4: web in z = 0, two flanges below; ``window`` is the half width of the hole in the web, m."""
    x = np.linspace(0, LENGTH, along + 1)
    run = np.concatenate(
        [
            np.linspace(-FLANGE, 0, down + 1),
            np.linspace(0, WIDTH, across + 1)[1:],
            np.linspace(WIDTH, WIDTH + FLANGE, down + 1)[1:],
        ]
    )
    y = np.clip(run, 0, WIDTH)
    z = np.where(run < 0, run, np.where(run > WIDTH, WIDTH - run, 0.0))
    points = np.stack([np.repeat(x, len(run)), np.tile(y, len(x)), np.tile(z, len(x))], axis=1)
    i, j = np.meshgrid(np.arange(along), np.arange(len(run) - 1), indexing="ij")
    n = len(run)
    quads = np.stack([i * n + j, (i + 1) * n + j, (i + 1) * n + j + 1, i * n + j + 1], axis=-1).reshape(-1, 4)
    middle = points[quads].mean(axis=1)
    hole = (np.abs(middle[:, 0] - 0.18) < 0.05) & (np.abs(middle[:, 1] - WIDTH / 2) < window) & (middle[:, 2] > -1e-9)
    quads = quads[~hole]
    return Mesh(points, (CellBlock("quad4", quads, np.arange(len(quads))),), np.arange(len(points)))


def nod(mesh: Mesh, twist: float = 0.25) -> np.ndarray:
    """(n, 3) a fold about x = 0.18 m with a twist beyond it, unit free."""
    x, y, z = mesh.points.T
    soft = 0.02 * np.log1p(np.exp((x - 0.18) / 0.02))
    turn = 1 / (1 + np.exp(-(x - 0.18) / 0.02))
    angle = twist * 3 * (x / LENGTH) ** 2
    return np.stack([2 * turn * z, -angle * z, -2 * soft + angle * (y - WIDTH / 2)], axis=1)


def fold_density(mesh: Mesh) -> np.ndarray:
    """(n_cells,) an invented density ÷ mean, high at the fold."""
    middle = np.concatenate([mesh.points[block.nodes].mean(axis=1) for block in mesh.blocks])
    value = 0.1 + 10 * np.exp(-(((middle[:, 0] - 0.18) / 0.04) ** 2)) + (1 - middle[:, 0] / LENGTH) ** 2
    return value / value.mean()


def body(mesh: Mesh | None = None, name: str = "baseline", share: float = 0.08, **changes) -> Body:
    """The channel, its peak drawn at ``share`` of the diagonal."""
    mesh = channel() if mesh is None else mesh
    shape = changes.pop("shape", None)
    shape = nod(mesh) if shape is None else shape
    factor = share * mesh.diagonal / np.linalg.norm(np.abs(shape), axis=1).max()
    return Body(name, mesh, shape, factor, 84.6, **{"density": fold_density(mesh), **changes})


NOTE = Note("Mode 1 · nods at the window", "84.6 Hz", ("size arbitrary, peak drawn at 8 % of the diagonal",))


def picture(*bodies: Body, **changes) -> Picture:
    """A small picture (480 × 360) of the channel, or of the given bodies."""
    settings = {"energy_top": 9.0, "width": 480, "height": 360, **changes}
    return Picture(bodies or (body(),), NOTE, **settings)
