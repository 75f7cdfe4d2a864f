"""The faces of cells that are seen from outside: those that belong to one solid only, and all shells."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from vib.structure.sparsity import Group
from vib.system import Array

Numbers = NDArray[np.intp]

# corners of the faces by the number of corners of a solid; their sense is set by where the cell lies
_FACES: dict[int, tuple[tuple[int, ...], ...]] = {
    4: ((0, 1, 2), (0, 1, 3), (1, 2, 3), (0, 2, 3)),
    5: ((0, 1, 2, 3), (0, 1, 4), (1, 2, 4), (2, 3, 4), (3, 0, 4)),
    6: ((0, 1, 2), (3, 4, 5), (0, 1, 4, 3), (1, 2, 5, 4), (2, 0, 3, 5)),
    8: ((0, 1, 2, 3), (4, 5, 6, 7), (0, 1, 5, 4), (1, 2, 6, 5), (2, 3, 7, 6), (3, 0, 4, 7)),
}


def outer_faces(
    nodes_m: Array, groups: tuple[Group, ...], parts: tuple[str, ...]
) -> list[tuple[str, Numbers]]:
    """Part and corners (f, 3 or 4) of the faces seen from outside; those of solids turned outwards."""
    shells, faces, keys = [], [], []
    for group, part in zip(groups, parts, strict=True):
        corners = group.connectivity[:, : group.family.corners]
        if group.family.dimension == 2:
            shells.append((part, corners))
            continue
        for face in _FACES[group.family.corners]:
            chosen = corners[:, face]
            faces.append((part, chosen, group))
            # three corners tell a face from all others, also of four
            keys.append(np.sort(chosen, axis=1)[:, :3])
    if not faces:
        return shells
    alone = _once(np.concatenate(keys), len(nodes_m))
    start = 0
    for part, chosen, group in faces:
        mine = alone[start : start + len(chosen)]
        start += len(chosen)
        if mine.any():
            shells.append((part, _outwards(nodes_m, chosen[mine], group.connectivity[mine])))
    return shells


def _once(keys: Numbers, count: int) -> NDArray[np.bool_]:
    """Which rows of three node numbers are there only once."""
    if count < 2**21:  # the three fit into one number, which sorts far quicker
        key = (keys[:, 0] * count + keys[:, 1]) * count + keys[:, 2]
        order = np.argsort(key, kind="stable")
        same = key[order][1:] == key[order][:-1]
    else:
        order = np.lexsort(keys.T[::-1])
        same = (keys[order][1:] == keys[order][:-1]).all(axis=1)
    alone = np.ones(len(keys), dtype=bool)
    alone[order[1:][same]] = False
    alone[order[:-1][same]] = False
    return alone


def _outwards(nodes_m: Array, faces: Numbers, cells: Numbers) -> Numbers:
    places = nodes_m[faces]
    normal = np.cross(places[:, 1] - places[:, 0], places[:, 2] - places[:, 0])
    inwards = np.einsum("fi,fi->f", normal, places.mean(axis=1) - nodes_m[cells].mean(axis=1)) < 0
    return np.where(inwards[:, None], faces[:, ::-1], faces)
