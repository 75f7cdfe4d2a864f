"""Shells of more than three nodes, computed as the triangles that they are cut into."""

from __future__ import annotations

from collections.abc import Callable
from functools import cached_property
from typing import ClassVar

import numpy as np
from numpy.typing import NDArray

from vib.structure.cells.family import Array, Family, Numbers, Properties, Stresses, upper_blocks
from vib.structure.cells.triangle import Triangle, area_vectors

_TRIANGLE = Triangle()
# a corner is folded in where its triangle has less than this part of the cell's size squared
_FOLDED = 1e-10
# the two ways to cut a quad into triangles
QUAD = ((0, 1, 2), (0, 2, 3), (0, 1, 3), (1, 2, 3))


class Split(Family):
    """A cell that is the weighted sum of triangles: node numbers ``pieces`` and a ``shares`` for each.

    A quad is the mean of its two cuts, so that it has no preferred diagonal, warped or not.
    """

    freedoms: ClassVar[int] = 6
    dimension: ClassVar[int] = 2
    pieces: ClassVar[tuple[tuple[int, int, int], ...]]
    shares: ClassVar[tuple[float, ...]]
    turned: ClassVar[tuple[int, ...]]

    @cached_property
    def mirrored(self) -> Numbers:
        """See `Family.mirrored`; it turns the normal round."""
        return np.array(self.turned)

    def stiffness(self, coordinates: Array, properties: Properties) -> Array:
        """See `Family.stiffness`."""
        return self._summed(_TRIANGLE.stiffness, coordinates, properties)

    def mass(self, coordinates: Array, properties: Properties) -> Array:
        """See `Family.mass`."""
        return self._summed(_TRIANGLE.mass, coordinates, properties)

    def stiffness_blocks(self, coordinates: Array, properties: Properties) -> Array:
        """See `Family.stiffness_blocks`."""
        return upper_blocks(self.stiffness(coordinates, properties), self.pairs)

    def mass_blocks(self, coordinates: Array, properties: Properties) -> Array:
        """See `Family.mass_blocks`."""
        return upper_blocks(self.mass(coordinates, properties), self.pairs)

    def stresses(self, coordinates: Array, properties: Properties, displacements: Array) -> Stresses:
        """See `Family.stresses`; at the centre of each piece."""
        apart = displacements.reshape(len(coordinates), self.nodes, 6, -1)
        parts = [
            _TRIANGLE.stresses(coordinates[:, piece], properties, apart[:, piece].reshape(len(apart), 18, -1))
            for piece in self.pieces
        ]
        return Stresses(
            points_m=np.concatenate([part.points_m for part in parts], axis=1),
            weights=np.concatenate([part.weights for part in parts], axis=1) * self.shares,
            values=np.concatenate([part.values for part in parts], axis=1),
            compliance=parts[0].compliance,
            frames=np.concatenate([part.frames for part in parts if part.frames is not None], axis=1),
        )

    def faults(self, coordinates: Array) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
        """See `Family.faults`; folded where a piece faces the other way than the whole."""
        size = np.ptp(coordinates, axis=1).max(axis=1)
        vectors = np.stack([area_vectors(coordinates[:, piece]) for piece in self.pieces], axis=1)
        flat = ~(np.linalg.norm(vectors, axis=2).max(axis=1) > _FOLDED * size**2)
        whole = np.tensordot(vectors, self.shares, axes=(1, 0))
        length = np.maximum(np.linalg.norm(whole, axis=1), np.finfo(float).tiny)
        facing = np.einsum("epi,ei->ep", vectors, whole) / length[:, None]
        return flat, (facing.min(axis=1) <= _FOLDED * size**2) & ~flat

    def _summed(
        self, compute: Callable[[Array, Properties], Array], coordinates: Array, properties: Properties
    ) -> Array:
        count = len(coordinates)
        matrix = np.zeros((count, self.nodes, 6, self.nodes, 6))
        for piece, share in zip(self.pieces, self.shares, strict=True):
            part = compute(coordinates[:, piece], properties).reshape(count, 3, 6, 3, 6)
            for a, row in enumerate(piece):
                for b, column in enumerate(piece):
                    matrix[:, row, :, column] += share * part[:, a, :, b]
        return matrix.reshape(count, 6 * self.nodes, 6 * self.nodes)


def cut(*quads: tuple[int, int, int, int]) -> tuple[tuple[int, int, int], ...]:
    """Both cuts of some quads; each of their triangles has half a share."""
    return tuple((quad[a], quad[b], quad[c]) for quad in quads for a, b, c in QUAD)
