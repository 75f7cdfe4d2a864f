"""How many eigenvalues of a quadratic lie within a circle about zero, by the argument principle.

f(s) = det(s^2 M + s (C + G) + K) is a polynomial, so the number of its zeros within |s| = R is the number of
times f goes round zero while s goes round the circle. The zeros that a search has found, inside and outside,
are divided out first: what is left is flat where none is missing, and a missing one close to the circle shows
in the size as well as in the phase. f is real for real s, so half the circle is enough.

The determinant comes from sparse complex factorisations; damping stated mode by mode is a term of low rank
that the matrix determinant lemma adds. (Argument principle for counting eigenvalues: E. Kamgnia, B. Philippe,
Electron. Trans. Numer. Anal. 40 (2013) 26-43; the step control here is our own.)
"""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise
from typing import NamedTuple

import numpy as np
import scipy.sparse as sparse
import scipy.sparse.linalg as sparse_linalg
from numpy.typing import NDArray

from vib.errors import AccuracyError
from vib.massless import root_scale
from vib.solve.damped import Complex
from vib.solve.undamped import Array, Matrix

INTERVALS = 12  # of the half circle at first; each is halved at least once
STEP = np.pi / 4  # most that the phase may change from one point to the next
BEND = 0.4  # most that the logarithm in the middle may differ from the mean of both ends
DEEPEST = 12  # halvings of an interval
MOST_POINTS = 200
# Rows of the factors times mean fill: beyond, one factorisation takes about a second and the proof too long.
AFFORDABLE_FILL = 1_500_000

Logarithm = Callable[[complex], complex]


class MissingError(AccuracyError):
    """Eigenvalues are missing within the circle of the proof; ``number`` tells how many."""

    def __init__(self, number: int) -> None:
        """Take how many are missing (negative: too many were found)."""
        self.number = number
        super().__init__(
            f"{number} eigenvalues were missed."
            if number > 0
            else f"{-number} eigenvalues too many were found."
        )


def widest_gap(sizes: Array, first: int, least: float) -> float | None:
    """Middle of the widest relative gap between neighbours from number ``first`` on, above ``least``."""
    best, radius = 1e-6, None
    for number in range(max(first, 1), len(sizes)):
        low, high = max(float(sizes[number - 1]), least), float(sizes[number])
        if low > 0 and high / low - 1 > best:
            best, radius = high / low - 1, float(np.sqrt(low * high))
    return radius


class Determinant:
    """log det(s^2 M + s (C + held diag(rates) held') + K) for complex s, up to a constant of its own."""

    def __init__(self, mass: Matrix, linear: Matrix, stiffness: Matrix, held: Array, rates: Array) -> None:
        """Take (n, n) sparse matrices; ``held`` (n, r) and ``rates`` (r,) are damping of low rank."""
        diagonal = np.abs(np.asarray(stiffness.diagonal())) + np.abs(np.asarray(linear.diagonal()))
        self._scale = root_scale(np.where(diagonal > 0, diagonal, np.asarray(mass.diagonal())))
        weight = sparse.diags_array(self._scale)
        pattern = abs(mass) + abs(linear) + abs(stiffness) + abs(linear).T + abs(stiffness).T
        zero = sparse.csc_array(pattern * 0.0)
        self._terms = []
        for matrix in (mass, linear, stiffness):
            scaled = sparse.csc_array(weight @ matrix @ weight + zero)
            scaled.sort_indices()
            self._terms.append(scaled)
        self._pattern = (self._terms[2].indices, self._terms[2].indptr)
        self._alike = all(
            np.array_equal(term.indices, self._pattern[0]) and np.array_equal(term.indptr, self._pattern[1])
            for term in self._terms
        )
        self._held, self._rates = self._scale[:, None] * held, rates
        self.fill = 0

    def logarithm(self, place: complex) -> complex:
        """log f(place); its imaginary part is the phase, any multiple of 2 pi beside. -inf where singular."""
        mass, linear, stiffness = self._terms
        if self._alike:
            data = place * place * mass.data + place * linear.data + stiffness.data
            matrix = sparse.csc_array((data, *self._pattern), shape=mass.shape)
        else:
            matrix = sparse.csc_array(place * place * mass + place * linear + stiffness)
        try:
            factor = sparse_linalg.splu(
                matrix, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.1, options={"SymmetricMode": True}
            )
        except RuntimeError:  # exactly singular
            return complex(-np.inf)
        self.fill = int(factor.nnz)
        pivots = factor.U.diagonal()
        with np.errstate(divide="ignore"):
            found = complex(np.log(pivots.astype(complex)).sum())
        if _odd(factor.perm_r) != _odd(factor.perm_c):
            found += 1j * np.pi
        if self._rates.size:
            answered = self._held.T @ factor.solve(self._held.astype(complex))
            small = np.eye(len(self._rates)) + place * self._rates[:, None] * answered
            sign, size = np.linalg.slogdet(small)
            found += complex(size + 1j * np.angle(sign))
        return found


