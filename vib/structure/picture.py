"""What later rooms look at: named places, and the lines of a drawing."""

from __future__ import annotations

import numpy as np
import scipy.sparse as sparse

from vib.structure.assembly import Assembly
from vib.structure.springs import GROUND
from vib.system import Matrix, Place, Wireframe


def find_places(assembly: Assembly) -> dict[str, Place]:
    """Every point and body by name, and how it follows the freedoms."""
    layout, nodes = assembly.layout, assembly.nodes
    names = (*layout.point_names, *layout.bodies.names)
    places = nodes.places_m[: len(names)].tolist()
    return {
        name: Place(name, (place[0], place[1], place[2]), _six_rows(nodes.transform, i))
        for i, (name, place) in enumerate(zip(names, places, strict=True))
    }


def _six_rows(matrix: Matrix, node: int) -> Matrix:
    """The rows of one node of a csr_array, without the cost of general slicing."""
    start = matrix.indptr[6 * node : 6 * node + 7]
    span = slice(start[0], start[-1])
    return sparse.csr_array(
        (matrix.data[span], matrix.indices[span], start - start[0]), shape=(6, matrix.shape[1]), copy=False
    )


def draw(assembly: Assembly) -> Wireframe:
    """Lines along every stretch, from bodies to their carriers, along offsets and between sprung points."""
    layout, nodes = assembly.layout, assembly.nodes
    stretches, springs = layout.stretches, layout.springs
    rows = (6 * np.arange(len(nodes.places_m))[:, None] + np.arange(3)).reshape(-1)
    lines: list[tuple[str, tuple[int, ...]]] = []
    for s, count in enumerate(assembly.counts.tolist()):
        name = assembly.group_name(stretches.group[s])
        lines.append((name, nodes.along(s, count)))
        for end in (0, 1):
            if stretches.reach_m[s, end].any():
                lines.append((name, (int(stretches.ends[s, end]), int(nodes.ends[s, end]))))
    for (a, b), owner in zip(springs.ends.tolist(), springs.owner.tolist(), strict=True):
        if b != GROUND:
            lines.append((assembly.spring_name(owner), (a, b)))
    for i, carriers in enumerate(layout.bodies.carriers):
        centre = len(layout.point_names) + i
        lines += [(assembly.body_name(i), (centre, point)) for point in carriers]
    return Wireframe(nodes.places_m, sparse.csr_array(nodes.transform[rows]), tuple(lines))
