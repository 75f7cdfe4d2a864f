"""Solid cells whose shape functions are polynomials given by their nodes."""

from __future__ import annotations

from typing import ClassVar

from vib.structure.cells.family import Array
from vib.structure.cells.polynomial import Nodal
from vib.structure.cells.solid import Solid


class NodalSolid(Solid):
    """A solid cell that names its shape functions once, as ``functions``."""

    functions: ClassVar[Nodal]

    @property
    def reference(self) -> Array:
        """See `Solid.reference`."""
        return self.functions.nodes

    def shape(self, points: Array) -> Array:
        """See `Solid.shape`."""
        return self.functions.values(points)

    def gradients(self, points: Array) -> Array:
        """See `Solid.gradients`."""
        return self.functions.gradients(points)
