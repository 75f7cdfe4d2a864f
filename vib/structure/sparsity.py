"""Assembly: many cells of any family into one sparse stiffness and one sparse mass with shared indices.

The pattern is built once, by blocks of three by three freedoms. Cells are then computed in chunks that fit
the cache; the blocks of a chunk are sorted by place, and the sums of equal places are added to the blocks of
the whole matrix. Beside the matrices only one chunk is held in memory.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import bsr_array, csr_array

from vib.errors import ModelError
from vib.progress import tell
from vib.structure.cells.family import Array, Family, Numbers, Properties

Matrix = Any  # scipy.sparse csr_array; scipy has no types
Ints = NDArray[np.integer[Any]]

# doubles in the element matrices of one chunk: about 8 MB, within the shared cache of usual machines
_CHUNK_VALUES = 1_000_000
# blocks mirrored at a time
_BLOCKS = 100_000


@dataclass(frozen=True, eq=False)
class Group:
    """Cells of one family and one material.

    ``connectivity`` (e, k): node numbers from 0, in the family's order.
    """

    family: Family
    connectivity: Numbers
    properties: Properties


@dataclass(frozen=True, eq=False)
class Pattern:
    """Which freedoms there are and which blocks of three by three couple them.

    A triple is the three translations of a node, or its three rotations where shells meet it. Triples keep
    the order of the nodes, so that a node's freedoms are x, y, z, rx, ry, rz in a row.
    ``first`` (nodes + 1,): the first triple of each node; a node without cells has none.
    ``blocks``: sparse, triples x triples, its data the number of each block.
    """

    first: Numbers
    blocks: Matrix

    @property
    def size(self) -> int:
        """How many freedoms."""
        return 3 * int(self.first[-1])

    def triples(self, group: Group, cells: slice = slice(None)) -> Numbers:
        """Triple numbers (e, k x triples per node) of some cells of a group."""
        wide = self.first[group.connectivity[cells]][:, :, None] + np.arange(group.family.freedoms // 3)
        return np.asarray(wide.reshape(len(wide), -1), dtype=np.intp)

    def freedoms(self, group: Group, cells: slice = slice(None)) -> Numbers:
        """Freedom numbers (e, k x freedoms per node) of some cells of a group."""
        wide = 3 * self.triples(group, cells)[:, :, None] + np.arange(3)
        return np.asarray(wide.reshape(len(wide), -1), dtype=np.intp)


@dataclass(frozen=True, eq=False)
class Assembly:
    """Stiffness (N/m) and consistent mass (kg), csr_arrays that share their index arrays."""

    stiffness: Matrix
    mass: Matrix
    pattern: Pattern


def assemble(nodes_m: Array, groups: Sequence[Group]) -> Assembly:
    """Stiffness and mass of all cells.

    Parameters
    ----------
    nodes_m
        Node coordinates (n, 3), m.
    groups
        The cells; check them with `vib.structure.cells.check_cells` before.

    Raises
    ------
    ModelError
        A node number out of range, or a cell that names a node twice.
    """
    pattern = find_pattern(len(nodes_m), groups)
    blocks = len(pattern.blocks.indices)
    stiffness = np.zeros((blocks, 9))
    scalar = all(group.family.scalar_mass for group in groups)
    mass = np.zeros((blocks, 1 if scalar else 9))
    total, done = sum(len(group.connectivity) for group in groups), 0
    for group in groups:
        step = max(1, _CHUNK_VALUES // (group.family.nodes * group.family.freedoms) ** 2)
        for start in range(0, len(group.connectivity), step):
            chunk = slice(start, start + step)
            _add_chunk(pattern, group, chunk, nodes_m, stiffness, mass)
            done += len(group.connectivity[chunk])
            tell("assembling", done / total)
    turn = _transposition(pattern.blocks)
    first = _finished(pattern, stiffness, turn)
    del stiffness
    second = _finished(pattern, mass, turn)
    shared = csr_array((second.data, first.indices, first.indptr), shape=first.shape)
    return Assembly(stiffness=first, mass=shared, pattern=pattern)


def _add_chunk(
    pattern: Pattern, group: Group, chunk: slice, nodes_m: Array, stiffness: Array, mass: Array
) -> None:
    family, triples = group.family, pattern.triples(group, chunk)
    coordinates, properties = nodes_m[group.connectivity[chunk]], group.properties.of(chunk)
    first, second = family.pairs
    size = pattern.blocks.shape[0]
    place = (triples[:, first] * size + triples[:, second]).ravel()
    order = np.argsort(place)
    ordered = place[order]
    starts = np.flatnonzero(np.concatenate([[True], ordered[1:] != ordered[:-1]]))
    number = pattern.blocks[np.divmod(ordered[starts], size)]
    # a matrix of ones that sums the blocks of equal place; its product is one pass in C
    summing = csr_array(
        (np.ones(len(place)), order, np.append(starts, len(place))), shape=(len(starts), len(place))
    )
    stiffness[number] += summing @ family.stiffness_blocks(coordinates, properties).reshape(-1, 9)
    blocks = family.mass_blocks(coordinates, properties)
    if family.scalar_mass and mass.shape[1] == 9:
        mass[number, ::4] += summing @ np.repeat(blocks.reshape(-1, 1), 3, axis=1)
    else:
        mass[number] += summing @ blocks.reshape(-1, mass.shape[1])


def _transposition(blocks: Matrix) -> Ints:
    """For each block of a symmetric pattern, the number of its mirror image."""
    turned: Ints = blocks.T.tocsr().data
    return turned


def _finished(pattern: Pattern, sums: Array, turn: Ints) -> Matrix:
    """The whole symmetric CSR matrix from sums that hold each pair of triples in one order or the other."""
    transposed = np.arange(9).reshape(3, 3).T.ravel() if sums.shape[1] == 9 else np.array([0])
    number = np.arange(len(turn))
    diagonal = number[number == turn]
    sums[diagonal] = (sums[diagonal] + sums[diagonal][:, transposed]) / 2
    upper = number[number < turn]  # blocks are numbered row by row
    for start in range(0, len(upper), _BLOCKS):
        above = upper[start : start + _BLOCKS]
        below = turn[above]
        both = sums[above] + sums[below][:, transposed]
        sums[above] = both
        sums[below] = both[:, transposed]
    if sums.shape[1] == 1:
        values = np.zeros((len(turn), 9))
        values[:, ::4] = sums
        sums = values
    blocks = pattern.blocks
    whole = bsr_array((sums.reshape(-1, 3, 3), blocks.indices, blocks.indptr), shape=(pattern.size,) * 2)
    return whole.tocsr()


def find_pattern(node_count: int, groups: Sequence[Group]) -> Pattern:
    """The pattern of stiffness and mass of all groups together.

    Raises
    ------
    ModelError
        A node number out of range, or a cell that names a node twice.
    """
    triples = np.zeros(node_count, dtype=np.intp)
    for group in groups:
        _check_nodes(group, node_count)
        used = np.unique(group.connectivity)
        triples[used] = np.maximum(triples[used], group.family.freedoms // 3)
    first = np.concatenate([[0], np.cumsum(triples)])
    size = int(first[-1])
    pattern = Pattern(first=first, blocks=csr_array((size, size), dtype=bool))
    together = pattern.blocks
    for group in groups:
        columns = pattern.triples(group)
        starts = np.arange(0, columns.size + 1, columns.shape[1])
        incidence = csr_array(
            (np.ones(columns.size, dtype=bool), columns.ravel(), starts), shape=(len(columns), size)
        )
        together = together + incidence.T.tocsr() @ incidence
    together.sort_indices()
    numbers = np.arange(len(together.indices))
    numbered = csr_array((numbers, together.indices, together.indptr), shape=together.shape)
    return Pattern(first=first, blocks=numbered)


def _check_nodes(group: Group, node_count: int) -> None:
    ordered = np.sort(group.connectivity, axis=1)
    for wrong, what in (
        ((ordered[:, 0] < 0) | (ordered[:, -1] >= node_count), "names a node that does not exist"),
        ((ordered[:, 1:] == ordered[:, :-1]).any(axis=1), "names a node twice"),
    ):
        if wrong.any():
            number = int(np.flatnonzero(wrong)[0]) + 1
            raise ModelError(f"{group.family.kind} cell {number} {what}; mend the mesh there.")
