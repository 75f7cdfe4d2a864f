"""How long to record and how finely, where that was not said."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from vib.response.contributions import Contributions, Flags
from vib.response.exponential import Array
from vib.response.motion import Motion

SAMPLES_PER_PERIOD = 20
MOST_AUTOMATIC = 10_000
MOST_ASKED = 200_000
UNDAMPED_PERIODS = 20
NOTICED = 1e-3  # outputs that move less than this share of the largest don't set step and length
_SHARE = 0.01  # nor does a part of less than this share of an output's motion
_FAST_SHARE = 0.1  # of the acceleration: from here on it is said that faster parts are not resolved


@dataclass(frozen=True, eq=False)
class Sampling:
    """Evenly spaced times from 0 (k,), s, and how they were chosen in words."""

    times: Array
    words: str
    remarks: tuple[str, ...] = ()


def sample(found: Contributions, motion: Motion, rotational: Flags, duration_s: float | None) -> Sampling:
    """Times over ``duration_s``, or until every output has fallen to 1 % of its peak."""
    step, slowest, remarks = _step_and_slowest(found, rotational)
    if motion.pulse is not None:
        step = min(step, motion.pulse.duration_s / SAMPLES_PER_PERIOD)
    if duration_s is not None:
        count = int(min(np.ceil(duration_s / step), MOST_ASKED)) + 1
        if duration_s / step > MOST_ASKED:
            remarks += (
                f"The record has {MOST_ASKED} steps, fewer than {SAMPLES_PER_PERIOD} per shortest period "
                "that matters: peaks may lie between the samples. Ask for a shorter duration.",
            )
        return Sampling(np.linspace(0.0, duration_s, max(count, 2)), "the duration asked for", remarks)
    end = _until_one_percent(found, motion, rotational, step, slowest)
    words = "until every output has fallen to 1 % of its peak"
    if end is None:
        end = found.origin_s + UNDAMPED_PERIODS * slowest
        words = f"{UNDAMPED_PERIODS} periods of the slowest part: not every output falls to 1 % of its peak"
    end = max(end, found.origin_s + 2 * step)
    if end > MOST_AUTOMATIC * step:
        remarks += (
            f"The record ends at {MOST_AUTOMATIC} steps; {words} it would take {end:.4g} s. "
            "Give a duration to see more.",
        )
        end, words = MOST_AUTOMATIC * step, f"capped at {MOST_AUTOMATIC} steps"
    count = int(np.ceil(end / step)) + 1
    return Sampling(np.linspace(0.0, end, max(count, 2)), words, remarks)


def significant(sizes: Array, rotational: Flags, least: float = 1e-9) -> Flags:
    """(p,) True for outputs that move more than ``least`` of the largest of their kind."""
    found = np.zeros(len(sizes), bool)
    for kind in (rotational, ~rotational):
        if kind.any():
            found |= kind & (sizes > least * sizes[kind].max())
    return found


def _step_and_slowest(found: Contributions, rotational: Flags) -> tuple[float, float, tuple[str, ...]]:
    """A twentieth of the shortest period that matters, the longest such period, and a remark."""
    speed = np.abs(found.eigenvalues)
    if not speed.any():
        return 1.0 / SAMPLES_PER_PERIOD, 1.0, ()
    sizes = np.abs(np.where(found.clustered, 0.0, found.weights))
    total = sizes.sum(axis=1)
    moving = significant(total, rotational, NOTICED) & (total > 0)
    shares = sizes[moving] / total[moving, None]
    matters = (found.clustered | (shares >= _SHARE).any(axis=0)) & (speed > 1e-9 * speed.max())
    chosen = speed[matters] if matters.any() else speed[speed > 0]
    remarks: tuple[str, ...] = ()
    jerky = sizes[moving] * speed**2
    fast = jerky[:, speed > 1.01 * chosen.max()].sum(axis=1)
    if (fast > _FAST_SHARE * jerky.sum(axis=1)).any():
        remarks = (
            f"Parts above {chosen.max() / (2 * np.pi):.3g} Hz add less than {100 * _SHARE:g} % to any "
            "displacement and are not resolved by the samples; they do matter to accelerations, whose peaks "
            "may lie between samples.",
        )
    return (
        2 * np.pi / float(chosen.max()) / SAMPLES_PER_PERIOD,
        2 * np.pi / float(chosen.min()),
        remarks,
    )


def _until_one_percent(
    found: Contributions, motion: Motion, rotational: Flags, step: float, slowest: float
) -> float | None:
    """When the envelope of every moving output is below 1 % of its peak, s; None if that never happens."""
    early = np.linspace(0.0, found.origin_s + 1.5 * slowest, int(min(1.5 * slowest / step, 4000)) + 50)
    peaks = np.abs(motion(early) - found.constant).max(axis=0)
    moving = significant(peaks, rotational, NOTICED)
    if (found.drifts & moving).any():
        return None
    stays = found.decay_per_s <= 0
    sizes = np.abs(np.where(found.clustered, 0.0, found.weights))
    level = 0.01 * peaks
    if (sizes[:, stays].sum(axis=1)[moving] >= level[moving]).any():
        return None

    def above(late: float) -> bool:
        return bool((found.envelope([found.origin_s + late])[0] > level)[moving].any())

    high = slowest
    for _ in range(200):
        if not above(high):
            break
        high *= 2
    low = 0.0 if high == slowest else high / 2
    for _ in range(40):
        middle = (low + high) / 2
        low, high = (middle, high) if above(middle) else (low, middle)
    return found.origin_s + high
