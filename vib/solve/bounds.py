"""What the approximations from a Krylov basis say about true eigenvalues, and how far off they can be."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from vib.solve.backends.interface import Array
from vib.solve.krylov import Krylov, Ritz

# Relative accuracy of each eigenvalue (of its distance from the shift), and of the residual, which sets that
# of the shapes: they enter participation and energy shares, where six figures are plenty.
VALUE_ACCURACY = 1e-11
SHAPE_ACCURACY = 1e-7
# Within a cluster that round-off smears the bound is the residual itself; this much of it is enough.
CLUSTER_ACCURACY = 1e-10
# Eigenvalues this near to 0, relative to the shift of a free structure, may be rigid-body motions: what their
# shapes hold of others must be round-off, so that its elastic energy does not hide that they have none.
NEAR_ZERO = 1e-6
RIGID_ACCURACY = 1e-12
# A gap between two eigenvalues, relative to their distance from the shift, wide enough to count in it.
GAP = 1e-5


@dataclass(frozen=True, eq=False)
class About:
    """A basis, the shift it is built about, and how many eigenvalues are below that shift."""

    krylov: Krylov
    shift: float
    below_shift: int


@dataclass(frozen=True, eq=False)
class Found:
    """Approximations by ascending eigenvalue.

    ``order`` (m,) are their numbers in ``ritz``, ``values`` (m,) the eigenvalues, ``bounds`` (m,) bound the
    error of each ``theta``, ``good`` (m,) tells whether it has converged; ``everything``: these are all.
    """

    ritz: Ritz
    order: NDArray[np.intp]
    values: Array
    bounds: Array
    good: NDArray[np.bool_]
    everything: bool

    @classmethod
    def of(cls, ritz: Ritz, about: About) -> Found:
        """Sort the approximations.

        Of the negative ``theta`` only as many count, largest magnitude first, as there are eigenvalues below
        the shift: others stand for eigenvalues near infinity that are still taking shape.
        """
        theta = ritz.theta  # ascending
        under = np.flatnonzero(theta < 0)[: about.below_shift]
        over = np.flatnonzero(theta > 0)
        order = np.concatenate([under[::-1], over[::-1]])
        size = np.abs(theta[order])
        bounds = theta_bounds(ritz)[order]
        residuals = ritz.residuals[order]
        sure = (bounds <= VALUE_ACCURACY * size) | (residuals <= CLUSTER_ACCURACY * size)
        values = about.shift + 1 / theta[order]
        near_zero = np.abs(values) <= NEAR_ZERO * abs(about.shift)
        good = sure & (residuals <= np.where(near_zero, RIGID_ACCURACY, SHAPE_ACCURACY) * size)
        return cls(ritz, order, values, bounds, good, about.krylov.spanned)

    def slowest(self, wanted: int) -> float | None:
        """Largest residual of the wanted ones over what is asked of it; None while there are too few."""
        chosen = self.order[:wanted]
        if len(chosen) < wanted:
            return None
        return float((self.ritz.residuals[chosen] / np.abs(self.ritz.theta[chosen])).max() / SHAPE_ACCURACY)

    def gap_above(self, about: About, wanted: int) -> float | None:
        """Middle of the first safe gap above the ``wanted``-th eigenvalue; None if there is none yet."""
        theta = self.ritz.theta[self.order]
        with np.errstate(divide="ignore"):
            reach = np.where(np.abs(theta) > self.bounds, theta - self.bounds, 0.0 * theta)
            high = np.where(reach != 0, about.shift + 1 / reach, np.inf)
            low = about.shift + 1 / (theta + self.bounds)
        for place in range(wanted, len(theta)):
            if not self.good[place - 1]:
                return None
            if low[place] - high[place - 1] > GAP / abs(theta[place]):
                return float((low[place] + high[place - 1]) / 2)
        return None


def theta_bounds(ritz: Ritz) -> Array:
    """Bound of the error of each ``theta`` (e,): the residual, or its square over the gap where that is less.

    B. N. Parlett, The Symmetric Eigenvalue Problem, SIAM 1998, theorems 4.5.1 and 11.7.1. Approximations that
    their residuals cannot tell apart share one gap and the root sum of squares of their residuals.
    """
    theta, residuals = ritz.theta, ritz.residuals
    if theta.size == 0:
        return theta
    together = np.diff(theta) <= 10 * (residuals[1:] + residuals[:-1])
    group = np.concatenate([[0], np.cumsum(~together)])
    firsts = np.flatnonzero(np.diff(group, prepend=-1))
    lasts = np.append(firsts[1:], theta.size) - 1
    whole = np.sqrt(np.add.reduceat(residuals**2, firsts))
    low, high = theta - residuals, theta + residuals
    below = np.concatenate([[np.inf], theta[firsts[1:]] - np.maximum.reduceat(high, firsts)[:-1]])
    above = np.concatenate([np.minimum.reduceat(low, firsts)[1:] - theta[lasts[:-1]], [np.inf]])
    # towards 0, where the spectrum of the operator gathers, others not seen yet may be as near as any
    below[0] = np.inf if theta[0] < 0 else 0.0
    gap = np.minimum(below, above)
    with np.errstate(divide="ignore", invalid="ignore"):
        squared = np.where(gap > 0, whole**2 / gap, np.inf)[group]
    return np.minimum(residuals, np.where(residuals > 0, squared, 0.0))
