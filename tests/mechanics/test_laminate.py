"""Layered and directional sheets, and sheets off their nodes: matrices by hand, closed forms, composite beams."""

from __future__ import annotations

import numpy as np
import pytest

from tests.checks.reference import richardson
from tests.mechanics.models import STEEL, design
from tests.mechanics.test_shell import cells, rigid
from tests.meshes import box_mesh, plate_mesh
from viewer.errors import ModelError
from viewer.mechanics.assembly import assemble, lay_out
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import energies
from viewer.mechanics.laminate import mass_moments, sheet
from viewer.mechanics.shell import PARTS, SHELLS
from viewer.model.design import (
    Assignment,
    Design,
    Directional,
    Layer,
    Material,
    Physics,
    Ply,
    Property,
    Section,
    Selector,
    Support,
)
from viewer.model.mesh import CellBlock, Mesh

FORMS = pytest.mark.parametrize("form", SHELLS[::2], ids=lambda form: form.name)
KINDS = pytest.mark.parametrize("kind", ["quad4", "tri3"])
# a graphite–epoxy ply in round numbers (common practice, no source)
PLY = Material("ply", 140e9, 0.25, 1600.0, Directional(140e9, 10e9, 0.25, 5e9, 5e9, 4e9))
FOAM = Material("foam", 70e6, 0.3, 60.0)
ALUMINIUM = Material("aluminium", 70e9, 0.33, 2700.0)


def stack(*layers, material=PLY, **more) -> Property:
    """Layers (thickness, angle) of one material."""
    found = tuple(Layer(material, thickness, angle) for thickness, angle in layers)
    return Property(material, sum(t for t, _ in layers), layers=found, direction=(1, 0.2, 0.1), **more)


# ---------------------------------------------------------------- matrices


def test_ply_matrices_by_hand():
    """Q of Jones 1999, § 2.6: Q11 = E1/(1 − ν12 ν21), Q16 at 45° = (Q11 − Q22)/4, and [0/90] coupling
    B11 = −B22 = (E2-side − E1-side) t²/8."""
    scale = 1 / (1 - 0.25**2 * 10 / 140)
    q11, q12, q22, q66 = 140e9 * scale, 0.25 * 10e9 * scale, 10e9 * scale, 5e9
    one = sheet(stack((1e-3, 0)))
    np.testing.assert_allclose(one.membrane, 1e-3 * np.array([[q11, q12, 0], [q12, q22, 0], [0, 0, q66]]))
    np.testing.assert_allclose(one.bending, one.membrane * 1e-6 / 12)
    np.testing.assert_allclose(one.shear, 5 / 6 * 1e-3 * np.diag([5e9, 4e9]))
    assert one.coupling is None
    slanted = sheet(stack((1e-3, 45))).membrane / 1e-3
    assert slanted[0, 0] == pytest.approx((q11 + 2 * q12 + 4 * q66 + q22) / 4)
    assert slanted[0, 2] == pytest.approx((q11 - q22) / 4)
    cross = sheet(stack((1e-3, 0), (1e-3, 90)))
    expected = (q22 - q11) * 1e-6 / 2
    np.testing.assert_allclose(cross.coupling, np.diag([expected, -expected, 0]), atol=1e-6 * abs(expected))
    assert sheet(stack((1e-3, 0), (1e-3, 90), (1e-3, 90), (1e-3, 0))).coupling is None


@pytest.mark.parametrize("formulation", SHELLS, ids=lambda f: f.name)
def test_isotropic_layers_are_the_isotropic_sheet(formulation):
    xyz = cells(formulation.kind)[:16]
    parts = tuple(Layer(STEEL, t, angle) for t, angle in ((0.004, 0), (0.003, 30), (0.013, -77)))
    layered, plain = Property(STEEL, 0.02, layers=parts), Property(STEEL, 0.02)
    for what in ("stiffness", "mass"):
        ours, theirs = getattr(formulation, what)(xyz, layered), getattr(formulation, what)(xyz, plain)
        np.testing.assert_allclose(ours, theirs, rtol=0, atol=1e-12 * np.abs(theirs).max())


def test_a_directional_material_of_isotropic_numbers_is_isotropic():
    g = STEEL.youngs_modulus / 2.6
    same = Material("same", 200e9, 0.3, 8000.0, Directional(200e9, 200e9, 0.3, g, g, g))
    for form in SHELLS[::2]:
        xyz = cells(form.kind)[:8]
        ours = form.stiffness(xyz, Property(same, 0.02, direction=(0.3, 1, 0.5)))
        np.testing.assert_allclose(ours, form.stiffness(xyz, Property(STEEL, 0.02)), atol=1e-6 * np.abs(ours).max())


