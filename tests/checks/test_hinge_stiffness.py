"""Rotational stiffness of grooves and notches: topic 11 of tests/data/checks.csv, solved by our elements.

Statics: one end held, the other turned as a plane section that is free to swell, stiffness K of assembly; the
stiffness is twice the energy over the square of the angle. Limits over three meshes by Richardson's rule. The same
stiffness is then read off a mode of a part with that groove or notch by the search for hinge lines.

Sources stand in the rows. H02 and H03 are formulas of beam theory, which beams of ours reproduce; the solid lies
below (H05), since sections of so steep a notch do not stay plane.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad

from tests.checks.reference import FLOOR, richardson, row
from tests.meshes import box_mesh, line_mesh, plate_mesh
from viewer.insight.hinges import find_hinges
from viewer.mechanics.assembly import assemble
from viewer.mechanics.eigen import solve
from viewer.mechanics.factor import factorise
from viewer.model.design import Assignment, Design, Material, Physics, Section, Selector, Support
from viewer.model.mesh import Mesh

E, WIDTH, RADIUS = 70e9, 0.01, 0.005  # of rows H01, H02, H03, H05
WEB = {"H02": 0.001, "thin": 0.0005}  # thickness left by the notch


def model(mesh: Mesh, poisson: float = 0.3, modulus: float = E, thickness: float | None = None, **physics) -> Design:
    material = Material("metal", modulus, poisson, 2700.0)
    return Design("flexure", mesh, Physics({"metal": material}, (Assignment("*", "metal", thickness),), **physics))


def at(mesh: Mesh, **where: float) -> np.ndarray:
    """Node rows on the planes given, x=0.01 and the like."""
    planes = [np.isclose(mesh.points[:, "xyz".index(axis)], value, atol=1e-9) for axis, value in where.items()]
    return np.nonzero(np.logical_and.reduce(planes))[0]


def held(mesh: Mesh, rows: np.ndarray, *directions: str) -> Support:
    return Support(" ".join(directions), Selector(nodes=mesh.node_ids[rows]), directions)


def turned(design: Design, prescribed: dict[str, tuple[np.ndarray, np.ndarray]]) -> float:
    """Twice the strain energy when directions of nodes move as given, {direction: (rows, values)}: the stiffness
    when the values are those of one radian. All else is free or held by the design's supports."""
    system = assemble(design)
    moved = np.zeros(system.n_dof)
    fixed = np.array(system.held)
    for direction, (rows, values) in prescribed.items():
        numbers = system.dof[rows, ("ux", "uy", "uz", "rx", "ry", "rz").index(direction)]
        moved[numbers], fixed[numbers] = values, True
    free = np.nonzero(~fixed)[0]
    moved[free] = factorise(system.K[free][:, free], definite=True).solve(-(system.K @ moved)[free])
    return float(moved @ system.K @ moved)


def brick_strip(cells: int, length: float, width: float, thickness: float, poisson: float, plane: bool) -> float:
    """A strip along x of 20-node bricks; the end turns about y. ``plane``: no strain along y."""
    mesh = box_mesh("hex20", (cells, 1, 1), (length, width, thickness))
    mesh = mesh.with_(points=mesh.points - [0, width / 2, thickness / 2])
    kept = np.arange(mesh.n_nodes) if plane else at(mesh, x=0, y=0)
    supports = (held(mesh, at(mesh, x=0), "ux"), held(mesh, at(mesh, x=0, z=0), "uz"), held(mesh, kept, "uy"))
    end = at(mesh, x=length)
    return turned(model(mesh, poisson, supports=supports), {"ux": (end, mesh.points[end, 2])})


def sheet_strip(cells: int, length: float, width: float, thickness: float, modulus: float, poisson: float) -> float:
    """A strip along x of shells between two planes of symmetry; the end turns about y."""
    mesh = plate_mesh("quad4", (cells, 2), (length, width))
    sides = np.union1d(at(mesh, y=0), at(mesh, y=width))
    supports = (held(mesh, at(mesh, x=0), "ux", "uy", "uz", "rx", "ry", "rz"), held(mesh, sides, "uy", "rx"))
    end = at(mesh, x=length)
    design = model(mesh, poisson, modulus, thickness, supports=supports)
    return turned(design, {"ry": (end, np.ones(len(end)))})


