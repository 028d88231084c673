"""NAFEMS free-vibration benchmarks (topic 3 of tests/data/checks.csv) that solids, shell strips and masses express,
and the cantilever plate of row P02 from one layer of 8-node hexahedra. Plates and the membrane: test_plates.py.

Three meshes each, limits by Richardson's rule against max(row's tolerance, 1e-3), unless said otherwise. Sources
stand in the rows; what is left out, and why: left_out.md.
"""

from __future__ import annotations

import re
from collections.abc import Callable

import numpy as np
import pytest

from tests.checks.reference import richardson, row
from tests.meshes import box_mesh
from viewer.mechanics.eigen import solve
from viewer.model.design import Assignment, Design, LumpedMass, Material, Physics, Selector, Spring, Support
from viewer.model.mesh import CellBlock, Mesh

STEEL = Material("steel", 200e9, 0.3, 8000.0)


def model(mesh: Mesh, material: Material = STEEL, thickness: float | None = None, **physics) -> Design:
    return Design(
        "case", mesh, Physics({material.name: material}, (Assignment("*", material.name, thickness),), **physics)
    )


def nodes(mesh: Mesh, where: np.ndarray) -> Selector:
    return Selector(nodes=mesh.node_ids[where])


# N01 --------------------------------------------------------------------------------------------------------------


def double_cross(cells: int) -> Design:
    """Eight arms as strips of sheet standing on the plane, joined along the centre line.

    Bending of a strip in the plane is plate bending of its thickness; with Poisson's ratio 0 a strip is a beam of the
    square section. The joint passes on the turning about the centre line, as a welded frame does.
    """
    length, side = 5.0, 0.125
    x = np.linspace(0, length, cells + 1)[1:]
    points, quads = [[0, 0, 0], [0, 0, side]], []
    for arm in range(8):
        along = np.array([np.cos(arm * np.pi / 4), np.sin(arm * np.pi / 4)])
        lower, upper = 0, 1
        for distance in x:
            at = len(points)
            points += [[*(distance * along), 0], [*(distance * along), side]]
            quads.append([lower, at, at + 1, upper])
            lower, upper = at, at + 1
    mesh = Mesh(np.array(points), (CellBlock("quad4", quads, np.arange(len(quads))),), np.arange(len(points)))
    ends = np.isclose(np.linalg.norm(mesh.points[:, :2], axis=1), length)
    return model(
        mesh,
        Material("beam", 200e9, 0.0, 8000.0),
        side,
        supports=(
            Support("pins", nodes(mesh, ends), ("ux", "uy")),
            Support("plane", Selector(nodes=mesh.node_ids), ("uz", "rx", "ry")),
        ),
    )


def test_double_cross_n01():
    """Against the values computed from beam theory that stand in the row's last column: its value column writes the
    pairs, in which the joint moves, as if they equalled the fives."""
    listed = re.findall(r"([\d.]+)(?:x(\d))?", row("N01").status.split("(")[1])
    expected = np.array([float(value) for value, times in listed for _ in range(int(times or 1))])
    assert len(expected) == len(row("N01").values) == 16
    np.testing.assert_allclose(expected, row("N01").values, rtol=row("N01").tolerance)
    found = [solve(double_cross(n), 16).freq_hz for n in (16, 32, 64)]
    reached = richardson(*found)
    assert (reached.error(expected) <= row("N01").tolerance).all(), reached.limit / expected - 1
    assert ((reached.rate > 1.8) & (reached.rate < 2.3)).all(), reached.rate


# N02 --------------------------------------------------------------------------------------------------------------


