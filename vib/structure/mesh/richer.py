"""The functions that the solids of a mesh lack, numbered so that neighbours share them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from vib.errors import AccuracyError
from vib.structure.cells.edges import EDGES, FACES
from vib.structure.cells.solid import Solid
from vib.structure.cells.surplus import Kind, Surplus, surplus_of
from vib.structure.mesh.skin import faces_seen
from vib.structure.sparsity import Group
from vib.system import Array

Numbers = NDArray[np.intp]
Flags = NDArray[np.bool_]
_KINDS: tuple[Kind, ...] = ("edge", "odd edge", "triangle", "quadrangle", "first", "second")
_MOST_CORNERS = 2**20  # three corner numbers and a kind fit into one number


@dataclass(frozen=True, eq=False)
class RicherGroup:
    """A group of solids, the functions that it lacks, and for each cell their ``numbers`` and ``signs``.

    Both (e, s); a sign is -1 where the cell sees the function the other way round.
    """

    group: Group
    family: Solid
    surplus: Surplus
    numbers: Numbers
    signs: Array


@dataclass(frozen=True, eq=False)
class Richer:
    """All functions that a mesh lacks, ``count`` of them; ``held`` (count, 3): what supports hold."""

    groups: tuple[RicherGroup, ...]
    count: int
    held: Flags


def richer(groups: Sequence[Group], held: Flags) -> Richer:
    """Number the functions that the solids of a mesh lack.

    Parameters
    ----------
    groups
        Solids only.
    held
        (k, 3): translations of the nodes that can't move by themselves.

    Raises
    ------
    AccuracyError
        A mesh of more than a million corners.
    """
    corners = np.unique(
        np.concatenate([group.connectivity[:, : group.family.corners].ravel() for group in groups])
    )
    if len(corners) > _MOST_CORNERS:
        raise AccuracyError(f"The error of more than {_MOST_CORNERS} corners of cells can't be estimated.")
    place = np.zeros(len(held), dtype=np.intp)
    place[corners] = np.arange(len(corners))
    found, keys = [], []
    for group in groups:
        assert isinstance(group.family, Solid)
        surplus = surplus_of(group.family)
        own, signs = _keys(place[group.connectivity[:, : group.family.corners]], surplus)
        found.append((group, group.family, surplus, own.shape, signs))
        keys.append(own.ravel())
    distinct, numbers = np.unique(np.concatenate(keys), return_inverse=True)
    parts, start = [], 0
    for group, family, surplus, shape, signs in found:
        own = numbers[start : start + shape[0] * shape[1]].reshape(shape)
        start += own.size
        parts.append(RicherGroup(group, family, surplus, own, signs))
    flags = _held(len(distinct), parts, held)
    return Richer(tuple(parts), len(distinct), flags)


def _keys(cells: Numbers, surplus: Surplus) -> tuple[Numbers, Array]:
    """What tells the functions of cells (e, corners) from all others, and their signs; (e, s) each."""
    keys, signs = np.empty((2, len(cells), len(surplus.kinds)), dtype=np.intp)
    for column, (kind, corners) in enumerate(zip(surplus.kinds, surplus.corners, strict=True)):
        named = cells[:, corners]
        code, sign = np.full(len(cells), _KINDS.index(kind)), np.ones(len(cells))
        if kind == "odd edge":
            sign = np.where(named[:, 0] < named[:, 1], 1.0, -1.0)
        elif kind in ("first", "second"):
            code, sign = _directed(named, kind)
        ordered = np.sort(named, axis=1)
        key = ordered[:, 0] * _MOST_CORNERS + ordered[:, 1]
        # three corners tell a face from all others, also of four
        key = key * _MOST_CORNERS + ordered[:, 2] if len(corners) > 2 else key
        keys[:, column] = key * len(_KINDS) + code
        signs[:, column] = sign
    return keys, signs.astype(np.float64)


def _directed(named: Numbers, kind: Kind) -> tuple[Numbers, Array]:
    """Which of the two directed functions of a quadrangle this is for all its cells, and its sign.

    Seen from its corner of lowest number, the first runs to the lower of the two corners beside.
    """
    row, lowest = np.arange(len(named)), named.argmin(axis=1)
    along, up = np.array([1, 0, 3, 2])[lowest], np.array([3, 2, 1, 0])[lowest]
    swapped = named[row, up] < named[row, along]
    first = (kind == "first") != swapped
    forwards = np.isin(lowest, (0, 3)) if kind == "first" else np.isin(lowest, (0, 1))
    return (
        np.where(first, _KINDS.index("first"), _KINDS.index("second")),
        np.where(forwards, 1.0, -1.0),
    )


def _held(count: int, parts: Sequence[RicherGroup], held: Flags) -> Flags:
    """(count, 3): all nodes of the edge or face are held, and it lies on the surface.

    What runs through the body between two held faces can move.
    """
    flags, outside = np.ones((count, 3), dtype=bool), np.zeros(count, dtype=bool)
    seen = faces_seen(len(held), [part.group for part in parts])
    for part, alone in zip(parts, seen, strict=True):
        corners, cells = part.family.corners, part.group.connectivity
        middle = dict(zip(EDGES[corners], range(corners, part.family.nodes), strict=False))
        for column, own in enumerate(part.surplus.corners):
            nodes = [*own, *(node for edge, node in middle.items() if set(edge) <= set(own))]
            around = [k for k, face in enumerate(FACES[corners]) if set(own) <= set(face)]
            numbers = part.numbers[:, column]
            outside[numbers[alone[:, around].any(axis=1)]] = True
            for component in range(3):
                flags[numbers[~held[cells[:, nodes], component].all(axis=1)], component] = False
    return flags & outside[:, None]
