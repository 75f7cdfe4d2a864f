"""The noun `Severity`: predicted vibration against zones, own limits and separation margins."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from vib.severity.margins import Margin
from vib.severity.own import OwnCheck
from vib.severity.standards import MEANING, Boundaries, Zone
from vib.severity.support import Support
from vib.study.severity import Stand


@dataclass(frozen=True)
class Judged:
    """One place along one axis, at the running speed where it is worst.

    Attributes
    ----------
    output, place, axis
        "motor y", "motor", "y"; the axis is "" for a freedom of bare matrices.
    speed_hz
        Of the reference shaft, rev/s.
    velocity_rms_m_s, displacement_rms_m
        R.m.s. in the band of the standard; of all frequencies where there is no standard. Infinite where the
        machine is unstable.
    support
        Rigid or flexible there; None where nothing depends on it.
    limits
        The zone boundaries that were used, each with its source; empty without a standard.
    """

    output: str
    place: str
    axis: str
    speed_hz: float
    velocity_rms_m_s: float
    displacement_rms_m: float
    support: Stand | None
    limits: tuple[Boundaries, ...]

    def level(self, quantity: str) -> float:
        """The r.m.s. velocity or displacement."""
        return self.velocity_rms_m_s if quantity == "velocity_rms" else self.displacement_rms_m

    @property
    def zones(self) -> dict[str, Zone]:
        """The zone by each quantity that the standard has boundaries of."""
        return {one.quantity: one.zone(self.level(one.quantity)) for one in self.limits}

    @property
    def zone(self) -> Zone | None:
        """The worse of them; None without a standard."""
        return max(self.zones.values(), default=None)

    @property
    def decided_by(self) -> Boundaries | None:
        """The boundaries of the quantity that sets the zone; of two the one that is nearer to its last."""

        def rank(one: Boundaries) -> tuple[Zone, float]:
            return one.zone(self.level(one.quantity)), self.level(one.quantity) / one.values[-1]

        return max(self.limits, key=rank, default=None)

    def to_dict(self) -> dict[str, Any]:
        """Plain values."""
        zones = self.zones
        decided = self.decided_by
        return {
            "output": self.output,
            "place": self.place,
            "axis": self.axis,
            "speed_rpm": 60 * self.speed_hz,
            "velocity_rms_m_s": self.velocity_rms_m_s,
            "displacement_rms_m": self.displacement_rms_m,
            "support": self.support,
            "zone": self.zone,
            "velocity_zone": zones.get("velocity_rms"),
            "displacement_zone": zones.get("displacement_rms"),
            "limits": [one.to_dict() for one in self.limits],
            "source": None if decided is None else decided.source,
        }


@dataclass(frozen=True, kw_only=True, eq=False)
class Severity:
    """How bad the predicted vibration is at the running speeds.

    Attributes
    ----------
    rows
        Place by place, axis by axis.
    own
        Limits of the user's own against the levels that they are for.
    supports
        By axis; empty where nothing depends on the support.
    margins
        Critical speeds near the running speeds.
    machine, band
        What the machine was taken for, and the band of the r.m.s. values, in words.
    shaft
        The reference shaft.
    speeds_hz, main_hz
        The lowest and the highest speed of it that was judged (rev/s), and main excitation frequency (Hz).
    stable
        False if the machine is unstable at one of these speeds.
    remarks
        Conventions used and what was not judged, in words.
    """

    rows: tuple[Judged, ...]
    own: tuple[OwnCheck, ...]
    supports: Mapping[str, Support]
    margins: tuple[Margin, ...]
    machine: str
    band: str
    shaft: str
    speeds_hz: tuple[float, float]
    main_hz: tuple[float, float]
    stable: bool
    remarks: tuple[str, ...]

    @property
    def worst(self) -> Judged | None:
        """The row that matters most: the worst zone, and in it the highest level."""

        def rank(row: Judged) -> tuple[str, float]:
            decided = row.decided_by
            share = (
                row.velocity_rms_m_s if decided is None else row.level(decided.quantity) / decided.values[-1]
            )
            return row.zone or "", share

        return max(self.rows, key=rank, default=None)

    @property
    def zone(self) -> Zone | None:
        """The worst zone of all; None without a standard."""
        worst = self.worst
        return None if worst is None else worst.zone

    @property
    def missed(self) -> tuple[Margin, ...]:
        """The margins that are too small."""
        return tuple(margin for margin in self.margins if not margin.met)

    @property
    def acceptable(self) -> bool:
        """False in zone C or D, above a limit or within a margin of the user's own, or if unstable."""
        own = any(check.exceeded for check in self.own)
        stated = any(margin.stated for margin in self.missed)
        return self.stable and self.zone not in ("C", "D") and not own and not stated

    @property
    def verdict(self) -> str:
        """The same in a few sentences."""
        told = [] if self.stable else ["The machine is unstable at a running speed."]
        worst = self.worst
        if worst is not None and worst.zone is not None and worst.decided_by is not None:
            where = f"{worst.output}, {60 * worst.speed_hz:.4g} rpm" if self.shaft else worst.output
            meaning = MEANING[worst.zone]
            told.append(f"Zone {worst.zone} ({meaning}) at {where}; {worst.decided_by.source}.")
        beyond = [check for check in self.own if check.exceeded]
        if beyond:
            told.append(
                f"{_counted(len(beyond), 'limit of your own is', 'limits of your own are')} exceeded."
            )
        elif self.own:
            told.append("Every limit of your own is kept.")
        if self.missed:
            numbers = sorted({margin.mode for margin in self.missed})
            listed = ", ".join(str(number) for number in numbers)
            which = f"Mode {listed} lies" if len(numbers) == 1 else f"Modes {listed} lie"
            told.append(
                f"{which} nearer to the running speeds than the separation margin of {self.missed[0].source}."
            )
        return " ".join(told)

    def to_dict(self) -> dict[str, Any]:
        """Plain values that can be written as JSON, field names carrying their units."""
        return {
            "zone": self.zone,
            "acceptable": self.acceptable,
            "verdict": self.verdict,
            "machine": self.machine,
            "band": self.band,
            "shaft": self.shaft,
            "speed_from_rpm": 60 * self.speeds_hz[0],
            "speed_to_rpm": 60 * self.speeds_hz[1],
            "main_excitation_from_hz": self.main_hz[0],
            "main_excitation_to_hz": self.main_hz[1],
            "stable": self.stable,
            "places": [row.to_dict() for row in self.rows],
            "own_limits": [check.to_dict() for check in self.own],
            "supports": [support.to_dict() for support in self.supports.values()],
            "separation_margins": [margin.to_dict() for margin in self.margins],
            "remarks": list(self.remarks),
        }


def _counted(count: int, one: str, several: str) -> str:
    return f"{count} {one if count == 1 else several}"
