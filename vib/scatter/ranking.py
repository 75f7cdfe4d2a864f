"""Which uncertain quantities matter: effects of the first order, total effects, analytic sensitivities.

The effect of the first order is the share of the variance of a figure that would vanish if a factor were
known; the total effect is the share that would be left if all others were known. Estimators: A. Saltelli et
al., Computer Physics Communications 181 (2010) 259-270, table 2, rows b and f; f is M. J. W. Jansen's,
Computer Physics Communications 117 (1999) 35-43. Their errors are from resampling the rows of the design
(bootstrap).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from vib.scatter.batch import Array
from vib.scatter.sampling import Design

RESAMPLES = 400
STEADY = 1e-9  # of a figure: what varies less than this only varies by rounding


@dataclass(frozen=True, eq=False)
class Effects:
    """Effects of f factors on k figures, each (f, k); ``*_error`` is half a 95 % interval.

    NaN for a figure that does not vary.
    """

    first: Array
    first_error: Array
    total: Array
    total_error: Array

    def of_factor(self, factor: int) -> dict[str, list[float]]:
        """Plain values of one factor, one for each figure."""
        return {
            "first_order": self.first[factor].tolist(),
            "first_order_error": self.first_error[factor].tolist(),
            "total": self.total[factor].tolist(),
            "total_error": self.total_error[factor].tolist(),
        }


def effects(design: Design, figures: Array, *, seed: int) -> Effects:
    """Effects from figures ((f + 2) N, k) at the points of the design, in its order."""
    rows, count = len(design.first), design.first.shape[1]
    blocks = figures.reshape(count + 2, rows, -1)
    mean = blocks[:2].mean(axis=(0, 1))
    blocks = blocks - mean  # in both factors of a product it would only add noise
    blocks[..., blocks[:2].std(axis=(0, 1)) <= STEADY * np.abs(mean)] = np.nan
    first, total = _estimate(blocks, np.arange(rows))
    random = np.random.default_rng([seed, 2])
    drawn = [_estimate(blocks, random.integers(0, rows, rows)) for _ in range(RESAMPLES)]
    spread = [np.quantile(np.array(part), (0.025, 0.975), axis=0) for part in zip(*drawn, strict=True)]
    first_error, total_error = ((high - low) / 2 for low, high in spread)
    return Effects(first, first_error, total, total_error)


def _estimate(blocks: Array, rows: NDArray[np.intp]) -> tuple[Array, Array]:
    """First and total effects (f, k) from blocks A, B, mixed (f + 2, N, k), of some of the rows."""
    taken = blocks[:, rows]
    one, other, mixed = taken[0], taken[1], taken[2:]
    variance = taken[:2].reshape(-1, taken.shape[2]).var(axis=0)
    first = (other * (mixed - one)).mean(axis=1) / variance
    total = ((one - mixed) ** 2).mean(axis=1) / 2 / variance
    return first, total
