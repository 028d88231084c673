"""Effective masses and rigid content of small models whose modes are all kept, by matrices formed here."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.linalg

from tests.mechanics.models import CLAMP, STEEL, design, merged
from tests.meshes import box_mesh, line_mesh, plate_mesh
from viewer.errors import ModelError
from viewer.insight.effective_mass import effective_masses
from viewer.mechanics.assembly import assemble
from viewer.mechanics.eigen import solve
from viewer.mechanics.patch import rigid_fields
from viewer.model.design import Assignment, Design, Link, LumpedMass, Physics, Section, Selector, Spring, Support, Tie
from viewer.model.mesh import CellBlock, Mesh
from viewer.model.modes import ArrayShapes, ModeSet

LUMP = LumpedMass("lump", Selector(group="x1"), 3.0, np.array([1.3, 0.1, 0.4]), np.diag([0.02, 0.03, 0.05]))


def solid(**physics):
    return design(box_mesh("hex8", (4, 2, 1), (1.0, 0.3, 0.2), distort=0.2), **physics)


def sheet(**physics):
    return design(plate_mesh("quad4", (4, 2), (1.0, 0.3)), thickness=0.02, **physics)


def rod(**physics):
    mesh = line_mesh(np.outer(np.linspace(0, 1.0, 6), [0.8, 0.6, 0.0]))
    section = Section("rectangle", width=0.02, height=0.03)
    assigned = Assignment("*", "steel", None, "", section, (0, 0, 1))
    return Design("rod", mesh, Physics({"steel": STEEL}, (assigned,), **physics))


def every_mode(model: Design) -> tuple[ModeSet, np.ndarray]:
    """All modes by a dense solver, massless directions condensed out by its inverse; and their (n_free,) vectors."""
    system = assemble(model)
    stiffness, mass = (system.restrict(matrix).toarray() for matrix in (system.K, system.M))
    shift = np.trace(stiffness) / max(np.trace(mass), 1e-300) * 1e-9
    # M φ μ = (K + shift M) φ: μ = 0 for directions without mass, which are no modes
    inverse, vectors = scipy.linalg.eigh(mass, stiffness + shift * mass)
    keep = inverse > 1e-12 * inverse.max()
    vectors = vectors[:, keep][:, ::-1]
    vectors /= np.sqrt(np.einsum("nk,nm,mk->k", vectors, mass, vectors))
    omega = np.sqrt(np.maximum(1 / inverse[keep][::-1] - shift, 0))
    moved, turned = system.spread(system.extend(vectors.T))
    shapes = ArrayShapes(moved, turned)
    return ModeSet(model.mesh.node_ids, omega / (2 * np.pi), shapes, normalisation="mass"), vectors


BODIES = {
    "solid, clamped": solid(supports=(CLAMP,)),
    "solid, clamped, lumped mass": solid(supports=(CLAMP,), masses=(LUMP,)),
    "solid, one side held sideways": solid(supports=(Support("slide", Selector(group="x0"), ("uy",)),)),
    "sheet, clamped, lumped mass": sheet(supports=(CLAMP,), masses=(LUMP,)),
    "rod, clamped": rod(supports=(CLAMP,)),
    "solid, free, lumped mass": solid(masses=(LUMP,)),
    "sheet, free": sheet(),
    "rod, free, lumped mass at a node": rod(masses=(LumpedMass("end", Selector(group="x1"), 0.4),)),
    "solid on springs": solid(
        springs=(Spring("feet", Selector(group="z0"), stiffness=np.array([1e6] * 3 + [0] * 3)),)
    ),
}


def rigid(model: Design, about) -> tuple[np.ndarray, object]:
    system = assemble(model)
    moved = np.moveaxis(rigid_fields(model.mesh.points, about), 2, 0)
    turned = np.zeros_like(moved)
    for axis in range(3):
        turned[3 + axis, :, axis] = 1.0
    return system.gather(moved, turned), system


@pytest.mark.parametrize("name", BODIES)
@pytest.mark.parametrize("about", [None, (0.2, -1.0, 0.5)])
def test_all_modes_together(name, about):
    """Σ over all modes = gᵀ M_ff⁻¹ g with g = M_ff r_f + M_fs r_s, formed here from the assembled mass matrix."""
    model = BODIES[name]
    modes, _ = every_mode(model)
    found = effective_masses(model, modes, about=None if about is None else np.array(about))
    motion, system = rigid(model, found.about)
    mass, held, free = system.M.toarray(), np.nonzero(system.held)[0], system.free
    pull = mass[np.ix_(free, free)] @ motion[:, free].T + mass[np.ix_(free, held)] @ motion[:, held].T
    whole = np.einsum("in,nm,im->i", motion, mass, motion)
    free_part = np.einsum("ni,ni->i", pull, np.linalg.pinv(mass[np.ix_(free, free)], hermitian=True) @ pull)
    scale = np.maximum(whole, 1e-9 * whole.max())
    assert np.abs(found.whole - whole).max() <= 1e-9 * whole.max()
    assert (np.abs(found.free - free_part) <= 1e-7 * scale).all()
    assert (np.abs(found.values.sum(axis=0) - free_part) <= 1e-6 * scale).all()
    assert (found.supports >= 0).all()


@pytest.mark.parametrize("name", [name for name in BODIES if "free" in name])
def test_a_free_body_has_no_effective_mass_in_elastic_modes(name):
    modes, _ = every_mode(BODIES[name])
    found = effective_masses(BODIES[name], modes)
    elastic = modes.freq_hz > 1e-3 * modes.freq_hz.max()
    assert found.values[elastic].max() <= 1e-8 * found.whole.max()
    assert found.values[~elastic].sum(axis=0) == pytest.approx(found.whole, rel=1e-6, abs=1e-9 * found.whole.max())
    assert found.rigid[~elastic].sum(axis=1) == pytest.approx(1.0, abs=1e-8)
    assert found.rigid[elastic].sum(axis=1).max() < 1e-8
    assert found.supports == pytest.approx(np.zeros(6), abs=1e-8 * found.whole.max())


def test_centre_and_moments_of_a_brick_with_a_lumped_mass():
    """Against a brick's m/12 (b² + c²) and the parallel axes (any handbook of mechanics)."""
    size = np.array([1.0, 0.3, 0.2])
    model = design(box_mesh("hex8", (2, 1, 1), size), masses=(LUMP,))
    found = effective_masses(model, every_mode(model)[0], [0])
    brick = STEEL.density * size.prod()
    total = brick + LUMP.mass
    centre = (brick * size / 2 + LUMP.mass * LUMP.position) / total
    assert found.about == pytest.approx(centre, rel=1e-9)
    own = brick / 12 * (np.sum(size**2) - size**2) + np.diag(LUMP.inertia)
    shift = sum(
        m * (np.sum(a**2) - a**2) for m, a in ((brick, size / 2 - centre), (LUMP.mass, LUMP.position - centre))
    )
    assert found.whole == pytest.approx([total] * 3 + list(own + shift), rel=1e-9)


