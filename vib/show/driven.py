"""The sections of the page about driven vibration: run-up, severity, forced response."""

from __future__ import annotations

from typing import TYPE_CHECKING

from vib.show.blocks import Block, Bullets, Sentence
from vib.show.sections import Drawing, Section, drawings
from vib.units import UnitSystem

if TYPE_CHECKING:
    from vib.show.tables.respond import Responses
    from vib.show.tables.run_up import RunUps

_MOST_RECORDS = 4
_MOST_RUN_UPS = 4


def run_up_section(found: RunUps | None, stated: bool, units: UnitSystem) -> Section:
    """The run-up, where excitations state forces."""
    if found is None:
        why = "no excitation states a force" if stated else "the study names no [[excitations]]"
        return Section("Run-up", "run-up", (Sentence(f"Not computed: {why}.", "careful"),))
    from vib.show.figures.running import run_up_pictures
    from vib.show.tables.run_up import run_up_facts, run_up_stability, run_up_tables

    pictures = run_up_pictures(found.run_up, found.severity, units)
    curves = [picture for picture in pictures if picture.name.startswith("run_up")]
    kept = [*curves[:_MOST_RUN_UPS], *pictures[len(curves) :]]
    return Section(
        "Run-up",
        "run-up",
        (
            run_up_stability(found.run_up),
            *drawings(kept, "run-up"),
            _left_out(len(curves), _MOST_RUN_UPS, "places"),
            *run_up_tables(found, units),
            run_up_facts(found.run_up),
            Bullets(found.run_up.remarks) if found.run_up.remarks else None,
        ),
    )


def severity_section(found: RunUps | None, asked: bool, units: UnitSystem) -> Section:
    """Predicted vibration against standards and limits."""
    if found is None or found.severity is None:
        why = "no excitation states a force" if asked else "the study has no [severity]"
        return Section("Severity", "severity", (Sentence(f"Not judged: {why}.", "careful"),))
    from vib.show.tables.severity import severity_blocks, severity_remarks

    return Section(
        "Severity",
        "severity",
        (*severity_blocks(found.severity, units), severity_remarks(found.severity)),
    )


def severity_words(found: RunUps | None) -> list[Sentence]:
    """What the reader must know first of predicted vibration; nothing where it was not judged."""
    if found is None:
        return []
    from vib.show.tables.run_up import run_up_stability
    from vib.show.tables.severity import severity_verdict

    told = [] if found.run_up.stable else [run_up_stability(found.run_up)]
    return told if found.severity is None else [*told, severity_verdict(found.severity)]


def response_section(found: Responses | None, units: UnitSystem) -> Section:
    """Response to loads and to a moving ground, over time and over frequency."""
    if found is None:
        words = (
            "Not computed: the study has no [[loads]], no [base_motion] and asks for no frequency response."
        )
        return Section("Forced response", "response", (Sentence(words, "careful"),))
    from vib.show.figures.responding import amplitude_picture, record_picture
    from vib.show.tables.respond import line_blocks, record_blocks, response_stability

    items: list[Block | Drawing | None] = [response_stability(found)]
    record, lines = found.record, found.lines
    if record is not None:
        shown = range(min(len(record.freedoms), _MOST_RECORDS))
        items += drawings([record_picture(record, output, units) for output in shown], "response")
        items.append(_left_out(len(record.freedoms), _MOST_RECORDS, "outputs"))
        items += record_blocks(record, units)
    if lines is not None:
        kind = "receptance"
        shown = range(min(len(lines.inputs), _MOST_RECORDS))
        items += drawings([amplitude_picture(lines, given, kind) for given in shown], "response")
        items += line_blocks(lines)
    remarks = found.remarks
    return Section("Forced response", "response", (*items, Bullets(remarks) if remarks else None))


def _left_out(count: int, most: int, what: str) -> Sentence | None:
    if count <= most:
        return None
    return Sentence(f"The first {most} of {count} {what} are drawn; the tables have them all.", "quiet")
