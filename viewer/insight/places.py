"""Places of a body: connected patches of cells about the extremes of a field, and words for where they are."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import floor, log10

import numpy as np
import scipy.sparse as sp
from scipy.sparse.csgraph import connected_components

from viewer.model.arrays import Array, frozen
from viewer.model.mesh import Mesh

# The peak of a field is not one cell at a corner: it is the level that so much of the mass reaches, or above which so
# much of the whole effect lies, whichever is higher (a narrow neck may hold much of the effect and hardly any mass).
PEAK_MASS, PEAK_EFFECT = 0.01, 0.1
EDGE = 0.5  # of the peak: a patch ends where the field falls below
WORTH = 0.1  # of the strongest patch's effect, below which a patch is not named
ALIKE = 0.05  # relative difference of effect and weight up to which two patches are taken for mirrored halves
WHOLE_BODY = 0.6  # share of the body from which on a group is no place
_INSIDE = 0.7  # share of a patch from which on a group says where it is
_PART = 0.2  # share of a patch from which on a group that it reaches into is named
_FILLS = 0.7  # share of a group that a patch must fill for the group alone to say where it is


@dataclass(frozen=True, eq=False)
class Patch:
    """Cells about an extreme: ``cells`` rows, ``name`` in words, ``position`` (3,) m of the cell nearest the centre
    of its largest connected piece."""

    cells: Array
    name: str
    position: Array

    def __post_init__(self) -> None:
        object.__setattr__(self, "cells", frozen(self.cells, np.int64))
        object.__setattr__(self, "position", frozen(self.position, np.float64, shape=(3,)))


def peak_patches(mesh: Mesh, field: Array, weights: Array, limit: int = 3) -> list[Patch]:
    """The patches where ``field`` (n_cells,) is largest above zero, those of most effect Σ field × weight first.

    weights  (n_cells,) ≥ 0, masses or volumes; cells without weight, or where the field is not finite, take no part
    A patch holds the connected cells that reach half of the peak; those in the same groups, and mirrored halves, are
    one. At most ``limit``.
    """
    usable = (weights > 0) & np.isfinite(field)
    height = np.where(usable, field, 0.0)
    peak = _peak(height, np.where(usable, weights, 0.0))
    if not peak > 0:
        return []
    centres = cell_centres(mesh)
    bundles: list[list[_Piece]] = []
    for piece in _pieces(mesh, height, weights, EDGE * peak):
        like = [bundle for bundle in bundles if bundle[0].like(piece)]
        if like:
            like[0].append(piece)
        else:
            bundles.append([piece])
    bundles.sort(key=lambda bundle: -sum(piece.effect for piece in bundle))
    return [_patch(mesh, bundle, weights, centres) for bundle in bundles[:limit]]


@dataclass(frozen=True, eq=False)
class _Piece:
    """Connected cells, their Σ field × weight and Σ weight, and the groups that say where they are."""

    cells: Array
    effect: float
    weight: float
    groups: tuple[str, ...]

    def like(self, other: _Piece) -> bool:
        """Whether two pieces are one place: in the same groups, or as like as mirrored halves are."""
        alike = abs(self.effect - other.effect) <= ALIKE * self.effect
        return (self.groups == other.groups != ()) or (
            alike and abs(self.weight - other.weight) <= ALIKE * self.weight
        )


def cell_centres(mesh: Mesh) -> Array:
    """(n_cells, 3) m, mean of each cell's nodes."""
    return np.concatenate([mesh.points[block.nodes].mean(axis=1) for block in mesh.blocks] or [np.empty((0, 3))])


def _peak(height: Array, weights: Array) -> float:
    order = np.argsort(-height)
    levels = [0.0]
    for share, amounts in ((PEAK_MASS, weights), (PEAK_EFFECT, np.maximum(height, 0.0) * weights)):
        reached = np.cumsum(amounts[order])
        if len(order) and reached[-1] > 0:
            levels.append(float(height[order[np.searchsorted(reached, share * reached[-1])]]))
    return max(levels)


