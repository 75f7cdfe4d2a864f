"""Severity as blocks: the verdict, levels with their zones, boundaries with their sources, margins."""

from __future__ import annotations

from typing import TYPE_CHECKING

from vib.show.blocks import Block, Bullets, Column, Facts, Sentence, Table, Tone, text_column
from vib.show.numbers import MISSING, percent, significant
from vib.units import UnitSystem, shown, shown_unit

if TYPE_CHECKING:
    from vib.severity.own import OwnCheck
    from vib.severity.severity import Judged, Severity
    from vib.severity.standards import Boundaries

ZONE_TONES: dict[str | None, Tone] = {"A": "good", "B": "plain", "C": "careful", "D": "bad", None: "plain"}
_OWN_WORDS = {
    "velocity_rms": "velocity, r.m.s.",
    "displacement_rms": "displacement, r.m.s.",
    "displacement_peak": "displacement, at most",
    "force": "force, at most",
}
_POSITIONS = {True: "below", False: "above", None: "within"}
ROUNDING = 1e-9  # of the highest level of its kind; what is below is no vibration
_METRES_PER = {"si": 1e-6, "us": 25.4e-6}


def fine_unit(units: UnitSystem) -> str:
    """The unit that displacements of vibration are shown in."""
    return "mil" if units == "us" else "µm"


def fine(metres: float, units: UnitSystem) -> float:
    """A displacement in that unit."""
    return metres / _METRES_PER[units]


def counts(level: float, largest: float) -> bool:
    """Whether a level is more than rounding beside the largest of its kind; an infinite one is."""
    return level == float("inf") or level > ROUNDING * largest


def severity_blocks(severity: Severity, units: UnitSystem) -> list[Block]:
    """All that is said of severity, the verdict first."""
    blocks: list[Block] = [severity_verdict(severity), level_table(severity, units)]
    blocks += [
        block
        for block in (
            boundary_table(severity, units),
            own_table(severity, units),
            stand_table(severity),
            margin_table(severity),
        )
        if block is not None
    ]
    return [*blocks, severity_facts(severity)]


def severity_verdict(severity: Severity) -> Sentence:
    """The verdict with its tone."""
    if not severity.acceptable:
        return Sentence(severity.verdict, "careful" if severity.zone == "C" and severity.stable else "bad")
    told = severity.verdict or "No boundary and no limit to judge by."
    return Sentence(told, "careful" if severity.missed or not severity.verdict else "good")


def level_table(severity: Severity, units: UnitSystem) -> Table:
    """The level of each place along each axis at the running speed where it is worst."""
    turns = bool(severity.shaft)
    largest = max((row.velocity_rms_m_s for row in severity.rows), default=0.0)
    moving = [counts(row.velocity_rms_m_s, largest) for row in severity.rows]
    rows = tuple(
        (
            row.output,
            significant(60 * row.speed_hz, 4) if turns and moves else MISSING,
            significant(shown(row.velocity_rms_m_s, "velocity", units), 3) if moves else "0",
            row.zones.get("velocity_rms", MISSING),
            significant(fine(row.displacement_rms_m, units), 3) if moves else "0",
            row.zones.get("displacement_rms", MISSING),
            row.support or MISSING,
            row.zone or MISSING,
        )
        for row, moves in zip(severity.rows, moving, strict=True)
    )
    columns = (
        text_column("place"),
        Column("at", "rpm"),
        Column("velocity", shown_unit("velocity", units)),
        text_column("zone"),
        Column("displacement", fine_unit(units)),
        text_column("zone"),
        text_column("support"),
        text_column("zone"),
    )
    tones = tuple(ZONE_TONES[row.zone] for row in severity.rows)
    return Table(
        "Predicted vibration at the running speeds, r.m.s., each where it is worst",
        columns,
        rows,
        tones=tones,
    )


def boundary_table(severity: Severity, units: UnitSystem) -> Table | None:
    """The zone boundaries that were used, each with its source; None without a standard."""
    used = list(dict.fromkeys(limit for row in severity.rows for limit in row.limits))
    if not used:
        return None
    rows = tuple(
        (
            *_quantity_words(limit, units),
            *(significant(_boundary(limit, value, units), 3) for value in limit.values),
            limit.source,
        )
        for limit in used
    )
    columns = (
        text_column("quantity"),
        text_column("unit"),
        Column("A/B"),
        Column("B/C"),
        Column("C/D"),
        text_column("source"),
    )
    return Table("Zone boundaries", columns, rows)


