"""Second-order pyramid: thirteen nodes, rational shape functions that match all its neighbours.

Nodes 5 to 8 on the edges of the base 01, 12, 23, 30, nodes 9 to 12 on the edges from 0, 1, 2, 3 to the apex.
Source: G. Bedrosian, IJNME 35 (1992) 95-108.
"""

from __future__ import annotations

from functools import cached_property
from typing import ClassVar

import numpy as np

from vib.structure.cells.family import Array
from vib.structure.cells.pyramid import CORNERS
from vib.structure.cells.quadrature import Rule, pyramid
from vib.structure.cells.solid import Solid

_EDGES = np.array([[0, 1], [1, 2], [2, 3], [3, 0], [0, 4], [1, 4], [2, 4], [3, 4]])
_NODES = np.vstack([CORNERS, CORNERS[_EDGES].mean(axis=1)])


class Pyramid13(Solid):
    """Rational thirteen-node pyramid."""

    kind: ClassVar[str] = "pyramid13"
    nodes: ClassVar[int] = 13
    corners: ClassVar[int] = 5

    @property
    def reference(self) -> Array:
        """See `Solid.reference`."""
        return _NODES

    def shape(self, points: Array) -> Array:
        """See `Solid.shape`; not defined at the apex itself."""
        return _factors(points)[0]

    def gradients(self, points: Array) -> Array:
        """See `Solid.gradients`; not defined at the apex itself."""
        return _factors(points)[1]

    @cached_property
    def stiffness_rule(self) -> Rule:
        """Exact for affine cells."""
        return pyramid(3, 4)

    @cached_property
    def mass_rule(self) -> Rule:
        """Exact for affine cells and for straight-edged ones."""
        return pyramid(4, 5)

    @cached_property
    def stress_rule(self) -> Rule:
        """2 x 2 x 2 points."""
        return pyramid(2, 2)


def _factors(points: Array) -> tuple[Array, Array]:
    """Shape functions and gradients; each is a product of linear factors (value, slope) over 1 - z."""
    one = np.ones(len(points))
    x, y, z = points.T
    up, ex, ey = np.eye(3)[2], np.eye(3)[0], np.eye(3)[1]

    def side(a: float, along: Array, direction: Array) -> tuple[Array, Array]:
        return one + a * along - z, a * direction - up

    products: list[tuple[float, list[tuple[Array, Array]]]] = []
    for a, b, _ in CORNERS[:4]:
        tilt = (a * x + b * y - 1, a * ex + b * ey)
        products.append((0.25, [tilt, side(a, x, ex), side(b, y, ey)]))
    products.append((1.0, [(z, up), (2 * z - 1, 2 * up), (1 - z, -up)]))
    for a, b, _ in _NODES[5:9]:
        if a == 0:
            sides = [side(1, x, ex), side(-1, x, ex), side(b, y, ey)]
        else:
            sides = [side(1, y, ey), side(-1, y, ey), side(a, x, ex)]
        products.append((0.5, sides))
    for a, b, _ in CORNERS[:4]:
        products.append((1.0, [(z, up), side(a, x, ex), side(b, y, ey)]))
    shape, slope = np.empty((len(points), 13)), np.empty((len(points), 13, 3))
    below = 1 / (1 - z)
    for node, (scale, ((p, dp), (q, dq), (r, dr))) in enumerate(products):
        shape[:, node] = scale * p * q * r * below
        slope[:, node] = (
            scale * below[:, None] * ((q * r)[:, None] * dp + (p * r)[:, None] * dq + (p * q)[:, None] * dr)
            + (shape[:, node] * below)[:, None] * up
        )
    return shape, slope
