"""Run-ups for the commands: over the range of a shaft, and where lines meet modes."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from vib.modes import Modes
    from vib.response.run_up import RunUp
    from vib.screening import Line, Screening
    from vib.show.tables.run_up import RunUps
    from vib.study import Study
    from vib.study.excitations import Excitation

_ABOUT = np.array([-1.0, -0.5, 0.0, 0.5, 1.0])  # damping ratios off a resonance; the peak lies between


def drives(study: Study) -> bool:
    """Whether any excitation states a force."""
    return any(True for excitation in study.excitations for _ in excitation.acting())


def run_up_of(
    study: Study, shaft: str | None = None, watch: Sequence[str] = (), modes: Modes | None = None
) -> RunUps:
    """The run-up of a study, judged where it has a [severity].

    Raises
    ------
    ModelError
        Nothing drives, unknown places or shafts, or the severity can't be judged.
    """
    from vib.response.over_speeds import run_up
    from vib.severity import judge
    from vib.show.tables.run_up import RunUps

    if watch:  # stands in for the entry of the study; what [severity] judges is watched besides
        response = study.response.model_copy(update={"watch": tuple(watch)})
        study = study.model_copy(update={"response": response})
    found = run_up(study, shaft=shaft, modes=modes)
    severity = None if study.severity is None else judge(found, study.severity)
    return RunUps(study, found, severity)


def coincidences(study: Study, modes: Modes, screening: Screening) -> Sequence[RunUp]:
    """Run-ups at the speeds where lines meet modes of a screening, one for each machine that turns by itself.

    Empty where no mode lies inside a band of a line that a force is stated for.
    """
    by_name = {excitation.name: excitation for excitation in study.excitations}
    met = [row for row in screening.rows if row.inside and _states(by_name[row.line.excitation], row.line)]
    if not met:
        return ()
    from vib.response.over_speeds import run_up
    from vib.study.excitations import leader

    speeds: dict[str, list[float]] = {}
    for excitation in study.excitations:
        if excitation.turns:
            first, _ = leader(excitation, study.excitations)
            if any(True for _ in excitation.acting()):
                stated = [speed for ends in first.speed_ranges for speed in ends if speed > 0]
                speeds.setdefault(first.name, []).extend(stated)
    for row in met:
        if row.line.order is not None:
            first, ratio = leader(by_name[row.line.excitation], study.excitations)
            there = row.frequency_hz / (row.line.order * ratio)
            speeds[first.name] += (there * (1 + max(row.damping_ratio, 0.0) * _ABOUT)).tolist()
    if not speeds:
        return (run_up(study, modes=modes),)
    return tuple(
        run_up(study, shaft=name, speeds_hz=np.unique(rates), modes=modes) for name, rates in speeds.items()
    )


def _states(excitation: Excitation, line: Line) -> bool:
    """Whether the excitation states a force at this order or fixed frequency."""
    for _, row in excitation.acting():
        known, wanted = (row.fixed(), line.from_hz) if line.order is None else (row.multiples(), line.order)
        if any(abs(one - wanted) <= 1e-9 * wanted for one in known):
            return True
    return False
