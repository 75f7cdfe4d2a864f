"""All modes against all excitations: the noun `Screening` and how it is made."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from vib.screening.consequences import consequence_remarks, consequence_words, weighed
from vib.screening.drive import HARDLY_DRIVEN, drive
from vib.screening.judgement import NO_PEAK_RATIO, Row, judge
from vib.screening.lines import DEFAULT_BAND, Line, excitation_lines

if TYPE_CHECKING:
    from vib.modes import Modes
    from vib.response.run_up import RunUp
    from vib.study.excitations import Excitation
    from vib.study.severity import Severity

Range = tuple[float, float]


@dataclass(frozen=True)
class KeepOut:
    """Running speeds of one excitation to keep out of, all its orders and drivable modes together.

    ``ranges`` are (from, to) in rev/s, ascending, apart from each other; ``complete_below`` (rev/s) is the
    speed up to which the list is known to be whole: above it an order may meet a mode that was not computed.
    None: not known.
    """

    excitation: str
    ranges: tuple[Range, ...]
    complete_below: float | None

    def to_dict(self) -> dict[str, Any]:
        """Plain values, speeds in rpm."""
        below = self.complete_below
        return {
            "excitation": self.excitation,
            "speeds": [
                {"speed_from_rpm": low * 60.0, "speed_to_rpm": high * 60.0} for low, high in self.ranges
            ],
            "complete_below_rpm": None if below is None or below == float("inf") else below * 60.0,
        }


@dataclass(frozen=True)
class SpeedDiagram:
    """What the speed-frequency diagram (Campbell diagram) of one excitation shows.

    ``speed_to`` (rev/s) and ``frequency_to_hz`` are the ends of the axes, which start at zero; the line of
    each order is ``frequency = order * speed``, its band from (1 - band) to (1 + band) times that;
    ``running`` are the running speeds (from, to); ``frequencies_hz`` fixed frequencies (level lines).
    """

    excitation: str
    orders: tuple[float, ...]
    band: float
    running: tuple[Range, ...]
    frequencies_hz: tuple[float, ...]
    speed_to: float
    frequency_to_hz: float

    def to_dict(self) -> dict[str, Any]:
        """Plain values, speeds in rpm."""
        return {
            "excitation": self.excitation,
            "orders": list(self.orders),
            "band": self.band,
            "running": [
                {"speed_from_rpm": low * 60.0, "speed_to_rpm": high * 60.0} for low, high in self.running
            ],
            "frequencies_hz": list(self.frequencies_hz),
            "speed_to_rpm": self.speed_to * 60.0,
            "frequency_to_hz": self.frequency_to_hz,
        }


@dataclass(frozen=True, eq=False)
class Screening:
    """Every oscillating mode against every line of every excitation.

    Attributes
    ----------
    rows
        Mode by mode, and for each mode line by line.
    lines
        The orders and fixed frequencies screened against.
    clear
        True only if no row counts, the modes reach up to the highest band, and no mode is unstable.
    verdict
        The same in one or two sentences.
    covered_up_to_hz
        No mode below this frequency is missing; None where that is not known.
    needed_up_to_hz
        The top of the highest band.
    keep_out
        Per excitation with a running speed, the speeds to keep out of.
    diagrams
        Per excitation, what its speed-frequency diagram shows.
    not_screened
        (number, why) of the modes that no excitation can bring to resonance: rigid-body and overdamped ones.
    stable
        False if any mode grows.
    remarks
        The conventions used and what was not covered, in words.
    """

    rows: tuple[Row, ...]
    lines: tuple[Line, ...]
    clear: bool
    verdict: str
    covered_up_to_hz: float | None
    needed_up_to_hz: float
    keep_out: tuple[KeepOut, ...]
    diagrams: tuple[SpeedDiagram, ...]
    not_screened: tuple[tuple[int, str], ...]
    stable: bool
    remarks: tuple[str, ...]

    @property
    def objections(self) -> tuple[Row, ...]:
        """The rows that count: a mode inside a band that can be driven."""
        return tuple(row for row in self.rows if row.counts)

    @property
    def covered(self) -> bool:
        """Whether no mode up to the top of the highest band is missing."""
        return self.covered_up_to_hz is not None and self.covered_up_to_hz >= self.needed_up_to_hz

    def to_dict(self) -> dict[str, Any]:
        """Plain values that can be written as JSON, field names carrying their units."""
        reach = self.covered_up_to_hz
        return {
            "clear": self.clear,
            "verdict": self.verdict,
            "stable": self.stable,
            "covered": self.covered,
            "covered_up_to_hz": None if reach == float("inf") else reach,
            "needed_up_to_hz": self.needed_up_to_hz,
            "rows": [row.to_dict() for row in self.rows],
            "keep_out": [entry.to_dict() for entry in self.keep_out],
            "diagrams": [diagram.to_dict() for diagram in self.diagrams],
            "not_screened": [{"mode": mode, "why": why} for mode, why in self.not_screened],
            "remarks": list(self.remarks),
        }


def screen(
    modes: Modes,
    excitations: Sequence[Excitation],
    *,
    band: float | str | None = None,
    run_ups: Sequence[RunUp] = (),
    severity: Severity | None = None,
) -> Screening:
    """Screen modes against what shakes the machine.

    A mode is inside the band of a line where ``abs(f - f_excitation) <= band * f_excitation``; over a range
    of speeds, from (1 - band) times the lowest to (1 + band) times the highest excitation frequency. The
    error bar of the mode is added on both sides. f is the natural frequency ``abs(eigenvalue) / (2 pi)``.

    Parameters
    ----------
    modes
        Of the system; computed at least up to `highest_needed_hz`, or the screening says that it is not
        complete and is not clear.
    excitations
        As in a study (`Study.excitations`); speeds and frequencies in cycles per second.
    band
        Half width as a share of the excitation frequency, or text such as ``"25 %"``, for excitations that
        have none of their own. Default 20 %: common practice, no source.
    run_ups
        Predicted vibration, one run-up for each shaft that turns by itself: each row inside a band then says
        what the coincidence comes to. They change no verdict: a coincidence counts however harmless it is.
    severity
        ``study.severity``, for the zones of these levels.

    Returns
    -------
    Screening

    Raises
    ------
    ModelError
        There are no excitations, or one acts at a place that does not exist or is held.
    UnitError
        The band is not a ratio from 0 up to, and without, 1.
    """
    lines = excitation_lines(excitations, band=band)
    drives = {excitation.name: drive(modes, excitation) for excitation in excitations}
    oscillating, not_screened = _sorted_out(modes)
    rows = weighed(
        tuple(
            judge(
                index + 1,
                float(modes.frequencies_hz[index]),
                float(modes.errors_hz[index]),
                float(modes.damping_ratios[index]),
                line,
                _entry(drives[line.excitation], index),
            )
            for index in oscillating
            for line in lines
        ),
        modes,
        run_ups,
        severity,
    )
    needed = max(line.band_to_hz for line in lines)
    reach = modes.complete_below_hz
    covered = reach is not None and reach >= needed
    clear = covered and modes.stable and modes.stability_known and not any(row.counts for row in rows)
    return Screening(
        rows=rows,
        lines=lines,
        clear=clear,
        verdict=_verdict(rows, covered, modes, bool(run_ups)),
        covered_up_to_hz=reach,
        needed_up_to_hz=needed,
        keep_out=tuple(
            _keep_out(excitation, rows, lines, reach) for excitation in excitations if excitation.speed_ranges
        ),
        diagrams=tuple(_diagram(excitation, lines) for excitation in excitations),
        not_screened=not_screened,
        stable=modes.stable,
        remarks=(*_remarks(excitations, lines, rows, reach, needed, modes), *consequence_remarks(rows)),
    )


def merged(ranges: Iterable[Range]) -> tuple[Range, ...]:
    """Ranges in ascending order, with those that overlap or touch made one."""
    found: list[Range] = []
    for low, high in sorted(ranges):
        if found and low <= found[-1][1]:
            found[-1] = (found[-1][0], max(found[-1][1], high))
        else:
            found.append((low, high))
    return tuple(found)


def _entry(values: Any, index: int) -> float | None:
    return None if values is None else float(values[index])


def _sorted_out(modes: Modes) -> tuple[list[int], tuple[tuple[int, str], ...]]:
    """Positions of the modes that oscillate, and (number, why) of the others."""
    oscillating, others = [], []
    for index, eigenvalue in enumerate(modes.eigenvalues):
        if index < modes.rigid_body_count:
            others.append((index + 1, "rigid-body mode at 0 Hz"))
        elif eigenvalue.imag == 0:
            grows = eigenvalue.real > 0
            others.append(
                (
                    index + 1,
                    "unstable: grows without oscillating" if grows else "overdamped: does not oscillate",
                )
            )
        else:
            oscillating.append(index)
    return oscillating, tuple(others)


def _keep_out(
    excitation: Excitation, rows: Sequence[Row], lines: Sequence[Line], reach: float | None
) -> KeepOut:
    ranges = [
        row.speeds_to_avoid
        for row in rows
        if row.line.excitation == excitation.name and row.speeds_to_avoid is not None and row.drivable
    ]
    highest = max(
        line.order * (1.0 + line.band)
        for line in lines
        if line.excitation == excitation.name and line.order is not None
    )
    return KeepOut(excitation.name, merged(ranges), None if reach is None else reach / highest)


def _diagram(excitation: Excitation, lines: Sequence[Line]) -> SpeedDiagram:
    own = [line for line in lines if line.excitation == excitation.name]
    top = 1.2 * max((high for _, high in excitation.speed_ranges), default=0.0)
    orders = excitation.orders if excitation.speed_ranges else ()
    return SpeedDiagram(
        excitation=excitation.name,
        orders=tuple(orders),
        band=own[0].band,
        running=excitation.speed_ranges,
        frequencies_hz=excitation.frequencies,
        speed_to=top,
        frequency_to_hz=1.1 * max(line.band_to_hz for line in own),
    )


def _verdict(rows: Sequence[Row], covered: bool, modes: Modes, predicted: bool) -> str:
    counting = [row for row in rows if row.counts]
    numbers = sorted({row.mode for row in counting})
    if len(numbers) == 1:
        said = f"Mode {numbers[0]} lies inside a band and can be driven."
    elif numbers:
        listed = f"{', '.join(str(number) for number in numbers[:-1])} and {numbers[-1]}"
        said = f"Modes {listed} lie inside a band and can be driven."
    elif covered and any(row.inside for row in rows):
        said = "Clear: modes lie inside a band, but none that can be driven to resonance from there."
    elif covered:
        said = "Clear: no mode lies inside a band."
    else:
        said = (
            "Not shown to be clear: no mode found lies inside a band, but the modes do not cover every band."
        )
    if predicted and counting:
        said = f"{said} {consequence_words(counting)}"
    if not modes.stable:
        return f"The system is unstable. {said}"
    return said if modes.stability_known else f"Not shown to be stable. {said}"


def _remarks(
    excitations: Sequence[Excitation],
    lines: Sequence[Line],
    rows: Sequence[Row],
    reach: float | None,
    needed: float,
    modes: Modes,
) -> tuple[str, ...]:
    said = ["Natural frequencies are screened, not damped ones; their error bars are added to the bands."]
    if any(line.band == DEFAULT_BAND for line in lines):
        said.append(f"Band of {DEFAULT_BAND:.0%} on each side: common practice, no source.")
    if reach is None:
        said.append(f"It was not checked that no mode up to {needed:.4g} Hz, the highest band, is missing.")
    elif reach < needed:
        beyond = sorted({line.excitation for line in lines if line.band_to_hz > reach})
        said.append(
            f"Not covered: the modes are complete up to {reach:.4g} Hz only, the bands reach up to "
            f"{needed:.4g} Hz ({', '.join(beyond)}); compute modes up to there."
        )
    placed = [excitation for excitation in excitations if excitation.at is not None]
    if placed and modes.system.unsymmetric:
        said.append(
            "The stiffness is declared unsymmetric: how strongly a mode is driven does not follow from its "
            "shape, so every mode counts."
        )
    elif placed:
        said.append(
            f"A mode that moves less than {HARDLY_DRIVEN:.0%} of its greatest motion where the excitation "
            "acts counts as hardly driven (a convention of this program)."
        )
    if any(excitation.at is None for excitation in excitations):
        names = ", ".join(excitation.name for excitation in excitations if excitation.at is None)
        said.append(f"No place is given for {names}: every mode counts as one that can be driven.")
    if any(row.damping_ratio >= NO_PEAK_RATIO for row in rows):
        said.append("A mode damped by 0.707 of critical or more has no resonance peak and does not count.")
    if not modes.stable:
        said.append("A mode grows by itself: the machine is unstable, whatever shakes it.")
    return tuple(said)
