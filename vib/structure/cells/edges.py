"""Edges and faces of solids by their number of corners; corners are numbered as in meshio (and VTK)."""

from __future__ import annotations

# in the order of the mid-edge nodes of the second-order cells
EDGES: dict[int, tuple[tuple[int, int], ...]] = {
    4: ((0, 1), (1, 2), (2, 0), (0, 3), (1, 3), (2, 3)),
    5: ((0, 1), (1, 2), (2, 3), (3, 0), (0, 4), (1, 4), (2, 4), (3, 4)),
    6: ((0, 1), (1, 2), (2, 0), (3, 4), (4, 5), (5, 3), (0, 3), (1, 4), (2, 5)),
    8: (
        *((0, 1), (1, 2), (2, 3), (3, 0), (4, 5), (5, 6), (6, 7), (7, 4)),
        *((0, 4), (1, 5), (2, 6), (3, 7)),
    ),
}
# corners in a row around each face; which way round depends on where the cell lies
FACES: dict[int, tuple[tuple[int, ...], ...]] = {
    4: ((0, 1, 2), (0, 1, 3), (1, 2, 3), (0, 2, 3)),
    5: ((0, 1, 2, 3), (0, 1, 4), (1, 2, 4), (2, 3, 4), (3, 0, 4)),
    6: ((0, 1, 2), (3, 4, 5), (0, 1, 4, 3), (1, 2, 5, 4), (2, 0, 3, 5)),
    8: ((0, 1, 2, 3), (4, 5, 6, 7), (0, 1, 5, 4), (1, 2, 6, 5), (2, 3, 7, 6), (3, 0, 4, 7)),
}
