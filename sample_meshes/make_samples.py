"""Writes the sample meshes beside this script. All parts are invented; nothing here was ever built or measured.

    python sample_meshes/make_samples.py            # rewrites sample_meshes/*/*.vtu
    python sample_meshes/make_samples.py FOLDER     # writes them elsewhere

Lengths are metres. The meshes are structured grids, bent, pierced and welded with NumPy alone. There is no
randomness, and coordinates are rounded to a nanometre, so that every machine writes the same bytes.
"""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterable
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from viewer.model.mesh import CellBlock, Mesh

Floats = NDArray[np.float64]
Bools = NDArray[np.bool_]
NANOMETRE = 9  # decimals of a metre

# ---------------------------------------------------------------------------------------------------- grids


def divide(breaks: Iterable[float], sizes: Iterable[float], growth: float = 0.5) -> Floats:
    """Grid lines through all ``breaks``. ``sizes``: the cell size at each break, and the coarsest last.

    Between two breaks the size grows by ``growth`` per length until it is the coarsest.
    """
    breaks = list(breaks)
    *sizes, coarsest = sizes
    lines = [np.array(breaks[:1])]
    for start, end, first, last in zip(breaks, breaks[1:], sizes, sizes[1:], strict=False):
        place = np.linspace(start, end, 2001)
        size = np.minimum(np.minimum(first + growth * (place - start), last + growth * (end - place)), coarsest)
        count = np.concatenate([[0.0], np.cumsum((1 / size[1:] + 1 / size[:-1]) / 2 * np.diff(place))])
        n = max(1, round(count[-1]))
        lines.append(np.interp(np.linspace(0, count[-1], n + 1)[1:], count, place))
        lines[-1][-1] = end
    return np.concatenate(lines)


def at(lines: Floats, value: float) -> int:
    """Index of the grid line that lies at ``value``."""
    index = int(np.argmin(np.abs(lines - value)))
    assert abs(lines[index] - value) < 1e-9, (value, lines[index])
    return index


class Plane:
    """A flat structured grid (x along, s across) in which holes with rounded corners can be cut."""

    def __init__(self, x: Floats, s: Floats) -> None:
        self.lines = x, s
        self.at = np.stack(np.meshgrid(x, s, indexing="ij"), axis=-1)  # (nx, ns, 2)
        self.keep = np.ones((len(x) - 1, len(s) - 1), bool)  # cells that remain
        self._pinned = np.zeros(self.at.shape[:2], bool)
        self._moved = np.zeros_like(self.at)
        self._free = np.zeros(self.at.shape[:2], bool)

    def cut(
        self, x0: float, x1: float, s0: float, s1: float, radius: float, to: tuple[float, ...] = (), reach: int = 5
    ) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
        """Remove the cells between the lines x0, x1, s0, s1 and round the corners of the hole.

        Returns the indices of its edge, once around and closed.

        ``to``     the hole's true bounds, when the cut lines are to be moved there
        ``reach``  how many lines around the hole give way (see :meth:`settle`)
        """
        (i0, i1), (j0, j1) = (at(self.lines[0], v) for v in (x0, x1)), (at(self.lines[1], v) for v in (s0, s1))
        self.keep[i0:i1, j0:j1] = False
        edge = np.zeros_like(self._pinned)
        edge[i0 : i1 + 1, j0 : j1 + 1] = True
        edge[i0 + 1 : i1, j0 + 1 : j1] = False
        was = self.at[edge]
        low, high = np.array([x0, s0]), np.array([x1, s1])
        new_low, new_high = np.array(to or (x0, s0, x1, s1)).reshape(2, 2)
        moved = new_low + (was - low) / (high - low) * (new_high - new_low)
        self._moved[edge] = rounded(moved, new_low, new_high, radius) - was
        self._pinned[i0 : i1 + 1, j0 : j1 + 1] = True
        self._free[max(i0 - reach, 1) : i1 + reach + 1, max(j0 - reach, 0) : j1 + reach + 1] = True
        i, j = np.arange(i0, i1 + 1), np.arange(j0, j1 + 1)
        sides = [
            (i[:-1], 0 * i[:-1] + j0),
            (0 * j[:-1] + i1, j[:-1]),
            (i[:0:-1], 0 * i[1:] + j1),
            (0 * j[1:] + i0, j[:0:-1]),
            (i[:1], j[:1]),
        ]
        return np.concatenate([s[0] for s in sides]), np.concatenate([s[1] for s in sides])

    def settle(self, fixed: Bools, sweeps: int = 400) -> None:
        """Let the lines around the holes give way evenly (harmonic displacement); ``fixed`` nodes stay."""
        free = self._free & ~self._pinned & ~fixed
        free[[0, -1]] = free[:, [0, -1]] = False
        moved = self._moved.copy()
        for _ in range(sweeps):
            mean = (np.roll(moved, 1, 0) + np.roll(moved, -1, 0) + np.roll(moved, 1, 1) + np.roll(moved, -1, 1)) / 4
            moved[free] = mean[free]
        self.at = self.at + moved


