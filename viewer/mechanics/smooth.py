"""Noise in given shapes: how much there is, and taking it out by the model itself.

Noise of a measured or rounded shape is spread evenly over all the model's modes, while a mode of interest lies at the
low end of the spectrum. So the model's own stiffness and mass make the filter: with S = (M + K/μ)⁻¹ M, whose
eigenvalues are s = 1/(1 + λᵢ/μ) on the model's modes, the shape becomes p(S) ũ, where p rises from 0 at s = 0 to 1 at
s = 1 and is flat at both ends. Modes well below the edge μ pass unchanged, those well above are removed, and a shape
that is a mode of the model keeps its form exactly, hinges included, whatever the edge. S is the regularised least
squares fit argmin (u − ũ)ᵀM(u − ũ) + uᵀKu/μ (Tikhonov A.N., Arsenin V.Y., Solutions of ill-posed problems, 1977),
p the smoothstep polynomial of degree 7. M regularises free bodies; supports, links and ties hold exactly.

How much noise there is shows without any solution: elastic forces K u of a low mode are small, those of noise are
not, since stiffness belongs to the highest modes.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp

from viewer.cells.kinds import KINDS
from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import ElementGroup, Layout, System
from viewer.mechanics.factor import Factor, factorise
from viewer.mechanics.settle import rounding_of
from viewer.mechanics.sums import real_parts
from viewer.model.arrays import Array

EDGE = 4.0  # of the filter, in λ of the shape
_EDGES = 4  # the edge is raised so many times fourfold at most where more goes away than there is noise
_EXCESS = 1.5  # times the noise seen beforehand: more than that is not taken away without trying a higher edge
_ROUNDS = 8  # of looking for λ where it is not known
_LOWEST = 1 / 3  # Rayleigh quotient of the result ÷ λ below which λ was too high
_PASSED = 0.5  # share of the shape's square that passes; below, λ was too low
_STEP = (0.0, 0.0, 0.0, 35.0, -84.0, 70.0, -20.0)  # weights of s, s², …: p(s) = s⁴ (35 − 84 s + 70 s² − 20 s³)
_SAMPLE = 1500  # nodes at which elastic forces are formed
_ENTRIES = 2**22  # of element matrices at a time, 32 MB
_MIDDLE = 0.86  # median of |force| of noise ÷ its rms: √(χ²/k) has 0.83 for k = 2 and 0.89 for k = 3


@dataclass(frozen=True, eq=False)
class Filtered:
    """vector (n_dof,) the smoothed shape; square its Rayleigh quotient λ, rad²/s²; edge of the filter ÷ λ; rounds
    factorisations it took."""

    vector: Array
    square: float
    edge: float
    rounds: int


def low_pass(
    system: System, vector: Array, square: float | None, expected: float, absent: Array, progress: Progress = SILENT
) -> Filtered:
    """The vector (n_dof,), real or complex, without what lies far above ``square`` = ω² in the model's spectrum.

    square    None when not known: found from Rayleigh quotients of results, from above; also where the one given
              turns out to be that of another model
    expected  share of the shape (rms) that is thought to be noise; where more would go, the edge is raised
    absent    (n_dof,) True where the vector says nothing (missing rotations): filled in by a first result
    Raises ``SolveError`` when memory runs out.
    """
    stiffness, mass = system.restrict(system.K), system.restrict(system.M)
    even = _even_weights(system)
    given = real_parts(np.where(system.held | absent, 0.0, vector)).T  # (n_dof, p)
    level = square if square else _quotient(stiffness, mass, given[system.free])
    raised, edge, rounds = False, EDGE, 0
    while True:
        rounds += 1
        progress.tick("smoothing", rounds)
        factor = factorise(sp.csr_array(mass + stiffness / (edge * level)), definite=True)
        passed, smooth, alike = _fit(system, mass, even, factor, given, progress)
        if absent.any():
            filled = np.where(absent[:, None], system.extend(smooth.T).T, given)
            passed, smooth, alike = _fit(system, mass, even, factor, filled, progress)
        found = _quotient(stiffness, mass, smooth)
        if rounds >= _ROUNDS or _square(stiffness, smooth) <= rounding_of(stiffness, smooth).sum():
            break
        if passed < _PASSED:
            level, raised = 16 * level, True
        elif found < _LOWEST * level and not raised:
            level = found
        elif 1 - alike > (_EXCESS * expected) ** 2 + 1e-4 and edge < EDGE * 4**_EDGES:
            edge *= 4
        else:
            break
    full = system.extend(smooth.T)
    return Filtered(full[0] if len(full) == 1 else full[0] + 1j * full[1], found, edge, rounds)


def _fit(
    system: System, mass: sp.csr_array, even: Array, factor: Factor, given: Array, progress: Progress
) -> tuple[float, Array, float]:
    """Share of the square of ``given`` (n_dof, p) that passes the filter; the free values (n_free, p) of what passes,
    at the size that comes closest to ``given``; and how much alike the two are (MAC by mass).

    Consistent mass weighs the nodes of quadratic bricks unevenly, some below zero, which lets more noise through than
    need be. So what is left over, noise if all is well, is passed once more with ``even`` weights; a mode leaves
    nothing over and is not touched by that.
    """

    def sized(values: Array) -> Array:
        full = weights * system.extend(values.T).T
        return values * float(np.sum(full * given)) / max(float(np.sum(full * system.extend(values.T).T)), 1e-300)

    weights = even[:, None]
    heavy = system.M @ given
    load, whole = system.force(heavy.T).T, max(float(np.sum(given * heavy)), 1e-300)
    first = _passed(mass, factor, load, progress)
    smooth = sized(first)
    left = weights * (given - system.extend(smooth.T).T)
    smooth = sized(smooth + _passed(mass, factor, system.force(left.T).T, progress))
    alike = float(np.sum(smooth * load)) ** 2 / max(_square(mass, smooth) * whole, 1e-300)
    return _square(mass, first) / whole, smooth, alike


def _passed(mass: sp.csr_array, factor: Factor, load: Array, progress: Progress) -> Array:
    """p(S) M⁻¹ of the load (n_free, p)."""
    power, out = load, np.zeros_like(load)
    for degree, weight in enumerate(_STEP, start=1):
        progress.tick("smoothing", degree, len(_STEP))
        power = factor.solve(np.ascontiguousarray(power)).reshape(load.shape)
        out += weight * power
        power = mass @ power
    return out


def _even_weights(system: System) -> Array:
    """(n_dof,) masses of single nodes, all positive: the diagonal of M scaled to the whole mass (Hinton E., Rock T.,
    Zienkiewicz O.C., A note on mass lumping and related processes, Earthq. Eng. Struct. Dyn. 4 (1976) 245)."""
    diagonal = system.M.diagonal()
    along = np.zeros(system.n_dof)
    along[system.dof[:, 0][system.dof[:, 0] >= 0]] = 1.0
    return diagonal * _square(system.M, along) / max(float(along @ diagonal), 1e-300)


def _quotient(stiffness: sp.csr_array, mass: sp.csr_array, parts: Array) -> float:
    return _square(stiffness, parts) / max(_square(mass, parts), 1e-300)


def _square(matrix: sp.csr_array, parts: Array) -> float:
    return float(np.sum(parts * (matrix @ parts)))


def noise_of(layout: Layout, moved: Array, progress: Progress = SILENT) -> float:
    """Share of noise, rms ÷ rms of the shape, in translations ``moved`` (n_nodes, 3), real or complex.

    At up to 1 500 nodes the elastic force, of solids less the inertia force at the λ that suits all nodes best, is
    compared with what noise of one size at every node would give, by the norm of the matrix rows; the median over
    nodes is not misled by hinges, supports and places where the model is wrong. Sheets count by their membrane, beams
    by their stretching, since rotations may be missing: noise along the normal alone is not seen. NaN when no cell
    can tell.
    """
    parts = np.moveaxis(real_parts(np.asarray(moved)), 0, -1).reshape(3 * len(moved), -1)
    nodes: Array = np.unique(np.concatenate([np.empty(0, np.int64), *(g.nodes.ravel() for g in layout.blocks)]))
    size = np.sqrt((parts.reshape(len(moved), -1)[nodes] ** 2).sum() / max(len(nodes), 1))
    held: Array = np.append(layout.held, False)[layout.dof[:, :3]]
    inside = nodes[~held[nodes].any(axis=1)]
    if len(inside) > _SAMPLE:
        inside = np.sort(np.random.default_rng(7).choice(inside, _SAMPLE, replace=False))
    if size == 0 or not len(inside):
        return float("nan")
    stiffness, mass = _rows(layout, inside, progress)
    push, weight = stiffness @ parts, mass @ parts
    scale = np.repeat(1 / np.maximum(_norms(stiffness), 1e-300), 3)[:, None] ** 2
    square = max(float((scale * push * weight).sum() / max((scale * weight**2).sum(), 1e-300)), 0.0)
    norms = _norms(sp.csr_array(stiffness - square * mass))
    judged = norms > 0
    if not judged.any():
        return float("nan")
    left = np.sqrt(((push - square * weight) ** 2).reshape(len(inside), -1).sum(axis=1))
    each = np.median(left[judged] / norms[judged]) / _MIDDLE
    return float(np.sqrt(3.0) * each / size)


def _norms(rows: sp.csr_array) -> Array:
    """(k,) root of the sum of squares of every three rows (3k, n)."""
    return np.sqrt(rows.multiply(rows).sum(axis=1).reshape(-1, 3).sum(axis=1))


def _rows(layout: Layout, inside: Array, progress: Progress) -> tuple[sp.csr_array, sp.csr_array]:
    """(3k, 3 n_nodes) rows of the k nodes ``inside``, of stiffness and mass against translations: all of solids, the
    stiffness of sheets' membranes and beams' stretching."""
    size = len(layout.points)
    place = np.full(size, -1, np.int64)
    place[inside] = np.arange(len(inside))
    sums = [sp.csr_array((3 * len(inside), 3 * size)) for _ in range(2)]
    for group in layout.blocks:
        chosen = np.nonzero((place[group.nodes] >= 0).any(axis=1))[0]
        step = max(1, _ENTRIES // group.dofs.shape[1] ** 2)
        for start in range(0, len(chosen), step):
            progress.tick("estimating noise")
            nodes = group.nodes[chosen[start : start + step]]
            n = nodes.shape[1]
            cell, local = np.nonzero(place[nodes] >= 0)
            at = np.broadcast_to(
                (3 * place[nodes[cell, local]])[:, None, None] + np.arange(3)[:, None], (len(cell), 3, 3 * n)
            )
            ends = np.broadcast_to((3 * nodes[cell][:, :, None] + np.arange(3)).reshape(-1, 1, 3 * n), at.shape)
            for index, matrices in enumerate(_matrices(group, layout.points[nodes])):
                values = matrices.reshape(-1, n, 3, 3 * n)[cell, local]
                entries = (values.ravel(), (at.ravel(), ends.ravel()))
                sums[index] = sums[index] + sp.csr_array(sp.coo_array(entries, shape=sums[index].shape))
    return sums[0], sums[1]


def _matrices(group: ElementGroup, xyz: Array) -> tuple[Array, ...]:
    """(c, 3n, 3n) against translations: stiffness and mass of solids, the stiffness of a membrane or a bar."""
    formulation, prop = group.formulation, group.prop
    dim, count, n = KINDS[group.kind].dim, len(xyz), xyz.shape[1]
    if dim == 3:
        mass = formulation.mass(xyz, prop)
        if formulation.scalar_mass:
            mass = np.einsum("cij,kl->cikjl", mass, np.eye(3)).reshape(count, 3 * n, 3 * n)
        return formulation.stiffness(xyz, prop), mass
    if dim == 1:
        along = xyz[:, 1] - xyz[:, 0]
        bar = along[:, :, None] * along[:, None, :] / np.linalg.norm(along, axis=1)[:, None, None] ** 3
        return (np.block([[bar, -bar], [-bar, bar]]),)
    membrane = formulation.parts(xyz, prop)["membrane"]  # type: ignore[attr-defined]
    return (membrane.reshape(count, n, 6, n, 6)[:, :, :3, :, :3].reshape(count, 3 * n, 3 * n),)