def round_bar(cells: int, length: float, diameter: float) -> Mesh:
    """A bar along x of 2 × 2 hex20 a section, the square bulged to a circle; group names as in ``box_mesh``."""
    flat = box_mesh("hex20", (cells, 2, 2), (length, 2.0, 2.0))
    y, z = flat.points[:, 1] - 1, flat.points[:, 2] - 1
    disc = np.stack([y * np.sqrt(1 - z**2 / 2), z * np.sqrt(1 - y**2 / 2)], axis=1)  # square to disc, smooth inside
    return flat.with_(points=np.column_stack([flat.points[:, 0], 0.5 * diameter * disc]))


def test_off_centre_masses_n02():
    """The arms start from a rigid end: a cap of 0.25 m, a thousand times as stiff as steel and without weight, since
    a footprint alone leaves the end section free to deform. Modes 5 and 6: left_out.md."""
    expected = np.array(row("N02").values)[:4]
    cap = Material("cap", 1e3 * STEEL.youngs_modulus, STEEL.poisson, 1e-3)

    def values(cells: int) -> np.ndarray:
        mesh = round_bar(cells + 1, 10.0 + 10.0 / cells, 0.5)
        x = mesh.points[:, 0]
        points = mesh.points.copy()
        points[:, 0] = np.where(x > 10, 10 + (x - 10) * 0.25 * cells / 10, x)
        centres = points[mesh.blocks[0].nodes].mean(axis=1)[:, 0]
        mesh = mesh.with_(points=points, cell_groups={"cap": np.nonzero(centres > 10)[0]})
        tip = Selector(group="x1")
        design = Design(
            "case",
            mesh,
            Physics(
                {"steel": STEEL, "cap": cap},
                (Assignment("*", "steel"), Assignment("cap", "cap")),
                supports=(Support("A", Selector(group="x0")),),
                masses=(
                    LumpedMass("heavy", tip, 10000.0, [10.0, 2.0, 0.0]),
                    LumpedMass("light", tip, 1000.0, [10.0, -2.0, 0.0]),
                ),
            ),
        )
        return solve(design, 4).freq_hz

    reached = richardson(*(values(n) for n in (10, 20, 40)))
    assert (reached.error(expected) <= row("N02").tolerance).all(), reached.limit / expected - 1
    assert ((reached.rate > 1.0) & (reached.rate < 2.3)).all(), reached.rate  # the clamped edge is singular


# N03, N04 ---------------------------------------------------------------------------------------------------------


def bending(n: int) -> np.ndarray:
    """10 × 2 × 2 m, bending along y: a quarter of the section, both end sections held along y, free to turn."""
    mesh = box_mesh("hex20", (5 * n, n, n), (10.0, 1.0, 1.0))
    ends = np.union1d(mesh.node_groups["x0"], mesh.node_groups["x1"])
    return solve(
        model(
            mesh,
            supports=(
                Support("symmetric", Selector(group="z0"), ("uz",)),
                Support("antisymmetric", Selector(group="y0"), ("ux", "uz")),
                Support("ends", nodes(mesh, ends), ("uy",)),
            ),
        ),
        3,
    ).freq_hz


def stretching(n: int) -> np.ndarray:
    mesh = box_mesh("hex20", (5 * n, n, n), (10.0, 1.0, 1.0))
    return solve(
        model(
            mesh,
            supports=(
                Support("A", Selector(group="x0"), ("ux",)),
                Support("y", Selector(group="y0"), ("uy",)),
                Support("z", Selector(group="z0"), ("uz",)),
            ),
        ),
        1,
    ).freq_hz


def twisting(n: int) -> np.ndarray:
    mesh = box_mesh("hex20", (5 * n, n, n), (10.0, 1.0, 1.0))
    return solve(
        model(
            mesh,
            supports=(
                Support("A", Selector(group="x0"), ("uy", "uz")),
                Support("y", Selector(group="y0"), ("ux", "uz")),
                Support("z", Selector(group="z0"), ("ux", "uy")),
            ),
        ),
        2,
    ).freq_hz