def rounded(points: Floats, low: Floats, high: Floats, radius: float) -> Floats:
    """Points on the boundary of a rectangle, moved onto the same rectangle with rounded corners."""
    centre = (low + high) / 2
    sign = np.where(points >= centre, 1.0, -1.0)
    inward = np.clip((high - low) / 2 - np.abs(points - centre), 0.0, None)  # distance from the nearest sides
    along = inward.max(axis=1)
    near = along < radius * (1 - 1e-9)
    turn = np.pi / 4 * (1 - along[near] / radius)
    on_first = inward[near, 1] > inward[near, 0]  # on a side of constant x
    steep, flat = radius * (1 - np.cos(turn)), radius * (1 - np.sin(turn))
    local = np.where(on_first[:, None], np.stack([steep, flat], 1), np.stack([flat, steep], 1))
    out = points.copy()
    out[near] = (centre + sign * ((high - low) / 2))[near] - sign[near] * local
    return out


def level(x: Floats, y: Floats, z: float) -> Floats:
    """A flat patch at height z."""
    return np.stack([*np.meshgrid(x, y, indexing="ij"), np.full((len(x), len(y)), z)], -1)


class Sheets:
    """Collects patches of quadrilaterals and welds nodes that coincide."""

    def __init__(self) -> None:
        self._points: list[Floats] = []
        self._cells: list[NDArray[np.int64]] = []
        self._groups: list[NDArray[np.str_]] = []
        self._count = 0

    def add(self, points: Floats, group: str | NDArray[np.str_], keep: Bools | None = None) -> None:
        """A grid of points (m, n, 3); the normal of its cells is first direction × second."""
        m, n = points.shape[:2]
        rows = np.arange(m * n).reshape(m, n) + self._count
        cells = np.stack([rows[:-1, :-1], rows[1:, :-1], rows[1:, 1:], rows[:-1, 1:]], axis=-1)
        names = np.broadcast_to(np.asarray(group, dtype="U32"), cells.shape[:2])
        picked = np.ones(cells.shape[:2], bool) if keep is None else keep
        self._cells.append(cells[picked])
        self._groups.append(names[picked])
        self._points.append(points.reshape(-1, 3))
        self._count += m * n

    def mesh(self, node_groups: dict[str, Callable[[Floats], Bools]], source: str) -> Mesh:
        points = np.concatenate(self._points)
        cells, names = np.concatenate(self._cells), np.concatenate(self._groups)
        points, cells = weld(points, cells)
        groups = {str(name): np.nonzero(names == name)[0] for name in dict.fromkeys(names)}
        return finish("quad4", points, cells, groups, node_groups, source)


def weld(points: Floats, cells: NDArray[np.int64]) -> tuple[Floats, NDArray[np.int64]]:
    """Merge points closer than about a micrometre and drop those that no cell uses."""
    keys = np.round(points * 1e6).astype(np.int64)
    _, first, merged = np.unique(keys, axis=0, return_index=True, return_inverse=True)
    cells = first[merged.reshape(-1)][cells]
    used = np.unique(cells)
    return points[used], np.searchsorted(used, cells)


def finish(
    kind: str,
    points: Floats,
    cells: NDArray[np.int64],
    cell_groups: dict[str, NDArray[np.int64]],
    node_groups: dict[str, Callable[[Floats], Bools]],
    source: str,
) -> Mesh:
    points = np.round(points, NANOMETRE) + 0.0  # + 0.0: no negative zeros
    return Mesh(
        points,
        (CellBlock(kind, cells, np.arange(1, len(cells) + 1)),),
        np.arange(1, len(points) + 1),
        {name: np.nonzero(chosen(points))[0] for name, chosen in node_groups.items()},
        cell_groups,
        source,
    )


