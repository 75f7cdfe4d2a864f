"""The undamped problem of small systems: all modes, each with its own relative accuracy.

With K = F F' and M = L L' the angular frequencies are the singular values of inv(L) F. Both factors are
taken from matrices scaled to a unit diagonal, so soft and stiff modes side by side keep their digits
(Z. Drmac, A tangent algorithm for computing the generalized singular value decomposition, SIAM J. Numer.
Anal. 35 (1998) 1804-1832); the pivoted factor of K ends where K is used up, which gives the rigid-body modes.
"""

from __future__ import annotations

import numpy as np
import scipy.linalg
from numpy.typing import NDArray
from scipy.linalg import lapack

from vib.errors import AccuracyError
from vib.massless import Condensed, condense, root_scale
from vib.solve.undamped import (
    EPS,
    Array,
    Matrix,
    Undamped,
    elastic_ratio,
    round_off,
    stores_nothing,
    with_hidden,
)

# Above this ratio of highest to lowest frequency the fast singular value routine, whose error is relative to
# the highest, is replaced by the one-sided Jacobi one. Vectors then hold 1e-16 * 1e5, frequencies its square.
GRADED = 1e5
JACOBI_SIZE = 1000  # beyond, the Jacobi method takes too long; error bars say what the other one leaves


def dense_undamped(mass: Matrix, stiffness: Matrix) -> Undamped:
    """All finite modes of symmetric matrices, (n, n); see `condensed_modes`."""
    return condensed_modes(condense(mass, stiffness))


def condensed_modes(reduced: Condensed) -> Undamped:
    """All finite modes of a symmetric system whose motions without mass were eliminated.

    Parameters
    ----------
    reduced
        From `vib.massless.condense`, which raises where they can't be.

    Raises
    ------
    AccuracyError
        The singular value routine did not converge.
    """
    factor = _stiffness_factor(reduced.stiffness)
    if factor is None:
        null, (values, local, errors) = 0, _indefinite(reduced)
    else:
        null = len(reduced.mass) - factor[0].shape[1]
        values, local, errors = _semidefinite(reduced, *factor)
    energy, terms = elastic_ratio(reduced.stiffness, local)
    mass_terms = np.einsum("ij,ij->j", np.abs(local), np.abs(reduced.mass) @ np.abs(local))
    # Pivots of the scaled stiffness that cancel to round-off: the same criterion, before a shape is known.
    rigid = stores_nothing(energy, terms) | (np.arange(len(values)) < null)
    values = np.where(rigid, 0.0, values)
    angular = np.sqrt(np.abs(values))
    errors = with_hidden(errors + round_off(terms, mass_terms, angular), rigid, energy, terms, angular)
    order = np.lexsort((values, ~rigid))
    return Undamped(
        values=values[order],
        shapes=reduced.lift @ local[:, order],
        errors=errors[order],
        rigid=int(rigid.sum()),
        complete=True,
    )


def _stiffness_factor(stiffness: Array) -> tuple[Array, Array, NDArray[np.intp]] | None:
    """F (n, r) with K = F F', its leading triangle and pivot order; None if K is indefinite."""
    size = len(stiffness)
    diagonal = np.diag(stiffness)
    if (diagonal < 0).any() or stiffness[diagonal == 0].any():
        return None
    scale = root_scale(diagonal)
    scaled = scale[:, None] * stiffness * scale
    tolerance = EPS * max(8.0, 2.0 * size)
    upper, pivots, rank, _ = lapack.dpstrf(scaled, tol=tolerance)
    order = pivots.astype(np.intp) - 1
    upper = np.triu(upper)[:rank]
    rest = scaled[np.ix_(order[rank:], order[rank:])] - upper[:, rank:].T @ upper[:, rank:]
    if rest.size and np.abs(rest).max() > 64 * tolerance:
        return None
    factor = np.empty((size, rank))
    factor[order] = upper.T
    return factor / scale[:, None], upper, order


