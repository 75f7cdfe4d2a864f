"""What is wrong with a mesh: mended where that is safe, otherwise named by cell and node numbers.

Numbers in messages count from 1 in the order of the file.
"""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
import scipy.sparse as sparse
from numpy.typing import NDArray
from scipy.sparse.csgraph import connected_components

from vib.errors import ModelError
from vib.structure.mesh.assign import Patch
from vib.structure.mesh.reading import listed
from vib.structure.nearby import pairs_at_one_place
from vib.system import Array

Numbers = NDArray[np.intp]
_CHUNK = 2000
SAME = 1e-4  # of the smallest cell: nodes nearer than this are at one place


def is_line(patch: Patch) -> bool:
    """Whether the cells are lines."""
    return patch.kind.startswith("line")


def clean_cells(
    nodes_m: Array, patches: tuple[Patch, ...], offsets: dict[str, float]
) -> tuple[tuple[Patch, ...], tuple[str, ...]]:
    """The patches with every cell the right way round, and remarks on what was turned.

    Parameters
    ----------
    nodes_m
        (k, 3), m.
    patches
        As in the file.
    offsets
        Of the shells of each region, m.

    Raises
    ------
    ModelError
        Cells without volume or area, folded cells, or shells with an offset whose normals are mixed.
    """
    mended, remarks, faults = [], [], []
    for patch in patches:
        if is_line(patch):
            mended.append(patch)
            continue
        flat, folded = _judged(patch, nodes_m)
        connectivity = patch.connectivity
        if patch.family.dimension == 3 and folded.any():
            turned = Patch(
                patch.region,
                patch.kind,
                connectivity[folded][:, patch.family.mirrored],
                patch.numbers[folded],
            )
            still = np.logical_or(*_judged(turned, nodes_m))
            right = np.flatnonzero(folded)[~still]
            connectivity = connectivity.copy()
            connectivity[right] = turned.connectivity[~still]
            folded[right] = False
            if len(right):
                told = listed("cell", patch.numbers[right], 4)
                remarks.append(f"mesh: {told} ({patch.kind}) were inside out and have been turned round")
        for wrong, what in ((flat, "without volume or area (flat)"), (folded, "folded into themselves")):
            if wrong.any():
                faults.append(f"mesh: {listed('cell', patch.numbers[wrong])} ({patch.kind}) {what}")
        mended.append(Patch(patch.region, patch.kind, connectivity, patch.numbers))
    if faults:
        raise ModelError("\n".join(faults))
    return _alike(tuple(mended), offsets, remarks)


def _judged(patch: Patch, nodes_m: Array) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
    count = len(patch.connectivity)
    flat, folded = np.zeros(count, dtype=bool), np.zeros(count, dtype=bool)
    with np.errstate(all="ignore"):
        for start in range(0, count, _CHUNK):
            chunk = slice(start, start + _CHUNK)
            flat[chunk], folded[chunk] = patch.family.faults(nodes_m[patch.connectivity[chunk]])
    return flat, folded


def _alike(
    patches: tuple[Patch, ...], offsets: dict[str, float], remarks: list[str]
) -> tuple[tuple[Patch, ...], tuple[str, ...]]:
    """Shells of each region with their normals on one side."""
    shells: dict[str, list[int]] = {}
    for i, patch in enumerate(patches):
        if not is_line(patch) and patch.family.dimension == 2:
            shells.setdefault(patch.region, []).append(i)
    found = list(patches)
    for region, mine in shells.items():
        turn, twisted = _other_side([patches[i] for i in mine])
        numbers = np.concatenate([patches[i].numbers for i in mine])
        if not (turn.any() or twisted.any()):
            continue
        wrong = turn | twisted
        if offsets.get(region):
            raise ModelError(
                f"mesh: the normals of the shells of region {region} point to both sides (for instance "
                f"{listed('cell', numbers[wrong], 4)}), so that its offset has no meaning; give all its "
                "cells the same sense of rotation"
            )
        if twisted.any():
            remarks.append(f"mesh: the surface of region {region} has only one side (a twisted band)")
        start = 0
        for i in mine:
            patch = patches[i]
            own = turn[start : start + len(patch.numbers)]
            start += len(patch.numbers)
            connectivity = np.where(
                own[:, None], patch.connectivity[:, patch.family.mirrored], patch.connectivity
            )
            found[i] = Patch(patch.region, patch.kind, connectivity, patch.numbers)
        if turn.any():
            remarks.append(
                f"mesh: shells of region {region} had their normals on both sides; "
                f"{listed('cell', numbers[turn], 4)} have been turned round"
            )
    return tuple(found), tuple(remarks)


