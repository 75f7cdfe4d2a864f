"""Transmission zeros of x' = A x + B u, y = C x + D u, the infinite ones removed before any is computed."""

from __future__ import annotations

import numpy as np
import scipy.linalg
from numpy.typing import NDArray

from vib.errors import AccuracyError, ModelError

Array = NDArray[np.float64]
EPS = float(np.finfo(float).eps)
Zeros = NDArray[np.complex128]
_AGREEMENT = 1e-5
_SLACK = 1e3  # roundings of the largest entry, below which a singular value counts as zero


def transmission_zeros(a: Array, b: Array, c: Array, d: Array) -> NDArray[np.complex128]:
    """Finite values s at which [[A - s I, B], [C, D]] loses rank, (k,) complex, 1/s, by size.

    Rows and columns that stand for zeros at infinity are split off by orthogonal transformations until D is
    square and regular; the rest is a generalised eigenproblem with finite eigenvalues only.

    Parameters
    ----------
    a, b, c, d
        (s, s), (s, i), (o, s), (o, i); as many inputs as outputs.

    Raises
    ------
    ModelError
        Not as many inputs as outputs.
    AccuracyError
        The outputs do not depend on each input by itself, so that every s is a zero; or the zeros of the
        transposed system, which are the same, come out differently (zeros of high multiplicity or next to
        infinite ones): ``partial`` holds what was found.

    References
    ----------
    A. Emami-Naeini, P. Van Dooren, Automatica 18 (1982) 415-430, doi:10.1016/0005-1098(82)90070-X, the
    reduction (its second pass is for systems that are not square).
    """
    if b.shape[1] != c.shape[0]:
        raise ModelError(
            f"zeros: as many inputs as outputs are needed, got {b.shape[1]} and {c.shape[0]}; choose the "
            "inputs and outputs of the state space"
        )
    if not b.shape[1]:
        return np.zeros(0, np.complex128)
    a, b, c, d = _scaled(a, b, c, d)
    size = float(np.abs(a).max()) or 1.0
    found, again = _finite_zeros(a, b, c, d), _finite_zeros(a.T, c.T, b.T, d.T)
    if len(found) != len(again) or not _same(found, again, size):
        raise AccuracyError(
            "zeros: they are so sensitive that rounding decides where and how many they are (zeros of high "
            "multiplicity, or next to infinite ones); choose inputs and outputs closer together, or read the "
            "antiresonances off the frequency response",
            partial=found,
        )
    return found


def _same(found: Zeros, again: Zeros, size: float) -> bool:
    """Whether each zero has its own partner, near in relation to itself and to the system's rates."""
    left = list(again)
    for zero in found:
        gaps = np.abs(np.array(left) - zero)
        nearest = int(np.argmin(gaps))
        if gaps[nearest] > _AGREEMENT * max(abs(zero), 1e-2 * size):
            return False
        left.pop(nearest)
    return True


def _finite_zeros(a: Array, b: Array, c: Array, d: Array) -> Zeros:
    slack = _SLACK * EPS * len(a)
    a, b, c, d = _reduce(a, b, c, d, slack)
    if c.shape[0] != b.shape[1]:  # the rows left are as many as the transfer matrix has rank
        raise AccuracyError("zeros: the outputs do not depend on each input by itself, so every s is a zero")
    if not len(a):
        return np.zeros(0, np.complex128)
    size = len(a)
    # columns turned so that [C D] becomes [0 R]: what is left is a pencil of the size of A
    turned = scipy.linalg.qr(np.hstack([c, d]).T[::-1], mode="full")[0][::-1, ::-1]
    kernel = turned[:, :size]
    found = scipy.linalg.eigvals(np.hstack([a, b]) @ kernel, kernel[:size])
    found = np.asarray(found, np.complex128)
    found = found[np.isfinite(found)]
    return np.asarray(found[np.lexsort((found.imag, np.abs(found)))])


def _scaled(a: Array, b: Array, c: Array, d: Array) -> tuple[Array, Array, Array, Array]:
    """States, inputs and outputs in units in which their entries are of like size."""
    (gebal,) = scipy.linalg.get_lapack_funcs(("gebal",), (a,))
    balanced, _, _, scale, _ = gebal(a, scale=1, permute=0)
    b, c = b / scale[:, None], c * scale
    size = np.abs(balanced).max() or 1.0
    inward = np.abs(np.vstack([b, d])).max(axis=0)
    inward = np.where(inward > 0, inward, 1.0)
    b, d = b * (size / inward), d * (size / inward)
    outward = np.abs(np.hstack([c, d])).max(axis=1)[:, None]
    outward = np.where(outward > 0, outward, 1.0) / size
    return balanced, b, c / outward, d / outward


def _reduce(a: Array, b: Array, c: Array, d: Array, slack: float) -> tuple[Array, Array, Array, Array]:
    """Until D has full row rank: outputs without direct input become conditions on the states."""
    while c.shape[0]:
        left, values, _ = _singular(d)
        whole = np.vstack([np.hstack([a, b]), np.hstack([c, d])])
        size = float(np.abs(whole).max(initial=0.0))
        rank = int((values > slack * size).sum())
        if rank == c.shape[0]:
            break
        c, d = left.T @ c, left.T @ d
        d[rank:] = 0.0
        silent = c[rank:]
        _, lengths, right = _singular(silent)
        seen = int((lengths > slack * size).sum())
        if seen == 0:
            c, d = c[:rank], d[:rank]
            break
        # states in an order in which the silent outputs see the last ones only, which therefore must be 0
        basis = np.vstack([right[seen:], right[:seen]]).T
        a, b, c = basis.T @ a @ basis, basis.T @ b, c @ basis
        rest = len(a) - seen
        a, b, c, d = (
            a[:rest, :rest],
            b[:rest],
            np.vstack([c[:rank, :rest], a[rest:, :rest]]),
            np.vstack([d[:rank], b[rest:]]),
        )
    return a, b, c, d


def _singular(matrix: Array) -> tuple[Array, Array, Array]:
    """The singular value decomposition, also of a matrix without rows or columns."""
    if not matrix.size:
        return np.eye(matrix.shape[0]), np.zeros(0), np.eye(matrix.shape[1])
    left, values, right = scipy.linalg.svd(matrix, full_matrices=True)
    return left, values, right
