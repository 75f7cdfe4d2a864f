"""What a coincidence of one line with one mode comes to: the level where they meet, and its zone."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from vib.severity.judging import axis_of, judged_outputs
from vib.severity.levels import band_levels, strain, zone_numbers
from vib.severity.standards import ZONES, Zone, boundaries
from vib.severity.support import Support
from vib.study.severity import Severity as Table

if TYPE_CHECKING:
    from vib.response.run_up import RunUp

Array = NDArray[np.float64]
_NEAR = 0.01  # a line this near to a natural frequency, as a share of it, is taken to meet the mode


@dataclass(frozen=True)
class Consequence:
    """The highest level by one line of an excitation, alone, near where it meets a mode.

    The line counts whatever its frequency: a standard's band would leave out a slow line that does harm.

    Attributes
    ----------
    output
        Where it is highest, such as "motor y".
    frequency_hz, speed_hz
        Of the line, and of the reference shaft, rev/s (0 where nothing turns).
    meets
        The line is at the natural frequency there. False: it can't be or was not computed, and this is the
        level of the line at its stated frequency or its nearest speed.
    velocity_rms_m_s, displacement_rms_m
        R.m.s. over time; infinite where the machine is unstable.
    zone, source
        Zone of the line alone and where the boundary comes from; None and "" without a standard.
    """

    output: str
    frequency_hz: float
    speed_hz: float
    meets: bool
    velocity_rms_m_s: float
    displacement_rms_m: float
    zone: Zone | None
    source: str

    @property
    def harmless(self) -> bool:
        """Zone A or B: the line may meet the mode."""
        return self.zone in ("A", "B")

    def to_dict(self) -> dict[str, Any]:
        """Plain values."""
        return {
            "output": self.output,
            "frequency_hz": self.frequency_hz,
            "speed_rpm": 60 * self.speed_hz,
            "meets": self.meets,
            "velocity_rms_m_s": self.velocity_rms_m_s,
            "displacement_rms_m": self.displacement_rms_m,
            "zone": self.zone,
            "source": self.source,
        }


def consequence(
    run_ups: Sequence[RunUp],
    table: Table | None,
    supports: Mapping[str, Support],
    excitation: str,
    order: float | None,
    line_hz: tuple[float, float],
    natural_hz: float,
) -> Consequence | None:
    """The level where a line meets a mode, None where no force is stated for the line.

    Parameters
    ----------
    run_ups
        One for each shaft that turns by itself; of those that have the line, the one where it comes nearest
        to the mode is used.
    table, supports
        What is judged by (None: nothing, only levels are given), and how the machine stands by axis, as in
        `Severity.supports`.
    excitation, order, line_hz
        The line: name, multiple of the excitation's speed (None: fixed), its frequencies at the running
        speeds (from, to), Hz.
    natural_hz
        Of the mode, Hz.
    """
    best: tuple[float, RunUp, tuple[int, ...]] | None = None
    for run_up in run_ups:
        found = _lines(run_up, excitation, order, line_hz)
        if found:
            gap = float(np.abs(run_up.lines[found[0]].frequency_hz - natural_hz).min())
            if best is None or gap < best[0]:
                best = gap, run_up, found
    if best is None:
        return None
    return _level(best[1], table, supports, best[2], natural_hz)


def _lines(
    run_up: RunUp, excitation: str, order: float | None, line_hz: tuple[float, float]
) -> tuple[int, ...]:
    """Numbers of the lines of a run-up that are this line, whatever forces they are of."""
    found = []
    for number, line in enumerate(run_up.lines):
        if line.excitation != excitation or (line.order is None) != (order is None):
            continue
        if order is None:
            same = np.isclose(line.frequency_hz[0], line_hz[0], rtol=1e-9)
        else:
            assert line.order is not None
            same = np.isclose(line.order, order, rtol=1e-9)
        if same:
            found.append(number)
    return tuple(found)


def _level(
    run_up: RunUp,
    table: Table | None,
    supports: Mapping[str, Support],
    lines: tuple[int, ...],
    natural_hz: float,
) -> Consequence | None:
    straight = [column for column, turning in enumerate(run_up.rotational) if not turning]
    watched = straight if table is None else judged_outputs(run_up, table)
    if not watched:
        return None
    frequency = run_up.lines[lines[0]].frequency_hz
    gaps = np.abs(frequency - natural_hz)
    meets = bool(gaps.min() <= _NEAR * natural_hz)
    near = np.flatnonzero(gaps <= (_NEAR * natural_hz if meets else gaps.min() * (1 + 1e-9)))
    moved = run_up.displacement_m[:, list(lines)].sum(axis=1, keepdims=True)[near]
    levels = band_levels(frequency[near, None], moved, np.zeros(len(near)))
    ranked = []
    for column in watched:
        support = supports.get(axis_of(run_up.places[column][1])) or next(iter(supports.values()), None)
        stand = "rigid" if support is None else support.stand
        limits = () if table is None else boundaries(table, stand)
        velocity, displacement = (level[:, column] for level in levels)
        zones, strains = zone_numbers(velocity, displacement, limits), strain(velocity, displacement, limits)
        k = int(np.lexsort((strains, zones))[-1])
        ranked.append((int(zones[k]), float(strains[k]), column, k, limits))
    zone, _, column, k, limits = max(ranked, key=lambda entry: entry[:2])
    return Consequence(
        output=run_up.outputs[column],
        frequency_hz=float(frequency[near[k]]),
        speed_hz=float(run_up.speed_hz[near[k]]) if run_up.shaft else 0.0,
        meets=meets,
        velocity_rms_m_s=float(levels[0][k, column]),
        displacement_rms_m=float(levels[1][k, column]),
        zone=ZONES[zone] if limits else None,
        source=limits[0].source if limits else "",
    )
