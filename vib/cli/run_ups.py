"""Run-ups for the commands: over the range of a shaft, and where lines meet modes."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from vib.modes import Modes
    from vib.response.run_up import RunUp
    from vib.screening import Screening
    from vib.show.tables.run_up import RunUps
    from vib.study import Study

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

    Empty where no excitation states a force, or no mode lies inside a band.
    """
    if not drives(study) or not any(row.inside for row in screening.rows):
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
    for row in screening.rows:
        if row.inside and row.line.order is not None:
            excitation = next(one for one in study.excitations if one.name == row.line.excitation)
            first, ratio = leader(excitation, study.excitations)
            if first.name in speeds:
                met = row.frequency_hz / (row.line.order * ratio)
                speeds[first.name] += (met * (1 + max(row.damping_ratio, 0.0) * _ABOUT)).tolist()
    if not speeds:
        return (run_up(study, modes=modes),)
    return tuple(
        run_up(study, shaft=name, speeds_hz=np.unique(rates), modes=modes) for name, rates in speeds.items()
    )
