"""Plates and membranes of tests/data/checks.csv (topics 2 and 3) solved by our shells.

Each case is solved on three meshes whose element size falls by the same ratio; the observed rate of convergence of
every mode is asserted, the limits by Richardson's rule are compared with the row at max(its tolerance, 1e-3).
Sources stand in the rows. What is left out, and why: tests/checks/left_out.md.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cache

import numpy as np
import pytest

from tests.checks.reference import Extrapolated, richardson, row
from tests.meshes import plate_mesh
from viewer.mechanics.eigen import solve
from viewer.model.design import Assignment, Design, Material, Physics, Selector, Support
from viewer.model.mesh import CellBlock, Mesh

STEEL = Material("steel", 200e9, 0.3, 8000.0)
THIN = 0.01  # m, with sides of 10 m: shear and rotary inertia take less than 1e-4 off
UNUSED = ("ux", "uy", "rz")  # by a flat plate in bending
CLAMPED = ("uz", "rx", "ry")


def rectangle(n: int, a: float = 10.0, b: float = 10.0, kind: str = "quad4", m: int = 0) -> Mesh:
    return plate_mesh(kind, (n, m or n), (a, b))


def mapped(mesh: Mesh, place: Callable[[np.ndarray], np.ndarray]) -> Mesh:
    return Mesh(place(mesh.points), mesh.blocks, mesh.node_ids, mesh.node_groups, mesh.cell_groups)


def rhombus(n: int) -> Mesh:
    """Sides of 10 m at 45 degrees."""
    shear = np.array([[1, 0, 0], [np.sqrt(0.5), np.sqrt(0.5), 0], [0, 0, 1]])
    return mapped(rectangle(n), lambda points: points @ shear)


def taper(n: int) -> Mesh:
    """N13: length 10 m, depth from 5 m to 1 m, symmetric."""

    def place(points: np.ndarray) -> np.ndarray:
        x, y = points[:, 0], points[:, 1]
        return np.stack([x, (y - 0.5) * (5 - 0.4 * x), 0 * x], axis=1)

    return mapped(rectangle(2 * n, 10.0, 1.0, m=n), place)


def disc(n: int) -> Mesh:
    """Radius 10 m: a square of 2n × 2n cells bulged towards the circle, and four blocks of n rows around it."""
    t = np.linspace(-1, 1, 2 * n + 1)
    arc = np.stack([np.sin(np.pi / 4 * t), np.cos(np.pi / 4 * t)], axis=1)
    side = 0.5 * np.stack([t, np.ones_like(t)], axis=1) * (1 + 0.2 * (1 - t[:, None] ** 2))
    u, v = np.meshgrid(t, t, indexing="ij")
    inner = 0.5 * np.stack([u * (1 + 0.2 * (1 - v**2)), v * (1 + 0.2 * (1 - u**2))], axis=-1)
    inner[:, [0, -1]] = side[:, None] * np.array([[1, -1], [1, 1]])
    inner[[0, -1]] = side[None, :, ::-1] * np.array([[-1, 1], [1, 1]])[:, None]
    r = np.linspace(0, 1, n + 1)[:, None, None]
    ring = np.swapaxes((1 - r) * side + r * arc, 0, 1)[:, ::-1]  # from the arc inwards: counter-clockwise cells
    quarter = np.array([[0, -1], [1, 0]])
    blocks = [inner, *(ring @ np.linalg.matrix_power(quarter, k) for k in range(4))]
    points, cells, start = [], [], 0
    for block in blocks:
        i, j = np.meshgrid(*(np.arange(count - 1) for count in block.shape[:2]), indexing="ij")
        k, stride = start + (i * block.shape[1] + j).ravel(), block.shape[1]
        cells.append(np.stack([k, k + stride, k + stride + 1, k + 1], axis=1))
        points.append(block.reshape(-1, 2))
        start += points[-1].shape[0]
    _, first, merged = np.unique(np.round(np.concatenate(points), 9), axis=0, return_index=True, return_inverse=True)
    flat = np.pad(10 * np.concatenate(points)[first], ((0, 0), (0, 1)))
    nodes = merged.reshape(-1)[np.concatenate(cells)]
    rim = np.nonzero(np.isclose(np.linalg.norm(flat, axis=1), 10.0))[0]
    return Mesh(
        flat, (CellBlock("quad4", nodes, np.arange(len(nodes))),), np.arange(len(flat)), node_groups={"rim": rim}
    )


@dataclass(frozen=True)
class Case:
    """A plate and the three meshes it is solved on."""

    mesh: Callable[[int], Mesh] = rectangle
    held: tuple[tuple[str, tuple[str, ...]], ...] = ()  # (edge, held directions)
    thickness: float = THIN
    poisson: float = 0.3
    scale: str = "lambda"  # what the row states: "lambda" = ω 10² √(ρh/D), or "Hz"
    unused: tuple[str, ...] = UNUSED
    sizes: tuple[int, int, int] = (16, 24, 36)
    formulation: str = ""

    def design(self, n: int) -> Design:
        mesh = self.mesh(n)
        material = Material("steel", STEEL.youngs_modulus, self.poisson, STEEL.density)
        supports = [Support("plane", Selector(nodes=mesh.node_ids), self.unused)] + [
            Support(group, Selector(group=group), directions) for group, directions in self.held
        ]
        return Design(
            "plate",
            mesh,
            Physics(
                {"steel": material}, (Assignment("*", "steel", self.thickness, self.formulation),), tuple(supports)
            ),
        )


@cache
def limits(case: Case, count: int) -> Study:
    """Limits and rates of the first ``count`` elastic values of ``case``, in the row's own scale."""
    rigid = 0 if case.held else 3
    results = [solve(case.design(n), rigid + count).freq_hz for n in case.sizes]
    for found in results:
        assert (found[:rigid] < 1e-3 * found[rigid]).all(), "three rigid motions of a free plate in bending"
    if case.scale == "lambda":
        bending = STEEL.youngs_modulus * case.thickness**3 / (12 * (1 - case.poisson**2))
        results = [2 * np.pi * 100 * np.sqrt(STEEL.density * case.thickness / bending) * found for found in results]
    coarse, middle, fine = (found[rigid:] for found in results)
    return Study(richardson(coarse, middle, fine, case.sizes[1] / case.sizes[0]), np.abs(coarse / fine - 1))


