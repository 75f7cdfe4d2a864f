"""How far critical speeds stay away from the running speeds, and how far they should."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from vib.study.severity import Severity as Table

if TYPE_CHECKING:
    from vib.modes import Modes

Array = NDArray[np.float64]
Range = tuple[float, float]

STATED = "the study"
SOURCE = "API 617 / API RP 684, formula from memory"
NOT_ASKED_BELOW = 2.5  # an amplification factor below this asks for no margin
_CAP_BELOW, _CAP_ABOVE, _STEP_ABOVE, _SCALE = 0.16, 0.26, 0.10, 0.17
_FARTHEST = 0.4  # modes farther from the running speeds than any margin asked for are left out
_NO_PEAK_RATIO = np.sqrt(0.5)  # damped so much or more, a mode has no peak (ISO 2041)
_LEAST_POINTS = 5  # of the run-up between the half-power points, for the peak to be trusted
_LEAST_PEAK = 1e-3  # of the highest amplitude at any place; what is below is not seen
_NEAR = 0.1  # a peak this near to the nearest natural frequency, as a share of it, is that mode's


@dataclass(frozen=True)
class Margin:
    """One critical speed against the running speeds.

    Attributes
    ----------
    mode, critical_hz
        Number of the mode and its critical speed (rev/s): that of the peak of the run-up where there is one,
        else its natural frequency over the order.
    amplification, amplification_source
        Amplification factor and how it was found.
    below
        The critical speed is below the running range; False above it; None inside.
    actual
        Distance to the nearest running speed, as a share of that; 0 inside.
    wanted
        What is asked for, as a share; 0 where none is.
    source
        Where ``wanted`` comes from.
    seen
        The run-up has a peak there at a judged place.
    """

    mode: int
    critical_hz: float
    amplification: float
    amplification_source: str
    below: bool | None
    actual: float
    wanted: float
    source: str
    seen: bool

    @property
    def stated(self) -> bool:
        """Whether the margin asked for is the user's own."""
        return self.source == STATED

    @property
    def met(self) -> bool:
        """Whether the margin is as large as asked for."""
        return self.actual >= self.wanted * (1 - 1e-9)

    def to_dict(self) -> dict[str, Any]:
        """Plain values; speeds in rpm, margins as shares of the running speed."""
        return {
            "mode": self.mode,
            "critical_speed_rpm": 60 * self.critical_hz,
            "amplification_factor": self.amplification,
            "amplification_source": self.amplification_source,
            "position": {True: "below", False: "above", None: "inside"}[self.below],
            "margin": self.actual,
            "wanted_margin": self.wanted,
            "met": self.met,
            "seen_in_run_up": self.seen,
            "source": self.source,
        }


def wanted_margin(amplification: float, *, above: bool) -> float:
    """Separation asked for, as a share of the running speed, by the amplification factor AF.

    Below the running range min(16, 17 (1 - 1 / (AF - 1.5))) %, above it
    min(26, 10 + 17 (1 - 1 / (AF - 1.5))) %, none for AF < 2.5: lateral analysis of rotors by API 617 and
    API RP 684, the formulas, the caps and which is for which side from memory.
    """
    if amplification < NOT_ASKED_BELOW * (1 - 1e-12):
        return 0.0
    grown = 0.0 if amplification == np.inf else 1.0 / (amplification - 1.5)
    bare = _SCALE * (1.0 - grown)
    return min(_CAP_ABOVE, _STEP_ABOVE + bare) if above else min(_CAP_BELOW, bare)


def needed_hz(table: Table, main_hz: float) -> float:
    """How far modes must reach for every margin and the support to be judged, Hz."""
    return (1.0 + _reach(table)) * main_hz


def _reach(table: Table) -> float:
    return max(_FARTHEST, table.separation_margin or 0.0)


@dataclass(frozen=True)
class Peak:
    """A peak of a curve: where, how high, and N / (N2 - N1) by the half-power points N1 and N2."""

    speed_hz: float
    height: float
    amplification: float


def half_power(speed_hz: Array, curve: Array) -> tuple[Peak, ...]:
    """The peaks of a run-up curve that are resolved: both half-power points lie on it.

    The peak is that of the parabola through the three highest points, the half-power points (0.707 of the
    peak) are interpolated; a peak with fewer than five points between them is left out, as is one between
    whose half-power points the curve rises above it.

    Parameters
    ----------
    speed_hz, curve
        (k,) ascending speeds and amplitudes.
    """
    found = []
    inner = np.flatnonzero((curve[1:-1] >= curve[:-2]) & (curve[1:-1] > curve[2:])) + 1
    for top in inner:
        speed, height = _summit(speed_hz[top - 1 : top + 2], curve[top - 1 : top + 2])
        level = height * np.sqrt(0.5)
        left, right = np.flatnonzero(curve[:top] < level), np.flatnonzero(curve[top + 1 :] < level)
        if not left.size or not right.size:
            continue
        low, high = int(left[-1]), int(top + 1 + right[0])
        if high - low - 1 < _LEAST_POINTS or curve[low : high + 1].max() > height * (1 + 1e-9):
            continue
        first = np.interp(level, curve[low : low + 2], speed_hz[low : low + 2])
        last = np.interp(level, curve[high - 1 : high + 1][::-1], speed_hz[high - 1 : high + 1][::-1])
        found.append(Peak(float(speed), float(height), float(speed / (last - first))))
    return tuple(found)


