"""What a sparse factorisation gives, whichever library did it: checked solutions and the inertia."""

from __future__ import annotations

from abc import ABC, abstractmethod
from types import TracebackType
from typing import Any, Self

import numpy as np
import scipy.sparse as sparse
from numpy.typing import NDArray

from vib.errors import AccuracyError

Array = NDArray[np.float64]
Matrix = Any
EPS = float(np.finfo(float).eps)

# Normwise backward error (N. J. Higham, Accuracy and Stability of Numerical Algorithms, 2nd ed., SIAM 2002,
# theorem 7.1) of the two test solutions: above ENOUGH a step of iterative refinement is added to every
# solution, above TOLERATED after MOST_REFINEMENTS steps the factorisation is refused.
ENOUGH = 1e-13
TOLERATED = 1e-11
MOST_REFINEMENTS = 3


class FactorError(AccuracyError):
    """A factorisation that failed, or whose solutions do not satisfy the equations."""


class TooLargeError(FactorError):
    """A factorisation that would not fit into the memory at hand; no other library would do with less."""


def check_memory(backend: str, needed: float) -> None:
    """Raise TooLargeError where ``needed`` bytes are more than the machine has free."""
    try:
        with open("/proc/meminfo", encoding="ascii") as listing:
            told = dict(line.split(":", 1) for line in listing)
        free = 1024.0 * float(told["MemAvailable"].split()[0])
    except (OSError, KeyError):  # not told on this system
        return
    if needed > free:
        raise TooLargeError(
            f"{backend}: the factorisation needs about {needed / 1e9:.1f} GB of memory, {free / 1e9:.1f} GB "
            "are free; use a coarser mesh or a machine with more memory."
        )


class Factor(ABC):
    """A factorisation of one real matrix, its freedoms scaled to a diagonal of about 1 beforehand.

    The scaling uses powers of two, so it rounds nothing; "a small pivot" then means the same in every unit.
    Memory outside Python is given back by `release` or at the end of a ``with`` block.

    Attributes
    ----------
    backend
        Plain name of the library that did the work.
    size
        Number of equations.
    negative
        How many eigenvalues of a symmetric matrix are negative; None where the method does not tell.
    smallest_pivot
        Magnitude of the smallest pivot of the scaled matrix; near round-off for a singular one; None where
        the method does not tell.
    backward_error
        Largest normwise backward error of two test solutions, after refinement.
    nonzeros, memory_bytes
        Size of the factor.
    """

    backend: str
    symmetric: bool
    negative: int | None = None
    smallest_pivot: float | None = None
    backward_error: float = np.inf
    nonzeros: int = 0
    memory_bytes: int = 0
    refinements: int = 0

    def __init__(self, matrix: Matrix, *, symmetric: bool) -> None:
        """Factorise ``matrix`` (n, n): for a symmetric one, its upper triangle with every diagonal entry."""
        self.symmetric = symmetric
        self.size = int(matrix.shape[0])
        self._take(matrix)
        try:
            self._analyse()
            self._numbers()
            self._check()
        except BaseException:
            self.release()
            raise

    def replace(self, matrix: Matrix) -> None:
        """Factorise another matrix of the same pattern in the same memory; its ordering is kept.

        Raises
        ------
        FactorError
            The pattern differs, or the factorisation failed; the object then holds no factor any more.
        """
        before = self._matrix
        same = matrix.indices is before.indices or np.array_equal(matrix.indices, before.indices)
        if not (same and np.array_equal(matrix.indptr, before.indptr)):
            raise FactorError(
                "replace: the pattern of the new matrix differs from the one that was analysed."
            )
        self._take(matrix)
        self._numbers()
        self._check()

    def solve(self, right: Array) -> Array:
        """Solutions x of matrix x = right, for one (n,) or many (n, k) right-hand sides at once."""
        columns = np.asarray(right, dtype=np.float64)
        wide = columns.reshape(self.size, -1)
        solution = self._scaled_solve(wide)
        for _ in range(self.refinements):
            solution += self._scaled_solve(wide - self._product(solution))
        return np.asarray(solution).reshape(columns.shape)

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.release()

    @abstractmethod
    def release(self) -> None:
        """Give the memory of the factor back; the object is of no use afterwards."""

    @abstractmethod
    def _analyse(self) -> None:
        """Order the equations of ``self._matrix``; only the pattern counts."""

    @abstractmethod
    def _numbers(self) -> None:
        """Factorise ``self._matrix`` in the order found; set ``negative``, ``smallest_pivot``, sizes."""

    @abstractmethod
    def _solve(self, right: Array) -> Array:
        """Solve with the scaled matrix; (n, k) to (n, k)."""

    def _take(self, matrix: Matrix) -> None:
        diagonal = np.abs(np.asarray(matrix.diagonal()))
        counts = np.diff(matrix.indptr)
        if (diagonal == 0).any():
            rows = np.repeat(np.arange(self.size), counts)
            largest = np.zeros(self.size)
            np.maximum.at(largest, rows, np.abs(matrix.data))
            np.maximum.at(largest, matrix.indices, np.abs(matrix.data))
            diagonal = np.where(diagonal > 0, diagonal, largest)
        if not np.isfinite(diagonal).all() or (diagonal == 0).any():
            raise FactorError("The matrix has a row of zeros, or an entry that is not a finite number.")
        self._scale = np.exp2(-np.round(np.log2(diagonal) / 2))
        data = matrix.data * self._scale[matrix.indices]
        data *= np.repeat(self._scale, counts)
        self._matrix = sparse.csr_array((data, matrix.indices, matrix.indptr), shape=matrix.shape)

    def _scaled_solve(self, right: Array) -> Array:
        solution = self._solve(self._scale[:, None] * right)
        solution *= self._scale[:, None]
        return np.asarray(solution)

    def _scaled_product(self, vectors: Array) -> Array:
        product = self._matrix @ vectors
        if self.symmetric:
            product += self._matrix.T @ vectors
            product -= self._matrix.diagonal()[:, None] * vectors
        return np.asarray(product)

    def _product(self, vectors: Array) -> Array:
        product = self._scaled_product(vectors / self._scale[:, None])
        return np.asarray(product / self._scale[:, None])

    def _check(self) -> None:
        """Solve for two right-hand sides, refine until they are right; refuse the factor if they stay off."""
        ramp = np.arange(self.size) / self.size
        right = np.stack([np.cos(1e3 * ramp) + 0.5, np.sin(7e5 * ramp**2)], axis=1)
        sizes = (np.abs(self._matrix.data), self._matrix.indices, self._matrix.indptr)
        sums = sparse.csr_array(sizes, shape=self._matrix.shape) @ np.ones(self.size)
        largest = sums.max() * (2 if self.symmetric else 1)  # the norm, or half of it, or twice
        solution = self._solve(right)
        self.refinements = 0
        while True:
            rest = right - self._scaled_product(solution)
            allowed = largest * np.abs(solution).max(axis=0) + np.abs(right).max(axis=0)
            worst = (np.abs(rest).max(axis=0) / allowed).max()
            self.backward_error = float(worst) if np.isfinite(worst) else np.inf
            if self.backward_error <= ENOUGH or self.refinements == MOST_REFINEMENTS:
                break
            self.refinements += 1
            solution = solution + self._solve(rest)
        if self.backward_error > TOLERATED:
            raise FactorError(
                f"{self.backend}: the solutions do not satisfy the equations (backward error "
                f"{self.backward_error:.1e}, {TOLERATED:.0e} allowed)."
            )
