"""Sweeps: frequencies and damping while one quantity of a study, or two, run from one value to another."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Literal

import numpy as np

from vib.errors import ModelError, UnitError
from vib.scatter.batch import Array, Batch
from vib.scatter.engine import Progress, Where, calmly, limits_of, reanalysis_of
from vib.scatter.family import Family, nominal_value
from vib.scatter.levels import VELOCITY, predicting
from vib.severity.standards import Boundaries
from vib.units import parse

if TYPE_CHECKING:
    from vib.modes import Modes
    from vib.study import Study

Spacing = Literal["linear", "logarithmic"]
STEPS = {1: 41, 2: 15}
MOST_STEPS = 2000
CLEAR = 0.7  # modal assurance with the nominal shape below which a mode is not surely the same one


@dataclass(frozen=True, eq=False)
class Swept:
    """A quantity that is swept: its entry, its kind (see `vib.units.KINDS`), its values (k,), SI."""

    path: str
    kind: str
    nominal: float
    values: Array


@dataclass(frozen=True, kw_only=True, eq=False)
class Sweep:
    """Modes against one quantity or two.

    Attributes
    ----------
    study, modes
        The nominal study and its modes; a mode is the one of the same shape everywhere.
    swept
        The one or two quantities, with k or k1 and k2 values.
    batch
        What was found, value by value; of two quantities the second runs faster.
    outputs, boundaries
        (q,) where vibration is predicted, and the boundaries of the zones there; () where no force is stated.
    remarks
        What the reader should know, in words.
    """

    study: Study
    modes: Modes
    swept: tuple[Swept, ...]
    batch: Batch
    outputs: tuple[str, ...]
    boundaries: tuple[tuple[Boundaries, ...], ...]
    remarks: tuple[str, ...]

    @property
    def shape(self) -> tuple[int, ...]:
        """(k,) or (k1, k2): how many values there are."""
        return tuple(len(one.values) for one in self.swept)

    @property
    def frequencies_hz(self) -> Array:
        """Natural frequencies (k, m) or (k1, k2, m)."""
        return self.batch.frequencies_hz.reshape(*self.shape, -1)

    @property
    def damping_ratios(self) -> Array:
        """Damping ratios (k, m) or (k1, k2, m)."""
        return self.batch.damping_ratios.reshape(*self.shape, -1)

    @property
    def velocity_rms_m_s(self) -> Array:
        """R.m.s. velocity in the band of the standard at the worst running speed, (k, q) or (k1, k2, q)."""
        levels = self.batch.levels
        found = np.zeros((len(self.batch), 0)) if levels is None else levels[:, :, VELOCITY]
        return found.reshape(*self.shape, -1)

    @property
    def stable(self) -> bool:
        """Whether nothing grows anywhere."""
        return bool(self.batch.stable.all())


def sweep(
    study: Study,
    vary: Mapping[str, tuple[str | float, str | float]],
    *,
    steps: int | None = None,
    spacing: Spacing = "linear",
    levels: bool = True,
    count: int | None = None,
    up_to: str | float | None = None,
    workers: int | None = None,
    cluster: str | None = None,
    resume_in: str | Path | None = None,
    progress: Progress | None = None,
) -> Sweep:
    """Find the modes while one quantity or two run from one value to another.

    Parameters
    ----------
    study
        Read from a file.
    vary
        From and to of each quantity by its entry, such as ``{"springs[0].stiffness.x": ("1 kN/mm",
        "4 kN/mm")}``: text with a unit, or SI numbers.
    steps
        How many values of each; default: 41 of one quantity, 15 of two.
    spacing
        Of the values; ``"logarithmic"`` for quantities above zero.
    levels
        Whether to predict vibration where forces are stated, which takes some hundredths of a second a value.
    count, up_to, workers, cluster, resume_in, progress
        As for `vib.scatter.scatter.scatter`.

    Raises
    ------
    ModelError
        No quantity or more than two, a range of no width, or a structure that can't be built.
    StudyError
        There is no such entry, it is no quantity, or a value is none that it may have.
    UnitError
        A value that can't be read.
    """
    if len(vary) not in STEPS:
        raise ModelError(f"vary: one quantity or two are swept, got {len(vary)}")
    number = STEPS[len(vary)] if steps is None else steps
    if isinstance(number, bool) or int(number) != number or not 2 <= number <= MOST_STEPS:
        raise ModelError(f"steps: a whole number from 2 to {MOST_STEPS} is needed, got {steps!r}")
    swept = tuple(_swept(study, path, ends, int(number), spacing) for path, ends in vary.items())
    for one in swept:
        for value in (one.values[0], one.values[-1]):
            study.varied({one.path: float(value)})
    grid = np.meshgrid(*(one.values for one in swept), indexing="ij")
    values = np.stack([axis.ravel() for axis in grid], axis=1)
    bounds = {one.path: (float(one.values.min()), float(one.values.max())) for one in swept}
    with calmly(study):
        family = Family.from_study(study, bounds, **limits_of(study, count, up_to, None))
        reanalysis = reanalysis_of(family, values)
        asked = predicting(study, reanalysis.evaluator) if levels else None
        task = reanalysis.evaluator if asked is None else asked.task
        batch = Where(workers, cluster, resume_in, progress).run(task, values, "sweep")
    notes = (*_remarks(batch), *reanalysis.remarks)
    return Sweep(
        study=study,
        modes=family.modes,
        swept=swept,
        batch=batch,
        outputs=() if asked is None else asked.outputs,
        boundaries=() if asked is None else asked.boundaries,
        remarks=notes,
    )


def _swept(
    study: Study, path: str, ends: tuple[str | float, str | float], steps: int, spacing: Spacing
) -> Swept:
    nominal = nominal_value(study, path)
    kind = study.kind_of(path, nominal)
    try:
        unit = study.units.declared().get(kind)
        start, stop = (parse(end, kind, unit=unit) if isinstance(end, str) else float(end) for end in ends)
    except UnitError as error:
        raise UnitError(f"{path}: {error}") from None
    if not np.isfinite([start, stop]).all() or start == stop:
        raise ModelError(f"{path}: two different values are needed to sweep between")
    if spacing == "linear":
        return Swept(path, kind, nominal, np.linspace(start, stop, steps))
    if spacing != "logarithmic":
        raise ModelError(f"spacing: linear or logarithmic is needed, got {spacing!r}")
    if min(start, stop) <= 0:
        raise ModelError(f"{path}: logarithmic spacing needs values above zero")
    return Swept(path, kind, nominal, np.geomspace(start, stop, steps))


def _remarks(batch: Batch) -> tuple[str, ...]:
    said = []
    unclear = int(np.count_nonzero(batch.likeness.min(axis=1) < CLEAR))
    if unclear:
        said.append(
            f"At {unclear} of {len(batch)} values a mode has little of the nominal shape that it is followed "
            f"by (modal assurance below {CLEAR:g}): near there curves may trade places."
        )
    lacking = int(np.count_nonzero(np.isnan(batch.frequencies_hz).any(axis=1)))
    if lacking:
        said.append(
            f"At {lacking} of {len(batch)} values a motion is overdamped and nominally not, or the other way "
            "round, and a mode is lacking: its figures are those of the others."
        )
    grown = int(np.count_nonzero(~batch.stable))
    if grown:
        said.append(f"At {grown} of {len(batch)} values a motion grows by itself.")
    return tuple(said)
