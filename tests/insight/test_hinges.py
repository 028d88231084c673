"""Where a mode folds: parts whose fold line is known because it was built in, and parts that have none.

What is expected is geometry (the line that was thinned, the slit's tab, the arc) and the theory of plates: a strip of
width w, length b and thickness t between stiff plates turns with D b / w, D = E t³ / 12 (1 − ν²) where the strip
cannot contract across and E t³ / 12 where it can (Timoshenko, Woinowsky-Krieger, Theory of Plates and Shells, ch. 1).
"""

from __future__ import annotations

import numpy as np
import pytest

from tests.meshes import box_mesh, line_mesh, plate_mesh
from viewer.errors import Cancelled
from viewer.insight.hinges import find_hinges
from viewer.insight.hinges.curve import fit_arc
from viewer.insight.hinges.profile import edges_of, profile
from viewer.jobs import Progress
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import energies
from viewer.model.design import Assignment, Design, LumpedMass, Material, Physics, Section, Selector, Spring, Support
from viewer.model.mesh import CellBlock
from viewer.model.modes import ArrayShapes, ModeSet

STEEL = Material("steel", 200e9, 0.3, 7850.0)
LENGTH, WIDTH, THICK, THIN = 0.3, 0.15, 4e-3, 1.4e-3
GROOVE = (0.12, 0.13)  # of a plate of 30 cells along its length, 10 mm each
CLAMP = Support("root", Selector(group="x0"))


def middles(mesh):
    return np.concatenate([mesh.points[b.nodes].mean(axis=1) for b in mesh.blocks])


def without(mesh, gone):
    """The mesh less some cells (flags), and less the nodes only they had."""
    (block,) = mesh.blocks
    rows, nodes = np.unique(block.nodes[~gone], return_inverse=True)
    groups = {name: np.nonzero(np.isin(rows, members))[0] for name, members in mesh.node_groups.items()}
    nodes = nodes.reshape(-1, block.nodes.shape[1])
    return mesh.with_(
        points=mesh.points[rows],
        blocks=(CellBlock(block.kind, nodes, np.arange(1, len(nodes) + 1)),),
        node_ids=mesh.node_ids[rows],
        node_groups=groups,
        cell_groups={},
    )


def sheet(mesh, thin=None, *, thickness=THICK, clamp=True, **physics):
    """A design of shells, ``thin`` (flags) its thinned cells."""
    thin = np.zeros(mesh.n_cells, bool) if thin is None else thin
    groups = {"plain": np.nonzero(~thin)[0], "thin": np.nonzero(thin)[0]}
    given = [Assignment("plain", STEEL.name, thickness), Assignment("thin", STEEL.name, THIN)]
    return Design(
        "part",
        mesh.with_(cell_groups=groups),
        Physics({STEEL.name: STEEL}, tuple(given[: 1 + thin.any()]), (CLAMP,) if clamp else (), **physics),
    )


def grooved(kind="quad4", groove=GROOVE, counts=(60, 15), **given):
    mesh = plate_mesh(kind, counts, (LENGTH, WIDTH))
    x = middles(mesh)[:, 0]
    return sheet(mesh, (x > groove[0]) & (x < groove[1]), **given)


@pytest.fixture(scope="module")
def folding():
    design = grooved()
    return design, solve(design, 4)


def test_groove_is_found_with_its_axis_and_stiffness(folding):
    design, modes = folding
    finding = find_hinges(design, modes, 1)
    assert finding.verdict == "hinges" and len(finding.hinges) == 1
    (hinge,) = finding.hinges
    assert (hinge.kind, hinge.label) == ("line", "strong")
    assert hinge.position == pytest.approx([0.125, WIDTH / 2, 0], abs=1e-3)
    assert abs(hinge.direction[1]) > 0.9999
    assert hinge.axis[:, 0] == pytest.approx(0.125, abs=1e-3)
    assert np.ptp(hinge.axis[:, 1]) == pytest.approx(WIDTH, rel=1e-6)
    assert hinge.width == pytest.approx(0.01, rel=0.05)
    narrow = STEEL.youngs_modulus * THIN**3 / 12 * WIDTH / 0.01
    assert narrow * 0.98 < hinge.stiffness < narrow / (1 - STEEL.poisson**2) * 1.02
    assert set(hinge.cells) == set(design.mesh.cell_groups["thin"])


