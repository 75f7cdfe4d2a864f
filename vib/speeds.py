"""Modes against the speed of a shaft: curves followed by shape, critical speeds, onset of instability.

Gyroscopic and circulatory terms grow with the speed (`vib.system.Rotation`). Modes of neighbouring speeds are
paired by the modal assurance criterion (R. J. Allemang, D. L. Brown, Proc. 1st International Modal Analysis
Conference (1982) 110-116) with the assignment that maximises its sum; where a pairing is not clear the step
is halved. A critical speed of order k is a root of frequency(speed) - k speed on one curve, an onset one of
the real part of the eigenvalue, both by Brent's method (R. P. Brent, Algorithms for Minimization without
Derivatives, 1973, chapter 4) on the system itself, not read off the points of the curve.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from vib.errors import AccuracyError, ModelError, in_own_words
from vib.solve.damped import Damped
from vib.solve.stability import takes_energy
from vib.speed_basis import SpeedBasis
from vib.system import Array, Rotation, System
from vib.whirl import Whirl, whirl_of

STEPS = 12  # of speed at first
CLEAR = 0.7  # modal assurance of every pair for a step to be taken as it is
HALVINGS = 6
SPARE = 4  # modes followed beyond those asked for, so that none leaves the set by crossing
NEARLY = 0.05  # damping ratio below which a curve may cross zero between two speeds
STILL = 1e-4  # of the top speed: shapes at rest are told apart from here
PRECISION = 1e-12
TURN = 2 * np.pi


@dataclass(frozen=True, eq=False)
class Critical:
    """A speed at which an order of the shaft meets a mode: ``speed_hz`` rev/s, ``frequency_hz`` of the mode.

    ``mode`` counts the curves from 1 by their frequency at rest; ``whirl`` as in `vib.whirl`.
    """

    order: float
    speed_hz: float
    frequency_hz: float
    damping_ratio: float
    mode: int
    whirl: Whirl


@dataclass(frozen=True, eq=False)
class Onset:
    """The speed from which a motion grows: ``frequency_hz`` and ``shape`` (n,) of that motion there."""

    speed_hz: float
    frequency_hz: float
    mode: int
    whirl: Whirl
    shape: NDArray[np.complex128]


@dataclass(frozen=True, eq=False)
class SpeedCurves:
    """Modes of a system against the speed of one shaft.

    ``speeds_hz`` (p,) rev/s, ascending; ``eigenvalues`` (p, m) 1/s, ``frequencies_hz`` (p, m) their
    magnitude / 2 pi, one curve a column, by frequency at the lowest speed; ``whirls`` (p, m). ``critical``
    by speed; ``onset`` None where nothing grows from rest up to the top speed, as far as the curves show.
    """

    shaft: str
    stated_hz: float
    speeds_hz: Array
    eigenvalues: NDArray[np.complex128]
    whirls: tuple[tuple[Whirl, ...], ...]
    critical: tuple[Critical, ...]
    onset: Onset | None
    remarks: tuple[str, ...]

    @property
    def frequencies_hz(self) -> Array:
        """Natural frequencies (p, m)."""
        return np.asarray(np.abs(self.eigenvalues) / (2 * np.pi))

    @property
    def damping_ratios(self) -> Array:
        """Damping ratios (p, m)."""
        size = np.abs(self.eigenvalues)
        return np.asarray(-self.eigenvalues.real / np.where(size > 0, size, np.nan))

    def to_dict(self) -> dict[str, Any]:
        """Plain values; speeds in rpm."""
        return {
            "shaft": self.shaft,
            "stated_speed_rpm": 60 * self.stated_hz,
            "speeds_rpm": (60 * self.speeds_hz).tolist(),
            "modes": [
                {
                    "number": number + 1,
                    "frequencies_hz": self.frequencies_hz[:, number].tolist(),
                    "damping_ratios": self.damping_ratios[:, number].tolist(),
                    "whirl": [row[number] for row in self.whirls],
                }
                for number in range(self.eigenvalues.shape[1])
            ],
            "critical_speeds": [
                {
                    "order": row.order,
                    "speed_rpm": 60 * row.speed_hz,
                    "frequency_hz": row.frequency_hz,
                    "damping_ratio": row.damping_ratio,
                    "mode": row.mode,
                    "whirl": row.whirl,
                }
                for row in self.critical
            ],
            "onset_of_instability": None
            if self.onset is None
            else {
                "speed_rpm": 60 * self.onset.speed_hz,
                "frequency_hz": self.onset.frequency_hz,
                "mode": self.onset.mode,
                "whirl": self.onset.whirl,
            },
            "remarks": list(self.remarks),
        }


def at_speed(system: System, shaft: str, speed_hz: float) -> System:
    """The same system with one shaft at another speed (rev/s); its members are not cut again.

    Raises
    ------
    ModelError
        No shaft of that name turns in it.
    """
    turning = next((row for row in system.rotations if row.shaft == shaft), None)
    if turning is None:
        known = ", ".join(row.shaft for row in system.rotations) or "none"
        raise ModelError(f"{shaft}: no shaft of that name turns anything; known: {known}.")
    change = 2 * np.pi * (speed_hz - turning.speed_hz)
    gyroscopic, stiffness = system.gyroscopic, system.stiffness
    if turning.gyroscopic is not None and gyroscopic is not None:
        gyroscopic = gyroscopic + change * turning.gyroscopic
        gyroscopic = (gyroscopic - gyroscopic.T) / 2
    if turning.circulatory is not None:
        stiffness = stiffness + change * turning.circulatory
    others = tuple(replace(row, speed_hz=speed_hz) if row.shaft == shaft else row for row in system.rotations)
    anatomy = None if system.anatomy is None else replace(system.anatomy, division=None, discretisation=None)
    return replace(system, gyroscopic=gyroscopic, stiffness=stiffness, anatomy=anatomy, rotations=others)


@in_own_words
def speed_curves(
    system: System,
    shaft: str,
    *,
    count: int = 8,
    orders: Sequence[float] = (1.0,),
    top_hz: float | None = None,
) -> SpeedCurves:
    """Follow the slowest modes from rest to a top speed.

    Parameters
    ----------
    system
        With rotations; the system of found `Modes` is cut finely enough.
    shaft
        Whose speed varies; other shafts keep theirs.
    count
        How many curves.
    orders
        Multiples of the shaft's speed whose critical speeds are wanted.
    top_hz
        Top speed, rev/s; default: 1.25 times the fastest that the shaft runs.

    Raises
    ------
    ModelError
        No such shaft.
    AccuracyError
        A solver did not finish.
    """
    turning = next((row for row in system.rotations if row.shaft == shaft), None)
    top = top_hz or 1.25 * (turning.speed_hz if turning else 1.0)
    track = _Track(system, shaft, count + SPARE)
    points = track.follow(np.linspace(STILL * top, top, STEPS + 1))
    values = np.array([point.values for point in points])
    speeds = np.array([point.speed_hz for point in points])
    curves = _Curves(track, points, speeds, values, turning)
    critical = sorted(
        (row for order in orders for row in curves.critical(order)), key=lambda row: (row.speed_hz, row.mode)
    )
    remarks = () if track.clear else ("Some modes could not be followed surely where curves come close.",)
    kept = min(count, values.shape[1])
    whirls = tuple(tuple(curves.whirl(p, mode) for mode in range(kept)) for p in range(len(points)))
    return SpeedCurves(
        shaft,
        turning.speed_hz if turning else 0.0,
        speeds,
        values[:, :kept],
        whirls,
        tuple(row for row in critical if row.mode <= kept),
        curves.onset(),
        remarks,
    )


@dataclass(frozen=True, eq=False)
class _Point:
    """Modes at one speed, in the order of the curves."""

    speed_hz: float
    values: NDArray[np.complex128]
    shapes: NDArray[np.complex128]
    movement: Array  # how far rounding may have moved each value

    def grows(self, mode: int) -> bool:
        """Whether a curve grows here beyond doubt."""
        value = self.values[mode]
        return bool(value.real > max(1e-9 * abs(value), self.movement[mode]))


class _Track:
    """Modes at any speed, paired with those of a speed near by."""

    def __init__(self, system: System, shaft: str, count: int) -> None:
        self.system, self.shaft, self.count = system, shaft, count
        self.mass = system.mass
        self.clear = True
        self._basis = SpeedBasis(count + SPARE)

    def follow(self, speeds: Array) -> list[_Point]:
        """Points at these speeds, and at more where the pairing needs them."""
        points = [self._first(float(speeds[0]))]
        for speed in speeds[1:].tolist():
            points += self._reach(points[-1], speed, HALVINGS)
        return points

    def paired(self, near: _Point, speed_hz: float) -> tuple[_Point, float]:
        """The modes at a speed in the order of those of ``near``, and the least assurance of a pair."""
        from scipy.optimize import linear_sum_assignment

        found = self._solve(speed_hz)
        there, here = _unit(near.shapes, self.mass), _unit(found.shapes, self.mass)
        alike = np.abs(there.conj().T @ (self.mass @ here)) ** 2
        # equal shapes of an overdamped pair are told apart by the eigenvalue
        apart = np.abs(near.values[:, None] - found.values)
        apart = apart / (np.abs(near.values)[:, None] + np.abs(found.values) + np.finfo(float).tiny)
        rows, columns = linear_sum_assignment(-(alike - 0.2 * apart))
        order = columns[np.argsort(rows)]
        if len(order) < len(near.values):
            raise AccuracyError(f"Too few modes were found at {60 * speed_hz:.6g} rpm to follow the curves.")
        least = float(alike[np.arange(len(order)), order][: max(1, len(order) - SPARE)].min())
        return _Point(speed_hz, found.values[order], found.shapes[:, order], found.movement[order]), least

    def _first(self, speed_hz: float) -> _Point:
        found = self._solve(speed_hz)
        number = min(self.count, len(found.values))
        return _Point(speed_hz, found.values[:number], found.shapes[:, :number], found.movement[:number])

    def _solve(self, speed_hz: float) -> Damped:
        system = at_speed(self.system, self.shaft, speed_hz)
        found = self._basis.solve(system)
        kept = np.arange(len(found.values)) >= found.rigid
        return replace(
            found,
            values=found.values[kept],
            shapes=found.shapes[:, kept].astype(complex),
            movement=found.movement[kept],
            rigid=0,
        )

    def _reach(self, start: _Point, speed: float, halvings: int) -> list[_Point]:
        point, least = self.paired(start, speed)
        if least >= CLEAR:
            return [point]
        if not halvings:
            self.clear = False
            return [point]
        first = self._reach(start, (start.speed_hz + speed) / 2, halvings - 1)
        return first + self._reach(first[-1], speed, halvings - 1)


def _unit(shapes: NDArray[np.complex128], mass: Any) -> NDArray[np.complex128]:
    size = np.sqrt(np.abs(np.einsum("ij,ij->j", shapes.conj(), mass @ shapes)))
    return np.asarray(shapes / np.where(size > 0, size, 1.0))


class _Curves:
    """Roots on the curves of a track."""

    def __init__(
        self,
        track: _Track,
        points: list[_Point],
        speeds: Array,
        values: NDArray[np.complex128],
        turning: Rotation | None,
    ) -> None:
        self._track, self._points, self._speeds, self._values = track, points, speeds, values
        self._bodies = turning.bodies if turning else ()
        system = track.system
        terms = [part for part in (system.damping, system.gyroscopic) if part is not None]
        self._feeding = system.unsymmetric or not all(takes_energy(part) for part in terms)

    def whirl(self, point: int, mode: int) -> Whirl:
        """The sense of whirl of a curve at a point."""
        return self._whirl(self._points[point].values[mode], self._points[point].shapes[:, mode])

    def critical(self, order: float) -> list[Critical]:
        """Where frequency = order times speed."""
        rows = []
        for mode in range(self._values.shape[1]):
            off = self._values[:, mode].imag / (2 * np.pi) - order * self._speeds
            swings = self._values[:, mode].imag > 0
            for p in np.flatnonzero((off[:-1] > 0) != (off[1:] > 0)).tolist():
                if not (swings[p] and swings[p + 1]):
                    continue
                start, stop = self._points[p], self._points[p + 1]
                at = self._root(start, stop, mode, lambda value, speed: value.imag / TURN - order * speed)
                value = at.values[mode]
                rows.append(
                    Critical(
                        order=order,
                        speed_hz=at.speed_hz,
                        frequency_hz=float(abs(value)) / (2 * np.pi),
                        damping_ratio=float(-value.real / abs(value)),
                        mode=mode + 1,
                        whirl=self._whirl(value, at.shapes[:, mode]),
                    )
                )
        return rows

    def onset(self) -> Onset | None:
        """The lowest speed from which the real part of a curve is positive; the first if it is so there."""
        best: Onset | None = None
        for mode in range(self._values.shape[1]):
            at = self._first_growth(mode)
            if at is not None and (best is None or at.speed_hz < best.speed_hz):
                value, shape = at.values[mode], at.shapes[:, mode]
                size = float(abs(value)) / (2 * np.pi)
                best = Onset(at.speed_hz, size, mode + 1, self._whirl(value, shape), shape)
        return best

    def _first_growth(self, mode: int) -> _Point | None:
        if self._points[0].grows(mode):
            return self._points[0]
        for p in range(len(self._points) - 1):
            start = self._points[p]
            between = self._between(p, mode)
            if between is not None:
                return self._root(start, between, mode, lambda value, _: value.real)
            if self._points[p + 1].grows(mode):
                return self._root(start, self._points[p + 1], mode, lambda value, _: value.real)
        return None

    def _between(self, p: int, mode: int) -> _Point | None:
        """A point after number ``p`` where a curve grows, looked for where that may be missed from both ends.

        Motions that feed each other do so where their curves meet; and the real part may have its largest
        value between two speeds.
        """
        if not self._feeding:
            return None
        start, stop = self._points[p], self._points[p + 1]
        apart = self._values[p : p + 2].imag - self._values[p : p + 2, mode, None].imag
        meeting = np.flatnonzero((apart[0] > 0) != (apart[1] > 0))
        shares = [apart[0, other] / (apart[0, other] - apart[1, other]) for other in meeting.tolist()]
        real = self._values[max(0, p - 1) : p + 3, mode].real
        near_zero = real.max() > -NEARLY * abs(start.values[mode])
        if len(real) > 2 and near_zero and real.max() > max(real[0], real[-1]):
            shares += [0.2, 0.5, 0.8]
        for share in sorted({float(share) for share in shares if np.isfinite(share)}):
            speed = start.speed_hz + share * (stop.speed_hz - start.speed_hz)
            if start.speed_hz < speed < stop.speed_hz:
                point = self._track.paired(start if share < 0.5 else stop, speed)[0]
                if point.grows(mode):
                    return point
        return None

    def _whirl(self, value: complex, shape: NDArray[np.complex128]) -> Whirl:
        return whirl_of(self._track.system, self._bodies, value, shape)

    def _root(self, start: _Point, stop: _Point, mode: int, off: Callable[[complex, float], float]) -> _Point:
        """The point on a curve between two points where ``off`` changes sign."""
        from scipy.optimize import brentq

        met: dict[float, _Point] = {start.speed_hz: start, stop.speed_hz: stop}

        def at(speed: float) -> float:
            if speed not in met:
                near = min(met.values(), key=lambda point: abs(point.speed_hz - speed))
                met[speed] = self._track.paired(near, speed)[0]
            return off(complex(met[speed].values[mode]), speed)

        if at(start.speed_hz) * at(stop.speed_hz) > 0:  # zero within round-off at one end
            return start if abs(at(start.speed_hz)) < abs(at(stop.speed_hz)) else stop
        root = float(brentq(at, start.speed_hz, stop.speed_hz, xtol=1e-300, rtol=4 * np.finfo(float).eps))
        at(root)
        return met[root]
