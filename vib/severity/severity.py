"""The noun `Severity`: predicted vibration against zones, own limits and separation margins."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from vib.errors import ModelError
from vib.severity.levels import band_levels, strain, zone_numbers
from vib.severity.margins import Margin, judge_margins, needed_hz
from vib.severity.own import OwnCheck, check_own
from vib.severity.standards import MEANING, Boundaries, Zone, band_from_hz, band_words, boundaries
from vib.severity.support import AXES, Support, judge_support
from vib.study.severity import Severity as Table
from vib.study.severity import Stand

if TYPE_CHECKING:
    from vib.modes import Modes
    from vib.response.run_up import RunUp

Array = NDArray[np.float64]


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
                f"{which} nearer to the running speeds than the separation margin; {self.missed[0].source}."
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


def judge(run_up: RunUp, table: Table, modes: Modes | None = None) -> Severity:
    """Judge predicted vibration at the running speeds.

    Parameters
    ----------
    run_up
        Its outputs at the places that the table names are judged; without such, those at bodies; angles are
        left out. Its running speeds are judged, all its speeds where it states none.
    table
        ``study.severity``.
    modes
        Of the same structure, complete up to 1.25 times the main excitation frequency; needed for the support
        where the study does not state it, and for separation margins.

    Raises
    ------
    ModelError
        The main excitation that the table names has no force in the run-up, or there is no output to judge.
    """
    watched = judged_outputs(run_up, table)
    if not watched:
        raise ModelError("severity: there is no place to judge; name bearings or feet in severity.places")
    chosen = run_up.in_service if run_up.in_service.any() else np.ones(len(run_up.speed_hz), dtype=bool)
    main = main_frequency(run_up, table)
    places = [run_up.places[column][0] for column in watched]
    supports = judge_support(modes, table, list(dict.fromkeys(places)), float(main[chosen].max()))
    levels = band_levels(run_up.frequency_hz, run_up.combined_m, band_from_hz(table, main))
    rows = tuple(
        _row(run_up, table, supports, column, levels, main, np.flatnonzero(chosen)) for column in watched
    )
    speeds = run_up.speed_hz[chosen]
    return Severity(
        rows=rows,
        own=check_own(run_up, table, watched, chosen),
        supports=supports,
        margins=judge_margins(modes, table, _running(run_up, main), main, _turning(run_up, main, watched)),
        machine=table.machine_words,
        band=band_words(table),
        shaft=run_up.shaft,
        speeds_hz=(float(speeds.min()), float(speeds.max())),
        main_hz=(float(main[chosen].min()), float(main[chosen].max())),
        stable=bool(run_up.stable_at[chosen].all()),
        remarks=tuple(_remarks(run_up, table, supports, modes, float(main[chosen].max()))),
    )


def judged_outputs(run_up: RunUp, table: Table) -> list[int]:
    """Which outputs are judged: at the places that the table names, else at bodies, else all; no angles."""
    straight = [column for column, turning in enumerate(run_up.rotational) if not turning]
    if table.places is not None:
        named = set(table.places)
        return [k for k in straight if run_up.outputs[k] in named or run_up.places[k][0] in named]
    anatomy = run_up.system.anatomy
    bodies = {part.name for part in anatomy.parts if part.kind == "body"} if anatomy is not None else set()
    return [k for k in straight if run_up.places[k][0] in bodies] or straight


def main_frequency(run_up: RunUp, table: Table) -> Array:
    """(k,) the main excitation frequency, Hz, at each speed: mostly the running speed.

    Where nothing turns it is the frequency of the line that shakes the outputs most.

    Raises
    ------
    ModelError
        The table names an excitation without a force in the run-up.
    """
    if not run_up.shaft:
        moved = np.abs(run_up.combined_m).max(axis=2) * run_up.frequency_hz
        strongest = int(np.argmax(np.nan_to_num(moved).max(axis=0)))
        return np.asarray(run_up.frequency_hz[:, strongest])
    if table.main is None or table.main == run_up.shaft:
        return run_up.speed_hz
    for line in run_up.lines:
        if line.excitation == table.main and line.order:
            return np.asarray(line.frequency_hz / line.order)
    raise ModelError(
        f'severity.main: "{table.main}" has no force at an order of its speed, so its speed in the run-up is '
        "not known; name an excitation that has, or leave main out"
    )


def axis_of(along: Any) -> str:
    """The axis of an output, the nearest one of a slanting direction; "" where none is known."""
    if along is None:
        return ""
    if isinstance(along, str):
        return along.strip().lstrip("+-")
    return AXES[int(np.argmax(np.abs(np.asarray(along, dtype=np.float64))))]


def _row(
    run_up: RunUp,
    table: Table,
    supports: Mapping[str, Support],
    column: int,
    levels: tuple[Array, Array],
    main: Array,
    chosen: NDArray[np.intp],
) -> Judged:
    place, along = run_up.places[column]
    axis = axis_of(along)
    support = supports.get(axis) or next(iter(supports.values()), None)
    best: tuple[tuple[int, float], int, Stand | None, tuple[Boundaries, ...]] | None = None
    for stand in ("rigid", "flexible"):
        here = chosen
        if support is not None:
            stands = np.array([support.stand_at(float(main[k])) == stand for k in chosen])
            here = chosen[stands]
        if not len(here):
            continue
        limits = boundaries(table, stand)
        velocity, displacement = (level[here, column] for level in levels)
        zones, strains = zone_numbers(velocity, displacement, limits), strain(velocity, displacement, limits)
        k = int(np.lexsort((strains, zones))[-1])
        rank = (int(zones[k]), float(strains[k]))
        if best is None or rank > best[0]:
            best = rank, int(here[k]), None if support is None else stand, limits
        if support is None:
            break
    assert best is not None
    _, k, found, limits = best
    return Judged(
        output=run_up.outputs[column],
        place=place,
        axis=axis,
        speed_hz=float(run_up.speed_hz[k]),
        velocity_rms_m_s=float(levels[0][k, column]),
        displacement_rms_m=float(levels[1][k, column]),
        support=found,
        limits=limits,
    )


def _running(run_up: RunUp, main: Array) -> list[tuple[float, float]]:
    """The running speeds of the main shaft, rev/s; none where nothing turns."""
    if not run_up.shaft:
        return []
    return [
        (float(np.interp(low, run_up.speed_hz, main)), float(np.interp(high, run_up.speed_hz, main)))
        for low, high in run_up.service_hz
    ]


def _turning(run_up: RunUp, main: Array, watched: list[int]) -> Array:
    """(k, p) amplitude at the turning frequency of the main shaft, at each place judged."""
    same = [
        group
        for group in range(len(run_up.groups))
        if np.allclose(run_up.frequency_hz[:, group], main, rtol=1e-9, atol=0)
    ]
    if not same or not run_up.stable:
        return np.zeros((len(main), 0))
    return np.asarray(np.abs(run_up.combined_m[:, same[0], :][:, watched]))


def _remarks(
    run_up: RunUp, table: Table, supports: Mapping[str, Support], modes: Modes | None, main_hz: float
) -> Iterator[str]:
    yield (
        "Levels are predicted from the forces that the study states; what shakes the machine besides is not "
        "in them."
    )
    if any(run_up.rotational):
        yield "Angles are not judged."
    unknown = [axis for axis, support in supports.items() if not support.known]
    if unknown:
        yield (
            f"How the machine stands along {', '.join(unknown)} is not known; the stricter limits of a rigid "
            "support are used."
        )
    if any(not support.stated for support in supports.values()):
        yield (
            "A mode is one along an axis where the judged places move at least 10 % of its greatest motion, "
            "and 30 % of their squared motion is along that axis (conventions of this program)."
        )
    reach = None if modes is None else modes.complete_below_hz
    if modes is not None and (reach is None or reach < needed_hz(table, main_hz)):
        yield "The modes found do not reach far enough above the running speeds to judge every margin there."
    if modes is None:
        yield "No modes were given: separation margins are not judged."
    if table.rules is not None:
        yield "The standard's figures are quoted from memory: check them against its text before they decide."


def _counted(count: int, one: str, several: str) -> str:
    return f"{count} {one if count == 1 else several}"
