"""What every damped solver returns; eigenvalues of proportionally damped modes; quality of an eigenpair."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from vib.solve.damping import ModalDamping
from vib.solve.undamped import EPS, Array

Complex = NDArray[np.complex128]
CRITICAL = 64 * EPS  # relative gap between (d/2)^2 and w^2 that rounding of either can make


@dataclass(frozen=True, eq=False)
class Damped:
    """Solutions of (l^2 M + l (C + G) + K) x = 0, one of each conjugate pair, by magnitude, rigid first.

    ``values`` (m,) complex, 1/s; ``shapes`` (n, m), real where ``proportional``; ``errors`` (m,) bound the
    error of abs(value), ``movement`` (m,) that of the value itself, 1/s; ``condition`` (m,); ``undamped``
    (m,) angular frequency without damping, NaN for a lag without mass; ``certified`` as in
    `Undamped`, in 1/s; ``growing``: an eigenvalue beyond these that grows, where one was met.
    """

    values: Complex
    shapes: NDArray[Any]
    errors: Array
    movement: Array
    condition: Array
    undamped: Array
    rigid: int
    proportional: bool
    complete: bool
    certified: float | None = None
    growing: complex | None = None


def order_modes(values: Complex, rigid: NDArray[np.bool_]) -> NDArray[np.intp]:
    """Rigid-body modes first, then by magnitude; of two equal ones the slower decay first."""
    return np.lexsort((-values.real, np.abs(values), ~rigid))


def proportional_modes(damping: ModalDamping, massless: Array) -> Damped:
    """Eigenvalues of l^2 + d l + w^2 = 0 for each undamped mode.

    Real ones stand alone: an overdamped mode gives two with the same shape, a critically damped one two
    equal ones, a rigid body with damping to ground one at 0 and one at -d. With damping a M + b K each
    motion of ``massless`` (n, z), which has stiffness and no mass, adds one at -1 / b.
    """
    undamped = damping.undamped
    values: list[complex] = []
    movement: list[float] = []
    sizes: list[float] = []
    source: list[int] = []
    for index, (square, rate) in enumerate(
        zip(undamped.values.tolist(), damping.total.tolist(), strict=True)
    ):
        error = 2 * float(undamped.angular[index] * undamped.errors[index])
        for value in _roots(square, rate):
            moved, sized = _movement(value, square, rate, error, float(undamped.errors[index]))
            values.append(value)
            movement.append(moved)
            # of a rigid-body mode the frequency that round-off may hide, which moves no other figure
            sizes.append(sized if value else float(undamped.errors[index]))
            source.append(index)
    shapes, squares, rates = undamped.shapes, undamped.values, damping.total
    if massless.shape[1] and damping.rayleigh is not None and damping.rayleigh[1] > 0:
        pull, number = 1 / damping.rayleigh[1], massless.shape[1]
        values += [complex(-pull)] * number
        movement += [16 * EPS * pull] * number
        sizes += [16 * EPS * pull] * number
        source += list(range(len(squares), len(squares) + number))
        shapes = np.hstack([shapes, massless / np.abs(massless).max(axis=0)])
        squares, rates = (
            np.append(squares, np.full(number, np.nan)),
            np.append(rates, np.full(number, np.nan)),
        )
    found, origin = np.array(values, dtype=np.complex128), np.array(source, dtype=np.intp)
    order = order_modes(found, (found == 0) & (origin < undamped.rigid))
    found, origin = found[order], origin[order]
    return Damped(
        values=found,
        shapes=shapes[:, origin],
        errors=np.array(sizes)[order],
        movement=np.array(movement)[order],
        condition=_condition(found, squares[origin], rates[origin]),
        undamped=np.sqrt(np.abs(squares))[origin],
        rigid=undamped.rigid,
        proportional=True,
        complete=undamped.complete,
        certified=_certified(damping),
    )


def _roots(square: float, rate: float) -> list[complex]:
    """Roots of l^2 + rate l + square, one of each conjugate pair, without cancellation."""
    if square == 0:
        return [0j] if rate == 0 else [0j, complex(-rate)]
    half = rate / 2
    excess = half * half - square
    if abs(excess) <= CRITICAL * abs(square):
        return [complex(-half), complex(-half)]
    if excess < 0:
        return [complex(0.0 - half, np.sqrt(-excess))]
    far = -(half + np.copysign(np.sqrt(excess), half))
    return [complex(far), complex(square / far)]


def _movement(
    value: complex, square: float, rate: float, error: float, angular: float
) -> tuple[float, float]:
    """Error bounds of a root and of its magnitude for errors in w^2 and round-off in the rate."""
    if value == 0:
        return 0.0, 0.0
    change = error + abs(value) * 16 * EPS * abs(rate)
    slope = abs(2 * value + rate)
    moved = float(np.sqrt(change)) if slope * slope <= 4 * change else 2 * change / slope
    return moved, angular if value.imag else moved  # the magnitude of a pair is w, whatever the damping


def _condition(values: Complex, squares: Array, rates: Array) -> Array:
    """Condition number in the energy norm, (w^2 + |l|^2) / (|l| |2 l + d|): 1 undamped, infinite critical."""
    size = np.abs(values)
    slope = size * np.abs(2 * values + rates)
    simple = (size == 0) | np.isnan(rates)  # rigid-body motions, and first-order lags
    known = slope > EPS * size**2
    ratio = (np.abs(squares) + size**2) / np.where(known, slope, 1.0)
    return np.where(simple, 1.0, np.where(known, np.maximum(ratio, 1.0), np.inf))


def _certified(damping: ModalDamping) -> float | None:
    """Below which magnitude no eigenvalue of a mode that was not computed can lie.

    A pair has magnitude w. The slow eigenvalue of an overdamped mode is at least w^2 / d, and with
    d = a + b w^2 + 2 ratio w that grows with w, so its value at the edge of what was computed bounds it.
    """
    reach = damping.undamped.certified
    if damping.undamped.complete or not reach:
        return reach
    if damping.rayleigh is None:
        return None
    mass_part, stiffness_part = damping.rayleigh
    most = max(mass_part, 0.0) + max(stiffness_part, 0.0) * reach**2 + 2 * damping.law_limit * reach
    return reach if most <= reach else reach**2 / most
