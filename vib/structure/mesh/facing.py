"""Which shells around a node face about the same way, so that they are one smooth surface there."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import scipy.sparse as sparse
from numpy.typing import NDArray
from scipy.sparse.csgraph import connected_components

from vib.structure.sparsity import Group
from vib.system import Array

Numbers = NDArray[np.intp]
_SMOOTH = np.cos(0.6)  # cells that meet at a greater angle (rad) are not smoothed into one another


def smooth_corners(node: Numbers, cell: Numbers, normals: Array) -> Numbers:
    """A number for each corner (c,) of a cell, the same where cells of one node face about the same way.

    ``node`` and ``cell`` (c,) of each corner, ``normals`` (cells, 3).
    """
    order = np.argsort(node, kind="stable")
    node, cell = node[order], cell[order]
    rows, columns = [np.arange(len(node))], [np.arange(len(node))]
    for step in range(1, int(np.bincount(node).max())):
        near = node[step:] == node[:-step]
        alike = np.abs(np.einsum("ei,ei->e", normals[cell[step:]], normals[cell[:-step]])) > _SMOOTH
        first = np.flatnonzero(near & alike)
        rows.append(first)
        columns.append(first + step)
    listed = np.concatenate(rows), np.concatenate(columns)
    graph = sparse.coo_array((np.ones(len(listed[0]), dtype=bool), listed), shape=(len(node),) * 2)
    label = connected_components(graph, directed=False)[1]
    found = np.empty(len(node), dtype=np.intp)
    found[order] = label
    return found


def corner_normals(nodes_m: Array, groups: Sequence[Group]) -> list[Array]:
    """The normal of the smooth surface at each corner of each cell: (e, 3 or 4, 3) per group.

    Inside the surface the mean of the cells around the corner. At its rim such a mean is one-sided: there the
    normals are what makes the mean over each cell its own normal.
    """
    flat, node, cell, start = [], [], [], 0
    for group in groups:
        places = nodes_m[group.connectivity]
        # of a quad, across its diagonals; of a triangle, the third corner stands for the fourth
        flat.append(_unit(np.cross(places[:, 2] - places[:, 0], places[:, -1] - places[:, 1])))
        node.append(group.connectivity.ravel())
        cell.append(start + np.repeat(np.arange(len(places)), group.connectivity.shape[1]))
        start += len(places)
    each, owner = np.concatenate(flat), np.concatenate(cell)
    label = smooth_corners(np.concatenate(node), owner, each)
    _, first = np.unique(label, return_index=True)
    # normals of a surface may point to either side; at each corner those of its first cell are followed
    sense = np.where(np.einsum("ci,ci->c", each[owner], each[owner[first[label]]]) < 0, -1.0, 1.0)[:, None]
    normals = _unit(_summed(label, sense * each[owner]))
    ends = np.cumsum([group.connectivity.size for group in groups])[:-1]
    labels = [
        own.reshape(group.connectivity.shape)
        for own, group in zip(np.split(label, ends), groups, strict=True)
    ]
    rim = _rim(labels, len(normals))
    inside = ~rim[label]
    size, within = np.bincount(owner, minlength=start), np.bincount(owner, inside, minlength=start)
    missing = size[:, None] * each - _summed(owner, (inside[:, None] * sense) * normals[label], start)
    share = missing / np.maximum(size - within, 1)[:, None]
    told = _summed(label, (sense * share[owner]) * (within[owner] > 0)[:, None])
    known = rim & (np.linalg.norm(told, axis=1) > 0)
    normals[known] = _unit(told[known])
    return [normals[own] for own in labels]


def _rim(labels: Sequence[Numbers], count: int) -> NDArray[np.bool_]:
    """Which corners (count,) lie on an edge that only one cell of their smooth surface has."""
    pairs = np.concatenate(
        [np.sort(np.stack([own, np.roll(own, -1, axis=1)], axis=2), axis=2).reshape(-1, 2) for own in labels]
    )
    edges, times = np.unique(pairs, axis=0, return_counts=True)
    found = np.zeros(count, dtype=bool)
    found[edges[times == 1]] = True
    return found


def _summed(place: Numbers, vectors: Array, count: int = 0) -> Array:
    return np.stack([np.bincount(place, vectors[:, axis], count) for axis in range(3)], axis=1)


def _unit(vectors: Array) -> Array:
    return np.asarray(vectors / np.linalg.norm(vectors, axis=1, keepdims=True))
