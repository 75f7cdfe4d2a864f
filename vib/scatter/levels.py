"""Predicted vibration of many samples, and the probability that it passes a limit.

Each sample is rebuilt and answered by the whole damped model (`vib.run_up`) at speeds at which the machine
runs: at single speeds there, over a range at its ends and wherever a line meets a mode of that sample.
What the support is taken for, rigid or flexible, is judged once, for the nominal structure.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np

from vib.response.over_speeds import run_up
from vib.scatter.batch import Array, Batch
from vib.scatter.evaluator import Evaluator
from vib.scatter.sampling import Factors
from vib.scatter.statistics import Distribution, Estimate, distribution, probability
from vib.severity import judge
from vib.severity.judging import judged_outputs, main_frequency
from vib.severity.levels import band_levels, zone_numbers
from vib.severity.standards import Boundaries, band_from_hz

if TYPE_CHECKING:
    from vib.response.run_up import RunUp
    from vib.study import Study
    from vib.study.severity import Severity as Table

LOW = 0.025  # share of the values below the low end of a factor, and above its high one
CHUNK = 16  # samples that are handed out at a time: one takes some hundredths of a second
# what stands in the last axis of `Batch.levels`
VELOCITY, DISPLACEMENT, WHOLE_VELOCITY, WHOLE_DISPLACEMENT = range(4)


@dataclass(frozen=True)
class Passing:
    """The probability that a level is above a limit (m/s or m), which ``source`` names."""

    quantity: str
    limit: float
    source: str
    probability: Estimate


@dataclass(frozen=True, eq=False)
class Level:
    """One output: its r.m.s. velocity (m/s) in the band of the standard, at its worst running speed.

    ``boundaries`` are those of its zones; ``zone_c``, ``zone_d`` the probabilities that it is in zone C or
    worse, and in zone D, None without a standard; ``own`` limits of the user's own.
    """

    output: str
    velocity_m_s: Distribution
    boundaries: tuple[Boundaries, ...]
    zone_c: Estimate | None
    zone_d: Estimate | None
    own: tuple[Passing, ...]

    def to_dict(self) -> dict[str, Any]:
        """Plain values."""
        zones = {"zone_c_or_worse": self.zone_c, "zone_d": self.zone_d}
        return {
            "output": self.output,
            "velocity_rms": self.velocity_m_s.to_dict("_m_s"),
            "boundaries": [one.to_dict() for one in self.boundaries],
            **{name: None if one is None else one.to_dict("probability") for name, one in zones.items()},
            "own_limits": [
                {
                    "quantity": one.quantity,
                    "limit_si": one.limit,
                    "source": one.source,
                    **one.probability.to_dict("probability"),
                }
                for one in self.own
            ],
        }


@dataclass(frozen=True, eq=False)
class Levels:
    """Predicted vibration of the first samples.

    ``velocity_rms_m_s`` (n, q) of every sample and output, in the band of the standard; ``zone_c`` and
    ``zone_d`` are the probabilities that any output is in zone C or worse, and in zone D; ``nominal`` the
    judgement of the nominal structure in words, "" without [severity]. ``ends_m_s`` (f, 2, q) are the levels
    while one of the ``factors`` is where 2.5 % of its values lie below, and above, the others in the middle.
    """

    velocity_rms_m_s: Array
    factors: tuple[str, ...]
    ends_m_s: Array
    outputs: tuple[Level, ...]
    zone_c: Estimate | None
    zone_d: Estimate | None
    nominal: str

    @property
    def samples(self) -> int:
        """How many samples there are."""
        return len(self.velocity_rms_m_s)

    def to_dict(self) -> dict[str, Any]:
        """Plain values."""
        zones = {"zone_c_or_worse": self.zone_c, "zone_d": self.zone_d}
        return {
            "samples": self.samples,
            "outputs": [level.to_dict() for level in self.outputs],
            "one_at_a_time": [
                {
                    "factor": factor,
                    "velocity_rms_at_low_m_s": low.tolist(),
                    "velocity_rms_at_high_m_s": high.tolist(),
                }
                for factor, (low, high) in zip(self.factors, self.ends_m_s, strict=True)
            ],
            **{name: None if one is None else one.to_dict("probability") for name, one in zones.items()},
            "nominal": self.nominal,
        }


@dataclass(frozen=True, eq=False)
class Measuring:
    """What is asked of every sample: modes by the evaluator, then levels of the outputs.

    ``watched`` are places and components; ``shaft`` the one that the speeds are of; ``rates`` the frequency
    of each line over that speed.
    """

    evaluator: Evaluator
    table: Table | None
    watched: tuple[tuple[str, Any], ...]
    shaft: str
    rates: tuple[float, ...]

    @property
    def chunk(self) -> int:
        """How many samples are handed out at a time."""
        return CHUNK

    @cached_property
    def fingerprint(self) -> str:
        """Equal for tasks that give the same results."""
        return f"levels {self.evaluator.fingerprint} {self.watched} {self.shaft} {self.rates} {self.table}"

    def __call__(self, samples: Array) -> Batch:
        """Modes and levels (N, q, 4) of samples (N, d)."""
        batch = self.evaluator(samples)
        found = [self._levels(sample, own) for sample, own in zip(samples, batch.frequencies_hz, strict=True)]
        return replace(batch, levels=np.array(found).reshape(len(samples), len(self.watched), 4))

    def _levels(self, sample: Array, frequencies_hz: Array) -> Array:
        """Levels (q, 4) of one sample (d,) with modes at these frequencies."""
        builder = self.evaluator.builder
        system = builder.system(sample)
        if system.anatomy is not None:  # the division of the nominal structure is kept
            system = replace(system, anatomy=replace(system.anatomy, division=None, discretisation=None))
        study = builder.study.varied(dict(zip(builder.paths, sample.tolist(), strict=True)))
        found = run_up(
            system,
            excitations=study.excitations,
            shaft=self.shaft or None,
            speeds_hz=self._speeds(study, frequencies_hz) if self.shaft else None,
            watch=self.watched,
        )
        return levels_of(found, self.table)

    def _speeds(self, study: Study, frequencies_hz: Array) -> Array:
        """Running speeds (k,), rev/s, at which the level is looked at."""
        ranges = next(row for row in study.excitations if row.name == self.shaft).speed_ranges
        met = [frequency / rate for frequency in frequencies_hz.tolist() for rate in self.rates]
        inside = [speed for speed in met if any(low < speed < high for low, high in ranges)]
        return np.unique([*(end for low, high in ranges for end in (low, high)), *inside])


def levels_of(found: RunUp, table: Table | None) -> Array:
    """(q, 4) levels at the worst speed: r.m.s. velocity and displacement in the band, and of everything."""
    whole = found.velocity_rms_m_s, found.displacement_rms_m
    if table is None:
        return np.stack([part.max(axis=0) for part in (*whole, *whole)], axis=1)
    band = band_from_hz(table, main_frequency(found, table))
    inside = band_levels(found.frequency_hz, found.combined_m, band)
    return np.stack([part.max(axis=0) for part in (*inside, *whole)], axis=1)


@dataclass(frozen=True, eq=False)
class Predicting:
    """What is asked of every sample, and the nominal run-up that it is judged as.

    ``outputs`` (q,) names; ``boundaries`` of the zones of each, empty without a standard; ``verdict`` of the
    nominal structure in words, "" without [severity]; ``nominal`` (q, 4) its levels.
    """

    task: Measuring
    outputs: tuple[str, ...]
    boundaries: tuple[tuple[Boundaries, ...], ...]
    verdict: str
    nominal: Array


def predicting(study: Study, evaluator: Evaluator) -> Predicting | None:
    """How levels of samples are predicted; None where nothing states a force."""
    if not any(True for row in study.excitations for _ in row.acting()):
        return None
    found = run_up(study)
    table = study.severity
    straight = [column for column, turning in enumerate(found.rotational) if not turning]
    columns = judged_outputs(found, table) if table is not None else straight
    rates: Sequence[float] = ()
    if found.shaft:
        last = found.speed_hz[-1]
        rates = [float(line.frequency_hz[-1] / last) for line in found.lines if line.order is not None]
    watched = tuple(found.places[column] for column in columns)
    task = Measuring(evaluator, table, watched, found.shaft, tuple(sorted(set(rates))))
    verdict = None if table is None else judge(found, table)
    limits = {} if verdict is None else {row.output: row.limits for row in verdict.rows}
    outputs = tuple(found.outputs[column] for column in columns)
    return Predicting(
        task,
        outputs,
        tuple(limits.get(name, ()) for name in outputs),
        "" if verdict is None else verdict.verdict,
        levels_of(replace(found, **_in_service(found)), table)[columns],
    )


def ends(factors: Factors) -> Array:
    """Values (2 f, d) with one factor after the other at its low and its high end, others in the middle."""
    count = len(factors.names)
    points = np.full((count, 2, count), 0.5)
    for factor in range(count):
        points[factor, :, factor] = LOW, 1 - LOW
    return factors.values(points.reshape(2 * count, count))


def levels(asked: Predicting, factors: Factors, batch: Batch) -> Levels:
    """What a batch says that holds the samples, and behind them the `ends`."""
    every, table = batch.levels, asked.task.table
    assert every is not None
    count = len(factors.names)
    values, last = every[: -2 * count], every[-2 * count :, :, VELOCITY]
    zones = np.zeros(values.shape[:2], dtype=np.intp)
    for column, limits in enumerate(asked.boundaries):
        own = values[:, column]
        zones[:, column] = zone_numbers(own[:, VELOCITY], own[:, DISPLACEMENT], limits)
    outputs = tuple(
        Level(
            name,
            distribution(values[:, column, VELOCITY], float(asked.nominal[column, VELOCITY])),
            limits,
            probability(zones[:, column] >= 2) if limits else None,
            probability(zones[:, column] >= 3) if limits else None,
            tuple(_own(table, name, asked.task.watched[column][0], values[:, column])),
        )
        for column, (name, limits) in enumerate(zip(asked.outputs, asked.boundaries, strict=True))
    )
    worst = zones.max(axis=1, initial=0)
    judged = any(asked.boundaries)
    return Levels(
        values[:, :, VELOCITY],
        factors.names,
        last.reshape(count, 2, -1),
        outputs,
        probability(worst >= 2) if judged else None,
        probability(worst >= 3) if judged else None,
        asked.verdict,
    )


def _in_service(found: RunUp) -> dict[str, Any]:
    """The parts of a run-up at running speeds only."""
    chosen = found.in_service if found.in_service.any() else np.ones(len(found.speed_hz), dtype=bool)
    return {
        "speed_hz": found.speed_hz[chosen],
        "displacement_m": found.displacement_m[chosen],
        "lines": tuple(replace(line, frequency_hz=line.frequency_hz[chosen]) for line in found.lines),
    }


def _own(table: Table | None, output: str, place: str, values: Array) -> list[Passing]:
    """Limits of the user's own for one output with levels (N, 4)."""
    found = []
    for row in table.limits if table is not None else ():
        if row.at is not None and not {output, place} & set(row.at):
            continue
        for quantity, column in (("velocity_rms", WHOLE_VELOCITY), ("displacement_rms", WHOLE_DISPLACEMENT)):
            limit = getattr(row, quantity)
            if limit is not None:
                found.append(Passing(quantity, limit, row.name, probability(values[:, column] > limit)))
    return found
