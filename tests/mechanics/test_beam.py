"""Beams: rigid motions, masses, exact statics, offsets, sections, and what is said when something is missing."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.sparse.linalg as spla

from tests.checks.reference import row
from tests.mechanics.models import STEEL
from tests.meshes import line_mesh
from viewer.errors import ModelError
from viewer.mechanics.assembly import assemble
from viewer.mechanics.beam import BEAMS
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import energies
from viewer.mechanics.patch import rigid_fields
from viewer.mechanics.recovery import examine
from viewer.mechanics.sections import constants, rectangle_torsion
from viewer.model.design import Assignment, Design, LumpedMass, Physics, Property, Section, Selector, Support

FORMS = pytest.mark.parametrize("form", BEAMS, ids=lambda form: form.name)
FLAT = Section("rectangle", width=0.02, height=0.05)
EXACT = {"shear_up": 5 / 6, "shear_across": 5 / 6}


def prop(section=FLAT, up=(0, 0.3, 1), **more) -> Property:
    return Property(STEEL, section=section, orientation=up, **more)


def beam(points, section=FLAT, up=(0, 0, 1), formulation="", offset=0.0, **physics) -> Design:
    return Design(
        "beam",
        line_mesh(points),
        Physics({"steel": STEEL}, (Assignment("*", "steel", None, formulation, section, up, offset),), **physics),
    )


def straight(cells: int, length: float = 1.0, along=(1, 0, 0)):
    return np.outer(np.linspace(0, length, cells + 1), along)


def rigid(xyz):
    motion = np.zeros((len(xyz), 6, 6))
    motion[:, :3] = rigid_fields(xyz, np.zeros(3))
    motion[:, 3:, 3:] = np.eye(3)
    return motion.reshape(-1, 6)


@FORMS
@pytest.mark.parametrize("more", [{}, {"offset": 0.2, "offset_across": -0.1}])
def test_rigid_motions_are_free_and_carry_the_mass(form, more):
    xyz = np.random.default_rng(0).normal(size=(6, 2, 3))
    stiffness, mass = form.stiffness(xyz, prop(**more)), form.mass(xyz, prop(**more))
    for k, m, points in zip(stiffness, mass, xyz, strict=True):
        motion = rigid(points)
        assert np.abs(k @ motion).max() <= 1e-9 * np.abs(k).max() * np.abs(motion).max()
        scale = np.sqrt(np.diag(k))
        values = np.linalg.eigvalsh(k / np.outer(scale, scale))
        assert (np.abs(values[:6]) < 1e-12).all()
        assert values[6] > 1e-7
        expected = 8000 * 0.02 * 0.05 * np.linalg.norm(points[1] - points[0])
        np.testing.assert_allclose((motion.T @ m @ motion)[:3, :3], expected * np.eye(3), atol=1e-9 * expected)
        assert np.linalg.eigvalsh(m)[0] > (0 if form.slender else 1e-12) or form.slender


@pytest.mark.parametrize("offset", [0.0, 0.1])
def test_inertia_of_a_straight_bar_is_that_of_the_block(offset):
    """m (a² + b²) / 12 about the centroid, and m d² for the offset (any handbook of dynamics)."""
    length, width, height = 0.7, 0.02, 0.05
    mass = 8000 * length * width * height
    motion = rigid(np.array([[-length / 2, 0, 0], [length / 2, 0, 0]]))
    points = np.array([[[-length / 2, 0, 0], [length / 2, 0, 0]]])
    total = motion.T @ BEAMS[0].mass(points, prop(up=(0, 0, 1), offset=offset))[0] @ motion
    np.testing.assert_allclose(
        np.diag(total)[3:],
        mass
        * np.array(
            [
                (width**2 + height**2) / 12 + offset**2,
                (length**2 + height**2) / 12 + offset**2,
                (length**2 + width**2) / 12,
            ]
        ),
        rtol=1e-12,
    )
    assert total[0, 4] == pytest.approx(mass * offset)


@pytest.mark.parametrize("slenderness", [2.0, 20.0, 2e4])
@pytest.mark.parametrize("cells", [1, 3])
def test_tip_load_is_exact_at_any_slenderness(slenderness, cells):
    """PL³/3EI + PL/κGA, uneven element lengths and a direction askew in space; no locking, no dependence on cells."""
    height = 1 / slenderness
    section = Section("rectangle", width=height, height=2 * height, **EXACT)
    along = np.array([2, -1, 2]) / 3
    up = np.array([1, 2, 0]) / np.sqrt(5)
    points = np.outer(np.linspace(0, 1, cells + 1) ** 1.3, along)
    system = assemble(beam(points, section, tuple(up), supports=(Support("root", Selector(group="x0")),)))
    free = np.nonzero(~system.held)[0]
    upwards, across = height * (2 * height) ** 3 / 12, 2 * height * height**3 / 12
    for direction, second in ((up, upwards), (np.cross(up, along), across)):
        load = np.zeros(system.n_dof)
        load[system.dof[-1, :3]] = direction
        moved = np.zeros(system.n_dof)
        moved[free] = spla.spsolve(system.K[free][:, free].tocsc(), load[free])
        expected = 1 / (3 * 200e9 * second) + 1 / (5 / 6 * 200e9 / 2.6 * 2 * height**2)
        np.testing.assert_allclose(moved[system.dof[-1, :3]], expected * direction, rtol=1e-6, atol=1e-6 * expected)


def test_sections_b16_b20():
    """Cowper's coefficients and Saint-Venant's series against rows B16 and B20."""
    box, disc = constants(Section("rectangle", width=1, height=2), 0.3), constants(Section("round", diameter=1), 0.3)
    np.testing.assert_allclose([box.shear_up, disc.shear_up], row("B16").values, rtol=row("B16").tolerances[0])
    ratios = (1, 1.5, 2, 2.5, 3, 4, 5, 10)
    # five printed digits
    np.testing.assert_allclose([rectangle_torsion(r, 1) / r for r in ratios], row("B20").values, atol=0.6e-5)
    assert (box.iy, box.iz) == pytest.approx((8 / 12, 2 / 12))
    assert rectangle_torsion(1, 3) == rectangle_torsion(3, 1)
    # the thick tube of T04 (r = 50, t = 2 mm), and a tube without a hole
    thick = constants(Section("tube", diameter=0.102, wall=0.002), 0.3)
    assert thick.torsion * 1e12 == pytest.approx(row("T04").values[0], rel=1e-6)
    assert constants(Section("tube", diameter=1, wall=0.5), 0.3) == disc
    # a thin tube: 2 (1 + ν) / (4 + 3ν) (Cowper 1966, from memory)
    thin = constants(Section("tube", diameter=1, wall=1e-6), 0.3)
    assert thin.shear_up == pytest.approx(2.6 / 4.9, rel=1e-5)


def test_energies_of_a_bent_frame_add_up():
    points = np.array([[0, 0, 0], [0.5, 0, 0], [1, 0, 0], [1, 0.5, 0], [1, 0.5, 0.4], [1.0, 0.9, 0.6]])
    model = beam(
        points,
        Section("tube", diameter=0.03, wall=0.002),
        None,
        supports=(Support("root", Selector(group="x0")),),
        masses=(LumpedMass("tip", Selector(group="x1"), 2.0),),
    )
    modes, system = solve(model, 6), assemble(model)
    found = energies(model, modes)
    shapes = system.gather(modes.shapes.moved, modes.shapes.turned)
    strain = 0.5 * np.einsum("kn,nk->k", shapes, system.K @ shapes.T)
    np.testing.assert_allclose(found.strain.sum(axis=1), strain, rtol=1e-9)
    np.testing.assert_allclose(found.closure, 1, atol=1e-8)
    lengths = np.linalg.norm(np.diff(points, axis=0), axis=1)
    np.testing.assert_allclose(found.volumes, np.pi / 4 * (0.03**2 - 0.026**2) * lengths)


def test_lost_torsion_of_a_straight_beam_is_named():
    model = beam(straight(8), supports=(Support("root", Selector(group="x0")),))
    modes = solve(model, 4)
    system = assemble(model)
    found = examine(system, modes.shapes.moved)
    assert found.lost.tolist() == list(range(1, 9))
    assert "torsion of straight beams" in found.cautions[0]
    whole = system.gather(modes.shapes.moved, modes.shapes.turned)
    # bending modes come back but for rotary inertia, which the recovery leaves out
    np.testing.assert_allclose(found.vectors, whole, atol=5e-3 * np.abs(whole).max())


def test_square_sections_bend_alike_whatever_their_orientation():
    square = Section("rectangle", width=0.02, height=0.02)
    found = [solve(beam(straight(4), square, up), 10).freq_hz[6:] for up in (None, (0, 1, 1), (0, 0.3, -1))]
    np.testing.assert_allclose(found[1:], [found[0]] * 2, rtol=1e-6)


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"section": None}, ["1 cells line2", "beams without section"]),
        ({"section": Section("hexagon")}, ["hexagon", "rectangle, round, tube"]),
        ({"section": Section("rectangle", width=1.0)}, ["height is missing"]),
        ({"section": Section("round", diameter=1.0, wall=0.1)}, ["wall does not belong"]),
        ({"section": Section("round", diameter=-1.0)}, ["diameter is impossible"]),
        ({"section": Section("tube", diameter=0.1, wall=0.06)}, ["thicker than half"]),
        ({"section": Section("given", area=1, iy=1, iz=1)}, ["torsion is missing"]),
        ({"up": None}, ["need an orientation"]),
        ({"up": (1, 0, 0)}, ["run along their own orientation", "(0.5, 0, 0)"]),
        ({"formulation": "line2-magic"}, ["line2-magic", "line2-timoshenko"]),
    ],
)
def test_what_a_beam_lacks_is_said(change, words):
    with pytest.raises(ModelError) as caught:
        assemble(beam(straight(1), **change))
    for word in words:
        assert word in str(caught.value)