@dataclass(frozen=True)
class Study:
    """Limits with rates, and by how much each value moved from the coarse to the fine mesh."""

    reached: Extrapolated
    moved: np.ndarray

    def check(self, expected: np.ndarray, tolerance: float, rates: tuple[float, float]) -> None:
        """Every mode that moved by more than 1e-3 shows the rate (below that two small terms may cancel), and
        every limit agrees."""
        seen = self.reached.rate[self.moved > 1e-3]
        assert len(seen) >= len(expected) / 2
        assert (seen > rates[0]).all(), seen
        assert (seen < rates[1]).all(), seen
        assert (self.reached.error(expected) <= tolerance).all(), self.reached.limit / expected - 1


def edges(names: str, directions: tuple[str, ...] = ()) -> tuple[tuple[str, tuple[str, ...]], ...]:
    """Edges held in ``directions``, or simply supported with no rotation along the edge (hard support)."""
    along = {"x": ("uz", "rx"), "y": ("uz", "ry")}
    return tuple((name, directions or along[name[0]]) for name in names.split())


ALL = "x0 x1 y0 y1"
SSSS, CCCC, SFSF, CFFF, FFFF = (
    Case(held=held) for held in (edges(ALL), edges(ALL, CLAMPED), edges("x0 x1"), edges("x0", CLAMPED), ())
)
THICK = replace(SSSS, thickness=1.0, scale="Hz", formulation="quad4-mitc4-mindlin")
ROUND = Case(mesh=disc, held=(("rim", CLAMPED),), sizes=(8, 12, 18))


def slender(ratio: float) -> Case:
    """C-F-F-F of span 10 m and width 10 m / ratio, half as many cells across."""
    return replace(CFFF, mesh=_strip(ratio))


