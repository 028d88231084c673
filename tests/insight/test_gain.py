"""The gain map against changed designs solved again, closed forms, and itself in another basis."""

from __future__ import annotations

import json
from dataclasses import replace

import numpy as np
import pytest

from tests.checks.reference import row
from tests.insight.changes import FIELDS, changed
from tests.mechanics.models import CLAMP, STEEL, design
from tests.meshes import box_mesh, line_mesh, plate_mesh
from tests.sentences import unfounded
from viewer.errors import InputError, RefusedError
from viewer.insight.gain import gain_map, gain_maps
from viewer.insight.places import cell_centres
from viewer.mechanics.assembly import assemble, lay_out
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import energies, shape_vectors
from viewer.mechanics.growth import grown_property
from viewer.model.design import (
    Assignment,
    Design,
    Directional,
    LumpedMass,
    Material,
    Physics,
    Ply,
    Section,
    Selector,
    Spring,
)
from viewer.model.matrices import GivenMatrices, SymmetricMatrix
from viewer.model.modes import ArrayShapes

FOIL = Material("foil", 70e9, 0.33, 2700.0)
FIBRE = Material("fibre", 130e9, 0.3, 1600.0, Directional(130e9, 9e9, 0.3, 5e9, 5e9, 3.5e9))
TIP = Selector(group="x1")


def parted(mesh, name="part", share=0.4):
    """The mesh with a cell group of the cells up to ``share`` of its length, off the middle across."""
    centres = cell_centres(mesh)
    span = np.ptp(mesh.points, axis=0)
    inside = (centres[:, 0] <= share * span[0]) & (centres[:, 1] <= 0.7 * span[1] + 1e-9)
    return mesh.with_(cell_groups={name: np.nonzero(inside)[0]})


def squares(model, count):
    return (2 * np.pi * solve(model, count).freq_hz) ** 2


def slopes(make, square, step=2e-4):
    """(modes,) ∂ln λ by re-solution of ``make(factor)``."""
    return (squares(make(1 + step), len(square)) - squares(make(1 - step), len(square))) / (2 * step * square)


def of_group(model, modes, count, field):
    """(count,) of the first group, from the maps."""
    found = [gain_map(model, modes, number) for number in range(1, count + 1)]
    return np.array([getattr(item.groups[0], field).item() for item in found])


# ------------------------------------------------------------------------------------------ thickness of sheets


def layered(mesh, offset=0.0):
    plies = (Ply("foil", 0.004), Ply("fibre", 0.003, 30.0), Ply("fibre", 0.002, -45.0))
    assignment = Assignment("*", plies=plies, direction=(1, 0, 0), offset=offset)
    return Design("layers", mesh, Physics({"foil": FOIL, "fibre": FIBRE}, (assignment,), (CLAMP,)))


SHEETS = {
    "quad4": lambda: design(parted(plate_mesh("quad4", (8, 4), (0.8, 0.3), 0.2)), thickness=0.03, supports=(CLAMP,)),
    "tri3": lambda: design(parted(plate_mesh("tri3", (8, 4), (0.8, 0.3), 0.2)), thickness=0.03, supports=(CLAMP,)),
    "tri6": lambda: design(parted(plate_mesh("tri6", (5, 3), (0.8, 0.3))), thickness=0.02, supports=(CLAMP,)),
    "quad8": lambda: design(parted(plate_mesh("quad8", (5, 3), (0.8, 0.3))), thickness=0.02, supports=(CLAMP,)),
    "layers off their nodes": lambda: layered(parted(plate_mesh("quad4", (8, 4), (0.8, 0.3))), 0.006),
    "triangles in layers": lambda: layered(parted(plate_mesh("tri3", (8, 4), (0.8, 0.3))), 0.003),
    "camera on a sheet": lambda: design(
        parted(plate_mesh("quad4", (8, 4), (0.8, 0.3))),
        thickness=0.01,
        supports=(CLAMP,),
        masses=(LumpedMass("camera", TIP, 3.0, [0.85, 0.1, -0.1], np.diag([0.02, 0.02, 0.01])),),
        springs=(Spring("stay", TIP, None, [0, 0, 4e4, 0, 0, 0]),),
    ),
}


