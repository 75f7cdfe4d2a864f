"""Frequency response of symmetric systems as a sum over undamped modes, plus what the modes left out add.

Each mode adds shape shape' / (w_i^2 - w^2 + i w d_i). Damping that couples the modes but acts in few
directions (dashpots) is put back exactly by the Sherman-Morrison-Woodbury formula on those directions. Modes
that were not computed are stood for by their static flexibility and further terms of its power series in the
frequency, with a bound for the rest.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from vib.errors import ModelError
from vib.response.exponential import Array
from vib.solve.factor import factorise
from vib.solve.undamped import Undamped
from vib.system import Matrix

Complex = NDArray[np.complex128]

TARGET = 1e-10  # of the residual flexibility, for the tail of the power series
MOST_TERMS = 16
_NEAR = 1e-4  # of w^2; modes nearer than this to a line are not summed where dashpots couple them
_CHUNK = 6_000_000  # complex numbers at a time


@dataclass(frozen=True, eq=False)
class Dashpots:
    """A term directions (n, q) (i w linear + constant) directions' of the dynamic stiffness.

    ``linear`` and ``constant`` are (q, q), or (k, q, q) where they differ from line to line.
    """

    directions: Array
    linear: Array
    constant: Array

    @property
    def count(self) -> int:
        """How many directions."""
        return int(self.directions.shape[1])


@dataclass(frozen=True, eq=False)
class Remainder:
    """What modes that were not computed add: moments (terms, rows, columns) of a power series.

    In x = mu + shift with mu = (w^2 - i w a) / (1 + i w b), for damping a M + b K of those modes:
    (moment_0 + x moment_1 + x^2 moment_2 + ...) / (1 + i w b). ``sizes_out`` and ``sizes_in`` are the square
    roots of the residual flexibility at each row and column; ``limit`` is the lowest w_i^2 + shift left out;
    ``law_limit`` the largest ratio that the damping law gives them.
    """

    moments: Array
    shift: float
    sizes_out: Array
    sizes_in: Array
    limit: float
    law_limit: float


@dataclass(frozen=True, eq=False)
class ModalSum:
    """Modes with their damping rates (m,) at the rows and columns of interest.

    ``rows`` (r, m) and ``columns`` (c, m) are the shapes at the outputs (then dashpots) and at the inputs
    (then dashpots); ``direct`` (r, c) the flexibility of motions without mass; ``mass_part`` and
    ``stiffness_part`` the damping a M + b K of the modes that were left out; ``errors`` (m,) bound the error
    of each angular frequency, rad/s.
    """

    squares: Array
    rates: Array
    rows: Array
    columns: Array
    direct: Array | None
    remainder: Remainder | None
    mass_part: float = 0.0
    stiffness_part: float = 0.0
    errors: Array | None = None

    def __call__(self, omega: Array, *, without: NDArray[np.bool_] | None = None) -> Complex:
        """The receptance between rows and columns at angular frequencies (k,), rad/s: (k, r, c)."""
        r, c, m = len(self.rows), len(self.columns), len(self.squares)
        table = (self.rows[:, None, :] * self.columns[None, :, :]).reshape(r * c, m).T
        found = np.empty((omega.size, r * c), np.complex128)
        step = max(1, _CHUNK // max(1, m + r * c))
        for first in range(0, omega.size, step):
            piece = slice(first, first + step)
            weights = 1 / self.denominators(omega[piece])
            if without is not None:
                weights[without[piece]] = 0.0
            found[piece].real = weights.real @ table
            found[piece].imag = weights.imag @ table
        shaped = found.reshape(omega.size, r, c)
        if self.direct is not None:
            shaped += self.direct
        if self.remainder is not None:
            shaped += self._rest(omega)
        return shaped

    def denominators(self, omega: Array) -> Complex:
        """w_i^2 - w^2 + i w d_i, (k, m)."""
        found = np.empty((omega.size, len(self.squares)), np.complex128)
        # a difference of squares, so that nothing is lost next to a resonance
        angular = np.sqrt(np.abs(self.squares))
        found.real = np.where(
            self.squares >= 0,
            (angular - omega[:, None]) * (angular + omega[:, None]),
            self.squares - omega[:, None] ** 2,
        )
        found.imag = np.outer(omega, self.rates)
        return found

    def moved(self, omega: Array) -> Array:
        """How far the errors of the frequencies move the sum, (k, r, c), to first order."""
        r, c, m = len(self.rows), len(self.columns), len(self.squares)
        if self.errors is None or not self.errors.any():
            return np.zeros((omega.size, r, c))
        table = (np.abs(self.rows)[:, None, :] * np.abs(self.columns)[None, :, :]).reshape(r * c, m).T
        change = 2 * np.sqrt(np.abs(self.squares)) * self.errors
        found = np.empty((omega.size, r * c))
        step = max(1, _CHUNK // max(1, m + r * c))
        for first in range(0, omega.size, step):
            piece = slice(first, first + step)
            found[piece] = (change / np.abs(self.denominators(omega[piece])) ** 2) @ table
        return found.reshape(omega.size, r, c)

    def error(self, omega: Array) -> Array:
        """Bound (k, r, c) of all that is wrong with the sum; 0 where every mode is in it."""
        if self.remainder is None:
            return np.zeros((omega.size, len(self.rows), len(self.columns)))
        sizes = np.outer(self.remainder.sizes_out, self.remainder.sizes_in)
        return np.asarray(self.rest_bound(omega)[:, None, None] * sizes + self.moved(omega))

    def _rest(self, omega: Array) -> Complex:
        assert self.remainder is not None
        scale, x = self._series(omega)
        powers = x[:, None] ** np.arange(len(self.remainder.moments))
        return np.asarray(np.einsum("kt,trc->krc", powers / scale[:, None], self.remainder.moments))

    def _series(self, omega: Array) -> tuple[Complex, Complex]:
        assert self.remainder is not None
        scale: Complex = (1 + 1j * omega * self.stiffness_part).astype(np.complex128)
        return scale, (omega**2 - 1j * omega * self.mass_part) / scale + self.remainder.shift

    def rest_bound(self, omega: Array) -> Array:
        """A number (k,) per line: the error at row i, column j is at most it times sizes_out_i sizes_in_j.

        The tail of the power series: with every w_i^2 + shift left out at least ``limit`` the terms
        fall at least as fast as (x / limit)^t, and the sum of products of shapes over those modes is bounded
        by Cauchy and Schwarz. And the ratios of the damping law, which the series leaves out:
        2 ratio w w_i^3 / (w_i^2 - w^2)^2 of the flexibility of each mode, largest for the lowest.
        """
        if self.remainder is None:
            return np.zeros(omega.size)
        rest = self.remainder
        scale, x = self._series(omega)
        ratio = np.abs(x) / rest.limit
        tail = ratio ** len(rest.moments) / np.maximum(1 - ratio, 1e-12) / np.abs(scale)
        lowest = rest.limit - rest.shift
        gap = np.maximum(lowest - omega**2, 1e-12 * lowest)
        law = 2 * rest.law_limit * omega * lowest**1.5 / gap**2 * (rest.limit / lowest)
        return np.asarray(tail + law)


def coupled(
    summed: ModalSum, omega: Array, outputs: int, inputs: int, dashpots: Dashpots
) -> tuple[Complex, Array]:
    """Receptance (k, outputs, inputs) with the dashpots put back, and the bound of its error, alike.

    The rows of ``summed`` are the outputs, then the dashpots; its columns the inputs, then the dashpots.

    References
    ----------
    W. W. Hager, SIAM Review 31 (1989) 221-239, eq. (1): the inverse after a change of low rank.
    """
    q = dashpots.count
    found = np.empty((omega.size, outputs, inputs), np.complex128)
    bound = np.zeros((omega.size, outputs, inputs))
    step = max(1, _CHUNK // max(1, (outputs + q) * (inputs + q) + len(summed.squares)))
    linear, constant = (
        np.broadcast_to(matrix, (omega.size, q, q)) for matrix in (dashpots.linear, dashpots.constant)
    )
    for first in range(0, omega.size, step):
        piece = slice(first, first + step)
        lines = omega[piece]
        core = 1j * lines[:, None, None] * linear[piece] + constant[piece]
        near = np.abs(summed.denominators(lines)) < _NEAR * (lines[:, None] ** 2)
        whole = summed(lines, without=near)
        left = np.zeros((lines.size, outputs, q), np.complex128)
        right = np.zeros((lines.size, q, inputs), np.complex128)
        easy = ~near.any(axis=1)
        inverse = np.linalg.inv(np.eye(q) + whole[easy, outputs:, inputs:] @ core[easy])
        left[easy] = whole[easy, :outputs, inputs:] @ core[easy] @ inverse
        right[easy] = core[easy] @ inverse @ whole[easy, outputs:, :inputs]
        found[piece] = whole[:, :outputs, :inputs] - left @ whole[:, outputs:, :inputs]
        for line in np.flatnonzero(~easy):
            answer = _near(summed, lines[line], near[line], whole[line], core[line], (outputs, inputs))
            found[first + line], left[line], right[line] = answer
        if summed.remainder is not None:
            bound[piece] = _bound(summed.error(lines), left, right)
    return found, bound


def _near(
    summed: ModalSum,
    omega: float,
    near: NDArray[np.bool_],
    whole: Complex,
    core: Complex,
    shape: tuple[int, int],
) -> tuple[Complex, Complex, Complex]:
    """One line next to an undamped frequency: the modes there keep their own equations.

    With y the motion at the dashpots and z the coordinates of those modes:
    y + H core y - shapes z = H f and (columns' core) y + denominator z = columns' f.
    """
    outputs, inputs = shape
    q, k = len(core), int(near.sum())
    rows, columns = summed.rows[:, near], summed.columns[:, near]
    own = summed.denominators(np.array([omega]))[0, near]
    scale = omega**2  # both kinds of equation in the same unit
    system = np.block(
        [
            [np.eye(q) + whole[outputs:, inputs:] @ core, -rows[outputs:]],
            [columns[inputs:].T @ core / scale, np.diag(own) / scale],
        ]
    )
    loads = np.vstack([whole[outputs:, :inputs], columns[:inputs].T / scale])
    seen = np.hstack([-whole[:outputs, inputs:] @ core, rows[:outputs]])
    transfer = np.linalg.solve(system.T, seen.T).T
    answer = np.linalg.solve(system, loads)
    assert transfer.shape[1] == q + k
    return whole[:outputs, :inputs] + transfer @ loads, -transfer[:, :q], core @ answer[:q]


def _bound(error: Array, left: Complex, right: Complex) -> Array:
    """To first order: an error E between all rows and columns becomes (I, -left) E (I, -right')'."""
    k, outputs, _ = left.shape
    inputs = right.shape[2]
    before = np.concatenate([np.broadcast_to(np.eye(outputs), (k, outputs, outputs)), np.abs(left)], axis=2)
    after = np.concatenate([np.broadcast_to(np.eye(inputs), (k, inputs, inputs)), np.abs(right)], axis=1)
    return np.asarray(before @ error @ after)


def remainder(
    mass: Matrix,
    stiffness: Matrix,
    modes: Undamped,
    outputs: Array,
    inputs: Array,
    highest: float,
    law_limit: float,
) -> Remainder:
    """The power series of what the modes left out add at ``outputs`` (n, r) for forces ``inputs`` (n, c).

    Parameters
    ----------
    highest
        The highest angular frequency of the lines, rad/s; must lie below that of the lowest mode left out.
    law_limit
        The largest ratio that the damping law gives a mode left out.

    Raises
    ------
    ModelError
        The modes do not reach beyond ``highest``.

    References
    ----------
    R. R. Craig, Structural Dynamics, mode-acceleration method (from memory); the further terms are its power
    series in the frequency, the bound is ours.
    """
    shapes, squares = modes.shapes, modes.values
    certified = modes.certified if modes.certified is not None else float(modes.angular[-1])
    elastic = squares[modes.rigid :]
    shift = float(np.abs(elastic[0])) if modes.rigid and elastic.size else 0.0
    limit, reach = certified**2 + shift, highest**2 + shift
    if reach >= 0.9 * limit:
        raise ModelError(
            f"frequency response: modes up to {certified / 2 / np.pi:.4g} Hz do not reach beyond the highest "
            f"line, {highest / 2 / np.pi:.4g} Hz"
        )
    solver = factorise(stiffness + shift * mass if shift else stiffness)
    terms = int(np.clip(np.ceil(np.log(TARGET) / np.log(reach / limit)), 1, MOST_TERMS))

    def project(vectors: Array) -> Array:
        return np.asarray(vectors - shapes @ (shapes.T @ (mass @ vectors)))

    answer = project(solver.solve(inputs))
    sizes_in = np.einsum("ij,ij->j", inputs, answer)
    sizes_out = np.einsum("ij,ij->j", outputs, project(solver.solve(outputs)))
    moments = [outputs.T @ answer]
    for _ in range(terms - 1):
        answer = project(solver.solve(mass @ answer))
        moments.append(outputs.T @ answer)
    return Remainder(
        np.array(moments),
        shift,
        np.sqrt(np.maximum(sizes_out, 0.0)),
        np.sqrt(np.maximum(sizes_in, 0.0)),
        limit,
        law_limit,
    )
