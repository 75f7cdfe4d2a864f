"""Modes as tables: frequencies with error bars, effective masses, where the energy sits."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING

import numpy as np

from vib.show.blocks import Block, Column, Heading, Sentence, Table, Tone, text_column
from vib.show.numbers import error_bar, percent, significant, whole_percent
from vib.show.tables.speeds import speed_blocks
from vib.show.words import caution, completeness, rigid_motion, stability

if TYPE_CHECKING:
    from vib.modes import Array, Modes
    from vib.speeds import SpeedCurves


NONE_FOUND = Sentence("No mode was found in the range asked for.", "careful")


def modes_blocks(modes: Modes, title: str, curves: Sequence[SpeedCurves] = ()) -> list[Block]:
    """All that the ``modes`` command shows; a system that is not stable says so before all else."""
    table = frequency_table(modes) if modes.count else NONE_FOUND
    blocks: list[Block] = [Heading(title), *([] if modes.stable else [stability(modes)]), table]
    blocks += [*([stability(modes)] if modes.stable else []), *rigid_motion(modes), completeness(modes)]
    blocks += speed_blocks(curves)
    blocks.append(Sentence(f"Damping: {modes.damping_note}"))
    masses = mass_table(modes)
    if masses is not None:
        blocks.append(masses)
    return [*blocks, caution()]


def frequency_table(modes: Modes) -> Table:
    """One row per mode: frequency, error bar, damped frequency, damping, and the mode in words."""
    rows = []
    tones: list[Tone] = []
    for index in range(modes.count):
        rows.append(
            (
                str(index + 1),
                significant(modes.frequencies_hz[index], 5),
                error_bar(modes.errors_hz[index]),
                significant(modes.damped_frequencies_hz[index], 5),
                percent(modes.damping_ratios[index]),
                modes.descriptions[index],
            )
        )
        tones.append("bad" if modes.eigenvalues[index].real > 0 else "plain")
    columns = (
        Column("mode"),
        Column("natural", "Hz"),
        Column("error", "± Hz"),
        Column("damped", "Hz"),
        Column("damping", "%"),
        text_column("what moves"),
    )
    return Table("Natural frequencies", columns, tuple(rows), tones=tuple(tones))


def mass_table(modes: Modes) -> Table | None:
    """Effective mass of each mode as a share of the whole, along and about the axes; None without anatomy."""
    anatomy = modes.system.anatomy
    if modes.effective_mass is None or anatomy is None or not modes.count:
        return None
    whole = np.diag(anatomy.rigid_mass)
    shares = np.divide(
        modes.effective_mass, whole, out=np.full_like(modes.effective_mass, np.nan), where=whole > 0
    )
    rows = [
        (str(index + 1), *(whole_percent(share) for share in shares[index])) for index in range(modes.count)
    ]
    rows.append(("sum", *(whole_percent(share) for share in shares.sum(axis=0))))
    columns = (
        Column("mode"),
        *(Column(f"along {name}", "%") for name in "xyz"),
        *(Column(f"about {name}", "%") for name in "xyz"),
    )
    return Table("Effective mass, share of the whole (turns: about the origin)", columns, tuple(rows), sums=1)


def energy_words(shares: Mapping[str, Array] | None, index: int, most: int = 3) -> str:
    """The parts that hold most of the energy of a mode: "legs 71 %, beams 20 %"."""
    if not shares:
        return ""
    ranked = sorted(shares.items(), key=lambda entry: -float(entry[1][index]))
    told = [(name, float(values[index])) for name, values in ranked[:most] if values[index] >= 0.01]
    return ", ".join(f"{name} {whole_percent(share)} %" for name, share in told)