@pytest.mark.parametrize("name", SHEETS)
def test_one_part_changed_and_solved_again(name):
    model = SHEETS[name]()
    modes, count = solve(model, 6), 4
    cells, square = model.mesh.cell_groups["part"], (2 * np.pi * modes.freq_hz[:count]) ** 2
    for what, field in FIELDS.items():
        if what == "stiffness" and model.properties[0][0].layers:
            continue  # directional material has no single modulus
        measured = slopes(lambda factor, what=what: changed(model, cells, what, factor), square)
        np.testing.assert_allclose(of_group(model, modes, count, field), measured, atol=2e-5)


def test_thickness_is_three_times_bending_and_once_the_rest():
    """DESIGN §6 for quad4: (3 U_bending + U_membrane + U_shear)·2 − λφᵀMφ, rotary inertia (∝ t³) thrice."""
    model = SHEETS["quad4"]()
    modes = solve(model, 5)
    layout = lay_out(model)
    (group,) = layout.blocks
    parts = group.formulation.parts(model.mesh.points[group.nodes], group.prop)
    assert set(parts) == {"membrane", "bending", "shear", "drilling"}
    mass = group.mass(model.mesh.points, slice(None))
    for number in (1, 2, 5):
        found = gain_map(model, modes, number)
        vector = shape_vectors(layout, modes, np.array([number - 1]))[0][0]
        at = vector[group.dofs]
        energy = {name: 0.5 * np.einsum("bi,bij,bj->b", at, matrix, at) for name, matrix in parts.items()}
        turning = np.where(np.arange(24) % 6 >= 3, at, 0.0)
        moving = np.einsum("bi,bij,bj->b", at, mass, at) + 2 * np.einsum("bi,bij,bj->b", turning, mass, turning)
        square = modes.omega(number - 1) ** 2
        expected = 2 * sum((3 if name == "bending" else 1) * part for name, part in energy.items()) / square - moving
        np.testing.assert_allclose(found.thickness, expected, rtol=1e-6, atol=1e-9)
        np.testing.assert_array_equal(found.thickness, found.growth)


def test_thickened_cantilever_against_its_closed_form():
    """Narrow thin strip without Poisson's effect: per length ∂ln λ/∂ln t = 3 φ''²/∫φ''² − φ²/∫φ², Euler–Bernoulli
    with βL of row B01 (Blevins 1979, ch. 8)."""
    length, counts = 1.0, 80
    plain = Material("plain", 200e9, 0.0, 8000.0)
    mesh = plate_mesh("quad4", (counts, 1), (length, 0.01))
    model = design(mesh, thickness=0.002, material=plain, supports=(CLAMP,))
    modes = solve(model, 8)
    upright = [i for i in range(8) if np.abs(modes.shape(i)[:, 2]).max() > 0.9 * np.abs(modes.shape(i)).max()]
    for index, beta in zip(upright[:2], row("B01").values, strict=False):
        found = gain_map(model, modes, index + 1)
        fine = np.linspace(0, length, 40 * counts + 1)
        ratio = (np.cos(beta) + np.cosh(beta)) / (np.sin(beta) + np.sinh(beta))
        bend = np.cosh(beta * fine) + np.cos(beta * fine) - ratio * (np.sinh(beta * fine) + np.sin(beta * fine))
        move = np.cosh(beta * fine) - np.cos(beta * fine) - ratio * (np.sinh(beta * fine) - np.sin(beta * fine))
        density = 3 * bend**2 / np.trapezoid(bend**2, fine) - move**2 / np.trapezoid(move**2, fine)
        middle = 0.5 * (density[1:] + density[:-1]) * (fine[1] - fine[0])
        expected = middle.reshape(counts, -1).sum(axis=1)
        np.testing.assert_allclose(found.thickness, expected, atol=0.005 * np.abs(expected).max())
        per_kg = 0.5 * found.freq_hz * expected * counts / (8000.0 * 0.01 * 0.002 * length)
        np.testing.assert_allclose(found.per_kg, per_kg, atol=0.005 * np.abs(per_kg).max())
        if beta < 2:
            assert found.stiffen[0].position[0] < 0.2 < 0.8 < found.lighten[0].position[0]


