"""The pencil K - shift M of large sparse matrices, ready to be factorised at one shift after another."""

from __future__ import annotations

from contextlib import ExitStack

import numpy as np
import scipy.sparse as sparse
from numpy.typing import NDArray

from vib.solve.backends.choice import factor, one_pool, upper_triangle
from vib.solve.backends.interface import Array, Factor, Matrix
from vib.solve.undamped import CANCELLATION, EPS, elastic_ratio, stores_nothing


class Pencil:
    """K - shift M, its upper triangle on one pattern, and at most one factorisation of it at a time.

    Use it in a ``with`` block; leaving the block, also by an error or an interruption, gives the memory of
    the factorisation back.
    """

    def __init__(self, mass: Matrix, stiffness: Matrix, backend: str | None = None) -> None:
        """Take symmetric sparse matrices (n, n); ``backend`` as in `vib.solve.backends.choice.factor`."""
        self.mass, self.stiffness = _plain(mass), sparse.csr_array(stiffness)
        self.size = int(self.mass.shape[0])
        both = _both(self.stiffness, self.mass)
        self._pattern = (both.indices, both.indptr)
        self._stiff, self._massive = both.data.real.copy(), both.data.imag.copy()
        self._backend = backend
        self._threads = ExitStack()
        self._factor: Factor | None = None
        self._row_sums: Array | None = None
        self.shift = np.nan

    def __enter__(self) -> Pencil:
        self._threads.enter_context(one_pool(self.size, self._backend))
        return self

    def __exit__(self, *_: object) -> None:
        self.release()
        self._threads.close()

    def release(self) -> None:
        """Give the memory of the factorisation back."""
        if self._factor is not None:
            self._factor.release()
            self._factor = None

    def factorise(self, shift: float) -> Factor:
        """K - shift M factorised; the one before it is gone.

        Raises
        ------
        FactorError
            See `vib.solve.backends.choice.factor`; K - shift M may be singular.
        """
        if self._factor is not None and shift == self.shift:
            return self._factor
        matrix = sparse.csr_array(
            (self._stiff - shift * self._massive, *self._pattern), shape=(self.size,) * 2
        )
        matrix.has_sorted_indices = True
        before, self._factor = self._factor, None
        if before is not None:
            try:
                before.replace(matrix)
            except BaseException as error:
                before.release()
                before = None
                if not isinstance(error, ValueError):
                    raise
        self._factor = before or factor(matrix, symmetric=True, upper_only=True, backend=self._backend)
        self.shift = shift
        return self._factor

    def energy_terms(self, shapes: Array) -> tuple[Array, Array]:
        """Bounds of |x|' |K| |x| and |x|' |M| |x| (m,), the terms that cancel in energies of shapes (n, m).

        By |x_i x_j| <= (x_i^2 + x_j^2) / 2 they are at most the squares weighted with sums of the rows.
        """
        if self._row_sums is None:
            self._row_sums = np.stack([_row_sums(self.stiffness), _row_sums(self.mass)])
        stiff, massive = self._row_sums @ shapes**2
        return stiff, massive

    def rigid(self, shapes: Array, energy: Array) -> NDArray[np.bool_]:
        """Which shapes (n, m), of elastic energies x' K x (m,), are rigid-body motions."""
        found = stores_nothing(energy, self.energy_terms(shapes)[0])
        if found.any():  # a closer look, which costs more
            found[found] = stores_nothing(*elastic_ratio(self.stiffness, shapes[:, found]))
        # Shapes are mixed with each other by round-off; energy of that order is none of their own.
        mixed = (CANCELLATION * EPS) ** 2 * self.highest_ratio()
        return np.asarray(found | (np.abs(energy) <= mixed))

    def highest_ratio(self) -> float:
        """Largest ratio of diagonal stiffness to diagonal mass: about the highest eigenvalue there is."""
        mass, stiffness = self.mass.diagonal(), np.abs(self.stiffness.diagonal())
        moving = mass > 0
        return float((stiffness[moving] / mass[moving]).max()) if moving.any() else 0.0


def _row_sums(matrix: sparse.csr_array) -> Array:
    """Sums of the magnitudes of each row."""
    sizes = sparse.csr_array((np.abs(matrix.data), matrix.indices, matrix.indptr), shape=matrix.shape)
    return np.asarray(sizes @ np.ones(matrix.shape[1]))


def _plain(matrix: Matrix) -> sparse.csr_array:
    """As CSR without stored zeros (a copy only where there are any)."""
    listed = sparse.csr_array(matrix)
    if (listed.data == 0).any():
        listed = listed.copy()
        listed.eliminate_zeros()
    listed.sort_indices()
    return listed


def _both(stiffness: sparse.csr_array, mass: sparse.csr_array) -> sparse.csr_array:
    """Upper triangles in one complex matrix, stiffness real, mass imaginary: the union of their patterns."""
    heavy = upper_triangle(mass)
    weights: NDArray[np.complex128] = 1j * heavy.data
    merged = upper_triangle(stiffness) + sparse.csr_array(
        (weights, heavy.indices, heavy.indptr), shape=heavy.shape
    )
    return upper_triangle(merged)
