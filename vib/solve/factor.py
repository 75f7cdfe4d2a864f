"""One factorisation of a symmetric matrix: solves with it and counts its negative eigenvalues.

The matrix is scaled to a unit diagonal first. Sparse ones are factored by SuperLU in symmetric mode (minimum
degree ordering of A' + A, pivots left on the diagonal); where that is not accurate, with row pivoting, which
loses the count. Dense ones use the symmetric indefinite factorisation of Bunch and Kaufman.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
import scipy.linalg
import scipy.sparse as sparse
import scipy.sparse.linalg as sparse_linalg
from numpy.typing import NDArray

from vib.errors import AccuracyError
from vib.massless import root_scale

Array = NDArray[np.float64]
Matrix = Any

# A factorisation without row interchanges is kept if one solve with it leaves this relative residual; two
# steps of refinement then bring any solve to round-off.
TRUSTED = 1e-10
DENSE_LIMIT = 2500  # up to this size a sparse count that failed is redone with a dense factorisation


class SingularFactorError(AccuracyError):
    """The matrix has no inverse to working precision."""


@dataclass(frozen=True, eq=False)
class Factor:
    """Solves with a matrix; ``negatives`` its negative eigenvalues, None if not known.

    ``least_pivot`` is the smallest pivot of the matrix scaled to a unit diagonal.
    """

    matrix: Matrix
    scale: Array
    lower_upper: Any
    negatives: int | None
    least_pivot: float

    def solve(self, right: Array, *, transposed: bool = False) -> Array:
        """The solution of matrix x = right, (n,) or (n, m), with one step of refinement."""
        operator = self.matrix.T if transposed else self.matrix
        first = self._solve_once(right, transposed)
        return np.asarray(first + self._solve_once(right - operator @ first, transposed))

    def solve_once(self, right: Array, *, transposed: bool = False) -> Array:
        """The solution without refinement: enough inside an iteration that is checked at its end."""
        return self._solve_once(right, transposed)

    def _solve_once(self, right: Array, transposed: bool) -> Array:
        scale = self.scale if right.ndim == 1 else self.scale[:, None]
        weighted = np.ascontiguousarray(scale * right)
        if isinstance(self.lower_upper, tuple):
            found = scipy.linalg.lu_solve(
                self.lower_upper, weighted, trans=int(transposed), check_finite=False
            )
        else:
            found = self.lower_upper.solve(weighted, trans="T" if transposed else "N")
        return np.asarray(scale * found)


def factorise(matrix: Matrix, *, symmetric: bool = True) -> Factor:
    """Factor a square matrix, dense or sparse.

    Raises
    ------
    SingularFactorError
        No inverse to working precision.
    """
    scale = root_scale(_largest(matrix))
    if not sparse.issparse(matrix):
        return _dense_factor(matrix, scale, symmetric)
    scaled = _scaled(matrix, scale)
    if symmetric:
        kept = _super_lu(scaled, "diagonal")
        if kept is not None:
            pivots = kept.U.diagonal()
            if np.array_equal(kept.perm_r, kept.perm_c) and pivots.all() and _accurate(scaled, kept.solve):
                least = float(np.abs(pivots).min())
                return Factor(matrix, scale, kept, int((pivots < 0).sum()), least)
    moved = _super_lu(scaled, "rows")
    if moved is None or not _accurate(scaled, moved.solve):
        raise SingularFactorError("A matrix is singular to working precision and could not be factored.")
    return Factor(matrix, scale, moved, None, float(np.abs(moved.U.diagonal()).min()))


def negative_count(matrix: Matrix) -> int | None:
    """How many negative eigenvalues a symmetric matrix has (Sylvester's law); None if not known."""
    try:
        if sparse.issparse(matrix):
            counted = factorise(matrix).negatives
            if counted is not None or matrix.shape[0] > DENSE_LIMIT:
                return counted
            matrix = matrix.toarray()
        return _dense_negatives(matrix, root_scale(_largest(matrix)))
    except SingularFactorError:
        return None


def _largest(matrix: Matrix) -> Array:
    """The diagonal, with the largest of the row instead where it is zero."""
    diagonal: Array = np.abs(np.asarray(matrix.diagonal(), dtype=np.float64))
    if (diagonal > 0).all():
        return diagonal
    rows = abs(matrix).max(axis=1)
    largest = rows.toarray().ravel() if sparse.issparse(rows) else rows
    return np.asarray(np.where(diagonal > 0, diagonal, largest))


def _scaled(matrix: Matrix, scale: Array) -> Any:
    turned = sparse.csc_array(matrix, copy=True)
    turned.data *= scale[turned.indices] * np.repeat(scale, np.diff(turned.indptr))
    return turned


def _super_lu(scaled: Any, pivoting: Literal["diagonal", "rows"]) -> Any | None:
    try:
        if pivoting == "diagonal":
            return sparse_linalg.splu(
                scaled, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options={"SymmetricMode": True}
            )
        return sparse_linalg.splu(scaled, permc_spec="COLAMD")
    except RuntimeError:  # SuperLU: "Factor is exactly singular"
        return None


def _accurate(scaled: Any, solve: Any) -> bool:
    right = np.random.default_rng(20).standard_normal(scaled.shape[0])
    found = solve(right)
    size = float(np.abs(found).max())
    if not np.isfinite(size):
        return False
    return bool(np.abs(scaled @ found - right).max() <= TRUSTED * (size + np.abs(right).max()))


def _dense_factor(matrix: Array, scale: Array, symmetric: bool) -> Factor:
    scaled = scale[:, None] * matrix * scale
    lower_upper = scipy.linalg.lapack.dgetrf(scaled)
    if lower_upper[2] > 0:
        raise SingularFactorError("A matrix is singular to working precision and could not be factored.")
    negatives = _dense_negatives(matrix, scale) if symmetric else None
    least = float(np.abs(np.diag(lower_upper[0])).min())
    return Factor(matrix, scale, (lower_upper[0], lower_upper[1]), negatives, least)


def _dense_negatives(matrix: Array, scale: Array) -> int:
    blocks = scipy.linalg.ldl(scale[:, None] * matrix * scale, check_finite=False)[1]
    size, row, negatives = len(blocks), 0, 0
    while row < size:
        if row + 1 < size and blocks[row + 1, row] != 0:
            negatives += 1  # a 2 x 2 pivot of this factorisation always has one eigenvalue of each sign
            row += 2
        else:
            negatives += int(blocks[row, row] < 0)
            row += 1
    return negatives
