"""Interpolation of a vector that depends on several quantities, from as few evaluations as it needs.

The vector is a sum of changes, each times a product of Newton polynomials through points of F. Leja (Ann.
Polon. Math. 4 (1957) 8-13; from memory), which begin at the nominal value. Which products are needed is found
out step by step: one that would change nothing has no successors (A. Chkifa, A. Cohen, C. Schwab, Found.
Comput. Math. 14 (2014) 601-633; from memory). What is affine costs two evaluations, what acts on nothing one.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, field

import numpy as np

from vib.scatter.pattern import Change
from vib.system import Array

# (quantity, degree) of each quantity that a term depends on, in their order; () is the nominal vector
Term = tuple[tuple[int, int], ...]

HIGHEST_DEGREE = 10
MOST_EVALUATIONS = 600


class UnsuitedError(Exception):
    """The vector is no low polynomial of the quantities; the message says of which."""


@dataclass(frozen=True, eq=False)
class Interpolation:
    """Coefficients of a sum of changes as functions of the quantities.

    ``points`` (d rows) of each quantity, the nominal value first; ``terms`` the products, the first empty.
    """

    points: tuple[Array, ...]
    terms: tuple[Term, ...]

    @property
    def degrees(self) -> tuple[int, ...]:
        """(d,) highest degree in each quantity."""
        pairs = [pair for term in self.terms for pair in term]
        return tuple(max((k for i, k in pairs if i == own), default=0) for own in range(len(self.points)))

    def coefficients(self, samples: Array) -> Array:
        """Coefficient of every term (N, t) for samples (N, d)."""
        basis = [
            newton(points[: degree + 1], samples[:, i])
            for i, (points, degree) in enumerate(zip(self.points, self.degrees, strict=True))
        ]
        found = np.ones((len(samples), len(self.terms)))
        for number, term in enumerate(self.terms):
            for quantity, degree in term:
                found[:, number] *= basis[quantity][:, degree]
        return found


def newton(points: Array, at: Array) -> Array:
    """Newton polynomials (N, points): the k-th is 1 at its own point and 0 at those before it."""
    found = np.ones((len(at), len(points)))
    for k in range(1, len(points)):
        found[:, k] = np.prod((at[:, None] - points[:k]) / (points[k] - points[:k]), axis=1)
    return found


def leja(nominal: float, low: float, high: float, count: int) -> Array:
    """The nominal value and ``count`` points of [low, high], each as far from those before as can be."""
    points = [nominal]
    grid = (low + high) / 2 + (high - low) / 2 * np.cos(np.linspace(0.0, np.pi, 721))
    for _ in range(count if high > low else 0):
        spread = np.prod(np.abs(grid[:, None] - np.array(points)) / (high - low), axis=1)
        points.append(float(grid[int(np.argmax(spread))]))
    return np.array(points)


@dataclass(eq=False)
class Search:
    """Finds out how a vector depends on d quantities within their ``bounds`` (d, 2).

    ``evaluate`` takes values (d,) and returns the vector; ``matters`` tells whether a change of it does.
    """

    evaluate: Callable[[Array], Array]
    matters: Callable[[Array], bool]
    nominal: Array
    bounds: Array
    names: tuple[str, ...]
    evaluations: int = 0
    changes: dict[Term, Change] = field(default_factory=dict)

    def run(self) -> tuple[Interpolation, tuple[Change, ...]]:
        """The interpolation, and what each of its terms after the first changes.

        Raises
        ------
        UnsuitedError
            A degree, or a number of evaluations, beyond what is sensible.
        """
        rows = zip(self.nominal.tolist(), self.bounds.tolist(), strict=True)
        self.points = tuple(leja(value, low, high, HIGHEST_DEGREE) for value, (low, high) in rows)
        self.base = self._at(())
        for i in range(len(self.names)):
            self._alone(i)
        waiting = list(self._pairs())
        for term in waiting:  # grows while it is gone through
            if self._take(term):
                waiting += [after for after in self._after(term) if after not in waiting]
        interpolation = Interpolation(self.points, ((), *self.changes))
        return interpolation, tuple(self.changes.values())

    def _alone(self, i: int) -> None:
        """The terms of one quantity alone."""
        degree = 1
        while degree < len(self.points[i]) and self._take(((i, degree),)):
            degree += 1
        if degree > HIGHEST_DEGREE:
            raise UnsuitedError(f"{self.names[i]} changes the matrices in no simple way")

    def _pairs(self) -> Iterator[Term]:
        """Pairs that may act together; each quantity first with all after it at once, which settles most."""
        active = [i for i in range(len(self.names)) if ((i, 1),) in self.changes]
        for place in range(len(active) - 2, -1, -1):
            group = tuple((i, 1) for i in active[place:])
            apart = self._at(group) - self._at(group[1:])
            alone = self._predicted(group[:1]) - self.base
            if self.matters(apart - alone):
                yield from ((group[0], other) for other in group[1:])

    def _after(self, term: Term) -> Iterator[Term]:
        """Terms one step up from this one, all of whose own steps down are there."""
        degrees = dict(term)
        for i in range(len(self.names)):
            raised = {**degrees, i: degrees.get(i, 0) + 1}
            after = tuple(sorted(raised.items()))
            if raised[i] <= HIGHEST_DEGREE and all(before in self.changes for before in _before(after)):
                yield after

    def _take(self, term: Term) -> bool:
        """Whether a term changes the vector; it is kept if so."""
        change = self._at(term) - self._predicted(term)
        if not self.matters(change):
            return False
        where = np.flatnonzero(change)
        self.changes[term] = (where, change[where])
        return True

    def _at(self, term: Term) -> Array:
        if self.evaluations >= MOST_EVALUATIONS:
            raise UnsuitedError("the quantities act together in too many ways")
        self.evaluations += 1
        return self.evaluate(self._values(term))

    def _values(self, term: Term) -> Array:
        values = self.nominal.copy()
        for quantity, degree in term:
            values[quantity] = self.points[quantity][degree]
        return values

    def _predicted(self, term: Term) -> Array:
        """The vector at the point of a term, by the changes found so far."""
        found = self.base.copy()
        known = Interpolation(self.points, tuple(self.changes))
        factors = known.coefficients(self._values(term)[None])[0]
        for factor, (where, change) in zip(factors, self.changes.values(), strict=True):
            if factor:
                found[where] += factor * change
        return found


def _before(term: Term) -> Iterator[Term]:
    """The terms one step down."""
    for place, (quantity, degree) in enumerate(term):
        lowered = ((quantity, degree - 1),) if degree > 1 else ()
        yield (*term[:place], *lowered, *term[place + 1 :])
