"""The resonance screening as blocks and as a JSON document."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from vib.show.blocks import Block, Column, Heading, Sentence, Table, Tone, text_column
from vib.show.numbers import MISSING, error_bar, joined, significant
from vib.show.words import CAUTION, caution
from vib.units import UnitSystem, shown, shown_unit

if TYPE_CHECKING:
    from vib.modes import Modes
    from vib.screening import Screening
    from vib.screening.judgement import Row
    from vib.screening.lines import Line


def screening_blocks(screening: Screening, title: str, units: UnitSystem = "si") -> list[Block]:
    """All that the ``screen`` command shows: the verdict first."""
    blocks: list[Block] = [Heading(title), screening_verdict(screening), line_table(screening)]
    near = meeting_table(screening, units)
    if near is not None:
        blocks.append(near)
    else:
        blocks.append(Sentence("No mode lies inside a band."))
    keep_out = keep_out_table(screening)
    if keep_out is not None:
        blocks.append(keep_out)
    return [*blocks, caution()]


def screening_verdict(screening: Screening) -> Sentence:
    """The verdict with its tone."""
    if screening.objections or not screening.stable:
        return Sentence(screening.verdict, "bad")
    return Sentence(screening.verdict, "good" if screening.clear else "careful")


def objection_words(screening: Screening, most: int = 6) -> list[str]:
    """Each mode that counts, and what would drive it."""
    found: dict[int, list[Row]] = {}
    for row in screening.objections:
        found.setdefault(row.mode, []).append(row)
    told = [
        f"Mode {mode} at {significant(rows[0].frequency_hz, 4)} Hz: "
        + joined([f"{_line_words(row.line)} (off by {_signed_percent(row.separation)} %)" for row in rows])
        for mode, rows in found.items()
    ]
    more = [f"and {len(told) - most} more, see the screening"] if len(told) > most else []
    return told[:most] + more


def line_table(screening: Screening) -> Table:
    """What shakes: every order and fixed frequency with its band, and the mode nearest to it."""
    rows = []
    tones: list[Tone] = []
    for line in screening.lines:
        own = [row for row in screening.rows if row.line is line or row.line == line]
        nearest = min(own, key=lambda row: abs(row.separation), default=None)
        bad = any(row.counts for row in own)
        rows.append(
            (
                line.excitation,
                MISSING if line.order is None else f"{line.order:g}",
                _speed(line),
                _range(line.from_hz, line.to_hz),
                _range(line.band_from_hz, line.band_to_hz),
                f"{nearest.mode}" if nearest else MISSING,
                _signed_percent(nearest.separation) if nearest else MISSING,
            )
        )
        tones.append("bad" if bad else "plain")
    columns = (
        text_column("excitation"),
        Column("order"),
        Column("speed", "rpm"),
        Column("frequency", "Hz"),
        Column("band", "Hz"),
        Column("nearest", "mode"),
        Column("off by", "%"),
    )
    return Table("What shakes the machine", columns, tuple(rows), tones=tuple(tones))


def meeting_table(screening: Screening, units: UnitSystem = "si") -> Table | None:
    """The modes inside a band, those that count first; None where there are none.

    Where forces are stated the level at which line and mode meet stands beside them, with its zone.
    """
    inside = sorted((row for row in screening.rows if row.inside), key=lambda row: (not row.counts, row.mode))
    if not inside:
        return None
    predicted = any(row.consequence is not None for row in inside)
    rows = tuple(
        (
            str(row.mode),
            significant(row.frequency_hz, 4),
            *(() if predicted else (error_bar(row.error_hz),)),
            _line_words(row.line),
            _signed_percent(row.separation),
            _drive(row),
            *(_consequence(row, units) if predicted else ()),
            _verdict(row),
        )
        for row in inside
    )
    columns = (
        Column("mode"),
        Column("natural", "Hz"),
        *(() if predicted else (Column("error", "± Hz"),)),
        text_column("excitation"),
        Column("off by", "%"),
        Column("drive", "0 to 1"),
        *((Column("level", shown_unit("velocity", units)), text_column("zone")) if predicted else ()),
        text_column("verdict"),
    )
    tones: tuple[Tone, ...] = tuple("bad" if row.counts else "careful" for row in inside)
    sources = dict.fromkeys(row.consequence.source for row in inside if row.consequence is not None)
    named = "; ".join(source for source in sources if source)
    title = "Modes inside a band" + ("; level: r.m.s. velocity where they meet" if predicted else "")
    title += f"; zones by {named}" if named else ""
    return Table(title, columns, rows, tones=tones)


def _consequence(row: Row, units: UnitSystem) -> tuple[str, str]:
    """The r.m.s. level where line and mode meet, and its zone."""
    found = row.consequence
    if found is None:
        return MISSING, MISSING
    return significant(shown(found.velocity_rms_m_s, "velocity", units), 3), found.zone or MISSING


def _drive(row: Row) -> str:
    if row.drive is None:
        return MISSING
    return significant(row.drive, 2) if row.drive >= 1e-3 else "0"


def keep_out_table(screening: Screening) -> Table | None:
    """The running speeds to keep out of; None where no excitation has a running speed."""
    if not screening.keep_out:
        return None
    shown_to = {diagram.excitation: diagram.speed_to for diagram in screening.diagrams}
    rows = tuple(
        (
            entry.excitation,
            joined(
                [
                    f"{_rpm(low, down=True)} to {_rpm(high)}"
                    for low, high in entry.ranges
                    if low <= shown_to[entry.excitation]
                ]
            )
            or "none",
            _rpm(shown_to[entry.excitation], down=True),
            _known_up_to(entry.complete_below),
        )
        for entry in screening.keep_out
    )
    columns = (
        text_column("excitation"),
        text_column("keep out of, rpm"),
        Column("listed up to", "rpm"),
        Column("known up to", "rpm"),
    )
    return Table("Running speeds to keep out of", columns, rows)


def screening_document(screening: Screening, title: str, modes: Modes) -> dict[str, Any]:
    """What ``vib screen --json`` prints."""
    from vib.show.documents import modes_document

    return {
        "title": title,
        **screening.to_dict(),
        "modes": modes_document(modes, title)["modes"],
        "complete_below_hz": modes.complete_below_hz,
        "caution": CAUTION,
    }


def _verdict(row: Row) -> str:
    notes = [str(row.verdict), row.note]
    if row.consequence is not None and not row.consequence.meets:
        notes.append("level as it runs")
    return "; ".join(note for note in notes if note)


def _line_words(line: Line) -> str:
    if line.order is None:
        return f"{line.excitation}, {significant(line.from_hz, 4)} Hz"
    return f"{line.excitation}, order {line.order:g}"


def _speed(line: Line) -> str:
    return MISSING if line.speed is None else _range(line.speed[0] * 60, line.speed[1] * 60)


def _range(low: float, high: float) -> str:
    return significant(low) if low == high else f"{significant(low)} to {significant(high)}"


def _signed_percent(share: float) -> str:
    if share == 0:
        return "0"
    return f"{'+' if share > 0 else ''}{100 * share:.1f}"


def _rpm(speed: float, down: bool = False) -> str:
    """Whole turns per minute, rounded outwards: a range to keep out of must not shrink."""
    import math

    value = speed * 60
    return f"{math.floor(value) if down else math.ceil(value)}"


def _known_up_to(speed: float | None) -> str:
    if speed is None:
        return "not known"
    return "all" if speed == float("inf") else _rpm(speed, down=True)
