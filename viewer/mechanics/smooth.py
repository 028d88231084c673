"""Noise in given shapes: how much there is, and taking it out by the model itself.

Noise of a measured or rounded shape is spread evenly over all the model's modes, while a mode of interest lies at the
low end of the spectrum. So the model's own stiffness and mass make the filter: with S = (M + K/μ)⁻¹ M, whose
eigenvalues are s = 1/(1 + λᵢ/μ) on the model's modes, the shape becomes p(S) ũ, where p rises from 0 at s = 0 to 1 at
s = 1 and is flat at both ends. Modes well below the edge μ pass unchanged, those well above are removed, and a shape
that is a mode of the model keeps its form exactly, hinges included, whatever the edge. S is the regularised least
squares fit argmin (u − ũ)ᵀM(u − ũ) + uᵀKu/μ (Tikhonov A.N., Arsenin V.Y., Solutions of ill-posed problems, 1977),
p the smoothstep polynomial of degree 7. M regularises free bodies; supports, links and ties hold exactly.

How much noise there is shows without any solution: elastic forces K u of a low mode are small, those of noise are not,
since stiffness belongs to the highest modes.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp

from viewer.cells.kinds import KINDS
from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import ElementGroup, Layout, System
from viewer.mechanics.factor import factorise
from viewer.mechanics.settle import rounding_of
from viewer.mechanics.sums import real_parts
from viewer.model.arrays import Array

EDGE = 4.0  # of the filter, in λ of the shape
_EDGES = 4  # the edge is raised so many times fourfold at most where more goes away than there is noise
_EXCESS = 1.5  # times the noise seen beforehand: more than that is not taken away without trying a higher edge
_ROUNDS = 8  # of looking for λ where it is not known
_LOWEST = 1 / 3  # Rayleigh quotient of the result ÷ λ below which λ was too high
_KEPT = 0.5  # share of the shape's square that passes; below, λ was too low
_STEP = ((4, 35.0), (5, -84.0), (6, 70.0), (7, -20.0))  # p(s) = s⁴ (35 − 84 s + 70 s² − 20 s³)
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
    system: System, vector: Array, square: float | None, expected: float, progress: Progress = SILENT
) -> Filtered:
    """The vector (n_dof,), real or complex, without what lies far above ``square`` = ω² in the model's spectrum.

    square    None when not known: found from Rayleigh quotients of results, from above; also where the one given
              turns out to be that of another model
    expected  share of the shape (rms) that is thought to be noise; where more would go, the edge is raised
    Raises ``SolveError`` when memory runs out.
    """
    stiffness, mass = system.restrict(system.K), system.restrict(system.M)
    parts = real_parts(np.where(system.held, 0.0, vector)).T  # (n_dof, p)
    load = system.force((system.M @ parts).T).T
    whole = float(np.sum(parts * (system.M @ parts)))
    level = square if square else _quotient(stiffness, mass, parts[system.free])
    raised, edge, rounds = False, EDGE, 0
    while True:
        rounds += 1
        progress.tick("smoothing", rounds)
        smooth = _smoothstep(stiffness, mass, edge * level, load, progress)
        square_sum = max(float(np.sum(smooth * (mass @ smooth))), 1e-300)
        found = float(np.sum(smooth * (stiffness @ smooth))) / square_sum
        smooth *= float(np.sum(smooth * load)) / square_sum  # the size that comes closest to the shape given
        alike = float(np.sum(smooth * load)) / whole
        if rounds >= _ROUNDS or found * alike * whole <= rounding_of(stiffness, smooth).sum():
            break
        if square_sum < _KEPT * whole:
            level, raised = 16 * level, True
        elif found < _LOWEST * level and not raised:
            level = found
        elif 1 - alike > (_EXCESS * expected) ** 2 + 1e-4 and edge < EDGE * 4**_EDGES:
            edge *= 4
        else:
            break
    full = system.extend(smooth.T)
    return Filtered(full[0] if len(full) == 1 else full[0] + 1j * full[1], found, edge, rounds)


def _smoothstep(stiffness: sp.csr_array, mass: sp.csr_array, edge: float, load: Array, progress: Progress) -> Array:
    factor = factorise(sp.csr_array(mass + stiffness / edge), definite=True)
    power, out = load, np.zeros_like(load)
    weights = dict(_STEP)
    for degree in range(1, max(weights) + 1):
        progress.tick("smoothing", degree, max(weights))
        power = factor.solve(np.ascontiguousarray(power)).reshape(load.shape)
        out += weights.get(degree, 0.0) * power
        power = mass @ power
    return out


def _quotient(stiffness: sp.csr_array, mass: sp.csr_array, parts: Array) -> float:
    return float(np.sum(parts * (stiffness @ parts)) / max(np.sum(parts * (mass @ parts)), 1e-300))


def noise_of(layout: Layout, moved: Array, progress: Progress = SILENT) -> float:
    """Share of noise, rms ÷ rms of the shape, in translations ``moved`` (n_nodes, 3), real or complex.

    At up to 1 500 nodes the elastic force on the node is compared with what noise of one size at every node would
    give, by the norm of the stiffness rows; the median over nodes is not misled by hinges, supports and places where
    the model is wrong. Sheets count by their membrane, beams by their stretching, since rotations may be missing:
    noise along the normal alone is not seen. NaN when no cell can tell.
    """
    parts = np.moveaxis(real_parts(np.asarray(moved)), 0, -1)  # (n_nodes, 3, p)
    nodes = np.unique(np.concatenate([group.nodes.ravel() for group in layout.blocks])) if layout.blocks else []
    size = float(np.sqrt((parts[nodes] ** 2).sum() / max(len(nodes), 1)))
    if size == 0:
        return float("nan")
    held = np.append(layout.held, False)[layout.dof[:, :3]].any(axis=1)
    inside = nodes[~held[nodes]]
    if len(inside) > _SAMPLE:
        inside = np.sort(np.random.default_rng(7).choice(inside, _SAMPLE, replace=False))
    place = np.full(len(moved), -1, np.int64)
    place[inside] = np.arange(len(inside))
    rows, columns, values = [], [], []
    for nodes_of, matrices in _translational(layout, place, progress):
        at = place[nodes_of]
        cell, local = np.nonzero(at >= 0)
        n = nodes_of.shape[1]
        piece = matrices.reshape(-1, n, 3, n, 3)[cell, local].reshape(len(cell), 3, 3 * n)
        rows.append(np.repeat(3 * at[cell, local][:, None] + np.arange(3), 3 * n, axis=1).ravel())
        ends = (3 * nodes_of[cell][:, :, None] + np.arange(3)).reshape(len(cell), 1, 3 * n)
        columns.append(np.broadcast_to(ends, piece.shape).ravel())
        values.append(piece.ravel())
    if not values:
        return float("nan")
    joined = (np.concatenate(values), (np.concatenate(rows), np.concatenate(columns)))
    forces = sp.csr_array(sp.coo_array(joined, shape=(3 * len(inside), 3 * len(moved))))
    felt = ((forces @ parts.reshape(3 * len(moved), -1)) ** 2).reshape(len(inside), -1).sum(axis=1)
    norm = (forces.multiply(forces)).sum(axis=1).reshape(len(inside), 3).sum(axis=1)
    judged = norm > 0
    if not judged.any():
        return float("nan")
    each = float(np.median(np.sqrt(felt[judged] / norm[judged]))) / _MIDDLE
    return float(np.sqrt(3.0) * each / size)


def _translational(layout: Layout, place: Array, progress: Progress) -> Iterator[tuple[Array, Array]]:
    """(nodes (c, n), matrices (c, 3n, 3n)) of the cells that touch a chosen node: stiffness of solids against
    translations, of sheets the membrane part, of beams stretching."""
    for group in layout.blocks:
        chosen = np.nonzero((place[group.nodes] >= 0).any(axis=1))[0]
        step = max(1, _ENTRIES // group.dofs.shape[1] ** 2)
        for start in range(0, len(chosen), step):
            progress.tick("estimating noise")
            nodes = group.nodes[chosen[start : start + step]]
            yield nodes, _matrices(group, layout.points[nodes])


def _matrices(group: ElementGroup, xyz: Array) -> Array:
    dim, n = KINDS[group.kind].dim, xyz.shape[1]
    if dim == 3:
        return group.formulation.stiffness(xyz, group.prop)
    if dim == 1:
        along = xyz[:, 1] - xyz[:, 0]
        length = np.linalg.norm(along, axis=1)[:, None, None]
        square = along[:, :, None] * along[:, None, :] / length**3
        return np.block([[square, -square], [-square, square]])
    whole = group.formulation.parts(xyz, group.prop)["membrane"]  # type: ignore[attr-defined]
    return whole.reshape(len(xyz), n, 6, n, 6)[:, :, :3, :, :3].reshape(len(xyz), 3 * n, 3 * n)
