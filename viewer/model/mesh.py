"""The mesh: points, blocks of cells of one kind, external ids, groups."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from functools import cached_property

import numpy as np

from viewer.cells import Skin, skin
from viewer.model.arrays import Array, frozen, frozen_map


@dataclass(frozen=True, eq=False)
class CellBlock:
    """Cells of one kind.

    kind   name in ``viewer.cells`` ("hex8", "quad4", …)
    nodes  (n, nodes per cell) int64 rows of ``Mesh.points`` in VTK node order
    ids    (n,) int64 external element ids, never row numbers
    """

    kind: str
    nodes: Array
    ids: Array

    def __post_init__(self) -> None:
        object.__setattr__(self, "nodes", frozen(self.nodes, np.int64, shape=(None, None)))
        object.__setattr__(self, "ids", frozen(self.ids, np.int64, shape=(len(self.nodes),)))

    def __len__(self) -> int:
        return len(self.nodes)


@dataclass(frozen=True, eq=False)
class Mesh:
    """Points in metres and blocks of cells.

    A *cell row* counts through all blocks in order; every per-element array in the project is indexed by it.
    A *node row* indexes ``points``. Groups hold rows, external ids stay in ``node_ids`` and the blocks' ``ids``.
    """

    points: Array  # (n, 3) float64, m
    blocks: tuple[CellBlock, ...]
    node_ids: Array  # (n,) int64
    node_groups: Mapping[str, Array] = field(default_factory=dict)  # name -> node rows
    cell_groups: Mapping[str, Array] = field(default_factory=dict)  # name -> cell rows
    source: str = ""  # where it came from, for messages

    def __post_init__(self) -> None:
        put = lambda name, value: object.__setattr__(self, name, value)  # noqa: E731
        put("points", frozen(self.points, np.float64, shape=(None, 3)))
        put("blocks", tuple(self.blocks))
        put("node_ids", frozen(self.node_ids, np.int64, shape=(len(self.points),)))
        put("node_groups", frozen_map(self.node_groups, np.int64))
        put("cell_groups", frozen_map(self.cell_groups, np.int64))

    @property
    def n_nodes(self) -> int:
        return len(self.points)

    @property
    def n_cells(self) -> int:
        return sum(len(block) for block in self.blocks)

    @cached_property
    def block_starts(self) -> tuple[int, ...]:
        """First cell row of each block, and the number of cells at the end."""
        return tuple(int(n) for n in np.cumsum([0, *(len(block) for block in self.blocks)]))

    @cached_property
    def cell_ids(self) -> Array:
        """(n_cells,) external ids by cell row."""
        return frozen(np.concatenate([b.ids for b in self.blocks]) if self.blocks else np.empty(0, np.int64))

    @cached_property
    def diagonal(self) -> float:
        """Length of the diagonal of the bounding box, m: the size against which drawings are measured."""
        return float(np.linalg.norm(np.ptp(self.points, axis=0))) if self.n_nodes else 0.0

    @cached_property
    def used_nodes(self) -> Array:
        """Rows of nodes that some cell uses, ascending."""
        if not self.blocks:
            return frozen(np.empty(0, np.int64))
        used = np.zeros(self.n_nodes, bool)
        for block in self.blocks:
            used[block.nodes.ravel()] = True
        return frozen(np.flatnonzero(used))

    @cached_property
    def skin(self) -> Skin:
        """The drawable outside: outer faces of solids, surface cells, line cells."""
        return skin([(block.kind, block.nodes) for block in self.blocks])

    @cached_property
    def _row_of_id(self) -> dict[int, int]:
        return {int(i): row for row, i in enumerate(self.node_ids)}

    def node_rows(self, ids: Array) -> Array:
        """Rows of the given external node ids; ``KeyError`` names the first unknown id."""
        return np.array([self._row_of_id[int(i)] for i in np.atleast_1d(ids)], dtype=np.int64)

    def nodes_of_cells(self, cell_rows: Array) -> Array:
        """Ascending node rows that the given cells use."""
        picked = np.zeros(self.n_cells, bool)
        picked[cell_rows] = True
        used = np.zeros(self.n_nodes, bool)
        for block, start in zip(self.blocks, self.block_starts[:-1], strict=True):
            used[block.nodes[picked[start : start + len(block)]].ravel()] = True
        return np.flatnonzero(used)

    def with_(self, **changes) -> Mesh:
        """A copy with some fields replaced."""
        return replace(self, **changes)
