"""What later rooms look at: named places, and the lines of a drawing."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import scipy.sparse as sparse
from numpy.typing import NDArray

from vib.structure.assembly import Assembly
from vib.structure.springs import GROUND
from vib.system import Matrix, MeshView, Place, Wireframe

_MOST_ARMS = 24  # of a body that many points carry, drawn


def find_places(assembly: Assembly) -> dict[str, Place]:
    """Every point and body by name, and how it follows the freedoms; of a mesh only what has a name."""
    layout, nodes, mesh = assembly.layout, assembly.nodes, assembly.layout.mesh
    names = (*layout.point_names, *layout.bodies.names)
    places = nodes.places_m[: len(names)].tolist()
    found = {
        name: Place(name, (place[0], place[1], place[2]), _six_rows(nodes.transform, i, assembly.size))
        for i, (name, place) in enumerate(zip(names, places, strict=True))
        if mesh is None
        or i >= len(layout.point_names)
        or name in mesh.asked
        or name not in mesh.node_of_point
    }
    if mesh is None:
        return found
    point_of = {node: name for name, node in mesh.node_of_point.items()}
    number = {name: i for i, name in enumerate(layout.point_names)}

    def motion(node: int) -> Matrix:
        if node in point_of:
            return _six_rows(nodes.transform, number[point_of[node]], assembly.size)
        assert assembly.woven is not None
        return assembly.woven.motion_of(node)

    for name, node in mesh.named.items():
        if name not in found:
            x, y, z = mesh.nodes_m[node].tolist()
            found[name] = Place(name, (x, y, z), motion(node))
    for name, members in mesh.sets.items():
        x, y, z = mesh.nodes_m[members].mean(axis=0).tolist()
        total = _mean_motion(assembly, members, motion)
        found[name] = Place(name, (x, y, z), total)
    return {name: found[name] for name in (*(n for n in mesh.asked if n in found), *found)}


def _mean_motion(assembly: Assembly, members: NDArray[np.intp], motion: Callable[[int], Matrix]) -> Matrix:
    """(6, n): what the nodes of a set do on average; rotations count where all of them have some."""
    stacked = sparse.vstack([motion(int(node)) for node in members], format="csr")
    row = np.arange(stacked.shape[0])
    mean = sparse.coo_array((np.full(len(row), 1 / len(members)), (row % 6, row)), shape=(6, len(row)))
    found = sparse.csr_array(mean @ stacked)
    turning = np.diff(stacked.indptr).reshape(-1, 6)[:, 3:].any(axis=1)
    if turning.all():
        return found
    kept = sparse.coo_array((np.ones(3), (np.arange(3), np.arange(3))), shape=(6, 6))
    return sparse.csr_array(kept @ found)


def _six_rows(matrix: Matrix, node: int, size: int) -> Matrix:
    """The rows (6, size) of one node of a csr_array, without the cost of general slicing."""
    start = matrix.indptr[6 * node : 6 * node + 7]
    span = slice(start[0], start[-1])
    return sparse.csr_array(
        (matrix.data[span], matrix.indices[span], start - start[0]), shape=(6, size), copy=False
    )


def draw(assembly: Assembly, mesh: MeshView | None = None) -> Wireframe:
    """Lines along every stretch, from bodies to their carriers, along offsets and between sprung points.

    The nodes of a mesh that are seen from outside follow those of the frame, without lines.
    """
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
        few = carriers[:: -(-len(carriers) // _MOST_ARMS)]
        lines += [(assembly.body_name(i), (centre, point)) for point in few]
    moved = sparse.csr_array(nodes.transform[rows])
    if mesh is None:
        return Wireframe(nodes.places_m, moved, tuple(lines))
    seen = np.unique(np.concatenate([faces.ravel() for _, faces in mesh.faces]))
    after = mesh.motion[(3 * seen[:, None] + np.arange(3)).ravel()]
    moved = sparse.csr_array((moved.data, moved.indices, moved.indptr), shape=(moved.shape[0], assembly.size))
    places = np.concatenate([nodes.places_m, mesh.nodes_m[seen]])
    return Wireframe(places, sparse.vstack([moved, after], format="csr"), tuple(lines))
