"""How far the frequencies of solids are off: what the modes would gain from richer cells.

Each cell gets the shape functions of the next degree that it lacks (`vib.structure.cells.surplus`). A mode
that was exact would be in balance with all of them; the forces r that remain say how far its squared
frequency falls when they may act: by r' K^-1 r, where K is the stiffness of the added functions alone (two
levels of a hierarchy: O. C. Zienkiewicz, J. P. de S. R. Gago, D. W. Kelly, Computers & Structures 16 (1983)
53-65; R. E. Bank, R. K. Smith, SIAM J. Numer. Anal. 30 (1993) 921-935). What the modes gain in common comes
with it, so that those which are about to change places can be told by number.

K is never factorised: conjugate gradients with the blocks of each function as preconditioner add up the
energy from below, and what is still missing is extrapolated from the last two steps. Unlike smoothed
stresses this needs no patch of cells, and it sees the singular stresses at clamped and re-entrant edges.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from scipy.sparse import csr_array

from vib.errors import AccuracyError
from vib.structure.cells.solid import determinant_and_inverse, jacobians
from vib.structure.mesh.richer import Flags, Numbers, Richer, RicherGroup, richer
from vib.structure.sparsity import Group, Pattern
from vib.system import Array

# This part of the error is within reach, the rest is added. Stresses at a clamped edge grow like r^-0.29
# (nu = 0.3; M. L. Williams, J. Appl. Mech. 19 (1952) 526-528), so that the error goes with the degree p like
# p^(-4 0.71) (I. Babuska, M. Suri, RAIRO M2AN 21 (1987) 199-238): a degree of 3 takes away two thirds of that
# of degree 2. A fifth to a quarter of these two thirds is missed because the nodes are not let to follow
# (measured on blocks, cubes and brackets of all kinds of cells). Smooth modes come out up to twice as large.
REACHED = 1 / 2
ENOUGH = 0.15  # of the energy may be left to extrapolation
MOST_STEPS = 10
APART = 100.0  # ratio of squared frequencies
LEAST = np.finfo(float).tiny
DISTORTED = "Some cells are so distorted that richer ones would have no stiffness."
_CHUNK_VALUES = 1_000_000
_KEPT_BYTES = 1_000_000_000
_VECTOR_BYTES = 1_500_000_000


@dataclass(frozen=True, eq=False)
class _Chunk:
    """Some cells: numbers of their added functions, the stiffness of those, and what modes do to them.

    ``stiffness`` (e, 3 s, 3 s), ``from_nodes`` (e, 3 s, 3 a) of the nodes and internal functions, ``mass``
    (e, s, k) of the nodes.
    """

    numbers: Numbers
    stiffness: Array
    from_nodes: Array | None = None
    mass: Array | None = None


def solid_errors(
    nodes_m: Array, groups: Sequence[Group], pattern: Pattern, held: Flags, shapes: Array, angular: Array
) -> Array:
    """By how much modes would be softer if their cells were exact: twice the energy (m,), (rad/s)^2.

    The forces of a mode held, a mesh that is softer by the energy e gives way by e more: of the squared
    frequency w the part w / (w + e) is left, for small e the whole less e (G. Strang, G. J. Fix, An Analysis
    of the Finite Element Method, 1973, section 6.3). With all modes together e is a matrix, and what is left
    is told by number, slowest first, because modes of a coarse mesh may have changed places.

    Parameters
    ----------
    nodes_m, groups, pattern
        What was assembled; groups of solids only.
    held
        (k, 3): translations of the nodes that can't move by themselves.
    shapes
        (rows, m) modes on all rows of the pattern, of unit modal mass.
    angular
        (m,) their frequencies, rad/s, ascending.

    Raises
    ------
    AccuracyError
        More corners of cells than can be numbered, or cells that are all but folded.
    """
    level = _Level(nodes_m, richer(groups, held), pattern)
    count = shapes.shape[1]
    step = max(1, _VECTOR_BYTES // (6 * 8 * 3 * max(level.richer.count, 1)))
    found = np.zeros(count)
    for start in range(0, count, step):
        some = slice(start, start + step)
        found[some] = _by_number(level.gains(shapes[:, some], angular[some]), angular[some] ** 2)
    return found / REACHED


def _by_number(gains: Array, squares: Array) -> Array:
    """What each mode (m,) gains once the modes are in order again, from gains between modes (m, m).

    In groups, because far apart no modes change places, and the lowest would drown the highest in round-off.
    """
    found = np.zeros(len(squares))
    for some in np.split(np.arange(len(squares)), np.flatnonzero(squares[1:] > APART * squares[:-1]) + 1):
        own = squares[some]
        softer = np.diag(1 / own) + gains[np.ix_(some, some)] / np.outer(own, own)
        left = 1 / np.linalg.eigvalsh(softer)[::-1]
        found[some] = own * np.maximum(own / left - 1, 0.0)
    return found


class _Level:
    """The added functions of a mesh and their stiffness, cell by cell."""

    def __init__(self, nodes_m: Array, functions: Richer, pattern: Pattern) -> None:
        self.nodes_m, self.richer, self.pattern = nodes_m, functions, pattern
        self.kept: list[_Chunk] | None = None

    def gains(self, shapes: Array, angular: Array) -> Array:
        """How far the squared frequencies fall with richer cells, (m, m) between the modes, (rad/s)^2."""
        forces, diagonal = self._forces(shapes, angular)
        try:
            inverse = np.linalg.inv(diagonal)
        except np.linalg.LinAlgError:
            raise AccuracyError(DISTORTED) from None

        def preconditioned(vectors: Array) -> Array:
            return (inverse @ vectors.reshape(len(inverse), 3, -1)).reshape(vectors.shape)

        moved, left, gained = np.zeros_like(forces), forces.copy(), np.zeros(shapes.shape[1])
        direction = ahead = preconditioned(left)
        product, last = _dots(left, ahead), np.full(shapes.shape[1], np.inf)
        for _ in range(MOST_STEPS):
            pulled = self._pulled(direction)
            stretched = _dots(direction, pulled)
            if not ((product >= 0) & (stretched >= 0)).all():
                raise AccuracyError(DISTORTED)
            length = product / np.maximum(stretched, LEAST)
            moved += length * direction
            left -= length * pulled
            last, before = length * product, last
            gained += last
            fall = np.clip(last / np.maximum(before, LEAST), 0.0, 0.9)
            rest = last * fall / (1 - fall)
            if np.isfinite(before).all() and (rest <= ENOUGH * gained).all():
                break
            ahead = preconditioned(left)
            product, old = _dots(left, ahead), product
            direction = ahead + (product / np.maximum(old, LEAST)) * direction
        # r'x + x'r - x'K x, where K x = r - left
        common = moved.T @ (forces + left)
        common = (common + common.T) / 2
        scale = np.sqrt((gained + rest) / np.maximum(np.diag(common), LEAST))
        found: Array = common * np.outer(scale, scale)
        return found

    def _forces(self, shapes: Array, angular: Array) -> tuple[Array, Array]:
        """Forces (3 count, m) out of balance, and blocks (count, 3, 3) on the diagonal of the stiffness."""
        count, columns = self.richer.count, shapes.shape[1]
        forces, diagonal = np.zeros((count, 3 * columns)), np.zeros((count, 9))
        kept: list[_Chunk] | None = []
        size = 0
        for part, chunk in self._chunks():
            found = self._computed(part, chunk, nodes=True)
            assert found.from_nodes is not None
            assert found.mass is not None
            cells, functions = found.numbers.shape
            moved = shapes[self.pattern.freedoms(part.group, chunk)]
            coordinates = self.nodes_m[part.group.connectivity[chunk]]
            inner = part.family.internal(coordinates, part.group.properties.of(chunk), moved)
            pulled = found.from_nodes @ np.concatenate([moved, inner.reshape(cells, -1, columns)], axis=1)
            thrown = (found.mass @ moved.reshape(cells, part.family.nodes, -1)).reshape(pulled.shape)
            _add(forces, found.numbers, (pulled - thrown * angular**2).reshape(cells, functions, -1))
            apart = found.stiffness.reshape(cells, functions, 3, functions, 3)
            own = np.einsum("esisj->esij", apart).reshape(cells, functions, 9)
            _add(diagonal, found.numbers, own)
            size += found.stiffness.nbytes
            if kept is not None and size <= _KEPT_BYTES:
                kept.append(_Chunk(found.numbers, found.stiffness))
            else:
                kept = None
        self.kept = kept
        still = self.richer.held
        forces.reshape(count, 3, columns)[still] = 0.0
        blocks = diagonal.reshape(count, 3, 3)
        blocks[still[:, :, None] | still[:, None, :]] = 0.0
        blocks[:, range(3), range(3)] += still
        return forces.reshape(3 * count, columns), blocks

    def _pulled(self, vectors: Array) -> Array:
        """The stiffness of the added functions times vectors (3 count, m) that are zero where held."""
        count = self.richer.count
        total = np.zeros((count, vectors.size // count))
        rows = vectors.reshape(count, -1)
        chunks = self.kept
        for found in chunks if chunks is not None else (self._computed(*each) for each in self._chunks()):
            cells, functions = found.numbers.shape
            moved = rows[found.numbers].reshape(cells, 3 * functions, -1)
            _add(total, found.numbers, (found.stiffness @ moved).reshape(cells, functions, -1))
        total.reshape(count, 3, -1)[self.richer.held] = 0.0
        return total.reshape(vectors.shape)

    def _chunks(self) -> Iterator[tuple[RicherGroup, slice]]:
        for part in self.richer.groups:
            nodes = part.family.nodes + len(part.surplus.kinds)
            step = max(1, _CHUNK_VALUES // (9 * nodes * len(part.surplus.kinds)))
            for start in range(0, len(part.numbers), step):
                yield part, slice(start, start + step)

    def _computed(self, part: RicherGroup, chunk: slice, *, nodes: bool = False) -> _Chunk:
        family, surplus, rule = part.family, part.surplus, part.surplus.rule
        coordinates = self.nodes_m[part.group.connectivity[chunk]]
        properties = part.group.properties.of(chunk)
        signs = part.signs[chunk]
        plain = family.gradients(rule.points)
        determinant, inverse = determinant_and_inverse(jacobians(plain, coordinates))
        weights = determinant * rule.weights
        added = (surplus.gradients @ inverse) * signs[:, None, :, None]
        lame, shear = properties.lame(len(coordinates))
        stiffness = _stiffness(added, added, weights, lame, shear)
        if not nodes:
            return _Chunk(part.numbers[chunk], stiffness)
        _, own = family.mapped(plain, family.extra_gradients(rule.points), coordinates)
        density = properties.spread("density", len(coordinates))
        shared = np.einsum("ps,pk->psk", surplus.values, family.shape(rule.points))
        mass = np.tensordot(weights * density[:, None], shared, axes=1) * signs[:, :, None]
        return _Chunk(part.numbers[chunk], stiffness, _stiffness(added, own, weights, lame, shear), mass)


def _stiffness(first: Array, second: Array, weights: Array, lame: Array, shear: Array) -> Array:
    """(e, 3 s, 3 a) between functions by their gradients in space, (e, p, s, 3) and (e, p, a, 3)."""
    cells, points, rows, _ = first.shape
    columns = second.shape[2]
    weighted = (first * weights[:, :, None, None]).reshape(cells, points, -1)
    tensor = weighted.swapaxes(1, 2) @ second.reshape(cells, points, -1)
    apart = tensor.reshape(cells, rows, 3, columns, 3)
    found = lame[:, None, None, None, None] * apart
    found += shear[:, None, None, None, None] * apart.swapaxes(2, 4)
    trace = shear[:, None, None] * np.einsum("esiai->esa", apart)
    for axis in range(3):
        found[:, :, axis, :, axis] += trace
    return found.reshape(cells, 3 * rows, 3 * columns)


def _add(total: Array, numbers: Numbers, parts: Array) -> None:
    """Add parts (e, s, c) to the rows of ``total`` that ``numbers`` (e, s) name, some of them repeatedly."""
    used, place = np.unique(numbers, return_inverse=True)
    summing = csr_array(
        (np.ones(numbers.size), (place.ravel(), np.arange(numbers.size))), shape=(len(used), numbers.size)
    )
    total[used] += summing @ parts.reshape(numbers.size, -1)


def _dots(first: Array, second: Array) -> Array:
    found: Array = np.einsum("im,im->m", first, second)
    return found