def test_shear_of_a_sandwich_is_that_of_its_core():
    """G d²/c per width, d between the middles of thin faces, c the core (Allen H.G., Analysis and Design of
    Structural Sandwich Panels, 1969, ch. 2; from memory). Averaged shear moduli would give 23 times as much here."""
    core, face = 0.02, 0.0005
    layers = (Layer(ALUMINIUM, face), Layer(FOAM, core), Layer(ALUMINIUM, face))
    found = sheet(Property(ALUMINIUM, core + 2 * face, layers=layers)).shear
    expected = FOAM.youngs_modulus / 2.6 * (core + face) ** 2 / core
    np.testing.assert_allclose(found, expected * np.eye(2), rtol=2e-3, atol=1)


def test_mass_moments():
    """By hand: 2 mm of steel on 3 mm of aluminium, about the middle."""
    two = Property(STEEL, 0.005, layers=(Layer(STEEL, 0.002), Layer(ALUMINIUM, 0.003)))
    zero, one, second = mass_moments(two)
    assert zero == pytest.approx(16 + 8.1)
    assert one == pytest.approx(16 * -0.0015 + 8.1 * 0.001)
    assert second == pytest.approx(16 * (0.002**2 / 12 + 0.0015**2) + 8.1 * (0.003**2 / 12 + 0.001**2))


@FORMS
def test_rigid_motions_parts_and_mass_of_layers(form):
    xyz = cells(form.kind)[:16]
    prop = stack((0.004, 0), (0.006, 45), (0.002, 90), offset=0.03)
    stiffness, mass, parts = form.stiffness(xyz, prop), form.mass(xyz, prop), form.parts(xyz, prop)
    assert tuple(parts) == (*PARTS, "coupling")
    np.testing.assert_allclose(sum(parts.values()), stiffness, atol=1e-12 * np.abs(stiffness).max())
    for k, m, points in zip(stiffness, mass, xyz, strict=True):
        motion = rigid(points)
        assert np.abs(k @ motion).max() <= 1e-9 * np.abs(k).max() * np.abs(motion).max()
        scale = np.sqrt(np.diag(k))
        values = np.linalg.eigvalsh(k / np.outer(scale, scale))
        assert (np.abs(values[:6]) < 1e-11).all()
        assert values[6] > 1e-8
        np.testing.assert_allclose(m, m.T, atol=1e-15)
        assert np.linalg.eigvalsh(m)[0] > 0


@FORMS
def test_mass_off_the_nodes(form):
    """m d about the axes in the plane, m (b² + t²)/12 + m d² (any handbook of dynamics)."""
    a, b, t, d = 0.4, 0.3, 0.05, 0.2
    corners = np.array([[-a, -b, 0], [a, -b, 0], [a, b, 0], [-a, b, 0]]) / 2
    pieces = [corners] if form.kind == "quad4" else [corners[[0, 1, 2]], corners[[0, 2, 3]]]
    total = sum(rigid(x).T @ form.mass(x[None], Property(STEEL, t, offset=d))[0] @ rigid(x) for x in pieces)
    m = STEEL.density * a * b * t
    np.testing.assert_allclose(
        np.diag(total)[:5], [m, m, m, m * ((b**2 + t**2) / 12 + d**2), m * ((a**2 + t**2) / 12 + d**2)]
    )
    assert total[0, 4] == pytest.approx(m * d)
    assert total[1, 3] == pytest.approx(-m * d)


# ---------------------------------------------------------------- plates against closed forms

SIDES, THIN = (1.0, 0.7), 0.002


def plate(kind, n, plies, edges) -> Design:
    mesh = plate_mesh(kind, (n, n), SIDES)
    supports = tuple(Support(f"{e}{d}", Selector(group=e), d) for e, d in edges)
    return Design(
        "plate", mesh, Physics({"ply": PLY}, (Assignment("*", direction=(1, 0, 0), plies=plies),), supports)
    )


