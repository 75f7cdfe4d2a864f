"""First-order tetrahedron: four nodes, constant strain.

Too stiff for bending and for nearly incompressible materials; its second-order sister is recommended.
Source: O. C. Zienkiewicz, R. L. Taylor, The Finite Element Method, vol. 1, ch. on shape functions.
"""

from __future__ import annotations

from functools import cached_property
from typing import ClassVar

import numpy as np

from vib.structure.cells.nodal import NodalSolid
from vib.structure.cells.polynomial import Nodal
from vib.structure.cells.quadrature import Rule, tetrahedron

_NODES = np.array([[0, 0, 0], [1, 0, 0], [0, 1, 0], [0, 0, 1]], dtype=np.float64)
_FUNCTIONS = Nodal(_NODES, _NODES.astype(np.intp))


class Tetra(NodalSolid):
    """Constant-strain tetrahedron."""

    kind: ClassVar[str] = "tetra"
    functions: ClassVar[Nodal] = _FUNCTIONS
    nodes: ClassVar[int] = 4
    corners: ClassVar[int] = 4
    remark: ClassVar[str] = (
        "first-order tetrahedra are too stiff, so that frequencies come out too high; "
        "the error bar shows by how much, second-order tetrahedra are far closer"
    )

    @cached_property
    def stiffness_rule(self) -> Rule:
        """One point: the strain is constant."""
        return tetrahedron(1)

    @cached_property
    def mass_rule(self) -> Rule:
        """Exact for products of linear functions."""
        return tetrahedron(2)

    @cached_property
    def stress_rule(self) -> Rule:
        """The centre."""
        return tetrahedron(1)
