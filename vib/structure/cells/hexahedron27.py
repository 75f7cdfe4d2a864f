"""Second-order hexahedron with nodes on edges, faces and in the centre: 27 nodes.

Nodes 20 to 25 on the faces -x, +x, -y, +y, -z, +z of the reference cube, 26 in the centre.
Source: O. C. Zienkiewicz, R. L. Taylor, The Finite Element Method, vol. 1, ch. on shape functions.
"""

from __future__ import annotations

from functools import cached_property
from itertools import product
from typing import ClassVar

import numpy as np

from vib.structure.cells.hexahedron20 import NODES
from vib.structure.cells.nodal import NodalSolid
from vib.structure.cells.polynomial import Nodal
from vib.structure.cells.quadrature import Rule, cube

_FACES = np.array([[-1, 0, 0], [1, 0, 0], [0, -1, 0], [0, 1, 0], [0, 0, -1], [0, 0, 1], [0, 0, 0]])
_FUNCTIONS = Nodal(np.vstack([NODES, _FACES]), np.array(list(product(range(3), repeat=3))))


class Hexahedron27(NodalSolid):
    """Triquadratic hexahedron."""

    kind: ClassVar[str] = "hexahedron27"
    functions: ClassVar[Nodal] = _FUNCTIONS
    nodes: ClassVar[int] = 27
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
