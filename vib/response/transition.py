"""The state transition matrix Phi(t) = exp(A t), and the exact answer to an input that stays constant.

A `Propagator` is prepared once from A and evaluated at many times. It goes through the eigenvalues where
the eigenvector matrix is well conditioned and through `scipy.linalg.expm` where it is not (a defective
matrix has no eigenvector matrix at all), and says which of the two it used.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.linalg
from numpy.typing import ArrayLike, NDArray

from vib.errors import AccuracyError, MatrixError, ShapeError

Array = NDArray[np.float64]
Numbers = NDArray[Any]  # float64 for a real matrix, complex128 for a complex one

EPS = float(np.finfo(np.float64).eps)
ACCURACY = 1e-12
# The error of V exp(diag t) V^-1 is about cond(V) eps times a modest factor: the rounding of the
# eigenvectors, of the inverse and of the two products. Random tests stay below 10.
_ROUNDING = 10.0
# Rounding A in its last digit alone moves exp(A t) by about eps |A| t; past this share nothing is left.
_PHASE_LIMIT = 1e-3
_TAYLOR_TERMS = 18  # 1/19! = 8e-18 is below eps, which is what is left out where |A h| <= 1
_CHUNK = 2_000_000  # numbers per piece of a stack, to bound the working memory


class Propagator:
    """Phi(t) = exp(A t) of one square matrix, prepared for many times.

    Parameters
    ----------
    matrix
        A, (n, n), real or complex, 1/s.
    accuracy
        Relative error wanted, in norm. The eigenvalues are used where the condition number of the matrix of
        unit eigenvectors of the balanced A is at most ``limit = accuracy / (10 eps)``. Single times at which
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
        # powers of two, so that the scaling itself rounds nothing: A = diag(scale) balanced diag(1 / scale)
        balanced, (scale, _) = scipy.linalg.matrix_balance(self.matrix, permute=False, separate=True)
        self._balanced, self._scale = balanced, scale
        values, vectors = np.linalg.eig(balanced)
        self.eigenvalues = values.astype(np.complex128)
        self.condition = _condition(vectors)
        self.method = "eigenvalues" if self.condition <= self.limit else "matrix exponential"
        self._norm = float(np.linalg.norm(balanced, 1)) if self.size else 0.0
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
            found = np.empty((at.size, self.size), self.matrix.dtype)
            doubtful = np.ones(at.size, bool)
            if self.method == "eigenvalues":
                terms = np.exp(np.outer(at, self.eigenvalues)) * (self._left @ vector)
                found = self._real(terms @ self._right.T)
                size = np.abs(terms) @ np.abs(self._right).T
                doubtful = _largest(size) > self.limit * _largest(found)
            if doubtful.any():
                found[doubtful] = self._apply_exponentials(vector / self._scale, at[doubtful]) * self._scale
        self._check_finite(found, at)
        return found

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
            phi[doubtful] = self._by_exponentials(times[doubtful])
        return phi

    def _by_exponentials(self, times: Array) -> Numbers:
        """One exponential per different time; on a uniform grid only about 2 sqrt(k) of them."""
        different, places = np.unique(times, return_inverse=True)
        step = _uniform_step(different)
        if step is not None and (different[0] >= 0 or different[-1] <= 0):
            block = math.isqrt(different.size - 1) + 1
            short = np.stack([self._exponential(i * step) for i in range(block)])
            # semigroup law: Phi(t0 + (i block + j) step) = Phi(t0 + i block step) Phi(j step)
            starts = different[0] + step * np.arange(0, different.size, block)
            if different[-1] <= 0:  # backwards: both factors must run the same way or they would cancel
                short = np.stack([self._exponential(-i * step) for i in range(block)])
                starts = different[-1] - step * np.arange(0, different.size, block)
            parts = [self._exponential(start) @ short for start in starts]
            phi = np.concatenate(parts)[: different.size]
            phi = phi[::-1] if different[-1] <= 0 else phi
        else:
            phi = np.stack([self._exponential(one) for one in different])
        found: Numbers = ((self._scale[:, None] / self._scale) * phi)[places]
        return found

    def _exponential(self, time: float) -> Numbers:
        """exp of the balanced matrix; its fastest growth is taken out as a factor.

        exp(B t) = exp(a t) exp((B - a I) t): with a the largest real part nothing overflows on the way,
        and a single multiple eigenvalue leaves a nilpotent matrix, the best case for the exponential.
        """
        shift = self._growth(time)
        lowered = (self._balanced - shift * np.eye(self.size)) * time
        if not np.all(np.isfinite(lowered)):
            return np.full_like(self._balanced, np.nan)
        found: Numbers = np.exp(shift * time) * scipy.linalg.expm(lowered)
        return found

    def _growth(self, time: float) -> float:
        rates = self.eigenvalues.real
        return float(rates.max() if time >= 0 else rates.min()) if rates.size else 0.0

    def _apply_exponentials(self, start: Numbers, times: Array) -> Numbers:
        """exp(B t) start for k times by the binary digits of t / h, with |B h| <= 1, and a Taylor rest."""
        found = np.empty((times.size, self.size), np.result_type(start, self._balanced, np.float64))
        for forwards in (True, False):  # never mixed, so that no step undoes another
            chosen = (times >= 0) if forwards else (times < 0)
            if chosen.any():
                found[chosen] = self._one_way(start, times[chosen])
        return found

    def _one_way(self, start: Numbers, times: Array) -> Numbers:
        longest = float(times[np.argmax(np.abs(times))])
        halvings = max(0, math.ceil(math.log2(max(self._norm * abs(longest), 1.0))))
        unit = math.ldexp(longest, -halvings)
        counts = times / unit if unit else np.zeros_like(times)
        whole = np.minimum(np.floor(counts), 2.0**halvings)
        states = _taylor(self._balanced * unit, start, counts - whole)
        whole_numbers = whole.astype(np.int64)
        for digit in range(halvings + 1):
            chosen = (whole_numbers >> digit) & 1 == 1
            if chosen.any():
                states[chosen] = states[chosen] @ self._exponential(math.ldexp(unit, digit)).T
        return states

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


def _uniform_step(times: Array) -> float | None:
    """The step of ascending, evenly spaced times (to rounding), or None."""
    if times.size < 4:
        return None
    step = float((times[-1] - times[0]) / (times.size - 1))
    even = times[0] + step * np.arange(times.size)
    return step if np.all(np.abs(times - even) <= 4 * EPS * np.abs(times).max()) else None


def _taylor(matrix: Numbers, start: Numbers, fractions: Array) -> Numbers:
    """exp(matrix r) start for fractions r in [0, 1) and |matrix| <= 1: (k, n)."""
    states = np.zeros((fractions.size, start.size), np.result_type(start, matrix, np.float64))
    term = start.astype(states.dtype)
    weight = np.ones_like(fractions)
    for order in range(1, _TAYLOR_TERMS + 2):
        states += weight[:, None] * term
        term = matrix @ term / order
        weight = weight * fractions
    return states