def navier(plies, numbers, kind: str) -> np.ndarray:
    """Frequencies of a simply supported rectangle by the double series of classical lamination (Jones 1999, § 5.5;
    Ashton J.E., Whitney J.M., Theory of Laminated Plates, 1970): one 3 × 3 problem for each (m, n), in-plane inertia
    included. "cross": u = cos sin, v = sin cos (S2); "angle": u = sin cos, v = cos sin (S3)."""
    layers = tuple(Layer(PLY, ply.thickness, ply.angle) for ply in plies)
    prop = Property(PLY, sum(ply.thickness for ply in plies), layers=layers, direction=(1, 0, 0))
    found, mass = sheet(prop), mass_moments(prop)[0]
    a, d = found.membrane, found.bending
    b = np.zeros((3, 3)) if found.coupling is None else found.coupling
    values = []
    for m, n in numbers:
        x, y = m * np.pi / SIDES[0], n * np.pi / SIDES[1]
        stiff = np.zeros((3, 3))
        stiff[0, 0] = a[0, 0] * x**2 + a[2, 2] * y**2
        stiff[0, 1] = stiff[1, 0] = (a[0, 1] + a[2, 2]) * x * y
        stiff[1, 1] = a[2, 2] * x**2 + a[1, 1] * y**2
        stiff[2, 2] = d[0, 0] * x**4 + 2 * (d[0, 1] + 2 * d[2, 2]) * x**2 * y**2 + d[1, 1] * y**4
        if kind == "cross":
            stiff[0, 2] = stiff[2, 0] = -b[0, 0] * x**3 - (b[0, 1] + 2 * b[2, 2]) * x * y**2
            stiff[1, 2] = stiff[2, 1] = -b[1, 1] * y**3 - (b[0, 1] + 2 * b[2, 2]) * x**2 * y
        else:
            stiff[0, 2] = stiff[2, 0] = -(3 * b[0, 2] * x**2 * y + b[1, 2] * y**3)
            stiff[1, 2] = stiff[2, 1] = -(b[0, 2] * x**3 + 3 * b[1, 2] * x * y**2)
        values.append(np.sqrt(np.linalg.eigvalsh(stiff)[0] / mass) / (2 * np.pi))
    return np.sort(values)


NUMBERS = [(m, n) for m in range(1, 7) for n in range(1, 7)]
SPECIAL = (Ply("ply", THIN, 0),)
CROSS = (Ply("ply", THIN / 2, 0), Ply("ply", THIN / 2, 90))
ANGLE = (Ply("ply", THIN / 2, 45), Ply("ply", THIN / 2, -45))


def hard(along_x, along_y):
    """Edges x0 x1 held in ``along_x`` and y0 y1 in ``along_y`` beside uz and the turning across the edge."""
    return tuple((e, ("uz", "rx", *along_x)) for e in ("x0", "x1")) + tuple(
        (e, ("uz", "ry", *along_y)) for e in ("y0", "y1")
    )


@KINDS
@pytest.mark.parametrize(
    ("name", "plies", "edges", "series"),
    [
        ("specially orthotropic", SPECIAL, hard(("uy",), ("ux",)), "cross"),
        ("turned by 90", (Ply("ply", THIN, 90),), hard(("uy",), ("ux",)), "cross"),
        ("antisymmetric cross-ply", CROSS, hard(("uy",), ("ux",)), "cross"),
        ("antisymmetric angle-ply", ANGLE, hard(("ux",), ("uy",)), "angle"),
    ],
)
def test_simply_supported_plates(kind, name, plies, edges, series):
    """Four frequencies, limits of three meshes within 2e-3 (shear and rotary inertia of a sheet 350 times as wide as
    thick take up to 1e-3)."""
    # the fourth mode of the turned ply has five half waves along one side
    sizes = (18, 27, 40) if "turned" in name else (12, 18, 27)
    expected = navier(plies, NUMBERS, series)[:4]
    found = [solve(plate(kind, n, plies, edges), 4).freq_hz for n in sizes]
    reached = richardson(*found, ratio=1.5)
    assert (reached.error(expected) <= 2e-3).all(), reached.limit / expected - 1
    moving = np.abs(found[0] / found[2] - 1) > 2e-3
    assert moving.any()
    assert (reached.rate[moving] > 1.6).all(), reached.rate


def test_the_coupling_counts():
    """So that the checks above could fail: without coupling the cross-ply's first frequency is far higher."""
    alone = (Ply("ply", THIN / 4, 0), Ply("ply", THIN / 2, 90), Ply("ply", THIN / 4, 0))
    assert navier(CROSS, NUMBERS, "cross")[0] < 0.9 * navier(alone, NUMBERS, "cross")[0]