# ------------------------------------------------------------------------------------------------------- boom

LENGTH, WIDTH, DEPTH, BEND = 0.90, 0.16, 0.10, 0.008  # boom: along x, across y, down −z, bend radius
WINDOW, WINDOW_CORNER = (0.11, 0.26), 0.020  # the cable window, along x, and its corner radius
FLOOR, SEAT = (0.0, 0.58), (0.58, 0.73)  # plates that close the section from below; the camera's last
SLITS, SLIT = (0.752, 0.866), 0.008  # centres and width of the slits in the right flange
SLIT_TOP = 0.042  # distance of their ends from the fold


def folded(x: Floats, s: Floats) -> Floats:
    """The developed sheet (x, s) folded to an inverted U; s = 0 is the middle of the top."""
    half, arc = WIDTH / 2 - BEND, BEND * np.pi / 2
    out = np.abs(s)
    turn = np.clip((out - half) / BEND, 0, np.pi / 2)
    y = np.minimum(out, half) + BEND * np.sin(turn)
    z = BEND * (np.cos(turn) - 1) - np.clip(out - half - arc, 0, None)
    return np.stack([x, np.where(s < 0, -y, y), z], axis=-1)


def boom(window_half_width: float, lip: float = 0.0) -> Mesh:
    """The boom with a window of the given half width, its edge turned up to a lip of the given height (0: none)."""
    half, arc = WIDTH / 2 - BEND, BEND * np.pi / 2
    edge = half + arc + DEPTH - BEND
    slit_end = half + arc + SLIT_TOP
    grid_half = 0.055  # the lines from which the window is cut
    sides = [side for centre in SLITS for side in (centre - SLIT / 2, centre, centre + SLIT / 2)]
    x = divide([FLOOR[0], *WINDOW, *SEAT, *sides, LENGTH], [0.01, 0.008, 0.008, 0.01, 0.01, *[0.004] * 6, 0.01, 0.01])
    right = divide(
        [0, grid_half, half, half + arc, slit_end, slit_end + SLIT / 2, edge],
        [0.0095, 0.0085, 0.008, 0.004, 0.005, 0.004, 0.0095, 0.0095],
    )
    s = np.concatenate([-right[:0:-1], right])
    plane = Plane(x, s)
    around = plane.cut(
        *WINDOW,
        -grid_half,
        grid_half,
        WINDOW_CORNER,
        to=(WINDOW[0], -window_half_width, WINDOW[1], window_half_width),
    )
    for centre in SLITS:  # a slit is open at the sheet's edge: its far corners stay sharp
        plane.cut(
            centre - SLIT / 2,
            centre + SLIT / 2,
            -edge,
            -slit_end,
            SLIT / 2,
            to=(centre - SLIT / 2, -edge, centre + SLIT / 2, -slit_end),
            reach=3,
        )
    plane.settle(fixed=np.broadcast_to(np.abs(np.abs(s) - half - arc / 2) < arc / 2 + 1e-9, (len(x), len(s))))

    middle = np.stack(np.meshgrid((x[1:] + x[:-1]) / 2, (s[1:] + s[:-1]) / 2, indexing="ij"), -1)
    group = np.where(middle[..., 1] > half, "flange_left", np.where(middle[..., 1] < -half, "flange_right", "top"))
    flap = (middle[..., 0] > SLITS[0]) & (middle[..., 0] < SLITS[1]) & (middle[..., 1] < -slit_end)
    group = np.where(flap, "flap", group)
    group = np.where(flap & (middle[..., 1] > -slit_end - SLIT / 2), "score_line", group)
    parts = Sheets()
    parts.add(folded(plane.at[..., 0], plane.at[..., 1]), group, plane.keep)

    across = np.linspace(-WIDTH / 2, WIDTH / 2, 2 * (at(right, half) + 2) + 1)
    for name, (start, end) in zip(("floor", "camera_seat"), (FLOOR, SEAT), strict=True):
        parts.add(level(x[at(x, start) : at(x, end) + 1], across, -DEPTH), name)
    parts.add(nose(folded(np.full(len(s), LENGTH), s), across), "nose")
    if lip:
        rim = folded(plane.at[around][:, 0], plane.at[around][:, 1])
        up = np.array([0, 0, 1.0]) * np.linspace(0, lip, 3)[:, None]
        parts.add(rim[:, None] + up[None], "lip")
    return parts.mesh({"root": lambda p: p[:, 0] < 1e-9, "tip": lambda p: p[:, 0] > LENGTH - 1e-9}, "invented boom")