@pytest.mark.parametrize("solved", ["bricks", "shells"])
def test_uniform_flexure_h01(solved):
    """A beam: Poisson's ratio plays no part in E I / L, with 0 there is no end effect either."""
    length, thickness = 0.01, 0.001
    values = [
        brick_strip(n, length, WIDTH, thickness, 0.0, plane=False)
        if solved == "bricks"
        else sheet_strip(n, length, WIDTH, thickness, E, 0.0)
        for n in (2, 4, 8)
    ]
    found = richardson(*values)
    assert found.error(row("H01").values[0]) < max(row("H01").tolerance, FLOOR)


def test_a_short_flexure_lies_between_beam_and_plate():
    """With Poisson's ratio a strip as wide as long is stiffer than the beam of H01, softer than the plate."""
    length, thickness, nu = 0.01, 0.001, 0.3
    mesh = plate_mesh("quad4", (16, 16), (length, WIDTH))
    clamp = held(mesh, at(mesh, x=0), "ux", "uy", "uz", "rx", "ry", "rz")
    end = at(mesh, x=length)
    straight = {"ry": (end, np.ones(len(end))), "rx": (end, np.zeros(len(end)))}
    found = turned(model(mesh, nu, thickness=thickness, supports=(clamp,)), straight)
    beam = row("H01").values[0]
    assert beam * 1.01 < found < beam / (1 - nu**2)


@pytest.mark.parametrize("solved", ["bricks", "shells"])
def test_groove_line_h06(solved):
    modulus, nu, thickness, length, width = 45e9, 0.35, 0.0005, 0.001, 0.002
    values = [
        brick_strip(n, length, width, thickness, nu, plane=True) * modulus / E
        if solved == "bricks"
        else sheet_strip(n, length, width, thickness, modulus, nu)
        for n in (2, 4, 8)
    ]
    found = richardson(*values)
    assert found.error(row("H06").values[0] * width) < max(row("H06").tolerance, FLOOR)


def height(x: np.ndarray | float, web: float) -> np.ndarray | float:
    """Of the section of a notch between two half circles, −R ≤ x ≤ R."""
    return web + 2 * (RADIUS - np.sqrt(RADIUS**2 - np.square(x)))


def beam_notch(cells: int, web: float) -> float:
    """The notch as beams of one height each, that in their middle."""
    edges = np.linspace(-RADIUS, RADIUS, cells + 1)
    mesh = line_mesh(np.stack([edges, 0 * edges, 0 * edges], axis=1))
    groups = {f"cell{i}": np.array([i]) for i in range(cells)}
    sections = tuple(
        Assignment(
            f"cell{i}",
            "metal",
            formulation="line2-slender",
            section=Section("rectangle", width=WIDTH, height=float(height(middle, web))),
            orientation=(0.0, 0.0, 1.0),
        )
        for i, middle in enumerate((edges[1:] + edges[:-1]) / 2)
    )
    mesh = mesh.with_(cell_groups=groups)
    metal = {"metal": Material("metal", E, 0.3, 2700.0)}
    root = held(mesh, at(mesh, x=-RADIUS), "ux", "uy", "uz", "rx", "ry", "rz")
    design = Design("notch", mesh, Physics(metal, sections, supports=(root,)))
    return turned(design, {"ry": (at(mesh, x=RADIUS), np.ones(1))})


