"""Designs as somebody else would have them: solid, sheet and mixed parts with a lumped mass and a spring, on meshes
whose node ids are neither consecutive nor in order."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from tests.meshes import box_mesh
from viewer.cells import KINDS
from viewer.model.design import Assignment, Design, LumpedMass, Material, Physics, Selector, Spring, Support
from viewer.model.mesh import CellBlock, Mesh
from viewer.model.modes import ArrayShapes, ModeSet

STEEL = Material("steel", 205e9, 0.3, 7850.0)


def scattered_ids(mesh: Mesh, seed: int = 1) -> Mesh:
    """The same mesh with node ids that are neither consecutive nor in order."""
    ids = 7 + 3 * np.random.default_rng(seed).permutation(mesh.n_nodes)
    return mesh.with_(node_ids=ids)


def kept(mesh: Mesh, keep) -> Mesh:
    """The cells of a one-block mesh whose centre ``keep(x, y, z)`` accepts, on the nodes they use."""
    (block,) = mesh.blocks
    nodes = block.nodes[keep(*mesh.points[block.nodes].mean(axis=1).T)]
    used, nodes = np.unique(nodes, return_inverse=True)
    groups = {name: np.nonzero(np.isin(used, rows))[0] for name, rows in mesh.node_groups.items()}
    nodes = nodes.reshape(-1, block.nodes.shape[1])
    return Mesh(
        mesh.points[used],
        (CellBlock(block.kind, nodes, np.arange(1, len(nodes) + 1)),),
        np.arange(1, len(used) + 1),
        groups,
        {"all": np.arange(len(nodes))},
    )


def design(name: str, mesh: Mesh, root: str, tip: str, *, thickness: float | None = None, **more) -> Design:
    """Steel, held at ``root``, with a mass of 0.3 kg ahead of ``tip`` and a spring to ground under it."""
    ahead = mesh.points[mesh.node_groups[tip]].mean(axis=0) + np.array([0.02, 0.01, 0.03])
    return Design(
        name,
        mesh,
        Physics(
            {STEEL.name: STEEL},
            (Assignment("*", STEEL.name, thickness), *more.pop("assignments", ())),
            supports=(Support("root", Selector(group=root)),),
            springs=(Spring("strut", Selector(group=tip), None, [0, 0, 2e4, 0, 0, 0]),),
            masses=(LumpedMass("head", Selector(group=tip), 0.3, ahead, np.diag([2e-4, 3e-4, 2e-4])),),
        ),
        **more,
    )


def bracket(kind: str) -> Design:
    """A solid angle bracket: a foot along x, held at its end, and an upright."""
    fine = 2 if KINDS[kind].n_nodes > 8 else 4
    whole = box_mesh(kind, (2 * fine, 2, 2 * fine), (0.2, 0.05, 0.2), 0.0)
    mesh = scattered_ids(kept(whole, lambda x, y, z: (z < 0.05) | (x > 0.15)))
    return design(f"{kind} bracket", mesh, "x0", "z1")


def channel(along: int = 12, length: float = 0.4, thickness: float = 0.002) -> Design:
    """A folded sheet channel, one flange of triangles, the rest of quadrilaterals: clamped at one end."""
    mesh, groups = channel_mesh(along, length)
    return design("channel", scattered_ids(mesh.with_(node_groups=groups)), "root", "tip", thickness=thickness)


def channel_mesh(along: int, length: float) -> tuple[Mesh, dict[str, np.ndarray]]:
    section = np.array([[0, 0.04], [0, 0.02], [0, 0], [0.03, 0], [0.06, 0], [0.06, 0.02], [0.06, 0.04]])
    x = np.linspace(0, length, along + 1)
    points = np.array([[s, y, z] for s in x for y, z in section])
    at = np.arange(len(points)).reshape(along + 1, len(section))
    quads = np.concatenate([_strip(at[:, j], at[:, j + 1]) for j in range(4)])
    flange = np.concatenate([_strip(at[:, j], at[:, j + 1]) for j in (4, 5)])
    triangles = np.concatenate([flange[:, [0, 1, 2]], flange[:, [0, 2, 3]]])
    blocks = (
        CellBlock("quad4", quads, np.arange(100, 100 + len(quads))),
        CellBlock("tri3", triangles, np.arange(1000, 1000 + len(triangles))),
    )
    rows = np.arange(len(quads), len(quads) + len(triangles))
    mesh = Mesh(points, blocks, np.arange(1, len(points) + 1), {}, {"far flange": rows})
    return mesh, {"root": at[0], "tip": at[-1]}


def block_with_plate(tip: str = "tip") -> Design:
    """A solid block whose upper side carries a sheet that reaches beyond it: shells and solids on shared nodes.

    ``tip`` "edge": the mass hangs on a line of nodes, so that it spins with the sheet's own rotations.
    """
    block = box_mesh("hex8", (4, 3, 2), (0.08, 0.06, 0.03))
    x, y = np.linspace(0, 0.24, 13), np.linspace(0, 0.06, 4)
    sheet = np.array([[a, b, 0.03] for a in x for b in y])
    points = np.vstack([block.points, sheet])
    _, first, where = np.unique(np.round(points, 9), axis=0, return_index=True, return_inverse=True)
    order = np.argsort(first, kind="stable")
    rank = np.empty_like(order)
    rank[order] = np.arange(len(order))
    row = rank[where.ravel()]
    at = row[len(block.points) :].reshape(13, 4)
    quads = np.concatenate([_strip(at[:, j], at[:, j + 1]) for j in range(3)])
    solids = row[block.blocks[0].nodes]
    points = points[first[order]]
    groups = {"root": np.nonzero(points[:, 2] < 1e-9)[0], "tip": at[-2:].ravel(), "edge": at[-1]}
    mesh = Mesh(
        points,
        (CellBlock("hex8", solids, np.arange(1, 25)), CellBlock("quad4", quads, np.arange(101, 137))),
        np.arange(1, len(points) + 1),
        groups,
        {},
    )
    sheets = (Assignment("quad4", STEEL.name, 0.003),)
    return design("block with plate", scattered_ids(mesh), "root", tip, assignments=sheets)


def _strip(left: np.ndarray, right: np.ndarray) -> np.ndarray:
    """Quadrilaterals between two rows of nodes."""
    return np.stack([left[:-1], left[1:], right[1:], right[:-1]], axis=1)


def without_rotations(modes: ModeSet, dtype=np.float64) -> ModeSet:
    """The mode set as most programs write it: translations alone, origin forgotten."""
    moved = np.stack([modes.shape(i) for i in range(modes.count)]).astype(dtype).astype(float)
    return ModeSet(modes.node_ids, modes.freq_hz, ArrayShapes(moved), normalisation=modes.normalisation)


def npz_by_hand(path: Path, mesh: Mesh, modes: ModeSet, rows=slice(None), dtype=np.float64) -> Path:
    """Modes of the nodes ``rows`` in the documented ``.npz`` layout, as ten lines of anybody's script write it."""
    moved = np.stack([modes.shape(i)[rows] for i in range(modes.count)]).astype(dtype)
    np.savez(path, modes=moved, freq_hz=modes.freq_hz, node_id=mesh.node_ids[rows])
    return path
