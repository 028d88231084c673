"""Beams, rods and shafts of tests/data/checks.csv (topics 1 and 13) solved by our solid elements.

Each case is solved on three meshes, each twice as fine; the limits by Richardson's rule are compared with the row at
max(its tolerance, 1e-3) and the observed rate of convergence is asserted wherever the values still move by more than
1e-5. Sources stand in the rows. What is left out, and why: left_out.md.

Bars are slender enough (length over depth 400) for Euler and Bernoulli, of 20-node hexahedra, in plane motion, with
Poisson's ratio 0 so that clamps do not stiffen them: the rows do not depend on it.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from scipy.interpolate import CubicSpline
from scipy.optimize import brentq

from tests.checks.reference import Extrapolated, richardson, row
from tests.meshes import box_mesh, plate_mesh
from viewer.mechanics.assembly import assemble
from viewer.mechanics.eigen import solve
from viewer.model.design import (
    Assignment,
    Design,
    LumpedMass,
    Material,
    Physics,
    Selector,
    Spring,
    Support,
)
from viewer.model.mesh import Mesh
from viewer.model.modes import ModeSet

LENGTH, DEPTH = 10.0, 0.025
BAR = Material("bar", 200e9, 0.0, 8000.0)
STEEL = Material("steel", 200e9, 0.3, 8000.0)
SIZES = (16, 32, 64)
CLAMPED = Support("root", Selector(group="x0"))
AREA, INERTIA = DEPTH**2, DEPTH**4 / 12
MASS = BAR.density * AREA * LENGTH


def plane(mesh: Mesh, *directions: str) -> Support:
    """Directions held at every node."""
    return Support("plane", Selector(nodes=mesh.node_ids), directions)


def model(mesh: Mesh, material: Material = BAR, formulation: str = "", **physics) -> Design:
    return Design(
        "bar",
        mesh,
        Physics({material.name: material}, (Assignment("*", material.name, None, formulation),), **physics),
    )


def beam(cells: int, supports: tuple[Support, ...] = (), **physics) -> Design:
    """A bar of square section along x that bends along y."""
    mesh = box_mesh("hex20", (cells, 1, 1), (LENGTH, DEPTH, DEPTH))
    return model(mesh, supports=(*supports, plane(mesh, "uz")), **physics)


def beta(modes: ModeSet) -> np.ndarray:
    """βL of the elastic modes, from ω = β² √(EI/ρA)."""
    omega = 2 * np.pi * modes.freq_hz[modes.freq_hz > 0]
    return LENGTH * np.sqrt(omega / np.sqrt(BAR.youngs_modulus * INERTIA / (BAR.density * AREA)))


def study(values: Callable[[int], np.ndarray], sizes: tuple[int, ...] = SIZES) -> tuple[Extrapolated, np.ndarray]:
    """The extrapolated limit and how far each value moved from the coarse to the fine mesh, relatively."""
    results = [values(n) for n in sizes]
    return richardson(*results, ratio=sizes[1] / sizes[0]), np.abs(results[0] / results[-1] - 1)


def check(found: tuple[Extrapolated, np.ndarray], expected, tolerance: float, rates: tuple[float, float]) -> None:
    reached, moved = found
    assert (reached.error(expected) <= tolerance).all(), reached.limit / np.asarray(expected) - 1
    seen = reached.rate[moved > 1e-5]
    assert len(seen) > 0
    assert ((seen > rates[0]) & (seen < rates[1])).all(), seen


# Cells much longer than the bar is deep carry one curvature each, which makes frequencies converge with the second
# order; the fourth order of quadratic elements shows where cells are about as long as wide.
SECOND, FOURTH = (1.8, 2.3), (3.3, 4.7)


@pytest.mark.parametrize(("name", "supports", "rigid"), [("B01", (CLAMPED,), 0), ("B02", (), 3)])
def test_beta(name, supports, rigid):
    count = len(row(name).values)
    found = study(lambda n: beta(solve(beam(n, supports), rigid + count)))
    check(found, row(name).values, row(name).tolerance, SECOND)


def test_beta_clamped_at_both_ends():
    """B02 holds for both pairs of ends."""
    both = (CLAMPED, Support("tip", Selector(group="x1")))
    check(study(lambda n: beta(solve(beam(n, both), 6))), row("B02").values, row("B02").tolerance, SECOND)


def pins(mesh: Mesh) -> tuple[Support, ...]:
    """Both ends held along y on the neutral axis, one end along x too."""
    axis = np.isclose(mesh.points[:, 1], DEPTH / 2)
    ends = [mesh.node_ids[axis & np.isclose(mesh.points[:, 0], x)] for x in (0.0, LENGTH)]
    return Support("pin", Selector(nodes=ends[0]), ("ux", "uy")), Support("roller", Selector(nodes=ends[1]), ("uy",))


def pinned(cells: int) -> Design:
    mesh = box_mesh("hex20", (cells, 1, 1), (LENGTH, DEPTH, DEPTH))
    return beam(cells, pins(mesh))


def test_beta_pinned():
    assert row("B04").text == "n*pi"
    expected = np.pi * np.arange(1, 7)
    check(study(lambda n: beta(solve(pinned(n), 6))), expected, row("B04").tolerance, SECOND)


def test_squares_of_beta():
    check(study(lambda n: beta(solve(beam(n, (CLAMPED,)), 3)) ** 2), row("B05").values, row("B05").tolerance, SECOND)


def deflection(design: Design, modes: ModeSet, index: int) -> tuple[np.ndarray, np.ndarray]:
    """x/L and uy along the neutral axis."""
    points = design.mesh.points
    line = np.nonzero(np.isclose(points[:, 1], DEPTH / 2) & np.isclose(points[:, 2], 0))[0]
    line = line[np.argsort(points[line, 0])]
    return points[line, 0] / LENGTH, modes.shape(index)[line, 1]


def test_nodes_of_cantilever_modes_b06():
    def nodes(cells: int) -> np.ndarray:
        design = beam(cells, (CLAMPED,))
        modes = solve(design, 4)
        found = []
        for index in (1, 2, 3):
            x, y = deflection(design, modes, index)
            curve = CubicSpline(x, y)
            change = np.nonzero(y[1:-1] * y[2:] < 0)[0] + 1  # the clamped end is no node
            found += [brentq(curve, x[i], x[i + 1]) for i in change]
        return np.array(found)

    reached, _ = study(nodes)
    assert (reached.error(row("B06").values) <= row("B06").tolerance).all()


def sigma(x: np.ndarray, y: np.ndarray, number: float, sign: float) -> float:
    """σ of cosh ± cos − σ (sinh ± sin) fitted to a shape; sign −1 for a clamped end at x = 0, +1 for a free one.

    Fitted as a f + b g with f = (cosh ± cos) − g and g = sinh ± sin, so that neither grows against the other;
    σ = 1 − b/a.
    """
    g = np.sinh(number * x) + sign * np.sin(number * x)
    f = np.exp(-number * x) + sign * (np.cos(number * x) - np.sin(number * x))
    (a, b), *_ = np.linalg.lstsq(np.stack([f, g], axis=1), y, rcond=None)
    return 1 - b / a


@pytest.mark.parametrize(
    ("part", "supports", "rigid", "sign"),
    [(0, (CLAMPED,), 0, -1.0), (1, (CLAMPED, Support("tip", Selector(group="x1"))), 0, -1.0), (1, (), 3, 1.0)],
)
def test_constants_of_shapes_b09(part, supports, rigid, sign):
    def constants(cells: int) -> np.ndarray:
        design = beam(cells, supports)
        modes = solve(design, rigid + 3)
        numbers = beta(modes)
        return np.array([sigma(*deflection(design, modes, rigid + i), numbers[i], sign) for i in range(3)])

    reached, _ = study(constants)
    assert (reached.error(row("B09").parts[part]) <= row("B09").tolerance).all(), reached.limit


def test_rod_b17():
    """Lateral motion held: with Poisson's ratio 0 it is none of the rod's business."""

    def rod(cells: int) -> np.ndarray:
        mesh = box_mesh("hex20", (cells, 1, 1), (10.0, 1.0, 1.0))
        return solve(model(mesh, supports=(CLAMPED, plane(mesh, "uy", "uz"))), 3).freq_hz

    check(study(rod, (4, 8, 16)), row("B17").values, row("B17").tolerance, FOURTH)


def shaft(width: float, depth: float, length: float, cells: tuple[int, int, int], count: int) -> np.ndarray:
    """Torsional frequencies of a bar of section 2·width × 2·depth, held against turning and free to warp at x = 0.

    A quarter of the section: on the planes of symmetry, torsion moves across the other axis only.
    """
    mesh = box_mesh("hex20", cells, (length, width, depth))
    return solve(
        model(
            mesh,
            STEEL,
            supports=(
                Support("fork", Selector(group="x0"), ("uy", "uz")),
                Support("y", Selector(group="y0"), ("ux", "uz")),
                Support("z", Selector(group="z0"), ("ux", "uy")),
            ),
        ),
        count,
    ).freq_hz


def test_square_shaft_b18():
    check(
        study(lambda n: shaft(1.0, 1.0, 10.0, (n, n // 2, n // 2), 3), (2, 4, 8)),
        row("B18").values,
        row("B18").tolerance,
        FOURTH,
    )


@pytest.mark.parametrize(("index", "ratio"), list(enumerate([1, 1.5, 2, 2.5, 3, 4, 5, 10])))
def test_torsion_coefficients_b20(index, ratio):
    """From the lowest torsional frequency f = √(G J / ρ I_p) / 4L of a bar 60 times as long as wide."""
    assert "a/b=1,1.5,2,2.5,3,4,5,10" in row("B20").quantity
    half_a, half_b, length = 0.5 * ratio, 0.5, 60.0 * ratio
    shear = STEEL.youngs_modulus / 2.6
    polar = ratio * (ratio**2 + 1) / 12

    def coefficient(n: int) -> np.ndarray:
        found = shaft(half_a, half_b, length, (4, max(n, round(n * min(ratio, 3))), n), 1)
        return (4 * length * found) ** 2 * STEEL.density * polar / shear / ratio

    reached, _ = study(coefficient, (1, 2, 4))
    assert reached.error(row("B20").values[index]) <= row("B20").tolerance


def test_rigid_body_counts_b21():
    solid, plate, membrane, axisymmetric, rod = row("B21").values
    box = box_mesh("hex8", (3, 2, 2), (1.0, 0.5, 0.4))

    def count(design: Design) -> int:
        return int((solve(design, 9).freq_hz == 0).sum())

    sheet = plate_mesh("quad4", (4, 3), (1.0, 0.7))

    def shell(*held: str) -> Design:
        return Design("sheet", sheet, Physics({"s": STEEL}, (Assignment("*", "s", 0.01),), (plane(sheet, *held),)))

    assert count(model(box, STEEL)) == solid
    assert count(shell("ux", "uy", "rz")) == plate
    assert count(shell("uz", "rx", "ry")) == membrane
    assert count(model(box, BAR, supports=(plane(box, "uy", "uz"),))) == rod
    # Bodies of revolution: two planes of symmetry leave the motion along the axis (and even harmonics, all elastic).
    quarter = (Support("y", Selector(group="y0"), ("uy",)), Support("z", Selector(group="z0"), ("uz",)))
    assert count(model(box, STEEL, supports=quarter)) == axisymmetric


def test_cantilever_with_tip_mass_b24():
    assert row("B24").inputs == "mu=1"
    tip = LumpedMass("tip", Selector(group="x1"), MASS)
    check(
        study(lambda n: beta(solve(beam(n, (CLAMPED,), masses=(tip,)), 3))),
        row("B24").values,
        row("B24").tolerance,
        SECOND,
    )


@pytest.mark.parametrize(("index", "ratio"), list(enumerate([1, 10, 100, 1000])))
def test_cantilever_with_tip_spring_b26(index, ratio):
    assert row("B26").inputs == "1|10|100|1000"
    total = ratio * BAR.youngs_modulus * INERTIA / LENGTH**3

    def first(cells: int) -> np.ndarray:
        nodes = len(box_mesh("hex20", (cells, 1, 1), (1, 1, 1)).node_groups["x1"])
        spring = Spring("tip", Selector(group="x1"), None, [0, total / nodes, 0, 0, 0, 0])
        return beta(solve(beam(cells, (CLAMPED,), springs=(spring,)), 1))

    reached, _ = study(first)
    assert reached.error(row("B26").values[index]) <= row("B26").tolerance


def tube(around: int, inner: float, outer: float, length: float, along: int) -> Mesh:
    """A quarter of a round tube, one layer of 27-node hexahedra; arguments in mm as in the rows, mesh in m."""
    flat = box_mesh("hex27", (along, 1, around), (length, 1.0, 1.0))
    x, t, s = flat.points.T
    radius, angle = inner + (outer - inner) * t, 0.5 * np.pi * s
    points = np.stack([x, radius * np.cos(angle), radius * np.sin(angle)], axis=1)
    groups = {"x0": flat.node_groups["x0"], "z0": flat.node_groups["z0"], "y0": flat.node_groups["z1"]}
    return flat.with_(points=1e-3 * points, node_groups=groups)


def test_closed_round_tube_t01_t04():
    """Torsion constant from the lowest torsional frequency and the model's own polar inertia, thick wall (T04);
    Bredt's value (T01) lies 0.04 % below it, within the tolerance."""
    assert row("T04").quantity.startswith("exact thick tube")
    length, outer, inner = 4.0, 51.0, 49.0
    shear = STEEL.youngs_modulus / 2.6

    def constant(n: int) -> np.ndarray:
        mesh = tube(n, inner, outer, 1e3 * length, 4)
        design = model(
            mesh,
            STEEL,
            supports=(
                Support("fork", Selector(group="x0"), ("uy", "uz")),
                Support("y", Selector(group="y0"), ("ux", "uz")),
                Support("z", Selector(group="z0"), ("ux", "uy")),
            ),
        )
        system = assemble(design)
        spin = np.zeros_like(mesh.points)
        spin[:, 1], spin[:, 2] = -mesh.points[:, 2], mesh.points[:, 1]
        vector = system.gather(spin)
        polar = 4 * vector @ system.M @ vector / length  # kg m, the whole tube
        return 1e12 * (4 * length * solve(design, 1).freq_hz) ** 2 * polar / shear

    reached, _ = study(constant, (2, 4, 8))
    assert reached.error(row("T04").values[0]) <= row("T04").tolerance
    assert reached.error(row("T01").values[0]) <= row("T01").tolerance