# ------------------------------------------------------------------------------------------------ beams, solids

SECTIONS = {
    "rectangle": Section("rectangle", width=0.03, height=0.05),
    "round": Section("round", diameter=0.04),
    "tube": Section("tube", diameter=0.05, wall=0.004),
    "given": Section("given", area=1e-3, iy=2e-7, iz=1e-7, torsion=5e-8),
}


@pytest.mark.parametrize("name", SECTIONS)
def test_beams_of_larger_section(name):
    points = np.array([[0, 0, 0], [0.2, 0, 0], [0.4, 0, 0], [0.5, 0.1, 0], [0.5, 0.3, 0.1]])

    def model(factor=1.0):
        """The first two of four beams with ``factor`` times the area."""
        section = SECTIONS[name]
        base = Design(
            "frame",
            line_mesh(points).with_(cell_groups={"part": np.array([0, 1])}),
            Physics(
                {"steel": STEEL},
                (Assignment("*", "steel", section=section, orientation=(0.1, 0.2, 1.0)),),
                (CLAMP,),
            ),
        )
        prop = grown_property(base.properties[0][0], 1, factor)
        assignment = replace(base.physics.assignments[0], target="part", section=prop.section)
        return base.with_(physics=replace(base.physics, assignments=(*base.physics.assignments, assignment)))

    modes, count = solve(model(), 6), 4
    np.testing.assert_allclose(
        of_group(model(), modes, count, "growth"), slopes(model, squares(model(), count)), atol=2e-5
    )
    found = gain_map(model(), modes, 1)
    assert found.groups[0].thickness is None
    assert np.isnan(found.thickness).all()
    lengths = np.linalg.norm(np.diff(points, axis=0), axis=1)
    area = found.cell_mass / (8000.0 * lengths)
    np.testing.assert_allclose(area, area[0])
    if name == "round":
        assert area[0] == pytest.approx(np.pi * 0.02**2)


def test_solids_of_more_material():
    model = design(parted(box_mesh("hex8", (8, 2, 2), (0.5, 0.06, 0.04))), supports=(CLAMP,))
    cells = model.mesh.cell_groups["part"]
    modes, count = solve(model, 6), 3

    def denser(factor):
        more = replace(STEEL, name="more", youngs_modulus=factor * 200e9, density=factor * 8000.0)
        physics = model.physics
        changes = {"materials": {**physics.materials, "more": more}}
        return model.with_(
            physics=replace(physics, assignments=(*physics.assignments, Assignment("part", "more")), **changes)
        )

    measured = slopes(denser, squares(model, count))
    np.testing.assert_allclose(of_group(model, modes, count, "growth"), measured, atol=2e-5)
    found = gain_map(model, modes, 1)
    np.testing.assert_allclose(found.growth, found.stiffness + found.mass, atol=1e-15)
    assert found.cell_mass.sum() == pytest.approx(8000 * 0.5 * 0.06 * 0.04)
    place = found.to_dict()["groups"][0]
    kilograms = 8000 * 0.06 * 0.04 * 0.5 * len(cells) / model.mesh.n_cells
    hz = (solve(denser(1.001), 1).freq_hz[0] - solve(denser(0.999), 1).freq_hz[0]) / (0.002 * kilograms)
    assert place["hz_per_kg"] == pytest.approx(hz, rel=1e-4)
    assert place["made_of"] == "solid"
    assert "stiffness and mass" in found.sentence


# ------------------------------------------------------------------------------------- springs and lumped masses