@KINDS
def test_numbering_and_pose_do_not_matter(kind):
    """Cells that start at another corner, and the whole turned in space with its direction, vibrate alike."""
    plies = (Ply("ply", 0.002, 20), Ply("ply", 0.001, 70))
    mesh = plate_mesh(kind, (6, 4), (0.6, 0.4))
    nodes = mesh.blocks[0].nodes.copy()
    for row in range(len(nodes)):
        nodes[row] = np.roll(nodes[row], row % 4)
    turn = np.linalg.qr(np.random.default_rng(5).normal(size=(3, 3)))[0]
    turn *= np.sign(np.linalg.det(turn))
    found = []
    for points, cells_, direction in (
        (mesh.points, mesh.blocks[0].nodes, (1, 0, 0)),
        (mesh.points, nodes, (1, 0, 0)),
        (mesh.points @ turn, mesh.blocks[0].nodes, tuple(np.array([1, 0, 0.0]) @ turn)),
    ):
        shape = Mesh(points, (CellBlock(kind, cells_, mesh.blocks[0].ids),), mesh.node_ids, mesh.node_groups)
        found.append(
            solve(
                Design(
                    "d",
                    shape,
                    Physics(
                        {"ply": PLY},
                        (Assignment("*", direction=direction, plies=plies),),
                        (Support("root", Selector(group="x0")),),
                    ),
                ),
                5,
            ).freq_hz
        )
    np.testing.assert_allclose(found[1:], [found[0]] * 2, rtol=1e-8)


def test_energies_of_layers_add_up():
    model = plate("quad4", 6, (*CROSS, Ply("ply", 0.001, 30)), (("x0", ("ux", "uy", "uz", "rx", "ry", "rz")),))
    found = energies(model, solve(model, 4))
    np.testing.assert_allclose(found.total_strain, found.total_kinetic, rtol=1e-8)
    np.testing.assert_allclose(found.volumes.sum(), 0.7 * 0.003)


# ---------------------------------------------------------------- off the nodes

ROOT = (Support("root", Selector(group="x0")),)


def strips(kind: str, n: int, parts, supports=ROOT, length=1.0, width=0.04, **more) -> Design:
    """Sheets on the same nodes, each (material, thickness, offset)."""
    mesh = plate_mesh(kind, (n, 2), (length, width))
    block = mesh.blocks[0]
    count = len(block)
    blocks = tuple(CellBlock(kind, block.nodes, block.ids + i * count) for i in range(len(parts)))
    groups = {f"{i}": np.arange(i * count, (i + 1) * count) for i in range(len(parts))}
    return Design(
        "strips",
        mesh.with_(blocks=blocks, cell_groups=groups),
        Physics(
            {material.name: material for material, _, _ in parts},
            tuple(Assignment(f"{i}", m.name, t, offset=o) for i, (m, t, o) in enumerate(parts)),
            supports,
        ),
    )


@KINDS
def test_two_half_sheets_make_a_whole(kind):
    """Half sheets at ± a quarter of the thickness on the same nodes: the frequencies of the whole in the limit."""
    halves = ((STEEL, 0.005, 0.0025), (STEEL, 0.005, -0.0025))
    found = [solve(strips(kind, n, halves), 4).freq_hz for n in (8, 16, 32)]
    whole = [solve(strips(kind, n, ((STEEL, 0.01, 0.0),)), 4).freq_hz for n in (8, 16, 32)]
    ours, theirs = richardson(*found), richardson(*whole)
    # twisting differs: two sheets glued to common nodes shear between them with the nodes' rotation alone
    np.testing.assert_allclose(ours.limit, theirs.limit, rtol=2e-3)


@KINDS
def test_offsets_equal_layers(kind):
    """A bimetal as layers, and as two sheets off the nodes: bending. (In the third mode, twisting, two sheets shear
    against each other with the nodes' rotations alone: 2 % apart with triangles on this mesh.)"""
    layered = plate_mesh(kind, (12, 2), (1.0, 0.04))
    first = Design(
        "layers",
        layered,
        Physics(
            {"steel": STEEL, "aluminium": ALUMINIUM},
            (Assignment("*", plies=(Ply("steel", 0.004), Ply("aluminium", 0.006))),),
            ROOT,
        ),
    )
    second = strips(kind, 12, ((STEEL, 0.004, -0.003), (ALUMINIUM, 0.006, 0.002)))
    np.testing.assert_allclose(solve(first, 2).freq_hz, solve(second, 2).freq_hz, rtol=3e-3)


