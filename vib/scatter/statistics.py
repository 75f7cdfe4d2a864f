"""What samples say about a figure, and how far that may be off because they are finitely many.

All intervals hold with 95 % where samples are drawn independently: order statistics for percentiles (H. A.
David, H. N. Nagaraja, Order Statistics, 3rd ed. 2003, section 7.1), the score of E. B. Wilson (J. Am. Stat.
Assoc. 22 (1927) 209-212) for probabilities. Samples of a Latin hypercube are as good or better for all but
very few of them (M. Stein, Technometrics 29 (1987) 143-151), and so are scrambled Sobol points for most
figures, so that the intervals are on the wide side there.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.stats import binom

from vib.scatter.batch import Array
from vib.study.tolerances import COVERAGE_95

PERCENTILES = (2.5, 5.0, 25.0, 50.0, 75.0, 95.0, 97.5)


@dataclass(frozen=True)
class Estimate:
    """A figure from samples, and the interval that holds the true one with 95 %."""

    value: float
    low: float
    high: float

    def to_dict(self, name: str) -> dict[str, float]:
        """The three figures under a name."""
        return {name: self.value, f"{name}_from": self.low, f"{name}_to": self.high}


@dataclass(frozen=True, eq=False)
class Distribution:
    """How a figure scatters: mean, standard deviation, and percentiles by their number."""

    nominal: float
    mean: Estimate
    deviation: float
    least: float
    most: float
    percentiles: dict[float, Estimate]

    def to_dict(self, unit: str) -> dict[str, Any]:
        """Plain values; ``unit`` ends every name, such as ``_hz``."""
        return {
            f"nominal{unit}": self.nominal,
            f"standard_deviation{unit}": self.deviation,
            f"least{unit}": self.least,
            f"most{unit}": self.most,
            **self.mean.to_dict(f"mean{unit}"),
            "percentiles": [
                {"percent": percent, **estimate.to_dict(f"value{unit}")}
                for percent, estimate in self.percentiles.items()
            ],
        }


def distribution(values: Array, nominal: float) -> Distribution:
    """How values (N,) scatter about a nominal one; samples that have none (NaN) are left out."""
    ordered = np.sort(values[~np.isnan(values)])
    size = len(ordered)
    if not size:
        none = Estimate(np.nan, np.nan, np.nan)
        return Distribution(nominal, none, np.nan, np.nan, np.nan, dict.fromkeys(PERCENTILES, none))
    deviation = float(ordered.std(ddof=1)) if size > 1 else 0.0
    mean, half = float(ordered.mean()), COVERAGE_95 * deviation / size**0.5
    return Distribution(
        nominal,
        Estimate(mean, mean - half, mean + half),
        deviation,
        float(ordered[0]),
        float(ordered[-1]),
        {percent: _percentile(ordered, percent / 100) for percent in PERCENTILES},
    )


def _percentile(ordered: Array, share: float) -> Estimate:
    """Order statistics around a percentile; beyond the least and the greatest nothing is known."""
    size = len(ordered)
    lower = int(binom.ppf(0.025, size, share))
    upper = int(binom.ppf(0.975, size, share)) + 1
    return Estimate(
        float(np.quantile(ordered, share)),
        float(ordered[max(lower - 1, 0)]),
        float(ordered[min(upper - 1, size - 1)]),
    )


def enough_for_percentiles(size: int) -> bool:
    """Whether the outermost percentiles have samples on both sides of their intervals."""
    return int(binom.ppf(0.025, size, PERCENTILES[0] / 100)) >= 1


def probability(happens: NDArray[np.bool_]) -> Estimate:
    """The share of samples (N,) in which something happens, with Wilson's interval."""
    size, hits = len(happens), int(np.count_nonzero(happens))
    share, square = hits / size, COVERAGE_95**2
    middle = (hits + square / 2) / (size + square)
    half = COVERAGE_95 / (size + square) * (hits * (1 - share) + square / 4) ** 0.5
    # at 0 and at all the interval ends there, which rounding must not spoil
    low = 0.0 if hits == 0 else max(middle - half, 0.0)
    high = 1.0 if hits == size else min(middle + half, 1.0)
    return Estimate(share, low, high)
