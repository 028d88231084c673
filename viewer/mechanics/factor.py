"""Sparse symmetric factorisations: SciPy's SuperLU always, PARDISO where the ``fast`` extra is installed."""

from __future__ import annotations

import contextlib
import ctypes
from functools import cache
from typing import Any, Protocol

import numpy as np
import scipy.sparse as sp
import scipy.sparse.linalg as spla

from viewer.errors import SolveError
from viewer.model.arrays import Array

# Unknowns up to which a factorisation takes an instant; larger ones belong in a process that can be killed, since
# they hear neither Ctrl-C nor a cancel.
AT_ONCE = 12_000
_ONE_CODE_PATH = 2  # MKL_CBWR_AUTO


class Factor(Protocol):
    """A factorised symmetric matrix A.

    negative  number of negative eigenvalues of A (Sylvester's law of inertia), None when it is not known
    """

    @property
    def negative(self) -> int | None: ...

    def solve(self, right: Array) -> Array:
        """A⁻¹ b for (n,) or (n, k)."""
        ...


def factorise(matrix: sp.csr_array, *, definite: bool, solver: str = "") -> Factor:
    """Factorise a symmetric matrix with canonical CSR structure.

    definite  True when the matrix is known to be positive definite
    solver    "superlu", "pardiso" or empty: PARDISO when it can be loaded
    Raises ``SolveError`` when the matrix is singular or memory runs out.
    """
    if solver == "pardiso" and _mkl() is None:
        raise SolveError("PARDISO cannot be loaded", do="install the extra 'fast', or take SuperLU")
    if solver != "superlu" and _mkl() is not None:
        return Pardiso(matrix, definite)
    return SuperLU(matrix)


class SuperLU:
    """SciPy's SuperLU in symmetric mode: minimum degree on A + Aᵀ, pivots kept on the diagonal.

    (Li X.S., An overview of SuperLU, ACM TOMS 31 (2005) 302: options for symmetric matrices.)
    """

    def __init__(self, matrix: sp.csr_array) -> None:
        try:
            self._lu = spla.splu(
                sp.csc_array(matrix.T),
                permc_spec="MMD_AT_PLUS_A",
                diag_pivot_thresh=0.001,
                options={"SymmetricMode": True},
            )
        except (RuntimeError, MemoryError) as error:
            raise _failure(str(error)) from error

    @property
    def negative(self) -> int | None:
        """From the signs of U's diagonal, as long as no row was exchanged: then L D Lᵀ = P A Pᵀ."""
        if not np.array_equal(self._lu.perm_r, self._lu.perm_c):
            return None
        return int((self._lu.U.diagonal() < 0).sum())

    def solve(self, right: Array) -> Array:
        return self._lu.solve(right)


class Pardiso:
    """Intel MKL's PARDISO on the upper triangle; the library is found by pypardiso.

    The call is made here, since pypardiso compares the whole matrix before every solution.
    """

    def __init__(self, matrix: sp.csr_array, definite: bool) -> None:
        upper = sp.triu(matrix, format="csr")
        upper.sort_indices()
        self._pointers = np.zeros(64, np.int64)
        self._settings = np.zeros(64, np.int32)
        self._type = 2 if definite else -2
        self._values = np.ascontiguousarray(upper.data, float)
        self._rows = upper.indptr.astype(np.int32) + 1
        self._columns = upper.indices.astype(np.int32) + 1
        self._size = matrix.shape[0]
        # Own settings rather than defaults; nested dissection in its sequential form, so that the ordering, and with
        # it every bit of the result, does not depend on threads.
        self._settings[[0, 1, 9, 17, 20]] = 1, 2, 8, -1, 1
        self._call(12, np.zeros((self._size, 1), order="F"))
        self.negative: int | None = 0 if definite else int(self._settings[22])

    def solve(self, right: Array) -> Array:
        return np.ascontiguousarray(self._call(33, np.asfortranarray(right, float)))

    def __del__(self) -> None:
        # At the interpreter's end the library's names may be gone, and so is then the memory it held.
        with contextlib.suppress(TypeError, AttributeError, ImportError):
            if self._pointers.any():
                self._call(-1, np.zeros((self._size, 1), order="F"), check=False)

    def _call(self, phase: int, right: Array, check: bool = True) -> Array:
        library = _mkl()
        assert library is not None
        out = np.zeros_like(right, order="F")
        error = ctypes.c_int32(0)
        number = [ctypes.c_int32(n) for n in (1, 1, self._type, phase, self._size)]
        columns = ctypes.c_int32(1 if right.ndim == 1 else right.shape[1])
        void, whole, quiet = ctypes.c_void_p, ctypes.POINTER(ctypes.c_int32), ctypes.c_int32(0)
        library.pardiso(
            self._pointers.ctypes.data_as(ctypes.POINTER(ctypes.c_int64)),
            *map(ctypes.byref, number),
            self._values.ctypes.data_as(void),
            self._rows.ctypes.data_as(whole),
            self._columns.ctypes.data_as(whole),
            np.zeros(1, np.int32).ctypes.data_as(whole),
            ctypes.byref(columns),
            self._settings.ctypes.data_as(whole),
            ctypes.byref(quiet),
            right.ctypes.data_as(void),
            out.ctypes.data_as(void),
            ctypes.byref(error),
        )
        if check and error.value:
            raise _failure({-2: "not enough memory", -4: "zero pivot"}.get(error.value, f"error {error.value}"))
        return out


def _failure(found: str) -> SolveError:
    return SolveError(
        "the stiffness matrix could not be factorised",
        found=found,
        do="if memory ran out use a coarser mesh; otherwise look for parts that hang together by nothing",
    )


@cache
def _mkl() -> Any:
    """MKL as loaded by pypardiso; None when the extra is not installed or does not load."""
    try:
        from pypardiso import PyPardisoSolver

        library = PyPardisoSolver().libmkl
    except (ImportError, OSError):
        return None
    # Bitwise reproducible results need one code path of MKL, whatever the alignment of the arrays; this is only
    # heeded before MKL's first use in the process and harmless afterwards.
    library.MKL_CBWR_Set(ctypes.c_int(_ONE_CODE_PATH))
    return library
