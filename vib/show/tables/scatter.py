"""Scatter as blocks and as a JSON document."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from vib.show.blocks import (
    Block,
    Bullets,
    Column,
    Facts,
    Heading,
    Sentence,
    Table,
    Tone,
    text_column,
    unit_label,
)
from vib.show.numbers import MISSING, significant
from vib.show.tables.levels import SELDOM, SHOWN, level_blocks
from vib.show.tables.quantities import entry_words, factor_words, quantity_texts
from vib.show.words import CAUTION, caution
from vib.units import UnitSystem

if TYPE_CHECKING:
    from vib.scatter.chances import Chance
    from vib.scatter.scatter import Scatter
    from vib.scatter.statistics import Distribution, Estimate

_MOST_FACTORS, _MOST_RANKED = 4, 6
_SHIFT = "Shift: by the derivative, while the quantity goes from its value to its upper limit."
_ROUND_OFF = 1e-9  # of a figure: an interval below this is none


def scatter_blocks(found: Scatter, units: UnitSystem) -> list[Block]:
    """All that the ``scatter`` command shows: the verdict first."""
    return [Heading(found.study.title), *scatter_parts(found, units), caution()]


def scatter_parts(found: Scatter, units: UnitSystem) -> list[Block]:
    """The same without its title and the caution."""
    blocks: list[Block | None] = [*verdict(found), Facts(_facts(found)), quantity_table(found, units)]
    blocks += [frequency_table(found), damping_table(found), chance_table(found)]
    blocks += level_blocks(found, units)
    if (ranked := ranking_table(found)) is not None:
        blocks += [ranked, Sentence(_SHIFT, "quiet")]
    blocks.append(Bullets(found.remarks) if found.remarks else None)
    return [block for block in blocks if block is not None]


def objects(found: Scatter) -> bool:
    """Whether a resonance, or a level in zone C or worse, is likely enough to count, or something grows."""
    met = found.chances is not None and found.chances.any_line.value > SELDOM
    level = (
        found.levels is not None and found.levels.zone_c is not None and found.levels.zone_c.value > SELDOM
    )
    own = found.levels is not None and any(
        limit.probability.value > SELDOM for level in found.levels.outputs for limit in level.own
    )
    return not found.stable or met or level or own


def verdict(found: Scatter) -> list[Sentence]:
    """What the reader must know first."""
    told = []
    if not found.stable:
        share = 1 - float(np.mean(found.batch.stable))
        told.append(
            Sentence(f"UNSTABLE in {100 * share:.3g} % of the samples: motion grows by itself.", "bad")
        )
    if found.chances is None:
        return [*told, Sentence("No probability of resonance: the study names no excitations.", "careful")]
    chance = found.chances.any_line
    text = f"A mode that can be driven lies within a band with a probability of {probability_words(chance)}."
    told.append(Sentence(text, _tone_of(chance)))
    zone = None if found.levels is None else found.levels.zone_c
    if zone is not None:
        words = f"The level is in zone C or worse with a probability of {probability_words(zone)}."
        told.append(Sentence(words, _tone_of(zone)))
    return told


def _tone_of(chance: Estimate) -> Tone:
    return "bad" if chance.value > SELDOM else ("careful" if chance.value > 0 else "good")


def probability_words(estimate: Estimate) -> str:
    """Such as "12.3 % (10.4 to 14.5 %)"."""
    low, high = significant(100 * estimate.low, 3), significant(100 * estimate.high, 3)
    return f"{significant(100 * estimate.value, 3)} % ({low} to {high} %)"


def _facts(found: Scatter) -> tuple[tuple[str, str], ...]:
    full = int(np.count_nonzero(found.batch.full))
    drawn = f"{found.samples} by {_METHODS[found.method]}, seed {found.seed}"
    if full:
        drawn += f"; {full} of them solved in full"
    rows = [("samples", drawn)]
    intervals = "95 %, from the number of samples alone; the error of each frequency is not in them"
    rows.append(("intervals", intervals))
    worst = float(np.nanmax(found.batch.errors_hz, initial=0.0))
    rows.append(("largest error bar", f"{significant(worst, 2)} Hz of a frequency of any sample"))
    return tuple(rows)


_METHODS = {"sobol": "a scrambled Sobol sequence", "latin hypercube": "a Latin hypercube"}


def quantity_table(found: Scatter, units: UnitSystem) -> Table:
    """What scatters, and how."""
    rows = []
    for row in found.factors.tolerances:
        *figures, unit = quantity_texts(row.kind, (row.nominal, row.low, row.high), units)
        name = f"{entry_words(found.study, row.path)}, {unit_label(unit)}"
        drawn = row.distribution if row.group is None else f"{row.distribution}, group {row.group}"
        if row.group is not None and row.correlation < 1:
            drawn += f" ({row.correlation:g})"
        rows.append((name, *figures, drawn))
    columns = (
        text_column("quantity"),
        Column("value"),
        Column("from"),
        Column("to"),
        text_column("drawn"),
    )
    return Table("What scatters", columns, tuple(rows))


def elastic(found: Scatter) -> list[int]:
    """Positions of the modes above 0 Hz."""
    return [mode for mode in range(found.modes.count) if found.modes.frequencies_hz[mode] > 0]


def frequency_table(found: Scatter) -> Table:
    """Nominal frequency and percentiles of each mode, with half their intervals."""
    rows = tuple((str(mode + 1), *_figures(found.frequencies_hz[mode], 1.0)) for mode in elastic(found))
    return Table("Natural frequencies", _columns("Hz"), rows)


def damping_table(found: Scatter) -> Table | None:
    """The same of the damping ratios, where they scatter."""
    varying = [mode for mode in elastic(found) if found.damping_ratios[mode].deviation > 1e-9]
    if not varying:
        return None
    rows = tuple((str(mode + 1), *_figures(found.damping_ratios[mode], 100.0)) for mode in varying)
    return Table("Damping ratios", _columns("%"), rows)


def _columns(unit: str) -> tuple[Column, ...]:
    pairs = [(Column("median" if p == 50 else f"{p:g} %", unit), Column("±", unit)) for p in SHOWN]
    return Column("mode"), Column("nominal", unit), *(column for pair in pairs for column in pair)


def _figures(own: Distribution, scale: float) -> tuple[str, ...]:
    found = [significant(scale * own.nominal, 4)]
    for percent in SHOWN:
        estimate = own.percentiles[percent]
        found += [significant(scale * estimate.value, 4)]
        half = (estimate.high - estimate.low) / 2
        found += ["0" if half <= _ROUND_OFF * abs(estimate.value) else significant(scale * half, 2)]
    return tuple(found)


def chance_table(found: Scatter) -> Table | None:
    """The probability of each mode to lie within each band; None without excitations."""
    if found.chances is None:
        return None
    rows, tones = [], []
    for line in found.chances.by_line:
        own = [row for row in found.chances.by_mode if row.line == line.line]
        for row in (*own, line):
            rows.append(_chance_row(row))
            tones.append(_tone(row))
    columns = (
        text_column("excitation"),
        Column("order"),
        Column("band", "Hz"),
        text_column("mode"),
        Column("probability", "%"),
        text_column("95 % interval, %"),
    )
    title = "Probability of a mode within a band (any: of those that it can drive)"
    return Table(title, columns, tuple(rows), tones=tuple(tones))


def _chance_row(row: Chance) -> tuple[str, ...]:
    number = "any" if row.mode is None else str(row.mode)
    mode = number if row.drivable else f"{number}, hardly driven"
    line, chance = row.line, row.probability
    return (
        line.excitation,
        MISSING if line.order is None else f"{line.order:g}",
        f"{significant(line.band_from_hz, 4)} to {significant(line.band_to_hz, 4)}",
        mode,
        significant(100 * chance.value, 3),
        f"{significant(100 * chance.low, 3)} to {significant(100 * chance.high, 3)}",
    )


def _tone(row: Chance) -> Tone:
    if not row.drivable:
        return "quiet"
    return "bad" if row.probability.value > SELDOM else "plain"


def ranking_table(found: Scatter) -> Table | None:
    """The factors that matter most to each of the first modes; None where no frequency scatters."""
    ranking = found.ranking
    if ranking is None:
        return None
    rows = []
    for mode in elastic(found)[:_MOST_RANKED]:
        total = ranking.frequencies.total[:, mode]
        for factor in strongest(total)[:_MOST_FACTORS]:
            rows.append(
                (
                    str(mode + 1),
                    factor_words(found.study, ranking.factors[factor]),
                    *_share(
                        ranking.frequencies.first[factor, mode], ranking.frequencies.first_error[factor, mode]
                    ),
                    *_share(total[factor], ranking.frequencies.total_error[factor, mode]),
                    significant(found.shifts_hz[mode, factor], 3),
                )
            )
    if not rows:
        return None
    columns = (
        Column("mode"),
        text_column("quantity"),
        Column("first order", "%"),
        Column("±", "%"),
        Column("total", "%"),
        Column("±", "%"),
        Column("shift", "Hz"),
    )
    return Table("What the scatter of the frequencies comes from", columns, tuple(rows))


def strongest(total: Any) -> list[int]:
    """Positions of the factors with an effect to speak of (above 1 %), the strongest first."""
    return [int(row) for row in np.argsort(-np.nan_to_num(total)) if total[row] > 0.01]


def _share(value: float, error: float) -> tuple[str, str]:
    return f"{100 * value:.1f}", f"{100 * error:.1f}"


def scatter_document(found: Scatter) -> dict[str, Any]:
    """What ``vib scatter --json`` prints."""
    ranking, met = found.ranking, found.chances
    paths = found.factors.paths
    return {
        "title": found.study.title,
        "samples": found.samples,
        "seed": found.seed,
        "method": found.method,
        "solved_in_full": int(np.count_nonzero(found.batch.full)),
        "swapped": int(np.count_nonzero(found.batch.swapped)),
        "unstable": int(np.count_nonzero(~found.batch.stable)),
        "stable": found.stable,
        "quantities": [
            {
                "entry": row.path,
                "kind": row.kind,
                "value_si": row.nominal,
                "from_si": row.low,
                "to_si": row.high,
                "distribution": row.distribution,
                "group": row.group,
                "correlation": row.correlation if row.group is not None else None,
            }
            for row in found.factors.tolerances
        ],
        "modes": [
            {
                "number": mode + 1,
                "description": found.modes.descriptions[mode],
                "frequency": found.frequencies_hz[mode].to_dict("_hz"),
                "damping_ratio": found.damping_ratios[mode].to_dict(""),
                "slopes_hz_per_si": dict(zip(paths, found.slopes[mode], strict=True)),
            }
            for mode in range(found.modes.count)
        ],
        "probability_of_resonance": None if met is None else met.any_line.to_dict("probability"),
        "bands": [] if met is None else [row.to_dict() for row in (*met.by_line, *met.by_mode)],
        "levels": None if found.levels is None else found.levels.to_dict(),
        "ranking": None if ranking is None else ranking.to_dict(),
        "remarks": list(found.remarks),
        "caution": CAUTION,
    }
