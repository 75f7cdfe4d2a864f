"""The state transition matrix Phi(t) = exp(A t), and the exact answer to an input that stays constant.

A `Propagator` is prepared once from A and evaluated at many times. It goes through the eigenvalues where
the eigenvector matrix is well conditioned and through `scipy.linalg.expm` where it is not (a defective
matrix has no eigenvector matrix at all), and says which of the two it used.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike

from vib.errors import AccuracyError, MatrixError, ShapeError
from vib.response.exponential import EPS, Array, Exponential, Numbers, balance

ACCURACY = 1e-12
# The error of V exp(diag t) V^-1 is about cond(V) eps times a modest factor: the rounding of the
# eigenvectors, of the inverse and of the two products. Random tests stay below 10.
_ROUNDING = 10.0
# Rounding A in its last digit alone moves exp(A t) by about eps |A| t; past this share nothing is left.
_PHASE_LIMIT = 1e-3
_CHUNK = 2_000_000  # numbers per piece of a stack, to bound the working memory


class Propagator:
    """Phi(t) = exp(A t) of one square matrix, prepared for many times.

    Parameters
    ----------
    matrix
        A, (n, n), real or complex, 1/s.
    accuracy
        Relative error wanted, in norm. The eigenvalues are used where the condition number of the matrix of
        unit eigenvectors of the balanced A is at most ``limit = accuracy / (10 eps)`` (and the eigenvectors
        found satisfy their equation, which is checked). Single times at which
        the terms of the sum cancel further than that (very short ones: Phi is then the identity and a little)
        are left to the matrix exponential.

    Attributes
    ----------
    method : str
        ``"eigenvalues"`` or ``"matrix exponential"``.
    condition : float
        Condition number (2-norm) of the eigenvectors; infinite where they are linearly dependent.
    limit : float
        The largest condition number at which the eigenvalues are used.
    eigenvalues : ndarray
        (n,) complex, 1/s.

    Raises
    ------
    ShapeError
        ``matrix`` is not square.
    MatrixError
        An entry is not finite.

    References
    ----------
    C. Moler, C. Van Loan, SIAM Review 45 (2003) 3-49, methods 14 (eigenvectors) and 3 (scaling and
    squaring), doi:10.1137/S00361445024180. `scipy.linalg.expm` follows A. H. Al-Mohy, N. J. Higham, SIAM J.
    Matrix Anal. Appl. 31 (2009) 970-989, doi:10.1137/09074721X.
    """

    def __init__(self, matrix: ArrayLike, *, accuracy: float = ACCURACY) -> None:
        self.matrix = _square(matrix)
        self.limit = accuracy / (_ROUNDING * EPS)
        balanced, scale = balance(self.matrix)
        values, vectors = np.linalg.eig(balanced)
        self.eigenvalues = values.astype(np.complex128)
        self._scale = scale
        self._balanced = Exponential(balanced, self.eigenvalues)
        self.condition = _condition(vectors)
        self._norm = self._balanced.norm
        # LAPACK scales once more inside, which on some matrices spoils the vectors: so they are checked
        rest = np.abs(balanced @ vectors - vectors * values).max(initial=0.0)
        usable = self.condition <= self.limit and self.condition * rest <= accuracy * self._norm
        self.method = "eigenvalues" if usable else "matrix exponential"
        if self.method == "eigenvalues":
            self._right = scale[:, None] * vectors
            self._left = np.linalg.inv(vectors) / scale

    @property
    def size(self) -> int:
        """How many states."""
        return int(self.matrix.shape[0])

    def __call__(self, t: ArrayLike) -> Numbers:
        """Phi(t): (n, n) for one time, (k, n, n) for k times in any order, seconds, also negative.

        Raises
        ------
        AccuracyError
            The response grows past the largest number, or the times are so long that rounding A alone
            would change the answer.
        """
        times = _times(t)
        self._check_reach(times)
        with np.errstate(over="ignore", invalid="ignore", under="ignore"):
            if self.method == "eigenvalues":
                phi = self._by_eigenvalues(times.ravel())
            else:
                phi = self._by_exponentials(times.ravel())
        self._check_finite(phi, times.ravel())
        shaped: Numbers = phi.reshape(*times.shape, self.size, self.size)
        return shaped

    def apply(self, start: ArrayLike, times: ArrayLike) -> Numbers:
        """Phi(t) start at k times: (k, n); ``start`` is (n,), the times are in any order.

        Never forms the k matrices; the same errors as a call.
        """
        vector = np.asarray(start, dtype=self.matrix.dtype)
        if vector.shape != (self.size,):
            raise ShapeError("start", expected=(self.size,), got=vector.shape, hint="One number per state.")
        at = _times(times).ravel()
        self._check_reach(at)
        with np.errstate(over="ignore", invalid="ignore", under="ignore"):
            if self.method == "eigenvalues":
                terms = np.exp(np.outer(at, self.eigenvalues)) * (self._left @ vector)
                found = self._real(terms @ self._right.T)
                size = np.abs(terms) @ np.abs(self._right).T
            else:
                found = self._balanced.apply(vector / self._scale, at)
                size = np.broadcast_to(_largest(found)[:, None] * self._scale.max(initial=1.0), found.shape)
                found = found * self._scale
            # only before anything has moved can a small answer be trusted to mean cancellation
            doubtful = (_largest(size) > self.limit * _largest(found)) & (np.abs(at) * self._norm < 1)
            if doubtful.any():
                found[doubtful] = self._unscaled.apply(vector, at[doubtful])
        self._check_finite(found, at)
        return found

    def _by_exponentials(self, times: Array) -> Numbers:
        balanced = self._balanced(times)
        phi: Numbers = (self._scale[:, None] / self._scale) * balanced
        ratio = self._scale.max(initial=1.0) / self._scale.min(initial=1.0)
        doubtful = ratio * _largest(balanced) > self.limit * _largest(phi)
        if doubtful.any():
            phi[doubtful] = self._unscaled(times[doubtful])
        return phi

    @cached_property
    def _unscaled(self) -> Exponential:
        # where the eigenvector sum cancels, it is the scaling that hides it, so this one goes without
        return Exponential(self.matrix, self.eigenvalues)

    def _growth(self, time: float) -> float:
        return self._balanced.growth(time)

    def _real(self, found: Numbers) -> Numbers:
        # the imaginary parts of conjugate pairs cancel to rounding
        kept: Numbers = found if np.iscomplexobj(self.matrix) else found.real
        return kept

    def _by_eigenvalues(self, times: Array) -> Numbers:
        phi = np.empty((times.size, self.size, self.size), self.matrix.dtype)
        step = max(1, _CHUNK // max(1, self.size**2))
        doubtful = np.zeros(times.size, bool)
        right_size, left_size = np.abs(self._right), np.abs(self._left)
        for first in range(0, times.size, step):
            piece = slice(first, first + step)
            growth = np.exp(np.multiply.outer(times[piece], self.eigenvalues))
            phi[piece] = self._real((self._right * growth[:, None, :]) @ self._left)
            terms = (right_size * np.abs(growth)[:, None, :]) @ left_size
            doubtful[piece] = _largest(terms) > self.limit * _largest(phi[piece])
        if doubtful.any():
            phi[doubtful] = self._unscaled(times[doubtful])
        return phi

    def _check_reach(self, times: Array) -> None:
        """Refuse times at which the last digit of A decides the answer."""
        longest = float(np.abs(times).max(initial=0.0))
        if not self.size or not longest:
            return
        rate = max(self._growth(1.0) * times.max(), self._growth(-1.0) * times.min())
        alive = math.exp(min(0.0, rate))
        if EPS * self._norm * longest * alive > _PHASE_LIMIT:
            raise AccuracyError(
                f"exp(A t): at t = {longest:.4g} s the last digits of A (norm {self._norm:.4g} per s) "
                f"decide the answer; ask for times below {_PHASE_LIMIT / (EPS * self._norm):.2g} s"
            )

    def _check_finite(self, found: Numbers, times: Array) -> None:
        if np.all(np.isfinite(found)):
            return
        bad = times[~np.isfinite(found).reshape(times.size, -1).all(axis=1)]
        worst = float(bad[np.argmin(np.abs(bad))])
        raise AccuracyError(
            f"exp(A t): the response leaves the range of numbers at t = {worst:.4g} s (an eigenvalue with "
            f"real part {self._growth(worst):.4g} per s makes it grow); ask for a shorter time"
        )


@dataclass(frozen=True, eq=False)
class ConstantInput:
    """x(t) = transition x(0) + input_effect u for an input u that stays constant from 0 to t."""

    transition: Numbers  # (n, n), or (k, n, n) for k times
    input_effect: Numbers  # (n, m), or (k, n, m)
    method: str
    condition: float


def transition(matrix: ArrayLike, t: ArrayLike, *, accuracy: float = ACCURACY) -> Numbers:
    """Phi(t) = exp(A t); for many calls with one A, or for the method used, see `Propagator`.

    Parameters
    ----------
    matrix
        A, (n, n), 1/s.
    t
        One time or k times, s; negative ones too.

    Returns
    -------
    ndarray
        (n, n) for one time, (k, n, n) for k times; real for a real A.

    Raises
    ------
    ShapeError, MatrixError, AccuracyError
        As `Propagator` and its call.

    Examples
    --------
    >>> transition([[0.0, 1.0], [0.0, 0.0]], 3.0)
    array([[1., 3.],
           [0., 1.]])
    """
    return Propagator(matrix, accuracy=accuracy)(t)


def constant_input(
    matrix: ArrayLike, input_matrix: ArrayLike, t: ArrayLike, *, accuracy: float = ACCURACY
) -> ConstantInput:
    """The exact answer of x' = A x + B u to a constant u, also where A is singular.

    Parameters
    ----------
    matrix, input_matrix
        A (n, n), 1/s, and B (n, m).
    t
        One time or k times, s.

    Raises
    ------
    ShapeError, MatrixError, AccuracyError
        As `Propagator` and its call; B must have n rows.

    References
    ----------
    C. F. Van Loan, IEEE Trans. Automatic Control 23 (1978) 395-404, doi:10.1109/TAC.1978.1101743: the
    exponential of the augmented matrix [[A, B], [0, 0]] t holds Phi(t) and the integral of Phi times B.
    """
    a, b = _square(matrix), np.asarray(input_matrix)
    n = a.shape[0]
    if b.ndim != 2 or b.shape[0] != n:
        raise ShapeError(
            "input matrix", expected=(n, b.shape[-1] if b.ndim else 1), got=b.shape, hint="One row per state."
        )
    m = b.shape[1]
    augmented = np.block([[a, b], [np.zeros((m, n + m))]])
    propagator = Propagator(augmented, accuracy=accuracy)
    phi = propagator(t)
    return ConstantInput(phi[..., :n, :n], phi[..., :n, n:], propagator.method, propagator.condition)


def _square(matrix: ArrayLike) -> Numbers:
    found = np.asarray(matrix)
    found = found.astype(np.complex128 if np.iscomplexobj(found) else np.float64)
    if found.ndim != 2 or found.shape[0] != found.shape[1]:
        n = found.shape[0] if found.ndim else 1
        raise ShapeError("A", expected=(n, n), got=found.shape, hint="The matrix must be square.")
    bad = np.argwhere(~np.isfinite(found))
    if bad.size:
        row, column = (int(i) + 1 for i in bad[0])
        raise MatrixError(
            f"A: row {row}, column {column} is {found[row - 1, column - 1]}, not a finite number"
        )
    return found


def _times(t: ArrayLike) -> Array:
    times = np.asarray(t, dtype=np.float64)
    if times.ndim > 1:
        raise ShapeError("t", expected=(times.size,), got=times.shape, hint="One time, or one row of times.")
    if not np.all(np.isfinite(times)):
        raise AccuracyError("t: every time must be a finite number of seconds")
    return times


def _condition(vectors: Numbers) -> float:
    if not vectors.size:
        return 1.0
    lengths = np.linalg.svd(vectors, compute_uv=False)
    return float(lengths[0] / lengths[-1]) if lengths[-1] > 0 else math.inf


def _largest(stack: Numbers) -> Array:
    """The largest size of an entry in each of k arrays, (k,)."""
    found: Array = np.abs(stack).reshape(len(stack), -1).max(axis=1, initial=0.0)
    return found
