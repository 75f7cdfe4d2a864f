"""A sweep as blocks and as a JSON document."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from vib.show.blocks import Block, Bullets, Column, Heading, Sentence, Table
from vib.show.numbers import aligned, significant
from vib.show.tables.quantities import entry_words, quantity_texts
from vib.show.words import CAUTION, caution
from vib.units import UnitSystem, shown, shown_unit

if TYPE_CHECKING:
    from vib.scatter.sweep import Sweep

_MOST_MODES, _MOST_ROWS = 6, 21
_STEADY = 1e-6  # of a damping ratio: less than this is no change


def sweep_blocks(found: Sweep, units: UnitSystem) -> list[Block]:
    """All that the ``sweep`` command shows."""
    blocks: list[Block] = [Heading(found.study.title)]
    if not found.stable:
        count = int(np.count_nonzero(~found.batch.stable))
        blocks.append(Sentence(f"UNSTABLE at {count} of {len(found.batch)} values: motion grows.", "bad"))
    blocks.append(span_table(found))
    if len(found.swept) == 1:
        blocks.append(curve_table(found, units, "frequency"))
        if found.outputs:
            blocks.append(level_table(found, units))
        if np.nanmax(np.ptp(found.damping_ratios, axis=0), initial=0.0) > _STEADY:
            blocks.append(curve_table(found, units, "damping"))
    else:
        blocks.append(Sentence("The maps are drawn, and listed value by value, with --out FOLDER.", "quiet"))
    if found.remarks:
        blocks.append(Bullets(found.remarks))
    return [*blocks, caution()]


def _shown_modes(found: Sweep) -> list[int]:
    return [mode for mode in range(found.modes.count) if found.modes.frequencies_hz[mode] > 0]


def span_table(found: Sweep) -> Table:
    """Least and greatest frequency of each mode over all that was swept."""
    modes = _shown_modes(found)
    flat = found.batch.frequencies_hz
    rows = tuple(
        (
            str(mode + 1),
            significant(found.modes.frequencies_hz[mode], 4),
            significant(float(np.nanmin(flat[:, mode])), 4),
            significant(float(np.nanmax(flat[:, mode])), 4),
        )
        for mode in modes
    )
    columns = Column("mode"), Column("nominal", "Hz"), Column("least", "Hz"), Column("greatest", "Hz")
    swept = " and ".join(entry_words(found.study, one.path) for one in found.swept)
    return Table(f"Natural frequencies over {swept}", columns, rows)


def curve_table(found: Sweep, units: UnitSystem, what: str) -> Table:
    """Frequency or damping of the first modes, value by value; of a long sweep some of the values."""
    (one,) = found.swept
    modes = _shown_modes(found)[:_MOST_MODES]
    picked = _picked(len(one.values))
    *texts, unit = quantity_texts(one.kind, one.values[picked].tolist(), units)
    scale, array, word = (
        (1.0, found.frequencies_hz, "Natural frequencies")
        if what == "frequency"
        else (100.0, found.damping_ratios, "Damping ratios")
    )
    rows = tuple(
        (text, *(significant(scale * float(array[row, mode]), 4) for mode in modes))
        for text, row in zip(texts, picked, strict=True)
    )
    shown = "Hz" if what == "frequency" else "%"
    columns = (
        Column(entry_words(found.study, one.path), unit),
        *(Column(f"mode {m + 1}", shown) for m in modes),
    )
    return Table(f"{word}, value by value", columns, rows)


def _picked(count: int) -> NDArray[np.intp]:
    """Evenly some of so many values."""
    return np.arange(0, count, -(-count // _MOST_ROWS))


def level_table(found: Sweep, units: UnitSystem) -> Table:
    """R.m.s. velocity of the first outputs, value by value; of a long sweep some of the values."""
    (one,) = found.swept
    picked = _picked(len(one.values))
    *texts, unit = quantity_texts(one.kind, one.values[picked].tolist(), units)
    scale = float(shown(1.0, "velocity", units))
    every = scale * found.velocity_rms_m_s[:, :_MOST_MODES]
    largest = float(every[np.isfinite(every)].max(initial=0.0))
    columns = [aligned(values.tolist(), largest) for values in every[picked].T]
    rows = tuple(zip(texts, *columns, strict=True))
    heads = (Column(name, shown_unit("velocity", units)) for name in found.outputs[:_MOST_MODES])
    title = "R.m.s. velocity at the worst running speed, value by value"
    return Table(title, (Column(entry_words(found.study, one.path), unit), *heads), rows)


def sweep_document(found: Sweep) -> dict[str, Any]:
    """What ``vib sweep --json`` prints; of two quantities nested lists, the first outermost."""
    return {
        "title": found.study.title,
        "swept": [
            {
                "entry": one.path,
                "kind": one.kind,
                "nominal_si": one.nominal,
                "values_si": one.values.tolist(),
            }
            for one in found.swept
        ],
        "modes": [
            {
                "number": mode + 1,
                "description": found.modes.descriptions[mode],
                "nominal_hz": found.modes.frequencies_hz[mode],
                "frequency_hz": found.frequencies_hz[..., mode].tolist(),
                "damping_ratio": found.damping_ratios[..., mode].tolist(),
                "likeness": found.batch.likeness[:, mode].reshape(found.shape).tolist(),
            }
            for mode in range(found.modes.count)
        ],
        "levels": [
            {
                "output": name,
                "velocity_rms_m_s": found.velocity_rms_m_s[..., column].tolist(),
                "boundaries": [one.to_dict() for one in found.boundaries[column]],
            }
            for column, name in enumerate(found.outputs)
        ],
        "stable": found.stable,
        "remarks": list(found.remarks),
        "caution": CAUTION,
    }


def sweep_rows(found: Sweep) -> list[dict[str, Any]]:
    """Value by value, for a CSV file."""
    grids = np.meshgrid(*(one.values for one in found.swept), indexing="ij")
    levels = found.velocity_rms_m_s.reshape(len(found.batch), -1)
    named = [(f"{one.path}_si", grid.ravel()) for one, grid in zip(found.swept, grids, strict=True)]
    return [
        {
            **{name: float(values[row]) for name, values in named},
            **{
                f"mode_{mode + 1}_{word}": float(array[row, mode])
                for mode in range(found.modes.count)
                for word, array in (
                    ("frequency_hz", found.batch.frequencies_hz),
                    ("damping_ratio", found.batch.damping_ratios),
                )
            },
            **{
                f"{name}_velocity_rms_m_s": float(levels[row, column])
                for column, name in enumerate(found.outputs)
            },
        }
        for row in range(len(found.batch))
    ]