def test_deep_beam_n03_n04():
    """Each family of modes on a quarter of the section, told apart by the symmetry of its motion.

    N03: first bending, torsion and stretching (higher bending: left_out.md). N04: bending and stretching; its torsion
    takes the polar moment, which no solid does.
    """
    bend, stretch, twist = (richardson(*(case(n) for n in (1, 2, 4))) for case in (bending, stretching, twisting))
    early, late = row("N03"), row("N04")
    bend_1, _, tors_1, ext, bend_2, _, tors_2, bend_3, _ = early.values
    assert early.text.startswith("flex 42.650 x2; tors 71.20; ext 125.00; flex 148.15 x2; tors")
    assert (twist.error([tors_1, tors_2]) <= early.tolerance).all()
    assert (stretch.error([ext]) <= early.tolerance).all()
    assert bend.error([bend_1, bend_2, bend_3])[0] <= early.tolerance
    assert (bend.error([late.values[0], late.values[3], late.values[5]]) <= late.tolerance).all()
    assert (stretch.error([late.values[2]]) <= late.tolerance).all()
    for found in (bend, twist):
        assert ((found.rate > 3.3) & (found.rate < 4.7)).all(), found.rate


# N14 --------------------------------------------------------------------------------------------------------------


def hollow_cylinder(n: int) -> np.ndarray:
    """A sector of 4 degrees, one cell around; springs of 1e16 N/m a node hold its sides against leaving their planes
    (a ten-thousandth of a per cent of the hoop stiffness is left)."""
    flat = box_mesh("hex20", (5 * n, n, 1), (10.0, 0.4, 1.0))
    half = np.radians(2.0)
    radius, angle = 1.8 + flat.points[:, 1], half * (2 * flat.points[:, 2] - 1)
    mesh = flat.with_(points=np.column_stack([flat.points[:, 0], radius * np.cos(angle), radius * np.sin(angle)]))
    sides = tuple(
        Spring(side, Selector(group=side), None, axis=[0, -np.sin(turn), np.cos(turn)], axial=1e16)
        for side, turn in (("z0", -half), ("z1", half))
    )
    found = solve(model(mesh, springs=sides), 6).freq_hz
    assert found[0] == 0
    return found[1:]


def test_free_hollow_cylinder_n14():
    reached = richardson(*(hollow_cylinder(n) for n in (1, 2, 4)))
    assert (reached.error(row("N14").values) <= row("N14").tolerance).all()
    assert ((reached.rate > 3.0) & (reached.rate < 4.7)).all(), reached.rate


# N16, N17 ---------------------------------------------------------------------------------------------------------


def solid_plate(n: int, layers: int, count: int) -> tuple[np.ndarray, np.ndarray]:
    """Frequencies, and the share of the motion that is across the plate."""
    mesh = box_mesh("hex20", (n, n, layers), (10.0, 10.0, 1.0))
    rim = np.unique(np.concatenate([mesh.node_groups[side] for side in ("x0", "x1", "y0", "y1")]))
    lower = np.intersect1d(rim, mesh.node_groups["z0"])
    modes = solve(model(mesh, supports=(Support("edges", nodes(mesh, lower), ("uz",)),)), count)
    moved = modes.shapes.moved**2
    return modes.freq_hz, moved[:, :, 2].sum(axis=1) / moved.sum(axis=(1, 2))


