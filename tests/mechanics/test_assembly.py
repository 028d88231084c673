"""Matrices against an independent library, totals of mass, and clear errors for what a design lacks."""

from __future__ import annotations

import numpy as np
import pytest

from tests import independent
from tests.mechanics.models import CLAMP, STEEL, design, lone_nodes, merged
from tests.meshes import box_mesh, plate_mesh
from viewer.errors import Cancelled, ModelError
from viewer.jobs import Progress
from viewer.mechanics.assembly import assemble, lay_out
from viewer.mechanics.patch import rigid_fields
from viewer.model.design import Assignment, LumpedMass, Physics, Selector, Spring, Support
from viewer.model.mesh import CellBlock, Mesh


def entries(matrix, rows):
    return matrix.toarray()[np.ix_(rows, rows)]


@pytest.mark.parametrize(("kind", "formulation"), [("hex8", "hex8-full"), ("tet4", "tet4-constant")])
def test_matrices_equal_those_of_an_independent_library(kind, formulation):
    mesh = box_mesh(kind, (3, 2, 2), (1.0, 0.7, 0.5))
    space = independent.basis(mesh)
    theirs = independent.matrices(space, STEEL)
    ours = assemble(design(mesh, formulation=formulation))
    rows, their_rows = ours.dof[:, :3].ravel(), space.nodal_dofs[:3].T.ravel()
    for mine, other in zip((ours.K, ours.M), theirs, strict=True):
        expected = entries(other, their_rows)
        np.testing.assert_allclose(entries(mine, rows), expected, rtol=0, atol=1e-10 * np.abs(expected).max())


def test_matrices_are_canonical_and_symmetric_with_small_indices():
    system = assemble(design(box_mesh("hex8", (2, 2, 2), (1, 1, 1), 0.2)))
    for matrix in (system.K, system.M):
        assert matrix.indices.dtype == np.int32
        assert matrix.has_sorted_indices
        assert abs(matrix - matrix.T).max() <= 1e-14 * abs(matrix).max()


def test_slabs_and_chunks_change_nothing(monkeypatch):
    model = design(box_mesh("hex8", (3, 2, 2), (1, 1, 1), 0.2))
    whole = assemble(model)
    monkeypatch.setattr("viewer.mechanics.assembly._CHUNK", 2 * 24**2)
    monkeypatch.setattr("viewer.mechanics.pattern._SLAB", 5 * 24**2)
    pieces = assemble(model)
    np.testing.assert_allclose(pieces.K.toarray(), whole.K.toarray(), atol=1e-12 * abs(whole.K).max())
    np.testing.assert_allclose(pieces.M.toarray(), whole.M.toarray(), atol=1e-12 * abs(whole.M).max())


def mixed_mesh():
    """A box with a shell on its upper side that stands out beyond it."""
    box = box_mesh("hex8", (2, 2, 1), (2.0, 2.0, 0.5))
    points = np.vstack([box.points, [[3.0, 0, 0.5], [3.0, 1.0, 0.5]]])
    at = {tuple(p): i for i, p in enumerate(points)}
    corners = [[(x, y), (x + 1, y), (x + 1, y + 1), (x, y + 1)] for x, y in ((0, 0), (1, 0), (2, 0))]
    quads = np.array([[at[(float(a), float(b), 0.5)] for a, b in ring] for ring in corners])
    return Mesh(
        points,
        (*box.blocks, CellBlock("quad4", quads, np.arange(101, 104))),
        np.arange(1, len(points) + 1),
        node_groups=box.node_groups,
    )


def test_shells_and_solids_share_a_mesh():
    mesh = mixed_mesh()
    system = assemble(design(mesh, thickness=0.01))
    mass = 8000 * (2 * 2 * 0.5 + 3 * 0.01)
    assert any("like a hinge" in caution for caution in system.cautions)
    fields = rigid_fields(mesh.points, np.zeros(3))
    turned = np.zeros_like(fields)
    turned[:, :, 3:] = np.eye(3)
    rigid = system.gather(np.moveaxis(fields, 2, 0), np.moveaxis(turned, 2, 0))
    assert rigid[0] @ system.M @ rigid[0] == pytest.approx(mass, rel=1e-9)
    forces = np.abs(system.K @ rigid.T).max()
    assert forces <= 1e-9 * abs(system.K).max()