def own_table(severity: Severity, units: UnitSystem) -> Table | None:
    """Limits of the user's own; None where there are none."""
    if not severity.own:
        return None
    rows = tuple(
        (
            check.output,
            _OWN_WORDS[check.quantity],
            significant(_own(check, check.level, units), 3),
            significant(_own(check, check.limit, units), 3),
            _own_unit(check, units),
            significant(60 * check.speed_hz, 4) if severity.shaft else MISSING,
            check.source,
        )
        for check in severity.own
    )
    columns = (
        text_column("place"),
        text_column("quantity"),
        Column("level"),
        Column("limit"),
        text_column("unit"),
        Column("worst at", "rpm"),
        text_column("source"),
    )
    tones: tuple[Tone, ...] = tuple("bad" if check.exceeded else "good" for check in severity.own)
    return Table("Limits of your own", columns, rows, tones=tones)


def stand_table(severity: Severity) -> Table | None:
    """How the machine stands along each axis, and by what; None where nothing depends on it."""
    if not severity.supports:
        return None
    rows = tuple((axis, support.words, support.source) for axis, support in severity.supports.items())
    columns = (text_column("axis"), text_column("support"), text_column("source"))
    tones: tuple[Tone, ...] = tuple(
        "plain" if support.known else "careful" for support in severity.supports.values()
    )
    return Table("How the machine stands", columns, rows, tones=tones)


def margin_table(severity: Severity) -> Table | None:
    """Critical speeds near the running speeds; None where there are none."""
    if not severity.margins:
        return None
    rows = tuple(
        (
            str(margin.mode),
            significant(60 * margin.critical_hz, 4),
            significant(margin.amplification, 3),
            margin.amplification_source,
            _POSITIONS[margin.below],
            percent(margin.actual),
            percent(margin.wanted) if margin.wanted else "none",
        )
        for margin in severity.margins
    )
    columns = (
        Column("mode"),
        Column("critical", "rpm"),
        Column("factor"),
        text_column("amplification factor from"),
        text_column("lies"),
        Column("margin", "%"),
        Column("wanted", "%"),
    )
    tones: tuple[Tone, ...] = tuple(
        "plain" if margin.met else ("bad" if margin.stated else "careful") for margin in severity.margins
    )
    source = severity.margins[0].source
    title = f"Critical speeds against the running speeds; margin wanted by {source}"
    return Table(title, columns, rows, tones=tones)


def severity_facts(severity: Severity) -> Facts:
    """What was judged, and in which band."""
    low, high = severity.speeds_hz
    speeds = f"{60 * low:.5g} rpm" if low == high else f"{60 * low:.5g} to {60 * high:.5g} rpm"
    rows = [("machine", severity.machine)]
    if severity.shaft:
        rows.append(("speeds judged", f"{speeds} of {severity.shaft}"))
    if severity.band:
        rows.append(("band", severity.band))
    return Facts(tuple(rows))


def severity_remarks(severity: Severity) -> Bullets:
    """What the reader should know."""
    return Bullets(severity.remarks)


def level_words(row: Judged, units: UnitSystem) -> str:
    """The level that decides, in words."""
    decided = row.decided_by
    if decided is not None and decided.quantity == "displacement_rms":
        return f"{significant(fine(row.displacement_rms_m, units), 3)} {fine_unit(units)} r.m.s."
    velocity = shown(row.velocity_rms_m_s, "velocity", units)
    return f"{significant(velocity, 3)} {shown_unit('velocity', units)} r.m.s."


def _quantity_words(limit: Boundaries, units: UnitSystem) -> tuple[str, str]:
    if limit.quantity == "velocity_rms":
        return "velocity, r.m.s.", shown_unit("velocity", units)
    return "displacement, r.m.s.", fine_unit(units)


def _boundary(limit: Boundaries, value: float, units: UnitSystem) -> float:
    return shown(value, "velocity", units) if limit.quantity == "velocity_rms" else fine(value, units)


def _own(check: OwnCheck, value: float, units: UnitSystem) -> float:
    if check.quantity in ("velocity_rms", "force"):
        return shown(value, "velocity" if check.quantity == "velocity_rms" else "force", units)
    return fine(value, units)


def _own_unit(check: OwnCheck, units: UnitSystem) -> str:
    if check.quantity in ("velocity_rms", "force"):
        return shown_unit("velocity" if check.quantity == "velocity_rms" else "force", units)
    return fine_unit(units)
