"""The same mesh with better cells, to tell by comparison how far frequencies are off.

Shells are divided in four. New nodes lie on the smooth surface through the old ones, as far as its cells meet
at small angles: the cubic that leaves the ends of an edge square to the normals there (A. Vlachos, J. Peters,
C. Boyd, J. L. Mitchell, Proc. Symposium on Interactive 3D Graphics (2001) 159-166). What a curved surface
loses by its flat cells is seen with the rest.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from vib.structure.cells import FAMILIES
from vib.structure.mesh.facing import corner_normals
from vib.structure.mesh.model import MeshModel
from vib.structure.sparsity import Group
from vib.system import Array

Numbers = NDArray[np.intp]

# the first-order cells between the nodes of a second-order one, which is computed as those
_PIECES: dict[str, tuple[tuple[int, ...], ...]] = {
    "triangle": ((0, 1, 2),),
    "quad": ((0, 1, 2, 3),),
    "triangle6": ((0, 3, 5), (3, 1, 4), (5, 4, 2), (3, 4, 5)),
    "quad9": ((0, 4, 8, 7), (4, 1, 5, 8), (8, 5, 2, 6), (7, 8, 6, 3)),
}
_PIECES["quad8"] = _PIECES["quad9"]
# of the eight nodes of a quad, in its middle
_MIDDLE = np.array([-0.25] * 4 + [0.5] * 4)


def divided(model: MeshModel) -> MeshModel:
    """Every shell of a mesh of shells divided in four."""
    nodes = [model.nodes_m]
    count = len(model.nodes_m)
    firsts: list[Group] = []
    for group in model.groups:
        cells = group.connectivity
        if group.family.kind == "quad8":
            nodes.append(np.tensordot(model.nodes_m[cells], _MIDDLE, axes=(1, 0)))
            cells = np.column_stack([cells, count + np.arange(len(cells))])
            count += len(cells)
        pieces = [cells[:, piece] for piece in _PIECES[group.family.kind]]
        kind = "triangle" if pieces[0].shape[1] == 3 else "quad"
        firsts.append(Group(FAMILIES[kind], np.concatenate(pieces), group.properties))
    edges, number, sides = _edges(firsts)
    middles = count + np.arange(len(edges))
    places = np.concatenate(nodes)
    halfway = places[edges].mean(axis=1) + _bulges(places, firsts, len(edges), number)
    nodes.append(halfway)
    count += len(edges)
    groups = []
    for group, side in zip(firsts, sides, strict=True):
        middle = middles[number[side]]
        cells = group.connectivity
        if cells.shape[1] == 3:
            parts = _four_triangles(cells, middle)
        else:
            # in the middle of the surface between its four curved edges (S. A. Coons, 1967)
            around = halfway[number[side]].reshape(-1, 4, 3).sum(axis=1)
            nodes.append(around / 2 - places[cells].sum(axis=1) / 4)
            parts = _four_quads(cells, middle, count + np.arange(len(cells)))
            count += len(cells)
        groups.append(replace(group, connectivity=np.concatenate(parts)))
    return replace(
        model,
        nodes_m=np.concatenate(nodes),
        groups=tuple(groups),
        numbers=tuple(np.arange(len(group.connectivity)) for group in groups),
        held=tuple(
            (name, np.concatenate([held, _also(held, firsts, edges, number, sides, middles)]), components)
            for name, held, components in model.held
        ),
    )


def _bulges(places: Array, groups: list[Group], count: int, number: Numbers) -> Array:
    """How far the middle of each edge (s, 3) lies off the straight line, m.

    Where smooth surfaces meet at an angle, the one that sees the edge more curved is right.
    """
    seen = []
    for group, normal in zip(groups, corner_normals(places, groups), strict=True):
        start = places[group.connectivity]
        step, after = np.roll(start, -1, axis=1) - start, np.roll(normal, -1, axis=1)
        rise, fall = (np.einsum("eki,eki->ek", step, at)[..., None] * at for at in (normal, after))
        seen.append((fall - rise).reshape(-1, 3) / 8)
    bulges = np.concatenate(seen)
    order = np.argsort(np.linalg.norm(bulges, axis=1), kind="stable")
    found = np.zeros((count, 3))
    found[number[order]] = bulges[order]  # the last, largest one stays
    return found


def _edges(groups: list[Group]) -> tuple[Numbers, Numbers, list[slice]]:
    """Edges (s, 2), the edge of each side of each cell, and where in that list each group is.

    ``number`` is (cells, sides) for one group at a time, flattened one after the other.
    """
    found, sides, start = [], [], 0
    for group in groups:
        cells = group.connectivity
        ahead = np.roll(cells, -1, axis=1)
        found.append(np.sort(np.stack([cells, ahead], axis=2).reshape(-1, 2), axis=1))
        sides.append(slice(start, start + cells.size))
        start += cells.size
    edges, number = np.unique(np.concatenate(found), axis=0, return_inverse=True)
    return edges, number.ravel(), sides


def _four_triangles(cells: Numbers, middle: Numbers) -> list[Numbers]:
    m = middle.reshape(-1, 3)
    return [
        np.column_stack([cells[:, 0], m[:, 0], m[:, 2]]),
        np.column_stack([m[:, 0], cells[:, 1], m[:, 1]]),
        np.column_stack([m[:, 2], m[:, 1], cells[:, 2]]),
        np.column_stack([m[:, 0], m[:, 1], m[:, 2]]),
    ]


def _four_quads(cells: Numbers, middle: Numbers, centre: Numbers) -> list[Numbers]:
    m = middle.reshape(-1, 4)
    return [np.column_stack([cells[:, k], m[:, k], centre, m[:, (k + 3) % 4]]) for k in range(4)]


def _also(
    held: Numbers, groups: list[Group], edges: Numbers, number: Numbers, sides: list[slice], middles: Numbers
) -> Numbers:
    """New nodes that belong to a set of old ones: midway on edges whose two ends do.

    An edge that cuts off a corner joins two nodes of the set as well, and does not run along it: it is told
    by a cell on just one side that has all its nodes in the set.
    """
    inside = np.zeros(
        int(max(held.max(initial=0), max(group.connectivity.max() for group in groups))) + 1, bool
    )
    inside[held] = True
    beside = np.bincount(number, minlength=len(edges))
    full = np.zeros(len(edges))
    for group, side in zip(groups, sides, strict=True):
        whole = inside[group.connectivity].all(axis=1)
        full += np.bincount(
            number[side], weights=np.repeat(whole, group.connectivity.shape[1]), minlength=len(edges)
        )
    along = inside[edges].all(axis=1) & ((beside == 1) | (full == 0) | (full == beside))
    found: Numbers = middles[along]
    return found


def only_shells(model: MeshModel) -> bool:
    """Whether every cell is a shell that can be divided."""
    return all(group.family.kind in _PIECES for group in model.groups)


def count_of(model: MeshModel) -> int:
    """Freedoms, about, of a mesh of shells that are divided in four."""
    return 24 * sum(len(group.connectivity) * len(_PIECES[group.family.kind]) for group in model.groups)
