"""Checks of the matrices of a system, by name, before anything is computed with them.

Each fault is one sentence with row and column (counted from 1) and the freedoms they belong to. Nothing is
repaired: what passes is used as it came.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
import scipy.linalg
import scipy.sparse as sparse
import scipy.sparse.linalg as sparse_linalg
from numpy.typing import NDArray

from vib.errors import MatrixError, ShapeError

Array = NDArray[np.float64]
Matrix = Any

# Assembling a matrix and turning it into other axes rounds each entry a few dozen times; what differs by more
# than this part of the diagonal was not meant to be symmetric.
ROUND_OFF = 1e-12
_LANCZOS_STEPS, _LANCZOS_LOOK = 400, 25  # most products before a factorisation is taken after all
DENSE_LIMIT = 100  # up to this size a sparse mass matrix is checked by a dense factorisation


def as_matrix(name: str, value: object, size: int | None) -> Matrix:
    """A float64 copy of a matrix: a dense read-only array or a csr_array.

    Raises
    ------
    ShapeError
        Not square, or not ``size`` rows.
    MatrixError
        Complex, not numbers, or not finite.
    """
    if sparse.issparse(value):
        given: Any = value
        if given.dtype.kind not in "fiub":
            raise MatrixError(f"{name}: real numbers are needed, got entries of type {given.dtype}.")
        matrix: Any = sparse.csr_array(given, dtype=np.float64, copy=True)
        matrix.sum_duplicates()
    else:
        try:
            given = np.asarray(value)
            if given.dtype.kind not in "fiub":
                given = given.astype(np.float64) if given.dtype.kind == "O" else np.array(["?"])
            matrix = np.array(given, dtype=np.float64)
        except (TypeError, ValueError) as problem:
            raise MatrixError(f"{name}: real numbers in rows of equal length are needed.") from problem
        matrix.setflags(write=False)
    shape = tuple(matrix.shape)
    if len(shape) != 2 or shape[0] != shape[1] or shape[0] == 0 or (size is not None and shape[0] != size):
        expected = (
            (size, size) if size is not None else (shape[0], shape[0]) if shape and shape[0] else (1, 1)
        )
        raise ShapeError(
            name, expected=expected, got=shape, hint="One row and column per freedom of the mass."
        )
    return matrix


def check_finite(name: str, matrix: Matrix, names: Sequence[str]) -> None:
    """Raise MatrixError at the first entry that is not finite."""
    rows, columns, values = entries(matrix)
    bad = np.flatnonzero(~np.isfinite(values))
    if bad.size:
        row, column = int(rows[bad[0]]), int(columns[bad[0]])
        raise MatrixError(
            f"{name}: {float(values[bad[0]])!r} at {_spot(row, column, names)}; every entry must be finite."
        )


def check_symmetric(name: str, matrix: Matrix, names: Sequence[str], *, skew: bool = False) -> None:
    """Raise MatrixError where a matrix differs from its transpose (skew: its negative) beyond round-off."""
    other = -matrix.T if skew else matrix.T
    difference = abs(matrix - other)
    if not difference.max():
        return
    scale = np.sqrt(np.abs(matrix.diagonal()))
    rows, columns, gaps = entries(sparse.csr_array(difference))
    mirrored = _values_at(matrix, columns, rows)
    here = _values_at(matrix, rows, columns)
    allowed = ROUND_OFF * np.maximum(scale[rows] * scale[columns], np.maximum(np.abs(here), np.abs(mirrored)))
    if skew:  # the diagonal itself is the fault there, so it can't be the yardstick
        allowed = ROUND_OFF * np.where(rows == columns, 0.0, np.maximum(np.abs(here), np.abs(mirrored)))
    excess = np.where(gaps > allowed, gaps, 0.0)
    if not excess.any():
        return
    worst = int(np.argmax(excess / np.maximum(allowed, np.finfo(float).tiny)))
    row, column = sorted((int(rows[worst]), int(columns[worst])))
    upper, lower = float(matrix[row, column]), float(matrix[column, row])
    if skew:
        advice = "It must be skew-symmetric: the entry below the diagonal is minus the one above, 0 on it."
    elif name == "mass":
        advice = "It must be symmetric; enter both halves alike."
    else:
        advice = "Enter both halves alike, or declare circulatory forces with unsymmetric=True."
    raise MatrixError(f"{name}: {upper!r} at {_spot(row, column, names)} but {lower!r} mirrored. {advice}")


def check_carried(matrices: Sequence[Matrix], names: Sequence[str]) -> None:
    """Raise MatrixError at a freedom that no matrix has an entry for."""
    used = np.zeros(matrices[0].shape[0], dtype=bool)
    for matrix in matrices:
        rows, columns, values = entries(matrix)
        used[rows[values != 0]] = True
        used[columns[values != 0]] = True
    empty = np.flatnonzero(~used)
    if empty.size:
        row = int(empty[0])
        more = f" ({empty.size - 1} more like it)" if empty.size > 1 else ""
        raise MatrixError(
            f"mass and stiffness: {_spot(row, row, names)} and the whole of that row are zero in both{more}. "
            "A freedom with neither mass nor stiffness has no motion; give it either, or leave it out."
        )


def check_mass(mass: Matrix, names: Sequence[str]) -> None:
    """Raise MatrixError where the mass matrix is not positive semi-definite beyond round-off."""
    diagonal = np.asarray(mass.diagonal())
    if (diagonal < 0).any():
        row = int(np.argmin(diagonal))
        raise MatrixError(
            f"mass: {float(diagonal[row])!r} at {_spot(row, row, names)}; a mass can't be negative."
        )
    rows, columns, values = entries(mass)
    beside = (rows != columns) & (values != 0)
    if not beside.any():
        return
    rows, columns, values = rows[beside], columns[beside], values[beside]
    excess = np.abs(values) - np.sqrt(diagonal[rows]) * np.sqrt(diagonal[columns]) * (1 + ROUND_OFF)
    if (excess > 0).any():
        worst = int(np.argmax(excess))
        raise MatrixError(
            f"mass: {float(values[worst])!r} at {_spot(int(rows[worst]), int(columns[worst]), names)} "
            f"outweighs the masses {diagonal[rows[worst]]:.6g} and {diagonal[columns[worst]]:.6g} on the "
            "diagonal, so some motion would have negative kinetic energy (the mass matrix is indefinite)."
        )
    vector = _negative_direction(mass, diagonal)
    if vector is not None:
        row, column = sorted(np.argsort(-np.abs(vector))[:2].tolist())
        raise MatrixError(
            f"mass: indefinite; a motion mostly of {_spot(row, column, names)} has negative kinetic energy."
        )


def _negative_direction(mass: Matrix, diagonal: Array) -> Array | None:
    """A motion with negative kinetic energy beyond round-off, or None."""
    scale = np.where(diagonal > 0, 1 / np.sqrt(np.where(diagonal > 0, diagonal, 1.0)), 0.0)
    size = len(diagonal)
    slack = size * ROUND_OFF
    if size <= DENSE_LIMIT or not sparse.issparse(mass):
        dense = mass.toarray() if sparse.issparse(mass) else mass
        scaled = scale[:, None] * dense * scale
        if scipy.linalg.lapack.dpotrf(scaled + slack * np.eye(size), lower=1)[1] == 0:
            return None
        values, vectors = scipy.linalg.eigh(scaled, subset_by_index=(0, 0))
        return np.asarray(scale * vectors[:, 0]) if values[0] < -slack else None
    heavy = np.flatnonzero(diagonal > 0)  # a row of no mass is a row of zeros: the entries were checked
    plain = sparse.csr_array(mass)[heavy][:, heavy] if len(heavy) < size else sparse.csr_array(mass)
    data = plain.data * np.repeat(scale[heavy], np.diff(plain.indptr)) * scale[heavy][plain.indices]
    scaled = sparse.csr_array((data, plain.indices.copy(), plain.indptr.copy()), shape=plain.shape)
    scaled.eliminate_zeros()
    if _surely_positive(scaled):
        return None
    vector = _negative_by_factor(scaled, slack)
    if vector is None:
        return None
    whole = np.zeros(len(diagonal))
    whole[heavy] = scale[heavy] * vector
    return whole


def _surely_positive(scaled: sparse.csr_array) -> bool:
    """Whether the Lanczos process shows a matrix of unit diagonal to be positive definite; False: not shown.

    From a random start, k steps miss the lowest eigenvalue by more than e times the spread with a chance of
    at most 1.648 sqrt(n) exp(-sqrt(e) (2 k - 1)) (J. Kuczynski, H. Wozniakowski, SIAM J. Matrix Anal. Appl.
    13 (1992) 1094-1122, theorem 4.1), here less than 1e-12. Mass matrices of meshes are well conditioned once
    scaled (A. J. Wathen, IMA J. Numer. Anal. 7 (1987) 449-457), so that a hundred products tell what a
    factorisation would take minutes for.
    """
    size = scaled.shape[0]
    vector = np.random.default_rng(1992).standard_normal(size)
    vector /= np.linalg.norm(vector)
    before, link = np.zeros(size), 0.0
    centres: list[float] = []
    links: list[float] = []
    for step in range(1, _LANCZOS_STEPS + 1):
        image = scaled @ vector - link * before
        centres.append(float(vector @ image))
        image -= centres[-1] * vector
        link = float(np.linalg.norm(image))
        if link <= ROUND_OFF:
            return False  # the start was poor: the other way tells
        if step % _LANCZOS_LOOK == 0:
            values = scipy.linalg.eigvalsh_tridiagonal(centres, links)
            missed = (np.log(1.648e12 * np.sqrt(size)) / (2 * step - 1)) ** 2
            if missed < 0.4 and values[0] > missed * (values[-1] - values[0]) / (1 - 2 * missed):
                return True  # the spread itself is missed at either end
            if values[0] <= 0:
                return False
        links.append(link)
        before, vector = vector, image / link
    return False


def _negative_by_factor(scaled: sparse.csr_array, slack: float) -> Array | None:
    """A direction in which a matrix of unit diagonal is negative beyond ``slack``, or None."""
    size = scaled.shape[0]
    shifted = sparse.csc_array(scaled + slack * sparse.eye_array(size))
    factor = sparse_linalg.splu(
        shifted, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options={"SymmetricMode": True}
    )
    if (factor.U.diagonal() > 0).all():  # all pivots positive: positive definite (Sylvester)
        return None
    values, vectors = sparse_linalg.eigsh(scaled, k=1, which="SA", v0=np.ones(size))
    return np.asarray(vectors[:, 0]) if values[0] < -slack else None


def entries(matrix: Matrix) -> tuple[NDArray[np.int64], NDArray[np.int64], Array]:
    """Rows, columns and values of the stored entries (all of them for a dense matrix)."""
    if sparse.issparse(matrix):
        listed = matrix.tocoo()
        return listed.coords[0].astype(np.int64), listed.coords[1].astype(np.int64), np.asarray(listed.data)
    rows, columns = np.indices(matrix.shape).reshape(2, -1)
    return rows, columns, np.ravel(matrix)


def _values_at(matrix: Matrix, rows: NDArray[np.int64], columns: NDArray[np.int64]) -> Array:
    return np.asarray(matrix[rows, columns], dtype=np.float64).ravel()


def _spot(row: int, column: int, names: Sequence[str]) -> str:
    def called(index: int) -> str:
        return "" if names[index] == str(index + 1) else f" ({names[index]})"

    return f"row {row + 1}{called(row)}, column {column + 1}{called(column)}"