def fitted(spring=4e4, mass=3.0, modulus=1.0, density=1.0, inertia=1.0, poisson=0.33):
    material = Material("foil", modulus * 70e9, poisson, density * 2700.0)
    return design(
        parted(plate_mesh("quad4", (8, 4), (0.8, 0.3))),
        thickness=0.01,
        material=material,
        supports=(CLAMP,),
        masses=(LumpedMass("camera", TIP, mass, [0.85, 0.1, -0.1], inertia * np.diag([0.02, 0.02, 0.01])),),
        springs=(Spring("stay", TIP, None, [0, 0, spring, 0, 0, 0]),),
    )


def test_springs_and_masses_changed_and_solved_again():
    model, count = fitted(), 4
    modes, square = solve(model, 6), squares(model, count)
    found = [gain_map(model, modes, number) for number in range(1, count + 1)]
    stiffer = slopes(lambda factor: fitted(spring=4e4 * factor), square)
    np.testing.assert_allclose([item.springs[0].share for item in found], stiffer, atol=2e-5)
    heavier = slopes(lambda factor: fitted(mass=3.0 * factor, inertia=factor), square)
    np.testing.assert_allclose([-item.masses[0].share for item in found], heavier, atol=2e-5)
    loaded = slopes(lambda factor: fitted(mass=2.0 + factor), square)
    np.testing.assert_allclose([item.masses[0].per_mass for item in found], loaded, atol=2e-5)
    facts = found[0].to_dict()
    hz = solve(fitted(spring=4e4 * 1.01), 1).freq_hz[0] - solve(fitted(spring=4e4 * 0.99), 1).freq_hz[0]
    assert facts["springs"][0]["hz_for_tenth_more"] == pytest.approx(5 * hz, rel=1e-3)
    assert "10% more stiffness of stay by about" in found[0].sentence
    assert "10% less mass of camera, 300 g, by about" in found[0].sentence
    assert not unfounded(found[0].sentence, facts)


def test_uniform_changes_move_the_square_by_exactly_the_factor():
    """Everything stiffer by half, springs included: λ × 1.5; everything heavier by half: λ / 1.5."""
    model = fitted()
    modes, square = solve(model, 6), squares(model, 6)
    np.testing.assert_allclose(squares(fitted(spring=6e4, modulus=1.5), 6), 1.5 * square, rtol=1e-9)
    np.testing.assert_allclose(squares(fitted(mass=4.5, density=1.5, inertia=1.5), 6), square / 1.5, rtol=1e-9)
    for number in range(1, 7):
        found = gain_map(model, modes, number)
        assert found.stiffness_total == pytest.approx(1, abs=1e-12)
        assert found.mass_total == pytest.approx(-1, abs=1e-12)
        assert (found.stiffness > -1e-12).all()
        assert (found.mass <= 0).all()
        assert found.springs[0].share > 0
        # against the given frequency and shape, not their own sum
        assert found.stiffness.sum() == pytest.approx(
            2 * energies(model, modes, [number - 1]).strain.sum() / modes.omega(number - 1) ** 2, rel=1e-8
        )


# --------------------------------------------------------------------------------------- modes of equal frequency


def clamped(ratio=1.0):
    mesh = plate_mesh("quad4", (8, 8), (1.0, ratio))
    edges = np.unique(np.concatenate([mesh.node_groups[name] for name in ("x0", "x1", "y0", "y1")]))
    mesh = parted(mesh).with_(node_groups={"x0": edges})
    return design(mesh, thickness=0.01, supports=(CLAMP,))


@pytest.mark.parametrize("ratio", [1.0, 1.0002])
@pytest.mark.parametrize("what", FIELDS)
def test_a_pair_splits_as_solved_again(ratio, what):
    """Second and third mode of a clamped square plate, equal or nearly so: both values of the changed plate. Between
    the values at ±1 % the ascending order turns round, so that the derivatives pair up crosswise."""
    model = clamped(ratio)
    modes, step = solve(model, 6), 0.01
    found = gain_map(model, modes, 2)
    assert found.modes == (2, 3)
    assert gain_map(model, modes, 3).modes == (2, 3)
    assert len(gain_map(model, modes, 1).modes) == 1
    predicted = getattr(found.groups[0], FIELDS[what])
    assert np.ptp(predicted) > 0.05 * np.abs(predicted).max()
    cells = model.mesh.cell_groups["part"]
    square = (2 * np.pi * found.freq_hz) ** 2
    more, less = (squares(changed(model, cells, what, 1 + s), 3)[1:] for s in (step, -step))
    measured = np.sort((more - less[::-1]) / (2 * step * square))
    np.testing.assert_allclose(predicted, measured, atol=0.01 * np.abs(measured).max())