@pytest.mark.parametrize("kind", ["quad4", "tri3", "quad8"])
def test_a_rib_off_a_strip_is_a_composite_beam(kind):
    """T-section of a strip and a rib joined by offset: EI about the common centroid by Steiner's theorem (any
    handbook of strength of materials), Euler and Bernoulli's cantilever (β₁L)² = 3.5160, row B05; ν = 0."""
    plain = Material("plain", 200e9, 0.0, 8000.0)
    length, width, sheet_t, rib_b, rib_h = 2.0, 0.06, 0.004, 0.004, 0.03
    off = (sheet_t + rib_h) / 2
    areas, seconds = np.array([width * sheet_t, rib_b * rib_h]), np.array([width * sheet_t**3, rib_b * rib_h**3]) / 12
    centre = areas[1] * off / areas.sum()
    inertia = (seconds + areas * (np.array([0, off]) - centre) ** 2).sum()

    def first(n: int) -> float:
        mesh = plate_mesh(kind, (n, 2), (length, width))
        line = np.nonzero(np.isclose(mesh.points[:, 1], width / 2))[0]
        line = line[np.argsort(mesh.points[line, 0])]
        pairs = np.stack([line[:-1], line[1:]], axis=1)
        block = CellBlock("line2", pairs, np.arange(len(pairs)) + 1000)
        both = mesh.with_(blocks=(*mesh.blocks, block), cell_groups={})
        section = Section("rectangle", width=rib_b, height=rib_h)
        model = Design(
            "rib",
            both,
            Physics(
                {"plain": plain},
                (Assignment("*", "plain", sheet_t), Assignment("line2", "plain", None, "", section, (0, 0, 1), off)),
                (Support("root", Selector(group="x0")), Support("plane", Selector(nodes=mesh.node_ids), ("uy",))),
            ),
        )
        modes = solve(model, 2)
        lift = np.abs(modes.shapes.moved[..., 2]).mean(axis=1) > 1e-6
        return modes.freq_hz[lift][0]

    expected = 3.5160153 / length**2 * np.sqrt(200e9 * inertia / (8000 * areas.sum())) / (2 * np.pi)
    reached = richardson(*(np.array([first(n)]) for n in (8, 16, 32)))
    assert reached.error([expected])[0] < 2e-3, reached.limit / expected - 1
    bare = np.sqrt(seconds.sum() / inertia)
    assert bare < 0.75  # without the offset's coupling it would be this much lower


# ---------------------------------------------------------------- what is said


def sheet_design(**more) -> Design:
    bad = Material("bad", 1e9, 0.3, 1.0, Directional(1e9, 1e9, 1.1, 1e9, 1e9, 1e9))
    return Design(
        "d",
        plate_mesh("quad4", (2, 1), (1, 1)),
        Physics({"ply": PLY, "steel": STEEL, "bad": bad}, (Assignment("*", **more),)),
    )


@pytest.mark.parametrize(
    ("more", "words"),
    [
        ({"material": "ply", "thickness": 0.01}, ["ply", "no direction", "axis 1"]),
        ({"material": "ply", "thickness": 0.01, "direction": (0, 0, 1)}, ["stands square", "2 cells"]),
        ({"material": "bad", "thickness": 0.01, "direction": (1, 0, 0)}, ["nu12", "below"]),
        ({"plies": (Ply("steel", 0.01), Ply("steel", -0.001))}, ["thickness", "-0.001"]),
        ({"plies": (Ply("steel", 0.01), Ply("stele", 0.001))}, ["unknown material 'stele'"]),
    ],
)
def test_what_a_sheet_lacks_is_said(more, words):
    with pytest.raises(ModelError) as caught:
        assemble(sheet_design(**more))
    for word in words:
        assert word in str(caught.value)


def test_directional_material_of_sheets_on_a_solid_is_refused():
    with pytest.raises(ModelError, match=r"ply.*directional.*solids"):
        assemble(design(box_mesh("hex8", (1, 1, 1), (1, 1, 1)), material=PLY))


def test_sides_that_disagree_are_named_where_they_matter():
    mesh = plate_mesh("quad4", (2, 1), (1, 1))
    nodes = mesh.blocks[0].nodes.copy()
    nodes[1] = nodes[1][::-1]
    turned = mesh.with_(blocks=(CellBlock("quad4", nodes, mesh.blocks[0].ids),))
    for shape, offset, said in ((turned, 0.1, True), (turned, 0.0, False), (mesh, 0.1, False)):
        model = Design("d", shape, Physics({"steel": STEEL}, (Assignment("*", "steel", 0.01, offset=offset),)))
        assert any("opposite sides" in text for text in lay_out(model).cautions) == said
