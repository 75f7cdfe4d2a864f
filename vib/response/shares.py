"""The table of what each eigenvalue does in a ringing."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from vib.response.contributions import Contributions, Flags
from vib.response.decay import FALLS, logarithmic_decrement
from vib.response.exponential import Array
from vib.response.sampling import NOTICED, significant

LEAST_SHARE = 1e-3
MOST_ROWS = 40


@dataclass(frozen=True, eq=False)
class RingMode:
    """One eigenvalue of the ringing, or several that can't be told apart (``clustered``).

    ``frequency_hz`` is natural, ``abs(eigenvalue) / 2 pi``; ``damping_ratio`` None for rigid-body motion;
    ``logarithmic_decrement`` None where nothing swings. ``fall_to_10_percent_s`` and
    ``fall_to_1_percent_s`` are how long its own envelope takes, None if it does not fall or has no envelope
    of its own (clustered). ``amplitude``
    (p,) is abs(weight), in m or rad, NaN where clustered; ``share_of_peak`` (p,) is its signed part of each
    output's displacement at that output's peak: the shares of all eigenvalues and of what stays add to 1
    (0 for an output that does not move).
    """

    number: int
    eigenvalue: complex
    clustered: bool
    frequency_hz: float
    damped_frequency_hz: float
    damping_ratio: float | None
    logarithmic_decrement: float | None
    fall_to_10_percent_s: float | None
    fall_to_1_percent_s: float | None
    amplitude: Array
    share_of_peak: Array


def shares_at(found: Contributions, times: Array) -> tuple[Array, Array]:
    """Each eigenvalue's signed share of output i at ``times[i]`` (p, g), and the size of the output (p,)."""
    index = {id(part): place for place, part in enumerate(found.motion.parts.parts)}
    columns = [index[id(part)] for part in found.parts]
    shares = np.zeros((len(times), len(found.parts)))
    totals = np.zeros(len(times))
    for output, when in enumerate(times):
        one = found.motion.select(output)
        total = float(one(np.array([when]))[0, 0])
        totals[output] = abs(total)
        if total:
            shares[output] = one.by_part(float(when))[0, columns] / total
    return shares, totals


def ring_modes(found: Contributions, peak_times: Array, rotational: Flags) -> tuple[RingMode, ...]:
    """Rows for the eigenvalues that matter to some output that moves, slowest first."""
    shares, peaks = shares_at(found, peak_times)
    shares[~significant(peaks, rotational)] = 0.0
    noticed = significant(peaks, rotational, NOTICED)
    sizes = np.abs(np.where(found.clustered, 0.0, found.weights))
    total = sizes.sum(axis=1, keepdims=True)
    relative = np.maximum(np.abs(shares), sizes / np.where(total > 0, total, 1.0))[noticed]
    relative = relative.max(axis=0, initial=0.0)
    chosen = np.flatnonzero(relative >= LEAST_SHARE)
    if len(chosen) > MOST_ROWS:
        chosen = np.sort(chosen[np.argsort(-relative[chosen], kind="stable")[:MOST_ROWS]])
    return tuple(_row(found, shares, int(index), number) for number, index in enumerate(chosen, 1))


def _row(found: Contributions, shares: Array, index: int, number: int) -> RingMode:
    value, decay = complex(found.eigenvalues[index]), float(found.decay_per_s[index])
    rigid = abs(value) <= found.parts[index].rounding
    size = 0.0 if rigid else abs(value)
    ratio = None if rigid else decay / size
    falls: list[float | None] = [None] * len(FALLS)
    if decay > 0 and not found.clustered[index]:
        falls = [-math.log(share) / decay for share in FALLS]
    return RingMode(
        number=number,
        eigenvalue=0j if rigid else value,
        clustered=bool(found.clustered[index]),
        frequency_hz=size / (2 * math.pi),
        damped_frequency_hz=0.0 if rigid else abs(value.imag) / (2 * math.pi),
        damping_ratio=ratio,
        logarithmic_decrement=None if ratio is None else logarithmic_decrement(ratio),
        fall_to_10_percent_s=falls[0],
        fall_to_1_percent_s=falls[1],
        amplitude=np.abs(found.weights[:, index]),
        share_of_peak=shares[:, index],
    )
