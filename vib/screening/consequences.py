"""What coincidences come to: levels and zones put beside the rows of a screening, and said in words."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import TYPE_CHECKING

from vib.screening.judgement import Row
from vib.severity.consequence import consequence
from vib.severity.judging import judged_outputs, main_frequency
from vib.severity.standards import MEANING
from vib.severity.support import judge_support

if TYPE_CHECKING:
    from vib.modes import Modes
    from vib.response.run_up import RunUp
    from vib.study.severity import Severity


def weighed(
    rows: tuple[Row, ...], modes: Modes, run_ups: Sequence[RunUp], severity: Severity | None
) -> tuple[Row, ...]:
    """The rows; those inside a band with the level where line and mode meet."""
    if not run_ups:
        return rows
    supports = {}
    if severity is not None:
        first = run_ups[0]
        running = first.in_service if first.in_service.any() else slice(None)
        places = [first.places[column][0] for column in judged_outputs(first, severity)]
        main_hz = float(main_frequency(first, severity)[running].max())
        supports = dict(judge_support(modes, severity, list(dict.fromkeys(places)), main_hz))
    return tuple(
        replace(
            row,
            consequence=consequence(
                run_ups,
                severity,
                supports,
                row.line.excitation,
                row.line.order,
                (row.line.from_hz, row.line.to_hz),
                row.frequency_hz,
            ),
        )
        if row.inside
        else row
        for row in rows
    )


def consequence_words(counting: Sequence[Row]) -> str:
    """What the coincidences that count come to, in a sentence or two."""
    told = []
    zoned = [row for row in counting if row.consequence is not None and row.consequence.zone is not None]
    silent = dict.fromkeys(_line(row) for row in counting if row.consequence is None)
    if zoned:
        worst = max(zoned, key=_rank).consequence
        assert worst is not None
        assert worst.zone is not None
        where = "Where they meet" if worst.meets else "As it runs"
        told.append(
            f"{where}, the predicted level is in zone {worst.zone} at worst: {MEANING[worst.zone]} "
            f"({worst.source})."
        )
        if worst.harmless and not silent:
            told.append("So the coincidence stands, but does no harm by this prediction.")
    if silent:
        told.append(f"What it comes to is not known for {'; '.join(silent)}: no force is stated there.")
    return " ".join(told)


def consequence_remarks(rows: Sequence[Row]) -> tuple[str, ...]:
    """The conventions behind the levels; none where there are none."""
    if not any(row.consequence is not None for row in rows):
        return ()
    return (
        "Levels of coincidences are those of the one line alone, where it is strongest within 1 % of the "
        "natural frequency (a convention of this program), by the forces stated and the damping assumed.",
        "They count whatever their frequency: the band in which a standard forms its levels would hide slow "
        "lines. So the zone of a coincidence can be worse than that of the whole machine.",
    )


def _line(row: Row) -> str:
    if row.line.order is None:
        return f"{row.line.excitation} at {row.line.from_hz:.4g} Hz"
    return f"{row.line.excitation}, order {row.line.order:g}"


def _rank(row: Row) -> tuple[str, float]:
    found = row.consequence
    assert found is not None
    return found.zone or "", found.velocity_rms_m_s
