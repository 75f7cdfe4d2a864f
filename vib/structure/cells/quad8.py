"""Second-order quadrilateral with eight nodes, computed as a quad of nine whose centre is eliminated.

The centre lies where the eight-node shape functions put it; its six freedoms follow the others statically
(R. J. Guyan, AIAA J. 3 (1965) 380), within each cell and in the mass alike.
"""

from __future__ import annotations

from typing import ClassVar

import numpy as np
from numpy.typing import NDArray

from vib.structure.cells.family import Array, Properties, Stresses
from vib.structure.cells.quad9 import Quad9

_OUTER = 48
_CENTRE = np.array([-0.25] * 4 + [0.5] * 4)


class Quad8(Quad9):
    """Shell of eight nodes; 4 to 7 lie on the edges 01, 12, 23, 30."""

    kind: ClassVar[str] = "quad8"
    nodes: ClassVar[int] = 8
    turned: ClassVar[tuple[int, ...]] = (0, 3, 2, 1, 7, 6, 5, 4)
    remark: ClassVar[str] = "each is computed as four quads between its eight nodes and its centre"
    _whole: ClassVar[Quad9] = Quad9()

    def stiffness(self, coordinates: Array, properties: Properties) -> Array:
        """See `Family.stiffness`."""
        matrix = self._whole.stiffness(_with_centre(coordinates), properties)
        follow = _following(matrix)
        reduced = matrix[:, :_OUTER, :_OUTER] + matrix[:, :_OUTER, _OUTER:] @ follow
        found: Array = (reduced + reduced.swapaxes(1, 2)) / 2
        return found

    def mass(self, coordinates: Array, properties: Properties) -> Array:
        """See `Family.mass`."""
        nine = _with_centre(coordinates)
        follow = _following(self._whole.stiffness(nine, properties))
        every = np.concatenate([np.broadcast_to(np.eye(_OUTER), (len(nine), _OUTER, _OUTER)), follow], axis=1)
        found: Array = every.swapaxes(1, 2) @ self._whole.mass(nine, properties) @ every
        return found

    def stresses(self, coordinates: Array, properties: Properties, displacements: Array) -> Stresses:
        """See `Family.stresses`."""
        nine = _with_centre(coordinates)
        follow = _following(self._whole.stiffness(nine, properties))
        moved = np.concatenate([displacements, follow @ displacements], axis=1)
        return self._whole.stresses(nine, properties, moved)

    def faults(self, coordinates: Array) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
        """See `Family.faults`."""
        return self._whole.faults(_with_centre(coordinates))


def _with_centre(coordinates: Array) -> Array:
    centre = np.tensordot(coordinates, _CENTRE, axes=(1, 0))
    return np.concatenate([coordinates, centre[:, None]], axis=1)


def _following(matrix: Array) -> Array:
    """Motion of the centre per motion of the other nodes, (e, 6, 48)."""
    return np.asarray(-np.linalg.solve(matrix[:, _OUTER:, _OUTER:], matrix[:, _OUTER:, :_OUTER]))
