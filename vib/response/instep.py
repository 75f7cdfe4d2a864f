"""What an input does to one state within a step: integrals of exp(A (h - s)) b(s) over s from 0 to h.

The input is one of two shapes within the step: a power of the time since its beginning, or a sine and cosine.
Both integrals are exact, per eigenvalue in closed form and for a small matrix by the exponential of a larger
one, so that nothing is lost however long the step is.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.linalg
from numpy.typing import NDArray

Array = NDArray[np.float64]
Numbers = NDArray[Any]

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(40)
# 40 Gauss points integrate exp(z s) s^n over (0, 1) to rounding up to here; beyond, recursion loses nothing
_QUADRATURE_REACH = 24.0
_SERIES_TERMS = 17  # 1 / 19! is below rounding


@dataclass(frozen=True)
class Power:
    """(s / h)^n of the time s since the beginning of the step (or of the bit of a step) of length h."""

    degree: int


@dataclass(frozen=True)
class Wave:
    """cos(omega s), or sin(omega s); ``omega`` in rad/s."""

    omega: float
    sine: bool


Shape = Power | Wave


def effects(values: Numbers, lengths: Array, shape: Shape) -> Numbers:
    """The integral of exp(lambda (h - s)) shape(s) over a step: (k, m) for m eigenvalues and k lengths h.

    References
    ----------
    C. F. Van Loan, IEEE Trans. Automatic Control 23 (1978) 395-404: such integrals of a matrix exponential;
    M. Hochbruck, A. Ostermann, Acta Numerica 19 (2010) 209-286, section 2.1: the functions phi for powers.
    """
    late = np.asarray(lengths, dtype=np.float64)[:, None]
    if isinstance(shape, Power):
        return np.asarray(late * _moments(late * values, shape.degree))
    up, down = (_convolved(values, 1j * sign * shape.omega, late) for sign in (1, -1))
    return np.asarray((up - down) / 2j if shape.sine else (up + down) / 2)


def block_effects(block: Numbers, gain: Numbers, lengths: Array, shape: Shape) -> Numbers:
    """The same for a matrix block (s, s) and one direction ``gain`` (s,), k lengths: (k, s)."""
    size = len(gain)
    steps = shape.degree + 1 if isinstance(shape, Power) else 2
    whole = np.zeros((len(lengths), size + steps, size + steps), np.result_type(block, gain, np.float64))
    whole[:, :size, :size] = block * lengths[:, None, None]
    if isinstance(shape, Power):  # the powers of s / h follow from each other: n' = n times the one before
        whole[:, size:, size:] = np.diag(np.arange(1.0, steps), -1)
        driven, first = size + shape.degree, size
    else:
        turn = shape.omega * lengths  # sine, cosine
        whole[:, size, size + 1], whole[:, size + 1, size] = turn, -turn
        driven, first = size + (0 if shape.sine else 1), size + 1
    whole[:, :size, driven] = gain
    moved = np.stack([scipy.linalg.expm(one) for one in whole]) if len(whole) else whole
    return np.asarray(lengths[:, None] * moved[:, :size, first])


def _moments(z: Numbers, degree: int) -> Numbers:
    """The integral of exp(z (1 - s)) s^n over s from 0 to 1, n! phi_(n+1)(z)."""
    found = np.zeros(z.shape, np.complex128)
    if degree <= 1:  # constant and linear inputs, by far the most frequent: cheaper without the quadrature
        near = np.abs(z) < 1
        inner = z[near]
        kept = np.zeros(inner.shape, np.complex128)
        for term in range(_SERIES_TERMS, -1, -1):
            kept = kept * inner + 1 / math.factorial(term + degree + 1)
        found[near] = kept
        far = z[~near]
        found[~near] = (np.exp(far) - 1) / far
        if degree == 1:
            found[~near] = (found[~near] - 1) / far
        return found
    near = np.abs(z) < max(_QUADRATURE_REACH, 2.0 * degree)
    place = (_NODES + 1) / 2
    if near.any():
        inner = z[near]
        kept = np.zeros(inner.shape, np.complex128)
        for s, weight in zip(place, _WEIGHTS / 2, strict=True):
            kept += (weight * s**degree) * np.exp(inner * (1 - s))
        found[near] = kept
    if not near.all():
        far = z[~near]
        value = (np.exp(far) - 1) / far
        for n in range(1, degree + 1):  # by parts; stable as long as n stays below |z|
            value = (n * value - 1) / far
        found[~near] = value
    return found


def _convolved(values: Numbers, frequency: complex, late: Array) -> Numbers:
    """The integral of exp(lambda (t - s)) exp(frequency s) over s from 0 to t, also where the two agree."""
    difference = frequency - values
    size = np.abs(difference * late)
    apart = np.where(difference == 0, 1.0, difference)
    direct = (np.exp(frequency * late) - np.exp(values * late)) / apart
    small = np.where(size < 1, difference * late, 1.0)
    ratio = np.where(small == 0, 1.0, np.expm1(small) / np.where(small == 0, 1.0, small))
    return np.asarray(np.where(size < 1, np.exp(values * late) * late * ratio, direct))
