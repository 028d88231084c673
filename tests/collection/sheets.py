"""Parts described as a sheet: a rectangle in (s, t), cut, thinned, and placed in space; meshed as shell or solid.

All that is built in (grooves, slits, necks) is a rectangle in (s, t), so that the cells of a band, its centre line
and its edges are known exactly, in every kind of cell and at every density.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise

import numpy as np

from tests.meshes import SPLITS, elevate
from viewer.cells import KINDS
from viewer.model.arrays import Array
from viewer.model.design import Assignment, Design, Material, Physics, Selector, Support
from viewer.model.mesh import CellBlock, Mesh

STEEL = Material("steel", 200e9, 0.3, 7850.0)
_GROWTH = 0.6  # a cell's size may grow by this share of the distance from a finer place
_TINY = 1e-9


@dataclass(frozen=True)
class Patch:
    """The rectangle (s0, s1, t0, t1), m, of the sheet with a thickness of its own, m; 0 is a hole."""

    box: tuple[float, float, float, float]
    thickness: float


@dataclass(frozen=True)
class Band:
    """What was built in as a hinge.

    box      (s0, s1, t0, t1) of its cells; the line runs along t in the middle, or along s when ``along`` says so
    kind     "line", "curve" or "joint" (as long as wide: its length means nothing)
    cut      (s0, s1, t0, t1) cut out for the static solution: the band with a margin of its surroundings, so that
             every path from one side to the other crosses the band; None: none is made, since the sides of a curved
             band cannot turn as rigid lines
    root     one side of the band is the clamp
    """

    box: tuple[float, float, float, float]
    cut: tuple[float, float, float, float] | None
    along: str = "t"
    kind: str = "line"
    root: bool = False

    @property
    def across(self) -> int:
        """Column of the coordinate (s, t) across the line."""
        return 0 if self.along == "t" else 1

    @property
    def sides(self) -> tuple[float, float]:
        """Values of the coordinate across the line at the two edges."""
        return self.box[2 * self.across], self.box[2 * self.across + 1]

    @property
    def ends(self) -> tuple[float, float]:
        """Values of the coordinate along the line at its ends."""
        along = 1 - self.across
        return self.box[2 * along], self.box[2 * along + 1]


@dataclass(frozen=True)
class Blade:
    """A rib of ``height`` and ``thickness``, m, that stands on the line t between s0 and s1 (shells only)."""

    t: float
    ends: tuple[float, float]
    height: float
    thickness: float


def flat(s: Array, t: Array, n: Array) -> Array:
    """The sheet as it is: s along x, t along y, n along z."""
    return np.stack([s, t, n], axis=-1)


@dataclass(frozen=True, eq=False)
class Sheet:
    """A sheet to be meshed.

    size       (length, width), m: s and t run from 0
    thickness  m, of the plain sheet; patches: later ones win
    cell       m, largest side of a cell at the coarse density
    place      (s, t, n) (k,) each → (k, 3) m; n from the middle of the plain sheet
    breaks     further values of s, and of t, at which cells must end (folds)
    scale      (s, t) → factor on every thickness there (tapers)
    clamp      rectangles of (s, t) that are held; none: a free body
    least      cells at least across anything built in, at the coarse density
    layers     cells of a solid through each of its levels
    """

    size: tuple[float, float]
    thickness: float
    cell: float
    patches: tuple[Patch, ...] = ()
    bands: tuple[Band, ...] = ()
    blades: tuple[Blade, ...] = ()
    place: Callable[[Array, Array, Array], Array] = flat
    breaks: tuple[tuple[float, ...], tuple[float, ...]] = ((), ())
    scale: Callable[[Array, Array], Array] | None = None
    clamp: tuple[tuple[float, float, float, float], ...] = ()
    least: int = 2
    layers: int = 1

    def lines(self, axis: int, density: int) -> Array:
        """Values of s (0) or t (1) between which cells lie; twice the density halves every cell."""
        marks = [0.0, self.size[axis], *self.breaks[axis]]
        for item in (*self.patches, *self.bands):
            marks += item.box[2 * axis : 2 * axis + 2]
        for blade in self.blades:
            marks += blade.ends if axis == 0 else (blade.t,)
        kept: list[float] = []
        for mark in sorted(marks):
            if -_TINY <= mark <= self.size[axis] + _TINY and (not kept or mark - kept[-1] > 1e-6 * self.size[axis]):
                kept.append(mark)
        return _graded(np.array(kept), self.cell, self.least, density)

    def thickness_at(self, s: Array, t: Array) -> Array:
        """(k,) m, without the taper; 0 where there is nothing."""
        out = np.full(np.shape(s), self.thickness)
        for patch in self.patches:
            out[inside(s, t, patch.box)] = patch.thickness
        return out


def inside(s: Array, t: Array, box: tuple[float, float, float, float]) -> Array:
    """Which points lie in the rectangle, its sides included."""
    slack = 1e-7 * max(box[1] - box[0], box[3] - box[2])
    return (s >= box[0] - slack) & (s <= box[1] + slack) & (t >= box[2] - slack) & (t <= box[3] + slack)


def _graded(marks: Array, largest: float, least: int, density: int) -> Array:
    """Cells no larger than ``largest`` between ``marks``, at least ``least`` between two, growing slowly away from
    small ones."""
    wanted = np.minimum(np.diff(marks) / least, largest)
    out = [marks[:1]]
    for i, (start, end) in enumerate(pairwise(marks)):
        x = np.linspace(start, end, 401)
        size = np.full(len(x), wanted[i])
        for j, (a, b) in enumerate(pairwise(marks)):
            away = np.maximum(np.maximum(a - x, x - b), 0)
            size = np.minimum(size, wanted[j] + _GROWTH * away)
        filled = np.concatenate([[0], np.cumsum((1 / size[1:] + 1 / size[:-1]) / 2 * np.diff(x))])
        count = max(least, int(np.ceil(filled[-1] - 1e-6))) * density
        out.append(np.interp(np.linspace(0, filled[-1], count + 1)[1:], filled, x))
    out[-1][-1] = marks[-1]
    lines = np.concatenate(out)
    # Interpolation must not move the marks themselves: predicates ask for them.
    lines[[int(np.argmin(np.abs(lines - mark))) for mark in marks]] = marks
    return lines


@dataclass(frozen=True, eq=False)
class Built:
    """A sheet meshed with one kind of cell.

    design  ready to be solved; where (n_nodes, 3) s, t, n of the nodes (ribs keep their t, n is their height)
    middle  (n_cells, 2) s and t of the cells' centres; rib (n_cells,) cells of ribs
    """

    sheet: Sheet
    kind: str
    design: Design
    where: Array
    middle: Array
    rib: Array

    @property
    def mesh(self) -> Mesh:
        return self.design.mesh

    @cached_property
    def solid(self) -> bool:
        return KINDS[self.kind].dim == 3

    def cells(self, box: tuple[float, float, float, float]) -> Array:
        """(n_cells,) which cells of the sheet lie in the rectangle."""
        return inside(self.middle[:, 0], self.middle[:, 1], box) & ~self.rib

    def line(self, band: Band, count: int = 33) -> Array:
        """(count, 3) m, the true centre line at the middle of the sheet."""
        along, across = np.linspace(*band.ends, count), np.full(count, sum(band.sides) / 2)
        s, t = (across, along) if band.along == "t" else (along, across)
        return self.sheet.place(s, t, np.zeros(count))


def build(name: str, sheet: Sheet, kind: str, density: int = 1, through: int = 1) -> Built:
    """Mesh the sheet with cells of ``kind``; ``density`` 2 halves every side of every cell in the sheet's plane,
    ``through`` 2 every cell of a solid through the thickness."""
    cell = KINDS[kind]
    s, t = sheet.lines(0, density), sheet.lines(1, density)
    solid = cell.dim == 3
    levels = _levels(sheet, through) if solid else np.array([0.0])
    shape = (len(s), len(t), len(levels))
    grid = np.stack(np.meshgrid(s, t, levels, indexing="ij"), axis=-1).reshape(-1, 3)
    number = np.arange(len(grid)).reshape(shape)
    first = np.stack(np.meshgrid(*[np.arange(max(1, n - 1)) for n in shape], indexing="ij"), axis=-1).reshape(-1, 3)
    unit = ((KINDS["hex8" if solid else "quad4"].reference + 1) / 2).astype(int)
    unit = np.pad(unit, ((0, 0), (0, 3 - unit.shape[1])))
    bricks = number[tuple((first[:, None] + unit).transpose(2, 0, 1))]
    middle = grid[bricks].mean(axis=1)
    thick = sheet.thickness_at(middle[:, 0], middle[:, 1])
    kept = thick > middle[:, 2] + sheet.thickness / 2 if solid else thick > 0
    bricks, thick, middle = bricks[kept], thick[kept], middle[kept]
    rib = np.zeros(len(bricks), bool)
    for blade in sheet.blades:
        grid, quads, centres = _blade(blade, sheet, grid, s, int(np.argmin(np.abs(t - blade.t))), number, density)
        bricks, middle = np.vstack([bricks, quads]), np.vstack([middle, centres])
        thick = np.append(thick, np.full(len(quads), blade.thickness))
        rib = np.append(rib, np.full(len(quads), True))
    each = len(SPLITS[cell.family])
    corners = bricks[:, np.array(SPLITS[cell.family])].reshape(-1, cell.n_corners)
    where, nodes = elevate(cell, grid, corners)
    thick, middle, rib = (np.repeat(values, each, axis=0) for values in (thick, middle, rib))
    if not solid and sheet.scale is not None:
        thick = thick * sheet.scale(middle[:, 0], middle[:, 1])
    used, nodes = np.unique(nodes, return_inverse=True)
    where, nodes = where[used], nodes.reshape(len(corners), -1)
    factor = sheet.scale(where[:, 0], where[:, 1]) if solid and sheet.scale is not None else 1.0
    points = sheet.place(where[:, 0], where[:, 1], where[:, 2] * factor)
    design = _design(name, points, kind, nodes, None if solid else thick, _held(sheet, where))
    return Built(sheet, kind, design, where, middle[:, :2], rib)


def _levels(sheet: Sheet, through: int) -> Array:
    """Layers of a solid: every thickness in use ends one; material goes from the top."""
    used = {round(p.thickness, 12) for p in sheet.patches if p.thickness > 0} | {round(sheet.thickness, 12)}
    ends, each = np.array([0.0, *sorted(used)]), sheet.layers * through
    split = np.interp(np.arange((len(ends) - 1) * each + 1) / each, np.arange(len(ends)), ends)
    return split - sheet.thickness / 2


def _blade(blade, sheet, grid, s, column, number, density):
    """Nodes and squares of a rib added to the grid."""
    at = np.nonzero((s >= blade.ends[0] - _TINY) & (s <= blade.ends[1] + _TINY))[0]
    rows = max(2, int(np.ceil(blade.height / sheet.cell))) * density
    numbers = np.empty((len(at), rows + 1), np.int64)
    numbers[:, 0] = number[at, column, 0]
    numbers[:, 1:] = len(grid) + np.arange(len(at) * rows).reshape(len(at), rows)
    heights = np.linspace(0, blade.height, rows + 1)[1:]
    fresh = np.stack(np.broadcast_arrays(s[at][:, None], blade.t, heights[None, :]), axis=-1).reshape(-1, 3)
    quads = np.stack([numbers[:-1, :-1], numbers[1:, :-1], numbers[1:, 1:], numbers[:-1, 1:]], axis=-1).reshape(-1, 4)
    grid = np.vstack([grid, fresh])
    return grid, quads, grid[quads].mean(axis=1)


def _held(sheet: Sheet, where: Array) -> Array:
    held = np.zeros(len(where), bool)
    for box in sheet.clamp:
        held |= inside(where[:, 0], where[:, 1], box)
    return np.nonzero(held)[0]


def _design(name: str, points: Array, kind: str, nodes: Array, thick: Array | None, held: Array) -> Design:
    groups, assignments = {}, (Assignment("*", STEEL.name),)
    if thick is not None:
        values, index = np.unique(np.round(thick, 9), return_inverse=True)
        groups = {f"sheet {i + 1}": np.nonzero(index == i)[0] for i in range(len(values))}
        assignments = tuple(Assignment(f"sheet {i + 1}", STEEL.name, float(value)) for i, value in enumerate(values))
    mesh = Mesh(
        points,
        (CellBlock(kind, nodes, np.arange(1, len(nodes) + 1)),),
        np.arange(1, len(points) + 1),
        node_groups={"root": held} if len(held) else {},
        cell_groups=groups,
        source=name,
    )
    supports = (Support("root", Selector(group="root")),) if len(held) else ()
    return Design(name, mesh, Physics({STEEL.name: STEEL}, assignments, supports))