@pytest.mark.parametrize("kind", ["hex8", "hex20", "tet10", "wedge6"])
def test_total_mass_and_inertia(kind):
    mesh = box_mesh(kind, (2, 1, 1), (2.0, 0.4, 0.3))
    system = assemble(design(mesh))
    mass = 8000 * 2.0 * 0.4 * 0.3
    about = np.array([1.0, 0.2, 0.15])
    rigid = system.gather(np.moveaxis(rigid_fields(mesh.points, about), 2, 0))
    found = rigid @ system.M @ rigid.T
    sides = np.array([2.0, 0.4, 0.3]) ** 2
    expected = np.diag([mass] * 3 + [mass / 12 * (sides.sum() - s) for s in sides])  # a cuboid about its centre
    np.testing.assert_allclose(found, expected, atol=1e-9 * mass)
    assert np.abs(system.K @ rigid.T).max() <= 1e-9 * abs(system.K).max()


def test_lumped_mass_moves_with_its_footprint():
    mesh = box_mesh("hex8", (2, 1, 1), (2.0, 0.4, 0.3))
    centre = np.array([2.5, 0.1, 0.0])
    inertia = np.array([[2.0, 0.1, 0], [0.1, 3.0, 0], [0, 0, 4.0]])
    body = LumpedMass("camera", Selector(group="x1"), 7.0, centre, inertia)
    plain, loaded = assemble(design(mesh)), assemble(design(mesh, masses=(body,)))
    rigid = plain.gather(np.moveaxis(rigid_fields(mesh.points, centre), 2, 0))
    added = rigid @ (loaded.M - plain.M) @ rigid.T
    expected = np.zeros((6, 6))
    expected[:3, :3], expected[3:, 3:] = 7.0 * np.eye(3), inertia
    np.testing.assert_allclose(added, expected, atol=1e-9)
    assert abs(loaded.K - plain.K).max() == 0


def test_single_solid_node_carries_mass_and_says_what_is_lost():
    body = LumpedMass("weight", Selector(near=[1, 0, 0]), 2.0, None, np.eye(3))
    system = assemble(design(box_mesh("hex8", (1, 1, 1), (1, 1, 1)), masses=(body,)))
    assert any("weight" in text and "does not take part" in text for text in system.cautions)


def test_springs_to_ground_between_nodes_and_along_an_axis():
    mesh = lone_nodes(2)
    first, second = Selector(nodes=[1]), Selector(nodes=[2])
    springs = (
        Spring("ground", first, stiffness=[3, 0, 0, 0, 0, 5]),
        Spring("between", first, second, stiffness=[7, 0, 0, 0, 0, 0]),
        Spring("slanted", second, axis=[1, 1, 0], axial=4.0),
    )
    system = assemble(
        design(
            mesh,
            springs=springs,
            supports=(
                Support("a", Selector(nodes=[1]), ("uy", "uz", "rx", "ry")),
                Support("b", Selector(nodes=[2]), ("uz",)),
            ),
        )
    )
    ux1, rz1, ux2, uy2 = system.dof[0, 0], system.dof[0, 5], system.dof[1, 0], system.dof[1, 1]
    found = entries(system.K, [ux1, rz1, ux2, uy2])
    np.testing.assert_allclose(found, [[10, 0, -7, 0], [0, 5, 0, 0], [-7, 0, 9, 2], [0, 0, 2, 2]], atol=1e-12)
    assert system.cautions == ()


def test_spring_across_the_gap_between_its_ends_is_named():
    spring = Spring("leaning", Selector(nodes=[1]), Selector(nodes=[2]), stiffness=[0, 7, 0, 0, 0, 0])
    assert "acts across the line" in lay_out(design(lone_nodes(2), springs=(spring,))).cautions[0]


def test_boundary_cells_are_taken_as_names():
    solid = box_mesh("hex8", (2, 1, 1), (2, 1, 1))
    face = solid.blocks[0].nodes[:, [0, 1, 2, 3]]
    with_faces = solid.with_(blocks=(*solid.blocks, CellBlock("quad4", face, [7, 8])))
    system = assemble(design(with_faces))
    assert any("names of places" in text for text in system.cautions)
    assert abs(system.K - assemble(design(solid)).K).max() == 0


def bad(mesh=None, **changes):
    return design(mesh if mesh is not None else box_mesh("hex8", (2, 1, 1), (2, 1, 1)), **changes)


def without_material():
    model = bad()
    return model.with_(physics=Physics(materials={"steel": STEEL}))


def folded():
    mesh = box_mesh("hex8", (2, 1, 1), (2, 1, 1))
    nodes = mesh.blocks[0].nodes.copy()
    nodes[1] = nodes[1][[4, 5, 6, 7, 0, 1, 2, 3]]
    return bad(mesh.with_(blocks=(CellBlock("hex8", nodes, mesh.blocks[0].ids),)))


def loose_line():
    mesh = lone_nodes(3)
    return bad(mesh.with_(blocks=(CellBlock("line3", [[0, 1, 2]], [5]),)))


def other_density(value):
    return bad(material=type(STEEL)("alloy", 70e9, 0.33, value))


