"""Nodal shape functions from a list of monomials: N = basis x inverse of the basis at the nodes."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Nodal:
    """Shape functions that are one at their own node, zero at the others, and span the monomials given.

    ``nodes`` (n, d) and ``exponents`` (n, d): one monomial of the reference coordinates a row.
    """

    nodes: Array
    exponents: NDArray[np.intp]

    @cached_property
    def _coefficients(self) -> Array:
        # all cells here have dyadic coefficients; rounding removes the last bits of the inverse
        return np.round(np.linalg.inv(self._basis(self.nodes)) * 2**10) / 2**10

    def values(self, points: Array) -> Array:
        """Shape functions (p, n) at points (p, d)."""
        return self._basis(points) @ self._coefficients

    def gradients(self, points: Array) -> Array:
        """Derivatives (p, n, d) with respect to the reference coordinates."""
        columns = []
        for axis in range(points.shape[1]):
            lowered = self.exponents.copy()
            lowered[:, axis] = np.maximum(lowered[:, axis] - 1, 0)
            basis = np.prod(points[:, None, :] ** lowered, axis=2) * self.exponents[:, axis]
            columns.append(basis @ self._coefficients)
        return np.stack(columns, axis=2)

    def _basis(self, points: Array) -> Array:
        found: Array = np.prod(points[:, None, :] ** self.exponents, axis=2)
        return found


def mirrored_order(nodes: Array, swapped: tuple[int, int] | None) -> NDArray[np.intp]:
    """Where each node goes when two reference axes are swapped (None: the last axis is reversed)."""
    image = nodes.copy()
    if swapped is None:
        image[:, -1] = -image[:, -1]
    else:
        image[:, list(swapped)] = image[:, list(swapped)[::-1]]
    distance = np.abs(image[:, None, :] - nodes[None, :, :]).max(axis=2)
    return np.asarray(distance.argmin(axis=1), dtype=np.intp)
