"""Whether the parts of a mesh hang together, with members, bodies and springs between them."""

from __future__ import annotations

import numpy as np
import scipy.sparse as sparse
from numpy.typing import NDArray
from scipy.sparse.csgraph import connected_components

from vib.errors import ModelError
from vib.structure.bodies import Bodies
from vib.structure.members import Stretches
from vib.structure.mesh.model import MeshModel, held_flags
from vib.structure.mesh.reading import listed
from vib.structure.sparsity import Group
from vib.structure.springs import GROUND, Springs

Numbers = NDArray[np.intp]


def components_in_cells(mesh: MeshModel, points: dict[str, int]) -> Numbers:
    """(p,) how many components the cells resist at each point: 6 at shells, 3 at solids, else 0."""
    most = np.zeros(len(mesh.nodes_m), dtype=np.intp)
    for group in mesh.groups:
        nodes = group.connectivity.ravel()
        most[nodes] = np.maximum(most[nodes], group.family.freedoms)
    found = np.zeros(len(points), dtype=np.intp)
    for name, node in mesh.node_of_point.items():
        found[points[name]] = most[node]
    return found


def check_parts(
    mesh: MeshModel,
    points: dict[str, int],
    held: NDArray[np.bool_],
    stretches: Stretches,
    springs: Springs,
    bodies: Bodies,
) -> None:
    """Raise ModelError where a part of the mesh hangs on nothing while there are others."""
    if not mesh.groups:
        return
    nodes, first_point = len(mesh.nodes_m), len(mesh.nodes_m)
    first_body = first_point + len(points)
    ground = first_body + len(bodies.names)
    links: list[tuple[Numbers, Numbers]] = []
    for group in mesh.groups:
        cells = group.connectivity
        links.append((np.repeat(cells[:, 0], cells.shape[1] - 1), cells[:, 1:].ravel()))
    own = [(node, first_point + points[name]) for name, node in mesh.node_of_point.items()]
    own += [(first_body + i, first_point + point) for i, row in enumerate(bodies.carriers) for point in row]
    own += [(first_point + a, first_point + b) for a, b in stretches.ends.tolist()]
    own += [(first_point + a, ground if b == GROUND else first_point + b) for a, b in springs.ends.tolist()]
    own += [(first_point + point, ground) for point in np.flatnonzero(held.any(axis=1)).tolist()]
    own += [(node, ground) for node in np.flatnonzero(held_flags(mesh)[:, :3].any(axis=1)).tolist()]
    if own:
        a, b = np.array(own, dtype=np.intp).T
        links.append((a, b))
    rows, columns = (np.concatenate(part) for part in zip(*links, strict=True))
    graph = sparse.coo_array((np.ones(len(rows), dtype=bool), (rows, columns)), shape=(ground + 1,) * 2)
    label = connected_components(graph, directed=False)[1]
    used = np.zeros(nodes, dtype=bool)
    for group in mesh.groups:
        used[group.connectivity] = True
    parts = np.unique(label[:nodes][used])
    loose = [part for part in parts.tolist() if part != label[ground]]
    if len(parts) < 2 or not loose:
        return
    told = [
        f"{listed('cell', numbers, 3)} ({listed('node', group.connectivity[mine].min(axis=1)[:1] + 1)}, ...)"
        for part in loose[:3]
        for group, mine, numbers in _cells_of(mesh, label, part)
    ]
    raise ModelError(
        f"mesh: it falls into {len(parts)} parts that nothing joins, and {len(loose)} of them hang on "
        f"nothing: {'; '.join(told)}. Join their nodes ([mesh] join_within), or tie them by [[springs]], "
        "[[members]], [[bodies]] or [[supports]]"
    )


def _cells_of(mesh: MeshModel, label: Numbers, part: int) -> list[tuple[Group, Numbers, Numbers]]:
    found: list[tuple[Group, Numbers, Numbers]] = []
    for group, numbers in zip(mesh.groups, mesh.numbers, strict=True):
        mine = np.flatnonzero(label[group.connectivity[:, 0]] == part)
        if len(mine):
            found.append((group, mine, numbers[mine]))
    return found[:1]
