"""Modes against the speed of a shaft: critical speeds, whirl, and where motion starts to grow."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from vib.show.blocks import Block, Column, Sentence, Table, text_column
from vib.show.numbers import percent, significant

if TYPE_CHECKING:
    from vib.speeds import SpeedCurves


def speed_blocks(curves: Sequence[SpeedCurves]) -> list[Block]:
    """For each shaft: the onset of instability first, then its critical speeds."""
    blocks: list[Block] = []
    for shaft in curves:
        if shaft.onset is not None:
            onset = shaft.onset
            speed, frequency = significant(60 * onset.speed_hz, 5), significant(onset.frequency_hz, 4)
            text = (
                f"{shaft.shaft}: motion grows by itself from {speed} rpm on, at {frequency} Hz "
                f"({whirl_words(onset.whirl)}, curve {onset.mode})."
            )
            blocks.append(Sentence(text, "bad" if onset.speed_hz <= shaft.stated_hz else "careful"))
        blocks.append(critical_table(shaft) if shaft.critical else _none(shaft))
        blocks += [Sentence(remark, "careful") for remark in shaft.remarks]
    return blocks


def critical_table(curves: SpeedCurves) -> Table:
    """One row per speed at which an order of the shaft meets a mode."""
    rows = tuple(
        (
            f"{row.order:g}",
            significant(60 * row.speed_hz, 5),
            significant(row.frequency_hz, 5),
            percent(row.damping_ratio),
            str(row.mode),
            whirl_words(row.whirl),
        )
        for row in curves.critical
    )
    columns = (
        Column("order"),
        Column("critical speed", "rpm"),
        Column("natural", "Hz"),
        Column("damping", "%"),
        Column("curve"),
        text_column("whirl"),
    )
    top = significant(60 * float(curves.speeds_hz[-1]), 4)
    return Table(f"Critical speeds of {curves.shaft} up to {top} rpm", columns, rows)


def whirl_words(whirl: str) -> str:
    """How the axis of a spinning body goes round, in words."""
    return {
        "forward": "forward whirl",
        "backward": "backward whirl",
        "flat": "to and fro, no whirl",
    }.get(whirl, "-")


def _none(curves: SpeedCurves) -> Sentence:
    top = significant(60 * float(curves.speeds_hz[-1]), 4)
    return Sentence(f"{curves.shaft}: no critical speed of the modes followed up to {top} rpm.", "good")