def _odd(order: NDArray[np.intp]) -> bool:
    """Whether a permutation is odd."""
    seen = np.zeros(len(order), dtype=bool)
    swaps = 0
    steps = order.tolist()
    for first in range(len(steps)):
        if seen[first]:
            continue
        place = first
        while not seen[place]:
            seen[place] = True
            place = steps[place]
            swaps += 1
        swaps -= 1
    return bool(swaps % 2)


def affordable(determinant: Determinant, radius: float) -> bool:
    """Whether a few dozen factorisations take no more than some seconds."""
    determinant.logarithm(radius * 1j * (1 + 0.01j))
    return determinant.fill <= AFFORDABLE_FILL


def missing_within(logarithm: Logarithm, known: Complex, radius: float) -> int | None:
    """How many zeros within the circle ``known`` lacks; negative if it has too many.

    Parameters
    ----------
    logarithm
        log f(s) of a function that is real for real s and has no poles; see `Determinant.logarithm`.
    known
        Zeros that were found, each as often as it counts, both of a conjugate pair, inside and outside.
    radius
        Of the circle, well away from all of them.

    Returns
    -------
    int or None
        None where the phase could not be followed: a zero that is not known lies close to the circle.
    """

    def rest(angle: float) -> complex:
        place = radius * complex(np.cos(angle), np.sin(angle))
        return logarithm(place) - complex(np.log((place - known) / radius).sum())

    ends = np.linspace(0.0, np.pi, INTERVALS + 1)
    sizes = [rest(angle) for angle in ends.tolist()]
    if not np.isfinite(sizes).all():
        return None
    path = _Path(rest, _smooth(ends, np.array(sizes).real))
    path.keep(ends.tolist(), sizes)
    turned = 0.0
    for start, stop in pairwise(ends.tolist()):
        gained = path.follow(_Point(start, path.at(start)), _Point(stop, path.at(stop)), DEEPEST)
        if gained is None:
            return None
        turned += gained
    times = turned / np.pi  # half the circle goes half round
    return round(times) if abs(times - round(times)) < 0.1 else None


def _smooth(angles: Array, sizes: Array) -> Callable[[float], complex]:
    """The polynomial in s with real coefficients whose real part has these values on the half circle.

    Zeros far outside add up to a phase that is large but smooth. The exponential of a polynomial goes round
    zero no times, so this one may be taken off whether it fits well or not.
    """
    orders = np.arange(len(angles))
    weights = np.linalg.solve(np.cos(np.outer(angles, orders)), sizes)
    weights, orders = weights[:-1], orders[:-1]  # the last one is not told from its alias

    def value(angle: float) -> complex:
        return complex(weights @ np.exp(1j * orders * angle))

    return value


class _Point(NamedTuple):
    angle: float
    value: complex


class _Path:
    """The phase of a function over a smooth one followed along an interval, halved until it can't slip."""

    def __init__(self, function: Callable[[float], complex], smooth: Callable[[float], complex]) -> None:
        self._function, self._smooth = function, smooth
        self._known: dict[float, complex] = {}

    def keep(self, angles: list[float], values: list[complex]) -> None:
        """Take values that are known already."""
        for angle, value in zip(angles, values, strict=True):
            self._known[angle] = value - self._smooth(angle)

    def at(self, angle: float) -> complex:
        """The logarithm of the ratio."""
        if angle not in self._known:
            self._known[angle] = self._function(angle) - self._smooth(angle)
        return self._known[angle]

    def follow(self, start: _Point, stop: _Point, depth: int) -> float | None:
        """The gain of the phase from start to stop; None where it can't be followed."""
        if len(self._known) > MOST_POINTS:
            return None
        middle = _Point((start.angle + stop.angle) / 2, self.at((start.angle + stop.angle) / 2))
        first, second = _turn(start, middle), _turn(middle, stop)
        bend = abs(middle.value.real - (start.value.real + stop.value.real) / 2)
        if max(abs(first), abs(second)) <= STEP and bend <= BEND and abs(first - second) <= 2 * BEND:
            return first + second
        if depth == 0 or not np.isfinite(bend):
            return None
        left = self.follow(start, middle, depth - 1)
        right = None if left is None else self.follow(middle, stop, depth - 1)
        return None if left is None or right is None else left + right


def _turn(start: _Point, stop: _Point) -> float:
    """Change of phase, taken as less than half a turn."""
    change = stop.value.imag - start.value.imag
    return float(np.remainder(change + np.pi, 2 * np.pi) - np.pi)
