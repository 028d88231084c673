"""Stiffness and mass brought down to few coordinates: degrees of freedom that are picked, or channels of a test.

Static (Guyan): the rest follows as the strain energy wants. Guyan R.J., Reduction of stiffness and mass matrices,
AIAA J. 3 (1965) 380. A channel of a test lies inside a cell and looks in any direction, so that no degree of freedom
is its own: q = S u, with S the shape functions at the point times the direction. The motion T q is then the one of
least strain energy with S u = q,

    T = G Sᵀ (S G Sᵀ)⁻¹  with G = K⁻¹,

which is Guyan's where S picks degrees of freedom (Irons B., Structural eigenvalue problems: elimination of unwanted
variables, AIAA J. 3 (1965) 961, for the flexibility form; from memory). A body that is free to move as a whole has no
K⁻¹: it is pinned at just as many degrees of freedom as it has free motions R, which carry no force, since
the forces μ of the channels are asked to balance:

    [ S G Sᵀ  S R ] [ μ ]   [ q ]
    [ (S R)ᵀ   0  ] [ a ] = [ 0 ],   u = G Sᵀ μ + R a.

SEREP: the rest follows as it does in given modes. O'Callahan J., Avitabile P., Riemer R., IMAC 7 (1989) 29.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import scipy.linalg as sl
import scipy.sparse as sp
from scipy.sparse.csgraph import connected_components

from viewer.errors import ModelError
from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import Layout, System, assemble
from viewer.mechanics.base_motion import rigid_vectors
from viewer.mechanics.factor import factorise
from viewer.mechanics.given_matrices import given_system
from viewer.mechanics.settle import rounding_of
from viewer.model.arrays import Array, frozen
from viewer.model.design import Design

# Share of a channel's motion, squared, that is not that of others, below which it counts as theirs: two channels at
# one place, or within about a fifth of a cell. What they differ by is noise, which would have to bend the cell.
_SAME = 0.05
_PART = 0.05  # least part of two channels in a combination without motion for them to belong together
_CROWDED = 1.0  # of the body's mass: what moves when such a channel alone moves, its neighbours held
_ROUNDING = 1e-12  # of the largest: what sums over the channels leave


@dataclass(frozen=True, eq=False)
class Reduction:
    """transform (n, m): all n degrees of freedom from the m kept; stiffness and mass (m, m) of those."""

    transform: Array
    stiffness: Array
    mass: Array


def guyan(stiffness: Array, mass: Array, masters: Sequence[int]) -> Reduction:
    """Static condensation of dense or sparse (n, n) matrices onto the degrees of freedom ``masters``.

    Raises ``SolveError`` when the rest can move while they are held.
    """
    kept = np.asarray(masters, np.int64)
    rest = np.setdiff1d(np.arange(stiffness.shape[0]), kept)
    transform = np.zeros((stiffness.shape[0], len(kept)))
    transform[kept, np.arange(len(kept))] = 1
    if len(rest):
        matrix = sp.csr_array(stiffness)
        inner, coupling = sp.csr_array(matrix[rest][:, rest]), matrix[rest][:, kept].toarray()
        inner.sort_indices()
        transform[rest] = -factorise(inner, definite=True).solve(coupling).reshape(coupling.shape)
    return _onto(stiffness, mass, transform)


def serep(stiffness: Array, mass: Array, shapes: Array, masters: Sequence[int]) -> Reduction:
    """Matrices on ``masters`` that keep the modes ``shapes`` (k, n) and their frequencies exactly, as long as there
    are no fewer masters than modes and they tell the modes apart; of rank k."""
    modes = np.asarray(shapes, float).T
    return _onto(stiffness, mass, modes @ np.linalg.pinv(modes[np.asarray(masters, np.int64)]))


def _onto(stiffness: Array, mass: Array, transform: Array) -> Reduction:
    small = (transform.T @ (matrix @ transform) for matrix in (stiffness, mass))
    return Reduction(transform, *(0.5 * (m + m.T) for m in small))


@dataclass(frozen=True, eq=False)
class ChannelMass:
    """A design brought down to c channels.

    mass, stiffness  (c, c) kg, N/m; of rank ``rank``
    rank        how many independent motions the channels see
    still       (c,) bool: the channel cannot move in the model (its point is held)
    repeated    groups of channels that see one motion between them: two at one place in one direction, or more
                channels at a point than directions. Of values that contradict one another the mean counts
    crowded     (c,) bool: channels so near others that moving one alone by 1 m at 1 rad/s takes more kinetic energy
                than moving the whole body so: errors of measurement there count many times over
    unseen      number of motions of the whole body without strain that no channel sees: they stay at rest
    statements  the same in words
    """

    mass: Array
    stiffness: Array
    rank: int
    still: Array
    crowded: Array
    repeated: tuple[tuple[int, ...], ...] = ()
    unseen: int = 0

    def __post_init__(self) -> None:
        for name in ("mass", "stiffness", "still", "crowded"):
            object.__setattr__(self, name, frozen(getattr(self, name)))

    @property
    def statements(self) -> tuple[str, ...]:
        out = []
        if self.still.any():
            out.append(f"{int(self.still.sum())} channels sit where the model is held and count for nothing")
        if self.repeated:
            out.append(
                f"{sum(len(group) for group in self.repeated)} channels repeat what others see; of channels that see "
                "one motion the mean counts"
            )
        if self.crowded.any():
            out.append(
                f"{int(self.crowded.sum())} channels sit so near others that small errors of measurement there count "
                "many times in products through the reduced mass"
            )
        if self.unseen:
            out.append(f"{self.unseen} motions of the whole body are seen by no channel and stay out of the mass")
        return tuple(out)


def reduce_to_channels(
    model: Design | System, sensing: sp.csr_array, progress: Progress = SILENT, *, solver: str = ""
) -> ChannelMass:
    """Mass and stiffness on the channels of a test, from ``sensing`` (c, 3 · n_nodes): the nodes' translations, node
    by node, to motion along the channels.

    Rotations of sheets and beams, supports, links and ties are taken along. Raises ``ModelError`` as ``assemble``
    does or when no channel moves, ``SolveError`` when parts hang together by nothing.
    """
    system = model if isinstance(model, System) else _system(model, progress)
    stiffness, mass = system.restrict(system.K), system.restrict(system.M)
    looks, still = _on_free(system, sensing)
    progress.tick("reducing to channels", 0, 3)
    motions = _strainless(system, stiffness)
    held = _pinned(stiffness, motions)
    held.sort_indices()
    factor = factorise(held, definite=True, solver=solver)
    progress.tick("reducing to channels", 1, 3)
    seen, repeated = _independent(looks, still)
    few = seen.T @ looks  # (r, n_free) the motions that the channels tell apart
    answer = factor.solve(np.ascontiguousarray(few.T)).reshape(few.T.shape)
    progress.tick("reducing to channels", 2, 3)
    transform, unseen = _least_strain(few, answer, motions, mass)
    small = _onto(stiffness, mass, transform)
    by_channel = seen @ small.mass @ seen.T
    crowded = by_channel.diagonal() > _CROWDED * _whole_mass(system)
    return ChannelMass(by_channel, seen @ small.stiffness @ seen.T, seen.shape[1], still, crowded, repeated, unseen)


def _system(design: Design, progress: Progress) -> System:
    return assemble(design, progress) if design.physics.matrices is None else given_system(design)


def _on_free(layout: Layout, sensing: sp.csr_array) -> tuple[Array, Array]:
    """(c, n_free) what the channels see of the free degrees of freedom, and which (c,) cannot move at all."""
    if sensing.shape[1] != 3 * layout.design.mesh.n_nodes:
        raise ModelError(
            f"design '{layout.design.name}': the channels belong to another mesh",
            found=f"{sensing.shape[1]} columns",
            expected=f"{3 * layout.design.mesh.n_nodes}",
        )
    numbers = layout.dof[:, :3].ravel()
    there = np.nonzero(numbers >= 0)[0]
    full = np.zeros((sensing.shape[0], layout.n_dof))
    full[:, numbers[there]] = sp.csr_array(sensing)[:, there].toarray()
    looks = layout.force(full)
    size, whole = np.linalg.norm(looks, axis=1), np.linalg.norm(full, axis=1)
    still = size <= _ROUNDING * np.maximum(whole, 1.0)
    if still.all():
        raise ModelError(f"design '{layout.design.name}': no channel sits where the model can move")
    looks[still] = 0
    return looks, still


def _strainless(system: System, stiffness: sp.csr_array) -> Array:
    """(n_free, r) rigid motions that the supports leave free, orthonormal. r = 0 for a held body."""
    motions = rigid_vectors(system, system.points.mean(axis=0))[:, system.free].T
    size = np.linalg.norm(motions, axis=0)
    basis = sl.orth(motions[:, size > 0] / size[size > 0]) if (size > 0).any() else motions[:, :0]
    if not basis.shape[1]:
        return basis
    strain, turn = np.linalg.eigh(basis.T @ (stiffness @ basis))
    basis = basis @ turn
    return basis[:, strain <= rounding_of(stiffness, basis)]


def _whole_mass(system: System) -> float:
    """kg, of the body moving along an axis; the largest where masses differ by axis."""
    pushed = rigid_vectors(system, system.points.mean(axis=0))[:3]
    return float(np.einsum("ai,ia->a", pushed, system.M @ pushed.T).max())


def _pinned(stiffness: sp.csr_array, motions: Array) -> sp.csr_array:
    """The stiffness with as many springs to ground as there are motions without strain, at degrees of freedom far
    apart: just enough to hold the body, so that loads in balance leave them without force."""
    if not motions.shape[1]:
        return stiffness
    _, _, order = sl.qr(motions.T, mode="economic", pivoting=True)
    where = order[: motions.shape[1]]
    spring = np.zeros(stiffness.shape[0])
    spring[where] = stiffness.diagonal()[where]
    return sp.csr_array(stiffness + sp.diags_array(spring))


def _independent(looks: Array, still: Array) -> tuple[Array, tuple[tuple[int, ...], ...]]:
    """(c, r) combinations of the channels that are independent, and groups of channels that are not."""
    size = np.linalg.norm(looks, axis=1)
    scale = 1 / np.where(size > 0, size, 1)
    unit = looks * scale[:, None]
    overlap = unit @ unit.T
    strength, axes = np.linalg.eigh(overlap)
    kept = strength > _SAME
    # channels belong together that take part in the same combinations without motion of their own
    together = np.abs(axes[:, ~kept] @ axes[:, ~kept].T) > _PART
    together[still] = together[:, still] = False
    count, label = connected_components(together, directed=False)
    groups = (np.nonzero(label == g)[0].tolist() for g in range(count))
    return axes[:, kept] * scale[:, None], tuple(tuple(g) for g in groups if len(g) > 1)


def _least_strain(looks: Array, answer: Array, motions: Array, mass: sp.csr_array) -> tuple[Array, int]:
    """(n_free, r) the motion of least strain for unit values of the r channels ``looks`` (r, n_free), and how many of
    the motions without strain they do not see. ``answer`` is G Sᵀ."""
    count = len(looks)
    compliance = looks @ answer
    compliance = 0.5 * (compliance + compliance.T)
    rigid, unseen = motions, 0
    if motions.shape[1]:
        _, strength, right = np.linalg.svd(looks @ motions, full_matrices=True)
        shown = np.zeros(motions.shape[1], bool)
        shown[: len(strength)] = strength > 1e-9 * max(strength.max(initial=0.0), 1e-300)
        rigid, unseen = motions @ right[shown].T, int((~shown).sum())
    scale = 1 / np.sqrt(compliance.diagonal())
    seen = scale[:, None] * (looks @ rigid)
    # forces that balance: the null space of what the channels see of the free motions
    free = sl.null_space(seen.T) if rigid.shape[1] else np.eye(count)
    inner = free.T @ (scale[:, None] * compliance * scale) @ free
    strength, axes = np.linalg.eigh(inner)
    usable = strength > _ROUNDING * strength[-1] if len(strength) else np.zeros(0, bool)
    forces = free @ (axes[:, usable] / strength[usable]) @ axes[:, usable].T @ free.T * scale  # (r, r)
    elastic = answer @ (scale[:, None] * forces)
    transform = elastic
    if rigid.shape[1]:
        transform = elastic + rigid @ np.linalg.pinv(seen) @ (scale[:, None] * (np.eye(count) - looks @ elastic))
    if unseen:
        loose = motions @ right[~shown].T  # at rest: no part of them that has momentum
        pull = mass @ loose
        transform = transform - loose @ np.linalg.solve(loose.T @ pull, pull.T @ transform)
    return transform, unseen
