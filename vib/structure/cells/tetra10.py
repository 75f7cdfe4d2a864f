"""Second-order tetrahedron: ten nodes, straight or curved edges; recommended.

Nodes 4 to 9 lie on the edges 01, 12, 20, 03, 13, 23.
Source: O. C. Zienkiewicz, R. L. Taylor, The Finite Element Method, vol. 1, ch. on shape functions.
"""

from __future__ import annotations

from functools import cached_property
from typing import ClassVar

import numpy as np

from vib.structure.cells.nodal import NodalSolid
from vib.structure.cells.polynomial import Nodal
from vib.structure.cells.quadrature import Rule, collapsed_tetrahedron, tetrahedron

_CORNERS = np.array([[0, 0, 0], [1, 0, 0], [0, 1, 0], [0, 0, 1]], dtype=np.float64)
_EDGES = np.array([[0, 1], [1, 2], [2, 0], [0, 3], [1, 3], [2, 3]])
_NODES = np.vstack([_CORNERS, _CORNERS[_EDGES].mean(axis=1)])
_FUNCTIONS = Nodal(_NODES, np.rint(2 * _NODES).astype(np.intp))  # twice a node is its monomial's exponents


class Tetra10(NodalSolid):
    """Quadratic tetrahedron."""

    kind: ClassVar[str] = "tetra10"
    functions: ClassVar[Nodal] = _FUNCTIONS
    nodes: ClassVar[int] = 10
    corners: ClassVar[int] = 4

    @cached_property
    def stiffness_rule(self) -> Rule:
        """Degree 5; straight-edged cells need only 2, which the affine path integrates exactly."""
        return tetrahedron(5)

    @cached_property
    def mass_rule(self) -> Rule:
        """Exact to degree 7, so also on curved cells."""
        return collapsed_tetrahedron(5)

    @cached_property
    def stress_rule(self) -> Rule:
        """Four points."""
        return tetrahedron(2)
