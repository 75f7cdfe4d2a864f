"""A `Ring` as plain lists and numbers for JSON, field names carrying their units."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from vib.response.ring import Ring
    from vib.response.shares import RingMode

_NAMES = {
    False: {
        "displacement": "displacement_m",
        "velocity": "velocity_m_s",
        "acceleration": "acceleration_m_s2",
    },
    True: {
        "displacement": "angle_rad",
        "velocity": "angular_velocity_rad_s",
        "acceleration": "angular_acceleration_rad_s2",
    },
}


def ring_as_dict(ring: Ring) -> dict[str, Any]:
    """See `Ring.to_dict`. The record of each output stands with that output."""
    return {
        "start": ring.start,
        "time_s": numbers(ring.time_s),
        "outputs": [_output(ring, index) for index in range(len(ring.freedoms))],
        "modes": [_mode(ring, row) for row in ring.modes],
        "stable": ring.stable,
        "method": ring.method,
        "condition": ring.condition if math.isfinite(ring.condition) else None,
        "model": ring.model,
        "truncation": dict(ring.truncations),
        "duration_note": ring.duration_note,
        "remarks": list(ring.remarks),
    }


def numbers(values: NDArray[np.float64]) -> list[float | None]:
    """Floats, None where there is no finite number."""
    return [float(value) if math.isfinite(value) else None for value in values]


def _output(ring: Ring, index: int) -> dict[str, Any]:
    names = _NAMES[ring.rotational[index]]
    fall = ring.falls[index]
    envelope = "envelope_rad" if ring.rotational[index] else "envelope_m"
    rest = "rest_rad" if ring.rotational[index] else "rest_m"
    p = len(ring.freedoms)
    return {
        "name": ring.freedoms[index],
        names["displacement"]: numbers(ring.displacement_m[:, index]),
        names["velocity"]: numbers(ring.velocity_m_s[:, index]),
        names["acceleration"]: numbers(ring.acceleration_m_s2[:, index]),
        envelope: numbers(ring.envelope_m[:, index]),
        rest: float(ring.contributions.constant[index]),
        "peaks": [{names[peak.quantity]: peak.value, "time_s": peak.time_s} for peak in ring.peaks[index::p]],
        "fall": {
            "envelope_to_10_percent_s": fall.envelope_to_10_percent_s,
            "envelope_to_1_percent_s": fall.envelope_to_1_percent_s,
            "record_to_10_percent_s": fall.record_to_10_percent_s,
            "record_to_1_percent_s": fall.record_to_1_percent_s,
        },
    }


def _mode(ring: Ring, row: RingMode) -> dict[str, Any]:
    amplitude, shares = numbers(row.amplitude), numbers(row.share_of_peak)
    return {
        "number": row.number,
        "frequency_hz": row.frequency_hz,
        "damped_frequency_hz": row.damped_frequency_hz,
        "damping_ratio": row.damping_ratio,
        "logarithmic_decrement": row.logarithmic_decrement,
        "fall_to_10_percent_s": row.fall_to_10_percent_s,
        "fall_to_1_percent_s": row.fall_to_1_percent_s,
        "eigenvalue": {"real_per_s": row.eigenvalue.real, "imag_rad_per_s": row.eigenvalue.imag},
        "clustered": row.clustered,
        "outputs": [
            {
                "name": name,
                "amplitude_rad" if turns else "amplitude_m": amplitude[index],
                "share_of_peak": shares[index],
            }
            for index, (name, turns) in enumerate(zip(ring.freedoms, ring.rotational, strict=True))
        ],
    }
