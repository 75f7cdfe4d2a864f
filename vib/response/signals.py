"""Inputs as functions of time: steady, given at points or samples, blow, half-sine, harmonic, swept.

Every one of them says what it is within any short piece of time as a sum of shapes whose effect is known
exactly (`vib.response.instep`). Only a sweep is not of that kind: it is replaced, piece by piece, by a
polynomial that differs from it by at most 1e-13 of its amplitude (a bound, not an estimate).
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any, Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

from vib.errors import ModelError
from vib.response.instep import Power, Shape, Wave

Array = NDArray[np.float64]
Expansion = list[tuple[Shape, Array]]

SWEEP_ERROR = 1e-13  # of the amplitude of a sweep
_MOST_DEGREES = 24
_TURN = 1.2  # rad per step, up to which a sweep needs no more than a dozen powers


class Signal(Protocol):
    """One input over time; 0 before it begins and after it ends."""

    @property
    def corners(self) -> Array:
        """Times at which it begins, ends or has a corner, ascending, s."""
        ...

    @property
    def blows(self) -> tuple[tuple[float, float], ...]:
        """(time s, size) of impulses."""
        ...

    def value(self, times: Array, order: int = 0) -> Array:
        """The ``order``-th time derivative (k,) just after the times (k,)."""
        ...

    def expand(self, begins: Array, lengths: Array) -> Expansion:
        """The function on pieces without corners: shapes, and the amplitude of each in each piece (k,)."""
        ...

    def refinement(self, step_s: float) -> int:
        """Into how many equal parts a step must be cut so that pieces of it can be expanded."""
        ...


class _Plain:
    """What most signals have in common."""

    @property
    def blows(self) -> tuple[tuple[float, float], ...]:
        return ()

    def refinement(self, step_s: float) -> int:
        return 1


@dataclass(frozen=True)
class Constant(_Plain):
    """A constant ``level`` from ``start_s`` to ``end_s``."""

    level: float
    start_s: float = 0.0
    end_s: float = math.inf

    @property
    def corners(self) -> Array:
        """See `Signal`."""
        return _finite(self.start_s, self.end_s)

    def value(self, times: Array, order: int = 0) -> Array:
        """See `Signal`."""
        level = self.level if order == 0 else 0.0
        return np.where(_within(times, self.start_s, self.end_s), level, 0.0)

    def expand(self, begins: Array, lengths: Array) -> Expansion:
        """See `Signal`."""
        return [(Power(0), self.value(begins + lengths / 2))]


@dataclass(frozen=True, eq=False)
class Points(_Plain):
    """Values at ascending times, linear between them; 0 before the first and after the last.

    Raises
    ------
    ModelError
        Fewer than two points, times that do not ascend, or entries that are not finite.
    """

    times_s: Array
    values: Array

    def __post_init__(self) -> None:
        times, values = (np.asarray(array, dtype=np.float64) for array in (self.times_s, self.values))
        if times.ndim != 1 or times.shape != values.shape or times.size < 2:
            raise ModelError(
                f"points: as many times as values are needed, at least two, got {times.shape} and "
                f"{values.shape}"
            )
        if not (np.isfinite(times).all() and np.isfinite(values).all()):
            bad = int(np.argmin(np.isfinite(times) & np.isfinite(values)))
            raise ModelError(f"points: row {bad + 1} is not finite")
        if (np.diff(times) <= 0).any():
            bad = int(np.argmax(np.diff(times) <= 0))
            raise ModelError(
                f"points: times must ascend; {times[bad + 1]:g} s follows {times[bad]:g} s (row {bad + 2})"
            )
        object.__setattr__(self, "times_s", times)
        object.__setattr__(self, "values", values)

    @property
    def corners(self) -> Array:
        """See `Signal`."""
        return self.times_s

    @cached_property
    def slopes(self) -> Array:
        """Rate of change in each interval."""
        return np.diff(self.values) / np.diff(self.times_s)

    def _interval(self, times: Array) -> NDArray[np.intp]:
        return np.searchsorted(self.times_s, times, side="right") - 1

    def value(self, times: Array, order: int = 0) -> Array:
        """See `Signal`."""
        inside = _within(times, float(self.times_s[0]), float(self.times_s[-1]))
        if order == 0:
            last = times == self.times_s[-1]
            return np.where(inside | last, np.interp(times, self.times_s, self.values), 0.0)
        if order > 1:
            return np.zeros(times.shape)
        return np.where(inside, self.slopes[np.clip(self._interval(times), 0, self.slopes.size - 1)], 0.0)

    def expand(self, begins: Array, lengths: Array) -> Expansion:
        """See `Signal`."""
        middle = begins + lengths / 2
        place = np.clip(self._interval(middle), 0, self.slopes.size - 1)
        inside = _within(middle, float(self.times_s[0]), float(self.times_s[-1]))
        slope = np.where(inside, self.slopes[place], 0.0)
        at_middle = np.where(inside, self.values[place] + slope * (middle - self.times_s[place]), 0.0)
        return [(Power(0), at_middle - slope * lengths / 2), (Power(1), slope * lengths)]


class Samples(Points):
    """Values (k,) every ``step_s`` from ``start_s`` on, linear between them (a choice, and said so)."""

    def __init__(self, values: ArrayLike, step_s: float, start_s: float = 0.0) -> None:
        given = np.asarray(values, dtype=np.float64)
        if not (math.isfinite(step_s) and step_s > 0 and math.isfinite(start_s)):
            raise ModelError(f"samples: the step must be a positive time, got {step_s:g} s")
        times: Array = start_s + step_s * np.arange(given.size, dtype=np.float64)
        super().__init__(times, given)
        object.__setattr__(self, "step_s", float(step_s))

    @cached_property
    def slopes(self) -> Array:
        """Rate of change in each interval; by the step itself, which the times are rounded multiples of."""
        return np.diff(self.values) / float(self.__dict__["step_s"])

    def _interval(self, times: Array) -> NDArray[np.intp]:
        guess = ((times - self.times_s[0]) / float(self.__dict__["step_s"])).astype(np.intp)
        guess = np.clip(guess, 0, self.times_s.size - 1)
        return np.asarray(guess - (self.times_s[guess] > times), dtype=np.intp)


@dataclass(frozen=True, eq=False)
class Steps(_Plain):
    """``levels`` (k,) that hold from each of the ascending ``times_s`` (k + 1,) to the next."""

    times_s: Array
    levels: Array

    @property
    def corners(self) -> Array:
        """See `Signal`."""
        return self.times_s

    def value(self, times: Array, order: int = 0) -> Array:
        """See `Signal`."""
        if order:
            return np.zeros(times.shape)
        place = np.clip(np.searchsorted(self.times_s, times, side="right") - 1, 0, self.levels.size - 1)
        inside = _within(times, float(self.times_s[0]), float(self.times_s[-1]))
        return np.where(inside, self.levels[place], 0.0)

    def expand(self, begins: Array, lengths: Array) -> Expansion:
        """See `Signal`."""
        return [(Power(0), self.value(begins + lengths / 2))]


@dataclass(frozen=True)
class Impulse(_Plain):
    """A blow of this ``size`` (its time integral) at ``time_s``, so short that nothing moves meanwhile."""

    size: float
    time_s: float = 0.0

    @property
    def corners(self) -> Array:
        """See `Signal`."""
        return np.zeros(0)

    @property
    def blows(self) -> tuple[tuple[float, float], ...]:
        """See `Signal`."""
        return ((self.time_s, self.size),)

    def value(self, times: Array, order: int = 0) -> Array:
        """See `Signal`; a blow has no value at any time."""
        return np.zeros(times.shape)

    def expand(self, begins: Array, lengths: Array) -> Expansion:
        """See `Signal`."""
        return []


@dataclass(frozen=True)
class Harmonic(_Plain):
    """amplitude sin(2 pi frequency (t - start) + phase) from ``start_s`` to ``end_s``."""

    amplitude: float
    frequency_hz: float
    phase_rad: float = 0.0
    start_s: float = 0.0
    end_s: float = math.inf

    @property
    def corners(self) -> Array:
        """See `Signal`."""
        return _finite(self.start_s, self.end_s)

    @property
    def omega(self) -> float:
        """Angular frequency, rad/s."""
        return 2 * math.pi * self.frequency_hz

    def value(self, times: Array, order: int = 0) -> Array:
        """See `Signal`."""
        angle = self.omega * (times - self.start_s) + self.phase_rad + order * math.pi / 2
        size = np.where(_within(times, self.start_s, self.end_s), self.amplitude * self.omega**order, 0.0)
        return np.asarray(size * np.sin(angle))

    def expand(self, begins: Array, lengths: Array) -> Expansion:
        """See `Signal`."""
        size = self.amplitude * _within(begins + lengths / 2, self.start_s, self.end_s)
        angle = self.omega * (begins - self.start_s) + self.phase_rad
        return [
            (Wave(self.omega, sine=False), size * np.sin(angle)),
            (Wave(self.omega, sine=True), size * np.cos(angle)),
        ]


def half_sine(peak: float, duration_s: float, start_s: float = 0.0) -> Harmonic:
    """A half-sine pulse: peak sin(pi (t - start) / duration), then 0."""
    return Harmonic(peak, 0.5 / duration_s, 0.0, start_s, start_s + duration_s)


@dataclass(frozen=True)
class Sweep(_Plain):
    """amplitude sin(phase(t)) whose frequency runs from ``from_hz`` to ``to_hz`` in ``duration_s``.

    Linear: so many Hz per second. Exponential: so many octaves per second. Each piece of a step is a Taylor
    polynomial about its beginning, of a degree for which Cauchy's estimate bounds the rest by `SWEEP_ERROR`.
    """

    amplitude: float
    from_hz: float
    to_hz: float
    duration_s: float
    exponential: bool = False
    start_s: float = 0.0

    def __post_init__(self) -> None:
        if not (min(self.from_hz, self.to_hz) > 0 and self.duration_s > 0):
            raise ModelError("sweep: both frequencies and the duration must be greater than 0")

    @property
    def corners(self) -> Array:
        """See `Signal`."""
        return _finite(self.start_s, self.start_s + self.duration_s)

    @property
    def _growth(self) -> float:
        """Exponential: the rate r of frequency = from exp(r t), 1/s. Linear: d frequency / d t, Hz/s."""
        if self.exponential:
            return math.log(self.to_hz / self.from_hz) / self.duration_s
        return (self.to_hz - self.from_hz) / self.duration_s

    def frequency(self, times: Array) -> Array:
        """Frequency (k,) at times (k,), Hz."""
        late = times - self.start_s
        if self.exponential:
            return np.asarray(self.from_hz * np.exp(self._growth * late))
        return np.asarray(self.from_hz + self._growth * late)

    def phase(self, times: Array) -> Array:
        """Phase (k,), rad; 0 at the beginning."""
        late = times - self.start_s
        if self.exponential and self._growth:
            turns = self.from_hz * np.expm1(self._growth * late) / self._growth
        elif self.exponential:
            turns = self.from_hz * late
        else:
            turns = self.from_hz * late + self._growth * late**2 / 2
        return np.asarray(2 * math.pi * turns)

    def value(self, times: Array, order: int = 0) -> Array:
        """See `Signal`."""
        inside = self.amplitude * _within(times, self.start_s, self.start_s + self.duration_s)
        angle, rate = self.phase(times), 2 * math.pi * self.frequency(times)
        if order == 0:
            return np.asarray(inside * np.sin(angle))
        if order == 1:
            return np.asarray(inside * rate * np.cos(angle))
        change = rate * self._growth if self.exponential else 2 * math.pi * self._growth
        return np.asarray(inside * (change * np.cos(angle) - rate**2 * np.sin(angle)))

    def refinement(self, step_s: float) -> int:
        """See `Signal`."""
        fastest = 2 * math.pi * max(self.from_hz, self.to_hz) * step_s
        return max(1, math.ceil(fastest / _TURN), math.ceil(4 * self._relative_growth * step_s))

    @property
    def _relative_growth(self) -> float:
        return abs(self._growth) if self.exponential else abs(self._growth) / max(self.from_hz, self.to_hz)

    def expand(self, begins: Array, lengths: Array) -> Expansion:
        """See `Signal`."""
        inside = self.amplitude * _within(begins + lengths / 2, self.start_s, self.start_s + self.duration_s)
        degree = self.degree(float(lengths.max(initial=0.0)))
        rate = 2 * math.pi * self.frequency(begins) * lengths
        if self.exponential:
            rates = [rate * (self._growth * lengths) ** n / math.factorial(n) for n in range(degree)]
        else:
            rates = [rate, 2 * math.pi * self._growth * lengths**2]
        # the series of y = exp(i phase) from y' = i phase' y
        series: list[Any] = [np.exp(1j * self.phase(begins))]
        for n in range(degree):
            below = sum(rates[j] * series[n - j] for j in range(min(n + 1, len(rates))))
            series.append(1j * below / (n + 1))
        return [(Power(n), inside * term.imag) for n, term in enumerate(series)]

    def degree(self, length_s: float) -> int:
        """The degree with which the rest of the Taylor series is at most `SWEEP_ERROR` of the amplitude.

        Raises
        ------
        ModelError
            The piece is too long for any degree used here (see `refinement`).

        References
        ----------
        Cauchy's estimate of Taylor coefficients, abs(c_n) <= max abs(f) / r^n on a circle of radius r (any
        book on complex functions, e.g. L. V. Ahlfors, Complex Analysis, section 4.2.3, from memory).
        """
        turn = 2 * math.pi * max(self.from_hz, self.to_hz) * length_s
        bend = self._relative_growth * length_s
        radii = np.geomspace(1.5, 400.0, 400)
        if self.exponential and bend:
            with np.errstate(over="ignore"):
                height = turn * np.expm1(bend * radii) / bend
        else:
            height = turn * (radii + bend * radii**2 / 2)
        for degree in range(1, _MOST_DEGREES + 1):
            rest = height - (degree + 1) * np.log(radii) - np.log1p(-1 / radii)
            if rest.min() <= math.log(SWEEP_ERROR):
                return degree
        raise ModelError(f"sweep: pieces of {length_s:.3g} s are too long for its fastest part")


def ends_of(signals: Sequence[Signal]) -> float:
    """When the last of them has its last corner or blow, s; 0 if none has one."""
    last = [float(signal.corners[-1]) for signal in signals if signal.corners.size]
    last += [time for signal in signals for time, _ in signal.blows]
    return max(last, default=0.0)


def _finite(start: float, end: float) -> Array:
    return np.array([time for time in (start, end) if math.isfinite(time)])


def _within(times: Array, start: float, end: float) -> Any:
    return (times >= start) & (times < end)
