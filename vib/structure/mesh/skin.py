"""The faces of cells that are seen from outside: those that belong to one solid only, and all shells."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from vib.structure.cells.edges import FACES
from vib.structure.mesh.assign import Patch
from vib.structure.sparsity import Group
from vib.system import Array

Numbers = NDArray[np.intp]


def outer_faces(
    nodes_m: Array, groups: tuple[Group, ...], parts: tuple[str, ...]
) -> list[tuple[str, Numbers]]:
    """Part and corners (f, 3 or 4) of the faces seen from outside; those of solids turned outwards."""
    found = []
    solids = [(group, part) for group, part in zip(groups, parts, strict=True) if group.family.dimension == 3]
    for group, part in zip(groups, parts, strict=True):
        if group.family.dimension == 2:
            found.append((part, group.connectivity[:, : group.family.corners]))
    for (group, part), alone in zip(
        solids, faces_seen(len(nodes_m), [group for group, _ in solids]), strict=True
    ):
        for column, face in enumerate(FACES[group.family.corners]):
            mine = group.connectivity[alone[:, column]]
            if len(mine):
                found.append((part, _outwards(nodes_m, mine[:, face], mine)))
    return found


def faces_seen(count: int, solids: Sequence[Group | Patch]) -> list[NDArray[np.bool_]]:
    """For each group of solids (e, faces): the face belongs to no other cell; of ``count`` nodes in all."""
    keys = [
        # three corners tell a face from all others, also of four
        np.sort(group.connectivity[:, face], axis=1)[:, :3]
        for group in solids
        for face in FACES[group.family.corners]
    ]
    if not keys:
        return []
    alone = np.split(_once(np.concatenate(keys), count), np.cumsum([len(key) for key in keys])[:-1])
    found, start = [], 0
    for group in solids:
        faces = len(FACES[group.family.corners])
        found.append(np.stack(alone[start : start + faces], axis=1))
        start += faces
    return found


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
