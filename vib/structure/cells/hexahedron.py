"""First-order hexahedron with incompatible modes: eight nodes, good in bending.

Three internal quadratic displacement modes are eliminated in each cell. Sources: E. L. Wilson, R. L. Taylor,
W. P. Doherty, J. Ghaboussi, in Numerical and Computer Methods in Structural Mechanics (1973) 43-57, with the
correction that makes it pass the patch test on any shape: R. L. Taylor, P. J. Beresford, E. L. Wilson,
IJNME 10 (1976) 1211-1219.
"""

from __future__ import annotations

from functools import cached_property
from typing import ClassVar

import numpy as np

from vib.structure.cells.family import Array, Properties, upper_blocks, whole
from vib.structure.cells.polynomial import Nodal
from vib.structure.cells.quadrature import Rule, cube
from vib.structure.cells.solid import Solid

CORNERS = np.array(
    [[-1, -1, -1], [1, -1, -1], [1, 1, -1], [-1, 1, -1], [-1, -1, 1], [1, -1, 1], [1, 1, 1], [-1, 1, 1]],
    dtype=np.float64,
)
_OUTER = 24  # freedoms of the nodes; those of the internal modes come after
_FUNCTIONS = Nodal(CORNERS, ((CORNERS + 1) / 2).astype(np.intp))


class Hexahedron(Solid):
    """Trilinear hexahedron with incompatible modes."""

    kind: ClassVar[str] = "hexahedron"
    nodes: ClassVar[int] = 8
    corners: ClassVar[int] = 8

    @property
    def reference(self) -> Array:
        """See `Solid.reference`."""
        return CORNERS

    def shape(self, points: Array) -> Array:
        """See `Solid.shape`."""
        return _FUNCTIONS.values(points)

    def gradients(self, points: Array) -> Array:
        """See `Solid.gradients`."""
        return _FUNCTIONS.gradients(points)

    def extra_gradients(self, points: Array) -> Array:
        """Of the modes 1 - x^2, 1 - y^2, 1 - z^2 in reference coordinates."""
        return -2 * points[:, :, None] * np.eye(3)

    def _condensed(self, blocks: Array) -> Array:
        matrix = whole(blocks, self._all_pairs)
        reduced = matrix[:, :_OUTER, :_OUTER] + matrix[:, :_OUTER, _OUTER:] @ _following(matrix)
        return upper_blocks((reduced + reduced.swapaxes(1, 2)) / 2, self.pairs)

    def internal(self, coordinates: Array, properties: Properties, displacements: Array) -> Array:
        """See `Solid.internal`."""
        matrix = whole(self._full_blocks(coordinates, properties), self._all_pairs)
        found: Array = (_following(matrix) @ displacements).reshape(len(matrix), 3, 3, -1)
        return found

    @cached_property
    def stiffness_rule(self) -> Rule:
        """2 x 2 x 2 points, as the patch test of the incompatible modes needs."""
        return cube(2)

    @cached_property
    def mass_rule(self) -> Rule:
        """Exact for all eight-node cells."""
        return cube(3)

    @cached_property
    def stress_rule(self) -> Rule:
        """The centre, where the incompatible modes have no strain."""
        return cube(1)


def _following(matrix: Array) -> Array:
    """Motion of the internal modes per motion of the nodes, (e, 9, 24)."""
    return np.asarray(-np.linalg.solve(matrix[:, _OUTER:, _OUTER:], matrix[:, _OUTER:, :_OUTER]))
