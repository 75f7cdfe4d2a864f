"""R.m.s. values in a band of frequencies, from the lines of a run-up."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from vib.severity.standards import BAND_TO_HZ, Boundaries

Array = NDArray[np.float64]


def band_levels(
    frequency_hz: Array, displacement_m: NDArray[np.complex128], band_from_hz: Array
) -> tuple[Array, Array]:
    """R.m.s. velocity and displacement of what lies in the band, (k, p) each; infinite where unstable.

    Parameters
    ----------
    frequency_hz
        (k, groups) frequencies, those that are the same already added as vectors.
    displacement_m
        (k, groups, p) complex phasors.
    band_from_hz
        (k,) lower end of the band; up to 1000 Hz, or up to any frequency where it is 0.
    """
    slack = 1e-9
    low = band_from_hz[:, None] * (1 - slack)
    high = np.where(band_from_hz[:, None] > 0, BAND_TO_HZ * (1 + slack), np.inf)
    inside = ((frequency_hz >= low) & (frequency_hz <= high))[:, :, None]
    squared = np.abs(displacement_m) ** 2 / 2 * inside
    rates = (2 * np.pi * frequency_hz[:, :, None]) ** 2
    velocity, displacement = np.sqrt((rates * squared).sum(axis=1)), np.sqrt(squared.sum(axis=1))
    finite = np.isfinite(displacement_m).all(axis=1)
    return np.where(finite, velocity, np.inf), np.where(finite, displacement, np.inf)


def zone_numbers(velocity: Array, displacement: Array, limits: tuple[Boundaries, ...]) -> NDArray[np.intp]:
    """(k,) zone at each level, 0 for A to 3 for D: the worse of velocity and displacement."""
    found = np.zeros(len(velocity), dtype=np.intp)
    for one in limits:
        levels = velocity if one.quantity == "velocity_rms" else displacement
        found = np.maximum(found, (levels[:, None] > np.array(one.values) * (1 + 1e-12)).sum(axis=1))
    return found


def strain(velocity: Array, displacement: Array, limits: tuple[Boundaries, ...]) -> Array:
    """(k,) the level over the highest boundary, the greater of velocity and displacement; ranks levels."""
    if not limits:
        return velocity
    shares = [
        (velocity if one.quantity == "velocity_rms" else displacement) / one.values[-1] for one in limits
    ]
    return np.asarray(np.max(shares, axis=0))
