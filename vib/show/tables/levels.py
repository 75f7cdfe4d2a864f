"""Predicted levels of scattered samples as blocks."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from vib.show.blocks import Block, Column, Sentence, Table, Tone, text_column
from vib.show.numbers import MISSING, aligned, joined, significant
from vib.show.tables.quantities import factor_words
from vib.units import UnitSystem, shown, shown_unit

if TYPE_CHECKING:
    from vib.scatter.levels import Levels, Passing
    from vib.scatter.scatter import Scatter
    from vib.scatter.statistics import Estimate

SELDOM = 0.05  # a probability above this is an objection: common practice, no source
SHOWN = (2.5, 50.0, 97.5)  # percentiles
_MOST_FACTORS = 6


def level_blocks(found: Scatter, units: UnitSystem) -> list[Block]:
    """Predicted vibration at the worst running speed, with the source of its limits."""
    if found.levels is None:
        return []
    unit = shown_unit("velocity", units)
    rows = []
    tones: list[Tone] = []
    for level in found.levels.outputs:
        own = level.velocity_m_s
        at = (own.nominal, *(own.percentiles[percent].value for percent in SHOWN))
        figures = aligned([float(shown(value, "velocity", units)) for value in at], _largest(found, units), 3)
        chances = [MISSING if one is None else _interval(one) for one in (level.zone_c, level.zone_d)]
        rows.append((level.output, *figures, *chances))
        tones.append("plain" if level.zone_c is None or level.zone_c.value <= SELDOM else "bad")
    columns = (
        text_column("output"),
        Column("nominal", unit),
        *(Column("median" if p == 50 else f"{p:g} %", unit) for p in SHOWN),
        text_column("zone C or worse, %"),
        text_column("zone D, %"),
    )
    title = f"R.m.s. velocity at the worst running speed, {found.levels.samples} samples"
    blocks: list[Block] = [Table(title, columns, tuple(rows), tones=tuple(tones))]
    blocks.append(_ends_table(found, found.levels, units))
    sources = dict.fromkeys(one.source for level in found.levels.outputs for one in level.boundaries)
    if sources:
        blocks.append(Sentence(f"Zones by {joined(list(sources))}; the support as of the nominal structure."))
    if own_rows := [
        (
            level.output,
            _OWN[limit.quantity][0],
            _limit(limit, units),
            limit.source,
            _interval(limit.probability),
        )
        for level in found.levels.outputs
        for limit in level.own
    ]:
        own_columns = (
            text_column("output"),
            text_column("quantity"),
            Column("limit"),
            text_column("by"),
            text_column("above it, %"),
        )
        blocks.append(Table("Probability of passing limits of your own", own_columns, tuple(own_rows)))
    return blocks


def _ends_table(found: Scatter, levels: Levels, units: UnitSystem) -> Table:
    """The level of the output that moves most, while one quantity after the other is at its ends."""
    finite = np.where(np.isfinite(levels.ends_m_s), levels.ends_m_s, 0.0)
    output = int(np.argmax(finite.max(axis=(0, 1))))
    own = float(shown(1.0, "velocity", units)) * levels.ends_m_s[:, :, output]
    order = np.argsort(-np.abs(finite[:, 1, output] - finite[:, 0, output]))[:_MOST_FACTORS]
    rows = tuple(
        (
            factor_words(found.study, levels.factors[factor]),
            significant(float(own[factor, 0]), 3),
            significant(float(own[factor, 1]), 3),
        )
        for factor in order
    )
    unit = shown_unit("velocity", units)
    columns = (text_column("quantity"), Column("at 2.5 %", unit), Column("at 97.5 %", unit))
    name = levels.outputs[output].output
    return Table(f"Level of {name} with one quantity at its ends, all others in the middle", columns, rows)


_OWN = {
    "velocity_rms": ("r.m.s. velocity", "velocity"),
    "displacement_rms": ("r.m.s. displacement", "length"),
}


def _limit(limit: Passing, units: UnitSystem) -> str:
    kind = _OWN[limit.quantity][1]
    return f"{significant(float(shown(limit.limit, kind, units)), 3)} {shown_unit(kind, units)}"


def _largest(found: Scatter, units: UnitSystem) -> float:
    assert found.levels is not None
    every = [level.velocity_m_s.percentiles[97.5].value for level in found.levels.outputs]
    return float(shown(max([value for value in every if np.isfinite(value)], default=0.0), "velocity", units))


def _interval(estimate: Estimate) -> str:
    low, high = significant(100 * estimate.low, 3), significant(100 * estimate.high, 3)
    return f"{significant(100 * estimate.value, 3)} ({low} to {high})"