@pytest.mark.parametrize("turn", ["turned", "complex", "not orthogonal"])
def test_a_pair_has_no_basis_of_its_own(turn):
    model = clamped()
    modes = solve(model, 6)
    mixes = {
        "turned": [[np.cos(0.7), np.sin(0.7)], [-np.sin(0.7), np.cos(0.7)]],
        "complex": np.array([[1, 1j], [1, -1j]]) * 3.0,
        "not orthogonal": [[1.0, 0.0], [0.8, 2.0]],
    }
    mix = np.asarray(mixes[turn])
    moved, turned = (np.array(part, mix.dtype) for part in (modes.shapes.moved, modes.shapes.turned))
    moved[1:3], turned[1:3] = (np.einsum("ij,jnd->ind", mix, part[1:3]) for part in (moved, turned))
    other = modes.with_(shapes=ArrayShapes(moved, turned), normalisation="unknown")
    one, two = gain_map(model, modes, 2), gain_map(model, other, 3)
    for field in ("stiffness", "mass", "thickness", "per_kg", "split"):
        np.testing.assert_allclose(getattr(one, field), getattr(two, field), rtol=1e-6, atol=1e-7 * one.per_kg.max())
    np.testing.assert_allclose(one.split.mean(axis=1), one.per_kg)
    np.testing.assert_allclose(one.groups[0].growth, two.groups[0].growth, atol=1e-9)
    assert one.stiffness_total == pytest.approx(1)
    assert "Modes 2 and 3" in one.sentence
    assert not unfounded(one.sentence, one.to_dict())


def test_all_maps_at_once_are_those_one_by_one():
    model = clamped()
    modes = solve(model, 6)
    together = gain_maps(model, modes)
    assert [found.mode for found in together] == [1, 2, 3, 4, 5, 6]
    assert together[1].modes == together[2].modes == (2, 3)
    for found in together:
        alone = gain_map(model, modes, found.mode)
        np.testing.assert_allclose(found.per_kg, alone.per_kg, rtol=1e-9, atol=1e-9 * np.abs(alone.per_kg).max())
        assert found.sentence == alone.sentence
    assert gain_maps(model, modes, []) == []


def test_the_same_shape_twice_is_one_mode():
    model = clamped(0.8)
    modes = solve(model, 3)
    pick = [0, 1, 1, 2]
    doubled = modes.with_(
        freq_hz=modes.freq_hz[pick], shapes=ArrayShapes(modes.shapes.moved[pick], modes.shapes.turned[pick])
    )
    np.testing.assert_allclose(gain_map(model, doubled, 3).per_kg, gain_map(model, modes, 2).per_kg)


def test_a_close_neighbour_is_named():
    model = clamped(1.01)
    modes = solve(model, 6)
    gap = modes.freq_hz[2] - modes.freq_hz[1]
    assert 1e-3 < gap / modes.freq_hz[1] < 0.02
    found = gain_map(model, modes, 2)
    assert found.modes == (2,)
    assert any(words.startswith(f"mode 3 lies only {gap:.2g} Hz away") for words in found.cautions)
    assert not any("no mode above" in words for words in found.cautions)
    assert any("no mode above" in words for words in gain_map(model, modes, 6).cautions)


# --------------------------------------------------------------------------------------- other mode sets, refusals