def _summit(x: Array, y: Array) -> tuple[float, float]:
    """Place and height of the parabola through three points around a peak."""
    slopes = np.diff(y) / np.diff(x)
    bend = (slopes[1] - slopes[0]) / (x[2] - x[0])
    if bend >= 0:
        return float(x[1]), float(y[1])
    place = (x[0] + x[1]) / 2 - slopes[0] / (2 * bend)
    return float(place), float(y[0] + slopes[0] * (place - x[0]) + bend * (place - x[0]) * (place - x[1]))


@dataclass(frozen=True)
class Critical:
    """A critical speed, rev/s: number of the mode, and its damping ratio there."""

    mode: int
    speed_hz: float
    damping_ratio: float


def critical_speeds(modes: Modes, met: Sequence[Critical], span: Range) -> tuple[Critical, ...]:
    """The critical speeds of a shaft (order 1), by speed.

    Parameters
    ----------
    modes
        Of the system at its stated speed.
    met
        Those that a run-up found, where modes may change with the speed.
    span
        Its slowest and fastest speed, rev/s: where it found any, only modes outside it are added.
    """
    others = [
        Critical(index + 1, float(modes.frequencies_hz[index]), float(modes.damping_ratios[index]))
        for index, eigenvalue in enumerate(modes.eigenvalues)
        if index >= modes.rigid_body_count and eigenvalue.imag != 0
    ]
    added = [one for one in others if not met or not span[0] <= one.speed_hz <= span[1]]
    found = [one for one in (*met, *added) if one.damping_ratio < _NO_PEAK_RATIO]
    return tuple(sorted(found, key=lambda one: one.speed_hz))


def judge_margins(
    critical: Sequence[Critical],
    table: Table,
    running: Sequence[Range],
    speed_hz: Array,
    curves: Array,
) -> tuple[Margin, ...]:
    """Every critical speed of the main shaft near its running speeds.

    Parameters
    ----------
    critical
        As from `critical_speeds`.
    table
        A margin of its own stands in for the formula.
    running
        Running speeds (from, to) of the main shaft, rev/s; without any nothing is judged.
    speed_hz, curves
        (k,) speeds and (k, p) amplitudes at turning frequency of the judged places along each axis; p may
        be 0.
    """
    if not running or not critical:
        return ()
    speeds = np.array([one.speed_hz for one in critical])
    own: dict[int, list[Peak]] = {}
    least = _LEAST_PEAK * curves.max(initial=0.0)
    for peak in (peak for curve in curves.T for peak in half_power(speed_hz, curve)):
        if peak.height < least:
            continue
        nearest = int(np.argmin(np.abs(speeds - peak.speed_hz)))
        if abs(peak.speed_hz - speeds[nearest]) <= _NEAR * speeds[nearest]:
            own.setdefault(nearest, []).append(peak)
    margins = (_margin(one, own.get(k, []), running, table) for k, one in enumerate(critical))
    return tuple(margin for margin in margins if margin.actual <= _reach(table))


def _margin(one: Critical, peaks: Sequence[Peak], running: Sequence[Range], table: Table) -> Margin:
    if peaks:
        peak = max(peaks, key=lambda peak: peak.height)
        speed, factor = peak.speed_hz, peak.amplification
        how = "half-power points of the run-up"
    else:
        speed, ratio = one.speed_hz, one.damping_ratio
        factor = 1 / (2 * ratio) if ratio > 0 else np.inf
        how = f"damping ratio {ratio:.3g}: 1 / (2 ratio); no peak of its own in the run-up"
    below, actual = _distance(speed, running)
    if table.separation_margin is not None:
        wanted, source = table.separation_margin, STATED
    else:
        # inside the range the larger of the two is asked for; whichever, it is not met
        wanted, source = wanted_margin(factor, above=below is not True), SOURCE
    return Margin(one.mode, speed, factor, how, below, actual, wanted, source, bool(peaks))


def _distance(critical: float, running: Sequence[Range]) -> tuple[bool | None, float]:
    """Whether a critical speed is below the nearest running range, and how far, as a share of its end."""
    nearest: tuple[bool | None, float] = (None, np.inf)
    for low, high in running:
        if low <= critical <= high:
            return None, 0.0
        here = (True, (low - critical) / low) if critical < low else (False, (critical - high) / high)
        nearest = min(nearest, here, key=lambda pair: pair[1])
    return nearest
