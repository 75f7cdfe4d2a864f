"""One mode against one line of an excitation."""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import StrEnum
from typing import TYPE_CHECKING, Any

from vib.screening.drive import HARDLY_DRIVEN
from vib.screening.lines import Line

if TYPE_CHECKING:
    from vib.severity.consequence import Consequence

# at and above this ratio the response to a force of constant size has no peak (ISO 2041; 1 / sqrt(2))
NO_PEAK_RATIO = math.sqrt(0.5)


class Verdict(StrEnum):
    """What is said of a mode against a line."""

    INSIDE = "inside the band"
    HARDLY_DRIVEN = "inside the band, hardly driven"
    TOO_DAMPED = "inside the band, too damped to resonate"
    CLEAR = "clear"


@dataclass(frozen=True)
class Row:
    """One mode against one line of an excitation.

    Attributes
    ----------
    mode
        Number of the mode, from 1, rigid-body modes counted.
    frequency_hz, error_hz, damping_ratio
        The natural (not the damped) frequency of the mode, its numerical error bar, its damping.
    line
        The order or fixed frequency, with its band.
    separation
        Signed share of the nearest excitation frequency; positive where the mode is above, 0 in the range.
    drive
        0 to 1: how strongly the mode can be driven from the place; None where no place is given.
    inside
        The mode, or its error bar, lies in the band.
    verdict
        In words; only ``Verdict.INSIDE`` is an objection.
    speeds_to_avoid
        Running speeds (from, to), rev/s, at which this order would lie too near; None for a fixed frequency.
    note
        What else is to be said, or "".
    consequence
        The predicted level where line and mode meet, and its zone; None where the mode is outside the band or
        no force is stated.
    """

    mode: int
    frequency_hz: float
    error_hz: float
    damping_ratio: float
    line: Line
    separation: float
    drive: float | None
    inside: bool
    verdict: Verdict
    speeds_to_avoid: tuple[float, float] | None
    note: str
    consequence: Consequence | None = None

    @property
    def counts(self) -> bool:
        """Whether this row is an objection: inside the band, and able to be driven."""
        return self.verdict is Verdict.INSIDE

    @property
    def drivable(self) -> bool:
        """Whether a band that holds the mode is an objection: it can be driven, or it grows by itself."""
        return _can_resonate(self.damping_ratio, self.drive)

    def to_dict(self) -> dict[str, Any]:
        """Plain values; frequencies in Hz, speeds in rpm."""
        line, speeds = self.line, self.speeds_to_avoid
        return {
            "mode": self.mode,
            "frequency_hz": self.frequency_hz,
            "error_hz": self.error_hz,
            "damping_ratio": self.damping_ratio,
            "excitation": line.excitation,
            "order": line.order,
            "excitation_from_hz": line.from_hz,
            "excitation_to_hz": line.to_hz,
            "band": line.band,
            "band_from_hz": line.band_from_hz,
            "band_to_hz": line.band_to_hz,
            "separation": self.separation,
            "drive": self.drive,
            "inside": self.inside,
            "counts": self.counts,
            "verdict": str(self.verdict),
            "speed_from_rpm": speeds[0] * 60.0 if speeds else None,
            "speed_to_rpm": speeds[1] * 60.0 if speeds else None,
            "note": self.note,
            "consequence": None if self.consequence is None else self.consequence.to_dict(),
        }


def judge(
    mode: int, frequency_hz: float, error_hz: float, damping_ratio: float, line: Line, drive: float | None
) -> Row:
    """Judge one oscillating mode (``frequency_hz`` > 0, ``damping_ratio`` < 1) against one line."""
    bare = line.band_from_hz <= frequency_hz <= line.band_to_hz
    inside = line.band_from_hz <= frequency_hz + error_hz and frequency_hz - error_hz <= line.band_to_hz
    notes = []
    if inside and not bare:
        notes.append("only its error bar reaches into the band")
    if damping_ratio < 0:
        notes.append("unstable: it grows without being driven")
    if damping_ratio >= NO_PEAK_RATIO:
        notes.append("damped so much that its response has no peak")
    verdict = Verdict.CLEAR
    if inside:
        verdict = Verdict.INSIDE
        if damping_ratio >= NO_PEAK_RATIO:
            verdict = Verdict.TOO_DAMPED
        elif not _can_resonate(damping_ratio, drive):
            verdict = Verdict.HARDLY_DRIVEN
    return Row(
        mode=mode,
        frequency_hz=frequency_hz,
        error_hz=error_hz,
        damping_ratio=damping_ratio,
        line=line,
        separation=line.separation(frequency_hz),
        drive=drive,
        inside=inside,
        verdict=verdict,
        speeds_to_avoid=line.speeds_to_avoid(frequency_hz, error_hz),
        note="; ".join(notes),
    )


def _can_resonate(damping_ratio: float, drive: float | None) -> bool:
    if damping_ratio < 0:
        return True
    return damping_ratio < NO_PEAK_RATIO and (drive is None or drive >= HARDLY_DRIVEN)
