"""Modes against matrices that were given: closure, modal mass, total energies, residual. No energies by element."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields
from typing import Any

import numpy as np

from viewer.errors import ModelError
from viewer.jobs import SILENT, Progress
from viewer.mechanics.assembly import System
from viewer.mechanics.closure import flexible_share, residuals
from viewer.mechanics.constraints import held_dofs
from viewer.mechanics.energy import CLOSURE_BOUND, RESIDUAL_BOUND
from viewer.model.arrays import Array, frozen
from viewer.model.design import Design
from viewer.model.modes import ModeSet

_RIGID = 1e-4  # as in ``energy.py``
NO_CELLS = "its stiffness and mass were given as matrices, so energies by element are not known"


def given_system(design: Design) -> System:
    """The design's matrices with its supports. Raises ``ModelError`` when it has none."""
    given = design.physics.matrices
    if given is None:
        raise ModelError(f"design '{design.name}' has no matrices")
    physics = design.physics
    if any((physics.assignments, physics.springs, physics.masses, physics.links, physics.ties, physics.struts)):
        raise ModelError(
            f"design '{design.name}' has matrices and parts of its own beside them",
            expected="supports only",
            do="leave out the matrices, or what they contain already",
        )
    if len(given.dof) != design.mesh.n_nodes:
        raise ModelError(f"design '{design.name}': its matrices are those of another mesh")
    size = given.stiffness.size
    none = frozen(np.zeros(size, bool))
    held = held_dofs(design.physics.supports, design, given.dof, size)
    return System(
        design,
        given.dof,
        size,
        frozen(held),
        blocks=(),
        springs=(),
        masses=(),
        follow=None,
        dependent=none,
        cautions=(),
        statements=(),
        K=given.stiffness.csr(),
        M=given.mass.csr(),
    )


@dataclass(frozen=True, eq=False)
class Totals:
    """Energies of k modes as wholes. A mode j counts through ``indices``; fields as in ``Energies``.

    modal_mass  (k,) φᴴMφ, kg times the square of the shape's unit
    """

    indices: Array
    freq_hz: Array
    strain: Array
    kinetic: Array
    modal_mass: Array
    closure: Array
    residual: Array
    trusted: Array

    def __post_init__(self) -> None:
        for item in fields(self):
            object.__setattr__(self, item.name, frozen(getattr(self, item.name)))

    def to_dict(self, j: int) -> dict[str, Any]:
        """Every figure of mode j as plain numbers."""
        number = lambda value: None if np.isnan(value) else float(value)  # noqa: E731
        return {
            "mode": int(self.indices[j]) + 1,
            "frequency_hz": float(self.freq_hz[j]),
            "strain_energy": float(self.strain[j]),
            "kinetic_energy": float(self.kinetic[j]),
            "modal_mass": float(self.modal_mass[j]),
            "closure": number(self.closure[j]),
            "residual": number(self.residual[j]),
            "trusted": bool(self.trusted[j]),
        }


def totals(
    design: Design, modes: ModeSet, indices: Sequence[int] | None = None, progress: Progress = SILENT
) -> Totals:
    """Total energies of the modes ``indices`` (None: all) by the design's matrices. Raises ``ModelError``."""
    picked = np.arange(modes.count) if indices is None else np.asarray(indices, np.int64)
    if not np.array_equal(modes.node_ids, design.mesh.node_ids):
        raise ModelError(f"design '{design.name}': the modes are not given on the nodes of its mesh")
    system = given_system(design)
    moved, turned = np.stack([modes.shape(int(i)) for i in picked]), [modes.rotations(int(i)) for i in picked]
    given = [values for values in turned if values is not None]
    if system.has_rotations and len(given) < len(turned):
        raise ModelError(
            f"design '{design.name}': its matrices have rotations, the modes have none",
            file=modes.source or None,
            do="give modes with rotations",
        )
    vectors = system.gather(moved, np.stack(given) if len(given) == len(turned) else None)
    omega = 2 * np.pi * modes.freq_hz[picked]
    strain, modal_mass = 0.5 * _quadratic(system.K, vectors), _quadratic(system.M, vectors)
    if not (modal_mass > 0).all():
        raise ModelError(f"design '{design.name}': mode {picked[int(np.argmin(modal_mass))] + 1} moves no mass")
    rigid = (omega <= 0) | (flexible_share(system, vectors) < _RIGID)
    with np.errstate(divide="ignore", invalid="ignore"):
        closure = np.where(rigid, np.nan, np.sqrt(np.maximum(2 * strain, 0) / modal_mass) / omega)
    residual, missing = np.full(len(picked), np.nan), np.zeros(len(picked))
    elastic = np.nonzero(~rigid)[0]
    if len(elastic):
        found = residuals(system, vectors[elastic], omega[elastic], progress)
        residual[elastic], missing[elastic] = found.share, found.missing
    return Totals(
        picked,
        modes.freq_hz[picked],
        strain,
        0.5 * modal_mass * omega**2,
        modal_mass,
        closure,
        residual,
        (np.abs(closure - 1) <= CLOSURE_BOUND) & (residual + missing <= RESIDUAL_BOUND) & (not modes.caution),
    )


def _quadratic(matrix, vectors: Array) -> Array:
    """(k,) vᴴ A v of real or complex vectors (k, n)."""
    return np.real(np.einsum("kn,nk->k", vectors.conj(), matrix @ vectors.T))