def test_notch_of_beams_h02_h03():
    web = WEB["H02"]
    integral, _ = quad(lambda x: 12 / (E * WIDTH * height(x, web) ** 3), -RADIUS, RADIUS, epsabs=0, epsrel=1e-12)
    assert 1 / integral == pytest.approx(row("H02").values[0], rel=row("H02").tolerances[0])
    found = richardson(*(beam_notch(n, web) for n in (24, 48, 96)))
    assert found.error(row("H02").values[0]) < max(row("H02").tolerance, FLOOR)
    assert 1.5 < found.rate < 2.3  # second order, less at the ends where the height starts like a root
    short = 2 * E * WIDTH * web**2.5 / (9 * np.pi * np.sqrt(RADIUS))
    assert short == pytest.approx(row("H03").values[0], rel=row("H03").tolerances[0])
    # The short formula is the first term for a thin web: it comes closer as the web gets thinner.
    gaps = []
    for thin in (web, web / 4):
        exact, _ = quad(
            lambda x, t=thin: 12 / (E * WIDTH * height(x, t) ** 3), -RADIUS, RADIUS, epsrel=1e-10, limit=200
        )
        gaps.append(1 - 2 * E * WIDTH * thin**2.5 / (9 * np.pi * np.sqrt(RADIUS)) * exact)
    assert 0 < gaps[1] < gaps[0] / 2


def notch_points(places: np.ndarray, web: float, beyond: float) -> np.ndarray:
    """Places (s, y, r) of a box to a quarter of the notch: s from the throat (0) along the arc to its end (1) and on
    to the end of the block (2), r from the middle (0) to the surface (1). ``beyond`` m is the length of the block."""
    s, y, r = places.T
    arc = np.pi / 2 * np.minimum(s, 1) * (0.3 + 0.7 * np.minimum(s, 1) ** 2)  # finer at the throat
    block = np.maximum(s - 1, 0)
    top_x, top_z = RADIUS * np.sin(arc) + block * beyond, web / 2 + RADIUS * (1 - np.cos(arc))
    foot = 1.4 * RADIUS  # below the end of the arc: lines from there to the arc cross it at an angle
    mid_x = foot * arc / (np.pi / 2) + block * (RADIUS + beyond - foot)
    return np.stack([mid_x + r * (top_x - mid_x), y, r * top_z], axis=1)


def solid_notch(cells: int, web: float, poisson: float = 0.3) -> float:
    """N·m/rad of the notch between blocks whose far faces stay plane, in plane stress: a slice much thinner than the
    web, free at its sides. A quarter: bending is even about the throat and odd about the middle."""
    slice_ = web / 20
    mesh = box_mesh("hex20", (3 * cells, 1, cells), (2.0, slice_, 1.0))
    mesh = mesh.with_(points=notch_points(mesh.points, web, RADIUS))
    end = at(mesh, x=2 * RADIUS)
    supports = (
        held(mesh, np.union1d(at(mesh, x=0), at(mesh, z=0)), "ux"),
        held(mesh, at(mesh, x=0, z=0), "uz"),
        held(mesh, at(mesh, y=0), "uy"),  # half the slice
    )
    energy = turned(model(mesh, poisson, supports=supports), {"ux": (end, mesh.points[end, 2])})
    # Four quarters hold the energy of a notch that folds by 2 rad: 4 · energy = k · 2².
    return energy * WIDTH / slice_


@pytest.mark.parametrize("web", [0, 1])
def test_notch_in_plane_stress_h05(web):
    expected = row("H05").values
    thickness = list(WEB.values())[web]
    values = [solid_notch(n, thickness) for n in (4, 8, 16)]
    found = richardson(*values)
    wanted = expected[web]
    assert found.error(wanted) < row("H05").tolerance
    full, _ = quad(lambda x: 12 / (E * WIDTH * height(x, thickness) ** 3), -RADIUS, RADIUS, epsrel=1e-10)
    below = 1 - float(found.limit) * full
    assert below == pytest.approx((0.07, 0.037)[web], abs=0.005)


CLOSE = 0.15  # of a stiffness from a mode to one from a static solution: the bound the search answers for


def line_found(part: Design, where: float):
    """The one hinge line that the search names in the first mode; it must lie across x at ``where``."""
    finding = find_hinges(part, solve(part, 1), 1)
    assert finding.verdict == "hinges"
    (hinge,) = finding.hinges
    assert hinge.label == "strong"
    assert abs(hinge.position[0] - where) < 0.01 * part.mesh.diagonal
    assert abs(hinge.direction[1]) > np.cos(np.radians(3))
    return hinge


