"""Second-order wedge: fifteen nodes.

Nodes 6 to 8 on the edges of triangle 012, 9 to 11 of triangle 345, 12 to 14 between the triangles.
Source: serendipity functions,
O. C. Zienkiewicz, R. L. Taylor, The Finite Element Method, vol. 1, ch. on shape functions.
"""

from __future__ import annotations

from functools import cached_property
from typing import ClassVar

import numpy as np

from vib.structure.cells.nodal import NodalSolid
from vib.structure.cells.polynomial import Nodal
from vib.structure.cells.quadrature import Rule, wedge

_TRIANGLE = np.array([[0, 0], [1, 0], [0, 1]], dtype=np.float64)
_CORNERS = np.vstack([np.column_stack([_TRIANGLE, np.full(3, z)]) for z in (-1.0, 1.0)])
_EDGES = np.array([[0, 1], [1, 2], [2, 0], [3, 4], [4, 5], [5, 3], [0, 3], [1, 4], [2, 5]])
_NODES = np.vstack([_CORNERS, _CORNERS[_EDGES].mean(axis=1)])
_QUADRATIC = ((0, 0), (1, 0), (0, 1), (2, 0), (1, 1), (0, 2))
_POWERS = [[i, j, k] for k in (0, 1) for i, j in _QUADRATIC] + [[0, 0, 2], [1, 0, 2], [0, 1, 2]]
_FUNCTIONS = Nodal(_NODES, np.array(_POWERS))


class Wedge15(NodalSolid):
    """Serendipity wedge."""

    kind: ClassVar[str] = "wedge15"
    functions: ClassVar[Nodal] = _FUNCTIONS
    nodes: ClassVar[int] = 15
    corners: ClassVar[int] = 6
    mirror: ClassVar[tuple[int, int] | None] = None

    @cached_property
    def stiffness_rule(self) -> Rule:
        """Exact for affine cells."""
        return wedge(4, 3)

    @cached_property
    def mass_rule(self) -> Rule:
        """Exact for straight-edged cells too."""
        return wedge(6, 4)

    @cached_property
    def stress_rule(self) -> Rule:
        """Six points."""
        return wedge(2, 2)
