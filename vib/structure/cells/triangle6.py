"""Second-order triangle with six nodes, computed as four triangles.

The mid-edge nodes count as mesh points: accuracy is that of first-order triangles of half the size.
"""

from __future__ import annotations

from typing import ClassVar

from vib.structure.cells.split import Split


class Triangle6(Split):
    """Shell of six nodes; 3 to 5 lie on the edges 01, 12, 20."""

    kind: ClassVar[str] = "triangle6"
    nodes: ClassVar[int] = 6
    corners: ClassVar[int] = 3
    pieces: ClassVar[tuple[tuple[int, int, int], ...]] = ((0, 3, 5), (3, 1, 4), (5, 4, 2), (3, 4, 5))
    shares: ClassVar[tuple[float, ...]] = (1.0,) * 4
    turned: ClassVar[tuple[int, ...]] = (0, 2, 1, 5, 4, 3)
    remark: ClassVar[str] = "each is computed as four triangles between its six nodes"
