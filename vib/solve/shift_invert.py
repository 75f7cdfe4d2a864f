"""The undamped problem of sparse systems: the lowest modes by shift-invert Lanczos, counted after.

One factorisation of K - shift M; the Lanczos process of ARPACK (R. B. Lehoucq, D. C. Sorensen, C. Yang,
ARPACK Users' Guide, SIAM 1998); one step of block inverse iteration with a Rayleigh-Ritz projection to
polish; then the number of negative pivots of K - s M, which by Sylvester's law is the number of modes
below sqrt(s).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.linalg
import scipy.sparse.linalg as sparse_linalg

from vib.errors import AccuracyError
from vib.solve.factor import Factor, SingularFactorError, factorise, negative_count
from vib.solve.undamped import (
    CANCELLATION,
    EPS,
    Array,
    Matrix,
    Undamped,
    elastic_ratio,
    round_off,
    stores_nothing,
)

# Pivots of K scaled to a unit diagonal that are smaller than this may be those of a free structure.
NEARLY_FREE = 1e-9
SPARE = 2  # modes found beyond those asked for, so that the count is taken in a gap


@dataclass(frozen=True, eq=False)
class Shifted:
    """K - shift M, factored; ``below`` counts its negative pivots (None: not known)."""

    factor: Factor
    shift: float

    @property
    def below(self) -> int | None:
        """How many eigenvalues lie below the shift."""
        return self.factor.negatives


def shifted(mass: Matrix, stiffness: Matrix) -> Shifted:
    """Factor K itself where it is safely regular, else K - shift M with a small negative shift.

    The shift is a fraction of min(K_ii / M_ii), which is never below the lowest eigenvalue.
    """
    try:
        factor = factorise(stiffness)
        if factor.negatives == 0 and factor.least_pivot > NEARLY_FREE:
            return Shifted(factor, 0.0)
    except SingularFactorError:
        pass
    heavy = mass.diagonal() > 0
    ratios = np.abs(stiffness.diagonal()[heavy]) / mass.diagonal()[heavy]
    ratios = ratios[ratios > 0]
    reference = float(ratios.min()) if ratios.size else 1.0
    for part in (1e-5, 1e-3, 1e-1, 0.37):
        try:
            factor = factorise(stiffness + part * reference * mass)
        except SingularFactorError:
            continue
        if factor.least_pivot > 1e-14:
            return Shifted(factor, -part * reference)
    raise AccuracyError(
        "The stiffness matrix could not be factored at any shift: some motion has neither mass nor "
        "stiffness, or the entries are too far apart."
    )


def sparse_undamped(mass: Matrix, stiffness: Matrix, count: int, *, certify: bool = True) -> Undamped:
    """The lowest modes of sparse symmetric matrices.

    Parameters
    ----------
    mass, stiffness
        (n, n) csr_array; the mass positive semi-definite, ``count`` well below n.
    certify
        Count the modes below the last one by a second factorisation.

    Raises
    ------
    AccuracyError
        ARPACK did not converge, or modes are still missing after the search was repeated.
    """
    base = shifted(mass, stiffness)
    wanted = count + SPARE
    counted: int | None = None
    for attempt in range(4):
        found = _search(mass, stiffness, base, wanted, attempt)
        if not certify:
            return found.first(count)
        limit, inside = _gap(found, count)
        if limit is None:  # one cluster of equal frequencies up to the end: look further
            wanted = 2 * wanted + SPARE
            continue
        counted = negative_count(stiffness - limit * mass)
        if counted is None:
            return found.first(count)
        if counted == inside:
            return _certified(found, float(np.sqrt(limit))).first(count)
        wanted += max(SPARE, counted - inside)
    raise AccuracyError(
        f"The inertia count finds {counted} modes where the search found {inside}, also when repeated.",
        found.first(count),
    )


def count_below(mass: Matrix, stiffness: Matrix, angular: float) -> int | None:
    """How many undamped modes lie below an angular frequency, rigid-body ones included; None: not known."""
    for nudge in (0.0, 1e-9, 1e-7):
        counted = negative_count(stiffness - (angular * (1 + nudge)) ** 2 * mass)
        if counted is not None:
            return counted
    return None


def _search(mass: Matrix, stiffness: Matrix, base: Shifted, wanted: int, attempt: int) -> Undamped:
    size = mass.shape[0]
    wanted = min(wanted, size - 1)
    operator = sparse_linalg.LinearOperator((size, size), matvec=base.factor.solve_once, dtype=np.float64)
    start = np.random.default_rng(attempt).standard_normal(size)
    try:
        _, vectors = sparse_linalg.eigsh(
            stiffness, k=wanted, M=mass, sigma=base.shift, OPinv=operator, v0=operator @ (mass @ start), tol=0
        )
    except sparse_linalg.ArpackError as problem:
        raise AccuracyError(f"The Lanczos process stopped: {problem}.") from problem
    values, shapes = _polish(mass, stiffness, base, vectors)
    energy, terms = elastic_ratio(stiffness, shapes)
    mass_terms = np.einsum("ij,ij->j", np.abs(shapes), abs(mass) @ np.abs(shapes))
    # Shapes are mixed with each other by round-off; energy of that order is none of their own.
    mixed = (CANCELLATION * EPS) ** 2 * float(np.abs(values).max(initial=0.0))
    rigid = stores_nothing(energy, terms) | (np.abs(values) <= mixed)
    angular = np.sqrt(np.abs(np.where(rigid, 0.0, values)))
    errors = _residual_bound(mass, stiffness, base, shapes, values) + round_off(terms, mass_terms, angular)
    order = np.lexsort((values, ~rigid))
    return Undamped(
        values=np.where(rigid, 0.0, values)[order],
        shapes=shapes[:, order],
        errors=np.where(rigid, 0.0, errors)[order],
        rigid=int(rigid.sum()),
        complete=False,
    )


def _polish(mass: Matrix, stiffness: Matrix, base: Shifted, vectors: Array) -> tuple[Array, Array]:
    """One step of inverse iteration on the whole block, then the best vectors in its span."""
    block = base.factor.solve(mass @ vectors)
    block = block / np.sqrt(np.einsum("ij,ij->j", block, mass @ block))
    small_mass = block.T @ (mass @ block)
    small = block.T @ (stiffness @ block)
    values, turn = scipy.linalg.eigh((small + small.T) / 2, (small_mass + small_mass.T) / 2)
    shapes = block @ turn
    shapes = shapes / np.sqrt(np.einsum("ij,ij->j", shapes, mass @ shapes))
    values = np.einsum("ij,ij->j", shapes, stiffness @ shapes)
    return values, shapes


def _residual_bound(mass: Matrix, stiffness: Matrix, base: Shifted, shapes: Array, values: Array) -> Array:
    """Bound of each angular frequency's error from the residual r in the norm of inv(K - shift M).

    With x of unit modal mass some eigenvalue l has (l - value)^2 <= (l - shift) r' inv(K - shift M) r
    (expand x in modes), and d(w) = d(w^2) / (2 w).
    """
    residual = stiffness @ shapes - (mass @ shapes) * values
    size = np.abs(np.einsum("ij,ij->j", residual, base.factor.solve(residual)))
    angular = np.sqrt(np.abs(values))
    change = np.sqrt(size * np.abs(values - base.shift))
    return np.asarray(np.minimum(change / (2 * np.where(angular > 0, angular, 1.0)), np.sqrt(change)))


def _gap(found: Undamped, count: int) -> tuple[float | None, int]:
    """A value in the first gap at or above the last mode asked for, and how many modes found lie below it."""
    angular, errors, number = found.angular, found.errors, len(found.values)
    if found.values.min(initial=0.0) < 0:  # indefinite: the count holds below zero as well, order by value
        order = np.argsort(found.values)
        angular, errors = np.sqrt(np.maximum(found.values[order], 0.0)), errors[order]
    for inside in range(min(count, number - 1), number):
        low = angular[inside - 1] + 2 * errors[inside - 1] if inside else 0.0
        high = angular[inside] - 2 * errors[inside]
        if high > low * (1 + 1e-9) and high > 0:
            return float((low + high) / 2) ** 2, inside
    return None, number


def _certified(found: Undamped, angular: float) -> Undamped:
    return Undamped(found.values, found.shapes, found.errors, found.rigid, complete=False, certified=angular)