def nose(rim: Floats, across: Floats) -> Floats:
    """The plate that closes the tip: a transfinite grid inside the folded rim and the seat's edge."""
    half = (len(across) - 1) // 2
    middle = (len(rim) - 1) // 2
    left, top, right = rim[: middle - half + 1], rim[middle - half : middle + half + 1], rim[middle + half :][::-1]
    bottom = np.stack([np.full(len(across), LENGTH), across, np.full(len(across), -DEPTH)], -1)
    u = np.linspace(0, 1, len(across))[:, None, None]
    v = ((left[:, 2] + DEPTH) / (left[-1, 2] + DEPTH))[None, :, None]
    sides = (1 - u) * left[None] + u * right[None]
    ends = (1 - v) * bottom[:, None] + v * top[:, None]
    corners = (1 - u) * (1 - v) * bottom[0] + u * (1 - v) * bottom[-1] + (1 - u) * v * top[0] + u * v * top[-1]
    plate = sides + ends - corners
    for _ in range(30):  # evens out the cells that the bends squeeze
        plate[1:-1, 1:-1] = (plate[2:, 1:-1] + plate[:-2, 1:-1] + plate[1:-1, 2:] + plate[1:-1, :-2]) / 4
    return plate


# ------------------------------------------------------------------------------------------------------- fork


