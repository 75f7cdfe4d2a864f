"""That no eigenvalue of a system with a localised velocity term is missing within a circle, at any size.

With T0(s) = s^2 M + s (a M + b K) + K, det T(s) = det T0(s) det(1 + (s L + N) B' inv(T0(s)) B). The zeros of
det T0 are counted by Sylvester's law, those of the small determinant over them by the argument principle.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import scipy.linalg

from vib.solve.damped import Complex
from vib.solve.localised import Localised
from vib.solve.undamped import Array, Undamped
from vib.solve.winding import MissingError, missing_within, widest_gap

if TYPE_CHECKING:
    from vib.solve.reduced import Projected, Reduction

UNSURE = 0.05  # most that the phase of the small determinant may be off for what the space lacks


def prove(
    reduction: Reduction,
    problem: Projected,
    undamped: Undamped,
    values: Complex,
    count: int,
    limit: float | None,
) -> float | None:
    """Magnitude below which no eigenvalue is missing; None if that can't be shown.

    Raises
    ------
    MissingError
        Some are.
    """
    found = np.sort(np.abs(values))
    first = count - undamped.rigid if limit is None else int((found <= limit).sum())
    radius = widest_gap(found, first, limit or 0.0)
    if radius is None:
        return None
    term, squares = problem.term, problem.squares
    place = _above(reduction, problem, radius)
    if place is None:
        return None
    counted = reduction.count_below(place)
    if counted is None:
        return None
    have = int((squares < place).sum())
    if counted != have:
        raise MissingError(counted - have)
    if term.stiffness_part * radius > 0.5 or term.mass_part * radius < 0:
        return None  # slow roots of modes beyond those counted might lie within the circle
    bare = _undamped_zeros(term, np.where(np.arange(len(squares)) < undamped.rigid, 0.0, squares), place)
    still = _zeros_at_rest(reduction, problem, undamped.rigid)
    known = np.concatenate([values, values[values.imag > 0].conj(), np.zeros(still)])

    def logarithm(s: complex) -> complex:
        ratio = _small_determinant(problem, s)
        return ratio + complex(np.log((s - bare) / radius).sum())

    missing = missing_within(logarithm, known, radius)
    if missing is None:
        return None
    if missing:
        raise MissingError(missing)
    return radius


def _zeros_at_rest(reduction: Reduction, problem: Projected, rigid: int) -> int:
    """How many eigenvalues at zero the rigid-body motions make: two for each that no velocity force resists.

    A force at right angles to all of them (gyroscopic) is answered by a steady offset and does not count.
    """
    if not rigid:
        return 0
    drag = problem.linear()[:rigid, :rigid]
    still = np.abs(reduction.space.basis @ problem.found.turn[:, :rigid])
    touch = still.T @ abs(problem.term.basis)  # what cancels between the ends of a dashpot is not lost here
    terms = float((touch @ np.abs(problem.term.linear) @ touch.T).max(initial=0.0))
    sizes = scipy.linalg.svdvals(drag)
    return rigid + int((sizes <= 1e-9 * max(terms, np.finfo(float).tiny)).sum())


def _above(reduction: Reduction, problem: Projected, radius: float) -> float | None:
    """A value in a gap of the converged undamped spectrum above the square of ``radius``."""
    found, squares = problem.found, problem.squares
    good = int(np.argmin(np.append(found.residuals <= 1e-4 * found.theta, False)))
    best, place = 1e-4, None
    for number in range(1, good):
        low, high = max(float(squares[number - 1]), radius**2), float(squares[number])
        if high / low - 1 > best:
            best, place = high / low - 1, float(np.sqrt(low * high))
        if place is not None and number > 8 + int((squares < radius**2).sum()):
            break
    return place


def _undamped_zeros(term: Localised, squares: Array, place: float) -> Complex:
    """Zeros of det T0 for the modes below ``place``."""
    inside = squares[squares < place].astype(complex)
    half = (term.mass_part + term.stiffness_part * inside) / 2
    root = np.sqrt(half**2 - inside)
    return np.concatenate([-half + root, -half - root])


def _small_determinant(problem: Projected, s: complex) -> complex:
    """log det(1 + (s L + N) B' inv(T0(s)) B) with the damping law among the terms."""
    theta, term, shift = problem.found.theta, problem.term, problem.shift
    stiff = 1 + shift * theta
    bare = s * s * theta + s * (term.mass_part * theta + term.stiffness_part * stiff) + stiff
    both = np.hstack([problem.touch, problem.held])
    answer = both.T @ (both / bare[:, None])
    rank = term.rank
    weight = np.zeros(answer.shape, complex)
    weight[:rank, :rank] = s * term.linear + term.constant
    weight[rank:, rank:] = s * np.diag(problem.rates)
    inner = np.eye(len(answer)) + weight @ answer
    sign, size = np.linalg.slogdet(inner)
    # What the space lacks of the answer is r' inv(T0) r with the residual r, in the energy of S at most
    # |r|^2 max |S / T0|; it moves the phase by no more than the trace norm of what it moves inside.
    whole = s * s + shift + s * (term.mass_part + term.stiffness_part * shift)
    beyond = np.linalg.norm(whole * (problem.found.beyond @ (both / bare[:, None])), axis=0)
    lacking = np.outer(beyond, beyond) * float(np.abs(1 / bare).max())
    moved = np.abs(np.linalg.solve(inner, weight)) @ lacking
    return complex(size + 1j * np.angle(sign)) if np.trace(moved) <= UNSURE else complex(np.nan)
