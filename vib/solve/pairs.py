"""Eigenvalues with right and left eigenvectors of a quadratic: polished, judged, and put in order.

Error bound and condition number: first-order perturbation of y*(l^2 M + l C + K)x = 0 (F. Tisseur, Linear
Algebra Appl. 309 (2000) 339-361), in the energy norm, so that they do not depend on units.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from vib.solve.damped import Complex, Damped, order_modes
from vib.solve.undamped import EPS, Array, Matrix


@dataclass(frozen=True, eq=False)
class Quadratic:
    """Coefficients in some coordinates; ``linear`` includes gyroscopic terms.

    ``slack`` (n,) is the uncertainty of the diagonal of ``constant`` that came with the coordinates.
    ``dual_norm`` gives for forces (n, k) their squared size (k,) in the inverse of a fixed positive matrix
    and ``norm`` the size of displacements in that matrix; None: the diagonals of the coefficients.
    """

    mass: Matrix
    linear: Matrix
    constant: Matrix
    slack: Array
    norm: Callable[[Complex], Array] | None = None
    dual_norm: Callable[[Complex], Array] | None = None


@dataclass(frozen=True, eq=False)
class Pairs:
    """Eigenvalues (m,), right and left eigenvectors (n, m); movement and condition once judged."""

    values: Complex
    shapes: Complex
    duals: Complex
    movement: Array
    condition: Array
    undamped: Array

    @staticmethod
    def found(values: Complex, shapes: Complex, duals: Complex) -> Pairs:
        """Pairs that were not judged yet."""
        nothing = np.zeros(len(values))
        return Pairs(np.asarray(values, complex), shapes, duals, nothing, nothing, nothing)

    @staticmethod
    def none(size: int) -> Pairs:
        """No pairs at all."""
        empty = np.zeros((size, 0), complex)
        return Pairs.found(np.zeros(0, complex), empty, empty)

    def take(self, chosen: np.ndarray[tuple[int], np.dtype[np.intp]]) -> Pairs:
        """Some of the pairs, in the order given."""
        return Pairs(
            self.values[chosen],
            self.shapes[:, chosen],
            self.duals[:, chosen],
            self.movement[chosen],
            self.condition[chosen],
            self.undamped[chosen],
        )


def improve(quadratic: Quadratic, pairs: Pairs, *, passive: bool) -> Pairs:
    """Two Newton steps on y*(l^2 M + l C + K)x = 0 for each eigenvalue, then its error and condition.

    ``passive``: nothing in the matrices can feed energy in, so that a real part that is positive within its
    error is round-off and becomes zero. A pair whose imaginary part is within its error becomes the two
    equal real eigenvalues of critical damping.
    """
    if not len(pairs.values):
        return pairs
    x, y = pairs.shapes, _matched(quadratic, pairs)
    on_mass, on_linear, on_constant = (
        matrix @ x for matrix in (quadratic.mass, quadratic.linear, quadratic.constant)
    )
    m, c, k = (np.einsum("ij,ij->j", y.conj(), acted) for acted in (on_mass, on_linear, on_constant))
    values = pairs.values
    for _ in range(2):
        slope = 2 * values * m + c
        step = (values**2 * m + values * c + k) / np.where(slope == 0, np.inf, slope)
        step = np.where(pairs.values.imag == 0, step.real, step)
        values = values - np.where(np.abs(step) < 1e-3 * np.abs(values), step, 0.0)
    slope = np.abs(2 * values * m + c)
    residual = values**2 * on_mass + values * on_linear + on_constant
    size = np.abs(values)
    elastic, inertial = (np.abs(np.einsum("ij,ij->j", x.conj(), acted)) for acted in (on_constant, on_mass))
    elastic_dual = np.abs(np.einsum("ij,ij->j", y.conj(), quadratic.constant @ y))
    inertial_dual = np.abs(np.einsum("ij,ij->j", y.conj(), quadratic.mass @ y))
    safe = np.where(slope == 0, np.finfo(float).tiny, slope)
    energies = (elastic + size**2 * inertial) * (elastic_dual / size**2 + inertial_dual)
    condition = np.maximum(np.sqrt(energies) / safe, 1.0)
    movement = (_dual_size(quadratic, y, residual, size) + _rounding(quadratic, x, y, size)) / safe
    gaps = _gaps(values)
    movement = np.where(movement > gaps / 4, movement + gaps, movement)
    undamped = np.sqrt(elastic / np.where(inertial > 0, inertial, np.inf))
    values = np.where(passive & (values.real > 0) & (values.real <= movement), 1j * values.imag, values)
    return _critical(replace(pairs, values=values, movement=movement, condition=condition, undamped=undamped))


def _matched(quadratic: Quadratic, pairs: Pairs) -> Complex:
    """Left vectors of equal eigenvalues turned so that each is bi-orthogonal to the other right vectors."""
    values, duals = pairs.values, pairs.duals.copy()
    near = np.abs(values[:, None] - values) <= 1e-8 * np.abs(values)
    for index in np.flatnonzero(near.sum(axis=1) > 1):
        group = np.flatnonzero(near[index])
        if group[0] != index:
            continue
        right, left = pairs.shapes[:, group], duals[:, group]
        inner = left.conj().T @ (2 * values[index] * (quadratic.mass @ right) + quadratic.linear @ right)
        scale = np.sqrt(np.abs(inner).max(axis=1)[:, None] * np.abs(inner).max(axis=0))
        sizes = np.linalg.svd(inner / np.where(scale > 0, scale, 1.0), compute_uv=False)
        if (
            sizes[-1] > 1e-6 * sizes[0]
        ):  # else the eigenvalue is (nearly) defective, and the bound shall say so
            duals[:, group] = left @ np.linalg.inv(inner).conj().T
    return duals


def _dual_size(quadratic: Quadratic, y: Complex, residual: Complex, size: Array) -> Array:
    """|y*r| at most, by Cauchy and Schwarz in the norm of an energy."""
    if quadratic.norm is not None and quadratic.dual_norm is not None:
        return np.asarray(np.sqrt(quadratic.norm(y) * quadratic.dual_norm(residual)))
    energy = np.abs(quadratic.constant.diagonal())[:, None] + size**2 * quadratic.mass.diagonal()[:, None]
    energy = energy + size * np.abs(quadratic.linear.diagonal())[:, None]
    floor = np.finfo(float).tiny
    energy = np.where(energy > floor, energy, floor)
    left = np.sum(np.abs(y) ** 2 * energy, axis=0)
    return np.asarray(np.sqrt(left * np.sum(np.abs(residual) ** 2 / energy, axis=0)))


def _rounding(quadratic: Quadratic, x: Complex, y: Complex, size: Array) -> Array:
    """|y|'dP|x| for coefficients that are off by a few round-off units in every entry, and by the slack."""
    there, back = np.abs(x), np.abs(y)
    terms = abs(quadratic.constant) @ there + size * (abs(quadratic.linear) @ there)
    terms = terms + size**2 * (abs(quadratic.mass) @ there)
    return np.asarray(np.einsum("ij,ij->j", back, 4 * EPS * terms + quadratic.slack[:, None] * there))


