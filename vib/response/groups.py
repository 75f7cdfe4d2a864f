"""A first-order model x' = A x taken apart by its eigenvalues, also where they can't be told apart.

Each part is one real eigenvalue, one conjugate pair, or a *cluster*: eigenvalues so close to defective
that their eigenvectors are no basis (a critically damped pair, the double zero of a rigid-body motion).
A cluster keeps its small matrix and moves by the matrix exponential; all others move by exp(lambda t).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
import scipy.linalg
from numpy.typing import NDArray
from scipy.sparse import csr_array
from scipy.sparse.csgraph import connected_components

from vib.response.exponential import EPS, Array, Numbers, balance
from vib.response.transition import Propagator

# Accuracy 1e-10 over 10 eps: as in `transition`, but a little looser, because splitting into parts is worth
# more to the reader than the last two digits.
CONDITION_LIMIT = 1e-10 / (10 * EPS)

Complex = NDArray[np.complex128]


@dataclass(frozen=True, eq=False)
class Part:
    """An invariant part of x' = A x: x_part(t) = factor Re(right exp(block t) left x(0)).

    ``eigenvalues`` (s,); ``block`` (s, s); ``right`` (n, s); ``left`` (s, n). ``factor`` is 2 where the
    part stands for its conjugate too, else 1. ``rounding`` (1/s) is how far rounding moves the eigenvalue.
    """

    eigenvalues: Complex
    block: Numbers
    right: Numbers
    left: Numbers
    factor: float
    rounding: float = 0.0

    @property
    def single(self) -> bool:
        """One eigenvalue (with its conjugate): the part moves by exp(lambda t)."""
        return len(self.eigenvalues) == 1

    @cached_property
    def propagator(self) -> Propagator:
        """exp(block t)."""
        return Propagator(self.block)

    def free(self, start: Numbers, times: Array) -> Numbers:
        """exp(block t) start, (k, s), for coordinates ``start`` (s,) of the part."""
        if self.single:
            found: Numbers = np.exp(np.outer(times, self.eigenvalues)) * start
            return found
        return self.propagator.apply(start, times)


@dataclass(frozen=True, eq=False)
class Parts:
    """All parts of A, slowest first, and the condition number of their bases."""

    parts: tuple[Part, ...]
    condition: float

    @property
    def method(self) -> str:
        """How the parts move in time."""
        clusters = sum(not part.single for part in self.parts)
        if not clusters:
            return "eigenvalues"
        if clusters == len(self.parts):
            return "matrix exponential"
        return "eigenvalues, with the matrix exponential where they cannot be told apart"


def take_apart(matrix: Array, limit: float = CONDITION_LIMIT) -> Parts:
    """Split A (n, n), 1/s, into its parts.

    Uncoupled states are split first, exactly. Within a coupled set the eigenvalues stand alone if the
    condition number of their unit eigenvectors is at most ``limit``; otherwise close ones are gathered
    into clusters, as few as keep the bases below the limit.

    References
    ----------
    C. A. Bavely, G. W. Stewart, SIAM J. Numer. Anal. 16 (1979) 359-367 (block diagonalisation with a bound
    on the condition); the gathering by distance is ours.
    """
    n = matrix.shape[0]
    _, labels = connected_components(csr_array(matrix != 0), directed=True, connection="weak")
    found: list[Part] = []
    largest, smallest = 1.0, 1.0
    for label in np.unique(labels):
        own = np.flatnonzero(labels == label)
        balanced, scale = balance(matrix[np.ix_(own, own)])
        parts, stretch = _split(balanced, limit)
        largest, smallest = max(largest, stretch[0]), min(smallest, stretch[1])
        rounding = 16 * EPS * float(np.linalg.norm(balanced, 1))
        for part in parts:
            right = np.zeros((n, part.right.shape[1]), part.right.dtype)
            left = np.zeros((part.left.shape[0], n), part.left.dtype)
            right[own] = scale[:, None] * part.right
            left[:, own] = part.left / scale
            found.append(Part(part.eigenvalues, part.block, right, left, part.factor, rounding))
    found.sort(key=lambda part: (abs(part.eigenvalues).min(), part.eigenvalues[0].imag))
    return Parts(tuple(found), largest / smallest)


def _split(matrix: Array, limit: float) -> tuple[list[Part], tuple[float, float]]:
    values, vectors = np.linalg.eig(matrix)
    n = len(values)
    tried = -1
    for gap in [0.0, *(float(abs(values).max()) * 10.0 ** np.arange(-15, 0.1))]:
        labels = _linked(values, gap)
        if labels.max() == tried:
            continue
        tried = int(labels.max())
        parts = _parts(matrix, values, vectors, labels)
        if parts is None:
            continue
        # [v, conj v] = sqrt(2) [Re v, Im v] U with U unitary: the same singular values in real arithmetic
        basis = np.hstack(
            [
                part.right.real
                if part.factor == 1
                else np.sqrt(2) * np.hstack([part.right.real, part.right.imag])
                for part in parts
            ]
        )
        lengths = np.linalg.svd(basis, compute_uv=False)
        if lengths[-1] > 0 and lengths[0] / lengths[-1] * max(1.0, _residual(matrix, parts)) <= limit:
            return _with_left(parts, basis), (float(lengths[0]), float(lengths[-1]))
    whole = Part(values.astype(np.complex128), matrix, np.eye(n), np.eye(n), 1.0)
    return [whole], (1.0, 1.0)


def _residual(matrix: Array, parts: list[Part]) -> float:
    """How badly the bases are invariant, in units of ten roundings of the matrix."""
    moved = matrix @ np.hstack([part.right for part in parts])
    kept = np.hstack([part.right @ part.block for part in parts])
    size = 10 * len(matrix) * EPS * max(float(np.linalg.norm(matrix, 1)), float(np.finfo(float).tiny))
    return float(np.abs(moved - kept).max(initial=0.0)) / size


def _linked(values: Numbers, gap: float) -> NDArray[np.int64]:
    """A label per eigenvalue: the same for those linked by steps of at most ``gap``; none for gap 0."""
    if gap == 0:
        return np.arange(len(values))
    near = np.abs(values[:, None] - values[None, :]) <= gap
    labels: NDArray[np.int64] = connected_components(csr_array(near), directed=False)[1].astype(np.int64)
    return labels


def _parts(matrix: Array, values: Numbers, vectors: Numbers, labels: NDArray[np.int64]) -> list[Part] | None:
    """Parts with unit right vectors, orthonormal in a cluster; None if a cluster can't be isolated."""
    empty = np.zeros((0, len(values)))
    parts = []
    for label in np.unique(labels):
        own = labels == label
        inside = values[own].astype(np.complex128)
        mirrored = bool(inside.imag.min() < 0 < inside.imag.max()) or not inside.imag.any()
        if not mirrored and inside.imag.min() < 0:
            continue  # the conjugate cluster stands for it
        factor = 1.0 if mirrored else 2.0
        if own.sum() == 1:
            vector = vectors[:, own]
            vector = vector.real / np.linalg.norm(vector.real) if factor == 1 else vector
            parts.append(Part(inside, np.diag(inside), vector, empty, factor))
            continue
        basis = _invariant_basis(matrix, inside, values[~own])
        if basis is None:
            return None
        if mirrored:  # a real cluster has a real basis
            spread = np.hstack([basis.real, basis.imag])
            basis = np.linalg.svd(spread, full_matrices=False)[0][:, : len(inside)]
        parts.append(Part(inside, basis.conj().T @ matrix @ basis, basis, empty, factor))
    return parts


def _invariant_basis(matrix: Array, inside: Complex, outside: Numbers) -> Numbers | None:
    """Orthonormal basis of the invariant subspace of the eigenvalues ``inside`` (ordered Schur form)."""

    def belongs(value: complex) -> bool:
        return not outside.size or bool(np.abs(inside - value).min() < np.abs(outside - value).min())

    try:
        _, basis, count = scipy.linalg.schur(matrix.astype(np.complex128), output="complex", sort=belongs)
    except np.linalg.LinAlgError:  # the reordering failed: eigenvalues too close to be told apart
        return None
    return basis[:, : len(inside)] if count == len(inside) else None


def _with_left(parts: list[Part], basis: Array) -> list[Part]:
    inverse = np.linalg.inv(basis)
    finished, row = [], 0
    for part in parts:
        size = part.right.shape[1]
        left = inverse[row : row + size]
        if part.factor == 2:
            left = (left - 1j * inverse[row + size : row + 2 * size]) / np.sqrt(2)
        row += size * int(part.factor)
        finished.append(Part(part.eigenvalues, part.block, part.right, left, part.factor))
    return finished