def _semidefinite(
    reduced: Condensed, factor: Array, upper: Array, order: NDArray[np.intp]
) -> tuple[Array, Array, Array]:
    size, rank = factor.shape
    mass_scale = root_scale(np.diag(reduced.mass))
    # Soft freedoms first: the triangular solve then adds soft rows to stiff ones, never the reverse.
    soft = np.argsort(np.diag(reduced.stiffness) * mass_scale**2, kind="stable")
    scaled = mass_scale[:, None] * reduced.mass * mass_scale
    lower = np.empty((size, size))
    lower[soft] = scipy.linalg.cholesky(scaled[np.ix_(soft, soft)], lower=True)
    product = scipy.linalg.solve_triangular(lower[soft], (mass_scale[:, None] * factor)[soft], lower=True)
    left, angular = _singular(product)

    def shapes(vectors: Array) -> Array:
        found = np.empty(vectors.shape)
        found[soft] = scipy.linalg.solve_triangular(lower[soft].T, vectors, lower=False)
        return mass_scale[:, None] * found

    stretched = product.T @ left
    # Residual in two norms: with inv(M) it is good for stiff modes, with inv(K) for soft ones.
    residual = np.linalg.norm(product @ stretched - angular**2 * left, axis=0)
    by_gap = _by_gap(residual, np.einsum("ij,ij->j", stretched, stretched), angular**2)
    stiffness_scale = root_scale(np.diag(reduced.stiffness))
    force = stiffness_scale[:, None] * (lower @ left) / mass_scale[:, None]
    inverse = scipy.linalg.solve_triangular(upper[:, :rank].T, force[order[:rank]], lower=True)
    by_stiffness = np.linalg.norm(stretched - angular**2 * inverse, axis=0) / 2
    errors = np.minimum(np.minimum(residual, by_gap) / (2 * angular), by_stiffness)

    null = np.zeros((size, size - rank))
    if rank < size:
        null[order[:rank]] = -scipy.linalg.solve_triangular(upper[:, :rank], upper[:, rank:], lower=False)
        null[order[rank:]] = np.eye(size - rank)
        null *= stiffness_scale[:, None]
        weighted = lower.T @ (null / mass_scale[:, None])
        null = shapes(np.linalg.qr(weighted / np.linalg.norm(weighted, axis=0))[0])
    none = np.zeros(size - rank)
    energy = np.einsum("ij,ij->j", null, reduced.stiffness @ null)
    return (
        np.concatenate([energy, angular**2]),
        np.hstack([null, shapes(left)]),
        np.concatenate([none, errors]),
    )


def _by_gap(residual: Array, quotient: Array, values: Array) -> Array:
    """Error of each eigenvalue from its Rayleigh quotient: residual^2 / gap to the nearest other eigenvalue.

    T. Kato, J. Phys. Soc. Japan 4 (1949) 334-339; G. Temple, Proc. R. Soc. Lond. A 119 (1928) 276-293.
    """
    distance = np.abs(values[:, None] - values)
    np.fill_diagonal(distance, np.inf)
    gap = distance.min(axis=1, initial=np.inf) - residual
    return np.where(gap > 0, residual**2 / np.where(gap > 0, gap, 1.0) + np.abs(quotient - values), np.inf)


def _singular(product: Array) -> tuple[Array, Array]:
    """Left singular vectors (n, r) and values (r,), by the Jacobi method where the values are far apart."""
    if product.shape[1] == 0:
        return product, np.zeros(0)
    left, values, _ = scipy.linalg.svd(product, full_matrices=False)
    if values[0] <= GRADED * values[-1] or len(product) > JACOBI_SIZE:
        # The Rayleigh quotient as a sum of squares: its error is the square of that of the vector.
        return np.asarray(left), np.linalg.norm(product.T @ left, axis=0)
    # joba=2: the matrix is well conditioned but for scaling of rows and columns; jobr=0: full range;
    # jobt=1: don't transpose; jobp=0: don't perturb.
    values, left, _, work, _, info = lapack.dgejsv(product, joba=2, jobu=0, jobv=0, jobr=0, jobt=1, jobp=0)
    if info != 0:
        raise AccuracyError("The Jacobi singular value method did not converge on these matrices.")
    return np.asarray(left[:, : product.shape[1]]), np.asarray(values * (work[0] / work[1]))


def _indefinite(reduced: Condensed) -> tuple[Array, Array, Array]:
    """Through the Cholesky factor of M alone: K has negative eigenvalues (buckled or wrongly signed)."""
    scale = root_scale(np.diag(reduced.mass))
    lower = scipy.linalg.cholesky(scale[:, None] * reduced.mass * scale, lower=True)
    half = scipy.linalg.solve_triangular(lower, scale[:, None] * reduced.stiffness * scale, lower=True)
    whole = scipy.linalg.solve_triangular(lower, half.T, lower=True)
    values, vectors = scipy.linalg.eigh((whole + whole.T) / 2)
    shapes = scale[:, None] * scipy.linalg.solve_triangular(lower.T, vectors, lower=False)
    values = np.einsum("ij,ij->j", shapes, reduced.stiffness @ shapes)
    residual = np.linalg.norm(whole @ vectors - values * vectors, axis=0)
    angular = np.sqrt(np.abs(values))
    bound = residual / (2 * np.where(angular > 0, angular, 1.0))
    return values, shapes, np.minimum(bound, np.sqrt(residual))