@cache
def _strip(ratio: float) -> Callable[[int], Mesh]:
    return lambda n: rectangle(n, 10.0, 10.0 / ratio, m=n // 2)


# row, part of the row, case, how many times each value of the row stands among the modes
THREE_PAIRS = (1, 2, 1, 2, 2)
CASES = [
    ("P01", 0, SSSS, THREE_PAIRS),
    ("P02", 0, CFFF, ()),
    ("P03", 0, CFFF, ()),
    ("P04", 0, FFFF, ()),
    ("P06", 0, CCCC, ()),
    ("P07", 0, SFSF, ()),
    ("P11", 0, slender(2 / 3), ()),
    ("P14", 0, slender(2.5), ()),
    ("P15", 0, slender(2.0), ()),
    ("P15", 1, slender(3.0), ()),
    ("P15", 2, slender(5.0), ()),
    ("P17", 0, replace(FFFF, poisson=0.225), ()),
    ("P17", 1, FFFF, ()),
    ("P17", 2, replace(FFFF, poisson=1 / 3), ()),
    ("P18", 0, CFFF, ()),
    ("P18", 1, CCCC, (1, 2, 1, 1, 1)),
    ("P18", 2, SSSS, (1, 2, 1)),
    ("P19", 0, ROUND, (1, 2, 2, 1, 2, 2)),
    ("P20", 0, replace(ROUND, held=(("rim", ("uz",)),)), (1, 2, 2, 1)),
    ("P23", 0, replace(CCCC, mesh=rhombus, sizes=(24, 36, 54)), ()),
    ("P24", 0, THICK, THREE_PAIRS),
    ("N07", 0, replace(FFFF, thickness=0.05, scale="Hz"), ()),
    ("N08", 0, replace(SSSS, thickness=0.05, scale="Hz"), ()),
    ("N10", 0, replace(CFFF, thickness=0.05, scale="Hz"), ()),
    ("N11", 0, THICK, ()),
]


@pytest.mark.parametrize(("name", "part", "case", "times"), CASES, ids=[f"{c[0]}-{c[1]}" for c in CASES])
def test_plate(name: str, part: int, case: Case, times: tuple[int, ...]):
    wanted = row(name).values[part : part + 1] if name == "P17" else row(name).parts[part]
    expected = np.repeat(wanted, times) if times else np.array(wanted)
    if name == "P18":  # the row's B is λ / √12
        expected = expected * np.sqrt(12)
    limits(case, len(expected)).check(expected, row(name).tolerance, order(case))


def order(case: Case) -> tuple[float, float]:
    """The second order of bilinear rotations; less where a free edge's boundary layer, as wide as the plate is
    thick, is not resolved, or a clamped edge ends at a free one (singular moments)."""
    free_edges = len(case.held) < 4 and case.mesh is not disc
    return (1.5, 2.3) if free_edges else (1.85, 2.3)


TRIANGLES = [
    ("P01", SSSS, THREE_PAIRS),
    ("P02", CFFF, ()),
    ("P04", FFFF, ()),
    ("P06", CCCC, ()),
    ("P24", replace(THICK, formulation="tri3-dkmt-mindlin"), THREE_PAIRS),
]


@pytest.mark.parametrize(("name", "case", "times"), TRIANGLES, ids=[c[0] for c in TRIANGLES])
def test_plate_of_triangles(name: str, case: Case, times: tuple[int, ...]):
    expected = np.repeat(row(name).values, times) if times else np.array(row(name).values)
    limits(replace(case, mesh=triangles), len(expected)).check(expected, row(name).tolerance, order(case))


QUADRATICS = [("P01", SSSS, THREE_PAIRS), ("P06", CCCC, ()), ("P02", CFFF, ())]


@pytest.mark.parametrize("kind", ["tri6", "quad8", "quad9"])
@pytest.mark.parametrize(("name", "case", "times"), QUADRATICS, ids=[c[0] for c in QUADRATICS])
def test_plate_of_pieces(kind: str, name: str, case: Case, times: tuple[int, ...]):
    """Cells of six, eight and nine nodes, half as many along each side."""
    expected = np.repeat(row(name).values, times) if times else np.array(row(name).values)
    pieces = replace(case, mesh=_of(kind), sizes=(8, 12, 18))
    limits(pieces, len(expected)).check(expected, row(name).tolerance, order(case))


@cache
def _of(kind: str) -> Callable[[int], Mesh]:
    return lambda n: rectangle(n, kind=kind)


def triangles(n: int) -> Mesh:
    return rectangle(n, kind="tri3")


def test_tapered_membrane():
    """N13. The clamped corners are singular: no mode converges with the second order of a smooth solution."""
    case = Case(taper, edges("x0", ("ux", "uy", "rz")), thickness=0.05, scale="Hz", unused=("uz", "rx", "ry"))
    limits(case, 6).check(np.array(row("N13").values), row("N13").tolerance, (1.2, 2.0))
