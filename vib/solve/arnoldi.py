"""The quadratic eigenproblem of large sparse systems: eigenvalues nearest zero by shift and invert.

With states (q, v = q'), (A - s B)^-1 B needs only S = s^2 M + s (C + G) + K factored once, in real arithmetic
(F. Tisseur, K. Meerbergen, SIAM Review 43 (2001) 235-286, section 5.2): for B (f, g) the solution is
q = -inv(S) (M g + (C + G + s M) f), v = f + s q. The shift is zero, or slightly negative for a free
structure, whose rigid-body motions are projected out exactly.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.linalg

from vib.errors import AccuracyError
from vib.massless import root_scale
from vib.solve.damped import Complex, Damped
from vib.solve.factor import Factor, SingularFactorError, factorise
from vib.solve.pairs import Pairs, Quadratic, damped_from_pairs, improve
from vib.solve.shift_invert import Shifted, shifted
from vib.solve.stability import is_passive
from vib.solve.two_level import BLOCK, largest, noise
from vib.solve.undamped import CANCELLATION, EPS, Array, Matrix, Undamped
from vib.solve.winding import Determinant, MissingError, affordable, missing_within, widest_gap

# Pivots of a stiffness scaled to a unit diagonal below this leave no digit of the slowest eigenvalues.
SINGULAR = 1e-14
SPURIOUS = 1e-4  # residual over its terms beyond which a pair is noise of eigenvalues at infinity
_NEXT_TO_NOTHING = 1e-11  # of the diagonal: eigenvalues of a damping matrix below this are round-off


def sparse_quadratic(
    mass: Matrix,
    linear: Matrix,
    stiffness: Matrix,
    undamped: Undamped,
    law: Array,
    count: int,
    *,
    circle: float | None = None,
) -> Damped:
    """The ``count`` eigenvalues of least magnitude of a large sparse system, one of each conjugate pair.

    Parameters
    ----------
    mass, linear, stiffness
        (n, n) csr_array; ``linear`` with gyroscopic terms, ``stiffness`` perhaps unsymmetric.
    undamped
        The lowest modes of the mass and the symmetric part of the stiffness, rigid-body modes all there.
    law
        Damping ratio to be added in each of them.
    circle
        Prove that none is missing within a circle about zero of this radius at least, rad/s, where that is
        affordable; None: no proof.

    Raises
    ------
    MissingError
        The proof finds eigenvalues missing.
    AccuracyError
        The factorisation or the iteration failed, or the stiffness is unsymmetric and singular.
    """
    problem = _Problem.of(mass, linear, stiffness, undamped, law)
    values, shapes = _search(problem, stiffness, count, transposed=False)
    if problem.symmetric:
        duals = shapes.conj()
    else:
        others, found = _search(problem, stiffness, count, transposed=True)
        # A left vector of l is the conjugate of a right vector of the transposed problem.
        duals = found[:, _partners(values, others)].conj()
    base = shifted(mass, (stiffness + stiffness.T) / 2)
    whole = Quadratic(
        mass=mass,
        linear=LowRank(linear, problem.held, problem.rates),
        constant=stiffness,
        slack=np.zeros(mass.shape[0]),
        norm=lambda x: _energy(mass, stiffness, base, x),
        dual_norm=lambda force: _dual_energy(base, force),
    )
    passive = problem.symmetric_stiffness and is_passive(linear, undamped)
    pairs = improve(whole, Pairs.found(values, shapes, duals), passive=passive)
    certified = None if circle is None else _proof(problem, stiffness, pairs.values, count, circle)
    return damped_from_pairs(pairs, problem.still, mass, complete=False, certified=certified)


def _proof(problem: _Problem, stiffness: Matrix, values: Complex, count: int, circle: float) -> float | None:
    """Magnitude below which no eigenvalue is missing, by the argument principle; None if not shown."""
    sizes = np.sort(np.abs(values))
    first = max(count - problem.still.shape[1], int((sizes <= circle).sum()))
    radius = widest_gap(sizes, first, circle)
    if radius is None:
        return None
    determinant = Determinant(problem.mass, problem.linear, stiffness, problem.held, problem.rates)
    if not affordable(determinant, radius):
        return None
    zeros = np.zeros(problem.still.shape[1] + problem.coasting.shape[1])
    known = np.concatenate([values, values[values.imag > 0].conj(), zeros])
    missing = missing_within(determinant.logarithm, known, radius)
    if missing:
        raise MissingError(missing)
    return None if missing is None else radius


@dataclass(frozen=True, eq=False)
class LowRank:
    """A sparse matrix plus ``held`` diag(``rates``) ``held``', with just the operations that are needed."""

    matrix: Matrix
    held: Array
    rates: Array

    @staticmethod
    def of(linear: Matrix, mass: Matrix, undamped: Undamped, law: Array) -> LowRank:
        """``linear`` and the damping ratios ``law`` (m,) of undamped modes."""
        rates = 2 * law * undamped.angular
        return LowRank(linear, mass @ undamped.shapes[:, rates != 0], rates[rates != 0])

    def diagonal(self) -> Array:
        """Its diagonal (n,)."""
        return np.asarray(self.matrix.diagonal() + (self.held**2) @ self.rates)

    def __matmul__(self, motion: Complex) -> Complex:
        return np.asarray(self.matrix @ motion + self.held @ (self.rates[:, None] * (self.held.T @ motion)))

    def __abs__(self) -> LowRank:
        return LowRank(abs(self.matrix), np.abs(self.held), np.abs(self.rates))


