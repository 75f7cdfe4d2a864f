"""Whether something grows in a system too large for all its eigenvalues: what can be proved either way.

Growth: det(s^2 M + s (C + G) + K) has a positive real zero where det K is negative, and one for each
negative eigenvalue of K where all matrices are symmetric; the real parts of all eigenvalues add up to
-trace(inv(M) C).
Rest: with e > 0 the function V = v M v / 2 + q (K + e C) q / 2 + e q M v of displacements q and velocities v
falls along every motion where [[C - e M, (N - e G) / 2], [., e K]] is positive, N the skew part of the
stiffness (Lyapunov's direct method; the function is the energy with a cross term, derived here).
Beyond that, motions near the places that feed energy in are looked for and followed to eigenvalues of the
whole system.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import scipy.linalg
import scipy.sparse as sparse
import scipy.sparse.linalg as sparse_linalg
from numpy.typing import NDArray

from vib.massless import dense, root_scale
from vib.solve.backends.choice import factor
from vib.solve.backends.interface import FactorError
from vib.solve.damped import Complex
from vib.solve.factor import negative_count
from vib.solve.undamped import EPS, Array, Matrix
from vib.solve.winding import Determinant

UNKNOWN = complex(np.nan, np.nan)  # of a motion that grows for sure, but was not computed
LIFT = 1e-11  # of the diagonal of the stiffness: a negative eigenvalue of less is taken for round-off
SURE = 1e-9  # of the terms of a sum that cancel: what is left must be more
QUICK = 8000  # rows up to which the plain factorisation takes less time than the choice of a better one
MOST_SOLVES = 400  # columns of inv(M) for the trace
STEPS = 40  # halvings of an interval for a rate
SHARES = (0.5, 0.9, 0.2, 0.05, 0.01)  # of the least damping rate, for the function V
LOCAL = 120  # freedoms about the places that feed energy in
MOST_PLACES = 160
FOLLOWED = 8  # local motions that are followed to the whole system
MOST_FOLLOWED_SIZE = 30_000  # freedoms up to which complex factorisations are quick enough for that


class Verdict(NamedTuple):
    """An eigenvalue that grows (`UNKNOWN`: one does, for sure), or None; and whether that is proved."""

    growing: complex | None
    proved: bool


class Terms(NamedTuple):
    """s^2 mass + s (linear + held diag(rates) held') + stiffness, sparse (n, n), held (n, r)."""

    mass: Matrix
    linear: Matrix
    stiffness: Matrix
    held: Array
    rates: Array


def grows(terms: Terms) -> Verdict:
    """What can be said about growth without all eigenvalues."""
    rate = _without_swinging(terms)
    if rate is not None:
        return Verdict(rate, proved=True)
    if _adds_up_to_growth(terms):
        return Verdict(UNKNOWN, proved=True)
    if _falls(terms):
        return Verdict(None, proved=True)
    met = _about_the_sources(terms)
    return Verdict(met, proved=met is not None)


def _halves(matrix: Matrix) -> tuple[Matrix, Matrix]:
    whole = sparse.csr_array(matrix)
    return sparse.csr_array((whole + whole.T) / 2), sparse.csr_array((whole - whole.T) / 2)


def _without_swinging(terms: Terms) -> complex | None:
    """The fastest positive real eigenvalue where signs of determinants or pivots prove that there is one."""
    stiffness, across = _halves(terms.stiffness)
    symmetric = abs(across).max() == 0 and abs(_halves(terms.linear)[1]).max() == 0
    if symmetric:
        # a free structure's motions at no frequency are round-off of either sign
        lifted = stiffness + LIFT * sparse.diags_array(np.abs(stiffness.diagonal()))
        if not negative_count(sparse.csr_array(lifted)):
            return None
        mass, linear = terms.mass, _halves(terms.linear)[0]

        def beyond(rate: float) -> bool:
            return not negative_count(sparse.csr_array(rate * rate * mass + rate * linear + stiffness))
    else:
        determinant = Determinant(terms.mass, terms.linear, terms.stiffness, terms.held, terms.rates)

        def beyond(rate: float) -> bool:
            return bool(np.cos(determinant.logarithm(complex(rate)).imag) > 0)

        if beyond(0.0) or not _regular(terms.stiffness):
            return UNKNOWN if _turned_over(terms) else None
    heavy = terms.mass.diagonal() > 0
    if not heavy.any():
        return UNKNOWN
    ratios = np.abs(stiffness.diagonal()[heavy]) / terms.mass.diagonal()[heavy]
    low, high = 0.0, float(np.sqrt(ratios.max(initial=0.0))) or 1.0
    for _ in range(STEPS):
        if beyond(high):
            break
        low, high = high, 4 * high
    else:
        return UNKNOWN
    for _ in range(STEPS):
        middle = (low + high) / 2
        low, high = (low, middle) if beyond(middle) else (middle, high)
    return complex(low) if low > 0 else UNKNOWN


def _turned_over(terms: Terms) -> bool:
    """Whether gyroscopic forces hold up what the stiffness does not, which any damping of all motions undoes.

    W. Thomson and P. G. Tait; N. G. Chetaev, The Stability of Motion, 1961 (quoted from memory).
    """
    stiffness, across = _halves(terms.stiffness)
    if abs(across).max() > 0 or (terms.rates < 0).any():
        return False
    lifted = stiffness + LIFT * sparse.diags_array(np.abs(stiffness.diagonal()))
    if not negative_count(sparse.csr_array(lifted)):
        return False
    return _least_rate(sparse.csr_array(terms.mass), _halves(terms.linear)[0]) is not None


def _regular(stiffness: Matrix) -> bool:
    """Whether the sign of the determinant is more than round-off."""
    try:
        with factor(sparse.csr_array(stiffness), symmetric=False) as found:
            return found.smallest_pivot is None or found.smallest_pivot > 1e-10
    except FactorError:
        return False


def _adds_up_to_growth(terms: Terms) -> bool:
    """Whether the real parts of all eigenvalues, -trace(inv(M) C), add up to more than nothing."""
    mass, damping = sparse.csr_array(terms.mass), _halves(terms.linear)[0]
    diagonal = np.asarray(mass.diagonal())
    if not (diagonal > 0).all():
        return False
    beside = mass - sparse.diags_array(diagonal)
    extra = float(terms.rates.sum())  # the shapes that the law acts on have unit modal mass
    touched = np.flatnonzero(np.diff(damping.indptr))
    if abs(beside).max() == 0:
        parts = np.asarray(damping.diagonal()) / diagonal
    elif len(touched) <= MOST_SOLVES:
        unit = np.zeros((len(diagonal), len(touched)))
        unit[touched, np.arange(len(touched))] = 1.0
        try:
            with factor(mass, symmetric=True) as found:
                if found.negative:
                    return False
                parts = np.einsum("ij,ij->j", np.asarray(damping @ found.solve(unit)), unit)
        except FactorError:
            return False
    else:
        return False
    return bool(parts.sum() + extra < -SURE * (np.abs(parts).sum() + extra))


def _falls(terms: Terms) -> bool:
    """Whether a function V proves that every motion dies away.

    A damping law with ratios that are not negative only helps: it adds to C in V and in its fall alike.
    """
    mass = sparse.csr_array(terms.mass)
    (damping, turning), (stiffness, across) = _halves(terms.linear), _halves(terms.stiffness)
    if (terms.rates < 0).any():
        return False
    least = _least_rate(mass, damping)
    if least is None:
        return False
    for share in SHARES:
        e = share * least
        cross = (across - e * turning) / 2
        fall = sparse.block_array([[damping - e * mass, cross], [cross.T, e * stiffness]], format="csr")
        height = sparse.block_array([[mass, e * mass], [e * mass, stiffness + e * damping]], format="csr")
        if _positive(fall) and _positive(height):
            return True
    return False


def _least_rate(mass: Matrix, damping: Matrix) -> float | None:
    """A rate d with C - d M positive, about the largest; None if C is not positive."""
    diagonal = np.asarray(mass.diagonal())
    rates = np.asarray(damping.diagonal()) / np.where(diagonal > 0, diagonal, np.inf)
    if not (diagonal > 0).all() or rates.min() <= 0:
        return None
    high = float(rates.min())
    for _ in range(24):
        if _positive(sparse.csr_array(damping - high * mass)):
            return high
        high /= 2
    return None


def _positive(matrix: Matrix) -> bool:
    """Whether a sparse symmetric matrix is positive definite by more than round-off."""
    scale = root_scale(np.asarray(matrix.diagonal()))
    if (np.asarray(matrix.diagonal()) <= 0).any():
        return False
    weight = sparse.diags_array(scale)
    scaled = weight @ matrix @ weight - 64 * EPS * sparse.eye_array(matrix.shape[0])
    if matrix.shape[0] <= QUICK:
        return negative_count(sparse.csr_array(scaled)) == 0
    try:
        with factor(sparse.csr_array(scaled), symmetric=True) as found:
            return found.negative == 0
    except FactorError:
        return False


def _about_the_sources(terms: Terms) -> complex | None:
    """An eigenvalue that grows, met from motions of the neighbourhood of what feeds energy in."""
    damping, _ = _halves(terms.linear)
    across = _halves(terms.stiffness)[1]
    diagonal = np.asarray(damping.diagonal())
    rest = np.asarray(abs(damping).sum(axis=1)).ravel() - np.abs(diagonal)
    feeding = (diagonal < rest * (1 - 1e-12)) | (np.diff(across.indptr) > 0)
    places = np.flatnonzero(feeding)
    if not 0 < len(places) <= MOST_PLACES or terms.mass.shape[0] > MOST_FOLLOWED_SIZE:
        return None
    near = _neighbourhood(sparse.csr_array(terms.stiffness), places)
    m, c, k = (dense(sparse.csr_array(part)[near][:, near]) for part in terms[:3])
    c = c + (terms.held[near] * terms.rates) @ terms.held[near].T
    heavy = np.diag(m) > 0
    if not heavy.all():
        return None
    scale = root_scale(np.diag(m))
    m, c, k = (scale[:, None] * part * scale for part in (m, c, k))
    size = len(m)
    top = np.hstack([np.zeros((size, size)), np.eye(size)])
    state = np.vstack([top, -np.linalg.solve(m, np.hstack([k, c]))])
    values, shapes = scipy.linalg.eig(state)
    upper = np.flatnonzero((values.imag >= 0) & (values.real > 1e-12 * np.abs(values)))
    chosen = upper[np.argsort(-values[upper].real)][:FOLLOWED]
    for number in chosen.tolist():
        start = np.zeros(terms.mass.shape[0], complex)
        start[near] = scale * shapes[:size, number]
        met = _followed(terms, complex(values[number]), start)
        if met is not None:
            return met
    return None


def _neighbourhood(stiffness: sparse.csr_array, places: NDArray[np.intp]) -> NDArray[np.intp]:
    """The places and what is tied to them, ring by ring, as long as there is room."""
    pattern = sparse.csr_array((np.ones(len(stiffness.data)), stiffness.indices, stiffness.indptr))
    reached = np.zeros(stiffness.shape[0])
    reached[places] = 1.0
    while True:
        wider = reached + pattern @ reached > 0
        if wider.sum() > LOCAL or wider.sum() == np.count_nonzero(reached):
            return np.flatnonzero(reached)
        reached = wider.astype(float)


def _followed(terms: Terms, value: complex, shape: Complex) -> complex | None:
    """The eigenvalue that inverse iteration leads to, if it grows.

    A. Ruhe, SIAM J. Numer. Anal. 10 (1973) 674-689.
    """
    mass, linear, stiffness = (sparse.csc_array(part) for part in terms[:3])
    held, rates = terms.held, terms.rates

    def slope(at: complex, x: Complex) -> Complex:
        return np.asarray(2 * at * (mass @ x) + linear @ x + held @ (rates * (held.T @ x)))

    for _ in range(12):
        try:
            solver = sparse_linalg.splu(sparse.csc_array(value * value * mass + value * linear + stiffness))
        except RuntimeError:  # exactly singular: an eigenvalue to the last digit
            return value if value.real > SURE * abs(value) else None
        right = slope(value, shape)
        solved = solver.solve(right)
        if rates.size:
            answered = solver.solve(held.astype(complex))
            small = np.diag(1 / (value * rates)) + held.T @ answered
            solved = solved - answered @ np.linalg.solve(small, held.T @ solved)
        at = int(np.argmax(np.abs(shape)))
        if not np.isfinite(solved).all() or solved[at] == 0:
            return None
        step = complex(shape[at] / solved[at])
        value, shape = value - step, solved / np.abs(solved).max()
        if abs(step) <= 1e-11 * abs(value):
            return complex(value.real, abs(value.imag)) if value.real > SURE * abs(value) else None
    return None