def fork() -> Mesh:
    """A two-tine carrier fork: a bar bent to a U, tines along x and tapering, a stem behind the crossbar's middle,
    held at its end; 20-node hexahedra."""
    reach, gap, bend, tall, thick, stem = 0.40, 0.20, 0.040, 0.030, 0.022, 0.070
    counts = {"tine_left": 44, "bend_left": 8, "crossbar": 14, "bend_right": 8, "tine_right": 44}
    n_thick, n_tall, n_stem, n_wide = 3, 3, 8, 4
    straight, arc = reach - bend - thick / 2, bend * np.pi / 2
    ends = np.concatenate([[0], np.cumsum([straight, arc, gap - 2 * bend, arc, straight])])
    station = np.concatenate(
        [
            np.linspace(start, end, 2 * n + 1)[bool(start) :]
            for start, end, n in zip(ends, ends[1:], counts.values(), strict=False)
        ]
    )
    across, up = np.linspace(-1, 1, 2 * n_thick + 1) * thick / 2, np.linspace(-1, 1, 2 * n_tall + 1) * tall / 2
    centre, normal = _u_path(station, straight, bend, gap)
    taper = 1 - 0.35 * np.clip((centre[:, 0] - bend) / straight, 0, 1)
    flat = centre[:, None] + normal[:, None] * across[None, :, None] * taper[:, None, None]
    bar = np.concatenate(
        [
            np.broadcast_to(flat[:, :, None], (*flat.shape[:2], len(up), 2)),
            np.broadcast_to(up[None, None, :, None], (*flat.shape[:2], len(up), 1)),
        ],
        axis=-1,
    )
    middle = len(station) // 2
    face = bar[middle - n_wide : middle + n_wide + 1, -1]  # outer side of the crossbar
    behind = np.linspace(0, stem, 2 * n_stem + 1)
    back = face[:, None] - behind[None, :, None, None] * np.array([1.0, 0, 0])
    cells = [_hex20(*(np.array(grid.shape[:3]) - 1) // 2) for grid in (bar, back)]
    points, nodes = weld(
        np.concatenate([bar.reshape(-1, 3), back.reshape(-1, 3)]),
        np.concatenate([cells[0], cells[1] + bar[..., 0].size]),
    )
    names = np.repeat([*counts, "stem"], [*(n * n_thick * n_tall for n in counts.values()), len(cells[1])])
    groups = {name: np.nonzero(names == name)[0] for name in (*counts, "stem")}
    root = lambda p: p[:, 0] < -thick / 2 - stem + 1e-9  # noqa: E731
    return finish("hex20", points, nodes, groups, {"root": root}, "invented fork")


def _u_path(station: Floats, straight: float, bend: float, gap: float) -> tuple[Floats, Floats]:
    """Centre line of the U and its outward normal, by station from the left tip (y > 0) to the right tip."""
    arc, bar = bend * np.pi / 2, gap - 2 * bend
    half = straight + arc + bar / 2
    d = half - np.abs(station - half)  # distance from the nearer tip
    turn = np.clip((d - straight) / bend, 0, np.pi / 2)
    x = bend + np.clip(straight - d, 0, None) - bend * np.sin(turn)
    y = gap / 2 - bend + bend * np.cos(turn) - np.clip(d - straight - arc, 0, None)
    sign = np.where(station <= half, 1.0, -1.0)
    return np.stack([x, sign * y], 1), np.stack([-np.sin(turn), sign * np.cos(turn)], 1)


def _hex20(na: int, nb: int, nc: int) -> NDArray[np.int64]:
    """Connectivity of 20-node hexahedra (VTK order) on a grid of (2na+1, 2nb+1, 2nc+1) points."""
    corner = [(0, 0, 0), (2, 0, 0), (2, 2, 0), (0, 2, 0), (0, 0, 2), (2, 0, 2), (2, 2, 2), (0, 2, 2)]
    edges = [(0, 1), (1, 2), (2, 3), (3, 0), (4, 5), (5, 6), (6, 7), (7, 4), (0, 4), (1, 5), (2, 6), (3, 7)]
    local = np.array(corner + [tuple((np.array(corner[a]) + corner[b]) // 2) for a, b in edges])
    base = np.stack(np.meshgrid(np.arange(na), np.arange(nb), np.arange(nc), indexing="ij"), -1).reshape(-1, 1, 3) * 2
    index = base + local
    return (index[..., 0] * (2 * nb + 1) + index[..., 1]) * (2 * nc + 1) + index[..., 2]


# ----------------------------------------------------------------------------------------------------- trough


def trough(straps: bool) -> Mesh:
    """An open cable trough, 1.5 m long, U section with bends; with flat strips laced across the open top."""
    length, width, depth, bend = 1.5, 0.15, 0.06, 0.006
    half, arc = width / 2 - bend, bend * np.pi / 2
    edge = half + arc + depth - bend
    count, slant, strap = 8, 9, 3  # straps; grid lines that one gains on its way, and is wide
    x = np.linspace(0, length, count * (slant + strap) + 1)
    right = divide([0, half, half + arc, edge], [0.0135, 0.0065, 0.0065, 0.0135, 0.0135], growth=1)
    s = np.concatenate([-right[:0:-1], right])
    grid = np.stack(np.meshgrid(x, s, indexing="ij"), -1)
    out = np.abs(grid[..., 1])
    turn = np.clip((out - half) / bend, 0, np.pi / 2)
    y = np.minimum(out, half) + bend * np.sin(turn)
    z = bend * (1 - np.cos(turn)) + np.clip(out - half - arc, 0, None)
    points = np.stack([grid[..., 0], np.where(grid[..., 1] < 0, -y, y), z], -1)
    side = (s[1:] + s[:-1]) / 2
    parts = Sheets()
    parts.add(points, np.where(side > half, "wall_left", np.where(side < -half, "wall_right", "floor"))[None])
    if straps:  # flat strips, slanting to and fro from rim to rim
        across = np.linspace(0, 1, 13)[None, :, None]
        for number in range(count):
            start = number * (slant + strap)
            ends = [
                level(x[line : line + strap + 1], np.array([side * width / 2]), depth)
                for line, side in ((start, -1.0), (start + slant, 1.0))
            ]
            strip = (1 - across) * ends[0] + across * ends[1]
            parts.add(strip if number % 2 == 0 else strip * [1, -1, 1], "straps")
    return parts.mesh({"fixed_end": lambda p: p[:, 0] < 1e-9}, "invented trough")


# ------------------------------------------------------------------------------------------------------ files

SAMPLES: dict[str, Callable[[], Mesh]] = {
    "boom/baseline.vtu": lambda: boom(window_half_width=0.062),
    "boom/modified.vtu": lambda: boom(window_half_width=0.034, lip=0.014),
    "fork/fork.vtu": fork,
    "trough/plain.vtu": lambda: trough(straps=False),
    "trough/strapped.vtu": lambda: trough(straps=True),
}


def main(folder: Path) -> None:
    from viewer.loaders import write_interchange

    for name, make in SAMPLES.items():
        (folder / name).parent.mkdir(parents=True, exist_ok=True)
        write_interchange(folder / name, make())


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent)
