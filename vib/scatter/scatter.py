"""Scatter: what the tolerances of a study do to its frequencies, damping and levels."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from vib.errors import ModelError, StudyError
from vib.scatter.batch import Array, Batch
from vib.scatter.chances import Chances, chances
from vib.scatter.engine import Progress, Where, calmly, limits_of, reanalysis_of
from vib.scatter.family import Family
from vib.scatter.levels import Levels, ends, levels, predicting
from vib.scatter.ranking import Effects, effects
from vib.scatter.reanalysis import Reanalysis
from vib.scatter.sampling import Design, Factors, Method, is_power_of_two, unit_points
from vib.scatter.sensitivity import sensitivities
from vib.scatter.statistics import Distribution, distribution, enough_for_percentiles

if TYPE_CHECKING:
    from vib.modes import Modes
    from vib.study import Study

USUAL_SAMPLES, USUAL_LEVELS = 1024, 128
HALF = 0.5  # modal assurance below which a mode is another one
MOST_CORNERS = 8  # quantities of one table that are tried at all corners
LEAST_ROWS, MOST_ROWS = 64, 1024  # of the design that ranks the factors


@dataclass(frozen=True, eq=False)
class Ranking:
    """Which factors matter, by variance and by derivative.

    Attributes
    ----------
    factors
        Names (f,): an entry of the study, or a group.
    frequencies, damping_ratios
        Effects on the frequency and on the damping ratio of each mode.
    rows
        Of the design that the effects are from.
    """

    factors: tuple[str, ...]
    frequencies: Effects
    damping_ratios: Effects
    rows: int

    def to_dict(self) -> dict[str, Any]:
        """Plain values, factor by factor; one figure for each mode."""
        return {
            "rows": self.rows,
            "factors": [
                {
                    "factor": factor,
                    "frequency": self.frequencies.of_factor(number),
                    "damping_ratio": self.damping_ratios.of_factor(number),
                }
                for number, factor in enumerate(self.factors)
            ],
        }


@dataclass(frozen=True, kw_only=True, eq=False)
class Scatter:
    """Frequencies and damping of a study whose quantities scatter.

    Attributes
    ----------
    study, modes
        The nominal study and its modes; a mode of a sample is the one of the same shape.
    factors
        What was drawn, with the tolerances of the d quantities.
    seed, method
        Of the samples.
    values
        (N, d) the quantities of each sample, SI.
    batch
        What was found for each sample.
    frequencies_hz, damping_ratios
        (m,) distributions.
    chances
        Probabilities of a mode within the band of an excitation; None without excitations.
    levels
        Predicted vibration of some of the samples; None where nothing states a force.
    ranking
        Which factors matter; None where it was not asked for.
    slopes
        (m, d) derivative of each undamped natural frequency by each quantity, Hz per SI unit.
    remarks
        What the reader should know, in words.
    """

    study: Study
    modes: Modes
    factors: Factors
    seed: int
    method: Method
    values: Array
    batch: Batch
    frequencies_hz: tuple[Distribution, ...]
    damping_ratios: tuple[Distribution, ...]
    chances: Chances | None
    levels: Levels | None
    ranking: Ranking | None
    slopes: Array
    remarks: tuple[str, ...]

    @property
    def samples(self) -> int:
        """How many samples there are."""
        return len(self.values)

    @property
    def stable(self) -> bool:
        """Whether nothing grows in any sample."""
        return bool(self.batch.stable.all())

    @property
    def shifts_hz(self) -> Array:
        """(m, f) linear change of each frequency while a factor goes from nominal to its upper limit."""
        reach = np.array([(row.high - row.low) / 2 for row in self.factors.tolerances])
        return np.asarray((self.slopes * reach) @ self.factors.loadings)


def scatter(
    study: Study,
    *,
    samples: int = USUAL_SAMPLES,
    seed: int = 0,
    method: Method = "sobol",
    count: int | None = None,
    up_to: str | float | None = None,
    band: float | str | None = None,
    ranking: bool = True,
    level_samples: int = USUAL_LEVELS,
    workers: int | None = None,
    cluster: str | None = None,
    resume_in: str | Path | None = None,
    progress: Progress | None = None,
) -> Scatter:
    """Draw the quantities of a study within their tolerances and find the modes of every sample.

    The same seed gives the same numbers, whatever the number of workers.

    Parameters
    ----------
    study
        With tolerances (`Study.tolerances`).
    samples
        How many; of a Sobol sequence a power of two is best.
    seed, method
        Of the samples: ``"sobol"`` (scrambled) or ``"latin hypercube"``.
    count, up_to
        Which modes, of the nominal structure; default: those that may fall within the band of an excitation,
        or twelve.
    band
        Half width of the bands of excitations that have none of their own.
    ranking
        Whether to rank the quantities, which takes half as many further samples for each of them (at most
        1024), and for two more.
    level_samples
        For how many of the samples vibration is predicted, where forces are stated; each takes some
        hundredths of a second.
    workers
        How many processes; default: one for each core.
    cluster
        Address of the scheduler of a Dask cluster, instead of processes.
    resume_in
        Folder that keeps what is done, so that an interrupted run can be taken up again.
    progress
        Is told the share done, 0 to 1, and the seconds left.

    Raises
    ------
    ModelError
        The study states no tolerances, or a sample is no structure that can be built.
    StudyError
        A sample has a value that its entry may not have.
    AccuracyError
        A solver did not finish.
    """
    factors = Factors.of(tuple(study.tolerances.values()))
    values = factors.values(unit_points(samples, len(factors.names), seed=seed, method=method))
    check_values(study, factors.paths, values)
    design, further = None, np.zeros((0, values.shape[1]))
    if ranking:
        design = Design.of(_rows(samples), len(factors.names), seed=seed, method=method)
        further = factors.values(design.points)
        check_values(study, factors.paths, further)
    everything = np.vstack([values, further])
    limits = zip(everything.min(axis=0).tolist(), everything.max(axis=0).tolist(), strict=True)
    bounds = dict(zip(factors.paths, limits, strict=True))
    where = Where(workers, cluster, resume_in, progress)
    with calmly(study):
        family = Family.from_study(study, bounds, **limits_of(study, count, up_to, band))
        reanalysis = reanalysis_of(family, values)
        found = where.run(reanalysis.evaluator, everything, "samples")
        predicted = _predicted(reanalysis, factors, values[:level_samples], where)
        slopes = sensitivities(family)
    modes, batch = family.modes, _part(found, slice(0, samples))
    met = chances(study, modes, factors.paths, values, batch, band=band) if study.excitations else None
    ranked = None
    if design is not None:
        ranked = _ranked(factors, design, _part(found, slice(samples, None)), seed)
    return Scatter(
        study=study,
        modes=modes,
        factors=factors,
        seed=seed,
        method=method,
        values=values,
        batch=batch,
        frequencies_hz=_distributions(batch.frequencies_hz, modes.frequencies_hz),
        damping_ratios=_distributions(batch.damping_ratios, modes.damping_ratios),
        chances=met,
        levels=predicted,
        ranking=ranked,
        slopes=slopes,
        remarks=(*_remarks(samples, method, batch, met), *reanalysis.remarks),
    )


def _predicted(reanalysis: Reanalysis, factors: Factors, values: Array, where: Where) -> Levels | None:
    """Predicted vibration of some samples (N, d); None where nothing states a force, or of no samples."""
    asked = predicting(reanalysis.evaluator.builder.study, reanalysis.evaluator) if len(values) else None
    if asked is None:
        return None
    batch = where.run(asked.task, np.vstack([values, ends(factors)]), "levels of samples")
    return levels(asked, factors, batch)


def _rows(samples: int) -> int:
    """Rows of the design: a power of two about half the number of samples."""
    return 1 << (min(max(samples // 2, LEAST_ROWS), MOST_ROWS).bit_length() - 1)


def _part(batch: Batch, rows: slice) -> Batch:
    return Batch(**{name: array[rows] for name, array in batch.arrays().items()})


def _distributions(values: Array, nominal: Array) -> tuple[Distribution, ...]:
    return tuple(distribution(column, float(own)) for column, own in zip(values.T, nominal, strict=True))


def _ranked(factors: Factors, design: Design, batch: Batch, seed: int) -> Ranking:
    frequencies = effects(design, batch.frequencies_hz, seed=seed)
    damping = effects(design, batch.damping_ratios, seed=seed)
    return Ranking(factors.names, frequencies, damping, len(design.first))


def check_values(study: Study, paths: tuple[str, ...], values: Array) -> None:
    """That every sample (N, d) has values that their entries may have.

    Each quantity is tried at its least and its greatest value, and all those of one table at all corners of
    what was drawn. Only where a corner is not allowed are the samples tried one by one.

    Raises
    ------
    StudyError
        A value that its entry may not have, with the first sample that has it.
    """
    tables: dict[str, list[int]] = {}
    for column, path in enumerate(paths):
        tables.setdefault(_table(path), []).append(column)
    for columns in tables.values():
        picked = values[:, columns]
        corners = np.stack(np.meshgrid(*np.stack([picked.min(axis=0), picked.max(axis=0)], axis=1)), axis=-1)
        names = [paths[column] for column in columns]
        if len(columns) <= MOST_CORNERS and all(
            _allowed(study, dict(zip(names, corner.tolist(), strict=True))) is None
            for corner in corners.reshape(-1, len(columns))
        ):
            continue
        for number, sample in enumerate(picked):
            given = dict(zip(names, sample.tolist(), strict=True))
            fault = _allowed(study, given)
            if fault is not None:
                raise ModelError(
                    f"sample {number + 1} of {len(values)} can't be: {fault}. Narrow the tolerance, or "
                    'choose distribution = "lognormal", which stays above zero'
                )


def _table(path: str) -> str:
    """The table that an entry stands in: "springs[0]", "points.A"."""
    first, _, rest = path.partition(".")
    named = first in ("points", "materials", "sections")
    return f"{first}.{rest.partition('.')[0].partition('[')[0]}" if named else first


def _allowed(study: Study, given: Mapping[str, float]) -> StudyError | None:
    try:
        study.varied(given)
    except StudyError as error:
        return error
    return None


def _remarks(samples: int, method: Method, batch: Batch, met: Chances | None) -> tuple[str, ...]:
    said = []
    if method == "sobol" and not is_power_of_two(samples):
        below = 1 << (samples.bit_length() - 1)
        said.append(
            f"{samples} points of a Sobol sequence are a little less even than {below} or {2 * below} are."
        )
    if not enough_for_percentiles(samples):
        said.append(
            f"{samples} samples are too few for the interval of the outermost percentiles: it may reach "
            "further than the least or the greatest value drawn."
        )
    swapped = int(np.count_nonzero(batch.swapped))
    if swapped:
        said.append(
            f"In {swapped} of {samples} samples modes stand in another order of frequency than nominally; "
            "each is followed by its shape."
        )
    mixed = int(np.count_nonzero(np.nanmin(batch.likeness, axis=1) < HALF))
    if mixed:
        said.append(
            f"In {mixed} of {samples} samples a mode has less than half of the nominal shape that it is "
            "followed by: what is said of it alone depends on the naming, what is said of any mode does not."
        )
    lacking = int(np.count_nonzero(np.isnan(batch.frequencies_hz).any(axis=1)))
    if lacking:
        said.append(
            f"In {lacking} of {samples} samples a motion is overdamped and nominally not, or the other way "
            "round, and a mode is lacking: its figures are those of the others."
        )
    grown = int(np.count_nonzero(~batch.stable))
    if grown:
        said.append(f"In {grown} of {samples} samples a motion grows by itself.")
    if met is not None:
        missing = int(np.count_nonzero(~(batch.complete_hz >= met.needed_hz)))
        if missing:
            said.append(
                f"In {missing} of {samples} samples a mode that is not followed may lie below the top of the "
                "highest band: ask for more modes (count, up_to)."
            )
    return tuple(said)
