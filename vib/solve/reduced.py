"""Damped modes of large systems whose velocity term is localised: one factorisation, one real Krylov space.

A pair (s, x) of s^2 M + s (a M + b K + B L B') + K solves x = -inv(T0(s)) B (s L + N) B' x with T0 = s^2 M +
s (a M + b K) + K, so x lies in the span of inv(T0(s)) B, which Krylov spaces of inv(S) M from inv(S) B hold
better with every step, or it is an undamped mode that B does not see (Z. Bai, Appl. Numer. Math. 43 (2002)
9-44, on Krylov spaces for second-order systems). The projected problem is solved densely. Left vectors lie in
the same space, so eigenvalues are off by the square of what the vectors are.
"""

from __future__ import annotations

from collections.abc import Callable
from contextlib import ExitStack
from dataclasses import dataclass, replace

import numpy as np
import scipy.linalg
from numpy.typing import NDArray

from vib.errors import AccuracyError
from vib.solve.backends.choice import factor as factorise
from vib.solve.backends.choice import one_pool
from vib.solve.backends.interface import Factor, FactorError
from vib.solve.damped import Complex, Damped
from vib.solve.energy import Coordinates, EnergySpace
from vib.solve.localised import Localised
from vib.solve.pairs import Pairs, Quadratic, damped_from_pairs, improve
from vib.solve.proof import prove
from vib.solve.quadratic import modal_pairs
from vib.solve.undamped import (
    Array,
    Matrix,
    Undamped,
    elastic_ratio,
    round_off,
    stores_nothing,
    with_hidden,
)

RANDOM = 4  # directions beside those of the dashpots, for modes that no dashpot sees
SPARE = 4  # modes beyond those asked for
SHAPE = 1e-8  # energy norm of the residual of a unit shape; eigenvalues are then right to its square
GROWTH = 1.1  # of the space between two solutions of the projected problem
MOST_COLUMNS = 600  # of the basis; dense problems of twice that size
NO_MASS = 1e-13  # of the largest mass: coordinates below it have none
FREE_SHIFT = 1e-8  # of the highest ratio of stiffness to mass, to begin with
NEARLY_FREE = 1e-9  # pivots of a stiffness of unit diagonal below this may be those of a free structure


class UnsuitedError(AccuracyError):
    """This method can't solve the system; another may."""


