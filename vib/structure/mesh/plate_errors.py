"""The error of shells from the jumps of their stresses, for meshes that are not compared with a finer one.

The forces and moments of the cells around a node are averaged, and the energy of the difference between
averages and cells is taken for the error (O. C. Zienkiewicz, J. Z. Zhu, IJNME 24 (1987) 337-357). The shells
are no pure displacement elements, so that part of their errors cancels: on the plates of the tests that
energy is two to ten times the error of the squared frequency. It is divided by four.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import scipy.sparse as sparse
from numpy.typing import NDArray

from vib.structure.mesh.facing import smooth_corners
from vib.structure.sparsity import Group, Pattern
from vib.system import Array

Numbers = NDArray[np.intp]
OVERSTATED = 4.0
# corners of a triangle seen from points that integrate squares of linear fields exactly
_POINTS = np.array([[2 / 3, 1 / 6, 1 / 6], [1 / 6, 2 / 3, 1 / 6], [1 / 6, 1 / 6, 2 / 3]])


def plate_energies(
    nodes_m: Array, groups: Sequence[Group], pattern: Pattern, shapes: Array
) -> tuple[Array, Array]:
    """Twice the energy of the error, and twice the strain energy, of the shells in each mode; (m,) each.

    Parameters
    ----------
    nodes_m, groups, pattern
        What was assembled; groups of shells, smoothed one by one.
    shapes
        (rows, m) motions of all rows of the pattern.
    """
    error, energy = np.zeros(shapes.shape[1]), np.zeros(shapes.shape[1])
    for group in groups:
        found = _of_group(nodes_m, group, pattern, shapes)
        error += found[0]
        energy += found[1]
    return error / OVERSTATED, energy


def _of_group(nodes_m: Array, group: Group, pattern: Pattern, shapes: Array) -> tuple[Array, Array]:
    cells = group.connectivity
    stresses = group.family.stresses(nodes_m[cells], group.properties, shapes[pattern.freedoms(group)])
    assert stresses.frames is not None
    pieces = np.array(getattr(group.family, "pieces", ((0, 1, 2),)))
    flat = _pieces(group, pieces)
    count = flat.shape[0] // len(pieces)
    frames = stresses.frames.swapaxes(0, 1).reshape(-1, 3, 3)
    weights = stresses.weights.swapaxes(0, 1).ravel()
    values = stresses.values.swapaxes(0, 1).reshape(len(flat), -1, shapes.shape[1])
    compliance = np.tile(stresses.compliance, (len(pieces), 1, 1))[:, :6, :6]
    assert count == len(cells)
    tensors = _to_space(values[:, :6], frames)
    cell = np.repeat(np.arange(len(flat)), 3)
    corner = smooth_corners(flat.ravel(), cell, frames[:, 2]).reshape(flat.shape)
    number = int(corner.max()) + 1
    total = np.bincount(corner.ravel(), np.repeat(weights, 3), number)
    summing = sparse.csr_array(
        (np.repeat(weights, 3), (corner.ravel(), cell)),
        shape=(number, len(flat)),
    )
    mean = (summing @ tensors.reshape(len(flat), -1)) / total[:, None]
    at_corners = mean.reshape(number, *tensors.shape[1:])[corner]
    error = np.zeros(shapes.shape[1])
    for share in _POINTS:
        smooth = _to_cell(np.einsum("k,ek...->e...", share, at_corners), frames)
        error += _energy(smooth - values[:, :6], compliance, weights / 3)
    return error, _energy(values[:, :6], compliance, weights)


def _pieces(group: Group, pieces: Numbers) -> Numbers:
    """The triangles that cells are computed as, piece after piece; the middle of eight nodes is its own."""
    cells = group.connectivity
    if pieces.max() >= cells.shape[1]:
        cells = np.column_stack([cells, cells.max() + 1 + np.arange(len(cells))])
    return np.concatenate([cells[:, piece] for piece in pieces])


def _to_space(values: Array, frames: Array) -> Array:
    """Forces and moments (e, 6, m) along the axes of cells as tensors in space, (e, 2, 3, 3, m)."""
    plane = np.zeros((len(values), 2, 2, 2, values.shape[2]))
    for kind in (0, 1):
        xx, yy, xy = (values[:, 3 * kind + k] for k in range(3))
        plane[:, kind, 0, 0], plane[:, kind, 1, 1] = xx, yy
        plane[:, kind, 0, 1] = plane[:, kind, 1, 0] = xy
    axes = frames[:, :2]
    found: Array = np.einsum("eai,etabm,ebj->etijm", axes, plane, axes, optimize=True)
    return found


def _to_cell(tensors: Array, frames: Array) -> Array:
    axes = frames[:, :2]
    plane = np.einsum("eai,etijm,ebj->etabm", axes, tensors, axes, optimize=True)
    return np.concatenate(
        [np.stack([plane[:, k, 0, 0], plane[:, k, 1, 1], plane[:, k, 0, 1]], axis=1) for k in (0, 1)], axis=1
    )


def _energy(values: Array, compliance: Array, weights: Array) -> Array:
    found: Array = np.einsum("e,esm,est,etm->m", weights, values, compliance, values, optimize=True)
    return found
