"""First-order pyramid: five nodes, rational shape functions that match all its neighbours.

Nodes 0 to 3 on the base, 4 the apex. Source: G. Bedrosian, IJNME 35 (1992) 95-108. Plain displacement
element, too stiff in bending; meant as the link between hexahedra and tetrahedra.
"""

from __future__ import annotations

from functools import cached_property
from typing import ClassVar

import numpy as np

from vib.structure.cells.family import Array
from vib.structure.cells.quadrature import Rule, pyramid
from vib.structure.cells.solid import Solid

CORNERS = np.array([[-1, -1, 0], [1, -1, 0], [1, 1, 0], [-1, 1, 0], [0, 0, 1]], dtype=np.float64)


class Pyramid(Solid):
    """Rational five-node pyramid."""

    kind: ClassVar[str] = "pyramid"
    nodes: ClassVar[int] = 5
    corners: ClassVar[int] = 5
    remark: ClassVar[str] = (
        "first-order pyramids are too stiff in bending; they serve as links between other cells, "
        "where many of them carry the load use second-order ones"
    )

    @property
    def reference(self) -> Array:
        """See `Solid.reference`."""
        return CORNERS

    def shape(self, points: Array) -> Array:
        """See `Solid.shape`; not defined at the apex itself."""
        x, y, z = points.T
        shape = np.empty((len(points), 5))
        for node, (a, b, _) in enumerate(CORNERS[:4]):
            shape[:, node] = (1 + a * x - z) * (1 + b * y - z) / (4 * (1 - z))
        shape[:, 4] = z
        return shape

    def gradients(self, points: Array) -> Array:
        """See `Solid.gradients`; not defined at the apex itself."""
        x, y, z = points.T
        found = np.zeros((len(points), 5, 3))
        for node, (a, b, _) in enumerate(CORNERS[:4]):
            found[:, node, 0] = a * (1 + b * y - z) / (4 * (1 - z))
            found[:, node, 1] = b * (1 + a * x - z) / (4 * (1 - z))
            found[:, node, 2] = (a * b * x * y / (1 - z) ** 2 - 1) / 4
        found[:, 4, 2] = 1
        return found

    @cached_property
    def stiffness_rule(self) -> Rule:
        """Exact for affine cells."""
        return pyramid(2, 2)

    @cached_property
    def mass_rule(self) -> Rule:
        """Exact for all five-node pyramids."""
        return pyramid(3, 4)

    @cached_property
    def stress_rule(self) -> Rule:
        """The point on the axis at a quarter of the height, the centre of mass."""
        return Rule(np.array([[0.0, 0.0, 0.25]]), np.array([4 / 3]))
