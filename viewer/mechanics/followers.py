"""Degrees of freedom that follow others, by elimination: rigid links and ties between meshes that share no nodes.

Every follower is written as a sum over leaders, u = F q with q the independent degrees of freedom; the matrices are
reduced to Fᵀ K F and Fᵀ M F. No penalty enters, links hold no energy, and the energies of cells keep being formed
from the full vectors. A follower may lead others; a circle is an error.

Ties interpolate with the shape functions of the face: u = Σ Nᵢ uᵢ + ω × gap, where ω is the face's small rotation,
the mean of its nodes' rotations on shells and (I − ½ n nᵀ) Σ aᵅ × ∂u/∂ξᵅ on solids (aᵅ the dual base of the face's
tangents, n its normal): exact for every rigid motion whatever the gap, and for linear fields without a gap.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
import scipy.sparse as sp

from viewer.cells import KINDS, Places, nearest, outer_faces
from viewer.errors import ModelError
from viewer.mechanics.constraints import some_ids
from viewer.mechanics.patch import RigidPatch, cross_matrix
from viewer.model.arrays import Array
from viewer.model.design import DIRECTIONS, Design, Link, Tie

REACH = 0.5  # of the face's longest edge: how far a tied node may lie off when the tie does not say


@dataclass(eq=False)
class Rules:
    """Follower rules under way: triples (degree of freedom, leader, weight) and who owns each follower.

    ``statements`` tell what every link and tie joins, ``cautions`` what it cannot.
    """

    dof: Array
    owner: dict[int, str] = field(default_factory=dict)
    rows: list[Array] = field(default_factory=list)
    columns: list[Array] = field(default_factory=list)
    values: list[Array] = field(default_factory=list)
    statements: list[str] = field(default_factory=list)
    cautions: list[str] = field(default_factory=list)

    def claim(self, dofs: Array, what: str, design: Design) -> None:
        for number in dofs[dofs >= 0].tolist():
            if number in self.owner:
                node = int(np.nonzero((self.dof == number).any(axis=1))[0][0])
                raise ModelError(
                    f"design '{design.name}': node {design.mesh.node_ids[node]} follows twice",
                    found=f"{self.owner[number]} and {what}",
                    do="leave it out of one of them",
                )
            self.owner[number] = what

    def add(self, rows: Array, columns: Array, values: Array) -> None:
        """Followers ``rows`` (k, 3) of ``columns`` (k, m) by ``values`` (k, 3, m); −1 and zeros are left out."""
        rows, columns = np.broadcast_arrays(rows[:, :, None], columns[:, None, :])
        kept = (rows >= 0) & (values != 0)
        if (columns[kept] < 0).any():
            raise AssertionError("a leader lacks a degree of freedom")
        self.rows.append(rows[kept])
        self.columns.append(columns[kept])
        self.values.append(values[kept])


def link_nodes(link: Link, design: Design) -> tuple[int, Array]:
    """Node rows of the leader and of the followers."""
    what = f"link '{link.name}'"
    leader, others = link.first.rows(design.mesh, f"{what}, from"), link.second.rows(design.mesh, f"{what}, to")
    if len(leader) > 1:
        leader, others = others, leader
    if len(leader) != 1:
        raise ModelError(
            f"{what} needs one node that leads",
            found=f"{len(others)} and {len(leader)} nodes at its ends",
            do="select a single node at one end (near, or one id), and the nodes that follow at the other",
        )
    followers = np.setdiff1d(others, leader)
    if len(followers) == 0:
        raise ModelError(f"{what} has no node that follows", do="select other nodes at one of its ends")
    return int(leader[0]), followers


def add_link(rules: Rules, link: Link, design: Design) -> None:
    """Followers move with the leader as one rigid body, u = u₀ + θ₀ × arm and θ = θ₀."""
    leader, followers = link_nodes(link, design)
    what, dof = f"link '{link.name}'", rules.dof
    moved, turned = dof[followers, :3], dof[followers, 3:]
    rules.claim(dof[followers], what, design)
    arms = design.mesh.points[followers] - design.mesh.points[leader]
    weights = np.concatenate([np.broadcast_to(np.eye(3), (len(arms), 3, 3)), -cross_matrix(arms)], axis=2)
    rules.add(moved, np.broadcast_to(dof[leader], (len(arms), 6)), weights)
    rules.add(turned, np.broadcast_to(dof[leader, 3:], (len(arms), 3)), np.broadcast_to(np.eye(3), (len(arms), 3, 3)))
    rules.statements.append(f"{what}: {len(followers)} nodes follow node {design.mesh.node_ids[leader]} rigidly")


def hold_loose_spins(rules: Rules, design: Design, turning: Array) -> None:
    """A leader whose followers have no rotations and lie in a line with it could spin about that line without
    stiffness or mass: that spin is zero. ``turning`` (n_nodes,): rotations that cells or springs resist."""
    for link in design.physics.links:
        leader, followers = link_nodes(link, design)
        spin = rules.dof[leader, 3:]
        given = [rules.dof[node, 3] >= 0 and turning[node] for node in (leader, *followers)]
        if any(given) or any(int(number) in rules.owner for number in spin):
            continue
        patch = RigidPatch(design.mesh.points[np.append(followers, leader)])
        if patch.rank == 6:
            continue
        what = f"link '{link.name}'"
        loose = np.linalg.svd(patch.seen_axes)[0][:, patch.rank - 3 :] if patch.rank > 3 else np.eye(3)
        if patch.rank == 3:
            rules.claim(spin, what, design)
        else:
            axis = loose[:, 0]  # axis · θ = 0, solved for its largest component
            first = int(np.abs(axis).argmax())
            others = [i for i in range(3) if i != first]
            rules.claim(spin[[first]], what, design)
            rules.add(spin[None, [first]], spin[None, others], (-axis[others] / axis[first])[None, None])
        rules.cautions.append(
            f"{what}: its nodes lie in a line or in one place and have no rotations of their own, so that nothing "
            "resists its spin about them; that spin is held at zero"
        )


def add_tie(rules: Rules, tie: Tie, design: Design) -> None:
    """Nodes follow the nearest place of the surface."""
    mesh, what, dof = design.mesh, f"tie '{tie.name}'", rules.dof
    rows = tie.nodes.rows(mesh, f"{what}, nodes")
    loose = rows[dof[rows, 0] < 0]
    if len(loose):
        raise ModelError(
            f"{what} names nodes of no cell with a material",
            found=f"nodes {some_ids(mesh.node_ids[loose])}",
            do="select nodes of the structure",
        )
    faces = _faces(tie, rows, design, dof)
    points = mesh.points[rows]
    places = nearest(faces, mesh.points, points)
    _check_reach(tie, rows, places, faces, design)
    rules.claim(dof[rows], what, design)
    starts = np.cumsum([0, *(len(nodes) for _, nodes in faces)])
    for (kind, nodes), start in zip(faces, starts[:-1], strict=True):
        mine = np.nonzero((places.cell >= start) & (places.cell < start + len(nodes)))[0]
        if len(mine):
            _add_places(
                rules,
                mesh.points,
                kind,
                nodes[places.cell[mine] - start],
                places.xi[mine, :2],
                rows[mine],
                points[mine] - places.position[mine],
            )
    turning = int((dof[rows, 3] >= 0).sum())
    gap = float(places.distance.max()) if places.distance.max() > 1e-9 * mesh.diagonal else 0.0
    rules.statements.append(
        f"{what}: {len(rows)} nodes tied in translation{f', {turning} of them in rotation too' if turning else ''}; "
        f"largest gap {gap:.3g} m"
    )
    if turning and any(not (dof[nodes, 3] >= 0).all() for _, nodes in faces):
        rules.cautions.append(
            f"{what}: {turning} nodes turn with the face of the solid they lie on; how soft that joint is depends on "
            "the solid's mesh there, which should not be finer than the sheet or beam is thick"
        )


def _faces(tie: Tie, rows: Array, design: Design, dof: Array) -> list[tuple[str, Array]]:
    mesh = design.mesh
    chosen = np.zeros(mesh.n_nodes, bool)
    chosen[tie.surface.rows(mesh, f"tie '{tie.name}', to")] = True
    follows = np.zeros(mesh.n_nodes, bool)
    follows[rows] = True
    found = []
    for kind, nodes, _ in outer_faces([(block.kind, block.nodes) for block in mesh.blocks]):
        kept = chosen[nodes].all(axis=1) & ~follows[nodes].any(axis=1) & (dof[nodes, 0] >= 0).all(axis=1)
        if kept.any():
            found.append((kind, nodes[kept]))
    if not found:
        raise ModelError(
            f"tie '{tie.name}': its surface has no face",
            file=mesh.source or None,
            expected="outer faces of solids or shell cells, with all nodes selected in 'to' and none in 'nodes'",
        )
    return found


def _check_reach(tie: Tie, rows: Array, places: Places, faces: list[tuple[str, Array]], design: Design) -> None:
    points = design.mesh.points
    if tie.reach is None:
        longest = np.concatenate(
            [
                np.max(
                    [
                        np.linalg.norm(points[nodes[:, e[0]]] - points[nodes[:, e[1]]], axis=1)
                        for e in KINDS[kind].edges
                    ],
                    axis=0,
                )
                for kind, nodes in faces
            ]
        )
        allowed = REACH * longest[places.cell]
    else:
        allowed = np.full(len(rows), tie.reach)
    far = places.distance > allowed + 1e-9 * design.mesh.diagonal
    if far.any():
        worst = int(np.argmax(np.where(far, places.distance - allowed, -np.inf)))
        raise ModelError(
            f"tie '{tie.name}': {int(far.sum())} nodes lie too far from the surface",
            found=f"nodes {some_ids(design.mesh.node_ids[rows[far]])}; node {design.mesh.node_ids[rows[worst]]} is "
            f"{places.distance[worst]:.3g} m away",
            expected=f"at most {allowed[worst]:.3g} m",
            do="select only nodes on the surface, or raise 'reach'",
        )


def _add_places(rules: Rules, points: Array, kind: str, nodes: Array, xi: Array, rows: Array, gap: Array) -> None:
    """Rules of followers ``rows`` (k,) on faces ``nodes`` (k, n) at ``xi`` (k, 2), ``gap`` (k, 3) m off."""
    dof, (count, n) = rules.dof, nodes.shape
    values = KINDS[kind].shape(xi)  # (k, n)
    turned = dof[nodes, 3:]
    shell = (turned >= 0).all(axis=(1, 2))
    turn = np.zeros((count, 3, n, 6))  # ω from the nodes' freedoms
    turn[shell, :, :, 3:] = np.einsum("kn,ij->kinj", values[shell], np.eye(3))
    turn[~shell, :, :, :3] = _surface_rotation(kind, points[nodes[~shell]], xi[~shell])
    move = np.zeros_like(turn)
    move[..., :3] = np.einsum("kn,ij->kinj", values, np.eye(3))
    move += np.einsum("kij,kjnm->kinm", -cross_matrix(gap), turn)  # ω × gap
    leaders = dof[nodes].reshape(count, 6 * n)
    rules.add(dof[rows, :3], leaders, move.reshape(count, 3, 6 * n))
    rules.add(dof[rows, 3:], leaders, turn.reshape(count, 3, 6 * n))


def _surface_rotation(kind: str, xyz: Array, xi: Array) -> Array:
    """(k, 3, n, 3) small rotation of faces ``xyz`` (k, n, 3) at ``xi`` (k, 2) from their nodes' translations."""
    gradient = KINDS[kind].gradient(xi)  # (k, n, 2)
    tangents = np.einsum("kni,knd->kdi", xyz, gradient)
    dual = np.linalg.solve(np.einsum("kdi,kei->kde", tangents, tangents), tangents)
    normal = np.cross(tangents[:, 0], tangents[:, 1])
    normal /= np.maximum(np.linalg.norm(normal, axis=1, keepdims=True), 1e-300)
    slopes = np.einsum("knd,kdi->kni", gradient, dual)  # surface gradient of N
    half = np.eye(3) - 0.5 * normal[:, :, None] * normal[:, None, :]
    return np.einsum("kij,knjm->kinm", half, cross_matrix(slopes))


