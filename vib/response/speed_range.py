"""At which speeds a run-up is computed: evenly, about every resonance, and finer until each peak is met."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from vib.modes import Modes, find_modes
from vib.response.at_speeds import AtSpeeds
from vib.response.exponential import Array
from vib.response.tracking import Tracked

EVEN = 201  # points over the range
_ABOUT = np.array([-8.0, -4.0, -2.0, -1.0, -0.5, 0.0, 0.5, 1.0, 2.0, 4.0, 8.0])  # half widths of a peak
UNDAMPED = 1e-6  # ratio below which a peak has no height worth finding
_NO_PEAK = 0.7
_FLAT = 5e-3  # fall from a peak to its neighbours: the peak between is then less than 0.1 % higher
_SMALL = 1e-3  # of the largest value of a curve: peaks below are not looked at closely
ROUNDS = 16  # of refinement at most
_CLOSE = 1e-9
_NARROW = 0.1 * UNDAMPED  # of a speed: points are not set closer for the sake of a peak
_SAMPLES = 9  # speeds at which the modes of a system that changes with the speed are found first
_TRIES = 6


@dataclass(frozen=True)
class Meeting:
    """Where frequency = rate times speed: of a mode, counted from 1 by frequency at that speed."""

    speed_hz: float
    rate: float
    mode: int
    frequency_hz: float
    damping_ratio: float


def default_range(ranges: Sequence[tuple[float, float]]) -> tuple[float, float]:
    """From and to, rev/s: the stated range; around single speeds, from a tenth to 1.2 times."""
    low, high = min(low for low, _ in ranges), max(high for _, high in ranges)
    if any(start < end for start, end in ranges):
        return max(low, 1e-3 * high), high
    return 0.1 * low, 1.2 * high


def meetings(
    family: AtSpeeds, rates: Sequence[float], low: float, high: float, modes: Modes | None
) -> list[Meeting]:
    """Every meeting of a line with a mode between two speeds, by speed.

    Where the matrices change with the speed, curves of the modes by their frequencies are followed between
    samples (`vib.response.tracking`), and each meeting is found by the rule of false position.
    """
    top = 1.02 * max(rates, default=0.0) * high
    if not top:
        return []
    if not family.varies:
        known = modes if modes is not None else find_modes(family.system, up_to=top)
        found = [
            Meeting(float(frequency) / rate, rate, number + 1, float(frequency), float(ratio))
            for rate in rates
            for number, (frequency, ratio) in enumerate(
                zip(known.frequencies_hz, known.damping_ratios, strict=True)
            )
            if frequency > 0 and ratio < _NO_PEAK and low <= frequency / rate <= high
        ]
        return sorted(found, key=lambda row: (row.speed_hz, row.mode))
    curves = _Curves(Tracked(family, high, top))
    for speed in np.linspace(low, high, _SAMPLES).tolist():
        curves.at(speed)
    found = [row for rate in rates for row in curves.meetings(rate)]
    return sorted(found, key=lambda row: (row.speed_hz, row.mode))


class _Curves:
    """Natural frequencies and ratios by their order at every speed asked for."""

    def __init__(self, tracked: Tracked) -> None:
        self._tracked = tracked
        self._known: dict[float, tuple[Array, Array]] = {}

    def at(self, speed_hz: float) -> tuple[Array, Array]:
        """Frequencies, ascending, and ratios at a speed."""
        if speed_hz not in self._known:
            self._known[speed_hz] = self._tracked.at(speed_hz)
        return self._known[speed_hz]

    def meetings(self, rate: float) -> list[Meeting]:
        """Where a line crosses the curves."""
        found = []
        speeds = sorted(self._known)
        for start, stop in pairwise(speeds):
            count = min(len(self.at(start)[0]), len(self.at(stop)[0]))
            before = self.at(start)[0][:count] - rate * start
            after = self.at(stop)[0][:count] - rate * stop
            for mode in np.flatnonzero((before > 0) & (after <= 0) | (before < 0) & (after >= 0)).tolist():
                row = self._meet(rate, mode, (start, float(before[mode])), (stop, float(after[mode])))
                if row.damping_ratio < _NO_PEAK and row.frequency_hz > 0:
                    found.append(row)
        return found

    def _meet(self, rate: float, mode: int, start: tuple[float, float], stop: tuple[float, float]) -> Meeting:
        """The rule of false position, with the end that stays halved (Illinois), within the half width."""
        (a, fa), (b, fb) = start, stop
        speed = b
        for _ in range(_TRIES):
            speed = (a * fb - b * fa) / (fb - fa) if fa != fb else b
            frequencies, ratios = self.at(speed)
            if mode >= len(frequencies):
                break
            off = float(frequencies[mode] - rate * speed)
            if abs(off) <= 0.1 * max(float(ratios[mode]), UNDAMPED) * rate * speed:
                break
            if (off > 0) == (fb > 0):
                b, fb, fa = speed, off, fa / 2
            else:
                a, fa, fb = speed, off, fb / 2
        frequencies, ratios = self.at(speed)
        mode = min(mode, len(frequencies) - 1)
        return Meeting(speed, rate, mode + 1, float(frequencies[mode]), float(ratios[mode]))


def first_speeds(
    low: float, high: float, met: Sequence[Meeting], stated: Sequence[tuple[float, float]]
) -> Array:
    """Even points, the stated speeds, and points about each meeting."""
    points = [np.linspace(low, high, EVEN), np.array(stated).ravel()]
    for row in met:
        width = max(row.damping_ratio, UNDAMPED)
        about = _ABOUT if row.damping_ratio > UNDAMPED else _ABOUT[_ABOUT != 0]
        points.append(row.speed_hz * (1 + width * about))
    return tidy(np.concatenate(points), low, high)


def tidy(points: Array, low: float, high: float) -> Array:
    """Ascending, inside, and none twice."""
    inside = np.unique(points[(points >= low) & (points <= high)])
    apart = np.concatenate([[True], np.diff(inside) > _CLOSE * high]) if inside.size else np.zeros(0, bool)
    return np.asarray(inside[apart])


def finer(speeds: Array, curves: Array) -> Array:
    """Points to add where a curve (k, m) has a peak that its neighbours don't come close to."""
    if len(speeds) < 3 or not curves.size:
        return np.zeros(0)
    with np.errstate(invalid="ignore"):
        inner = curves[1:-1]
        peak = (inner >= curves[:-2]) & (inner >= curves[2:]) & (inner > _SMALL * np.nanmax(curves, axis=0))
        steep = np.minimum(curves[:-2], curves[2:]) < (1 - _FLAT) * inner
    wide = np.minimum(speeds[1:-1] - speeds[:-2], speeds[2:] - speeds[1:-1]) > _NARROW * speeds[1:-1]
    here = 1 + np.flatnonzero((peak & steep).any(axis=1) & wide)
    added = np.concatenate([(speeds[here - 1] + speeds[here]) / 2, (speeds[here] + speeds[here + 1]) / 2])
    return np.unique(added)
