"""What acts on a system over time: forces at places, and one motion of the ground."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
import scipy.linalg
from numpy.typing import ArrayLike

from vib.errors import ModelError
from vib.response.exponential import Array
from vib.response.signals import Harmonic, Points, Signal, Steps

Along = str | Sequence[float] | None
GroundQuantity = Literal["acceleration", "velocity", "displacement"]


@dataclass(frozen=True)
class Load:
    """A force (N; along a rotation a moment, N m) at a place; ``words`` say what it is."""

    signal: Signal
    at: str
    along: Along = None
    name: str = "load"
    words: str = ""


@dataclass(frozen=True, eq=False)
class GroundMotion:
    """A motion of the ground along one axis: its acceleration over time, and where it begins.

    ``displacement_m`` and ``velocity_m_s`` are those of the ground at time 0 (rad, rad/s about an axis).
    """

    acceleration: Signal
    along: str
    displacement_m: float = 0.0
    velocity_m_s: float = 0.0
    name: str = "ground"
    words: str = ""
    remarks: tuple[str, ...] = ()


def harmonic_ground(
    amplitude: float,
    frequency_hz: float,
    along: str,
    *,
    quantity: GroundQuantity = "acceleration",
    phase_rad: float = 0.0,
) -> GroundMotion:
    """A ground that moves for ever as amplitude sin(2 pi f t + phase), in m/s^2, m/s or m by ``quantity``.

    Its displacement swings about 0, and at time 0 it has the displacement and velocity of that motion.
    """
    omega = 2 * np.pi * frequency_hz
    order = {"acceleration": 2, "velocity": 1, "displacement": 0}[quantity]
    travel, phase = amplitude / omega**order, phase_rad - order * np.pi / 2
    return GroundMotion(
        Harmonic(-travel * omega**2, frequency_hz, phase),
        along,
        float(travel * np.sin(phase)),
        float(travel * omega * np.cos(phase)),
        words=f"harmonic, {abs(travel):.4g} m at {frequency_hz:.4g} Hz",
        remarks=("The system begins at rest against the moving ground.",),
    )


def recorded_ground(
    times_s: ArrayLike, values: ArrayLike, along: str, *, quantity: GroundQuantity
) -> GroundMotion:
    """A ground that moves as recorded: (k,) times, s, ascending, and values in m/s^2, m/s or m.

    Between its values an acceleration is linear, a velocity linear (so that the acceleration has steps), a
    displacement a natural cubic spline (so that the acceleration is linear). Before and after the record the
    ground is not accelerated.

    Raises
    ------
    ModelError
        The record is no record, see `vib.response.signals.Points`.

    References
    ----------
    C. de Boor, A Practical Guide to Splines (1978), chapter IV, natural end conditions.
    """
    record = Points(np.asarray(times_s, np.float64), np.asarray(values, np.float64))
    times, given = record.times_s, record.values
    if quantity == "acceleration":
        return GroundMotion(
            record,
            along,
            remarks=(
                "The recorded acceleration is taken as linear between its values; the ground begins at rest.",
            ),
        )
    if quantity == "velocity":
        return GroundMotion(
            Steps(times, record.slopes),
            along,
            0.0,
            float(given[0]),
            remarks=("The recorded velocity is taken as linear between its values.",),
        )
    bends = _spline_bends(times, given)
    first = float(record.slopes[0] - (times[1] - times[0]) * (2 * bends[0] + bends[1]) / 6)
    return GroundMotion(
        Points(times, bends),
        along,
        float(given[0]),
        first,
        remarks=("The recorded displacement is taken as a natural cubic spline through its values.",),
    )


def _spline_bends(times: Array, values: Array) -> Array:
    """Second derivatives (k,) of the natural cubic spline."""
    gaps = np.diff(times)
    bends = np.zeros(times.size)
    if times.size < 3:
        return bends
    bands = np.zeros((3, times.size - 2))
    bands[0, 1:], bands[1], bands[2, :-1] = gaps[1:-1], 2 * (gaps[:-1] + gaps[1:]), gaps[1:-1]
    bends[1:-1] = scipy.linalg.solve_banded((1, 1), bands, 6 * np.diff(np.diff(values) / gaps))
    return bends


def check_loads(loads: Sequence[Load], ground: GroundMotion | None) -> None:
    """There must be something to respond to.

    Raises
    ------
    ModelError
        Nothing acts.
    """
    if not loads and ground is None:
        raise ModelError("respond: nothing acts; give at least one load, or a motion of the ground")