class Reduction:
    """The Krylov space of one system, grown as far as each question needs."""

    def __init__(self, mass: Matrix, stiffness: Matrix, term: Localised) -> None:
        """Take csr_array (n, n), ``stiffness`` symmetric.

        Raises
        ------
        UnsuitedError
            The stiffness is not positive.
        """
        self.mass, self.stiffness, self.term = mass, stiffness, term
        with ExitStack() as threads:
            threads.enter_context(one_pool(mass.shape[0]))
            self.shift, self.regular, self.factor = _regular(mass, stiffness)
            random = np.random.default_rng(7).standard_normal((mass.shape[0], RANDOM))
            force = np.hstack([term.basis.toarray(), mass @ random])
            self.space = EnergySpace(mass, self.regular, self.factor, self.factor.solve(force))
            self._threads = threads.pop_all()

    def __enter__(self) -> Reduction:
        return self

    def __exit__(self, *_: object) -> None:
        self.factor.release()
        self._threads.close()

    def grow(self) -> None:
        """One more step; fresh directions where the space has closed."""
        if self.space.exhausted:
            random = np.random.default_rng(self.space.used).standard_normal((self.mass.shape[0], RANDOM))
            self.space.add(self.factor.solve(self.mass @ random))
        if self.space.exhausted or self.space.used > MOST_COLUMNS:
            raise UnsuitedError("The space for the modes of this system grew too large.")
        self.space.step()

    def widen(self) -> None:
        """Take fresh directions, where modes are missing."""
        random = np.random.default_rng(1000 + self.space.used).standard_normal(
            (self.mass.shape[0], 2 * RANDOM)
        )
        self.space.add(self.factor.solve(self.mass @ random))
        for _ in range(3):
            self.grow()

    def undamped(self, count: int) -> Undamped:
        """The lowest ``count`` undamped modes or more, converged; not proved complete."""
        while True:
            if self.space.done >= count:
                found = self.space.coordinates()
                heavy = found.theta > NO_MASS * found.theta.max(initial=0.0)
                sure = (found.residuals <= SHAPE * found.theta) & heavy
                good = int(np.argmin(np.append(sure, False)))
                if good >= count:
                    return self._modes(found, good)
            self.grow()

    def _modes(self, found: Coordinates, count: int) -> Undamped:
        theta = found.theta[:count]
        shapes = self.space.basis @ (found.turn[:, :count] / np.sqrt(theta))
        energy, terms = elastic_ratio(self.stiffness, shapes)
        rigid = stores_nothing(energy, terms)
        values = np.where(rigid, 0.0, energy)
        angular = np.sqrt(np.abs(values))
        mass_terms = elastic_ratio(self.mass, shapes)[1]
        # Kato and Temple: the residual's square over the gap in theta, here no less than the residual's own
        off = np.minimum(found.residuals[:count], found.residuals[:count] ** 2 / (1e-6 * theta))
        far = np.where(rigid, 1.0, 2 * angular)
        errors = np.where(rigid, 0.0, off / theta**2 / far + round_off(terms, mass_terms, angular))
        errors = with_hidden(errors, rigid, energy, terms, angular)
        order = np.lexsort((values, ~rigid))
        return Undamped(
            values[order],
            np.ascontiguousarray(shapes[:, order]),
            errors[order],
            int(rigid.sum()),
            complete=False,
        )

    def count_below(self, value: float) -> int | None:
        """How many eigenvalues of the undamped problem are below ``value``."""
        try:
            with factorise(self.stiffness - value * self.mass, symmetric=True) as found:
                return found.negative
        except FactorError:
            return None


def _regular(mass: Matrix, stiffness: Matrix) -> tuple[float, Matrix, Factor]:
    """Shift, K - shift M and its factorisation, positive definite: the shift is zero unless K is singular.

    For a free structure it is minus the lowest elastic eigenvalue, roughly, so that rigid-body motions do not
    drown the others in round-off.
    """
    found = _definite(stiffness)
    if found is not None:
        return 0.0, stiffness, found
    ratio = np.abs(stiffness.diagonal()) / np.where(mass.diagonal() > 0, mass.diagonal(), np.inf)
    shift = -FREE_SHIFT * float(ratio.max())
    for _ in range(3):
        regular = stiffness - shift * mass
        found = _definite(regular)
        if found is None:
            break
        elastic = _first_elastic(mass, stiffness, found)
        if elastic is None or 0.03 <= -shift / elastic <= 3:
            return shift, regular, found
        found.release()
        shift = -0.3 * elastic
    raise UnsuitedError("The stiffness is not positive definite.")


def _definite(matrix: Matrix) -> Factor | None:
    """The factorisation of a matrix that is safely positive definite."""
    try:
        found = factorise(matrix, symmetric=True)
    except FactorError:
        return None
    pivot = found.smallest_pivot
    if found.negative == 0 and (pivot is None or pivot > NEARLY_FREE):
        return found
    found.release()
    return None


def _first_elastic(mass: Matrix, stiffness: Matrix, factor: Factor) -> float | None:
    """About the lowest eigenvalue that is not a rigid-body motion; None if no other motion was met."""
    block = np.random.default_rng(3).standard_normal((mass.shape[0], 8))
    for _ in range(3):
        block = factor.solve(mass @ block)
        heavy = block.T @ (mass @ block)
        scale = 1 / np.sqrt(np.diag(heavy))
        values, turn = scipy.linalg.eigh(scale[:, None] * heavy * scale)
        some = values > 1e-13
        block = block @ (scale[:, None] * turn[:, some] / np.sqrt(values[some]))
    stiff = block.T @ (stiffness @ block)
    _, turn = scipy.linalg.eigh((stiff + stiff.T) / 2)
    energy, terms = elastic_ratio(stiffness, block @ turn)
    elastic = energy[~stores_nothing(energy, terms)]
    return float(elastic.min()) if elastic.size else None


