"""Arnoldi process for second-order systems in blocks, with one basis for displacements and velocities.

Both halves of a state (q, v) lie in one space of vectors of n rows that grows by one column for each step, so
that only it is stored (two-level orthogonal Arnoldi, D. Lu, Y. Su, Z. Bai, SIAM J. Matrix Anal. Appl. 37
(2016) 195-214); states are orthonormal through small matrices. Blocks find eigenvalues that are there several
times.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import NamedTuple

import numpy as np
import scipy.linalg
from numpy.typing import NDArray

from vib.errors import AccuracyError
from vib.solve.damped import Complex
from vib.solve.undamped import EPS, Array

Step = Callable[[Array, Array], tuple[Array, Array]]

BLOCK = 4
CONVERGED = 1e-13  # residual over the eigenvalue
ROUND = 8 * EPS  # of the largest eigenvalue: what no step improves
TOLERATED = 1e-9  # where the space may not grow any more; Newton steps and error bars do the rest
DEPENDENT = 1e-13  # of its length: what is left of a vector below this is round-off
COLUMNS, SPARE = 14, 120  # most states: so many for each eigenvalue wanted, and these
BYTES = 4e9
GROWTH = 1.12  # of the space between two looks at its eigenvalues


class Largest(NamedTuple):
    """Eigenvalues (m,) of the operator by magnitude, falling, and displacement parts (n, m)."""

    values: Complex
    motions: Complex


def largest(step: Step, start: Array, held: Array, wanted: int) -> Largest:
    """The ``wanted`` eigenvalues of largest magnitude of an operator on states, or all that there are.

    Parameters
    ----------
    step
        From displacements and velocities (n, b) to those that the operator makes of them.
    start
        Displacements (n, b) of the first states.
    held
        Motions (n, z) that ``step`` may add to any displacement or velocity.
    wanted
        How many.

    Raises
    ------
    AccuracyError
        The process did not converge in the room it may take.
    """
    space = _Space(step, start, held)
    size = start.shape[0]
    most = min(2 * size, COLUMNS * wanted + SPARE, int(BYTES / (8 * size)))
    looked = 0
    while True:
        closed = space.advance()
        if not closed and space.done < most and space.done < max(wanted + BLOCK, GROWTH * looked):
            continue
        looked = space.done
        values, weights, residuals = space.ritz(wanted)
        size_of = np.abs(values)
        good = residuals <= np.maximum(CONVERGED * size_of, ROUND * size_of.max(initial=0.0))
        if closed or space.done >= 2 * size or (len(values) >= wanted and good.all()):
            return Largest(values, space.motions(weights))
        if space.done >= most:
            if len(values) >= wanted and (residuals <= TOLERATED * size_of).all():
                return Largest(values, space.motions(weights))
            raise AccuracyError(
                f"The search for {wanted} eigenvalues did not converge in {space.done} steps; ask for fewer "
                "modes or a lower highest frequency."
            )


class _Space:
    """Q (n, r), states Q (2 r, k) U, and the operator projected on them, H (k + b, k)."""

    def __init__(self, step: Step, start: Array, held: Array) -> None:
        self._step = step
        self._basis = np.zeros((start.shape[0], 0))
        self._widen(held)
        self._widen(start)
        first = self._basis.T @ start
        self._parts = np.zeros((2, self._basis.shape[1], 0))
        self._projected = np.zeros((0, 0))
        self.done = 0
        self._link = np.zeros((0, 0))
        self._waiting = _unit(np.stack([first, np.zeros_like(first)]))

    def advance(self) -> bool:
        """Apply the operator to the block that waits; whether the space is closed under it."""
        block = self._waiting
        width = block.shape[2]
        motion, speed = self._step(self._basis @ block[0], self._basis @ block[1])
        before = self._basis.shape[1]
        self._widen(motion)
        grown = self._basis.shape[1] - before
        self._parts = np.pad(np.concatenate([self._parts, block], axis=2), ((0, 0), (0, grown), (0, 0)))
        image = np.stack([self._basis.T @ motion, self._basis.T @ speed])
        flat, known = _flat(image), _flat(self._parts)
        fresh = _beyond(flat, known)
        total = self.done + width
        projected = np.zeros((total, total))
        projected[: self.done, : self.done] = self._projected
        if self._link.size:
            projected[self.done : total, : self.done] = self._link
        projected[:, self.done : total] = known.T @ flat
        self._projected = projected
        self._link = np.zeros((fresh.shape[1], total))
        self._link[:, self.done :] = fresh.T @ flat
        self.done = total
        self._waiting = fresh.reshape(2, self._basis.shape[1], fresh.shape[1])
        return not fresh.size

    def ritz(self, wanted: int) -> tuple[Complex, Complex, Array]:
        """Values (m,) by magnitude, weights (k, m) and residuals (m,)."""
        values, weights = scipy.linalg.eig(self._projected)
        chosen = np.argsort(-np.abs(values), kind="stable")[:wanted]
        if len(chosen) and len(chosen) < len(values) and values[chosen[-1]].imag > 0:
            chosen = np.append(chosen, np.argsort(-np.abs(values), kind="stable")[wanted])
        values, weights = values[chosen], weights[:, chosen]
        return values, weights, np.linalg.norm(self._link @ weights, axis=0)

    def motions(self, weights: Complex) -> Complex:
        """Displacement parts of states of these weights."""
        return np.asarray(self._basis @ (self._parts[0] @ weights))

    def _widen(self, vectors: Array) -> None:
        """Add what is new in the vectors (n, b) to Q."""
        self._basis = np.hstack([self._basis, _beyond(vectors, self._basis)])


def _flat(parts: Array) -> Array:
    return parts.reshape(-1, parts.shape[2])


def _unit(parts: Array) -> Array:
    fresh = _beyond(_flat(parts), np.zeros((2 * parts.shape[1], 0)))
    return fresh.reshape(2, parts.shape[1], fresh.shape[1])


def _beyond(vectors: Array, basis: Array) -> Array:
    """Orthonormal columns that span what the vectors (m, b) have outside an orthonormal basis (m, k).

    What nearly lies inside is normalised and freed of the basis once more, lest round-off lead back into it.
    """
    fresh, least = vectors, DEPENDENT
    for _ in range(3):
        length = np.linalg.norm(fresh, axis=0)
        fresh = fresh[:, length > 0] / length[length > 0]
        for _ in range(2):
            fresh = fresh - basis @ (basis.T @ fresh)
        if not fresh.shape[1]:
            break
        columns, shares, _ = scipy.linalg.qr(fresh, mode="economic", pivoting=True)
        fresh = columns[:, np.abs(np.diag(shares)) > least]
        least = 0.5
    return fresh


def noise(values: Complex) -> NDArray[np.bool_]:
    """Which eigenvalues (m,) of an operator are round-off of none."""
    size = np.abs(values)
    return np.asarray(size <= 1e3 * EPS * size.max(initial=0.0))
