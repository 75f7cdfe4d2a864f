"""Sparse systems about a shift: where to factorise K - shift M, and the ways into block Lanczos."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from vib.errors import AccuracyError
from vib.solve.backends.interface import FactorError
from vib.solve.factor import Factor, SingularFactorError, factorise
from vib.solve.lanczos import lowest_modes
from vib.solve.pencil import Pencil
from vib.solve.undamped import Matrix, Undamped

# Pivots of K scaled to a unit diagonal that are smaller than this may be those of a free structure.
NEARLY_FREE = 1e-9


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
    """The lowest ``count`` modes of sparse symmetric matrices (n, n); the mass positive semi-definite.

    ``certify`` counts the modes below the last one by a second factorisation.

    Raises
    ------
    AccuracyError
        See `vib.solve.lanczos.lowest_modes`.
    """
    return lowest_modes(mass, stiffness, count=count, certify=certify)


def count_below(mass: Matrix, stiffness: Matrix, angular: float) -> int | None:
    """How many undamped modes lie below an angular frequency, rigid-body ones included; None: not known."""
    with Pencil(mass, stiffness) as pencil:
        for nudge in (0.0, 1e-9, 1e-7):
            try:
                counted = pencil.factorise((angular * (1 + nudge)) ** 2).negative
            except FactorError:
                continue
            if counted is not None:
                return counted
    return None