@dataclass(frozen=True, eq=False)
class Projected:
    """The system in undamped coordinates: S is 1, M is diag(theta), the rest of low rank.

    ``touch`` (k, r) is B' of each coordinate; ``held`` (k, l) and ``rates`` (l,) the damping law.
    """

    found: Coordinates
    shift: float
    term: Localised
    touch: Array
    held: Array
    rates: Array

    @property
    def squares(self) -> Array:
        """Eigenvalue of each coordinate (k,), infinite where it has no mass."""
        with np.errstate(divide="ignore"):
            return 1 / self.found.theta + self.shift

    def linear(self) -> Array:
        """C + G in the coordinates (k, k), where S is 1."""
        theta, term = self.found.theta, self.term
        whole = self.touch @ term.linear @ self.touch.T + (self.held * self.rates) @ self.held.T
        whole[np.diag_indices(len(theta))] += term.mass_part * theta + term.stiffness_part * (
            1 + self.shift * theta
        )
        return whole

    def constant(self) -> Array:
        """The unsymmetric part of the stiffness (k, k)."""
        return np.asarray(self.touch @ self.term.constant @ self.touch.T)

    def residual(self, value: Complex, weights: Complex) -> Array:
        """Energy norm of inv(S) T(s) x (m,) for shapes of weights (k, m), which is outside the space."""
        beyond = np.linalg.norm(self.found.beyond @ weights, axis=0)
        term, shift = self.term, self.shift
        whole = value**2 + shift + value * (term.mass_part + term.stiffness_part * shift)
        return np.asarray(np.abs(whole) * beyond / np.linalg.norm(weights, axis=0))


def projected_pairs(problem: Projected, rigid: int) -> tuple[Complex, Complex, Complex]:
    """All eigenvalues of the projected problem, one of each pair, with right and left weights (k, m)."""
    theta = problem.found.theta
    if rigid:
        return _free_pairs(problem, rigid)
    # with t = 1 / s and S = 1: t^2 x + t L x + M x = 0 in states (t x, root(M) x); normal where L is 0
    root = np.sqrt(theta)
    size = len(theta)
    twisted = bool(problem.term.constant.any())
    inverse = np.eye(size) + problem.constant()
    both = np.hstack([problem.linear(), np.diag(root)])
    state = np.zeros((2 * size, 2 * size))
    state[:size] = -np.linalg.solve(inverse, both) if twisted else -both
    state[size:, :size] = np.diag(root)
    times, left, right = scipy.linalg.eig(state, left=True, right=True)
    kept = (np.abs(times) > 1e-12 * np.abs(times).max()) & (times.imag <= 0)
    lefts = left[:size, kept]
    if twisted:
        lefts = np.linalg.solve(inverse.T, lefts)
    return 1 / times[kept], right[:size, kept], lefts


def _free_pairs(problem: Projected, rigid: int) -> tuple[Complex, Complex, Complex]:
    theta = problem.found.theta
    heavy = theta > NO_MASS * theta[0]
    if problem.term.constant.any() or (not heavy.all() and problem.touch[~heavy].any()):
        raise UnsuitedError("Free motions beside dashpots without mass or unsymmetric stiffness.")
    scale = 1 / np.sqrt(theta[heavy])
    linear = scale[:, None] * problem.linear()[np.ix_(heavy, heavy)] * scale
    squares = problem.squares[heavy]
    squares[:rigid] = 0.0
    size = len(squares)
    modal = Quadratic(np.eye(size), linear, np.diag(squares), np.zeros(size))
    terms = float((np.abs(linear)).max(initial=0.0))
    pairs = modal_pairs(modal, rigid, terms)
    weights = np.zeros((len(theta), len(pairs.values)), complex)
    duals = weights.copy()
    weights[heavy], duals[heavy] = scale[:, None] * pairs.shapes, scale[:, None] * pairs.duals
    return pairs.values, weights, duals


