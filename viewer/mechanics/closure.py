"""How far given shapes are from being modes of our matrices, and where: the residual of Kφ − λMφ.

With r that residual on the free directions and A = K + αM, the residual share is rᵀA⁻¹r / φᵀAφ. Written in the
model's own modes, φ = Σ cᵢφᵢ, this is Σ cᵢ²(λᵢ − λ)²/(λᵢ + α) over Σ cᵢ²(λᵢ + α): the share of energy that does not
belong to a mode of that frequency. It does not depend on the size of the shape, is second order in small errors,
and cannot cancel, as closure can. The inverse is needed: weighed by the diagonal of K instead, the residual of a
smooth wrong shape shrinks with the mesh. The term αM makes A regular for free bodies; with α about λ no part of the
spectrum counts for more than its own share (were α small, a trace of a low mode in a high one would count manifold).
α is λ rounded to a power of 4, so that a few factorisations serve many modes and a mode's figure does not depend on
which others are asked for.

x = A⁻¹r is the displacement by which the shape misses being a mode; the energy of x by cell shows where.
"""

from __future__ import annotations

import numpy as np
import scipy.sparse as sp
import scipy.sparse.linalg as spla

from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import Layout, System, assemble_layout
from viewer.mechanics.factor import factorise
from viewer.mechanics.patch import rigid_fields
from viewer.mechanics.sums import real_parts, strain_and_kinetic
from viewer.model.arrays import Array

FACTOR_LIMIT = 200_000  # free directions up to which A is factorised; beyond, conjugate gradients
_STEPS = 300  # of conjugate gradients


def flexible_share(layout: Layout, vectors: Array) -> Array:
    """(k,) share of the mean square translation of the nodes that is beyond their best rigid motion."""
    nodes = np.nonzero((layout.dof[:, :3] >= 0).any(axis=1))[0]
    fields = rigid_fields(layout.points[nodes], layout.points[nodes].mean(axis=0)).reshape(-1, 6)
    strength, axes = np.linalg.eigh(fields.T @ fields / np.maximum((fields**2).sum(), 1e-300))
    seen = strength > 1e-12 * strength[-1]
    basis, _ = np.linalg.qr(fields @ axes[:, seen])
    places = layout.dof[nodes, :3].ravel()
    rigid, counted = np.zeros((layout.n_dof, basis.shape[1])), np.zeros(layout.n_dof)
    rigid[places[places >= 0]], counted[places[places >= 0]] = basis[places >= 0], 1.0
    whole = np.maximum(np.einsum("kn,kn,n->k", vectors, vectors.conj(), counted).real, 1e-300)
    return np.maximum(1 - np.sum(np.abs(vectors @ rigid) ** 2, axis=1) / whole, 0.0)


def residuals(layout: Layout, vectors: Array, omega: Array, progress: Progress = SILENT) -> tuple[Array, Array]:
    """Residuals (k,) of the vectors (k, n_dof) as elastic modes of ω (k,) rad/s, and by cell (k, n_cells).

    The cells' shares add up to the residual but for what springs and lumped masses hold. Beyond 200 000 free
    directions A⁻¹ is replaced by conjugate gradients that may stop early; the figure is then a lower bound.
    """
    system = layout if isinstance(layout, System) else assemble_layout(layout, progress)
    # A shape that moves where the design is held, or apart from what it follows, cannot be its mode: that motion is
    # taken away, and what it leaves behind shows as residual beside the place.
    vectors = layout.extend(vectors[:, layout.free])
    level = np.rint(np.log(omega**2) / np.log(4.0))
    shares, by_cell = np.empty(len(vectors)), np.empty((len(vectors), layout.design.mesh.n_cells))
    for power in np.unique(level):
        which = np.nonzero(level == power)[0]
        shares[which], by_cell[which] = _one_level(system, vectors[which], omega[which], 4.0**power, progress)
    return shares, by_cell


def _one_level(system: System, vectors: Array, omega: Array, alpha: float, progress: Progress) -> tuple[Array, Array]:
    shifted = sp.csr_array(system.K + alpha * system.M)
    parts = real_parts(vectors)  # (p, k, n_dof)
    right = np.stack(
        [  # (p, n_free, k)
            system.force((system.K @ p.T - (system.M @ p.T) * omega**2).T).T for p in parts
        ]
    )
    whole = np.sum([np.einsum("kn,nk->k", p, shifted @ p.T) for p in parts], axis=0)
    inner = system.restrict(shifted)
    progress.tick("residual")
    flat = np.moveaxis(right, 1, 0).reshape(len(system.free), -1)
    direct = len(system.free) <= FACTOR_LIMIT
    found = factorise(inner, definite=True).solve(flat) if direct else _iterate(inner, flat, progress)
    # 2xᵀr − xᵀAx: equal to rᵀA⁻¹r for the exact x and below it for any other.
    gain = 2 * np.sum(flat * found, axis=0) - np.sum(found * (inner @ found), axis=0)
    missed = system.extend(found.T)
    strain, moving = strain_and_kinetic(system, missed, progress)
    by_cell = strain + alpha * moving
    shares = gain.reshape(len(parts), -1).sum(axis=0) / whole
    return shares, 2 * by_cell.reshape(len(parts), len(vectors), -1).sum(axis=0) / whole[:, None]


def _iterate(matrix: sp.csr_array, right: Array, progress: Progress) -> Array:
    scale = sp.diags_array(1 / matrix.diagonal())
    out = np.empty_like(right)
    for column in range(right.shape[1]):
        out[:, column], _ = spla.cg(
            matrix,
            right[:, column],
            rtol=1e-3,
            maxiter=_STEPS,
            M=scale,
            callback=lambda _: progress.tick("residual", column, right.shape[1]),  # noqa: B023
        )
    return out
