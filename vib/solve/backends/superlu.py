"""Factorisation by the SuperLU of SciPy: always there, for symmetric and general matrices.

Symmetric matrices are ordered by minimum degree on the pattern of A + A' and factorised without leaving the
diagonal (J. W. Demmel, S. C. Eisenstat, J. R. Gilbert, X. S. Li, J. W. H. Liu, SIAM J. Matrix Anal. Appl. 20
(1999) 720-755), which keeps the symmetry and so tells the inertia; where that loses accuracy, pivots are
chosen by size and the inertia is not known.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import scipy.sparse as sparse
import scipy.sparse.linalg as sparse_linalg

from vib.solve.backends.interface import Array, Factor, FactorError


class SuperLU(Factor):
    """LU = P A Q; without exchange of rows where the matrix is symmetric and ``pivoting`` is False."""

    backend = "SuperLU"

    _factor: Any = None

    def __init__(self, matrix: sparse.csr_array, *, symmetric: bool, pivoting: bool = False) -> None:
        """Factorise; see `Factor`."""
        self._pivoting = pivoting or not symmetric
        super().__init__(matrix, symmetric=symmetric)

    def release(self) -> None:
        """Give the memory of the factor back."""
        self._factor = None

    def _analyse(self) -> None:
        self._factor = None  # the library orders and factorises in one call

    def _numbers(self) -> None:
        self._factor = None
        whole = self._matrix
        if self.symmetric:
            whole = whole + sparse.triu(whole, k=1).T
        options = (
            {"permc_spec": "COLAMD"}
            if self._pivoting
            else {
                "permc_spec": "MMD_AT_PLUS_A",
                "diag_pivot_thresh": 0.0,
                "options": {"SymmetricMode": True},
            }
        )
        try:
            made = sparse_linalg.splu(sparse.csc_array(whole), **options)
        except RuntimeError as error:  # "Factor is exactly singular"
            raise FactorError(f"{self.backend}: {error}.") from error
        self._factor = made
        pivots = made.U.diagonal()
        on_diagonal = np.array_equal(made.perm_r, made.perm_c)
        self.negative = int((pivots < 0).sum()) if self.symmetric and on_diagonal else None
        self.smallest_pivot = float(np.abs(pivots).min())
        self.nonzeros = int(made.nnz)
        self.memory_bytes = 12 * self.nonzeros

    def _solve(self, right: Array) -> Array:
        if self._factor is None:
            raise FactorError("This factorisation was released.")
        return np.asarray(self._factor.solve(np.asfortranarray(right)))
