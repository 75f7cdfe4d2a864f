"""Velocity and circulatory terms that touch few freedoms: dashpots, spinning bodies, and what is beside them.

The damping matrix of a machine is mostly a M + b K with a few dashpots added. Taking it apart leaves a term
of low rank, B (s linear + constant) B', and with that a large problem fits in one real Krylov space.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.linalg
import scipy.sparse as sparse
from numpy.typing import NDArray

from vib.massless import root_scale
from vib.solve.undamped import CANCELLATION, EPS, Array, Matrix

MOST_TOUCHED = 240  # freedoms; a dense matrix of them is decomposed
MOST_RANK = 60  # of the term; beyond, a Krylov space that holds all its directions grows too fast
SAMPLE_ROWS = 40


@dataclass(frozen=True, eq=False)
class Localised:
    """C + G = mass_part M + stiffness_part K + B linear B', and K = symmetric part + B constant B'.

    ``basis`` B is sparse (n, r); ``linear`` and ``constant`` (r, r).
    """

    mass_part: float
    stiffness_part: float
    basis: Matrix
    linear: Array
    constant: Array

    @property
    def rank(self) -> int:
        """How many directions the term has."""
        return len(self.linear)

    @property
    def symmetric(self) -> bool:
        """Whether left and right eigenvectors are the same."""
        return not self.constant.any() and np.array_equal(self.linear, self.linear.T)


def localise(
    mass: Matrix,
    linear: Matrix,
    stiffness: Matrix,
    *,
    most_touched: int = MOST_TOUCHED,
    most_rank: int = MOST_RANK,
) -> Localised | None:
    """Take the velocity term apart, or None where it touches too many freedoms.

    Parameters
    ----------
    mass, linear, stiffness
        (n, n) csr_array; ``linear`` holds damping and gyroscopic terms, ``stiffness`` may be unsymmetric.
    most_touched, most_rank
        Beyond so many freedoms or directions: None.
    """
    straight = (stiffness + stiffness.T) / 2
    skew = _cleaned((stiffness - stiffness.T) / 2, abs(stiffness) + abs(stiffness).T)
    rest, parts = linear, (0.0, 0.0)
    if _rows(rest).size > MOST_RANK:
        found = _spread(mass, linear, straight)
        if found is not None:
            taken = found[0] * mass + found[1] * straight
            beside = _cleaned(linear - taken, abs(linear) + abs(taken))
            if _rows(beside).size < _rows(rest).size:
                rest, parts = beside, found
    touched = np.union1d(_rows(rest), _rows(skew))
    if touched.size > most_touched:
        return None
    term = _compressed(rest, skew, straight, touched, parts)
    return term if term.rank <= most_rank else None


def _cleaned(matrix: Matrix, terms: Matrix) -> Matrix:
    """Without the entries that are round-off of the terms that made them."""
    difference, allowed = sparse.coo_array(matrix), sparse.csr_array(terms)
    at = np.asarray(allowed[difference.coords[0], difference.coords[1]]).ravel()
    kept = np.abs(difference.data) > CANCELLATION * EPS * at
    rows, columns = (coordinate[kept] for coordinate in difference.coords)
    return sparse.csr_array((difference.data[kept], (rows, columns)), shape=matrix.shape)


def _rows(matrix: Matrix) -> NDArray[np.intp]:
    entries = sparse.coo_array(matrix)
    some = entries.data != 0
    return np.unique(np.concatenate([coordinate[some] for coordinate in entries.coords]))


def _spread(mass: Matrix, linear: Matrix, stiffness: Matrix) -> tuple[float, float] | None:
    """(a, b) of the part a M + b K that most rows share; None if there is none."""
    size = mass.shape[0]
    fits = []
    for row in np.unique(np.linspace(0, size - 1, SAMPLE_ROWS).astype(int)).tolist():
        known = np.column_stack([mass[[row]].toarray()[0], stiffness[[row]].toarray()[0]])
        filled = np.abs(known).sum(axis=1) > 0
        known, wanted = known[filled], linear[[row]].toarray()[0][filled]
        scale = np.abs(known).max(axis=0)
        scale = np.where(scale > 0, scale, 1.0)
        found, _, rank, _ = scipy.linalg.lstsq(known / scale, wanted)
        if rank == 2 or (rank == 1 and not known[:, 0].any()):
            fits.append(found / scale)
    if len(fits) < 3:
        return None
    chosen = np.median(np.array(fits), axis=0)
    return float(chosen[0]), float(chosen[1])


def _compressed(
    rest: Matrix, skew: Matrix, straight: Matrix, touched: NDArray[np.intp], parts: tuple[float, float]
) -> Localised:
    """The term on an orthonormal basis of the directions it acts in, scaled to unit stiffness."""
    small = [matrix[touched][:, touched].toarray() for matrix in (rest, skew)]
    scale = root_scale(np.asarray(straight.diagonal())[touched])
    scaled = [scale[:, None] * matrix * scale for matrix in small]
    tops = [float(np.abs(matrix).max(initial=0.0)) or 1.0 for matrix in scaled]
    unit = [matrix / top for matrix, top in zip(scaled, tops, strict=True)]
    columns = np.hstack([block for matrix in unit for block in (matrix, matrix.T)])
    left, sizes = columns, np.zeros(0)
    if touched.size:
        left, sizes, _ = scipy.linalg.svd(columns, full_matrices=False)
    kept = left[:, : int((sizes > 64 * EPS * sizes.max(initial=0.0)).sum())]
    basis = np.zeros((rest.shape[0], 0)) if not touched.size else kept / scale[:, None]
    spread = sparse.csr_array(
        (
            basis.ravel(),
            (np.repeat(touched, kept.shape[1]), np.tile(np.arange(kept.shape[1]), touched.size)),
        ),
        shape=(rest.shape[0], kept.shape[1]),
    )
    inner = [kept.T @ matrix @ kept for matrix in scaled]
    symmetric = np.array_equal(small[0], small[0].T)
    first = (inner[0] + inner[0].T) / 2 if symmetric else inner[0]
    return Localised(parts[0], parts[1], spread, first, inner[1])
