"""First-order quadrilateral: four nodes, flat or warped.

The mean of the two ways to cut it into the triangles of `triangle`, as in the early flat-shell quadrilaterals
(R. W. Clough, C. A. Felippa, Proc. 2nd Conf. Matrix Methods in Structural Mechanics (1968) 399-440, build
theirs from triangles too): thin and thick bending without locking, exact in-plane bending of rectangles.
"""

from __future__ import annotations

from typing import ClassVar

from vib.structure.cells.split import Split, cut


class Quad(Split):
    """Shell of four nodes."""

    kind: ClassVar[str] = "quad"
    nodes: ClassVar[int] = 4
    corners: ClassVar[int] = 4
    pieces: ClassVar[tuple[tuple[int, int, int], ...]] = cut((0, 1, 2, 3))
    shares: ClassVar[tuple[float, ...]] = (0.5,) * 4
    turned: ClassVar[tuple[int, ...]] = (0, 3, 2, 1)
