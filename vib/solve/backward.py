"""Backward error of eigenpairs: how little the matrices must change for a pair to be exact.

|T(s) x| / ((|s|^2 |M| + |s| |C + G| + |K|) |x|) (F. Tisseur, Linear Algebra Appl. 309 (2000) 339-361,
theorem 1), on freedoms scaled to unit stiffness, so that it does not change with units. Dense pairs whose
terms cancel to less than their residual are refined by inverse iteration.
"""

from __future__ import annotations

import numpy as np
import scipy.linalg

from vib.massless import root_scale
from vib.solve.damped import Complex, Damped
from vib.solve.damping import ModalDamping
from vib.solve.undamped import Array, Matrix

ENOUGH = 1e-12  # residual over the largest term of a dense pair
MOST_ROWS = 400  # beyond, a factorisation for each pair takes too long


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


def refined(mass: Array, linear: Array, constant: Array, values: Complex, shapes: Complex) -> Complex:
    """Shapes (n, m) of dense pairs, those whose terms cancel improved by inverse iteration."""
    if len(mass) > MOST_ROWS:
        return shapes
    better = shapes.copy()
    for number, value in enumerate(values.tolist()):
        shape = shapes[:, number]
        off = _cancelled(mass, linear, constant, value, shape)
        if off <= ENOUGH:
            continue
        matrix = value * value * mass + value * linear + constant
        factor, pivots, fault = scipy.linalg.lapack.zgetrf(matrix.astype(complex))
        if fault:
            continue
        right = (2 * value * mass + linear) @ shape
        solved = scipy.linalg.lu_solve((factor, pivots), right.astype(complex), check_finite=False)
        solved = solved / solved[int(np.argmax(np.abs(solved)))]
        if _cancelled(mass, linear, constant, value, solved) < off:
            better[:, number] = solved
    return better


def _cancelled(mass: Array, linear: Array, constant: Array, value: complex, shape: Complex) -> float:
    terms = (value * value * (mass @ shape), value * (linear @ shape), constant @ shape)
    largest = max(float(np.abs(term).max(initial=0.0)) for term in terms)
    return float(np.abs(sum(terms)).max(initial=0.0)) / (largest or 1.0)
