"""Quadrature rules on the reference cells.

Reference cells: line and square and cube on [-1, 1]; triangle and tetrahedron with the corners at the
origin and the unit points; wedge, the triangle times [-1, 1]; pyramid, base [-1, 1]^2 at z = 0 and apex
at z = 1.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import permutations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

# One orbit a row: barycentric coordinates of one point and the weight of each of its permutations
# (weights sum to one). D. A. Dunavant, IJNME 21 (1985) 1129-1148, table II, degrees 2, 4, 6.
_TRIANGLE: dict[int, tuple[tuple[tuple[float, ...], float], ...]] = {
    1: (((1 / 3, 1 / 3, 1 / 3), 1.0),),
    2: (((2 / 3, 1 / 6, 1 / 6), 1 / 3),),
    4: (
        ((0.108103018168070, 0.445948490915965, 0.445948490915965), 0.223381589678011),
        ((0.816847572980459, 0.091576213509771, 0.091576213509771), 0.109951743655322),
    ),
    6: (
        ((0.501426509658179, 0.249286745170910, 0.249286745170910), 0.116786275726379),
        ((0.873821971016996, 0.063089014491502, 0.063089014491502), 0.050844906370207),
        ((0.053145049844817, 0.310352451033784, 0.636502499121399), 0.082851075618374),
    ),
}

# The same for the tetrahedron. Degree 2: P. C. Hammer, A. H. Stroud, Math. Tables Aids Comput. 10 (1956)
# 137-139; degree 5: N. J. Walkington, Quadrature on simplices of arbitrary dimension (2000), 14 points.
_S5 = 5**0.5
_TETRAHEDRON: dict[int, tuple[tuple[tuple[float, ...], float], ...]] = {
    1: (((0.25, 0.25, 0.25, 0.25), 1.0),),
    2: ((((5 + 3 * _S5) / 20, (5 - _S5) / 20, (5 - _S5) / 20, (5 - _S5) / 20), 0.25),),
    5: (
        ((1 - 3 * 0.31088591926330061,) + (0.31088591926330061,) * 3, 0.11268792571801585),
        ((1 - 3 * 0.092735250310891226,) + (0.092735250310891226,) * 3, 0.073493043116361950),
        ((0.045503704125649649,) * 2 + (0.5 - 0.045503704125649649,) * 2, 0.042546020777081467),
    ),
}


@dataclass(frozen=True, eq=False)
class Rule:
    """Points (p, d) and weights (p,) of a quadrature; the weights sum to the reference cell's size."""

    points: Array
    weights: Array


def line(count: int) -> Rule:
    """Gauss-Legendre on [-1, 1] with ``count`` points, exact to degree 2 count - 1."""
    points, weights = np.polynomial.legendre.leggauss(count)
    return Rule(points[:, None], weights)


def product(first: Rule, second: Rule) -> Rule:
    """The tensor product of two rules, coordinates of the first before those of the second."""
    a, b = len(first.weights), len(second.weights)
    points = np.hstack([np.repeat(first.points, b, axis=0), np.tile(second.points, (a, 1))])
    return Rule(points, np.outer(first.weights, second.weights).ravel())


def square(count: int) -> Rule:
    """``count`` x ``count`` Gauss points on [-1, 1]^2."""
    return product(line(count), line(count))


def cube(count: int) -> Rule:
    """``count``^3 Gauss points on [-1, 1]^3."""
    return product(square(count), line(count))


def triangle(degree: int) -> Rule:
    """Symmetric rule on the reference triangle, exact to 1, 2, 4 or 6."""
    return _from_orbits(_TRIANGLE[degree], 0.5)


def tetrahedron(degree: int) -> Rule:
    """Symmetric rule on the reference tetrahedron, exact to 1, 2 or 5."""
    return _from_orbits(_TETRAHEDRON[degree], 1 / 6)


def collapsed_tetrahedron(count: int) -> Rule:
    """``count``^3 points, Gauss-Legendre in collapsed coordinates: exact to degree 2 count - 3."""
    gauss = cube(count)
    a, b, c = ((1 + gauss.points[:, k]) / 2 for k in range(3))
    points = np.column_stack([a * (1 - b) * (1 - c), b * (1 - c), c])
    return Rule(points, gauss.weights / 8 * (1 - b) * (1 - c) ** 2)


def wedge(degree: int, count: int) -> Rule:
    """A triangle rule times ``count`` Gauss points along z."""
    return product(triangle(degree), line(count))


def pyramid(count: int, upward: int) -> Rule:
    """``count``^2 points in each of ``upward`` planes, Gauss-Legendre in collapsed coordinates.

    The plane x, y shrinks with 1 - z, so that the rational shape functions of a pyramid become polynomials.
    """
    gauss = product(square(count), line(upward))
    z = (1 + gauss.points[:, 2]) / 2
    points = np.column_stack([gauss.points[:, 0] * (1 - z), gauss.points[:, 1] * (1 - z), z])
    return Rule(points, gauss.weights / 2 * (1 - z) ** 2)


def _from_orbits(orbits: tuple[tuple[tuple[float, ...], float], ...], size: float) -> Rule:
    points, weights = [], []
    for place, weight in orbits:
        for moved in sorted(set(permutations(place))):
            points.append(moved[1:])
            weights.append(weight)
    found = np.array(weights)
    return Rule(np.array(points), found * (size / found.sum()))
