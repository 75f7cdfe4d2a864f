"""A run-up as blocks: what shakes, the highest levels, forces on the supports, where lines meet modes."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from vib.show.blocks import Block, Bullets, Column, Facts, Heading, Sentence, Table, text_column
from vib.show.numbers import MISSING, percent, significant
from vib.show.tables.driving import driving_table
from vib.show.tables.ring import KINDS
from vib.show.tables.severity import counts, fine, fine_unit, severity_blocks
from vib.show.words import CAUTION, caution
from vib.units import UnitSystem, shown, shown_unit

if TYPE_CHECKING:
    from vib.response.run_up import RunUp
    from vib.severity import Severity
    from vib.study import Study

_MOST_MEETINGS = 24


@dataclass(frozen=True, eq=False)
class RunUps:
    """What ``vib respond --run-up`` found; ``severity`` is None where the study has no [severity]."""

    study: Study
    run_up: RunUp
    severity: Severity | None

    @property
    def title(self) -> str:
        """Of the study."""
        return self.study.title

    @property
    def remarks(self) -> tuple[str, ...]:
        """Remarks of both, each once."""
        told = [*self.run_up.remarks, *(self.severity.remarks if self.severity is not None else ())]
        return tuple(dict.fromkeys(told))


def run_up_blocks(found: RunUps, units: UnitSystem) -> list[Block]:
    """All that ``vib respond --run-up`` shows: severity first, then the run-up."""
    blocks: list[Block] = [Heading(found.title), run_up_stability(found.run_up)]
    if found.severity is not None:
        blocks += severity_blocks(found.severity, units)
    return [*blocks, *run_up_tables(found, units), run_up_facts(found.run_up), caution()]


def run_up_stability(run_up: RunUp) -> Sentence:
    """Whether there is a steady vibration at every speed."""
    if run_up.stable:
        return Sentence("Stable at every speed of the run-up: what is not driven dies away.", "good")
    growing = 60 * run_up.speed_hz[~run_up.stable_at]
    return Sentence(
        f"UNSTABLE: motion grows by itself at {_speeds(growing)}; there is no steady vibration there.", "bad"
    )


def run_up_tables(found: RunUps, units: UnitSystem) -> list[Block]:
    """The tables of the run-up itself."""
    run_up = found.run_up
    chosen = run_up.in_service
    apart = bool(chosen.any()) and not chosen.all()
    everywhere, running = np.arange(len(chosen)), np.flatnonzero(chosen)
    tables: list[Table | None] = [
        driving_table(run_up, found.study, units),
        highest_table(run_up, units, everywhere, "in the run-up"),
    ]
    if apart:
        tables.append(highest_table(run_up, units, running, "at the running speeds"))
    tables.append(force_table(run_up, units, everywhere, "in the run-up"))
    if apart:
        tables.append(force_table(run_up, units, running, "at the running speeds"))
    tables.append(crossing_table(run_up))
    return [table for table in tables if table is not None]


def highest_table(run_up: RunUp, units: UnitSystem, chosen: NDArray[np.intp], where: str) -> Table:
    """The highest level of each output at the chosen speeds, all frequencies counted."""
    velocity, peak = run_up.velocity_rms_m_s, run_up.displacement_peak_m
    rows = []
    for column, name in enumerate(run_up.outputs):
        turning = run_up.rotational[column]
        alike = [k for k, turns in enumerate(run_up.rotational) if turns == turning]
        top = int(chosen[np.argmax(velocity[chosen, column])])
        moves = counts(velocity[top, column], velocity[:, alike].max())
        rows.append(
            (
                name,
                _level(velocity[top, column], turning, units) if moves else "0",
                _moved(peak[top, column], turning, units) if moves else "0",
                _rpm(run_up, top) if moves else MISSING,
                _mostly(run_up, top, column) if moves else MISSING,
            )
        )
    columns = (
        text_column("output"),
        Column("velocity", _units_of(run_up, units, 1)),
        Column("displacement", _units_of(run_up, units, 0)),
        Column("at", "rpm"),
        text_column("mostly by"),
    )
    return Table(f"Highest {where}: velocity r.m.s., displacement at most", columns, tuple(rows))


def force_table(run_up: RunUp, units: UnitSystem, chosen: NDArray[np.intp], where: str) -> Table | None:
    """Forces on supports and mounts at the chosen speeds; None where there are none."""
    given = run_up.transmitted
    if given is None or not given.names:
        return None
    rms, peak = run_up.transmitted_rms_n, run_up.transmitted_peak_n
    rows = []
    for column, (name, component) in enumerate(zip(given.names, given.components, strict=True)):
        turning = component.startswith("r")
        kind = "moment" if turning else "force"
        alike = [k for k, other in enumerate(given.components) if other.startswith("r") == turning]
        at = int(chosen[np.argmax(rms[chosen, column])])
        sizes = ["0", "0"]
        acts = counts(rms[at, column], rms[:, alike].max())
        if acts:
            sizes = [
                significant(shown(float(size), kind, units), 3)
                for size in (rms[at, column], peak[at, column])
            ]
        rows.append(
            (
                name,
                given.kinds[column],
                shown_unit(kind, units),
                *sizes,
                _rpm(run_up, at) if acts else MISSING,
            )
        )
    columns = (
        text_column("on"),
        text_column("kind"),
        text_column("unit"),
        Column("r.m.s."),
        Column("at most"),
        Column("at", "rpm"),
    )
    return Table(f"Forces on supports and mounts, highest {where}", columns, tuple(rows))


def crossing_table(run_up: RunUp) -> Table | None:
    """Where lines meet modes; None where none do."""
    if not run_up.resonances:
        return None
    rows = tuple(
        (
            significant(60 * row.speed_hz, 4),
            run_up.lines[row.line].words,
            str(row.mode),
            significant(row.frequency_hz, 4),
            percent(row.damping_ratio),
        )
        for row in run_up.resonances[:_MOST_MEETINGS]
    )
    columns = (
        Column("speed", "rpm"),
        text_column("line"),
        Column("mode"),
        Column("natural", "Hz"),
        Column("damping", "%"),
    )
    left = len(run_up.resonances) - len(rows)
    title = "Where lines meet modes" + (f" (the first {len(rows)} of {len(rows) + left})" if left else "")
    return Table(title, columns, rows)


def run_up_facts(run_up: RunUp) -> Facts:
    """How it was computed."""
    rows = []
    if run_up.shaft:
        low, high = (f"{60 * float(run_up.speed_hz[at]):.5g}" for at in (0, -1))
        span = f"{low} rpm" if len(run_up.speed_hz) == 1 else f"{low} to {high} rpm"
        rows.append(("run-up", f"{run_up.shaft}, {span}, {len(run_up.speed_hz)} speeds"))
    rows += [
        ("method", run_up.method),
        (
            "sums",
            "lines of one frequency as vectors, others by their squares; displacements and forces at most: "
            "the sum of the amplitudes",
        ),
    ]
    rows += [("error", words) for words in run_up.errors]
    return Facts(tuple(rows))


def run_up_remarks(found: RunUps) -> Bullets | None:
    """What the reader should know."""
    return Bullets(found.remarks) if found.remarks else None


def run_up_document(found: RunUps) -> dict[str, Any]:
    """What ``vib respond --run-up --json`` prints."""
    return {
        "title": found.title,
        "stable": found.run_up.stable,
        "run_up": found.run_up.to_dict(),
        "severity": None if found.severity is None else found.severity.to_dict(),
        "remarks": list(found.remarks),
        "caution": CAUTION,
    }


def _mostly(run_up: RunUp, at: int, column: int) -> str:
    """The line that contributes most to the velocity of an output at a speed."""
    speeds = np.abs(run_up.combined_m[at, :, column]) * run_up.frequency_hz[at]
    if not np.isfinite(speeds).all() or not speeds.any():
        return MISSING
    group = run_up.groups[int(np.argmax(speeds))]
    return run_up.lines[max(group, key=lambda n: abs(run_up.displacement_m[at, n, column]))].words


def _level(value: float, turning: bool, units: UnitSystem) -> str:
    return significant(shown(float(value), KINDS[turning][1], units), 3)


def _moved(value: float, turning: bool, units: UnitSystem) -> str:
    return significant(shown(float(value), "angle", units) if turning else fine(float(value), units), 3)


def _units_of(run_up: RunUp, units: UnitSystem, order: int) -> str:
    """The unit of a column; of angles where all outputs are angles, both where some are."""
    if order == 1:
        straight, turning = (shown_unit(KINDS[angle][1], units) for angle in (False, True))
    else:
        straight, turning = fine_unit(units), shown_unit("angle", units)
    if not any(run_up.rotational):
        return straight
    return turning if all(run_up.rotational) else f"{straight} or {turning}"


def _rpm(run_up: RunUp, at: int) -> str:
    return significant(60 * float(run_up.speed_hz[at]), 4) if run_up.shaft else MISSING


def _speeds(rpm: NDArray[np.float64]) -> str:
    low, high = f"{rpm.min():.5g}", f"{rpm.max():.5g}"
    return f"{low} rpm" if low == high else f"speeds between {low} and {high} rpm"
