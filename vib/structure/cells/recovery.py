"""Discretisation error of solid meshes, estimated from the stresses of the modes.

Superconvergent patch recovery: around each corner node a polynomial of the order of the displacements is
fitted to the stresses at the points where they are most accurate (O. C. Zienkiewicz, J. Z. Zhu, IJNME 33
(1992) 1331-1364). Inside a cell the polynomials of its corners are blended by the first-order shape functions
(N.-E. Wiberg, F. Abdulwahab, S. Ziukas, IJNME 37 (1994) 3417-3440, blend like this). The energy of the
difference to the mode's own stresses estimates the error; the squared frequency is in error by that share.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import product

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csr_array

from vib.errors import AccuracyError
from vib.structure.cells.family import Array, Numbers
from vib.structure.cells.hexahedron import Hexahedron
from vib.structure.cells.pyramid import Pyramid
from vib.structure.cells.solid import Solid
from vib.structure.cells.tetra import Tetra
from vib.structure.cells.wedge import Wedge
from vib.structure.sparsity import Group, Pattern

_BLENDING: dict[int, Solid] = {4: Tetra(), 5: Pyramid(), 6: Wedge(), 8: Hexahedron()}
_CHUNK = 500
# A fit whose normal equations are worse than this rests on too few or ill-placed points: two by two points a
# layer can't tell a square from a constant, and on distorted cells only just.
_WORST_CONDITION = 1e4
_COMPONENTS = 6


@dataclass(frozen=True, eq=False)
class _Fits:
    """Polynomials about the corner nodes of a group: (v, q, 6 m), their centres, sizes and powers."""

    centres: Array
    sizes: Array
    coefficients: Array
    powers: NDArray[np.intp]
    corner_numbers: Numbers  # (e, corners): the fit that serves at each corner of each cell

    def basis(self, points: Array, vertices: Numbers) -> Array:
        """Monomials (e, p, q) at points (e, p, 3) about one vertex per cell."""
        return _monomials(
            (points - self.centres[vertices, None]) / self.sizes[vertices, None, None], self.powers
        )


def energy_errors(nodes_m: Array, groups: Sequence[Group], pattern: Pattern, shapes: Array) -> Array:
    """Estimated share of the error in each mode's strain energy.

    The relative error of the frequency is half of it: the squared frequency is proportional to the energy.

    Parameters
    ----------
    nodes_m, groups, pattern
        What was assembled; groups of solids only. Stresses are not smoothed across groups.
    shapes
        (n, m) modes on all freedoms of the pattern, held ones zero.

    Returns
    -------
    Array
        (m,), dimensionless.

    Raises
    ------
    AccuracyError
        A group has too few cells for any fit, or consists of shells.
    """
    error, energy = np.zeros(shapes.shape[1]), np.zeros(shapes.shape[1])
    for group in groups:
        if not isinstance(group.family, Solid):
            raise AccuracyError(
                f"The error of {group.family.kind} cells can't be estimated from their stresses."
            )
        fits = _fitted(nodes_m, group, pattern, shapes, group.family)
        for start in range(0, len(group.connectivity), _CHUNK):
            chunk = slice(start, start + _CHUNK)
            found = _chunk_energy(nodes_m, group, pattern, shapes, fits, chunk, group.family)
            error += found[0]
            energy += found[1]
    share: Array = error / np.maximum(energy, np.finfo(float).tiny)
    return share


def _fitted(nodes_m: Array, group: Group, pattern: Pattern, shapes: Array, family: Solid) -> _Fits:
    vertices, corner_numbers = np.unique(group.connectivity[:, : family.corners], return_inverse=True)
    corner_numbers = corner_numbers.reshape(len(group.connectivity), family.corners)
    degree = 1 if family.nodes == family.corners else 2
    powers = np.array([power for power in product(range(degree + 1), repeat=3) if sum(power) <= degree])
    extent = np.ptp(nodes_m[group.connectivity], axis=1).max(axis=1)
    sizes = np.zeros(len(vertices))
    np.maximum.at(sizes, corner_numbers.ravel(), np.repeat(extent, family.corners))
    terms, columns = len(powers), _COMPONENTS * shapes.shape[1]
    fits = _Fits(nodes_m[vertices], sizes, np.zeros((len(vertices), terms, columns)), powers, corner_numbers)
    normal = np.zeros((len(vertices), terms, terms))
    for start in range(0, len(group.connectivity), _CHUNK):
        chunk = slice(start, start + _CHUNK)
        connectivity = group.connectivity[chunk]
        moved = shapes[pattern.freedoms(group, chunk)]
        stresses = family.stresses(nodes_m[connectivity], group.properties.of(chunk), moved)
        values = stresses.values.reshape(*stresses.weights.shape, columns)
        for corner in range(family.corners):
            own = corner_numbers[chunk, corner]
            basis = fits.basis(stresses.points_m, own)
            _add_at(normal, own, basis.swapaxes(1, 2) @ basis)
            _add_at(fits.coefficients, own, basis.swapaxes(1, 2) @ values)
    return _solved(fits, normal, group.family.kind)


def _solved(fits: _Fits, normal: Array, kind: str) -> _Fits:
    """Coefficients by least squares; a corner with too few points borrows within each cell."""
    good = np.linalg.cond(normal) < _WORST_CONDITION
    if not good.any():
        raise AccuracyError(
            f"The {kind} cells are too few to estimate the error of their stresses; divide the mesh finer."
        )
    fits.coefficients[good] = np.linalg.solve(normal[good], fits.coefficients[good])
    lenders = _lenders(fits.centres, fits.corner_numbers, good)
    return _Fits(fits.centres, fits.sizes, fits.coefficients, fits.powers, lenders)


def _lenders(centres: Array, corner_numbers: Numbers, good: NDArray[np.bool_]) -> Numbers:
    """For each corner of each cell, the vertex whose fit serves there: its own or the nearest good one.

    Near and within the cell, because a fit soon goes astray outside its patch.
    """
    places = centres[corner_numbers]
    distance = np.linalg.norm(places[:, :, None] - places[:, None], axis=3)
    distance = np.where(good[corner_numbers][:, None, :], distance, np.inf)
    lenders = np.take_along_axis(corner_numbers, distance.argmin(axis=2), axis=1)
    served = np.isfinite(distance[:, 0].min(axis=1))
    while not served.all():
        lent = np.full(len(centres), -1)
        lent[corner_numbers[served].ravel()] = lenders[served].ravel()
        found = lent[corner_numbers].max(axis=1)
        new = ~served & (found >= 0)
        if not new.any():  # an island of cells without any fit
            new, found = ~served, np.full(len(served), np.flatnonzero(good)[0])
        lenders[new] = found[new, None]
        served = served | new
    return lenders


def _chunk_energy(
    nodes_m: Array,
    group: Group,
    pattern: Pattern,
    shapes: Array,
    fits: _Fits,
    chunk: slice,
    family: Solid,
) -> tuple[Array, Array]:
    """Energy of the error and of the mode itself in some cells, (m,) each."""
    connectivity, rule = group.connectivity[chunk], family.stiffness_rule
    moved = shapes[pattern.freedoms(group, chunk)]
    stresses = family.stresses(nodes_m[connectivity], group.properties.of(chunk), moved, rule)
    blending = _BLENDING[family.corners].shape(rule.points)
    smooth = np.zeros((*stresses.weights.shape, fits.coefficients.shape[2]))
    for corner in range(family.corners):
        own = fits.corner_numbers[chunk, corner]
        smooth += blending[:, corner, None] * (fits.basis(stresses.points_m, own) @ fits.coefficients[own])
    difference = smooth.reshape(stresses.values.shape) - stresses.values
    return _energy(difference, stresses.compliance, stresses.weights), _energy(
        stresses.values, stresses.compliance, stresses.weights
    )


def _energy(values: Array, compliance: Array, weights: Array) -> Array:
    strains = compliance[:, None] @ values
    found: Array = np.einsum("ep,epsm,epsm->m", weights, values, strains, optimize=True)
    return found


def _monomials(places: Array, powers: NDArray[np.intp]) -> Array:
    # products of columns; raising arrays to powers takes ten times as long
    columns: dict[tuple[int, ...], Array] = {(0, 0, 0): np.ones(places.shape[:2])}
    found = np.empty((*places.shape[:2], len(powers)))
    for index in np.argsort(powers.sum(axis=1), kind="stable").tolist():
        power = tuple(powers[index].tolist())
        if power not in columns:
            axis = next(axis for axis in range(3) if power[axis])
            lower = tuple(exponent - (place == axis) for place, exponent in enumerate(power))
            columns[power] = columns[lower] * places[:, :, axis]
        found[:, :, index] = columns[power]
    return found


def _add_at(total: Array, places: Numbers, parts: Array) -> None:
    """Add parts (e, ...) at places (e,) that may repeat."""
    used, row = np.unique(places, return_inverse=True)
    summing = csr_array((np.ones(len(places)), (row, np.arange(len(places)))), shape=(len(used), len(places)))
    total[used] += (summing @ parts.reshape(len(places), -1)).reshape(len(used), *total.shape[1:])
