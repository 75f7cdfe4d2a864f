"""Cells that do not fit together: hanging nodes, cells of different order, cells that are there twice.

A hanging node lies on an edge or a face of a cell that does not have it: the mesh is not joined there.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from vib.errors import ModelError
from vib.structure.cells.edges import EDGES, FACES
from vib.structure.mesh.assign import Patch
from vib.structure.mesh.reading import listed
from vib.structure.mesh.skin import faces_seen
from vib.system import Array

Numbers = NDArray[np.intp]
_NEAR = 1e-4  # of the size of an edge or face: nodes nearer than this lie on it


def check_fit(nodes_m: Array, patches: tuple[Patch, ...]) -> tuple[str, ...]:
    """Stop where neighbours do not share all the nodes on their common edges and faces, or lie in each other.

    The remarks say where a quadrangle meets two triangles: all nodes are shared, but what is between them is
    not quite the same on both sides.

    Cells of first and of second order are told apart by their edges; other nodes by where they lie. Inner
    faces of solids and inner edges of shells are shared by their corners, so that only the surface, the rims
    and the lines have to be looked at.

    Raises
    ------
    ModelError
        Names nodes and cells.
    """
    _check_twice(patches)
    edges = [_edges_of(patch) for patch in patches]
    nodes, cells = _mixed_orders(patches, edges)
    if len(nodes):
        raise ModelError(
            f"mesh: {listed('node', np.unique(nodes) + 1)} in the middle of an edge belong to one of the "
            f"cells there and not to its neighbour ({listed('cell', np.unique(cells))}): cells of first and "
            "second order meet; make all of them of one order, or join them by cells whose edges fit"
        )
    found = list(_lying(nodes_m, patches, edges))
    if found:
        nodes, cells = (np.unique(np.concatenate(column)) for column in zip(*found, strict=True))
        raise ModelError(
            f"mesh: {listed('node', nodes + 1)} lie on an edge or a face of cells that do not have them "
            f"({listed('cell', cells)}), so that the mesh is not joined there; divide both sides alike (what "
            "only touches and is not to be joined needs a gap)"
        )
    return tuple(_split_faces(len(nodes_m), patches))


def _check_twice(patches: tuple[Patch, ...]) -> None:
    """Shells and solids with the same corners, and faces that more than two solids have."""
    for dimension in (2, 3):
        own = [patch for patch in patches if _dimension(patch) == dimension]
        for corners in sorted({patch.family.corners for patch in own}):
            alike = [patch for patch in own if patch.family.corners == corners]
            cells = np.sort(np.concatenate([patch.connectivity[:, :corners] for patch in alike]), axis=1)
            _stop_where_more(
                cells, np.concatenate([patch.numbers for patch in alike]), 1, "have the same corners"
            )
    solids = [patch for patch in patches if _dimension(patch) == 3]
    for size in (3, 4):
        faces = [
            (patch.connectivity[:, face], patch.numbers)
            for patch in solids
            for face in FACES[patch.family.corners]
            if len(face) == size
        ]
        if faces:
            nodes, numbers = (np.concatenate(column) for column in zip(*faces, strict=True))
            _stop_where_more(np.sort(nodes, axis=1), numbers, 2, "lie in each other: they share a face")


def _stop_where_more(rows: Numbers, cells: Numbers, most: int, what: str) -> None:
    """Stop where more than ``most`` cells have the same row of nodes."""
    order = np.lexsort(rows.T[::-1])
    ordered = rows[order]
    same = (ordered[most:] == ordered[:-most]).all(axis=1)
    if same.any():
        first = np.flatnonzero(same)
        found = np.unique(cells[order[np.unique(first[:, None] + np.arange(most + 1))]])
        raise ModelError(f"mesh: {listed('cell', found)} {what}; leave out those that are there twice")


def _split_faces(count: int, patches: tuple[Patch, ...]) -> Iterator[str]:
    solids = [patch for patch in patches if _dimension(patch) == 3]
    faces: dict[int, list[Numbers]] = {3: [], 4: []}
    for patch, seen in zip(solids, faces_seen(count, solids), strict=True):
        for face, alone in zip(FACES[patch.family.corners], seen.T, strict=True):
            found = patch.connectivity[alone][:, face]
            faces[len(face)].append(np.column_stack([np.sort(found, axis=1), patch.numbers[alone]]))
    if not (faces[3] and faces[4]):
        return
    triangles, quads = (np.concatenate(faces[size]) for size in (3, 4))
    halves = np.concatenate([np.delete(quads[:, :4], corner, axis=1) for corner in range(4)])
    known = {tuple(nodes) for nodes in triangles[:, :3].tolist()}
    split = np.array([tuple(nodes) in known for nodes in halves.tolist()], dtype=bool)
    cells = np.unique(np.tile(quads[:, 4], 4)[split])
    if len(cells):
        yield (
            f"mesh: faces of {listed('cell', cells, 4)} with four corners meet two triangles each: the mesh "
            "is joined at its nodes only there; pyramids between them would join it all over"
        )


def _edges_of(patch: Patch) -> tuple[Numbers, Numbers]:
    """Ends (e, edges, 2) and middle nodes (e, edges) of the edges of each cell; -1 without a node there."""
    cells, corners = patch.connectivity, 2
    ends: tuple[tuple[int, int], ...] = ((0, 1),)
    if _dimension(patch) > 1:
        corners = patch.family.corners
        around = tuple((k, (k + 1) % corners) for k in range(corners))
        ends = EDGES[corners] if patch.family.dimension == 3 else around
    middles = cells[:, corners : corners + len(ends)]
    if middles.shape[1] < len(ends):
        middles = np.full((len(cells), len(ends)), -1)
    return cells[:, np.array(ends)], middles


def _mixed_orders(
    patches: tuple[Patch, ...], edges: list[tuple[Numbers, Numbers]]
) -> tuple[Numbers, Numbers]:
    """Middle nodes (h,) that not all cells at their edge have, and the cells (h,) there."""
    ends = np.sort(np.concatenate([own.reshape(-1, 2) for own, _ in edges]), axis=1)
    middle = np.concatenate([own.ravel() for _, own in edges])
    if (middle < 0).all():
        return middle[:0], middle[:0]
    cell = np.concatenate(
        [np.repeat(patch.numbers, own.shape[1]) for patch, (_, own) in zip(patches, edges, strict=True)]
    )
    order = np.lexsort((middle, ends[:, 1], ends[:, 0]))
    same = (ends[order][1:] == ends[order][:-1]).all(axis=1)
    wrong = np.flatnonzero(same & (middle[order][1:] != middle[order][:-1]))
    return middle[order][wrong + 1], np.concatenate([cell[order][wrong], cell[order][wrong + 1]])


def _lying(
    nodes_m: Array, patches: tuple[Patch, ...], edges: list[tuple[Numbers, Numbers]]
) -> Iterator[tuple[Numbers, Numbers]]:
    """Nodes and the numbers of the cells that they lie on without belonging to them."""
    loose, meshed = _candidates(len(nodes_m), patches, edges)
    solids = [patch for patch in patches if _dimension(patch) == 3]
    seen = dict(zip(map(id, solids), faces_seen(len(nodes_m), solids), strict=True))
    for patch in patches:
        corners = patch.connectivity
        if _dimension(patch) == 1:
            yield from _near(nodes_m, meshed, patch, np.arange(len(corners)), corners[:, [0, 1, 1]])
        elif _dimension(patch) == 2:
            for half in ((0, 1, 2), (0, 2, 3))[: patch.family.corners - 2]:
                yield from _near(nodes_m, loose, patch, np.arange(len(corners)), corners[:, half])
        else:
            for face, alone in zip(FACES[patch.family.corners], seen[id(patch)].T, strict=True):
                own = np.flatnonzero(alone)
                for a, b, c in ((0, 1, 2), (0, 2, 3))[: len(face) - 2]:
                    triangle = [face[a], face[b], face[c]]
                    yield from _near(nodes_m, loose, patch, own, corners[own][:, triangle])


def _dimension(patch: Patch) -> int:
    return 1 if patch.kind.startswith("line") else patch.family.dimension


def _candidates(
    count: int, patches: tuple[Patch, ...], edges: list[tuple[Numbers, Numbers]]
) -> tuple[Numbers, Numbers]:
    """Nodes on the surface of solids, on rims of shells and on lines; and all nodes of shells and solids.

    Lines may cross each other without being joined, as braces do.
    """
    loose, meshed = np.zeros((2, count), dtype=bool)
    rims = []
    solids = [(patch, own) for patch, own in zip(patches, edges, strict=True) if _dimension(patch) == 3]
    for patch, (ends, middles) in zip(patches, edges, strict=True):
        (loose if _dimension(patch) == 1 else meshed)[patch.connectivity] = True
        if _dimension(patch) == 2:
            rims.append(np.column_stack([np.sort(ends.reshape(-1, 2), axis=1), middles.ravel()]))
    for (patch, (_, middles)), seen in zip(
        solids, faces_seen(count, [patch for patch, _ in solids]), strict=True
    ):
        corners = patch.family.corners
        for face, alone in zip(FACES[corners], seen.T, strict=True):
            loose[patch.connectivity[alone][:, face]] = True
            for edge, middle in zip(EDGES[corners], middles.T, strict=True):
                if set(edge) <= set(face):
                    loose[middle[alone & (middle >= 0)]] = True
    if rims:
        lines, times = np.unique(np.concatenate(rims), axis=0, return_counts=True)
        on_rim = lines[times == 1].ravel()
        loose[on_rim[on_rim >= 0]] = True
    return np.flatnonzero(loose), np.flatnonzero(meshed)


def _near(
    nodes_m: Array, candidates: Numbers, patch: Patch, cells: Numbers, triangles: Numbers
) -> Iterator[tuple[Numbers, Numbers]]:
    """Candidates that lie on triangles (t, 3) of the cells (t,) of a patch and are none of their nodes.

    A line is a triangle whose last two corners are the same.
    """
    from scipy.spatial import cKDTree

    if not len(candidates) or not len(triangles):
        return
    places = nodes_m[triangles]
    centre = places.mean(axis=1)
    reach = np.linalg.norm(places - centre[:, None], axis=2).max(axis=1) * (1 + _NEAR)
    around = cKDTree(nodes_m[candidates]).query_ball_point(centre, reach)
    times = np.fromiter(map(len, around), dtype=np.intp, count=len(around))
    which = np.repeat(np.arange(len(triangles)), times)
    node = candidates[np.fromiter((k for found in around for k in found), dtype=np.intp, count=times.sum())]
    foreign = (patch.connectivity[cells[which]] != node[:, None]).all(axis=1)
    which, node = which[foreign], node[foreign]
    start = places[which, 0]
    first, second, away = places[which, 1] - start, places[which, 2] - start, nodes_m[node] - start
    # shares of the two sides in the way to the node by least squares, that of the third is the rest
    a, b, c = (np.einsum("ti,ti->t", x, y) for x, y in ((first, first), (first, second), (second, second)))
    p, q = np.einsum("ti,ti->t", first, away), np.einsum("ti,ti->t", second, away)
    determinant = a * c - b * b
    flat = determinant <= 1e-12 * a * c
    scale = np.where(flat, 1.0, determinant)
    u, v = np.where(flat, p / a, (p * c - q * b) / scale), np.where(flat, 0.0, (q * a - p * b) / scale)
    off = np.linalg.norm(away - u[:, None] * first - v[:, None] * second, axis=1)
    on = (off <= _NEAR * reach[which]) & (np.minimum(np.minimum(u, v), 1 - u - v) >= -_NEAR)
    if on.any():
        yield node[on], patch.numbers[cells[which[on]]]
