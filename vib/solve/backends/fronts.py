"""Factorisation of our own for symmetric matrices: dense blocks along a nested dissection.

The multifrontal method (I. S. Duff, J. K. Reid, ACM Trans. Math. Softw. 9 (1983) 302-325; J. W. H. Liu, SIAM
Review 34 (1992) 82-109): nearly all of the work is dense products of a few hundred blocks, so LAPACK does it
at the speed of the machine. A block is factorised by Cholesky's method or, where it is not positive
definite, by Bunch and Kaufman's with pivots from inside the block, which tells the inertia; whether that was
accurate enough, the residual check of `Factor` decides.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.linalg
import scipy.sparse as sparse
from numpy.typing import NDArray
from scipy.linalg import blas, lapack

from vib.solve.backends.dissection import dissect
from vib.solve.backends.interface import Array, Factor, FactorError, check_memory

Numbers = NDArray[np.intp]

# Consecutive equations are added to a parent run by run where runs are longer than this on average: below it
# the calls cost more than indexing entry by entry.
SHORT_RUNS = 10


@dataclass(frozen=True, eq=False)
class Piece:
    """One factorised block.

    With its p equations E and the q later ones B that they touch: ``turn`` (p, p) makes turn E turn' = D, and
    ``link`` (p, q) = inv(D) turn A_EB. D is the identity where ``curved`` is None, else ``curved`` (2, p) is
    the diagonal and the first off-diagonal of inv(D).
    """

    turn: Array
    link: Array
    curved: Array | None


class Fronts(Factor):
    """LDL' by dense blocks along a nested dissection."""

    backend = "nested dissection"

    def __init__(self, matrix: sparse.csr_array) -> None:
        """Factorise the upper triangle of a symmetric matrix; see `Factor`."""
        self._pieces: list[Piece] = []
        super().__init__(matrix, symmetric=True)

    def release(self) -> None:
        """Give the memory of the factor back."""
        self._pieces = []

    def _analyse(self) -> None:
        found = dissect(self._matrix)
        self._order, self._starts = found.order, found.starts
        self._children: list[list[int]] = [[] for _ in found.parents]
        for block, parent in enumerate(found.parents.tolist()):
            if parent >= 0:
                self._children[parent].append(block)
        place = np.empty(self.size, dtype=np.intp)
        place[self._order] = np.arange(self.size)
        self._sort_entries(place)
        self._borders = self._find_borders()
        widths = np.diff(self._starts)
        self.nonzeros = int(sum(p * (p + len(b)) for p, b in zip(widths, self._borders, strict=True)))
        self.memory_bytes = 8 * self.nonzeros
        check_memory(self.backend, self.memory_bytes + 16 * max(len(b) for b in self._borders) ** 2)

    def _sort_entries(self, place: Numbers) -> None:
        """Where each entry of the matrix goes in the new order: by row of its earlier equation."""
        rows = place[np.repeat(np.arange(self.size), np.diff(self._matrix.indptr))]
        columns = place[self._matrix.indices]
        early, late = np.minimum(rows, columns), np.maximum(rows, columns)
        moved = sparse.csr_array((np.arange(1.0, len(early) + 1), (early, late)), shape=self._matrix.shape)
        self._source = moved.data.astype(np.intp) - 1
        self._columns = moved.indices.astype(np.intp)
        self._rows = moved.indptr.astype(np.intp)

    def _find_borders(self) -> list[Numbers]:
        """For each block the later equations that it touches once the blocks before it are eliminated."""
        borders: list[Numbers] = []
        for block, children in enumerate(self._children):
            first, last = self._starts[block], self._starts[block + 1]
            own = self._columns[self._rows[first] : self._rows[last]]
            touched = np.sort(np.concatenate([own, *(borders[child] for child in children)]))
            fresh = np.diff(touched, prepend=-1) > 0
            borders.append(touched[fresh & (touched >= last)])
        return borders

    def _numbers(self) -> None:
        self._pieces = []
        self.negative, self.smallest_pivot = 0, np.inf
        values = self._matrix.data[self._source]
        local = np.empty(self.size, dtype=np.intp)
        passed_up: dict[int, Array] = {}
        for block, children in enumerate(self._children):
            first, last, border = int(self._starts[block]), int(self._starts[block + 1]), self._borders[block]
            width = last - first
            local[first:last] = np.arange(width)
            local[border] = width + np.arange(len(border))
            entries = slice(self._rows[first], self._rows[last])
            front = np.zeros((width, width + len(border)))
            rows = np.repeat(np.arange(width), np.diff(self._rows[first : last + 1]))
            front[rows, local[self._columns[entries]]] = values[entries]
            rest = np.zeros((len(border), len(border)))
            for child in children:
                _extend(front, rest, passed_up.pop(child), local[self._borders[child]])
            piece, pivots = _eliminate(front[:, :width], front[:, width:], rest)
            self._pieces.append(piece)
            self.negative += int((pivots < 0).sum())
            self.smallest_pivot = min(self.smallest_pivot, float(np.abs(pivots).min(initial=np.inf)))
            if len(border):
                passed_up[block] = rest

    def _solve(self, right: Array) -> Array:
        if not self._pieces:
            raise FactorError("This factorisation was released.")
        work = right[self._order]
        for block, piece in enumerate(self._pieces):
            own, border = slice(self._starts[block], self._starts[block + 1]), self._borders[block]
            work[own] = piece.turn @ work[own]
            if len(border):
                work[border] -= piece.link.T @ work[own]
        for block in range(len(self._pieces) - 1, -1, -1):
            piece, border = self._pieces[block], self._borders[block]
            own = slice(self._starts[block], self._starts[block + 1])
            inner = work[own] if piece.curved is None else _straighten(piece.curved, work[own])
            if len(border):
                inner = inner - piece.link @ work[border]
            work[own] = piece.turn.T @ inner
        solution = np.empty_like(work)
        solution[self._order] = work
        return solution