def test_sides_cover_the_part_and_the_held_one_comes_first(folding):
    design, modes = folding
    hinge = find_hinges(design, modes, 1).hinges[0]
    x = middles(design.mesh)[:, 0]
    assert set(hinge.sides[0]) == set(np.nonzero(x < GROOVE[0])[0])
    assert set(hinge.sides[1]) == set(np.nonzero(x > GROOVE[1])[0])
    assert hinge.arm == pytest.approx([1, 0, 0], abs=1e-6)


def test_fold_is_the_turn_between_the_edges(folding):
    design, modes = folding
    hinge = find_hinges(design, modes, 1).hinges[0]
    x, turned = design.mesh.points[:, 0], modes.rotations(0)
    edges = [turned[np.abs(x - edge) < 1e-9].mean(axis=0) for edge in GROOVE]
    assert hinge.fold == pytest.approx(edges[1] - edges[0], rel=0.03, abs=0.01 * hinge.fold_angle)


def test_flap_beyond_the_groove(folding):
    design, modes = folding
    finding = find_hinges(design, modes, 1)
    (flap,) = finding.flaps
    assert flap.hinges == (1,)
    assert set(flap.cells) == set(finding.hinges[0].sides[1])
    assert flap.kinetic_share > 0.9 and flap.rigid_fit > 0.99


@pytest.mark.parametrize("kind", ["tri3", "quad8"])
def test_other_sheets_agree(kind, folding):
    reference = find_hinges(*folding, 1).hinges[0]
    design = grooved(kind, counts=(30, 8))
    (hinge,) = find_hinges(design, solve(design, 1), 1).hinges
    assert np.linalg.norm((hinge.position - reference.position)[[0]]) < 0.005 * design.mesh.diagonal
    assert hinge.stiffness == pytest.approx(reference.stiffness, rel=0.08)


def test_solid_agrees_with_sheet(folding):
    reference = find_hinges(*folding, 1).hinges[0]
    mesh = box_mesh("hex20", (30, 6, 2), (LENGTH, WIDTH, THICK))
    x, _, z = middles(mesh).T
    # The lower layer stays: half of the thickness.
    mesh = without(mesh, (x > GROOVE[0]) & (x < GROOVE[1]) & (z > THICK / 2))
    design = Design("solid", mesh, Physics({STEEL.name: STEEL}, (Assignment("*", STEEL.name),), (CLAMP,)))
    (hinge,) = find_hinges(design, solve(design, 1), 1).hinges
    assert hinge.kind == "line"
    assert abs(hinge.position[0] - reference.position[0]) < 0.005 * mesh.diagonal
    assert abs(hinge.direction[1]) > 0.999


def free_plate(counts=(24, 12), kind="quad4"):
    return sheet(plate_mesh(kind, counts, (LENGTH, WIDTH)), clamp=False), 7


def cantilever(counts=(24, 12), kind="quad4"):
    return sheet(plate_mesh(kind, counts, (LENGTH, WIDTH))), 1


def all_round(counts=(24, 12), kind="tri3"):
    design = sheet(plate_mesh(kind, counts, (LENGTH, WIDTH)), clamp=False)
    edge = np.unique(np.concatenate(list(design.mesh.node_groups.values())))
    mesh = design.mesh.with_(node_groups={"edge": edge})
    support = Support("edge", Selector(group="edge"))
    physics = design.physics
    return design.with_(mesh=mesh, physics=Physics(physics.materials, physics.assignments, (support,))), 1


def window(counts=(30, 15), kind="quad4"):
    mesh = plate_mesh(kind, counts, (LENGTH, WIDTH))
    x, y, _ = middles(mesh).T
    return sheet(without(mesh, (np.abs(x - 0.16) < 0.045) & (np.abs(y - WIDTH / 2) < 0.03))), 1


@pytest.mark.parametrize("make", [free_plate, cantilever, all_round, window])
def test_spread_bending_has_no_hinge(make):
    design, first = make()
    modes = solve(design, first + 4)
    found = energies(design, modes)
    for number in range(first, first + 5):
        finding = find_hinges(design, modes, number, found)
        assert finding.verdict == "bending is spread", finding.sentence
        assert finding.hinges == () and finding.flaps == ()
        assert "no hinge line" in finding.sentence


def test_rigid_modes_are_called_so():
    design, _ = free_plate((8, 4))
    finding = find_hinges(design, solve(design, 7), 1)
    assert finding.verdict == "rigid-body mode" and not finding.hinges


def test_all_energy_in_springs_does_not_bend():
    mesh = plate_mesh("quad4", (6, 3), (LENGTH, WIDTH))
    soft = Spring("feet", Selector(group="x0"), stiffness=np.array([1, 1, 1, 1, 1, 1]) * 1e-6)
    design = sheet(mesh, clamp=False, thickness=0.05, springs=(soft,))
    finding = find_hinges(design, solve(design, 1), 1)
    assert finding.verdict in ("does not bend", "rigid-body mode")


