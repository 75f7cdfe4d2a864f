"""The lowest modes of large sparse undamped systems, with a proof that none is missing.

Shift-invert block Lanczos in the mass inner product (`vib.solve.krylov`) up to a bound on each eigenvalue's
error, then a Sylvester inertia count just above the last mode (Grimes, Lewis & Simon 1994, sect. 4.4); where
the count finds more, the search goes on in new directions until the numbers agree.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import scipy.linalg
from numpy.typing import NDArray

from vib.errors import AccuracyError
from vib.solve.backends.interface import Array, Factor, FactorError, Matrix
from vib.solve.bounds import ascending, theta_bounds
from vib.solve.krylov import Krylov, Ritz
from vib.solve.pencil import Pencil
from vib.solve.undamped import Undamped, elastic_ratio, round_off, stores_nothing

Progress = Callable[[float, float], None]

BLOCK = 8
# Relative accuracy of each eigenvalue (of its distance from the shift), and of the residual, which sets that
# of the shapes: they enter participation and energy shares, where six figures are plenty.
VALUE_ACCURACY = 1e-11
SHAPE_ACCURACY = 1e-7
# A gap between two eigenvalues, relative to them, wide enough for an inertia count in its middle.
GAP = 1e-5
# First shift of a free structure, as a share of the highest eigenvalue: far above round-off in the stiffness,
# far below its elastic modes. It is moved to the first elastic mode where it is out of proportion to that.
FREE_SHIFT = 1e-9
SHIFT_RANGE = (1e-6, 10.0)
BASIS_BYTES = 4e9
MOST_STEPS_PER_MODE = 40


def lowest_modes(
    mass: Matrix,
    stiffness: Matrix,
    *,
    count: int | None = None,
    below: float | None = None,
    backend: str | None = None,
    block: int = BLOCK,
    basis_bytes: float = BASIS_BYTES,
    progress: Progress | None = None,
) -> Undamped:
    """The lowest eigenvalues of stiffness x = value mass x, all multiplicities, certified by an inertia count.

    Parameters
    ----------
    mass, stiffness
        (n, n), sparse symmetric; the mass positive semi-definite.
    count
        How many modes.
    below
        Every mode below this angular frequency, rad/s; with ``count`` at most that many of them.
    backend
        Library that factorises, see `vib.solve.backends.choice.factor`; None for automatic choice.
    block
        Columns solved for at a time.
    basis_bytes
        Most memory for the basis; it is restarted when full.
    progress
        Called after each step with the share of the work done and an estimate of the seconds left.

    Raises
    ------
    AccuracyError
        No factorisation could be trusted, the search did not converge, the inertia count contradicts it, or
        it was interrupted from the keyboard; ``partial`` holds the modes that had converged (`Undamped`).
    """
    if count is None and below is None:
        raise ValueError("lowest_modes: give count, below or both.")
    with Pencil(mass, stiffness, backend) as pencil:
        search = _Search(pencil, block, basis_bytes, _Clock(progress))
        try:
            return search.run(count, below)
        except KeyboardInterrupt:
            found = search.partial()
            done = 0 if found is None else len(found.values)
            raise AccuracyError(f"Interrupted after {done} modes had converged.", partial=found) from None


@dataclass
class _Clock:
    """Share of the work done and the time it will still take, from the pace so far."""

    report: Progress | None
    factor_seconds: float = 0.0
    step_seconds: float = 0.0
    share: float = 0.0

    def __post_init__(self) -> None:
        self._start = time.perf_counter()

    def tell(self, steps_left: float, factorisations_left: int) -> None:
        if self.report is None:
            return
        past = time.perf_counter() - self._start
        left = steps_left * self.step_seconds + factorisations_left * self.factor_seconds
        self.share = max(self.share, past / (past + left)) if past + left > 0 else 0.0
        self.report(self.share, left)


class _Search:
    """One search: the shift, the basis, what is wanted of it, and the proof."""

    def __init__(self, pencil: Pencil, block: int, basis_bytes: float, clock: _Clock) -> None:
        self.pencil, self.block, self.basis_bytes, self.clock = pencil, block, basis_bytes, clock
        self.krylov: Krylov | None = None
        self.shift = 0.0
        self.below_shift = 0
        self.history: list[float] = []

    def run(self, count: int | None, below: float | None) -> Undamped:
        size = self.pencil.size
        limit_count: int | None = None
        if below is not None:
            limit_count = self._factorise(below**2).negative
            if limit_count is None:
                raise AccuracyError("The inertia of the shifted stiffness could not be found; ask by count.")
            if limit_count == 0:
                none = np.zeros(0)
                return Undamped(none, np.zeros((size, 0)), none, 0, complete=False, certified=below)
        wanted = min(limit_count if limit_count is not None else size, count if count is not None else size)
        capacity = self._capacity(wanted)
        krylov = self._settle(capacity)
        if limit_count is not None and wanted == limit_count and below is not None:
            ritz, order = self._converge(krylov, wanted)
            return self._result(krylov, ritz, order[:wanted], certified=below)
        return self._certified(krylov, wanted)

    def partial(self) -> Undamped | None:
        """The modes that have converged so far, lowest first, without proof."""
        krylov = self.krylov
        if krylov is None or krylov.done == 0:
            return None
        ritz = krylov.ritz()
        order, _ = ascending(ritz, self.shift, self.below_shift)
        good = self._converged(ritz)[order]
        first = int(np.argmin(good)) if not good.all() else len(good)
        return self._result(krylov, ritz, order[:first], certified=None) if first else None

    def _factorise(self, shift: float) -> Factor:
        start = time.perf_counter()
        factor = self.pencil.factorise(shift)
        self.clock.factor_seconds = time.perf_counter() - start
        return factor

    def _capacity(self, wanted: int) -> int:
        """Columns of the basis: enough not to restart, if the memory allows it."""
        most = int(self.basis_bytes / (8 * self.pencil.size))
        least = wanted + 4 * self.block
        if most < least:
            gigabytes = least * 8 * self.pencil.size / 1e9
            raise AccuracyError(
                f"{wanted} modes of {self.pencil.size} freedoms need a basis of {gigabytes:.1f} GB, "
                f"{self.basis_bytes / 1e9:.1f} GB are allowed; ask for fewer modes or a lower limit."
            )
        return min(most, 3 * wanted + 16 * self.block)

    # -- the shift ---------------------------------------------------------------------------------------

    def _settle(self, capacity: int) -> Krylov:
        """A basis about a shift where K - shift M is safely regular: 0, or below 0 for a free structure."""
        try:
            krylov = self._begin(0.0, capacity)
            if not self._trial(krylov)[0]:
                return krylov
        except FactorError:
            pass
        self.krylov = None
        shift = -FREE_SHIFT * self.pencil.highest_ratio()
        for _ in range(6):
            krylov = self._begin(shift, capacity)
            krylov.step()
            _, elastic = self._trial(krylov)
            if elastic is None or SHIFT_RANGE[0] * elastic <= -shift <= SHIFT_RANGE[1] * elastic:
                break
            shift = -elastic
        return krylov

    def _begin(self, shift: float, capacity: int) -> Krylov:
        factor = self._factorise(shift)
        self.shift = shift
        self.below_shift = factor.negative or 0
        self.krylov = Krylov(self.pencil, factor, block=self.block, capacity=capacity)
        return self.krylov

    def _trial(self, krylov: Krylov) -> tuple[bool, float | None]:
        """Whether the basis so far holds a rigid-body motion, and its lowest elastic eigenvalue."""
        basis = krylov.basis
        values, turn = scipy.linalg.eigh(_symmetric(basis.T @ (self.pencil.stiffness @ basis)))
        energy, terms = elastic_ratio(self.pencil.stiffness, basis @ turn)
        rigid = stores_nothing(energy, terms)
        elastic = np.abs(energy[~rigid])
        return bool(rigid.any()), float(elastic.min()) if elastic.size else None

    # -- convergence -------------------------------------------------------------------------------------

    def _converged(self, ritz: Ritz) -> NDArray[np.bool_]:
        size = np.abs(ritz.theta)
        return (theta_bounds(ritz) <= VALUE_ACCURACY * size) & (ritz.residuals <= SHAPE_ACCURACY * size)

    def _converge(self, krylov: Krylov, wanted: int) -> tuple[Ritz, NDArray[np.intp]]:
        """Go on until the lowest ``wanted`` approximations have converged."""
        most = 20 + MOST_STEPS_PER_MODE * -(-wanted // self.block)
        for _ in range(most):
            if krylov.done:
                ritz = krylov.ritz()
                order, _ = ascending(ritz, self.shift, self.below_shift)
                good = self._converged(ritz)[order]
                if len(order) >= wanted and good[:wanted].all():
                    return ritz, order
                self._tell(ritz, order, wanted)
                if krylov.full:
                    kept = order[: min(len(order), wanted + (krylov.done - wanted) // 3)]
                    krylov.restart(ritz, np.sort(kept))
            if krylov.exhausted:
                krylov.add_random()
                if krylov.exhausted:  # the operator's whole range is in the basis
                    ritz = krylov.ritz()
                    return ritz, ascending(ritz, self.shift, self.below_shift)[0]
            start = time.perf_counter()
            krylov.step()
            self.clock.step_seconds = time.perf_counter() - start
        raise AccuracyError(
            f"The search for {wanted} modes did not converge in {most} steps.", partial=self.partial()
        )

    def _tell(self, ritz: Ritz, order: NDArray[np.intp], wanted: int) -> None:
        """Report progress: steps left from how fast the slowest wanted residual falls."""
        expected = (2 * wanted + 6 * self.block) / self.block - len(self.history)
        if len(order) >= wanted:
            chosen = order[:wanted]
            worst = (ritz.residuals[chosen] / np.abs(ritz.theta[chosen])).max()
            self.history.append(float(np.log10(max(worst, 1e-30))))
            fall = self.history[0] - self.history[-1]
            if len(self.history) > 3 and fall > 0:
                pace = fall / (len(self.history) - 1)
                expected = (self.history[-1] - np.log10(SHAPE_ACCURACY)) / pace
        self.clock.tell(max(1.0, expected), 1)

    # -- the proof ---------------------------------------------------------------------------------------

    def _certified(self, krylov: Krylov, wanted: int) -> Undamped:
        """Converge, count the eigenvalues just above the last mode, go on while there are more."""
        ritz, order = self._converge(krylov, wanted)
        while True:
            found = self._gap_above(ritz, order, wanted)
            if found is not None or krylov.exhausted:
                break
            ritz, order = self._converge_more(krylov, wanted)
        if found is None:
            everything = len(order) <= wanted
            return self._result(krylov, ritz, order[:wanted], certified=None, complete=everything)
        below, place = found
        counted = self._factorise(place).negative
        for _ in range(10):
            if counted is None or counted == below:
                break
            if counted < below:
                raise AccuracyError(
                    f"The inertia count finds {counted} modes where the search found {below}; neither can be "
                    "trusted. Check the matrices for entries of very different size.",
                    partial=self._result(krylov, ritz, order[:wanted], certified=None),
                )
            krylov.take_factor(self._factorise(self.shift))
            krylov.add_random()
            ritz, order = self._converge(krylov, counted)
            _, values = ascending(ritz, self.shift, self.below_shift)
            below = int((values < place).sum())
        if counted is not None and counted != below:
            raise AccuracyError(
                f"{counted - below} of {counted} modes could not be found.",
                partial=self._result(krylov, ritz, order[:wanted], certified=None),
            )
        certified = None if counted is None else float(np.sqrt(max(place, 0.0)))
        return self._result(krylov, ritz, order[:wanted], certified=certified)

    def _gap_above(self, ritz: Ritz, order: NDArray[np.intp], wanted: int) -> tuple[int, float] | None:
        """How many approximations lie below the first safe gap at or above ``wanted``, and the gap's middle."""
        raise NotImplementedError

    def _result(
        self,
        krylov: Krylov,
        ritz: Ritz,
        chosen: NDArray[np.intp],
        *,
        certified: float | None,
        complete: bool = False,
    ) -> Undamped:
        """Shapes and frequencies of the approximations of the given numbers, with their errors."""
        pencil = self.pencil
        raise NotImplementedError


def _symmetric(matrix: Array) -> Array:
    return np.asarray((matrix + matrix.T) / 2)
