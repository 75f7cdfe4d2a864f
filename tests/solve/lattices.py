"""Sparse matrices with known modes, for the tests of the large solvers."""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.sparse as sparse


@dataclass(frozen=True, eq=False)
class Problem:
    """Matrices and, where there is a closed form, all eigenvalues in ascending order."""

    mass: sparse.csr_array
    stiffness: sparse.csr_array
    values: np.ndarray


def bar(cells: int, length: float, *, held: bool) -> tuple[Any, Any, Any]:
    """Linear elements for -u'' = value u on a line, both ends held or free, and its eigenvalues.

    Sines (held) or cosines (free) at the nodes are eigenvectors of both tridiagonal matrices, which gives
    (6 / h^2) (1 - cos a) / (2 + cos a) with a = k pi / cells.
    """
    h = length / cells
    one = np.ones(cells + 1)
    stiffness = sparse.diags_array([-one[1:], 2 * one, -one[1:]], offsets=[-1, 0, 1]).tolil() / h
    mass = sparse.diags_array([one[1:], 4 * one, one[1:]], offsets=[-1, 0, 1]).tolil() * (h / 6)
    for matrix in (stiffness, mass):
        for end in (0, cells):
            matrix[end, end] /= 2
    keep = np.arange(1, cells) if held else np.arange(cells + 1)
    angle = (np.arange(1, cells) if held else np.arange(cells + 1)) * np.pi / cells
    values = 6 / h**2 * (1 - np.cos(angle)) / (2 + np.cos(angle))
    return mass.tocsr()[keep][:, keep], stiffness.tocsr()[keep][:, keep], values


def box(
    cells: tuple[int, int, int], lengths: tuple[float, float, float] = (1.0, 1.0, 1.0), *, held: bool = True
) -> Problem:
    """Trilinear elements for the Laplacian on a box: eigenvalues are sums of those of three bars."""
    (m1, k1, v1), (m2, k2, v2), (m3, k3, v3) = (
        bar(n, length, held=held) for n, length in zip(cells, lengths, strict=True)
    )
    mass = sparse.kron(sparse.kron(m1, m2), m3)
    stiffness = (
        sparse.kron(sparse.kron(k1, m2), m3)
        + sparse.kron(sparse.kron(m1, k2), m3)
        + sparse.kron(sparse.kron(m1, m2), k3)
    )
    values = np.sort((v1[:, None, None] + v2[:, None] + v3).ravel())
    return Problem(sparse.csr_array(mass), sparse.csr_array(stiffness), values)


def lattice(shape: tuple[int, int, int] = (5, 5, 4), *, held: bool = False, seed: int = 1) -> Problem:
    """Point masses in space on springs to all neighbours, diagonals too: six rigid-body motions if free."""
    points = np.array(list(itertools.product(*(range(n) for n in shape))), dtype=float)
    random = np.random.default_rng(seed)
    size = 3 * len(points)
    rows, columns, values = [], [], []
    for i, j in itertools.combinations(range(len(points)), 2):
        along = points[j] - points[i]
        if np.abs(along).max() > 1:
            continue
        along = along / np.linalg.norm(along)
        block = 1e6 * random.uniform(0.5, 2.0) * np.outer(along, along)
        for a, b, sign in ((i, i, 1), (j, j, 1), (i, j, -1), (j, i, -1)):
            rows += np.repeat(3 * a + np.arange(3), 3).tolist()
            columns += np.tile(3 * b + np.arange(3), 3).tolist()
            values += (sign * block).ravel().tolist()
    stiffness = sparse.csr_array((values, (rows, columns)), shape=(size, size))
    mass = sparse.csr_array(sparse.diags_array(np.repeat(random.uniform(1, 5, len(points)), 3)))
    if held:
        keep = np.flatnonzero(np.repeat(points[:, 0] > 0, 3))
        stiffness, mass = stiffness[keep][:, keep], mass[keep][:, keep]
    return Problem(mass, stiffness, np.zeros(0))
