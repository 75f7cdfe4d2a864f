"""Where to factorise K - shift M: at 0 where the structure is held, a little below 0 where it is free."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.linalg

from vib.errors import AccuracyError
from vib.solve.backends.interface import FactorError
from vib.solve.bounds import About
from vib.solve.clock import Clock
from vib.solve.krylov import Krylov
from vib.solve.pencil import Pencil

# First shift of a free structure, as a share of the highest eigenvalue: far above round-off in the stiffness,
# below the elastic modes of most. It goes down by STEP_DOWN while it is beyond HIGHEST times the first
# elastic eigenvalue, where the search would be slow, and up to that where it is below LOWEST times it, where
# digits would get lost.
FREE_SHIFT = 1e-7
LOWEST, HIGHEST = 1e-6, 10.0
STEP_DOWN = 1e-3
MOST_MOVES = 5


@dataclass(frozen=True)
class Start:
    """How wide a block is and how much memory the basis may take."""

    block: int
    basis_bytes: float

    def settle(self, pencil: Pencil, wanted: int, clock: Clock, *, free: bool) -> About:
        """A basis about a shift where K - shift M is safely regular.

        Raises
        ------
        AccuracyError
            The basis would not fit, or no shift gives a factorisation that can be trusted.
        """
        capacity = self._capacity(pencil.size, wanted)
        if not free:
            try:
                about = self._begin(pencil, 0.0, capacity, clock)
                if not _trial(about.krylov, pencil)[0]:
                    return about
                del about  # its basis goes before the next one comes
            except FactorError:
                pass  # singular, as it is for a free structure
        shift = -FREE_SHIFT * pencil.highest_ratio()
        for _ in range(MOST_MOVES):
            about = self._begin(pencil, shift, capacity, clock)
            clock.time_step(about.krylov)
            rigid, elastic = _trial(about.krylov, pencil)
            if elastic is not None and -shift > HIGHEST * elastic:
                shift *= STEP_DOWN
                continue
            if elastic is not None and rigid and -shift < LOWEST * elastic:
                return self._begin(pencil, -elastic, capacity, clock)
            break
        return about

    def _capacity(self, size: int, wanted: int) -> int:
        """Columns of the basis: enough not to restart, if the memory allows it."""
        most = int(self.basis_bytes / (8 * size))
        least = 2 * wanted + 4 * self.block
        if most < least:
            raise AccuracyError(
                f"{wanted} modes of {size} freedoms need a basis of {least * 8 * size / 1e9:.1f} GB, but "
                f"{self.basis_bytes / 1e9:.1f} GB are allowed; ask for fewer modes or a lower limit."
            )
        return min(most, 3 * wanted + 16 * self.block)

    def _begin(self, pencil: Pencil, shift: float, capacity: int, clock: Clock) -> About:
        factor = clock.time_factor(pencil, shift)
        krylov = Krylov(pencil, shift, block=self.block, capacity=capacity)
        return About(krylov, shift, factor.negative or 0)


def _trial(krylov: Krylov, pencil: Pencil) -> tuple[bool, float | None]:
    """Whether the basis so far holds a rigid-body motion, and the lowest eigenvalue of the others in it."""
    basis = krylov.basis
    with_stiffness = pencil.stiffness @ basis
    projected = basis.T @ with_stiffness
    _, turn = scipy.linalg.eigh((projected + projected.T) / 2)
    shapes = basis @ turn
    energy = np.einsum("ij,ij->j", shapes, with_stiffness @ turn)
    rigid = pencil.rigid(shapes, energy)
    elastic = np.abs(energy[~rigid])
    return bool(rigid.any()), float(elastic.min()) if elastic.size else None