def test_two_grooves_close_together_stay_two():
    mesh = plate_mesh("quad4", (100, 10), (LENGTH, WIDTH))
    x = middles(mesh)[:, 0]
    first, second = (x > 0.117) & (x < 0.123), (x > 0.132) & (x < 0.138)  # 15 mm apart, 4.5 % of the diagonal
    design = sheet(mesh, first | second)
    hinges = find_hinges(design, solve(design, 1), 1).hinges
    assert sorted(round(float(h.position[0]), 4) for h in hinges) == pytest.approx([0.12, 0.135], abs=1e-3)


def test_tab_left_by_slits_is_found_in_its_own_mode():
    """A tongue of 3 % of the plate's area, thinned at its root, that flaps by itself."""
    mesh = plate_mesh("quad4", (60, 30), (LENGTH, WIDTH))
    x, y, _ = middles(mesh).T
    tongue = (x > 0.15) & (x < 0.18) & (y > 0.05) & (y < 0.1)
    around = (x > 0.15) & (x < 0.185) & (y > 0.045) & (y < 0.105)
    kept = ~(around & ~tongue)
    mesh = without(mesh, ~kept)
    x, y, _ = middles(mesh).T
    thin = (x > 0.15) & (x < 0.155) & (y > 0.05) & (y < 0.1)
    ends = np.nonzero((mesh.points[:, 0] < 1e-9) | (mesh.points[:, 0] > LENGTH - 1e-9))[0]
    design = sheet(mesh.with_(node_groups={"x0": ends}), thin)
    modes = solve(design, 8)
    inside = (mesh.points[:, 0] > 0.16) & (np.abs(mesh.points[:, 1] - 0.075) < 0.012)
    alone = [
        i for i in range(8) if np.abs(modes.shape(i)[inside]).max() > 3 * np.abs(modes.shape(i)[~inside]).mean() * 4
    ]
    assert alone, "no mode in which the tongue moves by itself"
    finding = find_hinges(design, modes, alone[0] + 1)
    near = [h for h in finding.hinges if np.linalg.norm(h.position - [0.1525, 0.075, 0]) < 0.003]
    assert len(near) == 1 and near[0].kind == "line" and abs(near[0].direction[1]) > 0.999
    assert any(near[0].number in flap.hinges for flap in finding.flaps)


def test_square_neck_is_a_joint():
    mesh = plate_mesh("quad4", (45, 30), (LENGTH, WIDTH))
    x, y, _ = middles(mesh).T
    mesh = without(mesh, (np.abs(x - 0.15) < 0.01) & (np.abs(y - WIDTH / 2) > 0.01))
    design = sheet(mesh)
    modes = solve(design, 4)
    kinds = {h.kind for i in range(1, 5) for h in find_hinges(design, modes, i).hinges}
    assert kinds == {"joint"}
    hinge = find_hinges(design, modes, 1).hinges[0]
    assert hinge.position[:2] == pytest.approx([0.15, WIDTH / 2], abs=0.01 * mesh.diagonal)


def test_line_along_an_arc_is_a_curve():
    flat = plate_mesh("quad4", (40, 24), (0.16, 0.16))
    s, t, _ = flat.points.T
    radius, angle = 0.2 + s, 4.0 * (t - 0.08)
    mesh = flat.with_(points=np.stack([radius * np.cos(angle), radius * np.sin(angle), 0 * s], axis=1))
    at = middles(flat)[:, 0]
    design = sheet(mesh, (at > 0.076) & (at < 0.084))
    (hinge,) = find_hinges(design, solve(design, 1), 1).hinges
    assert hinge.kind == "curve" and len(hinge.axis) > 8
    away = np.linalg.norm(hinge.axis[:, :2], axis=1)
    assert away == pytest.approx(0.28, abs=0.01 * mesh.diagonal)


def test_thinned_beam_is_a_joint():
    points = np.zeros((41, 3))
    points[:, 0] = np.linspace(0, 1, 41)
    mesh = line_mesh(points)
    weak = np.array([15])
    groups = {"weak": weak, "rest": np.setdiff1d(np.arange(40), weak)}
    thick, thin = Section("rectangle", width=0.02, height=0.02), Section("rectangle", width=0.02, height=0.006)
    physics = Physics(
        {STEEL.name: STEEL},
        tuple(
            Assignment(name, STEEL.name, section=s, orientation=(0.0, 0.0, 1.0))
            for name, s in (("rest", thick), ("weak", thin))
        ),
        (CLAMP,),
    )
    design = Design("beam", mesh.with_(cell_groups=groups), physics)
    (hinge,) = find_hinges(design, solve(design, 1), 1).hinges
    assert hinge.kind == "joint"
    assert hinge.position[0] == pytest.approx(15.5 / 40, abs=0.005)