@pytest.mark.parametrize(
    ("model", "words"),
    [
        (without_material, ["2 cells hex8", "no material", "assignment"]),
        (lambda: bad(plate_mesh("quad4", (1, 1), (1, 1))), ["quad4", "thickness"]),
        (lambda: bad(plate_mesh("quad4", (1, 1), (1, 1)), thickness=-1.0), ["quad4", "thickness", "-1"]),
        (lambda: other_density(0.0), ["alloy", "density", "hex8"]),
        (lambda: other_density(float("nan")), ["alloy", "density", "nan"]),
        (lambda: bad(material=type(STEEL)("rubber", 1e6, 0.5, 1000.0)), ["rubber", "Poisson"]),
        (folded, ["1 cells hex8 (ids 2", "Jacobian"]),
        (loose_line, ["line3", "no element formulation", "kinds:"]),
        (lambda: bad(formulation="hex8-magic"), ["hex8-magic", "hex8-incompatible"]),
        (lambda: bad(lone_nodes(2)), ["no cell with a material"]),
        (lambda: bad(supports=(Support("root", Selector(group="x0"), ("up",)),)), ["root", "up", "ux"]),
        (lambda: bad(supports=(Support("root", Selector(group="x0"), ("rx",)),)), ["root", "holds nothing"]),
        (
            lambda: bad(springs=(Spring("s", Selector(group="x0"), stiffness=[0, 0, 0, 1, 0, 0]),)),
            ["rotations", "'s'"],
        ),
        (lambda: bad(springs=(Spring("s", Selector(group="x0")),)), ["'s'", "no stiffness"]),
        (
            lambda: bad(springs=(Spring("s", Selector(group="x0"), stiffness=[-1, 0, 0, 0, 0, 0]),)),
            ["'s'", "negative"],
        ),
        (lambda: bad(springs=(Spring("s", Selector(group="x0"), Selector(group="x1"), [1] * 6),)), ["one node"]),
        (lambda: bad(masses=(LumpedMass("m", Selector(group="x0"), -1.0),)), ["'m'", "negative"]),
        (lambda: bad(masses=(LumpedMass("m", Selector(group="x0"), 1.0, None, -np.eye(3)),)), ["'m'", "inertia"]),
        (
            lambda: bad(lone_nodes(2), springs=(Spring("s", Selector(nodes=[1]), stiffness=[1, 0, 0, 0, 0, 0]),)),
            ["neither stiffness nor mass", "uy of node 1", "support"],
        ),
    ],
)
def test_what_a_design_lacks_is_said_in_one_message(model, words):
    with pytest.raises(ModelError) as caught:
        assemble(model())
    for word in words:
        assert word in str(caught.value)


def test_mass_on_a_node_of_no_cell():
    mesh = box_mesh("hex8", (1, 1, 1), (1, 1, 1))
    mesh = mesh.with_(points=np.vstack([mesh.points, [9, 9, 9]]), node_ids=np.append(mesh.node_ids, 77))
    body = LumpedMass("stray", Selector(nodes=[77]), 1.0)
    with pytest.raises(ModelError, match=r"stray.*77"):
        assemble(design(mesh, masses=(body,)))
    system = assemble(design(mesh, supports=(CLAMP,)))  # an unused node by itself is harmless
    assert (system.dof[-1] == -1).all()


def test_later_assignment_by_group_makes_its_own_element_group():
    mesh = box_mesh("hex8", (2, 1, 1), (2, 1, 1)).with_(cell_groups={"tip": [1]})
    light = type(STEEL)("light", 70e9, 0.33, 2700.0)
    model = design(mesh).with_(
        physics=Physics(
            materials={"steel": STEEL, "light": light},
            assignments=(Assignment("*", "steel"), Assignment("tip", "light")),
        )
    )
    system = assemble(model)
    assert [group.prop.material.name for group in system.blocks] == ["steel", "light"]
    ones = system.gather(np.broadcast_to([1.0, 0, 0], mesh.points.shape))
    assert ones @ system.M @ ones == pytest.approx(8000 + 2700)


def test_mixed_formulations_and_kinds_in_one_mesh_keep_their_own_matrices():
    hexes, tets = box_mesh("hex8", (1, 1, 1), (1, 1, 1)), box_mesh("tet4", (1, 1, 1), (1, 1, 1))
    both = assemble(design(merged(hexes, tets)))
    parts = assemble(design(hexes)).K + assemble(design(tets)).K
    np.testing.assert_allclose(both.K.toarray(), parts.toarray(), atol=1e-12 * abs(parts).max())
    assert any("tet4" in caution for caution in both.cautions)


def test_cancelling_stops_between_chunks():
    with pytest.raises(Cancelled):
        assemble(design(box_mesh("hex8", (1, 1, 1), (1, 1, 1))), Progress(stop=lambda: True))
