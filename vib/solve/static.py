"""Solutions of large static problems by the fastest factorisation at hand."""

from __future__ import annotations

from collections.abc import Callable

from vib.solve.backends.choice import factor
from vib.solve.backends.interface import Array, FactorError, Matrix


def static_solver(stiffness: Matrix) -> Callable[[Array], Array] | None:
    """What solves stiffness x = force, checked; None where the stiffness is singular.

    Parameters
    ----------
    stiffness
        (n, n), sparse and symmetric.
    """
    try:
        return factor(stiffness, symmetric=True).solve
    except FactorError:
        return None
