"""How large each kind of force is at a running speed, as a complex factor per multiple of the speed.

A term is Re(factor exp(2 pi i m n t)) along a direction, with m the multiple and n the speed, rev/s; the mark
on the shaft is at its zero at t = 0.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from vib.study.forces import Growth
from vib.study.motions import Crank, Shaking, Strokes, piston_orders

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]
Strength = Callable[[Array], Complex]
_POWERS = {"constant": 0, "linear": 1, "square": 2}


def grown(amplitude: float, phase: float, growth: Growth, stated_hz: float) -> Strength:
    """A stated amplitude that grows with the speed from what it is at ``stated_hz``."""
    power = _POWERS[growth]
    return lambda speed: amplitude * np.exp(1j * phase) * (speed / stated_hz) ** power + 0j


def pulled(unbalance_kg_m: float, phase: float) -> Strength:
    """The pull of an unbalance U: U (2 pi n)^2."""
    return lambda speed: unbalance_kg_m * (2 * np.pi * speed) ** 2 * np.exp(1j * phase)


def permissible_unbalance(grade_m_s: float, mass_kg: float, speed_hz: float) -> float:
    """Permissible residual unbalance, kg m: U = m G / w (ISO 21940-11:2016, from e w = G; from memory)."""
    return mass_kg * grade_m_s / (2 * np.pi * speed_hz)


def piston(crank: Crank, throw: float, order: int) -> Strength:
    """Inertia force of one piston along its bore, away from the crank: m r w^2 A_k cos(k (w t - throw))."""
    share = piston_orders(crank.radius / crank.rod)[order]
    size = crank.mass * crank.radius * share * np.exp(-1j * order * throw)
    return lambda speed: size * (2 * np.pi * speed) ** 2


def stroke(strokes: Strokes, order: int) -> Strength:
    """One order of a train of half-sine blows, the middle of each at ``angle``.

    Fourier's coefficient of F sin(pi t / T) with T = D / n, D the share of the stroke that the blow takes:
    4 F D cos(pi k D) / (pi (1 - (2 k D)^2)), and F D where 2 k D = 1 (elementary).
    """
    turned = np.exp(-1j * order * strokes.angle)

    def at(speed: Array) -> Complex:
        share = _share(strokes, speed)
        spread = 2 * order * share
        # cos(pi x / 2) / (1 - x^2) by the sinc function, without its 0 / 0 at x = 1
        bell = np.pi / 4 * (np.sinc((1 - spread) / 2) + np.sinc((1 + spread) / 2))
        return np.asarray(4 / np.pi * strokes.peak * share * bell * turned)

    return at


def shaken(row: Shaking) -> Strength:
    """Displacement of the ground, m (rad), from the amplitude of its displacement, velocity or acceleration.

    The strength of an order is a function of the speed; that of a fixed frequency is constant.
    """
    power, size = next(
        (power, float(size))
        for power, size in enumerate((row.displacement, row.velocity, row.acceleration))
        if size is not None
    )

    def at(speed: Array) -> Complex:
        rate = np.full(len(speed), row.frequency) if row.order is None else row.order * speed
        return np.asarray(size * np.exp(1j * row.phase) / (2j * np.pi * rate) ** power)

    return at


def times(factor: complex, strength: Strength) -> Strength:
    """A strength times a constant."""
    return lambda speed: factor * strength(speed)


def blow_rest(strokes: Strokes, speed_hz: float) -> float:
    """The share of the mean square of the blows, their mean left out, that lies above the last order."""
    one = np.array([speed_hz])
    share = float(_share(strokes, one)[0])
    whole = share / 2 - (2 * share / np.pi) ** 2
    lines = sum(abs(stroke(strokes, k)(one)[0]) ** 2 / 2 for k in range(1, strokes.harmonics + 1))
    return max(0.0, 1 - float(lines) / float(strokes.peak) ** 2 / whole)


def _share(strokes: Strokes, speed: Array) -> Array:
    """The share (k,) of the time of a stroke that the blow takes."""
    if strokes.duration is not None:
        return strokes.duration * speed
    return np.full(len(speed), strokes.share, dtype=np.float64)
