"""Samples of the uncertain quantities: even points in the unit cube, carried over to each distribution.

Points are those of a scrambled Sobol sequence (A. B. Owen, J. Complexity 14 (1998) 466-489) or of a Latin
hypercube (M. D. McKay, R. J. Beckman, W. J. Conover, Technometrics 21 (1979) 239-245), both from
`scipy.stats.qmc`; the inverse of each distribution function carries them over.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from scipy.special import ndtr, ndtri
from scipy.stats import qmc

from vib.errors import ModelError
from vib.scatter.batch import Array
from vib.study.tolerances import COVERAGE_95, Tolerance

Method = Literal["sobol", "latin hypercube"]
METHODS: tuple[Method, ...] = ("sobol", "latin hypercube")
# a point on the edge of the cube would be drawn to infinity
_EDGE = 2.0**-54


@dataclass(frozen=True, eq=False)
class Factors:
    """What is drawn independently, and how the quantities follow.

    Attributes
    ----------
    tolerances
        Of the d quantities.
    names
        Of the f factors: an entry of the study, or a group.
    loadings
        (d, f): the normal score of each quantity as a sum of those of the factors; rows of unit length.
    """

    tolerances: tuple[Tolerance, ...]
    names: tuple[str, ...]
    loadings: Array

    @classmethod
    def of(cls, tolerances: Sequence[Tolerance]) -> Factors:
        """One factor for each quantity that stands alone and for each group; of a group that is correlated
        in part, one for what its quantities share and one for each of them.

        Raises
        ------
        ModelError
            There are no tolerances.
        """
        if not tolerances:
            raise ModelError(
                'tolerances: the study states none; write for example stiffness = {x = "2 kN/mm +- 20 %"}'
            )
        names: list[str] = []
        shares: list[dict[str, float]] = []
        for row in tolerances:
            share = {row.path: 1.0}
            if row.group is not None:
                shared = f"group {row.group}"
                share = {shared: row.correlation**0.5, row.path: (1 - row.correlation) ** 0.5}
            share = {name: part for name, part in share.items() if part > 0}
            names += [name for name in share if name not in names]
            shares.append(share)
        loadings = np.array([[share.get(name, 0.0) for name in names] for share in shares])
        return cls(tuple(tolerances), tuple(names), loadings)

    @property
    def paths(self) -> tuple[str, ...]:
        """Entries of the quantities in the study."""
        return tuple(row.path for row in self.tolerances)

    @property
    def nominal(self) -> Array:
        """The values that are written down (d,), SI."""
        return np.array([row.nominal for row in self.tolerances])

    def values(self, points: Array) -> Array:
        """The quantities (N, d), SI, for points (N, f) of the unit cube."""
        inside = np.clip(points, _EDGE, 1 - _EDGE)
        found = np.empty((len(points), len(self.tolerances)))
        for column, (tolerance, loading) in enumerate(zip(self.tolerances, self.loadings, strict=True)):
            drawn = np.flatnonzero(loading)
            share = inside[:, drawn[0]] if len(drawn) == 1 else ndtr(ndtri(inside[:, drawn]) @ loading[drawn])
            found[:, column] = quantile(tolerance, share)
        return found


def quantile(tolerance: Tolerance, share: Array) -> Array:
    """The value (N,), SI, that a given share (N,), between 0 and 1, of all values lies below."""
    low, middle, high = tolerance.low, tolerance.nominal, tolerance.high
    if tolerance.distribution == "uniform":
        return np.asarray(low + share * (high - low))
    if tolerance.distribution == "triangular":
        width, before = high - low, (middle - low) / (high - low)
        return np.asarray(
            np.where(
                share < before,
                low + width * np.sqrt(share * before),
                high - width * np.sqrt((1 - share) * (1 - before)),
            )
        )
    score = ndtri(share) / COVERAGE_95
    if tolerance.distribution == "normal":
        return np.asarray(middle + score * (high - low) / 2)
    return np.asarray(middle * np.exp(score * np.log(high / middle)))


def unit_points(samples: int, factors: int, *, seed: int, method: Method = "sobol") -> Array:
    """Points (N, f) in the unit cube, the same for the same seed.

    Of a Sobol sequence, the first N of the next power of two; they are most even where N is one.

    Raises
    ------
    ModelError
        Fewer than two samples, a method that is not known, a negative seed.
    """
    if isinstance(samples, bool) or int(samples) != samples or samples < 2:
        raise ModelError(f"samples: a whole number from 2 is needed, got {samples!r}")
    if isinstance(seed, bool) or int(seed) != seed or seed < 0:
        raise ModelError(f"seed: a whole number from 0 is needed, got {seed!r}")
    random = np.random.default_rng(seed)
    if method == "sobol":
        power = int(samples - 1).bit_length()
        return np.asarray(qmc.Sobol(factors, scramble=True, seed=random).random_base2(power)[:samples])
    if method == "latin hypercube":
        return np.asarray(qmc.LatinHypercube(factors, seed=random).random(samples))
    raise ModelError(f"method: one of {', '.join(METHODS)} is needed, got {method!r}")


def is_power_of_two(samples: int) -> bool:
    """Whether a Sobol sequence of this length is balanced."""
    return samples & (samples - 1) == 0


@dataclass(frozen=True, eq=False)
class Design:
    """Points (N, f) for effects of the first order and total ones.

    ``first`` (A) and ``second`` (B) are independent; ``mixed`` (f, N, f) are A with one column of B each.
    """

    first: Array
    second: Array
    mixed: Array

    @classmethod
    def of(cls, rows: int, factors: int, *, seed: int, method: Method = "sobol") -> Design:
        """The design of A. Saltelli et al., Computer Physics Communications 181 (2010) 259-270, section 3."""
        both = unit_points(rows, 2 * factors, seed=seed, method=method)
        first, second = both[:, :factors], both[:, factors:]
        mixed = np.repeat(first[None], factors, axis=0)
        for factor in range(factors):
            mixed[factor, :, factor] = second[:, factor]
        return cls(first, second, mixed)

    @property
    def points(self) -> Array:
        """All ((f + 2) N, f) points: A, B, then the mixed ones."""
        return np.vstack([self.first, self.second, *self.mixed])