def test_stiffness_of_a_groove_from_a_mode_h06():
    """A clamped sheet, four times as thick as the web of its groove, which is that of row H06."""
    modulus, nu, thickness, length, width = 45e9, 0.35, 0.0005, 0.001, 0.06
    beside = np.cumsum(np.minimum(length / 4 * 1.4 ** np.arange(40), 0.004))  # cells grow away from the groove
    beside = beside[beside < 0.04]
    beside *= 0.04 / beside[-1]
    fine = np.linspace(0, length, 5)
    lines = np.concatenate([[0.0], 0.04 - beside[-2::-1], 0.04 + fine, 0.04 + length + beside])
    mesh = plate_mesh("quad4", (len(lines) - 1, 16), (1.0, width))
    points = np.array(mesh.points)
    points[:, 0] = np.interp(points[:, 0], np.linspace(0, 1, len(lines)), lines)
    centres = points[mesh.blocks[0].nodes].mean(axis=1)[:, 0]
    groove = np.nonzero((centres > 0.04) & (centres < 0.04 + length))[0]
    mesh = mesh.with_(points=points, cell_groups={"groove": groove})
    root = held(mesh, at(mesh, x=0), "ux", "uy", "uz", "rx", "ry", "rz")
    sheet = model(mesh, nu, modulus, 4 * thickness, supports=(root,))
    thin = (*sheet.physics.assignments, Assignment("groove", "metal", thickness))
    part = sheet.with_(physics=Physics(sheet.physics.materials, thin, supports=(root,)))
    hinge = line_found(part, 0.04 + length / 2)
    # The web alone, its edges kept straight by the thick sheet, free at its ends: nearly the plate strip of the row.
    web = plate_mesh("quad4", (4, 64), (length, width))
    clamp = held(web, at(web, x=0), "ux", "uy", "uz", "rx", "ry", "rz")
    end = at(web, x=length)
    straight = {"ry": (end, np.ones(len(end))), "rx": (end, np.zeros(len(end)))}
    static = turned(model(web, nu, modulus, thickness, supports=(clamp,)), straight)
    assert static == pytest.approx(row("H06").values[0] * width, rel=0.02)
    assert hinge.stiffness == pytest.approx(static, rel=CLOSE)


def notched_bar(cells: int, width: float, beyond: float) -> Mesh:
    """The notch of row H02 between two blocks, whole, of 20-node bricks."""
    mesh = box_mesh("hex20", (4 * cells, 3, 4), (4.0, width, 2.0))
    s, y, r = mesh.points.T - np.array([[2.0], [0.0], [1.0]])
    points = notch_points(np.stack([np.abs(s), y, np.abs(r)], axis=1), WEB["H02"], beyond)
    return mesh.with_(points=points * np.stack([np.sign(s), np.ones_like(s), np.sign(r)], axis=1))


def test_stiffness_of_a_notch_from_a_mode_h02():
    width, beyond = 0.06, 0.03
    part = notched_bar(4, width, beyond)
    root = held(part, at(part, x=-RADIUS - beyond), "ux", "uy", "uz")
    hinge = line_found(model(part, supports=(root,)), 0.0)
    cut = notched_bar(4, width, RADIUS)
    first, last = at(cut, x=-2 * RADIUS), at(cut, x=2 * RADIUS)
    middle = [held(cut, at(cut, x=-2 * RADIUS, z=0), "uz"), held(cut, at(cut, x=-2 * RADIUS, y=0, z=0), "uy")]
    static = turned(model(cut, supports=(held(cut, first, "ux"), *middle)), {"ux": (last, cut.points[last, 2])})
    # Wider than high, the web is a plate rather than a beam in plane stress (H05).
    beam = row("H05").values[0] * width / WIDTH
    assert beam < static < beam / (1 - 0.3**2)
    assert hinge.stiffness == pytest.approx(static, rel=CLOSE)
