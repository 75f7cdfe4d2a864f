"""A block Krylov basis of inv(K - shift M) M, orthonormal in the mass inner product, bounded in memory.

Block Lanczos with full reorthogonalisation (R. G. Grimes, J. G. Lewis, H. D. Simon, SIAM J. Matrix Anal.
Appl. 15 (1994) 228-272) and thick restart (K. Wu, H. Simon, SIAM J. Matrix Anal. Appl. 22 (2000) 602-616).
The projected matrix is kept whole, so blocks may shrink where columns depend on each other and grow where new
directions are added, and a restart needs no special case.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.linalg
from numpy.typing import NDArray

from vib.solve.backends.interface import Array, Matrix
from vib.solve.pencil import Pencil

TINY = float(np.finfo(float).tiny)

# Columns whose part outside the basis is below this share of what they were are taken as dependent: after
# cancellation to that degree nothing but round-off would be left of them.
DEPENDENT = 1e-10
# Columns are freed of the basis until a pass subtracts no more than this share of what was left of them;
# mostly twice is enough (B. N. Parlett, The Symmetric Eigenvalue Problem, SIAM 1998, section 6.9).
SLIGHT = 1e-12
# What the recurrence has been subtracted from is free at once where it holds no more than this of the basis.
NOTHING = 1e-14
MOST_PASSES = 4
# The basis of a block whose columns are this far from depending on each other needs no second turn.
SAFE = 1e-2
CROWDED = 1e-5
# Rows handled at a time where the basis is turned in place.
CHUNK = 8192


@dataclass(frozen=True, eq=False)
class Ritz:
    """Approximations from the basis: eigenvalues ``theta`` (e,) = 1 / (value - shift) of the operator.

    ``weights`` (e, e) combine the basis; ``residuals`` (e,) are the mass norms of operator y - theta y.
    """

    theta: Array
    weights: Array
    residuals: Array


class Krylov:
    """The basis V (n, k), its last block not yet multiplied by the operator, and V' M operator V."""

    def __init__(self, pencil: Pencil, shift: float, *, block: int, capacity: int) -> None:
        """Start with ``block`` random directions, always the same, in a basis of ``capacity`` columns."""
        self._pencil, self._shift = pencil, shift
        self._basis = np.empty((pencil.size, capacity), order="F")
        self._projected = np.zeros((capacity, capacity))
        self._random = np.random.default_rng(20240229)
        self.done = self.used = 0
        self._nothing_new = False
        self._waiting = np.zeros((pencil.size, 0))
        self.add_random(block)

    @property
    def basis(self) -> Array:
        """The basis (n, used), the waiting block included; a view."""
        return self._basis[:, : self.used]

    @property
    def full(self) -> bool:
        """Whether another step might find no room."""
        return 2 * self.used - self.done > self._basis.shape[1]

    @property
    def exhausted(self) -> bool:
        """Whether the operator leads nowhere out of the basis."""
        return self.used == self.done

    @property
    def spanned(self) -> bool:
        """Whether fresh directions were tried and the basis holds them all: there are no other modes."""
        return self.exhausted and self._nothing_new

    def begin_anew(self, ritz: Ritz, kept: NDArray[np.intp], columns: int) -> None:
        """Start over from the approximations of the given numbers and about ``columns`` fresh directions."""
        half = self._basis.shape[1] // 2
        columns = min(columns, half // 2)
        self.restart(ritz, kept[: half - columns])
        self.used, self.done = self.done, 0
        self._projected[:] = 0.0
        self._waiting = self._pencil.mass @ self.basis
        self.add_random(columns)

    def add_random(self, columns: int) -> None:
        """Append fresh directions to the waiting block."""
        force = self._pencil.mass @ self._random.standard_normal((self._pencil.size, columns))
        # one multiplication by the operator leaves no motion without mass in them
        before = self.used
        self._append(self._pencil.factorise(self._shift).solve(force), known=before)
        self._nothing_new = self.used == before

    def step(self) -> None:
        """Multiply the waiting block by the operator and take what is new in it as the next block."""
        first, last = self.done, self.used
        image = self._pencil.factorise(self._shift).solve(self._waiting)
        # what the recurrence says of it is subtracted before the first product with the mass
        expected = self._projected[:last, first:last].copy()
        corner = self._waiting.T @ image
        expected[first:] = (corner + corner.T) / 2
        coupled = np.flatnonzero(expected.any(axis=1))[:1]
        lead = slice(int(coupled[0]) if coupled.size else last, last)
        image -= self._basis[:, lead] @ expected[lead]
        self.done = last
        self._waiting = np.zeros((self._pencil.size, 0))
        self._append(image, known=last, came_from=(first, last), expected=expected)

    def ritz(self) -> Ritz:
        """Approximations from the part of the basis that the operator was applied to."""
        done = self.done
        theta, weights = scipy.linalg.eigh(self._projected[:done, :done])
        left = np.linalg.norm(self._projected[done : self.used, :done] @ weights, axis=0)
        return Ritz(theta, weights, left)

    def vectors(self, ritz: Ritz, chosen: NDArray[np.intp]) -> Array:
        """The approximations of the given numbers (n, c), each multiplied by the operator once more for free.

        That purifies them of motions without mass (B. Nour-Omid, B. N. Parlett, T. Ericsson, P. S. Jensen,
        Math. Comp. 48 (1987) 663-673).
        """
        weights = ritz.weights[:, chosen]
        beyond = self._projected[self.done : self.used, : self.done] @ weights / ritz.theta[chosen]
        return np.asarray(self.basis @ np.vstack([weights, beyond]))

    def restart(self, ritz: Ritz, kept: NDArray[np.intp]) -> None:
        """Shrink the basis to the approximations of the given numbers and the waiting block."""
        weights, count = ritz.weights[:, kept], len(kept)
        done, used = self.done, self.used
        for start in range(0, len(self._basis), CHUNK):
            rows = slice(start, start + CHUNK)
            self._basis[rows, :count] = self._basis[rows, :done] @ weights
        wide = used - done
        self._basis[:, count : count + wide] = self._basis[:, done:used]
        link = self._projected[done:used, :done] @ weights
        self._projected[:] = 0.0
        self._projected[np.arange(count), np.arange(count)] = ritz.theta[kept]
        self._projected[count : count + wide, :count] = link
        self._projected[:count, count : count + wide] = link.T
        self.done, self.used = count, count + wide

    def _append(
        self,
        image: Array,
        known: int,
        came_from: tuple[int, int] | None = None,
        expected: Array | None = None,
    ) -> None:
        """Orthogonalise ``image`` (n, b) against the basis, append what is new, note the projections.

        ``expected`` (known, b) are projections that have been subtracted already.
        """
        mass, basis = self._pencil.mass, self._basis[:, :known]
        weighted = mass @ image
        left = np.einsum("ij,ij->j", image, weighted)
        shares = np.zeros((known, image.shape[1])) if expected is None else expected
        before = left + np.einsum("ij,ij->j", shares, shares)
        for again in range(MOST_PASSES):
            share = basis.T @ weighted
            image -= basis @ share
            shares = shares + share
            sizes = np.sqrt(np.maximum(left, np.maximum(DEPENDENT**2 * before, TINY)))
            slight = SLIGHT if again else NOTHING
            if (again or expected is not None) and np.abs(share / sizes).max(initial=0.0) <= slight:
                break  # nothing but round-off was left to subtract: the product with the mass still holds
            weighted = mass @ image
            left = np.einsum("ij,ij->j", image, weighted)
        fresh, ready = _orthonormal(image, weighted, before, mass)
        last = known + fresh.shape[1]
        self._basis[:, known:last] = fresh
        if came_from is not None:
            columns = slice(*came_from)
            self._projected[:known, columns] = shares
            self._projected[columns, :known] = shares.T
            corner = self._projected[columns, columns]
            self._projected[columns, columns] = (corner + corner.T) / 2
            link = fresh.T @ weighted
            self._projected[known:last, columns] = link
            self._projected[columns, known:last] = link.T
        self.used = last
        self._waiting = np.hstack([self._waiting, ready])


def _orthonormal(image: Array, weighted: Array, before: Array, mass: Matrix) -> tuple[Array, Array]:
    """Mass-orthonormal columns that span ``image`` (n, b), and their product with the mass matrix."""
    for _ in range(3):
        if image.shape[1] == 0:
            break
        gram = image.T @ weighted
        gram = (gram + gram.T) / 2
        norms = np.diag(gram)
        kept = norms > DEPENDENT**2 * before
        scale = 1 / np.sqrt(norms[kept])
        values, vectors = scipy.linalg.eigh(scale[:, None] * gram[np.ix_(kept, kept)] * scale)
        independent = values > 1e-12
        turn = scale[:, None] * vectors[:, independent] / np.sqrt(values[independent])
        image, weighted = image[:, kept] @ turn, weighted[:, kept] @ turn
        before = np.ones(image.shape[1])
        smallest = values[independent].min(initial=1.0)
        if smallest > SAFE:
            break
        if smallest < CROWDED:  # the turn has magnified what round-off left between the two
            weighted = mass @ image
    return image, weighted