def test_size_and_missing_rotations_do_not_matter():
    model = fitted()
    modes = solve(model, 4)
    bare = modes.with_(shapes=ArrayShapes(-37.0 * modes.shapes.moved), normalisation="unknown", origin="imported")
    one, two = gain_map(model, modes, 1), gain_map(model, bare, 1)
    assert two.absolute
    np.testing.assert_allclose(two.per_kg, one.per_kg, atol=2e-3 * np.abs(one.per_kg).max())
    assert two.masses[0].per_mass == pytest.approx(one.masses[0].per_mass, rel=1e-6)


def test_energies_known_already_are_used_as_they_are():
    model = fitted()
    modes = solve(model, 4)
    known = energies(model, modes)
    one, two = gain_map(model, modes, 2, known), gain_map(model, modes, 2)
    np.testing.assert_allclose(one.per_kg, two.per_kg, rtol=1e-9)
    np.testing.assert_allclose(one.stiffness, known.strain[1] / known.total_strain[1], rtol=1e-12)


def test_untrusted_energies_give_shares_only():
    model = fitted()
    modes = solve(model, 4)
    wrong = modes.with_(freq_hz=modes.freq_hz * 1.3, origin="imported")
    found = gain_map(model, wrong, 1)
    assert not found.absolute
    assert np.isnan(found.per_kg).all()
    assert found.callouts == ()
    facts = found.to_dict()
    assert facts["groups"][0]["hz_per_kg"] is facts["springs"][0]["hz_for_tenth_more"] is None
    assert facts["masses"][0]["hz_per_kg"] is facts["stiffen"][0]["hz_for_tenth_more"] is None
    np.testing.assert_allclose(found.stiffness, gain_map(model, modes, 1).stiffness)
    assert any("not trusted" in words for words in found.cautions)
    assert "no figure in hertz" in found.sentence
    assert not unfounded(found.sentence, facts)


def test_without_material_shares_only():
    stated = fitted(poisson=0.3)  # as is assumed
    modes = solve(stated, 4)
    bare = stated.with_(physics=Physics(assignments=(Assignment("*", thickness=0.01),)))
    found = gain_map(bare, modes.with_(origin="imported"), 1)
    assert not found.absolute
    assert found.stiffness.sum() == pytest.approx(1)
    assert found.to_dict()["stiffen"][0]["mass_kg"] is None
    assert "no figure in hertz" in found.sentence
    np.testing.assert_allclose(
        found.stiffness / found.stiffness.sum(),
        (lambda s: s / s.sum())(gain_map(stated, modes, 1).stiffness),
        rtol=1e-6,
    )


def test_rigid_body_modes_have_no_gain():
    model = design(plate_mesh("quad4", (4, 2), (0.4, 0.2)), thickness=0.01)
    modes = solve(model, 8)
    found = gain_map(model, modes, 3)
    assert found.rigid
    assert not found.stiffness.any()
    assert found.stiffen == found.lighten == found.callouts == ()
    assert "rigid-body mode" in found.sentence
    json.dumps(found.to_dict(), allow_nan=False)
    assert gain_map(model, modes, 7).stiffness_total == pytest.approx(1)


def test_refusals():
    model = fitted()
    modes = solve(model, 2)
    with pytest.raises(InputError, match="no mode 3"):
        gain_map(model, modes, 3)
    with pytest.raises(InputError, match="no mode 0"):
        gain_map(model, modes, 0)
    system = assemble(model)
    parts = [SymmetricMatrix(one.data, one.indices, one.indptr) for one in (system.K, system.M)]
    given = model.with_(physics=Physics(matrices=GivenMatrices(*parts, system.dof)))
    with pytest.raises(RefusedError, match="given as matrices"):
        gain_map(given, solve(given, 1), 1)


def test_complex_shapes_weigh_like_real_ones():
    model = fitted()
    modes = solve(model, 3)
    phase = np.exp(0.4j)
    other = modes.with_(shapes=ArrayShapes(phase * modes.shapes.moved, phase * modes.shapes.turned))
    np.testing.assert_allclose(
        gain_map(model, other, 1).per_kg, gain_map(model, modes, 1).per_kg, rtol=1e-9, atol=1e-9
    )


