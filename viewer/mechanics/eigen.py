"""Natural frequencies and mode shapes: K φ = λ M φ on the free degrees of freedom.

Shift-invert Lanczos (Ericsson T., Ruhe A., The spectral transformation Lanczos method, Math. Comp. 35 (1980) 1251)
through ARPACK, about a *negative* shift: K − σM is then positive definite for free bodies too, without artificial
springs, as long as no motion has neither stiffness nor mass. Small problems are solved densely by the same
transformation, which also copes with directions that have stiffness but no mass.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.linalg as sl
import scipy.sparse as sp
import scipy.sparse.linalg as spla

from viewer.errors import ModelError, SolveError
from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import System, assemble
from viewer.mechanics.factor import Factor, SuperLU, factorise
from viewer.mechanics.given_matrices import given_system
from viewer.mechanics.patch import rigid_fields
from viewer.mechanics.settle import rounding_of, settle_modes
from viewer.model.arrays import Array
from viewer.model.design import Design
from viewer.model.modes import ArrayShapes, ModeSet

RESIDUAL_BOUND = 1e-8  # largest accepted residual share of a computed mode, see ``_residual_shares``
_DENSE = 300  # free directions up to which the dense solver is used
_COUNT_LIMIT = 30_000  # free directions up to which SuperLU factorises once more for the count
_SHIFT = 0.1  # of the estimate of the first elastic eigenvalue
_CLEAR = 100.0  # times the rounding of the lowest Rayleigh quotient: the shift stays above that


def solve(design: Design, count: int, progress: Progress = SILENT, *, solver: str = "") -> ModeSet:
    """The ``count`` lowest modes of a design or of the matrices given with it, mass-normalised (m/√kg, rotations in
    rad/√kg beside them).

    solver  "superlu" or "pardiso"; empty takes PARDISO where the extra ``fast`` is installed
    Rigid-body modes come first with frequency 0. Start vector, signs and the basis of repeated frequencies are
    fixed: the same input gives the same shapes. Fewer modes come back when the model has fewer.
    Raises ``ModelError`` (see ``assemble``) and ``SolveError`` when the residual or the count does not pass.
    """
    system = assemble(design, progress) if design.physics.matrices is None else given_system(design)
    return solve_system(system, count, progress, solver=solver)


def solve_system(system: System, count: int, progress: Progress = SILENT, *, solver: str = "") -> ModeSet:
    """As :func:`solve`, for matrices that are assembled already."""
    if count < 1:
        raise ModelError("the number of modes must be positive", found=str(count))
    if len(system.free) == 0:
        raise ModelError(f"design '{system.design.name}': the supports hold every direction", do="hold fewer nodes")
    stiffness, mass = system.restrict(system.K), system.restrict(system.M)
    if stiffness.nnz == 0 or mass.nnz == 0:
        raise ModelError(f"design '{system.design.name}' has no stiffness or no mass on its free directions")
    problem = _Problem(stiffness, mass, _smooth_fields(system)[system.free], solver)
    values, vectors = problem.lowest(count, progress)
    values, vectors = settle_modes(
        values, vectors, stiffness, mass, _rigid_motions(system)[system.free], wanted=count
    )
    problem.check(values, vectors, progress)
    moved, turned = system.spread(system.extend(vectors.T))
    return ModeSet(
        node_ids=system.design.mesh.node_ids,
        freq_hz=np.sqrt(values) / (2 * np.pi),
        shapes=ArrayShapes(moved, turned),
        normalisation="mass",
        origin="computed",
        source=system.design.name,
    )


@dataclass
class _Problem:
    """K φ = λ M φ with smooth trial fields (n, f) that tell the scale of the lowest eigenvalues."""

    K: sp.csr_array
    M: sp.csr_array
    fields: Array
    solver: str

    def __post_init__(self) -> None:
        size, self.fields = _shift_size(self.K, self.M, self.fields)
        self.shift = -size
        self.factor: Factor | None = None

    def lowest(self, count: int, progress: Progress) -> tuple[Array, Array]:
        """At least ``count`` lowest eigenvalues and vectors (columns), whole clusters, as far as there are any."""
        size = self.K.shape[0]
        progress.tick("factorising")
        margin = 4
        while True:
            asked = count + margin
            # Lanczos needs room beyond the modes asked for, and modes of finite frequency to find.
            if size <= _DENSE or 3 * asked > size:
                return self._dense(asked, progress)
            values, vectors = self._lanczos(asked, progress)
            gaps = np.diff(values[count - 1 :])
            if (gaps > 1e-5 * np.abs(values[count:]) + 1e-5 * abs(self.shift)).any():
                return values, vectors
            margin *= 2  # the last mode asked for is one of a cluster that goes on

    def _lanczos(self, asked: int, progress: Progress) -> tuple[Array, Array]:
        size = self.K.shape[0]
        if self.factor is None:
            self.factor = self._settle_shift(progress)
        factor = self.factor

        def invert(right: Array) -> Array:
            progress.tick("solving for modes")
            return factor.solve(np.ravel(right))

        start = self.M @ np.random.default_rng(20).standard_normal(size)
        try:
            values, vectors = spla.eigsh(
                self.K,
                asked,
                self.M,
                sigma=self.shift,
                which="LM",
                v0=factor.solve(start),
                tol=0,
                OPinv=spla.LinearOperator((size, size), invert, dtype=float),
                ncv=min(size, max(2 * asked + 1, 24)),
            )
        except spla.ArpackError as error:
            raise SolveError(
                "the eigen-solution did not converge", found=str(error), do="ask for fewer modes"
            ) from error
        order = np.argsort(values, kind="stable")
        return values[order], vectors[:, order]

    def _settle_shift(self, progress: Progress) -> Factor:
        """The factorisation at a shift of the right order. In thin sheets smooth fields are full of membrane and
        shear strain and their Ritz values far too high; steps of block inverse iteration bring both down."""
        for left in range(5, -1, -1):
            progress.tick("factorising")
            factor = factorise(_shifted(self.K, self.M, self.shift), definite=True, solver=self.solver)
            smoother = factor.solve(self.M @ self.fields).reshape(self.fields.shape)
            size, self.fields = _shift_size(self.K, self.M, smoother)
            if size > 0.1 * abs(self.shift) or not left:
                break
            self.shift = -size
        return factor

    def _dense(self, asked: int, progress: Progress) -> tuple[Array, Array]:
        """Eigenvalues θ = 1/(λ − σ) of L⁻¹ M L⁻ᵀ with L Lᵀ = K − σM; θ = 0 stands for massless directions."""
        size = self.K.shape[0]
        if size > 6000:
            raise SolveError(
                "too many modes asked",
                found=f"{asked} modes of {size} free directions",
                expected="at most a third of them",
                do="ask for fewer modes",
            )
        progress.tick("solving for modes")
        try:
            lower = np.linalg.cholesky(_shifted(self.K, self.M, self.shift).toarray())
        except np.linalg.LinAlgError as error:
            raise SolveError(
                "some motion has neither stiffness nor mass",
                found=str(error),
                do="hold it, or look for parts that hang together by nothing",
            ) from error
        half = sl.solve_triangular(lower, self.M.toarray(), lower=True)
        theta, vectors = np.linalg.eigh(_symmetric(sl.solve_triangular(lower, half.T, lower=True)))
        finite = np.nonzero(theta > 1e-12 * theta[-1])[0][::-1][:asked]
        vectors = sl.solve_triangular(lower.T, vectors[:, finite] / np.sqrt(theta[finite]))
        return 1 / theta[finite] + self.shift, vectors

    def check(self, values: Array, vectors: Array, progress: Progress) -> None:
        """Residual of every mode, and the count of eigenvalues below the last where the factorisation tells it."""
        progress.tick("checking modes")
        shares = self._residual_shares(values, vectors)
        if not shares.max() <= RESIDUAL_BOUND:
            worst = int(np.argmax(shares))
            raise SolveError(
                f"mode {worst + 1} did not converge",
                found=f"residual share {shares[worst]:.1e}",
                expected=f"at most {RESIDUAL_BOUND:.0e}",
                do="ask for fewer modes, or check units and thin cells",
            )
        missing = self._missing(values, progress)
        if missing:
            raise SolveError(
                f"{missing} modes below the last one were not found", do="ask for a few modes more or fewer"
            )

    def _residual_shares(self, values: Array, vectors: Array) -> Array:
        """rᵀ A⁻¹ r / φᵀ A φ of r = Kφ − λMφ with A = K − σM.

        For φ = Σ cᵢφᵢ this is Σ cᵢ²(λᵢ − λ)²/(λᵢ − σ) over Σ cᵢ²(λᵢ − σ): the share of the energy that does not
        belong to the mode. The relative error of λ − σ is at most the same number (a Rayleigh quotient).
        """
        residual = self.K @ vectors - (self.M @ vectors) * values
        if self.factor is None:
            self.factor = factorise(_shifted(self.K, self.M, self.shift), definite=True, solver=self.solver)
        corrected = self.factor.solve(residual).reshape(residual.shape)
        return np.abs(np.sum(residual * corrected, axis=0)) / (values - self.shift)

    def _missing(self, values: Array, progress: Progress) -> int:
        """How many eigenvalues below a point just under the last cluster are absent from ``values``.

        Counted at a point between clusters of the modes found; with massless directions as well, since these
        eigenvalues lie at +∞ of the pencil only when K is positive definite on them, as it is here.
        """
        if isinstance(self.factor, SuperLU) and self.K.shape[0] > _COUNT_LIMIT:
            return 0
        last = values[-1]
        below = values[values < last * (1 - 1e-4)]
        if len(below) == 0:
            return 0
        point = 0.5 * (below[-1] + values[len(below)])
        progress.tick("counting modes")
        try:
            negative = factorise(_shifted(self.K, self.M, point), definite=False, solver=self.solver).negative
        except SolveError:
            return 0  # a point on an eigenvalue by accident: no count, the residual check stands
        return 0 if negative is None else negative - len(below)


def _shifted(stiffness: sp.csr_array, mass: sp.csr_array, shift: float) -> sp.csr_array:
    return sp.csr_array(stiffness - shift * mass)


def _symmetric(matrix: Array) -> Array:
    return 0.5 * (matrix + matrix.T)


def _shift_size(stiffness: sp.csr_array, mass: sp.csr_array, fields: Array) -> tuple[float, Array]:
    """Size of a good shift, by Ritz's method over ``fields``, and the Ritz vectors.

    ``_SHIFT`` of the first eigenvalue above the rigid ones, as far as that stands clear of rounding. Only the order
    of magnitude matters: a shift far above the wanted eigenvalues slows Lanczos down, one far below drowns in
    rounding. Rayleigh quotients within their own rounding are taken as rigid.
    """
    norms = np.sqrt(np.einsum("nf,nf->f", fields, mass @ fields))
    fields = fields[:, norms > 1e-12 * norms.max(initial=0.0)] / norms[norms > 1e-12 * norms.max(initial=0.0)]
    floor = 1e-6 * float(stiffness.diagonal().sum() / mass.diagonal().sum())
    if fields.shape[1] == 0:
        return floor, fields
    gram, axes = np.linalg.eigh(_symmetric(fields.T @ (mass @ fields)))
    kept = gram > 1e-8 * gram[-1]
    basis = fields @ (axes[:, kept] / np.sqrt(gram[kept]))
    ritz, turn = np.linalg.eigh(_symmetric(basis.T @ (stiffness @ basis)))
    basis = basis @ turn
    noise = rounding_of(stiffness, basis)
    elastic = ritz[ritz > noise]
    return max(_SHIFT * float(elastic[0]) if len(elastic) else floor, _CLEAR * float(noise[0])), basis


def _rigid_motions(system: System) -> Array:
    """(n_dof, 6) translations along x y z and rotations about axes x y z through the centre of the nodes."""
    points = system.points
    fields = rigid_fields(points, points.mean(axis=0))
    turned = np.zeros_like(fields)
    turned[:, :, 3:] = np.eye(3)
    return system.gather(np.moveaxis(fields, 2, 0), np.moveaxis(turned, 2, 0)).T


def _smooth_fields(system: System) -> Array:
    """(n_dof, 30) displacements with each component a polynomial of degree ≤ 2 of position, and half their curl as
    rotations: bending, twisting and stretching of the whole body."""
    points = system.points - system.points.mean(axis=0)
    scale = max(float(np.abs(points).max()), 1e-300)
    x, y, z = (points / scale).T
    one, none = np.ones_like(x), np.zeros_like(x)
    values = np.stack([one, x, y, z, x * x, y * y, z * z, x * y, y * z, z * x])
    slopes = (
        np.stack(
            [
                np.stack([none, one, none, none, 2 * x, none, none, y, none, z]),
                np.stack([none, none, one, none, none, 2 * y, none, x, z, none]),
                np.stack([none, none, none, one, none, none, 2 * z, none, y, x]),
            ],
            axis=-1,
        )
        / scale
    )  # (10, n, 3)
    moved = np.zeros((3, *values.shape, 3))
    turned = np.zeros_like(moved)
    for axis in range(3):
        unit = np.eye(3)[axis]
        moved[axis] = values[..., None] * unit
        turned[axis] = 0.5 * np.cross(slopes, unit)  # curl (f e) = grad f × e
    return system.gather(moved.reshape(30, -1, 3), turned.reshape(30, -1, 3)).T
