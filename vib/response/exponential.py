"""The matrix exponential at many times, for matrices that eigenvectors don't serve."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import scipy.linalg
from numpy.typing import NDArray

Array = NDArray[np.float64]
Numbers = NDArray[Any]  # float64 for a real matrix, complex128 for a complex one

EPS = float(np.finfo(np.float64).eps)
_TAYLOR_TERMS = 19  # 1/19! = 8e-18 is below eps, which is what is left out where |A h| <= 1
# States further apart than this are not a matter of units: one of them hardly feels the other.
_LARGEST_SCALING = 1e12
_HIDDEN = 1e3


def balance(matrix: Numbers) -> tuple[Numbers, Array]:
    """B and d (n,) with A = diag(d) B diag(1 / d): rows and columns of B are of like size (LAPACK gebal).

    The factors are powers of two, so that nothing is rounded. Nothing is scaled where that would hide errors:
    what is small in B would be large in A, but exp(A t) never gets that large (D. S. Watkins, "A case where
    balancing is harmful", Electron. Trans. Numer. Anal. 23 (2006) 1-4).
    """
    (gebal,) = scipy.linalg.get_lapack_funcs(("gebal",), (matrix,))
    if not matrix.size:
        return matrix, np.ones(0)
    balanced, _, _, scale, _ = gebal(matrix, scale=1, permute=0)
    ratio = float(scale.max() / scale.min()) if scale.min() > 0 else math.inf
    if ratio == 1:
        return matrix, np.ones(len(matrix))
    if ratio <= _LARGEST_SCALING and np.all(np.isfinite(balanced)):
        moved = scipy.linalg.expm(balanced / np.linalg.norm(balanced, 1))
        if ratio <= _HIDDEN * float(np.abs((scale[:, None] / scale) * moved).max()):
            return balanced, scale
    return matrix, np.ones(len(matrix))


class Exponential:
    """exp(A t) of a square matrix (n, n) with known eigenvalues (n,), at many times.

    The fastest growth is taken out as a factor: exp(A t) = exp(a t) exp((A - a I) t). With a the largest real
    part nothing overflows on the way, and a single multiple eigenvalue leaves a nilpotent matrix, the best
    case there is. Overflowing results come out infinite or NaN; the caller checks.
    """

    def __init__(self, matrix: Numbers, eigenvalues: NDArray[np.complex128]) -> None:
        self.matrix = matrix
        self.rates = eigenvalues.real
        self.norm = float(np.linalg.norm(matrix, 1)) if matrix.size else 0.0

    def growth(self, time: float) -> float:
        """The real part of the eigenvalue that grows most in the direction of ``time``."""
        if not self.rates.size:
            return 0.0
        return float(self.rates.max() if time >= 0 else self.rates.min())

    def once(self, time: float) -> Numbers:
        """exp(A t) at one time, (n, n)."""
        shift = self.growth(time)
        lowered = (self.matrix - shift * np.eye(len(self.matrix))) * time
        if not np.all(np.isfinite(lowered)):
            return np.full_like(self.matrix, np.nan)
        found: Numbers = np.exp(shift * time) * scipy.linalg.expm(lowered)
        return found

    def __call__(self, times: Array) -> Numbers:
        """(k, n, n): one exponential per different time, on a uniform grid only about 2 sqrt(k) of them."""
        different, places = np.unique(times, return_inverse=True)
        step = _uniform_step(different)
        if step is not None and different[0] >= 0:
            stack = self._grid(different[0], step, different.size)
        elif step is not None and different[-1] <= 0:
            stack = self._grid(different[-1], -step, different.size)[::-1]
        else:
            stack = np.stack([self.once(float(one)) for one in different])
        found: Numbers = stack[places]
        return found

    def apply(self, start: Numbers, times: Array) -> Numbers:
        """exp(A t) start for ``start`` (n,) at any k times, (k, n), without the k matrices."""
        found = np.empty((times.size, len(start)), np.result_type(start, self.matrix, np.float64))
        for forwards in (True, False):  # never mixed, so that no step undoes another
            chosen = (times >= 0) if forwards else (times < 0)
            if chosen.any():
                found[chosen] = self._one_way(start, times[chosen])
        return found

    def _grid(self, first: float, step: float, count: int) -> Numbers:
        """Semigroup law: exp(A (t0 + (i b + j) step)) = exp(A (t0 + i b step)) exp(A j step)."""
        block = math.isqrt(count - 1) + 1
        short = np.stack([self.once(j * step) for j in range(block)])
        starts = [first + i * step for i in range(0, count, block)]
        return np.concatenate([self.once(start) @ short for start in starts])[:count]

    def _one_way(self, start: Numbers, times: Array) -> Numbers:
        """By the binary digits of t / h with |A h| <= 1: one exponential per digit, and a Taylor sum."""
        longest = float(times[np.argmax(np.abs(times))])
        halvings = max(0, math.ceil(math.log2(max(self.norm * abs(longest), 1.0))))
        unit = math.ldexp(longest, -halvings)
        counts = times / unit if unit else np.zeros_like(times)
        whole = np.floor(counts)
        states = _taylor(self.matrix * unit, start, counts - whole)
        digits = whole.astype(np.int64)
        for digit in range(halvings + 1):
            chosen = (digits >> digit) & 1 == 1
            if chosen.any():
                states[chosen] = states[chosen] @ self.once(math.ldexp(unit, digit)).T
        return states


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
    for order in range(1, _TAYLOR_TERMS + 1):
        states += weight[:, None] * term
        term = matrix @ term / order
        weight = weight * fractions
    return states
