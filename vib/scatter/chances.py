"""The probability that a mode falls within the band of an excitation, from samples."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from vib.errors import ModelError
from vib.scatter.batch import Array, Batch
from vib.scatter.statistics import Estimate, probability
from vib.screening import Line, excitation_lines, screen

if TYPE_CHECKING:
    from vib.modes import Modes
    from vib.study import Study


@dataclass(frozen=True)
class Chance:
    """The probability that a mode lies within the band of a line.

    ``mode`` is its nominal number from 1; None stands for any mode that the line can drive.
    ``drivable`` as the screening of the nominal modes says.
    """

    line: Line
    mode: int | None
    drivable: bool
    probability: Estimate

    def to_dict(self) -> dict[str, Any]:
        """Plain values; frequencies in Hz, speeds in rpm."""
        speeds = (
            {}
            if self.line.speed is None
            else dict(zip(_SPEEDS, np.multiply(self.line.speed, 60), strict=True))
        )
        return {
            "excitation": self.line.excitation,
            "order": self.line.order,
            **speeds,
            "band_from_hz": self.line.band_from_hz,
            "band_to_hz": self.line.band_to_hz,
            "mode": self.mode,
            "drivable": self.drivable,
            **self.probability.to_dict("probability"),
        }


TRIED = 8  # samples at which linearity is tested
_SPEEDS = ("speed_from_rpm", "speed_to_rpm")


@dataclass(frozen=True, eq=False)
class Chances:
    """Probabilities of a mode within a band.

    Attributes
    ----------
    by_mode
        Line by line, the modes that come within its band in any sample.
    by_line
        Of each line, any mode that it can drive.
    any_line
        Any line and any mode that it can drive.
    needed_hz
        (N,) top of the highest band of each sample; below it no mode may be missing.
    """

    by_mode: tuple[Chance, ...]
    by_line: tuple[Chance, ...]
    any_line: Estimate
    needed_hz: Array


def chances(
    study: Study,
    modes: Modes,
    paths: Sequence[str],
    values: Array,
    batch: Batch,
    *,
    band: float | str | None = None,
) -> Chances:
    """Probabilities from the samples of a study with excitations.

    Bands follow the speeds where these vary. A mode is the one of the same shape in every sample; its own
    error bar is not added.

    Parameters
    ----------
    study, modes
        The nominal study and its modes, the columns of the batch.
    paths, values
        Entries (d,) and their values (N, d), SI.
    band
        Half width of the bands of excitations that have none of their own; see `vib.screening.screen`.
    """
    lines = excitation_lines(study.excitations, band=band)
    low, high = _edges(study, lines, paths, values, band)
    within = (batch.frequencies_hz[:, :, None] >= low[:, None]) & (
        batch.frequencies_hz[:, :, None] <= high[:, None]
    )
    drivable = np.zeros((modes.count, len(lines)), dtype=bool)
    for row in screen(modes, study.excitations, band=band).rows:
        drivable[row.mode - 1, lines.index(row.line)] = row.drivable
    counts = within & drivable
    by_mode = [
        Chance(line, mode + 1, bool(drivable[mode, number]), probability(within[:, mode, number]))
        for number, line in enumerate(lines)
        for mode in range(modes.count)
        if within[:, mode, number].any()
    ]
    by_line = [
        Chance(line, None, True, probability(np.asarray(counts[:, :, number].any(axis=1))))
        for number, line in enumerate(lines)
    ]
    return Chances(
        tuple(by_mode), tuple(by_line), probability(np.asarray(counts.any(axis=(1, 2)))), high.max(axis=1)
    )


def _edges(
    study: Study, lines: Sequence[Line], paths: Sequence[str], values: Array, band: float | str | None
) -> tuple[Array, Array]:
    """Edges of the band of each line in each sample, each (N, lines)."""
    moving = [column for column, path in enumerate(paths) if path.startswith("excitations[")]
    names = [paths[column] for column in moving]

    def at(sample: Array) -> Array:
        """Both edges of every line (2 lines,) for values of what moves them."""
        varied = study.varied(dict(zip(names, sample.tolist(), strict=True))) if names else study
        drawn = excitation_lines(varied.excitations, band=band)
        if len(drawn) != len(lines):
            raise ModelError(
                "excitations: samples have other lines than the study; vary speeds and bands only"
            )
        return np.array([edge for line in drawn for edge in (line.band_from_hz, line.band_to_hz)])

    found = _by_samples(at, values[:, moving])
    return found[:, 0::2], found[:, 1::2]


def _by_samples(function: Callable[[Array], Array], samples: Array) -> Array:
    """A function of each sample (N, d); by its slopes where it is linear, as edges are in a speed."""
    size, count = samples.shape
    if not count:
        return np.tile(function(samples[0]), (size, 1))
    middle, reach = samples.mean(axis=0), np.ptp(samples, axis=0) / 2
    steps = np.eye(count) * reach
    slopes = np.array([function(middle + step) - function(middle - step) for step in steps])
    slopes /= 2 * np.where(reach > 0, reach, 1.0)[:, None]
    found = function(middle) + (samples - middle) @ slopes
    tried = np.linspace(0, size - 1, min(size, TRIED)).astype(int)
    exact = np.array([function(samples[row]) for row in tried])
    if np.allclose(found[tried], exact, rtol=1e-12, atol=0.0):
        return np.asarray(found)
    return np.array([function(sample) for sample in samples])
