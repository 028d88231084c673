"""Rigid links and ties: rigid motions, patches, energies, statics, and what is said when they cannot be."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.sparse.linalg as spla

from tests.mechanics.models import CLAMP, STEEL, design
from tests.meshes import box_mesh, plate_mesh
from viewer.errors import ModelError
from viewer.mechanics.assembly import assemble, lay_out
from viewer.mechanics.eigen import solve
from viewer.mechanics.energy import energies
from viewer.mechanics.patch import rigid_fields
from viewer.mechanics.recovery import examine
from viewer.model.design import (
    Assignment,
    Design,
    Link,
    LumpedMass,
    Material,
    Physics,
    Selector,
    Support,
    Tie,
)
from viewer.model.mesh import CellBlock, Mesh
from viewer.model.modes import ArrayShapes


def rigid_vectors(system) -> np.ndarray:
    """(6, n_dof) rigid motions, rotations included."""
    fields = rigid_fields(system.points, np.zeros(3))
    turned = np.zeros_like(fields)
    turned[:, :, 3:] = np.eye(3)
    return system.gather(np.moveaxis(fields, 2, 0), np.moveaxis(turned, 2, 0))


def joined(*meshes: Mesh) -> Mesh:
    """Meshes side by side, no node shared; node groups keep their names with the mesh's number in front, "0x1", and
    the group "0" holds all nodes of the first."""
    points, blocks, groups, at, cells = [], [], {}, 0, 0
    for number, mesh in enumerate(meshes):
        points.append(mesh.points)
        for block in mesh.blocks:
            blocks.append(CellBlock(block.kind, block.nodes + at, np.arange(cells, cells + len(block)) + 1))
            cells += len(block)
        groups |= {f"{number}{name}": rows + at for name, rows in mesh.node_groups.items()}
        groups[f"{number}"] = at + np.arange(mesh.n_nodes)
        at += mesh.n_nodes
    return Mesh(np.concatenate(points), tuple(blocks), np.arange(1, at + 1), node_groups=groups)


def moved(mesh: Mesh, by) -> Mesh:
    return mesh.with_(points=mesh.points + np.asarray(by, float))


def follows_rigid_motions(system) -> None:
    """Every rigid motion obeys the rules and is free of forces."""
    rigid = rigid_vectors(system)
    np.testing.assert_allclose(system.extend(rigid[:, system.free]), rigid, atol=1e-9 * np.abs(rigid).max())
    reduced = system.restrict(system.K)
    assert np.abs(reduced @ rigid[:, system.free].T).max() <= 1e-9 * abs(reduced).max() * np.abs(rigid).max()


# ---------------------------------------------------------------- links

BAR = box_mesh("hex8", (6, 2, 2), (1.0, 0.2, 0.1), 0.2)


def with_reference_node(mesh: Mesh, at) -> Mesh:
    points = np.vstack([mesh.points, at])
    return mesh.with_(points=points, node_ids=np.append(mesh.node_ids, 9999))


CAPPED = with_reference_node(BAR, [1.3, 0.1, 0.05])
CAP = Link("cap", Selector(nodes=[9999]), Selector(group="x1"))


def test_linked_body_moves_rigidly_and_keeps_its_mass():
    system = assemble(design(CAPPED, links=(CAP,)))
    follows_rigid_motions(system)
    rigid = rigid_vectors(system)
    assert rigid[0] @ system.M @ rigid[0] == pytest.approx(8000 * 0.02)
    reduced = system.restrict(system.M)
    free = rigid[:, system.free]
    np.testing.assert_allclose(free @ reduced @ free.T, rigid @ system.M @ rigid.T, rtol=1e-9, atol=1e-6)
    found = solve(design(CAPPED, links=(CAP,)), 8)
    assert (found.freq_hz[:6] == 0).all()
    assert found.freq_hz[6] > 0
    end = found.shapes.moved[6][np.append(BAR.node_groups["x1"], len(BAR.points))]
    arms = CAPPED.points[BAR.node_groups["x1"]] - CAPPED.points[-1]
    turn = found.shapes.turned[6][-1]
    np.testing.assert_allclose(end[:-1], end[-1] + np.cross(turn, arms), atol=1e-9)
    assert system.statements == ("link 'cap': 9 nodes follow node 9999 rigidly",)


def test_energies_of_linked_modes_add_up():
    model = design(
        CAPPED,
        links=(CAP,),
        supports=(CLAMP,),
        masses=(LumpedMass("camera", Selector(nodes=[9999]), 3.0, None, np.diag([0.1, 0.2, 0.3])),),
    )
    modes, system = solve(model, 5), assemble(model)
    found = energies(model, modes)
    shapes = system.gather(modes.shapes.moved, modes.shapes.turned)
    strain = 0.5 * np.einsum("kn,nk->k", shapes, system.K @ shapes.T)
    np.testing.assert_allclose(found.strain.sum(axis=1), strain, rtol=1e-10)
    np.testing.assert_allclose(found.total_strain, found.total_kinetic, rtol=1e-8)
    assert (found.mass_share(0) > 0) and found.trusted.all()
    # as imported shapes, and without rotations: the leader's are read off its followers
    again = energies(model, modes.with_(origin="imported"))
    np.testing.assert_allclose(again.residual, 0, atol=1e-10)
    stripped = modes.with_(shapes=ArrayShapes(modes.shapes.moved), origin="imported")
    bare = energies(model, stripped)
    np.testing.assert_allclose(bare.masses, found.masses, rtol=1e-6)
    assert bare.trusted.all()


def test_link_equals_a_stiff_plate():
    """The rigid end against one of a material a million times as stiff, both weightless: E ratio² is out of reach."""
    ends = box_mesh("hex8", (1, 2, 2), (0.01, 0.2, 0.1))
    block = moved(ends, [1.0, 0, 0])
    whole = joined(BAR.with_(points=box_mesh("hex8", (6, 2, 2), (1.0, 0.2, 0.1)).points), block)
    # weld the stiff plate on by common nodes
    nodes = whole.blocks[1].nodes.copy()
    for a in whole.node_groups["1x0"]:
        nodes[nodes == a] = whole.node_groups["0x1"][
            np.linalg.norm(whole.points[whole.node_groups["0x1"]] - whole.points[a], axis=1).argmin()
        ]
    stiff = Material("stiff", 200e15, 0.3, 1e-6)
    mesh = whole.with_(
        blocks=(whole.blocks[0], CellBlock("hex8", nodes, whole.blocks[1].ids)),
        cell_groups={"bar": np.arange(24), "plate": np.arange(24, 28)},
    )
    root = Support("root", Selector(group="0x0"))
    plated = Design(
        "plated",
        mesh,
        Physics(
            {"steel": STEEL, "stiff": stiff}, (Assignment("bar", "steel"), Assignment("plate", "stiff")), (root,)
        ),
    )
    bar = with_reference_node(mesh.with_(blocks=mesh.blocks[:1], cell_groups={}), [1.0, 0.1, 0.05])
    linked = Design(
        "linked",
        bar,
        Physics(
            {"steel": STEEL},
            (Assignment("*", "steel"),),
            (root,),
            links=(Link("end", Selector(nodes=[9999]), Selector(group="0x1")),),
        ),
    )
    np.testing.assert_allclose(solve(linked, 6).freq_hz, solve(plated, 6).freq_hz, rtol=1e-5)


def test_chained_links_pass_through():
    """A follower may lead: the same end moved by one link or through a node in between."""
    mesh = with_reference_node(CAPPED, [2.0, 0.3, 0.0])
    mesh = mesh.with_(node_ids=np.append(mesh.node_ids[:-1], 9998))
    body = (LumpedMass("far", Selector(nodes=[9998]), 2.0, None, np.eye(3)),)
    through = design(
        mesh, supports=(CLAMP,), masses=body, links=(CAP, Link("arm", Selector(nodes=[9999]), Selector(nodes=[9998])))
    )
    turned = design(
        mesh, supports=(CLAMP,), masses=body, links=(Link("arm", Selector(nodes=[9998]), Selector(nodes=[9999])), CAP)
    )
    np.testing.assert_allclose(solve(through, 5).freq_hz, solve(turned, 5).freq_hz, rtol=1e-9)


def test_shell_nodes_take_the_leaders_rotation():
    mesh = plate_mesh("quad4", (4, 2), (1.0, 0.5))
    link = Link("bar", Selector(near=[1, 0.25, 0]), Selector(group="x1"))
    model = design(mesh, thickness=0.01, links=(link,), supports=(CLAMP,))
    modes = solve(model, 3)
    turned = modes.shapes.turned[:, mesh.node_groups["x1"]]
    np.testing.assert_allclose(turned, np.broadcast_to(turned[:, :1], turned.shape), atol=1e-12)
    found = examine(lay_out(model), modes.shapes.moved)
    whole = assemble(model).gather(modes.shapes.moved, modes.shapes.turned)
    np.testing.assert_allclose(found.vectors, whole, atol=5e-3 * np.abs(whole).max())


def test_a_rigid_bar_between_two_solid_nodes_has_no_loose_spin():
    """A link along a skew line between nodes without rotations: no spurious motion, and the spin is named."""
    link = Link("bar", Selector(nodes=[1]), Selector(near=[1.0, 0.2, 0.1]))
    model = design(BAR, links=(link,))
    system = assemble(model)
    assert any("'bar'" in text and "spin" in text for text in system.cautions)
    found = solve(model, 9)
    assert (found.freq_hz[:6] == 0).all()
    assert found.freq_hz[6] > 100
    np.testing.assert_allclose(energies(model, found).closure[6:], 1, atol=1e-8)
    there = solve(design(BAR), 9).freq_hz
    assert (found.freq_hz[6:] >= there[6:] * (1 - 1e-9)).all()  # a constraint never lowers a frequency


# ---------------------------------------------------------------- ties

LOWER = box_mesh("hex8", (3, 2, 2), (1.0, 0.6, 0.4))
TIED = {
    "hex8 on hex8": moved(box_mesh("hex8", (4, 3, 2), (1.0, 0.6, 0.3)), [0, 0, 0.4]),
    "tet10 on hex8": moved(box_mesh("tet10", (2, 2, 1), (1.0, 0.6, 0.3)), [0, 0, 0.4]),
    "wedge15 on hex8": moved(box_mesh("wedge15", (2, 1, 1), (1.0, 0.6, 0.3)), [0, 0, 0.4]),
}
SEAM = Tie("seam", Selector(group="1z0"), Selector(group="0"))


@pytest.mark.parametrize("name", TIED)
@pytest.mark.parametrize("gap", [0.0, 0.02])
def test_tied_meshes_move_rigidly(name, gap):
    system = assemble(design(joined(LOWER, moved(TIED[name], [0, 0, gap])), ties=(SEAM,)))
    follows_rigid_motions(system)
    assert f"largest gap {gap:.3g} m" in system.statements[0]
    found = solve(design(joined(LOWER, moved(TIED[name], [0, 0, gap])), ties=(SEAM,)), 8).freq_hz
    assert (found[:6] == 0).all()
    assert found[6] > 100


PATCH_ERROR = 0.04  # of the largest displacement; measured 0.033 on these two or three cells a side


@pytest.mark.parametrize("name", TIED)
def test_patch_through_a_tie(name):
    """A linear field held at the outer boundary of both bodies comes back at all inner and tied nodes."""
    mesh = joined(LOWER, TIED[name])
    system = assemble(design(mesh, ties=(SEAM,)))
    field = 1e-3 * mesh.points @ np.array([[1.0, 0.2, 0], [0.3, -0.5, 0.1], [0.2, 0.1, 0.7]])
    vector = system.gather(field)
    x, y, z = mesh.points.T
    outer = (
        np.isclose(x, 0)
        | np.isclose(x, 1)
        | np.isclose(y, 0)
        | np.isclose(y, 0.6)
        | np.isclose(z, 0)
        | np.isclose(z, 0.7)
    )
    known = np.isin(system.free, system.dof[outer, :3])
    stiffness = system.restrict(system.K)
    found = vector[system.free].copy()
    right = -(stiffness[~known][:, known] @ found[known])
    found[~known] = spla.spsolve(stiffness[~known][:, ~known].tocsc(), right)
    # Placed by points, a tie passes linear fields on exactly, yet it hands on the tractions of unequal faces to the
    # nearest nodes only: the patch test of displacements holds, that of forces fails by a bounded amount.
    np.testing.assert_allclose(system.extend(vector[None, system.free])[0], vector, atol=1e-15)
    np.testing.assert_allclose(system.extend(found[None])[0], vector, atol=PATCH_ERROR * np.abs(vector).max())


def test_tied_cantilever_against_the_whole_one():
    """Two layers of unequal mesh tied along the middle against one body of quadratic hexahedra: 1.3 % off on 12 ×
    4 × 2 and 16 × 6 × 2 cells (twisting mode), of which 0.6 % belong to the cells (tied like to like)."""
    whole = solve(design(box_mesh("hex20", (8, 2, 2), (1.0, 0.2, 0.1)), supports=(CLAMP,)), 4).freq_hz
    errors = []
    for n in (1, 2):
        lower = box_mesh("hex8", (6 * n, 2 * n, n), (1.0, 0.2, 0.05))
        upper = moved(box_mesh("hex8", (8 * n, 3 * n, n), (1.0, 0.2, 0.05)), [0, 0, 0.05])
        mesh = joined(upper, lower)
        roots = Selector(nodes=mesh.node_ids[np.isclose(mesh.points[:, 0], 0)])
        model = design(
            mesh, supports=(Support("root", roots),), ties=(Tie("seam", Selector(group="0z0"), Selector(group="1")),)
        )
        errors.append(np.abs(solve(model, 4).freq_hz / whole - 1).max())
    assert errors[1] < 0.015
    assert errors[1] < 0.5 * errors[0]


def test_a_tie_of_like_meshes_is_a_weld():
    parts = box_mesh("hex8", (4, 2, 1), (1.0, 0.2, 0.05)), box_mesh("hex8", (4, 2, 1), (1.0, 0.2, 0.05))
    whole = box_mesh("hex8", (4, 2, 2), (1.0, 0.2, 0.1))
    mesh = joined(parts[0], moved(parts[1], [0, 0, 0.05]))
    roots = Selector(nodes=mesh.node_ids[np.isclose(mesh.points[:, 0], 0)])
    seam = Tie("s", Selector(group="1z0"), Selector(group="0"))
    model = design(mesh, supports=(Support("root", roots),), ties=(seam,))
    np.testing.assert_allclose(solve(model, 5).freq_hz, solve(design(whole, supports=(CLAMP,)), 5).freq_hz, rtol=1e-8)


def test_shell_tied_to_a_solid_turns_with_it():
    """A sheet standing on a block: its lower edge is tied in translation and rotation, so that it bends as from a
    clamp; untied rotations would let it swing free."""
    block = box_mesh("hex8", (4, 4, 2), (0.4, 0.4, 0.2))
    flat = plate_mesh("quad4", (5, 8), (0.3, 0.4))
    sheet = flat.with_(
        points=np.column_stack([flat.points[:, 0] + 0.05, np.full(flat.n_nodes, 0.21), flat.points[:, 1] + 0.2])
    )
    mesh = joined(block, sheet)
    tied = design(
        mesh,
        thickness=0.004,
        ties=(Tie("foot", Selector(group="1y0"), Selector(group="0")),),
        supports=(Support("base", Selector(group="0z0")),),
    )
    system = assemble(tied)
    assert "6 of them in rotation too" in system.statements[0]
    assert any("foot" in text and "soft" in text for text in system.cautions)
    clamped = design(sheet, thickness=0.004, supports=(Support("foot", Selector(group="y0")),))
    np.testing.assert_allclose(solve(tied, 3).freq_hz, solve(clamped, 3).freq_hz, rtol=0.01)
    free = design(mesh, thickness=0.004, ties=tied.physics.ties)
    follows_rigid_motions(assemble(free))


@pytest.mark.parametrize(("first", "second"), [("quad4", "quad4"), ("quad4", "tri3"), ("quad8", "quad4")])
def test_sheets_tied_edge_to_edge(first, second):
    """Two halves of a cantilever sheet, unlike meshes, tied in translation and rotation along the common edge: the
    frequencies of the whole sheet within 1.5 %."""
    left = plate_mesh(first, (6, 5), (0.5, 0.4))
    right = moved(plate_mesh(second, (8, 8), (0.5, 0.4)), [0.5, 0, 0])
    mesh = joined(left, right)
    tie = Tie("edge", Selector(group="1x0"), Selector(group="0"))
    model = design(mesh, thickness=0.005, ties=(tie,), supports=(Support("root", Selector(group="0x0")),))
    assert "9 of them in rotation too" in lay_out(model).statements[0]
    assert lay_out(model).cautions == ()
    whole = design(plate_mesh("quad4", (24, 12), (1.0, 0.4)), thickness=0.005, supports=(CLAMP,))
    np.testing.assert_allclose(solve(model, 4).freq_hz, solve(whole, 4).freq_hz, rtol=0.015)
    follows_rigid_motions(assemble(design(mesh, thickness=0.005, ties=(tie,))))


def test_nodes_tied_off_a_shell_follow_its_rotation():
    plate = plate_mesh("quad4", (4, 4), (1.0, 1.0))
    point = with_reference_node(plate, [0.45, 0.55, 0.05])
    mesh = point.with_(node_groups={**point.node_groups, "all": np.arange(plate.n_nodes)})
    link = Link("arm", Selector(nodes=[9999]), Selector(nodes=[9998]))
    mesh = with_reference_node(mesh, [0.45, 0.55, 0.3]).with_(node_ids=np.append(mesh.node_ids, 9998))
    tie = Tie("stud", Selector(nodes=[9999]), Selector(group="all"))
    model = design(
        mesh, thickness=0.01, ties=(tie,), links=(link,), masses=(LumpedMass("weight", Selector(nodes=[9998]), 1.0),)
    )
    follows_rigid_motions(assemble(model))


# ---------------------------------------------------------------- what is said


def far_tie(reach=None):
    mesh = joined(LOWER, moved(TIED["hex8 on hex8"], [0, 0, 0.5]))
    return design(mesh, ties=(Tie("seam", Selector(group="1z0"), Selector(group="0"), reach),))


FOOT = Selector(group="x1")


@pytest.mark.parametrize(
    ("model", "words"),
    [
        (lambda: design(CAPPED, links=(Link("cap", FOOT, FOOT),)), ["'cap'", "one node that leads", "9 and 9 nodes"]),
        (
            lambda: design(CAPPED, links=(Link("cap", Selector(nodes=[9999]), Selector(nodes=[9999])),)),
            ["no node that"],
        ),
        (
            lambda: design(CAPPED, links=(CAP, Link("cup", Selector(nodes=[1]), FOOT))),
            ["follows twice", "'cap'", "'cup'"],
        ),
        (
            lambda: design(CAPPED, links=(CAP, Link("cup", Selector(near=[1, 0, 0]), Selector(nodes=[9999])))),
            ["circle", "'c"],
        ),
        (
            lambda: design(CAPPED, links=(CAP,), supports=(Support("tip", FOOT, ("uy",)),)),
            ["holds uy of node", "follows others in link 'cap'", "hold the nodes that lead"],
        ),
        (far_tie, ["'seam'", "20 nodes lie too far", "0.5 m away", "at most 0.167 m"]),
        (lambda: far_tie(0.4), ["at most 0.4 m"]),
        (
            lambda: design(
                joined(LOWER, TIED["hex8 on hex8"]),
                ties=(Tie("seam", Selector(group="1z0"), Selector(group="0x0y0")),),
            ),
            ["0x0y0"],
        ),
        (
            lambda: design(
                joined(LOWER, TIED["hex8 on hex8"]), ties=(Tie("s", Selector(group="1z0"), Selector(nodes=[1])),)
            ),
            ["'s'", "no face"],
        ),
        (lambda: design(CAPPED, ties=(Tie("s", Selector(nodes=[9999]), Selector(group="x1")),)), ["no cell", "9999"]),
    ],
)
def test_what_cannot_be_joined_is_said(model, words):
    with pytest.raises(ModelError) as caught:
        assemble(model())
    for word in words:
        assert word in str(caught.value)


def test_a_wide_reach_is_allowed():
    assert "largest gap 0.5 m" in lay_out(far_tie(0.6)).statements[0]


def test_supports_may_hold_both_sides_of_a_tie():
    mesh = joined(LOWER, TIED["hex8 on hex8"])
    sides = Selector(nodes=mesh.node_ids[np.isclose(mesh.points[:, 0], 0)])
    assert lay_out(design(mesh, ties=(SEAM,), supports=(Support("side", sides, ("ux",)),))).held.any()