def reduced_quadratic(
    reduction: Reduction,
    undamped: Undamped,
    law: Array,
    count: int,
    *,
    limit: float | None,
    whole: Quadratic,
    passive: bool,
    certify: bool,
) -> Damped:
    """The ``count`` eigenvalues of least magnitude or more, proved complete where that is possible.

    Parameters
    ----------
    undamped, law
        Converged undamped modes, rigid-body modes all there, and damping ratios to be added in them.
    limit
        The circle of the proof reaches at least so far, rad/s.
    whole
        The coefficients on all freedoms, law included, without norms.
    passive
        Nothing feeds energy in.

    Raises
    ------
    UnsuitedError
        The space grew too large.
    """
    if reduction.term.stiffness_part * float(undamped.angular[min(count, len(undamped.values)) - 1]) > 1:
        raise UnsuitedError("Slow overdamped eigenvalues gather at the inverse of the stiffness damping.")
    rates = 2 * law * undamped.angular
    acted = rates != 0
    held = reduction.mass @ undamped.shapes[:, acted]
    still = undamped.shapes[:, : undamped.rigid]
    solved = 0
    while True:
        if reduction.space.done < GROWTH * solved:
            reduction.grow()
            continue
        solved = reduction.space.done
        problem = _project(reduction, held, rates[acted])
        values, weights, duals = projected_pairs(problem, undamped.rigid)
        order = np.lexsort((-values.real, np.abs(values)))
        wanted = min(count + SPARE, len(order))
        if limit is not None:
            wanted = max(wanted, min(len(order), int((np.abs(values) <= limit).sum()) + SPARE))
        chosen = order[:wanted]
        off = problem.residual(values[chosen], weights[:, chosen])
        if len(order) >= count + SPARE and (off <= SHAPE).all():
            break
        reduction.grow()
    basis = reduction.space.basis @ problem.found.turn
    pairs = Pairs.found(values[chosen], basis @ weights[:, chosen], basis @ duals[:, chosen])
    with_norms = replace(whole, norm=_norm(reduction), dual_norm=_dual_norm(reduction))
    pairs = improve(with_norms, pairs, passive=passive)
    certified = prove(reduction, problem, undamped, pairs.values, count, limit) if certify else None
    damped = damped_from_pairs(pairs, still, reduction.mass, complete=False, certified=certified)
    return damped if passive else replace(damped, growing=_growing(problem, values, weights, order[wanted:]))


def _growing(
    problem: Projected, values: Complex, weights: Complex, others: NDArray[np.intp]
) -> complex | None:
    """The fastest growing eigenvalue among those not asked for, as far as the space shows it."""
    off = problem.residual(values[others], weights[:, others])
    certain = others[(off < 1e-3) & (values[others].real > 2 * off * np.abs(values[others]))]
    return complex(values[certain[np.argmax(values[certain].real)]]) if len(certain) else None


def _project(reduction: Reduction, held: Array, rates: Array) -> Projected:
    found = reduction.space.coordinates()
    basis = reduction.space.basis
    touch = found.turn.T @ (basis.T @ reduction.term.basis)
    return Projected(found, reduction.shift, reduction.term, touch, found.turn.T @ (basis.T @ held), rates)


def _norm(reduction: Reduction) -> Callable[[Complex], Array]:
    def norm(motion: Complex) -> Array:
        return np.asarray(np.abs(np.einsum("ij,ij->j", motion.conj(), reduction.regular @ motion)))

    return norm


def _dual_norm(reduction: Reduction) -> Callable[[Complex], Array]:
    def norm(force: Complex) -> Array:
        both = np.hstack([force.real, force.imag])
        work = np.einsum("ij,ij->j", both, reduction.factor.solve(both))
        return np.asarray(np.abs(work[: force.shape[1]] + work[force.shape[1] :]))

    return norm