def test_links_and_ties_carry_the_base_along():
    """A body hung on the base by a rigid link, another glued to it: all modes hold what does not sit on the base."""
    lower = box_mesh("hex8", (3, 2, 1), (1.0, 0.3, 0.1))
    upper = box_mesh("hex8", (2, 1, 1), (1.0, 0.3, 0.1))
    points = np.concatenate([lower.points, upper.points + np.array([0, 0, 0.1])])
    nodes = upper.blocks[0].nodes + lower.n_nodes
    blocks = (lower.blocks[0], CellBlock("hex8", nodes, np.arange(len(nodes)) + 100))
    mesh = Mesh(points, blocks, np.arange(1, len(points) + 1), {"x0": lower.node_groups["x0"]})
    bottom = np.nonzero(points[lower.n_nodes :, 2] < 0.15)[0] + lower.n_nodes + 1
    tops = np.nonzero(np.abs(lower.points[:, 2] - 0.1) < 1e-9)[0] + 1
    tie = Tie("glue", Selector(nodes=bottom), Selector(nodes=tops), 0.01)
    link = Link("bar", Selector(nodes=np.array([1])), Selector(nodes=np.array([lower.n_nodes])))
    for physics in ({"ties": (tie,), "supports": (CLAMP,)}, {"ties": (tie,)}, {"ties": (tie,), "links": (link,)}):
        model = design(mesh, **physics)
        found = effective_masses(model, every_mode(model)[0])
        assert found.values.sum(axis=0) == pytest.approx(found.free, rel=1e-6)
        assert (found.free <= found.whole * (1 + 1e-9)).all()
        if "supports" not in physics:
            assert found.free == pytest.approx(found.whole, rel=1e-8)


LONG = {
    "solid": design(box_mesh("hex8", (60, 1, 1), (3.0, 0.05, 0.1), distort=0.3), supports=(CLAMP,)),
    "quadratic solid": design(box_mesh("hex20", (40, 1, 1), (3.0, 0.05, 0.1)), supports=(CLAMP,), masses=(LUMP,)),
    "sheet": design(plate_mesh("quad4", (60, 1), (3.0, 0.05)), thickness=0.02, supports=(CLAMP,)),
}