# ------------------------------------------------------------------------------------------------ places and words


def test_places_and_words():
    """A cantilevered plate: thicker at the clamp, lighter at the free end, in groups that say so."""
    mesh = plate_mesh("quad4", (20, 6), (0.8, 0.3))
    x = cell_centres(mesh)[:, 0]
    mesh = mesh.with_(cell_groups={"neck": np.nonzero(x < 0.2)[0], "rest": np.nonzero(x >= 0.2)[0]})
    model = design(mesh, thickness=0.01, supports=(CLAMP,))
    found = gain_map(model, solve(model, 3), 1)
    facts = found.to_dict()
    assert "neck" in facts["stiffen"][0]["name"]
    assert facts["stiffen"][0]["hz_per_kg"] > 0 > facts["lighten"][0]["hz_per_kg"]
    (add, first, cells), (remove, second, others) = found.callouts
    assert add.startswith("add material here: +")
    assert remove.startswith("remove material here: +")
    assert first[0] < 0.2 < 0.7 < second[0]
    assert found.per_kg[cells].min() >= 0.4 * found.per_kg.max()
    assert found.per_kg[others].max() < 0
    mean = np.average(found.per_kg[cells], weights=found.cell_mass[cells])
    assert facts["stiffen"][0]["hz_per_kg"] == pytest.approx(mean)
    assert not unfounded(found.sentence, facts)
    for words, place in ((add, facts["stiffen"][0]), (remove, facts["lighten"][0])):
        assert not unfounded(words, place)
    assert "raises it by about" in found.sentence
    assert "to be checked by solving the changed design" in found.sentence
    json.dumps(facts, allow_nan=False)


def test_mirrored_spots_are_one_place():
    """A strip held at both ends: its first mode bends most at both clamps."""
    mesh = plate_mesh("quad4", (24, 3), (0.9, 0.1))
    mesh = mesh.with_(
        node_groups={"x0": np.concatenate([mesh.node_groups["x0"], mesh.node_groups["x1"]])}, cell_groups={}
    )
    model = design(mesh, thickness=0.005, supports=(CLAMP,))
    (place,) = gain_map(model, solve(model, 2), 1).stiffen[:1]
    centres = cell_centres(mesh)[place.cells, 0]
    assert (centres < 0.2).sum() == (centres > 0.7).sum() > 0
    assert place.name.startswith("the region near (")


@pytest.mark.parametrize("width", [0.02, 0.004])
def test_a_weak_strip_is_where_to_stiffen_on_either_mesh(width):
    """A plate with a strip of a third of its thickness; the narrow one is 0.2 % of the mass."""
    figures = []
    for fine in (1, 2):
        steps = [np.linspace(0, 0.3, 15 * fine + 1), 0.3 + width * np.linspace(0, 1, 2 * fine + 1)[1:]]
        steps.append(np.linspace(0.3 + width, 0.8, 25 * fine + 1)[1:])
        mesh = plate_mesh("quad4", (42 * fine, 4 * fine), (1.0, 0.2))
        lines = np.concatenate(steps)
        points = mesh.points.copy()
        points[:, 0] = lines[np.rint(points[:, 0] * 42 * fine).astype(int)]
        x = points[mesh.blocks[0].nodes].mean(axis=1)[:, 0]
        weak = np.nonzero((x > 0.3) & (x < 0.3 + width))[0]
        mesh = mesh.with_(points=points, cell_groups={"strip": weak})
        thick, thin = Assignment("*", "steel", 0.006), Assignment("strip", "steel", 0.002)
        model = Design("weak", mesh, Physics({"steel": STEEL}, (thick, thin), (CLAMP,)))
        found = gain_map(model, solve(model, 2), 1)
        assert found.to_dict()["stiffen"][0]["name"] == "strip"
        assert set(found.stiffen[0].cells) == set(weak)
        figures.append(found.to_dict()["stiffen"][0]["hz_per_kg"])
    assert figures[0] == pytest.approx(figures[1], rel=0.03)
