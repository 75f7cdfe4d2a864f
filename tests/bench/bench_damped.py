"""Complex modes of a block of second-order tetrahedra on four strong dashpots.

Ours is the whole search with its proof of completeness. The alternative is shift-and-invert Arnoldi of
`scipy.sparse.linalg.eigs` on the sparse first-order pencil. The floor is our own search for the undamped
modes of the same block, proved complete as well: damping should cost no more than twice that.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.sparse as sparse
import scipy.sparse.linalg as sparse_linalg

from tests.bench.bench_assembly import ACROSS, STEEL, block, second_order
from tests.bench.case import Case
from vib.structure.cells import FAMILIES
from vib.structure.sparsity import Group, assemble
from vib.system import System

COUNT = 20
CORNERS = ((3, 0, 0), (3, 1, 0), (3, 0, 1), (3, 1, 1))
DASHPOT = 3e7  # N s/m and more: the slowest eigenvalues are overdamped


@dataclass(frozen=True)
class Block:
    """Mass, stiffness and damping of a cantilever block with a dashpot at each corner of its free end."""

    mass: Any
    stiffness: Any
    damping: Any


def prepare(size: str) -> Block:
    """About 11,000 freedoms for s, 58,000 for m, 250,000 for l."""
    nodes, cells = second_order(*block(ACROSS[size]))
    found = assemble(nodes, [Group(FAMILIES["tetra10"], cells, STEEL)])
    free = np.flatnonzero(np.repeat(nodes[:, 0] > 1e-9, 3))
    dashpots = np.zeros(3 * len(nodes))
    for number, corner in enumerate(CORNERS):
        node = int(np.argmin(np.abs(nodes - np.array(corner)).sum(axis=1)))
        dashpots[3 * node + 1 + number % 2] = DASHPOT * (1 + number)
    damping = sparse.csr_array(sparse.diags_array(dashpots[free]))
    mass, stiffness = (sparse.csr_array(matrix)[free][:, free] for matrix in (found.mass, found.stiffness))
    return Block(mass, stiffness, damping)


def ours(given: Block) -> list[float]:
    """The slowest eigenvalues, proved complete."""
    modes = System(mass=given.mass, stiffness=given.stiffness, damping=given.damping).modes(count=COUNT)
    if modes.complete_below_hz is None:
        raise SystemExit("the modes were not proved complete")
    return _summed(modes.eigenvalues)


def theirs(given: Block) -> list[float]:
    """The first-order pencil, factored and iterated by SciPy; both of each pair are found."""
    size = given.mass.shape[0]
    one = sparse.eye_array(size)
    left = sparse.block_array([[None, one], [-given.stiffness, -given.damping]], format="csc")
    right = sparse.block_array([[one, None], [None, given.mass]], format="csc")
    values = sparse_linalg.eigs(left, k=2 * COUNT, M=right, sigma=0, return_eigenvectors=False)
    upper = values[values.imag > -1e-6 * np.abs(values)]
    return _summed(upper[np.argsort(np.abs(upper))][:COUNT])


def floor(given: Block) -> list[float]:
    """The undamped modes of the same block."""
    found = System(mass=given.mass, stiffness=given.stiffness).modes(count=COUNT)
    return [float(frequency) for frequency in found.frequencies_hz]


def _summed(values: Any) -> list[float]:
    kept = values[:COUNT]
    return [float(np.abs(kept).sum()), float(np.abs(kept.real).sum())]


CASES = (
    Case(
        name="damped",
        work="20 damped modes, 4 strong dashpots",
        alternative="SciPy eigs, first-order pencil",
        prepare=prepare,
        ours=ours,
        theirs=theirs,
        floor=floor,
        rtol=1e-6,
        theirs_sizes=("s",),
    ),
)
