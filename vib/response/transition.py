"""The state transition matrix Phi(t) = exp(A t)."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Propagator:
    """Phi(t) of one matrix A, prepared once and evaluated at many times."""

    matrix: Array
    method: str  # "eigenvalues" or "matrix exponential"
    condition: float
    limit: float

    def __call__(self, t: ArrayLike) -> Array:
        """Phi(t): (n, n) for one time, (k, n, n) for k times."""
        raise NotImplementedError


def transition(matrix: ArrayLike, t: ArrayLike, *, accuracy: float = 1e-12) -> Array:
    """Phi(t) = exp(A t); (n, n) for one time, (k, n, n) for k times."""
    raise NotImplementedError