def follow_matrix(rules: Rules, design: Design, n_dof: int) -> tuple[sp.csr_array | None, Array]:
    """(n_dof, n_dof) matrix that gives every degree of freedom from the independent ones (their rows are unit rows,
    the columns of followers are empty), None without followers; and the mask (n_dof,) of the followers."""
    dependent = np.zeros(n_dof, bool)
    dependent[list(rules.owner)] = True
    if not dependent.any():
        return None, dependent
    independent = np.nonzero(~dependent)[0]
    step = sp.csr_array(
        (
            np.concatenate([*rules.values, np.ones(len(independent))]),
            (np.concatenate([*rules.rows, independent]), np.concatenate([*rules.columns, independent])),
        ),
        shape=(n_dof, n_dof),
    )
    follow = step
    for _ in range(len(rules.statements) + 1):
        open_ends = sp.csr_array(follow[:, dependent])
        if open_ends.nnz == 0:
            return follow, dependent
        follow = sp.csr_array(follow @ step)
        follow.eliminate_zeros()
    number = int(np.nonzero(np.diff(open_ends.indptr))[0][0])
    raise ModelError(
        f"design '{design.name}': links or ties follow each other in a circle",
        found=rules.owner[number],
        do="let one of them lead only",
    )


def check_supports(follow: sp.csr_array | None, dependent: Array, held: Array, rules: Rules, design: Design) -> None:
    """A support may hold a follower only where its leaders are held already."""
    both = np.nonzero(dependent & held)[0]
    if follow is None or not len(both):
        return
    weights = sp.csr_array(sp.csr_array(follow[both])[:, ~held])
    open_ends = both[np.asarray(abs(weights).max(axis=1).todense()).ravel() > 1e-9]
    if not len(open_ends):
        return
    node, direction = np.nonzero(rules.dof == open_ends[0])
    raise ModelError(
        f"design '{design.name}': a support holds {DIRECTIONS[direction[0]]} of node "
        f"{design.mesh.node_ids[node[0]]}, which follows others in {rules.owner[int(open_ends[0])]}",
        found=f"{len(open_ends)} such directions",
        do="hold the nodes that lead instead, or leave these nodes out",
    )
