"""Factorisation by the PARDISO of the oneAPI Math Kernel Library, found through the package ``pypardiso``.

Only the library is taken from that package; the calls are ours, because every entry of iparm has to be set
(with its defaults newer libraries leave large residuals on some matrices), only one triangle is passed for a
symmetric matrix, and its memory must be given back. Entries as in the library's reference, section "pardiso
iparm Parameter"; O. Schenk, K. Gaertner, Future Gener. Comput. Syst. 20 (2004) 475-487 for the method.
"""

from __future__ import annotations

import ctypes
import functools
import importlib.util
from typing import Any

import numpy as np
import scipy.sparse as sparse
from numpy.typing import NDArray

from vib.solve.backends.interface import Array, Factor, FactorError, check_memory

SYMMETRIC, DEFINITE, GENERAL = -2, 2, 11
ANALYSE, NUMBERS, SOLVE, RELEASE = 11, 22, 33, -1
FAULTS = {
    -2: "not enough memory",
    -3: "the reordering failed",
    -4: "a pivot is zero, or negative where the matrix was said to be positive definite",
    -7: "the diagonal is singular",
    -8: "the factor needs 64-bit indices",
    -9: "not enough memory for the factor outside core",
}


def installed() -> bool:
    """Whether the optional package is there; does not import it."""
    return importlib.util.find_spec("pypardiso") is not None


@functools.cache
def _library() -> Any:
    """The function ``pardiso`` with argument types of ours.

    Raises
    ------
    FactorError
        The package is not there or its library can't be loaded.
    """
    try:
        from pypardiso import PyPardisoSolver

        library = PyPardisoSolver().libmkl
    except (ImportError, OSError) as error:
        raise FactorError(f"PARDISO: the library could not be loaded ({error}).") from error
    call = library["pardiso"]  # by name, not as attribute: a function object of our own
    call.restype = None
    return call


class Pardiso(Factor):
    """LDL' of a symmetric matrix from its upper triangle (LL' if ``definite``), LU of a general one.

    ``matching`` lets the symmetric factorisation move and scale large entries next to the diagonal first
    (O. Schenk, K. Gaertner, Electron. Trans. Numer. Anal. 23 (2006) 158-179); slower, for hard matrices.
    """

    backend = "PARDISO"

    def __init__(
        self, matrix: sparse.csr_array, *, symmetric: bool, definite: bool = False, matching: bool = False
    ) -> None:
        """Factorise; see `Factor`."""
        self._kind = (DEFINITE if definite else SYMMETRIC) if symmetric else GENERAL
        self._matching = matching or not symmetric
        self._handle = np.zeros(64, dtype=np.int64)
        self._entries = np.zeros(64, dtype=np.int32)
        self._alive = False
        super().__init__(matrix, symmetric=symmetric)

    def __del__(self) -> None:
        self.release()

    def release(self) -> None:
        """Give the memory of the factor back."""
        if getattr(self, "_alive", False):
            self._alive = False
            self._call(RELEASE)

    def _take(self, matrix: sparse.csr_array) -> None:
        if max(matrix.nnz, self.size) > np.iinfo(np.int32).max:
            raise FactorError("PARDISO: the matrix has more entries than a 32-bit index can count.")
        if not matrix.has_sorted_indices:
            matrix = matrix.sorted_indices()
        super()._take(matrix)
        self._rows = np.ascontiguousarray(self._matrix.indptr, dtype=np.int32)
        self._columns = np.ascontiguousarray(self._matrix.indices, dtype=np.int32)

    def _analyse(self) -> None:
        self._set_entries()
        self._alive = True
        self._call(ANALYSE)
        at_start, to_stay, numbers = (1024.0 * int(kilobytes) for kilobytes in self._entries[14:17])
        check_memory(self.backend, max(at_start, to_stay + numbers))

    def _numbers(self) -> None:
        if not self._alive:
            raise FactorError("This factorisation was released.")
        self._call(NUMBERS)
        entries = self._entries
        perturbed = int(entries[13])
        self.negative = {SYMMETRIC: int(entries[22]), DEFINITE: 0}.get(self._kind)
        if self._kind == SYMMETRIC and entries[21] + entries[22] != self.size:
            self.negative = None  # some pivots were neither positive nor negative
        self.smallest_pivot = 0.0 if perturbed else None
        self.nonzeros = int(entries[17])
        self.memory_bytes = 1024 * (int(entries[15]) + int(entries[16]))

    def _solve(self, right: Array) -> Array:
        if not self._alive:
            raise FactorError("This factorisation was released.")
        given = np.asfortranarray(right)
        solution = np.empty_like(given)
        self._call(SOLVE, given, solution)
        return solution

    def _set_entries(self) -> None:
        """All entries of iparm, counted here from 0 (the reference counts from 1)."""
        entries = self._entries
        entries[:] = (
            0  # out: statistics, refinement inside (ours is checked), conjugates, partial solves, ...
        )
        entries[0] = 1  # take our entries, no defaults
        entries[1] = 2  # nested dissection
        entries[9] = 13 if self._kind == GENERAL else 14  # pivots below 1e-14 times the norm are replaced
        entries[10] = entries[12] = int(self._matching)  # scaling and weighted matching
        entries[17] = -1  # report the size of the factor
        entries[20] = 1  # pivots of one row or two, by Bunch and Kaufman
        entries[23] = 0 if self._matching else 1  # two-level parallel factorisation
        entries[34] = 1  # indices count from 0

    def _call(self, phase: int, right: Array | None = None, solution: Array | None = None) -> None:
        fault = ctypes.c_int32(0)
        columns = 1 if right is None else right.shape[1]
        _library()(
            _address(self._handle),
            *map(_number, (1, 1, self._kind, phase, self.size)),
            _address(self._matrix.data),
            _address(self._rows),
            _address(self._columns),
            None,
            _number(columns),
            _address(self._entries),
            _number(0),
            _address(right),
            _address(solution),
            ctypes.byref(fault),
        )
        if fault.value and phase != RELEASE:
            reason = FAULTS.get(fault.value, f"error {fault.value}")
            raise FactorError(f"{self.backend}: {reason}.")


def _number(value: int) -> Any:
    return ctypes.byref(ctypes.c_int32(value))


def _address(array: NDArray[Any] | None) -> Any:
    return None if array is None else array.ctypes.data_as(ctypes.c_void_p)
