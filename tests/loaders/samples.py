"""Meshes and mode sets to write and read: every awkwardness in a small space."""

from __future__ import annotations

import numpy as np

from viewer.cells import KINDS
from viewer.errors import LoadError
from viewer.loaders import read_mesh, read_modes
from viewer.model.mesh import CellBlock, Mesh
from viewer.model.modes import ArrayShapes, ModeSet


def grid_points() -> np.ndarray:
    """(16, 3) corners of three unit cubes in a row."""
    return np.array([[x, y, z] for z in (0, 1) for y in (0, 1) for x in range(4)], float)


def cube_rows() -> np.ndarray:
    """(3, 8) node rows of the cubes, VTK order."""
    n = lambda x, y, z: z * 8 + y * 4 + x  # noqa: E731
    return np.array(
        [
            [
                n(i, 0, 0),
                n(i + 1, 0, 0),
                n(i + 1, 1, 0),
                n(i, 1, 0),
                n(i, 0, 1),
                n(i + 1, 0, 1),
                n(i + 1, 1, 1),
                n(i, 1, 1),
            ]
            for i in range(3)
        ]
    )


END_QUAD = np.array([[0, 4, 12, 8]])  # the face x = 0


def make_mesh() -> Mesh:
    """Two blocks of one kind with another between, ids out of order, names that need care."""
    cubes, top = cube_rows(), np.array([[8, 9, 13, 12]])
    blocks = (CellBlock("hex8", cubes[:2], [7, 5]), CellBlock("quad4", top, [100]), CellBlock("hex8", cubes[2:], [1]))
    return Mesh(
        grid_points() * 0.1 + 0.05,
        blocks,
        np.arange(16)[::-1] * 10 + 3,
        {"root": [0, 4, 8, 12], 'tip <"ä&%"> 1/2': [3]},
        {"all": [0, 1, 2, 3], "skin.top": [2], "none": []},
    )


def make_modes(mesh: Mesh, *, is_complex: bool = False, rotations: bool = False, damping: bool = True) -> ModeSet:
    """Four modes, two of them at one frequency."""
    rng = np.random.default_rng(20240501)
    shape = (4, mesh.n_nodes, 3)

    def draw() -> np.ndarray:
        return rng.normal(size=shape) + (1j * rng.normal(size=shape) if is_complex else 0)

    return ModeSet(
        mesh.node_ids,
        [11.0, 42.5, 42.5, 1 / 3],
        ArrayShapes(draw(), draw() if rotations else None),
        np.array([0.01, 0.0, 0.02, 1e-17]) if damping else None,
        "mass",
    )


def one_of_each_kind() -> Mesh:
    """One cell of every kind, side by side, on their reference nodes."""
    points, blocks, start = [], [], 0
    for number, (name, kind) in enumerate(KINDS.items()):
        xyz = np.zeros((kind.n_nodes, 3))
        xyz[:, : kind.dim] = kind.reference
        points.append(xyz + np.array([3.0 * number, 0, 0]))
        blocks.append(CellBlock(name, np.arange(start, start + kind.n_nodes)[None], [number + 1]))
        start += kind.n_nodes
    return Mesh(np.concatenate(points), tuple(blocks), np.arange(1, start + 1))


def assert_same_mesh(a: Mesh, b: Mesh) -> None:
    assert np.array_equal(a.points, b.points)
    assert np.array_equal(a.node_ids, b.node_ids)
    assert [block.kind for block in a.blocks] == [block.kind for block in b.blocks]
    for left, right in zip(a.blocks, b.blocks, strict=True):
        assert np.array_equal(left.nodes, right.nodes)
        assert np.array_equal(left.ids, right.ids)
    for left, right in ((a.node_groups, b.node_groups), (a.cell_groups, b.cell_groups)):
        assert list(left) == list(right)
        assert all(np.array_equal(left[name], right[name]) for name in left)


def assert_same_modes(a: ModeSet, b: ModeSet) -> None:
    assert np.array_equal(a.node_ids, b.node_ids)
    assert np.array_equal(a.freq_hz, b.freq_hz)
    assert (a.damping is None) == (b.damping is None)
    assert a.damping is None or np.array_equal(a.damping, b.damping)
    assert a.normalisation == b.normalisation
    assert a.count == b.count
    assert a.is_complex == b.is_complex
    assert a.shapes.has_rotations == b.shapes.has_rotations
    for i in range(a.count):
        assert b.shape(i).dtype == a.shape(i).dtype
        assert np.array_equal(a.shape(i), b.shape(i))
        assert not b.shape(i).flags.writeable
        if a.shapes.has_rotations:
            assert np.array_equal(a.rotations(i), b.rotations(i))


def read_all(path, mesh):
    """Everything that a file offers, to the last number."""
    found = read_mesh(path)
    modes = read_modes(path, mesh)
    return found, modes, [modes.shape(i) for i in range(modes.count)]


def clear(error: LoadError, path, foreseen: bool = True) -> None:
    text = str(error)
    assert not foreseen or "cannot be read; found" not in text, "a check of ours speaks, not a failure deep inside"
    assert path.parent.name in text, "names the file"
    assert "Traceback" not in text
    assert "\n" not in text
    assert len(text) < 1000