def _gaps(values: Complex) -> Array:
    """Distance of each eigenvalue from the nearest other one, conjugates included."""
    every = np.concatenate([values, values[values.imag > 0].conj()])
    distance = np.abs(values[:, None] - every)
    distance[np.arange(len(values)), np.arange(len(values))] = np.inf
    return np.asarray(distance.min(axis=1))


def _critical(pairs: Pairs) -> Pairs:
    """A pair that is real within its error becomes two equal real eigenvalues."""
    double = np.flatnonzero((pairs.values.imag > 0) & (pairs.values.imag <= pairs.movement))
    if not len(double):
        return pairs
    values = pairs.values.copy()
    values[double] = values[double].real
    order = np.concatenate([np.arange(len(values)), double])
    return replace(pairs, values=values).take(order)


def damped_from_pairs(
    pairs: Pairs, still: Array, mass: Matrix, *, complete: bool, certified: float | None = None
) -> Damped:
    """Order the pairs behind the rigid-body motions ``still`` (n, z) and scale all shapes."""
    rigid = still.shape[1]
    nothing = np.zeros(rigid)
    values = np.concatenate([nothing.astype(complex), pairs.values])
    order = order_modes(values, np.arange(len(values)) < rigid)
    movement = np.concatenate([nothing, pairs.movement])[order]
    return Damped(
        values=values[order],
        shapes=normalised(np.hstack([still.astype(complex), pairs.shapes])[:, order], mass),
        errors=movement,
        movement=movement,
        condition=np.concatenate([nothing + 1, pairs.condition])[order],
        undamped=np.concatenate([nothing, pairs.undamped])[order],
        rigid=rigid,
        proportional=False,
        complete=complete,
        certified=certified,
    )


def normalised(shapes: Complex, mass: Matrix) -> Complex:
    """Unit modal mass (or unit largest component where a shape moves no mass), largest component real."""
    if not shapes.shape[1]:
        return shapes
    largest = np.argmax(np.abs(shapes), axis=0)
    peak = shapes[largest, np.arange(shapes.shape[1])]
    turned = shapes / np.where(peak == 0, 1.0, peak)
    modal = np.einsum("ij,ij->j", turned.conj(), mass @ turned).real
    terms = np.einsum("ij,ij->j", np.abs(turned), abs(mass) @ np.abs(turned))
    return turned / np.where(modal > 256 * EPS * terms, np.sqrt(np.maximum(modal, 0.0)), 1.0)