@pytest.mark.parametrize("name", LONG)
def test_supports_are_not_felt_far_away(name):
    """Bodies longer than the reach within which the supports' share is looked for: as by the whole matrix."""
    model = LONG[name]
    found = effective_masses(model, solve(model, 1))
    motion, system = rigid(model, found.about)
    pull = system.force((system.M @ motion.T).T)
    inside = np.linalg.pinv(system.restrict(system.M).toarray(), hermitian=True)
    exact = np.einsum("kn,nm,km->k", pull, inside, pull)
    assert (np.abs(found.free - exact) <= 1e-9 * np.maximum(found.whole, 1e-3 * found.whole[:3].max())).all()
    assert found.supports[0] > 1e-3 * found.whole[0]


def test_shares_of_direction_and_rigid_motion():
    """A body pushed as one piece: all of its motion is rigid, along the push; kinetic shares add up to one."""
    model = solid(masses=(LUMP,))
    push = np.broadcast_to([3.0, 4.0, 0.0], model.mesh.points.shape)
    modes = ModeSet(model.mesh.node_ids, np.array([5.0]), ArrayShapes(push[None]))
    found = effective_masses(model, modes)
    assert found.rigid[0] == pytest.approx([9 / 25, 16 / 25, 0, 0, 0, 0], abs=1e-9)
    assert found.direction[0] == pytest.approx([9 / 25, 16 / 25, 0, 0], abs=1e-9)
    assert found.modal_mass[0] == pytest.approx(25 * found.whole[0], rel=1e-9)
    shapes = every_mode(model)[0]
    assert effective_masses(model, shapes).direction.sum(axis=1) == pytest.approx(1.0, abs=1e-9)


def test_complex_shapes_count_like_their_parts():
    """A mode turned in phase is the same mode."""
    model = solid(supports=(CLAMP,))
    modes = solve(model, 3)
    turned = np.stack([modes.shape(i) for i in range(3)]) * np.exp(0.7j)
    found = effective_masses(model, modes.with_(shapes=ArrayShapes(turned)))
    plain = effective_masses(model, modes)
    assert found.values == pytest.approx(plain.values, rel=1e-9, abs=1e-12 * plain.whole.max())
    assert found.rigid == pytest.approx(plain.rigid, rel=1e-9, abs=1e-12)


def test_shells_without_rotations_are_nearly_the_same():
    spread = LumpedMass("lump", Selector(box=[[0.7, 0, 0], [1, 0.3, 0]]), 3.0, LUMP.position, LUMP.inertia)
    model = sheet(supports=(CLAMP,), masses=(spread,))
    modes = solve(model, 4)
    bare = modes.with_(shapes=ArrayShapes(np.stack([modes.shape(i) for i in range(4)])))
    found, whole = effective_masses(model, bare), effective_masses(model, modes)
    assert found.shares == pytest.approx(whole.shares, abs=2e-3)
    assert "rotations" in found.cautions[0] and "rough" not in found.cautions[0]
    on_a_line = effective_masses(sheet(supports=(CLAMP,), masses=(LUMP,)), bare)
    assert "how lump turns follows from them alone and is rough" in on_a_line.cautions[0]


def test_two_bodies_share_their_cells_mass():
    """Mixed solids and sheets: scalar and full element masses in one matrix."""
    box = box_mesh("hex8", (2, 1, 1), (1.0, 0.3, 0.2))
    skin = Mesh(
        box.points,
        (CellBlock("quad4", np.array([[0, 2, 3, 1]]), np.array([50])),),
        box.node_ids,
        box.node_groups,
    )
    model = design(merged(box, skin), thickness=0.01)
    found = effective_masses(model, every_mode(model)[0])
    assert found.whole[:3] == pytest.approx(STEEL.density * (0.06 + 0.3 * 0.2 * 0.01), rel=1e-9)
    assert found.values.sum(axis=0) == pytest.approx(found.whole, rel=1e-6)


def test_errors():
    model = solid(supports=(CLAMP,))
    modes = solve(model, 1)
    with pytest.raises(ModelError, match="not given on the nodes"):
        effective_masses(sheet(), modes)
    still = modes.with_(shapes=ArrayShapes(np.zeros((1, model.mesh.n_nodes, 3))))
    with pytest.raises(ModelError, match="moves no mass"):
        effective_masses(model, still)
