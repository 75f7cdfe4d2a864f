"""Second-order quadrilateral with nine nodes, computed as four quads.

The mid-edge and centre nodes count as mesh points: accuracy is that of first-order quads of half the size.
"""

from __future__ import annotations

from typing import ClassVar

from vib.structure.cells.split import Split, cut


class Quad9(Split):
    """Shell of nine nodes; 4 to 7 lie on the edges 01, 12, 23, 30, node 8 in the centre."""

    kind: ClassVar[str] = "quad9"
    nodes: ClassVar[int] = 9
    corners: ClassVar[int] = 4
    pieces: ClassVar[tuple[tuple[int, int, int], ...]] = cut(
        (0, 4, 8, 7), (4, 1, 5, 8), (8, 5, 2, 6), (7, 8, 6, 3)
    )
    shares: ClassVar[tuple[float, ...]] = (0.5,) * 16
    turned: ClassVar[tuple[int, ...]] = (0, 3, 2, 1, 7, 6, 5, 4, 8)
    remark: ClassVar[str] = "each is computed as four quads between its nine nodes"