@dataclass(frozen=True, eq=False)
class _Problem:
    """Matrices, damping law, rigid-body motions and the one factorisation of S = s^2 M + s (C + G) + K."""

    mass: Matrix
    linear: Matrix
    held: Array  # (n, r) M x of the modes that the damping law acts on
    rates: Array  # (r,) their damping rates
    still: Array  # (n, z) rigid-body motions
    coasting: Array  # those of them that no velocity term touches
    dragged: Array  # the others
    symmetric: bool
    symmetric_stiffness: bool
    shift: float
    speed: float  # a typical eigenvalue, to scale velocities like displacements
    weight: Array  # and displacements like forces
    factor: Factor

    @staticmethod
    def of(mass: Matrix, linear: Matrix, stiffness: Matrix, undamped: Undamped, law: Array) -> _Problem:
        rates = 2 * law * undamped.angular
        acted = rates != 0
        still = undamped.shapes[:, : undamped.rigid]
        straight = abs(stiffness - stiffness.T).max() == 0
        if undamped.rigid and not straight:
            raise AccuracyError(
                "A large system with rigid-body motions and an unsymmetric stiffness can't be solved yet; "
                "hold it by soft springs, or reduce it below 400 freedoms."
            )
        elastic = undamped.angular[undamped.rigid :]
        speed = float(elastic[len(elastic) // 2]) if len(elastic) else 1.0
        shift = -0.1 * float(elastic[0]) if undamped.rigid and len(elastic) else 0.0
        coasting, dragged = _split(linear, still)
        drag = scipy.linalg.svdvals(dragged.T @ (linear @ dragged))
        if drag.size and drag[-1] <= 1e-12 * drag[0]:
            raise AccuracyError(
                "A large free system whose rigid-body motions are turned by gyroscopic forces alone can't be "
                "solved yet; hold it by soft springs, or reduce it below 400 freedoms."
            )
        try:
            factor = factorise(shift**2 * mass + shift * linear + stiffness, symmetric=False)
        except SingularFactorError as problem:
            raise AccuracyError(
                "The stiffness is singular although no rigid-body motion was found; "
                "some entries are too far apart."
            ) from problem
        if shift == 0 and factor.least_pivot < SINGULAR:
            raise AccuracyError(
                "The stiffness is singular or nearly so although its symmetric part is not; "
                "a large system like this can't be solved yet."
            )
        return _Problem(
            mass=mass,
            linear=linear,
            held=mass @ undamped.shapes[:, acted],
            rates=rates[acted],
            still=still,
            coasting=coasting,
            dragged=dragged,
            symmetric=bool(straight) and abs(linear - linear.T).max() == 0,
            symmetric_stiffness=bool(straight),
            shift=shift,
            speed=speed,
            weight=1 / root_scale(np.asarray(stiffness.diagonal())),
            factor=factor,
        )

    def velocity_force(self, motion: Any, *, transposed: bool) -> Any:
        """(C + G + law) @ motion."""
        matrix = self.linear.T if transposed else self.linear
        return np.asarray(matrix @ motion + self.held @ (self.rates[:, None] * (self.held.T @ motion)))

    def projected(self, motion: Array, speed: Array, *, transposed: bool) -> tuple[Array, Array]:
        """The state without its part at eigenvalue zero: coasting motions, and the rest of dragged ones."""
        if self.coasting.shape[1]:
            motion = motion - self.coasting @ (self.coasting.T @ (self.mass @ motion))
            speed = speed - self.coasting @ (self.coasting.T @ (self.mass @ speed))
        if self.dragged.shape[1]:
            matrix = self.linear.T if transposed else self.linear
            kept = self.dragged.T @ (matrix @ motion + self.mass @ speed)
            motion = motion - self.dragged @ np.linalg.solve(self.dragged.T @ (matrix @ self.dragged), kept)
        return motion, speed


def _split(linear: Matrix, still: Array) -> tuple[Array, Array]:
    """Rigid-body motions that no velocity term touches, and the others."""
    if not still.shape[1]:
        return still, still
    touched = np.vstack([linear @ still, linear.T @ still])
    terms = float((abs(linear) @ np.abs(still)).max(initial=0.0))
    _, sizes, turned = scipy.linalg.svd(touched, full_matrices=False)
    free = sizes <= CANCELLATION * EPS * max(terms, np.finfo(float).tiny)
    return still @ turned[free].T, still @ turned[~free].T


def _search(problem: _Problem, stiffness: Matrix, count: int, *, transposed: bool) -> tuple[Complex, Complex]:
    """Eigenvalues nearest the shift and displacement shapes, one of each pair, ``count`` or more."""
    size = problem.mass.shape[0]
    solved = problem.factor.solve(problem.held, transposed=transposed) if problem.rates.size else problem.held
    small = np.diag(1 / problem.rates) + problem.shift * (problem.held.T @ solved)

    def solve(force: Array) -> Array:
        found = problem.factor.solve_once(force, transposed=transposed)
        if problem.shift == 0 or not problem.rates.size:
            return found
        return np.asarray(found - problem.shift * (solved @ np.linalg.solve(small, problem.held.T @ found)))

    def step(motion: Array, speed: Array) -> tuple[Array, Array]:
        motion, speed = motion / weight, speed * (problem.speed / weight)
        motion, speed = problem.projected(motion, speed, transposed=transposed)
        force = problem.velocity_force(motion, transposed=transposed)
        force = force + problem.mass @ (speed + problem.shift * motion)
        found = -solve(force)
        motion, speed = problem.projected(found, motion + problem.shift * found, transposed=transposed)
        return motion * weight, speed * (weight / problem.speed)

    weight = problem.weight[:, None]
    start = np.random.default_rng(2).standard_normal((size, BLOCK))
    found = largest(step, step(start, start)[0], problem.still * weight, min(2 * count + 4, 2 * size))
    # noise belongs to motions that were projected out and to those without mass
    kept = np.logical_not(noise(found.values))
    values, shapes = problem.shift + 1 / found.values[kept], found.motions[:, kept] / weight
    true = _solves(problem, stiffness.T if transposed else stiffness, values, shapes, transposed=transposed)
    return _upright(values[true], shapes[:, true])


def _solves(
    problem: _Problem, stiffness: Matrix, values: Complex, shapes: Complex, *, transposed: bool
) -> np.ndarray[tuple[int], np.dtype[np.bool_]]:
    """Which pairs (m,) are near solutions at all."""
    heavy, stiff = problem.mass @ shapes, stiffness @ shapes
    force = problem.velocity_force(shapes, transposed=transposed)
    off = np.abs(values**2 * heavy + values * force + stiff) / problem.weight[:, None]
    terms = np.abs(values**2 * heavy) + np.abs(values * force) + np.abs(stiff)
    terms = terms / problem.weight[:, None]
    return np.asarray(np.linalg.norm(off, axis=0) <= SPURIOUS * np.linalg.norm(terms, axis=0))


def _upright(values: Complex, shapes: Complex) -> tuple[Complex, Complex]:
    """One of each conjugate pair; a lower one whose partner was not returned is turned up."""
    upper = np.flatnonzero(values.imag >= 0)
    lower = np.flatnonzero(values.imag < 0)
    if len(upper):
        away = np.abs(values[lower].conj()[:, None] - values[upper]).min(axis=1, initial=np.inf)
        lower = lower[away > 1e-6 * np.abs(values[lower])]
    found = np.concatenate([values[upper], values[lower].conj()])
    moved = np.hstack([shapes[:, upper], shapes[:, lower].conj()])
    order = np.argsort(np.abs(found), kind="stable")
    return found[order], moved[:, order]


def _partners(values: Complex, others: Complex) -> np.ndarray[tuple[int], np.dtype[np.intp]]:
    """For each eigenvalue the nearest one of the transposed problem, each used once while there are any."""
    distance = np.abs(values[:, None] - others)
    chosen = np.zeros(len(values), dtype=np.intp)
    for index in range(len(values)):
        chosen[index] = int(np.argmin(distance[index]))
        if index + 1 < len(values) and np.isfinite(np.delete(distance[index], chosen[index])).any():
            distance[:, chosen[index]] = np.inf
    return chosen


def _energy(mass: Matrix, stiffness: Matrix, base: Shifted, motion: Complex) -> Array:
    force = stiffness @ motion - base.shift * (mass @ motion)
    return np.asarray(np.abs(np.einsum("ij,ij->j", motion.conj(), force)))


def _dual_energy(base: Shifted, force: Complex) -> Array:
    real, imaginary = base.factor.solve(force.real), base.factor.solve(force.imag)
    both = np.einsum("ij,ij->j", force.real, real) + np.einsum("ij,ij->j", force.imag, imaginary)
    return np.asarray(np.abs(both))
