"""The lowest modes of large sparse undamped systems, with a proof that none is missing.

Shift-invert block Lanczos in the mass inner product (`vib.solve.krylov`) up to a bound on each eigenvalue's
error, then a Sylvester inertia count just above the last mode (R. G. Grimes, J. G. Lewis, H. D. Simon, SIAM
J. Matrix Anal. Appl. 15 (1994) 228-272, section 4.4); where the count finds more, the search goes on in new
directions until the numbers agree.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import scipy.linalg
from numpy.typing import NDArray

from vib.errors import AccuracyError
from vib.solve.backends.interface import Matrix
from vib.solve.bounds import About, Found, theta_bounds
from vib.solve.clock import Clock
from vib.solve.krylov import Ritz
from vib.solve.pencil import Pencil
from vib.solve.shift import Start
from vib.solve.undamped import Undamped, round_off, with_hidden

BLOCK = 8
BASIS_BYTES = 4e9
STEPS_AT_LEAST, STEPS_PER_BLOCK = 60, 30
MOST_WIDENINGS, STEPS_BETWEEN_WIDENINGS = 5, 12
# An eigenvalue this close to the place of an inertia count, relative to it, may be counted on either side.
PLACE_SLACK = 1e-9
# Eigenvalues whose distances from the shift agree to this degree have their shapes turned together.
CLUSTER = 1e-6


def lowest_modes(
    mass: Matrix,
    stiffness: Matrix,
    *,
    count: int | None = None,
    below: float | None = None,
    free: bool = False,
    certify: bool = True,
    backend: str | None = None,
    block: int = BLOCK,
    basis_bytes: float = BASIS_BYTES,
) -> Undamped:
    """The lowest modes of stiffness x = value mass x, with all multiplicities, proved by an inertia count.

    Parameters
    ----------
    mass, stiffness
        (n, n), sparse symmetric; the mass positive semi-definite.
    count
        How many modes.
    below
        Every mode below this angular frequency, rad/s; with ``count`` at most that many of them.
    free
        The structure is known to have rigid-body motions: saves trying to factorise the stiffness itself.
    certify
        Prove by an inertia count that none is missing; costs one more factorisation.
    backend
        Library that factorises, see `vib.solve.backends.choice.factor`; None for automatic choice.
    block
        Columns solved for at a time.
    basis_bytes
        Most memory for the basis; it is restarted when full.

    Raises
    ------
    AccuracyError
        No factorisation could be trusted, the search did not converge, the inertia count contradicts it, or
        it was interrupted from the keyboard; ``partial`` holds the modes that had converged (`Undamped`).
    """
    if count is None and below is None:
        raise ValueError("lowest_modes: give count, below or both.")
    with Pencil(mass, stiffness, backend) as pencil:
        search = _Search(pencil, Start(block, basis_bytes), Clock(), free=free, certify=certify)
        try:
            return replace(search.run(count, below), seconds=search.clock.seconds)
        except KeyboardInterrupt:
            found = search.partial()
            done = 0 if found is None else len(found.values)
            raise AccuracyError(f"Interrupted after {done} modes had converged.", partial=found) from None


class _Search:
    """One search: the basis about a shift, what is wanted of it, and the proof."""

    def __init__(self, pencil: Pencil, start: Start, clock: Clock, *, free: bool, certify: bool) -> None:
        self.pencil, self.start, self.clock = pencil, start, clock
        self.free, self.certify = free, certify
        self.about: About | None = None

    def run(self, count: int | None, below: float | None) -> Undamped:
        # of no modes at all there would be no end to the search for what lies above them
        wanted = self.pencil.size if count is None else min(max(count, 1), self.pencil.size)
        if below is None:
            return self._by_count(wanted)
        counted = self.clock.time_factor(self.pencil, below**2).negative
        if counted is None:
            raise AccuracyError("The inertia of the shifted stiffness could not be found; ask by count.")
        if counted == 0:
            none = np.zeros(0)
            return Undamped(none, np.zeros((self.pencil.size, 0)), none, 0, complete=False, certified=below)
        if counted > wanted:
            return self._by_count(wanted)
        about = self._begin(counted)
        found = self._agree(about, self._converge(about, counted), counted, below**2)
        return results(self.pencil, about, found.order[:counted], found.ritz, certified=below)

    def partial(self) -> Undamped | None:
        """The modes that have converged so far, lowest first, without proof."""
        if self.about is None or self.about.krylov.done == 0:
            return None
        found = self._look(self.about)
        first = len(found.good) if found.good.all() else int(np.argmin(found.good))
        return results(self.pencil, self.about, found.order[:first], found.ritz) if first else None

    def _begin(self, wanted: int) -> About:
        self.about = self.start.settle(self.pencil, wanted, self.clock, free=self.free)
        return self.about

    def _by_count(self, wanted: int) -> Undamped:
        """Converge, then count the eigenvalues just above the last mode."""
        about = self._begin(wanted)
        found = self._converge(about, wanted)
        if not self.certify:
            return results(self.pencil, about, found.order[:wanted], found.ritz)
        while (gap := found.gap_above(about, wanted)) is None and not found.everything:
            self._advance(about, wanted)
            found = self._converge(about, wanted)
        if gap is None:
            return results(
                self.pencil, about, found.order[:wanted], found.ritz, complete=len(found.order) <= wanted
            )
        counted = self.clock.time_factor(self.pencil, gap).negative
        if counted is not None:
            found = self._agree(about, found, counted, gap)
        certified = float(np.sqrt(gap)) if counted is not None and gap > 0 else None
        inside = found.order[: int((found.values < gap).sum())]
        return results(self.pencil, about, inside, found.ritz, certified=certified).first(wanted)

    def _agree(self, about: About, found: Found, counted: int, place: float) -> Found:
        """Search on in new directions until as many eigenvalues below ``place`` are found as were counted."""
        slack = PLACE_SLACK * abs(place)
        for widened in range(1, MOST_WIDENINGS + 2):
            if (found.values < place - slack).sum() > counted:
                raise AccuracyError(
                    f"The inertia count finds {counted} modes where the search found more; neither can be "
                    "trusted. Check the matrices for entries of very different size.",
                    partial=self.partial(),
                )
            if (found.values < place + slack).sum() >= counted:
                # Approximations lie above the eigenvalues that they stand for (Cauchy's interlacing): these
                # are all that there are, but one that has not converged may belong further down.
                return self._converge(about, counted)
            if widened > MOST_WIDENINGS:
                break
            self.clock.time_factor(self.pencil, about.shift)
            columns = widened * self.start.block  # wider each time: there may be that many equal eigenvalues
            about.krylov.begin_anew(found.ritz, found.order[found.good], columns)
            for _ in range(STEPS_BETWEEN_WIDENINGS):
                self._advance(about, counted)
                found = self._look(about)
                if found.everything or (found.values < place + slack).sum() >= counted:
                    break
        missing = counted - int((found.values < place).sum())
        said = f"{missing} of {counted} modes could not be found."
        if about.shift == 0 and about.below_shift:
            said += (
                f" The stiffness is negative in {about.below_shift} directions, so the system is UNSTABLE: "
                "it is buckled, or a spring has the wrong sign. That motion grows too fast to be among the "
                "slowest; mend the stiffness first."
            )
        raise AccuracyError(said, partial=self.partial())

    def _converge(self, about: About, wanted: int) -> Found:
        """Go on until the lowest ``wanted`` approximations have converged, or there are no more."""
        most = STEPS_AT_LEAST + STEPS_PER_BLOCK * -(-wanted // self.start.block)
        for _ in range(most):
            found = self._look(about)
            if found.everything or (len(found.order) >= wanted and found.good[:wanted].all()):
                return found
            self.clock.tell(found.slowest(wanted), wanted / self.start.block)
            self._advance(about, wanted)
        unfinished = f"The search for {wanted} modes did not converge in {most} steps."
        raise AccuracyError(unfinished, partial=self.partial())

    def _look(self, about: About) -> Found:
        return Found.of(about.krylov.ritz(), about)

    def _advance(self, about: About, wanted: int) -> None:
        """One step, after a restart where the basis is full."""
        krylov = about.krylov
        self._make_room(about, wanted)
        if krylov.exhausted:
            krylov.add_random(self.start.block)
        if not krylov.exhausted:
            self.clock.time_step(krylov)

    def _make_room(self, about: About, wanted: int) -> None:
        krylov = about.krylov
        if krylov.full:
            found = self._look(about)
            spare = max(self.start.block, (krylov.done - wanted) // 3)
            krylov.restart(found.ritz, np.sort(found.order[: wanted + spare]))


def results(
    pencil: Pencil,
    about: About,
    chosen: NDArray[np.intp],
    ritz: Ritz,
    *,
    certified: float | None = None,
    complete: bool = False,
) -> Undamped:
    """Shapes and frequencies of the approximations of the given numbers, with their errors."""
    theta, bounds = ritz.theta[chosen], theta_bounds(ritz)[chosen]
    shapes = about.krylov.vectors(ritz, chosen)
    with_stiffness, with_mass = pencil.stiffness @ shapes, pencil.mass @ shapes
    apart = np.abs(np.diff(theta)) > CLUSTER * np.abs(theta[1:])
    for group in np.split(np.arange(len(theta)), np.flatnonzero(apart) + 1):
        stiff = shapes[:, group].T @ with_stiffness[:, group]
        heavy = shapes[:, group].T @ with_mass[:, group]
        _, turn = scipy.linalg.eigh((stiff + stiff.T) / 2, (heavy + heavy.T) / 2)
        for columns in (shapes, with_stiffness):
            columns[:, group] = columns[:, group] @ turn
    energy = np.einsum("ij,ij->j", shapes, with_stiffness)
    terms, mass_terms = pencil.energy_terms(shapes)
    rigid = pencil.rigid(shapes, energy)
    values = np.where(rigid, 0.0, energy)
    angular = np.sqrt(np.abs(values))
    far = np.where(rigid, 1.0, 2 * angular)
    errors = bounds / theta**2 / far + round_off(terms, mass_terms, angular)
    errors = with_hidden(errors, rigid, energy, terms, angular)
    order = np.lexsort((values, ~rigid))
    return Undamped(
        values=values[order],
        shapes=np.ascontiguousarray(shapes[:, order]),
        errors=errors[order],
        rigid=int(rigid.sum()),
        complete=complete,
        certified=certified,
    )