def test_complex_shape_is_turned_to_its_largest_motion(folding):
    design, modes = folding
    turned = np.exp(0.7j)
    shapes = ArrayShapes(modes.shape(0)[None] * turned, modes.rotations(0)[None] * turned)
    given = ModeSet(modes.node_ids, modes.freq_hz[:1], shapes, origin="imported")
    found = energies(design, given)
    finding = find_hinges(design, given, 1, found)
    real = find_hinges(design, modes, 1).hinges[0]
    assert len(finding.hinges) == 1
    assert finding.hinges[0].fold_angle == pytest.approx(real.fold_angle, rel=1e-3)
    assert any("complex" in words for words in finding.cautions)


def test_noisy_shape_is_smoothed_first(folding):
    design, modes = folding
    random = np.random.default_rng(5)
    shape = modes.shape(0)
    shape = shape + 0.02 * np.abs(shape).max() * random.normal(size=shape.shape)
    given = ModeSet(modes.node_ids, modes.freq_hz[:1], ArrayShapes(shape[None]), origin="imported")
    finding = find_hinges(design, given, 1)
    assert finding.basis == "smoothed" and 0.02 < finding.noise < 0.12  # 2 % of the peak is more of the mean
    (hinge,) = finding.hinges
    assert np.linalg.norm(hinge.position - [0.125, WIDTH / 2, 0]) < 0.035 * design.mesh.diagonal
    assert abs(hinge.direction[1]) > np.cos(np.radians(12))


def test_without_materials_stiffness_is_unknown(folding):
    design, modes = folding
    bare = tuple(Assignment(a.target, thickness=a.thickness) for a in design.physics.assignments)
    finding = find_hinges(design.with_(physics=Physics(assignments=bare)), modes, 1)
    assert len(finding.hinges) == 1 and finding.hinges[0].stiffness is None
    assert any("relative" in words for words in finding.cautions)


def test_lumped_mass_and_refined_mesh_do_not_move_the_line():
    camera = LumpedMass("camera", Selector(group="x1"), 0.5)
    coarse, fine = (grooved(counts=counts, masses=(camera,)) for counts in ((30, 8), (60, 16)))
    first, second = (find_hinges(design, solve(design, 1), 1).hinges[0] for design in (coarse, fine))
    assert np.linalg.norm(first.position - second.position) < 0.005 * fine.mesh.diagonal


def test_same_answer_with_energies_given(folding):
    design, modes = folding
    given = find_hinges(design, modes, 1, energies(design, modes, [2, 0])).hinges[0]
    formed = find_hinges(design, modes, 1).hinges[0]
    assert np.array_equal(given.cells, formed.cells)
    assert (given.stiffness, given.strain_share) == pytest.approx((formed.stiffness, formed.strain_share), rel=1e-9)


def test_cancelled_between_steps(folding):
    with pytest.raises(Cancelled):
        find_hinges(*folding, 1, progress=Progress(stop=lambda: True))


def test_profile_finds_the_edges_of_a_step():
    low = np.linspace(-1, 0.98, 100)
    volume = np.full(100, 0.02)
    strain = volume * np.where(np.abs(low + 0.01) < 0.2, 20.0, 1.0)
    found = edges_of(profile(low, low + 0.02, strain, volume, (-1.0, 1.0)))
    assert (found.low, found.high) == pytest.approx((-0.2, 0.2), abs=0.02)
    assert found.jump == pytest.approx(20, rel=0.2)
    flat = edges_of(profile(low, low + 0.02, volume, volume, (-1.0, 1.0)))
    assert flat is None or flat.jump == pytest.approx(1, rel=0.01)


def test_arc_through_a_band_of_points():
    angle = np.repeat(np.linspace(-0.6, 0.6, 40), 3)
    radius = np.tile([1.9, 2.0, 2.1], 40)
    points = np.stack([radius * np.cos(angle), radius * np.sin(angle), np.full(120, 3.0)], axis=1)
    arc = fit_arc(points, np.ones(120))
    feet = arc.foot(arc.along(points))
    assert np.linalg.norm(feet[:, :2], axis=1) == pytest.approx(2.0, abs=0.01)
    assert feet[:, 2] == pytest.approx(3.0)
