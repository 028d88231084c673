"""Stiffness and mass that somebody else's program has assembled, as an alternative to materials and sections."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np
import scipy.sparse as sp

from viewer.model.arrays import Array, frozen


@dataclass(frozen=True)
class MatrixFiles:
    """Where the matrices are: ``order`` is "by node", "by direction" or a table; units are factors to N/m and kg."""

    stiffness: Path
    mass: Path
    order: str | Path
    stiffness_unit: float = 1.0
    mass_unit: float = 1.0


@dataclass(frozen=True, eq=False)
class SymmetricMatrix:
    """The parts of a symmetric CSR matrix, both halves stored."""

    data: Array
    indices: Array
    indptr: Array

    def __post_init__(self) -> None:
        object.__setattr__(self, "data", frozen(self.data, np.float64, shape=(None,)))
        object.__setattr__(self, "indices", frozen(self.indices, np.int32, shape=(len(self.data),)))
        object.__setattr__(self, "indptr", frozen(self.indptr, np.int32, shape=(None,)))

    @property
    def size(self) -> int:
        return len(self.indptr) - 1

    def csr(self) -> sp.csr_array:
        """(size, size), a copy."""
        return sp.csr_array((self.data, self.indices, self.indptr), shape=(self.size, self.size), copy=True)


@dataclass(frozen=True, eq=False)
class GivenMatrices:
    """Stiffness N/m and mass kg (N·m/rad, kg·m² for rotations), and where each node's directions stand in them.

    dof  (n_nodes, 6) row of ux uy uz rx ry rz by node row of the mesh, −1 where the matrices have none
    """

    stiffness: SymmetricMatrix
    mass: SymmetricMatrix
    dof: Array

    def __post_init__(self) -> None:
        object.__setattr__(self, "dof", frozen(self.dof, np.int64, shape=(None, 6)))