def _extend(front: Array, rest: Array, passed: Array, places: Numbers) -> None:
    """Add the upper triangle of what a child passed up at its places in the parent's block and border."""
    width = front.shape[0]
    jumps = (np.diff(places) > 1) | (places[1:] == width)
    edges = np.concatenate([[0], np.flatnonzero(jumps) + 1, [len(places)]]).tolist()
    runs = list(zip(edges[:-1], edges[1:], places[edges[:-1]].tolist(), strict=True))
    blockwise = len(places) > SHORT_RUNS * len(runs)
    for number, (first, last, row) in enumerate(runs):
        shift = 0 if row < width else width
        target = (rest if shift else front)[row - shift : row - shift + last - first]
        if blockwise:
            for start, end, column in runs[number:]:
                target[:, column - shift : column - shift + end - start] += passed[first:last, start:end]
        else:
            target[:, places[first:] - shift] += passed[first:last, first:]


def _eliminate(own: Array, across: Array, rest: Array) -> tuple[Piece, Array]:
    """Factorise ``own`` (upper triangle), take its part out of ``rest``; the piece and the pivots (p,)."""
    lower, fault = lapack.dpotrf(own.T, lower=1, clean=1)
    if fault == 0:
        link = blas.dtrsm(1.0, lower, across.T, side=1, lower=1, trans_a=1).T if across.size else across
        turn, _ = lapack.dtrtri(lower, lower=1)
        piece = Piece(turn, link, None)
        if len(rest):
            blas.dsyrk(-1.0, link.T, 1.0, rest.T, lower=1, overwrite_c=1)
        return piece, np.diag(lower) ** 2
    return _eliminate_indefinite(own, across, rest)


def _eliminate_indefinite(own: Array, across: Array, rest: Array) -> tuple[Piece, Array]:
    whole = np.triu(own) + np.triu(own, 1).T
    lower, middle, order = scipy.linalg.ldl(whole, lower=True, check_finite=False)
    turn = np.eye(len(own))[order]
    turn = scipy.linalg.solve_triangular(lower[order], turn, lower=True, unit_diagonal=True)
    diagonal, beside = np.diag(middle).copy(), np.append(np.diag(middle, 1), 0.0)
    pivots, curved = _invert_middle(diagonal, beside)
    half = turn @ across
    link = _straighten(curved, half)
    rest -= half.T @ link
    return Piece(turn, link, curved), pivots


def _invert_middle(diagonal: Array, beside: Array) -> tuple[Array, Array]:
    """Eigenvalues of the 1 x 1 and 2 x 2 blocks (p,); diagonal and off-diagonal of their inverses (2, p)."""
    pairs = np.flatnonzero(beside)
    pivots, inverse, off = diagonal.copy(), np.empty_like(diagonal), np.zeros_like(diagonal)
    mean = (diagonal[pairs] + diagonal[pairs + 1]) / 2
    radius = np.hypot((diagonal[pairs] - diagonal[pairs + 1]) / 2, beside[pairs])
    pivots[pairs], pivots[pairs + 1] = mean + radius, mean - radius
    if (pivots == 0).any():
        raise FactorError(f"{Fronts.backend}: the matrix is singular.")
    inverse = 1 / np.where(diagonal == 0, 1.0, diagonal)
    determinant = diagonal[pairs] * diagonal[pairs + 1] - beside[pairs] ** 2
    inverse[pairs], inverse[pairs + 1] = diagonal[pairs + 1] / determinant, diagonal[pairs] / determinant
    off[pairs] = -beside[pairs] / determinant
    return pivots, np.stack([inverse, off])


def _straighten(curved: Array, vectors: Array) -> Array:
    """inv(D) times vectors (p, k)."""
    inverse, off = curved
    product = inverse[:, None] * vectors
    product[:-1] += off[:-1, None] * vectors[1:]
    product[1:] += off[:-1, None] * vectors[:-1]
    return np.asarray(product)
