"""Second-order hexahedron with nodes on its edges: twenty nodes.

Nodes 8 to 11 on the edges of face 0123, 12 to 15 of face 4567, 16 to 19 on the edges between them.
Source: serendipity functions,
O. C. Zienkiewicz, R. L. Taylor, The Finite Element Method, vol. 1, ch. on shape functions.
"""

from __future__ import annotations

from functools import cached_property
from itertools import product
from typing import ClassVar

import numpy as np

from vib.structure.cells.hexahedron import CORNERS
from vib.structure.cells.nodal import NodalSolid
from vib.structure.cells.polynomial import Nodal
from vib.structure.cells.quadrature import Rule, cube

EDGES = np.array(
    [[0, 1], [1, 2], [2, 3], [3, 0], [4, 5], [5, 6], [6, 7], [7, 4], [0, 4], [1, 5], [2, 6], [3, 7]]
)
NODES = np.vstack([CORNERS, CORNERS[EDGES].mean(axis=1)])
_POWERS = [
    powers
    for powers in product(range(3), repeat=3)
    if sum(power for power in powers if power > 1) <= 2  # superlinear degree two (Arnold & Awanou 2011)
]
_FUNCTIONS = Nodal(NODES, np.array(_POWERS))


class Hexahedron20(NodalSolid):
    """Serendipity hexahedron."""

    kind: ClassVar[str] = "hexahedron20"
    functions: ClassVar[Nodal] = _FUNCTIONS
    nodes: ClassVar[int] = 20
    corners: ClassVar[int] = 8

    @cached_property
    def stiffness_rule(self) -> Rule:
        """Exact for parallelepipeds."""
        return cube(3)

    @cached_property
    def mass_rule(self) -> Rule:
        """Exact for trilinear cells too."""
        return cube(4)

    @cached_property
    def stress_rule(self) -> Rule:
        """The 2 x 2 x 2 points where stresses are superconvergent (J. Barlow, IJNME 10 (1976) 243-251)."""
        return cube(2)
