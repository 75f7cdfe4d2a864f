"""Shell meshes with every cell divided in four: the second level that tells a mesh's discretisation error.

The frequencies of these shells err by h^2 (see their tests), so that those of the halved mesh are off by a
third of the difference between the two levels (L. F. Richardson, Phil. Trans. R. Soc. A 210 (1911) 307-357).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from vib.errors import ModelError
from vib.structure.cells.family import Array, Family, Numbers
from vib.structure.sparsity import Group

# edges and, for a quad, its centre, as the old nodes that a new node lies between
_EDGES = {"triangle": ((0, 1), (1, 2), (2, 0)), "quad": ((0, 1), (1, 2), (2, 3), (3, 0))}
# the four parts, numbered through the old nodes, the edges' nodes and the centre
_PARTS = {
    "triangle": ((0, 3, 5), (3, 1, 4), (5, 4, 2), (3, 4, 5)),
    "quad": ((0, 4, 8, 7), (4, 1, 5, 8), (8, 5, 2, 6), (7, 8, 6, 3)),
}


@dataclass(frozen=True, eq=False)
class Halved:
    """A mesh with its cells divided in four.

    ``nodes_m`` (n + new, 3): the old nodes first. ``parents`` (new, 4): the old nodes that each new one lies
    amid, two of them twice on an edge; what holds for all its parents may be taken to hold for it.
    """

    nodes_m: Array
    groups: tuple[Group, ...]
    parents: Numbers


def halved(nodes_m: Array, groups: Sequence[Group]) -> Halved:
    """Every triangle and quad divided in four; new nodes lie in the middle of the straight edges.

    Raises
    ------
    ModelError
        Cells other than triangles and quads.
    """
    for group in groups:
        if group.family.kind not in _PARTS:
            raise ModelError(f"{group.family.kind} cells can't be divided in four, only triangles and quads.")
    between = [_between(group.family, group.connectivity) for group in groups]
    parents, place = np.unique(
        np.vstack([part.reshape(-1, 4) for part in between]), axis=0, return_inverse=True
    )
    numbers = np.split(len(nodes_m) + place.ravel(), np.cumsum([part[..., 0].size for part in between])[:-1])
    found = []
    for group, new in zip(groups, numbers, strict=True):
        count = len(group.connectivity)
        nodes = np.hstack([group.connectivity, new.reshape(count, -1)])
        parts = np.vstack([nodes[:, part] for part in _PARTS[group.family.kind]])
        found.append(Group(group.family, parts, group.properties.of(np.tile(np.arange(count), 4))))
    return Halved(np.vstack([nodes_m, nodes_m[parents].mean(axis=1)]), tuple(found), parents)


def remaining_error(coarse: Array, fine: Array) -> Array:
    """Estimated error of the frequencies of the halved mesh; those of the coarse one err four times as much.

    ``coarse`` and ``fine`` (m,) are the frequencies of the same modes on both, in any unit.
    """
    return (coarse - fine) / 3


def _between(family: Family, connectivity: Numbers) -> Numbers:
    """The old nodes around each new one, in order of number, (e, new, 4); an edge's two stand twice."""
    edges = np.array(_EDGES[family.kind])
    ends = np.sort(connectivity[:, edges], axis=2)
    found = np.concatenate([ends, ends], axis=2)
    if family.kind == "quad":
        found = np.concatenate([found, np.sort(connectivity, axis=1)[:, None]], axis=1)
    return np.sort(found, axis=2)
