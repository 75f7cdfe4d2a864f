"""A mesh and what is joined to it in one set of freedoms.

The freedoms of points, bodies and members come first, as `vib.structure.freedoms` numbers them; after them
those of the mesh nodes that nothing else moves or holds. A node that is a point of the study follows that
point. The matrices of the mesh are cut and merged by their index arrays, because products with a transform
would cost more than the assembly itself at a million freedoms.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import overload

import numpy as np
import scipy.sparse as sparse
from numpy.typing import NDArray

from vib.structure.mesh.model import MeshModel, held_flags
from vib.structure.rigid import arms
from vib.structure.sparsity import Pattern, assemble
from vib.study.quantities import COMPONENTS
from vib.system import Array, Freedom, Matrix

Numbers = NDArray[np.intp]


@dataclass(frozen=True, eq=False)
class Woven:
    """The cells of a mesh, assembled, and how their rows follow the freedoms.

    The rows of the mesh are those of ``pattern``. ``own`` (rows,): the row is a freedom of its own, from
    number ``first`` on. ``joined`` are the rows that follow points, by ``follow`` (joined, first).
    ``stiffness`` and ``mass`` (n, n) are the share of the cells in the matrices of the whole. ``pushed``
    (rows, 6) is mass times rigid motion; ``edge`` the rows that are no freedoms, ``edge_stiffness``
    (edge, rows) what pulls at them.
    """

    model: MeshModel
    pattern: Pattern
    first: int
    own: NDArray[np.bool_]
    joined: Numbers
    follow: Matrix
    stiffness: Matrix
    mass: Matrix
    pushed: Array
    edge: Numbers
    edge_stiffness: Matrix

    @property
    def size(self) -> int:
        """How many freedoms there are, those of the frame included."""
        return self.first + int(self.own.sum())

    @cached_property
    def transform(self) -> Matrix:
        """(rows, n): the rows of the mesh from the freedoms."""
        own = np.flatnonzero(self.own)
        follow = self.follow.tocoo()
        rows = np.concatenate([own, self.joined[follow.coords[0]]])
        columns = np.concatenate([self.first + np.arange(len(own)), follow.coords[1]])
        values = np.concatenate([np.ones(len(own)), follow.data])
        return sparse.coo_array((values, (rows, columns)), shape=(len(self.own), self.size)).tocsr()

    def rigid_motion(self) -> Array:
        """(rows, 6) when everything moves as one body about the origin."""
        return rigid_motion(self.model.nodes_m, self.pattern)

    def rows_of(self, node: int) -> Numbers:
        """The rows of a node: three, six or none."""
        return np.arange(3 * self.pattern.first[node], 3 * self.pattern.first[node + 1])

    def motion_of(self, node: int) -> Matrix:
        """(6, n) of a node; rotations that it does not have are empty."""
        rows = self.rows_of(node)
        found = self.transform[rows].tocoo()
        return sparse.coo_array((found.data, found.coords), shape=(6, self.size)).tocsr()

    @cached_property
    def translations(self) -> Matrix:
        """(3 k, n): the translations of every node; empty rows where a node has no cells."""
        first = self.pattern.first
        has = np.flatnonzero(np.diff(first))
        rows = (3 * first[has][:, None] + np.arange(3)).ravel()
        moved = self.transform[rows]
        counts = np.zeros(3 * len(self.model.nodes_m), dtype=np.intp)
        counts[(3 * has[:, None] + np.arange(3)).ravel()] = np.diff(moved.indptr)
        return sparse.csr_array(
            (moved.data, moved.indices, np.concatenate([[0], np.cumsum(counts)])),
            shape=(3 * len(self.model.nodes_m), self.size),
        )


class MeshFreedoms(Sequence[Freedom]):
    """Names of the freedoms of a woven system, made when they are asked for: there may be a million."""

    def __init__(self, frame: tuple[Freedom, ...], woven: Woven) -> None:
        self._frame, self._first = frame, woven.pattern.first
        self._rows = np.flatnonzero(woven.own)

    def __len__(self) -> int:
        return len(self._frame) + len(self._rows)

    @overload
    def __getitem__(self, index: int) -> Freedom: ...
    @overload
    def __getitem__(self, index: slice) -> tuple[Freedom, ...]: ...
    def __getitem__(self, index: int | slice) -> Freedom | tuple[Freedom, ...]:
        if isinstance(index, slice):
            return tuple(self[i] for i in range(*index.indices(len(self))))
        if index < 0:
            index += len(self)
        if not 0 <= index < len(self):
            raise IndexError(index)
        if index < len(self._frame):
            return self._frame[index]
        row = int(self._rows[index - len(self._frame)])
        node = int(np.searchsorted(self._first, row // 3, side="right")) - 1
        return Freedom(f"node {node + 1}", COMPONENTS[row - 3 * int(self._first[node])])


def weave(model: MeshModel, points: dict[str, int], frame: Matrix) -> Woven:
    """Assemble the cells and cut what supports hold; join what follows points.

    Parameters
    ----------
    model
        The mesh.
    points
        The number of each point of the plain study.
    frame
        (6 k + t, f) `Nodes.transform` of everything that is not mesh.
    """
    assembled = assemble(model.nodes_m, model.groups)
    pattern = assembled.pattern
    joined, follow = _joined(model, points, frame, pattern)
    own = np.ones(pattern.size, dtype=bool)
    own[joined] = False
    own[_held_rows(model, pattern)] = False
    pushed = assembled.mass @ rigid_motion(model.nodes_m, pattern)
    edge = np.flatnonzero(~own)
    first = frame.shape[1]
    stiffness, mass = _own_parts(assembled.stiffness, assembled.mass, own)
    if first:
        stiffness, mass = (
            _with_frame(whole, inner, own, joined, follow)
            for whole, inner in ((assembled.stiffness, stiffness), (assembled.mass, mass))
        )
    mass = _without_zeros(mass)
    return Woven(
        model=model,
        pattern=pattern,
        first=first,
        own=own,
        joined=joined,
        follow=follow,
        stiffness=stiffness,
        mass=mass,
        pushed=pushed,
        edge=edge,
        edge_stiffness=assembled.stiffness[edge],
    )


def rigid_motion(nodes_m: Array, pattern: Pattern) -> Array:
    """(rows, 6) of the rows of a pattern, about the origin."""
    triples = np.diff(pattern.first)
    node = np.repeat(np.arange(len(nodes_m)), triples)
    second = np.arange(len(node)) > pattern.first[node]
    found = np.zeros((len(node), 3, 6))
    moved = arms(nodes_m[node])
    found[~second] = moved[~second, :3]
    found[second] = moved[second, 3:]
    return found.reshape(-1, 6)


def _joined(
    model: MeshModel, points: dict[str, int], frame: Matrix, pattern: Pattern
) -> tuple[Numbers, Matrix]:
    rows: list[Numbers] = [np.zeros(0, dtype=np.intp)]
    after: list[Numbers] = [np.zeros(0, dtype=np.intp)]
    for name, node in model.node_of_point.items():
        own = np.arange(3 * pattern.first[node], 3 * pattern.first[node + 1])
        rows.append(own)
        after.append(6 * points[name] + np.arange(len(own)))
    return np.concatenate(rows), frame[np.concatenate(after)]


def _held_rows(model: MeshModel, pattern: Pattern) -> Numbers:
    node, component = np.nonzero(held_flags(model))
    row = 3 * pattern.first[node] + component
    found: Numbers = row[row < 3 * pattern.first[node + 1]]
    return found


def _own_parts(stiffness: Matrix, mass: Matrix, own: NDArray[np.bool_]) -> tuple[Matrix, Matrix]:
    """The rows and columns that are freedoms of their own, of two matrices that share their indices."""
    if own.all():
        return stiffness, mass
    lengths = np.diff(stiffness.indptr)
    keep = own[stiffness.indices]
    keep &= np.repeat(own, lengths)
    counts = np.add.reduceat(keep, stiffness.indptr[:-1], dtype=np.intp) if len(keep) else np.zeros(0, int)
    number = (np.cumsum(own) - 1).astype(stiffness.indices.dtype)
    indices = number[stiffness.indices[keep]]
    indptr = np.concatenate([[0], np.cumsum(counts[own])]).astype(stiffness.indptr.dtype)
    size = int(own.sum())
    first, second = (
        sparse.csr_array((matrix.data[keep], indices, indptr), shape=(size, size))
        for matrix in (stiffness, mass)
    )
    return first, second


def _without_zeros(matrix: Matrix) -> Matrix:
    """A copy without stored zeros: two thirds of the entries of the mass, where it does not couple axes."""
    kept = matrix.data != 0
    counts = np.concatenate([[0], np.cumsum(kept)])
    indptr = counts[matrix.indptr].astype(matrix.indptr.dtype)
    return sparse.csr_array((matrix.data[kept], matrix.indices[kept], indptr), shape=matrix.shape)


def _with_frame(
    whole: Matrix, inner: Matrix, own: NDArray[np.bool_], joined: Numbers, follow: Matrix
) -> Matrix:
    """The cells' share in the matrix of the whole: what is joined goes to the freedoms of the frame."""
    frame = follow.shape[1]
    rows = whole[joined]
    corner = follow.T @ (rows[:, joined] @ follow)
    corner = sparse.csr_array((corner + corner.T) / 2)
    beside = sparse.csr_array(follow.T @ rows[:, np.flatnonzero(own)])
    upper = sparse.hstack([corner, beside], format="csr")
    lower = _side_by_side(sparse.csr_array(beside.T), inner, frame)
    indptr = np.concatenate([upper.indptr, upper.indptr[-1] + lower.indptr[1:]])
    data, indices = (
        np.concatenate(pair) for pair in ((upper.data, lower.data), (upper.indices, lower.indices))
    )
    return sparse.csr_array((data, indices, indptr), shape=(frame + inner.shape[0],) * 2)


def _side_by_side(left: Matrix, right: Matrix, width: int) -> Matrix:
    """[left, right], where few rows of the left have entries."""
    ahead = np.diff(left.indptr)
    after = np.cumsum(ahead)
    total = len(left.data) + len(right.data)
    place = np.arange(len(right.data)) + np.repeat(after, np.diff(right.indptr))
    data, indices = np.empty(total), np.empty(total, dtype=np.int32 if total < 2**31 else np.int64)
    here = np.ones(total, dtype=bool)
    here[place] = False
    data[place], indices[place] = right.data, right.indices + width
    data[here], indices[here] = left.data, left.indices
    indptr = right.indptr.astype(np.int64) + np.concatenate([[0], after])
    return sparse.csr_array((data, indices, indptr), shape=(right.shape[0], width + right.shape[1]))
