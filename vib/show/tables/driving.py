"""What drives a run-up: every line, how large its forces are at the fastest running speed, and by what."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from vib.show.blocks import Column, Table, text_column
from vib.show.numbers import MISSING, joined, significant
from vib.units import UnitSystem, shown, shown_unit

if TYPE_CHECKING:
    from vib.drive import Drive, DriveLine
    from vib.response.run_up import RunUp
    from vib.study import Study

_MOST_LINES = 24
_GRADE = "grade by ISO 21940-11:2016, from memory"


def driving_table(run_up: RunUp, study: Study, units: UnitSystem) -> Table:
    """Every line: what it comes from, its frequencies and its forces at the running speeds."""
    from vib.drive import drive

    planned = drive(run_up.system, study.excitations, shaft=run_up.shaft or None)
    chosen = run_up.in_service
    fastest = run_up.speed_hz[chosen][-1:]
    rows = []
    for line, acting in list(zip(run_up.lines, planned.lines, strict=True))[:_MOST_LINES]:
        low, high = float(line.frequency_hz[chosen].min()), float(line.frequency_hz[chosen].max())
        frequencies = significant(low) if low == high else f"{significant(low)} to {significant(high)}"
        order = MISSING if line.order is None else f"{line.order:.6g}"
        forces = _forces(planned, acting, fastest, units)
        source = _source(study, line.excitation, line.source)
        rows.append((line.excitation, line.source, order, frequencies, forces, source))
    left = len(run_up.lines) - len(rows)
    if left:
        rows.append((f"and {left} more", "", "", "", "", ""))
    columns = (
        text_column("excitation"),
        text_column("by"),
        Column("order"),
        Column("frequency", "Hz"),
        text_column("amplitude"),
        text_column("source"),
    )
    speed = f", amplitude at {60 * float(fastest[0]):.5g} rpm" if run_up.shaft else ""
    return Table(f"What drives the machine{speed}", columns, tuple(rows))


def _forces(planned: Drive, line: DriveLine, speed: np.ndarray, units: UnitSystem) -> str:
    """The greatest force at each place, and the greatest motion of the ground."""
    sizes = np.abs(planned.forces(line, speed))[0]
    found: dict[tuple[str, str], float] = {}
    for number, _ in line.terms:
        aim = planned.inputs[number]
        turning = bool(aim.weights) and not any(aim.weights[:3])
        kind = "moment" if turning or str(aim.along or "").lstrip("+-").startswith("r") else "force"
        found[aim.place, kind] = max(found.get((aim.place, kind), 0.0), float(sizes[number]))
    told = [
        f"{significant(shown(size, kind, units), 3)} {shown_unit(kind, units)} at {place}"
        for (place, kind), size in found.items()
    ]
    if line.shaking:
        ground = np.abs(planned.ground_m(line, speed))[0]
        for axis, _ in line.shaking:
            kind = "angle" if axis >= 3 else "length"
            size = significant(shown(float(ground[axis]), kind, units), 3)
            told.append(f"{size} {shown_unit(kind, units)} of the ground")
    return joined(list(dict.fromkeys(told)))


def _source(study: Study, excitation: str, source: str) -> str:
    """Where a force comes from: a balance grade, or what the study states."""
    row = next((one for one in study.excitations if one.name == excitation), None)
    graded = row is not None and any(one.grade is not None for one in row.unbalance)
    return _GRADE if source == "unbalance" and graded else "as stated"