def _pieces(mesh: Mesh, height: Array, weights: Array, edge: float) -> list[_Piece]:
    """Connected pieces of the cells that reach ``edge``, those of most effect first and of little effect left out;
    cells are neighbours when they share a node."""
    cells = np.nonzero((height >= edge) & (weights > 0))[0]
    place = np.full(mesh.n_cells, -1)
    place[cells] = np.arange(len(cells))
    rows, nodes = [], []
    for block, start in zip(mesh.blocks, mesh.block_starts[:-1], strict=True):
        here = place[start : start + len(block)]
        picked = block.nodes[here >= 0]
        rows.append(np.repeat(here[here >= 0], picked.shape[1]))
        nodes.append(picked.ravel())
    row, node = np.concatenate(rows), np.concatenate(nodes)
    touch = sp.csr_array((np.ones(len(row)), (row, node)), shape=(len(cells), mesh.n_nodes))
    count, label = connected_components(touch @ touch.T, directed=False)
    effect = np.bincount(label, height[cells] * weights[cells], minlength=count)
    named = [i for i in np.argsort(-effect, kind="stable") if effect[i] >= WORTH * effect.max()]
    parts = [cells[label == i] for i in named]
    return [
        _Piece(part, float(effect[i]), float(weights[part].sum()), _groups_of(mesh, part, weights))
        for i, part in zip(named, parts, strict=True)
    ]


def place_of(mesh: Mesh, cells: Array, weights: Array) -> str:
    """Words for where ``cells`` (rows) are: the groups that say so, else a position. ``weights`` (n_cells,) ≥ 0."""
    if not weights[cells].sum() > 0:
        return ""
    groups = _groups_of(mesh, cells, weights)
    if groups:
        return _listed(groups)
    centres = cell_centres(mesh)
    return f"{_coordinates(centres[nearest_cell(cells, weights, centres)], mesh.diagonal)} mm"


def _groups_of(mesh: Mesh, cells: Array, weights: Array) -> tuple[str, ...]:
    """The smallest group that holds nearly all of these cells, else those into which they reach."""
    whole, own = weights.sum(), weights[cells].sum()
    inside = np.zeros(mesh.n_cells, bool)
    inside[cells] = True
    shares = {
        name: (weights[rows[inside[rows]]].sum() / own, weights[rows].sum())
        for name, rows in mesh.cell_groups.items()
        if 0 < weights[rows].sum() <= WHOLE_BODY * whole
    }
    holding = [name for name, (share, _) in shares.items() if share >= _INSIDE]
    if holding:
        return (min(holding, key=lambda name: shares[name][1]),)
    reached = [name for name, (share, _) in shares.items() if share >= _PART]
    return tuple(sorted(reached, key=lambda name: -shares[name][0])[:3])


def _patch(mesh: Mesh, pieces: Sequence[_Piece], weights: Array, centres: Array) -> Patch:
    middles = [centres[nearest_cell(piece.cells, weights, centres)] for piece in pieces]
    groups = tuple(dict.fromkeys(name for piece in pieces for name in piece.groups))
    cells = np.sort(np.concatenate([piece.cells for piece in pieces]))
    return Patch(cells, _place_words(mesh, cells, groups, weights, middles), middles[0])


def nearest_cell(cells: Array, weights: Array, centres: Array) -> int:
    """The one of ``cells`` nearest their centre of mass, which itself may lie beside a bent sheet."""
    mean = np.average(centres[cells], axis=0, weights=weights[cells])
    return int(cells[np.argmin(np.linalg.norm(centres[cells] - mean, axis=1))])


def _place_words(mesh: Mesh, cells: Array, groups: tuple[str, ...], weights: Array, middles: Sequence[Array]) -> str:
    """Where these cells are: "flap"; "part of top and floor near (120, −40, 0) mm"; "the region near (…) mm"."""
    inside = np.zeros(mesh.n_cells, bool)
    inside[cells] = True
    members = [mesh.cell_groups[name] for name in groups]
    if groups and all(weights[rows[inside[rows]]].sum() >= _FILLS * weights[rows].sum() for rows in members):
        return _listed(groups)
    points = [_coordinates(middle, mesh.diagonal) for middle in middles]
    where = f"near {_listed(points)} mm"
    if len(points) > 2:
        where = f"at {len(points)} spots, the largest near {points[0]} mm"
    return f"part of {_listed(groups)} {where}" if groups else f"the region {where}"


def _coordinates(point: Array, size: float) -> str:
    """Millimetres, to about a thousandth of the body's ``size``."""
    places = max(0, -floor(log10(2e3 * size / 1e3)))
    numbers = [f"{1e3 * value:.{places}f}" for value in point]
    return "({})".format(", ".join("0" if float(n) == 0 else n.replace("-", "−") for n in numbers))


def _listed(words: Sequence[str]) -> str:
    return words[0] if len(words) == 1 else f"{', '.join(words[:-1])} and {words[-1]}"