def _other_side(patches: list[Patch]) -> tuple[NDArray[np.bool_], NDArray[np.bool_]]:
    """Which shells to turn so that neighbours agree, and which lie on a surface with one side only.

    Two copies of each cell, one per side; neighbours join the copies that agree. A surface whose two sides
    hang together has only one. Of the two sides the one that fewer cells have to be turned to is taken.
    """
    edges, cells, ways = [], [], []
    start = 0
    for patch in patches:
        corners = patch.connectivity[:, : patch.family.corners]
        ahead = np.roll(corners, -1, axis=1)
        edges.append(np.sort(np.stack([corners, ahead], axis=2).reshape(-1, 2), axis=1))
        ways.append((corners < ahead).ravel())
        cells.append(np.repeat(start + np.arange(len(corners)), patch.family.corners))
        start += len(corners)
    edge, cell, way = np.concatenate(edges), np.concatenate(cells), np.concatenate(ways)
    order = np.lexsort((edge[:, 1], edge[:, 0]))
    edge, cell, way = edge[order], cell[order], way[order]
    same = (edge[1:] == edge[:-1]).all(axis=1)
    alone = np.concatenate([[True], ~same, [True]])
    first = np.flatnonzero(same & alone[:-2] & alone[2:])  # edges of exactly two cells
    a, b = cell[first], cell[first + 1]
    against = (way[first] == way[first + 1]).astype(np.intp)  # neighbours run along an edge in opposite ways
    rows = np.concatenate([2 * a, 2 * a + 1])
    columns = np.concatenate([2 * b + against, 2 * b + 1 - against])
    graph = sparse.coo_array((np.ones(len(rows), dtype=bool), (rows, columns)), shape=(2 * start, 2 * start))
    label = connected_components(graph, directed=False)[1].reshape(-1, 2)
    twisted = label[:, 0] == label[:, 1]
    # the two sides of a surface are two labels; the lower one is its name, and its column the side of a cell
    surface, side = label.min(axis=1), label.argmin(axis=1)
    on_second = np.bincount(surface, weights=side, minlength=label.max() + 1)
    total = np.bincount(surface, minlength=label.max() + 1)
    turn = np.where(2 * on_second[surface] > total[surface], side == 0, side == 1)
    return turn & ~twisted, twisted


def check_nodes(nodes_m: Array, patches: Iterable[Patch], file_nodes: Numbers) -> tuple[str, ...]:
    """Remarks on nodes that no cell of the file has; nodes at one place stop.

    Parameters
    ----------
    file_nodes
        Numbers from 0 of the nodes that any cell of the file has.

    Raises
    ------
    ModelError
        Nodes of different cells at the same place.
    """
    patches = list(patches)
    used = np.zeros(len(nodes_m), dtype=bool)
    for patch in patches:
        used[patch.connectivity] = True
    smallest = min(
        float(np.ptp(nodes_m[patch.connectivity[start : start + _CHUNK]], axis=1).max(axis=1).min())
        for patch in patches
        for start in range(0, len(patch.connectivity), _CHUNK)
    )
    numbers = np.flatnonzero(used)
    pairs = []
    for a, b in pairs_at_one_place(nodes_m[numbers], SAME * smallest):
        pairs.append((int(numbers[a]) + 1, int(numbers[b]) + 1))
        if len(pairs) > 1000:
            break
    if pairs:
        shown = ", ".join(f"{a} and {b}" for a, b in sorted(pairs)[:4])
        count = "more than 1000" if len(pairs) > 1000 else str(len(pairs))
        raise ModelError(
            f"mesh: {count} pairs of nodes are at the same place but not joined: {shown}"
            f"{', ...' if len(pairs) > 4 else ''}; merge them in the mesh, or give [mesh] join_within, the "
            "distance within which nodes become one"
        )
    orphans = np.setdiff1d(np.arange(len(nodes_m)), file_nodes, assume_unique=True)
    if len(orphans):
        return (f"mesh: {listed('node', orphans + 1, 4)} of the file belong to no cell and were left out",)
    return ()


def joined_nodes(nodes_m: Array, distance_m: float) -> tuple[Numbers, tuple[str, ...]]:
    """(k,) the node that each node becomes when those within a distance are joined, and a remark."""
    found = list(pairs_at_one_place(nodes_m, distance_m))
    if not found:
        return np.arange(len(nodes_m)), (
            f"mesh: no nodes are within {1000 * distance_m:.4g} mm of one another",
        )
    a, b = np.array(found, dtype=np.intp).T
    graph = sparse.coo_array((np.ones(len(a), dtype=bool), (a, b)), shape=(len(nodes_m),) * 2)
    label = connected_components(graph, directed=False)[1]
    first = np.full(label.max() + 1, len(nodes_m), dtype=np.intp)
    np.minimum.at(first, label, np.arange(len(nodes_m)))
    became: Numbers = first[label]
    gone = int((became != np.arange(len(nodes_m))).sum())
    return became, (f"mesh: {gone} nodes within {1000 * distance_m:.4g} mm of others were joined to them",)


def mesh_parts(count: int, patches: Iterable[Patch]) -> Numbers:
    """(k,) the number of the part that each node hangs together with; nodes without cells have their own."""
    rows, columns = [], []
    for patch in patches:
        rows.append(np.repeat(patch.connectivity[:, 0], patch.connectivity.shape[1] - 1))
        columns.append(patch.connectivity[:, 1:].ravel())
    a, b = np.concatenate(rows), np.concatenate(columns)
    graph = sparse.coo_array((np.ones(len(a), dtype=bool), (a, b)), shape=(count, count))
    found: Numbers = connected_components(graph, directed=False)[1].astype(np.intp)
    return found