def test_solid_plate_in_plane_n16():
    def values(n: int, layers: int) -> np.ndarray:
        frequencies, across = solid_plate(n, layers, 15)
        return frequencies[(across < 0.1) & (frequencies > 0)][:3]

    found = [values(n, max(1, n // 4)) for n in (2, 4, 8)]
    reached = richardson(*found)
    assert (reached.error(row("N16").values) <= row("N16").tolerance).all(), reached.limit


def test_solid_plate_out_of_plane_n17():
    """The row's own mesh, 4 × 4 × 1 of 20-node hexahedra: held on lines, the frequencies of a solid fall with every
    finer mesh, so that nothing is extrapolated."""
    assert "HEX20 4x4x1: 44.762;110.52;169.08" in row("N17").text
    first, second, third = row("N17").values[-3:]
    frequencies, across = solid_plate(4, 1, 10)
    np.testing.assert_allclose(
        frequencies[(across > 0.5) & (frequencies > 0)][:4],
        [first, second, second, third],
        rtol=row("N17").tolerance,
    )
    finer, _ = solid_plate(8, 2, 4)
    assert finer[3] < frequencies[3]


# P02 from one layer of 8-node hexahedra ------------------------------------------------------------------------


def leaning(points: np.ndarray, n: int, angle: float) -> np.ndarray:
    """Cells lean by ``angle`` degrees: inner nodes of every second column are shifted along it by tan(angle) of a
    cell, at the far edge by at most three quarters."""
    points = points.copy()
    inner = (points[:, 1] > 1e-9) & (points[:, 1] < 1 - 1e-9) & (np.rint(points[:, 0] * n) % 2 == 1)
    points[inner, 1] = np.minimum(points[inner, 1] + np.tan(np.radians(angle)) / n, 1 - 0.25 / n)
    return points


def crooked(points: np.ndarray, n: int, share: float) -> np.ndarray:
    """Corners inside moved by up to ``share`` of a cell's edge in the plane, the same at both faces."""
    points = points.copy()
    inside = ((points[:, :2] > 1e-9) & (points[:, :2] < 1 - 1e-9)).all(axis=1)
    column = np.rint(points[inside, :2] * n).astype(int)
    shift = np.random.default_rng(1).uniform(-share / n, share / n, (n + 1, n + 1, 2))
    points[inside, :2] += shift[column[:, 0], column[:, 1]]
    return points


def layer(
    n: int, moved: Callable[[np.ndarray, int, float], np.ndarray], amount: float
) -> tuple[np.ndarray, np.ndarray]:
    """λ of the first six modes of a cantilever plate of n × n × 1 cells, 20 times as long as thick, and of the same
    grid of 4-node shells."""
    thickness = 1 / (20 * n)
    mesh = box_mesh("hex8", (n, n, 1), (1.0, 1.0, thickness))
    mesh = mesh.with_(points=moved(mesh.points, n, amount))
    clamp = Support("clamp", Selector(group="x0"))
    solid = solve(model(mesh, supports=(clamp,)), 6).freq_hz
    # The lower face as a shell: every second row of nodes.
    grid = Mesh(
        mesh.points[::2] * [1, 1, 0],
        (CellBlock("quad4", mesh.blocks[0].nodes[:, :4] // 2, mesh.blocks[0].ids),),
        np.arange(1, mesh.n_nodes // 2 + 1),
        node_groups={"x0": mesh.node_groups["x0"][::2] // 2},
    )
    plane = Support("plane", Selector(nodes=grid.node_ids), ("ux", "uy", "rz"))
    shell = solve(model(grid, thickness=thickness, supports=(clamp, plane)), 6).freq_hz
    rigidity = STEEL.youngs_modulus * thickness**3 / (12 * (1 - STEEL.poisson**2))
    scale = 2 * np.pi * np.sqrt(STEEL.density * thickness / rigidity)
    return scale * solid, scale * shell


@pytest.mark.parametrize(
    ("moved", "amount", "tolerance"),
    [(leaning, 0.0, 0.02), (leaning, 30.0, 0.05), (crooked, 0.2, 0.02)],
    ids=["square", "lean", "crooked"],
)
def test_one_layer_of_hexahedra_as_cantilever_plate_p02(moved, amount, tolerance):
    """All six modes on 16 × 16 cells. What is left is the error of the grid: shells on it have the same to 1e-3."""
    solid, shell = layer(16, moved, amount)
    np.testing.assert_allclose(solid, row("P02").values, rtol=tolerance)
    np.testing.assert_allclose(solid, shell, rtol=1e-3)
