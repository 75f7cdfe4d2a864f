"""Sparse matrices of many parts, one below the other, so that each step is done for all parts at once."""

from __future__ import annotations

import numpy as np
import scipy.sparse as sparse
from numpy.typing import NDArray

from vib.system import Array, Matrix

Indices = NDArray[np.intp]


def components_of(nodes: Indices) -> Indices:
    """(e, 6 m) rows of the six components of nodes (e, m)."""
    return (6 * nodes[:, :, None] + np.arange(6)).reshape(len(nodes), 6 * nodes.shape[1])


def scatter(blocks: Array, index: Indices, size: int, part: Indices | None = None, parts: int = 1) -> Matrix:
    """Sum blocks of elements into a stack of sparse matrices.

    Parameters
    ----------
    blocks
        (e, m, m), one per element.
    index
        (e, m) its rows and columns, below ``size``.
    part, parts
        (e,) the part that each element belongs to, and how many there are.

    Returns
    -------
    csr_array
        (parts size, size).
    """
    shift = 0 if part is None else size * part[:, None, None]
    rows = np.broadcast_to(index[:, :, None] + shift, blocks.shape).reshape(-1)
    columns = np.broadcast_to(index[:, None, :], blocks.shape).reshape(-1)
    values = blocks.reshape(-1)
    some = values != 0
    return sparse.coo_array((values[some], (rows[some], columns[some])), shape=(parts * size, size)).tocsr()


def unstack(stack: Matrix, count: int) -> list[Matrix]:
    """The ``count`` square matrices of a stack (p n, n), as csr_array that share its memory."""
    size = stack.shape[1]
    found = []
    for first in range(0, count * size, size) if size else [0] * count:
        ends = stack.indptr[first : first + size + 1]
        span = slice(ends[0], ends[-1])
        part = (stack.data[span], stack.indices[span], ends - ends[0])
        found.append(sparse.csr_array(part, shape=(size, size)))
    return found


def reduce_stack(stack: Matrix, transform: Matrix) -> Matrix:
    """T' X T of every X in a stack (p k, k) with T (k, n): a stack (p n, n), symmetric to the last bit."""
    rows, size = transform.shape
    parts = stack.shape[0] // rows if rows else 0
    moved = (stack @ transform).tocoo()
    # columns into rows: T' acts on each matrix of the stack as on one wide matrix
    part, row = np.divmod(moved.coords[0], max(rows, 1))
    wide = sparse.coo_array((moved.data, (row, part * size + moved.coords[1])), shape=(rows, parts * size))
    found = (transform.T.tocsr() @ wide.tocsr()).tocoo()
    i = found.coords[0].astype(np.intp)
    part, j = np.divmod(found.coords[1].astype(np.intp), max(size, 1))
    both = (np.concatenate([part * size + i, part * size + j]), np.concatenate([j, i]))
    halves = np.tile(0.5 * found.data, 2)
    result = sparse.coo_array((halves, both), shape=(parts * size, size)).tocsr()
    result.eliminate_zeros()
    return result


def add_up(stack: Matrix) -> Matrix:
    """The sum (n, n) of the matrices of a stack (p n, n)."""
    size = stack.shape[1]
    entries = stack.tocoo()
    row = entries.coords[0] % max(size, 1)
    return sparse.coo_array((entries.data, (row, entries.coords[1])), shape=(size, size)).tocsr()
