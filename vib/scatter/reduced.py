"""Small matrices of many samples at once: undamped modes, and how far they are off.

Each matrix of the family acts on a basis V (n, r) once and for all. Its product is kept in two parts:
projected on V, and seen by s random vectors, which tell the size of the residual of the full problem.

The basis holds shapes of undamped modes, so that Ritz values lie above the true ones, by the squared residual
in the norm of the inverse stiffness as long as what is missing lies well above them (reduced bases for
symmetric eigenproblems: L. Machiels, Y. Maday, I. B. Oliveira, A. T. Patera, D. V. Rovas, C. R. Acad. Sci.
Paris I 331 (2000) 153-158; from memory). That norm is estimated by products with vectors whose covariance is
the inverse stiffness (K. Smetana, O. Zahm, A. T. Patera, SIAM J. Sci. Comput. 41 (2019) A900-A926; from
memory).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from vib.system import Array, Matrix

ROUND_OFF = 16 * float(np.finfo(float).eps)
NEGLIGIBLE = 1e-13  # part of the largest combination of terms below which another one is round-off


@dataclass(frozen=True, eq=False)
class Projected:
    """A matrix X(p) = sum of t terms as [V W]' X(p) V for a basis V (n, r) and random vectors W (n, s).

    ``mix`` (t, a) combines the coefficients of the terms, ``stack`` (a, r + s, r) holds the products.
    """

    mix: Array
    stack: Array

    @classmethod
    def of(cls, terms: tuple[Matrix | None, ...], basis: Array, left: Array) -> Projected | None:
        """The terms (n, n) as seen from the columns of ``left``; None where there are none at all.

        Terms that depend on each other linearly are combined, so that fewer are left.
        """
        found = {number: left.T @ (term @ basis) for number, term in enumerate(terms) if term is not None}
        if not found:
            return None
        there, products = list(found), np.array(list(found.values()))
        rows = products.reshape(len(there), -1)
        size = np.linalg.norm(rows, axis=1)
        size = np.where(size > 0, size, 1.0)
        turn, values, across = np.linalg.svd(rows / size[:, None], full_matrices=False)
        kept = values > NEGLIGIBLE * values[0]
        mix = np.zeros((len(terms), int(kept.sum())))
        mix[there] = size[:, None] * turn[:, kept] * values[kept]
        return cls(mix, across[kept].reshape(-1, *products.shape[1:]))

    def at(self, coefficients: Array) -> Array:
        """The products (N, r + s, r) for coefficients (N, t)."""
        count, rows, columns = self.stack.shape
        flat = (coefficients @ self.mix) @ self.stack.reshape(count, -1)
        return np.asarray(flat.reshape(len(coefficients), rows, columns))


@dataclass(frozen=True, eq=False)
class Solved:
    """Undamped modes of N samples in the coordinates of the basis.

    ``squares`` (N, r) squared angular frequencies, ascending; ``shapes`` (N, r, r) of unit modal mass as
    columns; ``excess`` (N, k) by how much the lowest k squares are too large, estimated; ``regular`` (N,)
    whether the mass could be factored.
    """

    squares: Array
    shapes: Array
    excess: Array
    regular: NDArray[np.bool_]


def solve(stiffness: Array, mass: Array, count: int, rigid: int) -> Solved:
    """Modes of samples from products (N, r + s, r) of `Projected`, and residuals of the lowest ``count``.

    The squares of the lowest ``rigid`` are known to be zero.
    """
    rank = stiffness.shape[2]
    factor, regular = _factor(mass[:, :rank])
    inverse = inverted(factor)
    turned = np.swapaxes(inverse, 1, 2)
    squares, vectors = np.linalg.eigh(inverse @ stiffness[:, :rank] @ turned)  # reads one triangle
    squares[:, :rigid] = 0.0
    shapes = turned @ vectors
    lowest = shapes[:, :, :count]
    seen = stiffness[:, rank:] @ lowest - (mass[:, rank:] @ lowest) * squares[:, None, :count]
    # beside the residual, round-off of the size of the largest value
    excess = np.einsum("nsk,nsk->nk", seen, seen) + ROUND_OFF * squares[:, -1:]
    return Solved(squares, shapes, excess, regular)


def _factor(mass: Array) -> tuple[Array, NDArray[np.bool_]]:
    """Cholesky factors (N, r, r), and which there are; the identity stands for the others."""
    try:
        return np.asarray(np.linalg.cholesky(mass)), np.ones(len(mass), dtype=bool)
    except np.linalg.LinAlgError:
        regular = np.asarray(np.linalg.eigvalsh(mass)[:, 0] > 0)
        safe = np.where(regular[:, None, None], mass, np.eye(mass.shape[1]))
        return np.asarray(np.linalg.cholesky(safe)), regular


def inverted(lower: Array) -> Array:
    """Inverses of lower triangular matrices (N, r, r), by halves: faster than a general inverse of each."""
    rank = lower.shape[1]
    if rank <= 12:
        return np.asarray(np.linalg.inv(lower))
    half = rank // 2
    found = np.zeros_like(lower)
    first, last = inverted(lower[:, :half, :half]), inverted(lower[:, half:, half:])
    found[:, :half, :half], found[:, half:, half:] = first, last
    found[:, half:, :half] = -last @ (lower[:, half:, :half] @ first)
    return found


def clustered(values: Array, errors: Array) -> Array:
    """Errors (N, k) of values (N, k) with those of neighbours that lie no farther than both errors.

    Values so close may share their errors in any way.
    """
    near = np.abs(values[:, :, None] - values[:, None, :]) <= 2 * (errors[:, :, None] + errors[:, None, :])
    return np.asarray(np.einsum("nij,nj->ni", near, errors))
