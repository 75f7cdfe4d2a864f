"""First-order wedge: six nodes.

Nodes 0, 1, 2 on one triangle, 3, 4, 5 on the other. Plain displacement element: its triangles have constant
in-plane strain, so it is too stiff in bending.
Source: O. C. Zienkiewicz, R. L. Taylor, The Finite Element Method, vol. 1, ch. on shape functions.
"""

from __future__ import annotations

from functools import cached_property
from typing import ClassVar

import numpy as np

from vib.structure.cells.nodal import NodalSolid
from vib.structure.cells.polynomial import Nodal
from vib.structure.cells.quadrature import Rule, wedge

_TRIANGLE = np.array([[0, 0], [1, 0], [0, 1]], dtype=np.float64)
_NODES = np.vstack([np.column_stack([_TRIANGLE, np.full(3, z)]) for z in (-1.0, 1.0)])
_FUNCTIONS = Nodal(_NODES, np.array([[i, j, k] for k in (0, 1) for i, j in ((0, 0), (1, 0), (0, 1))]))


class Wedge(NodalSolid):
    """Linear wedge."""

    kind: ClassVar[str] = "wedge"
    functions: ClassVar[Nodal] = _FUNCTIONS
    nodes: ClassVar[int] = 6
    corners: ClassVar[int] = 6
    mirror: ClassVar[tuple[int, int] | None] = None
    remark: ClassVar[str] = (
        "first-order wedges are too stiff in bending, so that frequencies come out too high; "
        "second-order wedges are far closer"
    )

    @cached_property
    def stiffness_rule(self) -> Rule:
        """Exact for affine cells."""
        return wedge(2, 2)

    @cached_property
    def mass_rule(self) -> Rule:
        """Exact for all six-node wedges."""
        return wedge(4, 3)

    @cached_property
    def stress_rule(self) -> Rule:
        """The centre."""
        return wedge(1, 1)
