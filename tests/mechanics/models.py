"""Small designs shared by the tests of mechanics."""

from __future__ import annotations

import numpy as np

from viewer.model.design import Assignment, Design, Material, Physics, Selector, Support
from viewer.model.mesh import CellBlock, Mesh

STEEL = Material("steel", 200e9, 0.3, 8000.0)
CLAMP = Support("root", Selector(group="x0"))


def design(mesh, *, formulation="", thickness=None, material=STEEL, **physics):
    """A design of one material on every cell."""
    return Design(
        "test",
        mesh,
        Physics(
            materials={material.name: material},
            assignments=(Assignment("*", material.name, thickness, formulation),),
            **physics,
        ),
    )


def lone_nodes(count):
    """A mesh of nodes along x, 1 m apart, without a cell."""
    points = np.zeros((count, 3))
    points[:, 0] = np.arange(count)
    return Mesh(points, (), np.arange(1, count + 1))


def merged(first: Mesh, second: Mesh) -> Mesh:
    """Two meshes on the same points: the second's blocks after the first's."""
    ids = np.arange(1, first.n_cells + second.n_cells + 1)
    blocks, at = [], 0
    for block in (*first.blocks, *second.blocks):
        blocks.append(CellBlock(block.kind, block.nodes, ids[at : at + len(block)]))
        at += len(block)
    return first.with_(blocks=tuple(blocks))
