"""Rotations of shells and beams that a mode set leaves out.

Strain energy is minimised over the rotations with the translations held: K_rr r = −K_ru u (static condensation;
Guyan R.J., Reduction of stiffness and mass matrices, AIAA J. 3 (1965) 380).
That neglects rotary inertia, which is small in thin parts but not where a lumped mass rides on few nodes: with the
frequencies given, the rotations are brought into balance with inertia, (K − λM)_rr r = −(K − λM)_ru u, by steps with
K_rr alone. Where these do not settle (a rotation resonates below the mode) the rotations of least energy stay, and
the mode is named. The leader of a rigid link takes its rotation from the followers' translations as far as these
show it. What translations cannot show either has no stiffness in K_rr or no coupling to any translation (torsion of a
straight beam, spin of a point inertia): it stays zero and is named.

Bending of a thin sheet shows in small differences of translations of neighbouring nodes, so that a file of few
digits blurs its energies. How much is found by trial: the translations are disturbed at random within the rounding
that their own digits reveal, and the energies of the cells compared.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
import scipy.sparse as sp

from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import Layout, assemble_layout
from viewer.mechanics.constraints import some_ids
from viewer.mechanics.factor import factorise
from viewer.mechanics.followers import link_nodes
from viewer.mechanics.patch import RigidPatch
from viewer.mechanics.sums import cell_energies
from viewer.model.arrays import Array

ENERGY_BOUND = 0.02  # Σ|ΔU_e| / ΣU_e above which the digits of a file are said to be too few
_SOFT = 1e-12  # added to the diagonal, relative; taken off again by iterative refinement
_UNSEEN = 1e-6  # share of a random rotation that survives three filterings by _SOFT / (λ + _SOFT)
_STEPS, _SETTLED = 60, 1e-8  # of balancing with inertia: most steps, and relative change when settled
_UNITS = (1.0, 1e-3, 1e-2, 0.0254, 0.3048)  # metres per unit in which the file may have been written


class Rotations:
    """The rotations that go with given translations, for one stiffness matrix.

    stiffness (n_dof, n_dof) sparse; dof (n_nodes, 6) numbers of ux uy uz rx ry rz, −1 where absent;
    held (n_dof,) True where a support holds: held rotations are zero.
    shown: for nodes whose rotation follows from translations, (node row, node rows moved (k,), patch of these): the
    rotations the patch sees are taken from it.
    """

    def __init__(
        self,
        stiffness: Any,
        dof: Array,
        held: Array,
        progress: Progress = SILENT,
        shown: Sequence[tuple[int, Array, RigidPatch]] = (),
        mass: Any = None,
    ) -> None:
        self.dof, self.size, self.progress = np.asarray(dof), stiffness.shape[0], progress
        self.unsettled = np.empty(0, bool)
        numbers = self.dof[:, 3:]
        wanted = np.zeros(self.size, bool)
        wanted[numbers[numbers >= 0]] = True
        self.rows = np.nonzero(wanted & ~np.asarray(held))[0]
        self.shown = [item for item in shown if np.isin(self.dof[item[0], 3:], self.rows).all()]
        self.basis = self._unknowns()
        self.coupling = sp.csr_array(stiffness)[self.rows]
        self.inertia = None if mass is None else sp.csr_array(mass)[self.rows]
        inner = sp.csr_array(self.basis.T @ self.coupling[:, self.rows] @ self.basis)
        diagonal = inner.diagonal()
        self.scale = np.sqrt(np.where(diagonal > 0, diagonal, diagonal.max(initial=0.0) or 1.0))
        self.inner = inner
        if inner.shape[0]:
            progress.tick("factorising for rotations")
            weights = sp.diags_array(1 / self.scale)
            scaled = weights @ inner @ weights + _SOFT * sp.eye_array(inner.shape[0])
            self.factor = factorise(sp.csr_array(0.5 * (scaled + scaled.T)), definite=True)

    def _unknowns(self) -> sp.csr_array:
        """(rotations, unknowns): the unit matrix, but for the shown rotations only the axes their patch misses."""
        place = {int(row): at for at, row in enumerate(self.rows)}
        special = {place[int(self.dof[node, 3])]: patch for node, _, patch in self.shown}
        taken = np.zeros(len(self.rows), bool)
        pieces: list[tuple[Array, Array, Array]] = []
        columns = 0
        for at, patch in special.items():
            where = np.array([at, at + 1, at + 2])
            taken[where] = True
            missed = np.linalg.svd(patch.seen_axes)[0][:, patch.rank - 3 :]
            for axis in missed.T:
                pieces.append((where, np.full(3, columns), axis))
                columns += 1
        plain = np.nonzero(~taken)[0]
        pieces.append((plain, columns + np.arange(len(plain)), np.ones(len(plain))))
        rows, cols, values = (np.concatenate(part) for part in zip(*pieces, strict=True))
        return sp.csr_array((values, (rows, cols)), shape=(len(self.rows), columns + len(plain)))

    def complete(self, moved: Array, squares: Array | None = None) -> Array:
        """(k, n_dof) vectors from translations (k, n_nodes, 3), real or complex.

        squares  (k,) λ = ω² of the shapes, to balance the rotations with inertia; rows of ``unsettled`` are those
                 for which that did not work, where the least-energy rotations stand
        """
        moved = np.asarray(moved)
        if np.iscomplexobj(moved):
            real, doubtful = self.complete(moved.real, squares), self.unsettled
            imaginary = self.complete(moved.imag, squares)
            self.unsettled = doubtful | self.unsettled
            return real + 1j * imaginary
        there = self.dof[:, :3] >= 0
        vectors = np.zeros((len(moved), self.size))
        vectors[:, self.dof[:, :3][there]] = moved[:, there]
        for node, moving, patch in self.shown:
            about = patch.motion(moved[:, moving])
            vectors[:, self.dof[node, 3:]] = about[:, 3:]
        if not self.inner.shape[0]:
            return vectors
        right = -(self.basis.T @ (self.coupling @ vectors.T))
        turned = np.zeros_like(right)
        for _ in range(20):  # the softening on the diagonal leaves the answer with every step
            self.progress.tick("recovering rotations")
            step = self._solve(right - self.inner @ turned)
            turned += step
            if not (np.linalg.norm(step, axis=0) > 1e-10 * np.linalg.norm(turned, axis=0)).any():
                break
        plain = vectors.copy()
        plain[:, self.rows] += (self.basis @ turned).T
        if squares is None or self.inertia is None:
            return plain
        return self._balanced(vectors, plain, right, turned, np.asarray(squares))

    def _balanced(self, bare: Array, plain: Array, right: Array, turned: Array, squares: Array) -> Array:
        """``plain`` with rotations in balance with inertia; ``bare`` is the same without the recovered rotations."""
        assert self.inertia is not None
        vectors, last = plain.copy(), np.full(len(bare), np.inf)
        going = squares > 0
        for _ in range(_STEPS):
            self.progress.tick("balancing rotations with inertia")
            push = self.basis.T @ (self.inertia @ vectors[going].T) * squares[going]
            step = self._solve(right[:, going] + push - self.inner @ turned[:, going])
            turned[:, going] += step
            vectors[going] = bare[going]
            vectors[np.ix_(going, self.rows)] += (self.basis @ turned[:, going]).T
            size = np.linalg.norm(step, axis=0) / np.maximum(np.linalg.norm(turned[:, going], axis=0), 1e-300)
            rows = np.nonzero(going)[0]
            worse = size > 2 * last[rows]
            vectors[rows[worse]] = plain[rows[worse]]
            last[rows] = size
            going[rows[worse | (size < _SETTLED)]] = False
            if not going.any():
                break
        vectors[going & (last > 1e-3)] = plain[going & (last > 1e-3)]
        self.unsettled = last > 1e-3
        return vectors

    @cached_property
    def lost(self) -> Array:
        """Ascending rows of nodes with a rotation that no translation shows."""
        if not self.inner.shape[0]:
            return np.empty(0, np.int64)
        probe = np.random.default_rng(3).standard_normal((self.inner.shape[0], 4))
        for _ in range(3):
            probe = _SOFT * self.factor.solve(probe).reshape(probe.shape)
        unseen = self.rows[(abs(self.basis) @ np.abs(probe)).max(axis=1) > _UNSEEN]
        soft = np.isin(self.dof[:, 3:], unseen).any(axis=1)
        return np.nonzero(soft | self._deaf())[0]

    def _deaf(self) -> Array:
        """(n_nodes,) True where some free rotation never answers, whatever translations are given."""
        moved = np.random.default_rng(4).standard_normal((4, len(self.dof), 3))
        vectors = self.complete(moved)
        free = np.isin(self.dof[:, 3:], self.rows)
        found = np.zeros(len(self.dof), bool)
        nodes = np.nonzero(free.any(axis=1))[0]
        answers = np.where(free[nodes][..., None], np.moveaxis(vectors[:, self.dof[nodes, 3:]], 0, -1), 0.0)
        strength = np.linalg.svd(answers, compute_uv=False)  # (nodes, 3)
        count = free[nodes].sum(axis=1)
        least = np.take_along_axis(strength, count[:, None] - 1, axis=1)[:, 0]
        found[nodes] = least <= _UNSEEN * np.median(strength[:, 0])
        return found

    def _solve(self, right: Array) -> Array:
        scaled = np.ascontiguousarray(right / self.scale[:, None])
        return self.factor.solve(scaled).reshape(right.shape) / self.scale[:, None]


@dataclass(frozen=True, eq=False)
class Recovery:
    """Completed shapes and what is doubtful about them.

    vectors   (k, n_dof) translations as given with the rotations recovered
    lost      node rows with a rotation that translations do not show (left at zero)
    error     (k,) expected Σ|ΔU_e| / ΣU_e of the cells' strain energies by the rounding of the file
    cautions  sentences for the reader, none when all is well
    """

    vectors: Array
    lost: Array
    error: Array
    cautions: tuple[str, ...]


def recover(layout: Layout, moved: Array, progress: Progress = SILENT, squares: Array | None = None) -> Array:
    """(k, n_dof) vectors from translations (k, n_nodes, 3) alone: the rotations are those of least energy, or, with
    ``squares`` (k,) = ω², those in balance with inertia."""
    return _operator(layout, progress).complete(moved, squares)


def examine(layout: Layout, moved: Array, progress: Progress = SILENT, squares: Array | None = None) -> Recovery:
    """As :func:`recover`, with what cannot be recovered and what the digits of ``moved`` leave open."""
    operator = _operator(layout, progress)
    vectors = operator.complete(moved, squares)
    unsettled = operator.unsettled
    random = np.random.default_rng(5)
    blur = [rounding(part) * random.uniform(-1, 1, part.shape) for part in (moved.real, moved.imag)]
    disturbed = vectors + operator.complete(blur[0] + 1j * blur[1] if np.iscomplexobj(moved) else blur[0])
    given = cell_energies(layout, vectors, "stiffness", progress)
    changed = np.abs(cell_energies(layout, disturbed, "stiffness", progress) - given).sum(axis=1)
    with np.errstate(invalid="ignore", divide="ignore"):
        error = np.where(changed > 0, changed / given.sum(axis=1), 0.0)
    ids = layout.design.mesh.node_ids
    cautions = []
    if len(operator.lost):
        cautions.append(
            f"rotations of {len(operator.lost)} nodes ({some_ids(ids[operator.lost])}) cannot be recovered from "
            "translations and are taken as zero: torsion of straight beams and spin of point inertias do not show"
        )
    if unsettled.any():
        cautions.append(
            f"rotations of modes {some_ids(np.nonzero(unsettled)[0] + 1)} of those given are of least energy, "
            "without rotary inertia: a lumped one turns by itself near their frequency; write shapes with rotations"
        )
    blurred = np.nonzero(error > ENERGY_BOUND)[0]
    if len(blurred):
        cautions.append(
            f"the translations have too few digits for the strain energies of {len(blurred)} of {len(error)} modes "
            f"(expected error up to {100 * error.max():.2g} % of the total): write the shapes with rotations, or "
            "with more digits"
        )
    return Recovery(vectors, operator.lost, error, tuple(cautions))


def rounding(values: Array) -> Array:
    """Half a unit of the last digit of each of the ``values``, as far as they reveal it.

    Recognised, in metres or converted from mm, cm, in or ft: a fixed number of significant decimal digits, a fixed
    number of decimals, and single precision; otherwise double precision.
    """
    values = np.asarray(values, float)
    filled = values[values != 0]
    if not len(filled):
        return np.zeros_like(values)
    sample = filled if len(filled) <= 20_000 else np.random.default_rng(0).choice(filled, 20_000, replace=False)
    for unit in _UNITS:
        inside = sample / unit
        steps = [_significant(values / unit, inside), _decimals(values / unit, inside)]
        found = [step for step in steps if step is not None]
        if found:  # the coarser reading: 0.12 and 1.23 have two decimals, not three digits
            return unit * max(found, key=lambda step: float(np.log(step).mean()))
        with np.errstate(over="ignore"):
            short = np.abs(inside.astype(np.float32) - inside) <= 4 * np.finfo(float).eps * np.abs(inside)
        if short.all():
            return 0.5 * unit * np.spacing(np.abs(values / unit).astype(np.float32)).astype(float)
    return 0.5 * np.spacing(np.abs(values))


def _significant(values: Array, sample: Array) -> Array | None:
    """Half steps of numbers written with one number of significant digits, None when they were not."""
    power = 10.0 ** np.floor(np.log10(np.abs(sample)))
    for digits in range(1, 11):
        if _whole(sample / power * 10.0 ** (digits - 1), digits):
            size = np.where(values == 0, np.abs(sample).min(), np.abs(values))
            return 0.5 * 10.0 ** (np.floor(np.log10(size)) - digits + 1)
    return None


def _decimals(values: Array, sample: Array) -> Array | None:
    """Half steps of numbers written with one number of decimals, None when they were not."""
    peak = np.log10(np.abs(sample).max())
    for decimals in range(16):
        digits = int(np.ceil(peak)) + decimals
        if 0 < digits <= 11 and _whole(sample * 10.0**decimals, digits):
            return np.full_like(values, 0.5 * 10.0**-decimals)
    return None


def _whole(values: Array, digits: int) -> bool:
    """All whole numbers, to rounding of numbers of ``digits`` digits."""
    return bool((np.abs(values - np.rint(values)) <= 1e-15 * 10.0**digits + 4e-15 * np.abs(values)).all())


def _operator(layout: Layout, progress: Progress) -> Rotations:
    system = assemble_layout(layout, progress)
    if layout.follow is None:
        return Rotations(system.K, system.dof, system.held, progress, mass=system.M)
    shown = []
    for link in layout.design.physics.links:
        leader, followers = link_nodes(link, layout.design)
        moving = np.append(followers, leader)
        shown.append((leader, moving, RigidPatch(layout.points[moving], layout.points[leader])))
    return _Following(layout, system.K, system.M, progress, shown)


class _Following(Rotations):
    """Rotations of a layout with links or ties: followers' rotations come from what they follow."""

    def __init__(self, layout: Layout, stiffness: Any, mass: Any, progress: Progress, shown: list) -> None:
        assert layout.follow is not None
        self.follow, self.dependent = layout.follow, layout.dependent
        reduced, moving = (sp.csr_array(layout.follow.T @ matrix @ layout.follow) for matrix in (stiffness, mass))
        super().__init__(reduced, layout.dof, layout.held | layout.dependent, progress, shown, moving)

    def complete(self, moved: Array, squares: Array | None = None) -> Array:
        vectors = super().complete(moved, squares)
        if np.iscomplexobj(moved):
            return vectors  # both parts have passed here
        numbers = self.dof[:, 3:][self.dof[:, 3:] >= 0]
        numbers = numbers[self.dependent[numbers]]
        vectors[:, numbers] = (self.follow[numbers] @ vectors.T).T
        return vectors
