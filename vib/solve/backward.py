"""Backward error of eigenpairs: how little the matrices must change for a pair to be exact.

|T(s) x| / ((|s|^2 |M| + |s| |C + G| + |K|) |x|) (F. Tisseur, Linear Algebra Appl. 309 (2000) 339-361,
theorem 1), on freedoms scaled to unit stiffness, so that it does not change with units.
"""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import scipy.linalg
from numpy.typing import NDArray

from vib.massless import dense, root_scale
from vib.solve.damped import Complex, Damped
from vib.solve.damping import ModalDamping
from vib.solve.pairs import normalised
from vib.solve.undamped import Array, Matrix

ENOUGH = 1e-13  # backward error from which on a pair is improved
CLOSE = 1e-6  # relative distance of eigenvalues whose shapes mix freely
DEFECTIVE = 1e6  # condition number of an eigenvalue that shares its shape with another
MOST_ROWS = 400  # beyond, a factorisation for each pair takes too long
MOST_PAIRS = 60


def backward_errors(
    mass: Matrix, linear: Matrix, stiffness: Matrix, damping: ModalDamping, found: Damped
) -> Array:
    """Backward error (m,) of every pair of a solution, the damping law included as it was used."""
    values, shapes = found.values, found.shapes
    if not len(values):
        return np.zeros(0)
    heavy = mass @ shapes
    force = linear @ shapes + _law_force(mass, damping, found, heavy)
    residual = values**2 * heavy + values * force + stiffness @ shapes
    diagonal = np.asarray(stiffness.diagonal())
    scale = root_scale(np.where(diagonal != 0, diagonal, np.asarray(mass.diagonal())))
    sizes = [_norm(matrix, scale) for matrix in (mass, linear, stiffness)]
    size = np.abs(values)
    whole = size**2 * sizes[0] + size * sizes[1] + sizes[2]
    length = np.linalg.norm(shapes / scale[:, None], axis=0)
    off = np.linalg.norm(residual * scale[:, None], axis=0)
    largest = whole * length
    return np.asarray(off / np.where(largest > 0, largest, 1.0))


def _law_force(mass: Matrix, damping: ModalDamping, found: Damped, heavy: Complex) -> Complex | float:
    rates = 2 * damping.law * damping.undamped.angular
    acted = rates != 0
    if not acted.any():
        return 0.0
    held = mass @ damping.undamped.shapes[:, acted]
    return np.asarray(held @ (rates[acted][:, None] * (held.T @ found.shapes)))


def _norm(matrix: Matrix, scale: Array) -> float:
    """Geometric mean of the largest column and row sums: at least the spectral norm."""
    size = abs(matrix)
    columns = (np.asarray(size.T @ scale).ravel() * scale).max()
    rows = (np.asarray(size @ scale).ravel() * scale).max()
    return float(np.sqrt(columns * rows))


def refined(
    mass: Matrix, linear: Matrix, stiffness: Matrix, damping: ModalDamping, found: Damped
) -> tuple[Damped, Array]:
    """Pairs of a small system, the worst of them improved by inverse iteration, and their backward errors.

    On freedoms scaled to unit stiffness, so that soft parts of a shape beside stiff ones get digits of their
    own. Pairs close to another one are left alone: they would become the same.
    """
    errors = backward_errors(mass, linear, stiffness, damping, found)
    # of a defective eigenvalue both pairs have one shape
    alone = _apart(found.values) | (found.condition > DEFECTIVE)
    poor = np.flatnonzero((errors > ENOUGH) & (np.arange(len(errors)) >= found.rigid) & alone)
    if not len(poor) or mass.shape[0] > MOST_ROWS:
        return found, errors
    poor = poor[np.argsort(-errors[poor])][:MOST_PAIRS]
    m, c, k = dense(mass), dense(linear), dense(stiffness)
    rates = 2 * damping.law * damping.undamped.angular
    if not found.proportional:
        held = m @ damping.undamped.shapes
        c = c + (held * rates) @ held.T
    scale = root_scale(np.where(np.diag(k) != 0, np.diag(k), np.diag(m)))[:, None]
    shapes = found.shapes.copy()
    for number in poor.tolist():
        shape, value = shapes[:, number], complex(found.values[number])
        if not found.proportional:
            matrix, force = value * value * m + value * c + k, 2 * value * (m @ shape) + c @ shape
        elif value.imag > 0:
            matrix, force = k - found.undamped[number] ** 2 * m, m @ shape
        else:
            continue
        rest = shape[:, None] / scale**2
        right = np.hstack([force[:, None] * scale, rest * scale])
        solved = _solved(scale * matrix * scale.T, right)
        if solved is not None:
            shapes[:, number] = _best(matrix, scale, [shape, *(scale * solved).T])
    shapes[:, poor] = _like(normalised(shapes[:, poor], m), found.shapes[:, poor])
    better = replace(found, shapes=shapes)
    after = backward_errors(mass, linear, stiffness, damping, better)
    kept = np.where(after < errors, shapes, found.shapes)
    return replace(found, shapes=kept), np.minimum(after, errors)


def _apart(values: Complex) -> NDArray[np.bool_]:
    distance = np.abs(values[:, None] - values)
    np.fill_diagonal(distance, np.inf)
    return np.asarray(distance.min(axis=1, initial=np.inf) > CLOSE * np.abs(values))


def _solved(matrix: Any, right: Any) -> Any:
    factor, pivots, fault = scipy.linalg.get_lapack_funcs(("getrf",), (matrix,))[0](matrix)
    if fault:
        return None
    with np.errstate(all="ignore"):
        return scipy.linalg.lu_solve((factor, pivots), right, check_finite=False)


def _best(matrix: Any, scale: Array, candidates: list[Any]) -> Any:
    """The shape of least residual for its size, on scaled freedoms."""

    def off(shape: Any) -> float:
        length = float(np.linalg.norm(shape / scale[:, 0]))
        return float(np.linalg.norm((matrix @ shape) * scale[:, 0])) / length if length > 0 else np.inf

    return min((shape for shape in candidates if np.isfinite(shape).all()), key=off)


def _like(shapes: Any, before: Any) -> Any:
    """Real shapes with the sign that they had."""
    if np.iscomplexobj(before):
        return shapes
    return shapes.real * np.where(np.einsum("ij,ij->j", shapes.real, before) < 0, -1.0, 1.0)
