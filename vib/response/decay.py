"""How fast a ringing dies: logarithmic decrement, times to fall, and peak values found between samples."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from vib.response.contributions import Contributions
from vib.response.exponential import Array
from vib.response.motion import Motion

FALLS = (0.1, 0.01)  # the shares of the peak that times to fall are given for
_SCAN = 400
_BISECTIONS = 60
_REFINEMENTS = 9  # 32^9 = 4e13 parts of the first interval


def logarithmic_decrement(damping_ratio: float) -> float | None:
    """Natural logarithm of the ratio of successive maxima, 2 pi zeta / sqrt(1 - zeta^2) (ISO 2041).

    None where there are no successive maxima: an overdamped, growing-without-swinging or rigid-body motion.
    """
    if not abs(damping_ratio) < 1:  # also NaN
        return None
    return 2 * math.pi * damping_ratio / math.sqrt(1 - damping_ratio**2)


def damping_from_decrement(first: float, later: float, periods: int = 1) -> float:
    """Damping ratio from two maxima ``periods`` apart: delta / sqrt(4 pi^2 + delta^2)."""
    delta = math.log(first / later) / periods
    return delta / math.hypot(2 * math.pi, delta)


def cycles_to(share: float, damping_ratio: float) -> float:
    """How many cycles until the envelope of one mode has fallen to ``share``."""
    return -math.log(share) * math.sqrt(1 - damping_ratio**2) / (2 * math.pi * damping_ratio)


@dataclass(frozen=True)
class Peak:
    """The largest size of one output: its signed value and when; ``quantity`` is which derivative."""

    output: str
    quantity: str  # "displacement", "velocity" or "acceleration"
    value: float
    time_s: float


@dataclass(frozen=True)
class Fall:
    """When one output has fallen to a tenth and to a hundredth of its displacement peak, s from the start.

    ``envelope_to_10_percent_s`` and ``envelope_to_1_percent_s``: from then on the envelope, and so the
    output, stays below: a safe upper bound. ``record_to_...``: the last time the motion itself is above.
    None: it does not get there (or, for the record, it ends before the envelope is there). What stays in
    the end (a free machine comes to rest elsewhere) is taken off first.
    """

    output: str
    envelope_to_10_percent_s: float | None
    envelope_to_1_percent_s: float | None
    record_to_10_percent_s: float | None
    record_to_1_percent_s: float | None


def envelope_fall(found: Contributions, output: int, level: float) -> float | None:
    """The last time the envelope of one output is above ``level``, s; None if it stays above."""
    if level <= 0 or found.drifts[output]:
        return None

    def above(times: Array) -> Array:
        return found.envelope_of(output, times) - level

    if above(np.array([found.origin_s]))[0] <= 0 and not found.clustered.any():
        return found.origin_s
    end = _horizon(found, output, level)
    if end is None:
        return None
    times = np.linspace(found.origin_s, end, _SCAN)
    over = np.flatnonzero(above(times) > 0)
    if not over.size:
        return found.origin_s
    if over[-1] == _SCAN - 1:
        return None
    return _bisect(lambda t: float(above(np.array([t]))[0]), times[over[-1]], times[over[-1] + 1])


def _horizon(found: Contributions, output: int, level: float) -> float | None:
    """A time after which the envelope is surely below ``level``; None if it never gets there."""
    sizes = np.abs(np.where(found.clustered, 0.0, found.weights[output]))
    stays = found.decay_per_s <= 0
    room = level - float(sizes[stays].sum())
    if room <= 0:
        return None
    dies = ~stays & (found.clustered | (sizes > 0))
    if not dies.any():
        return found.origin_s + 1.0
    share = room / int(dies.sum())
    with np.errstate(divide="ignore"):
        spans = np.log(np.maximum(sizes[dies] / share, 1.0)) / found.decay_per_s[dies]
    end = max(float(spans.max()), float(5 / found.decay_per_s[dies].min()) if found.clustered.any() else 0.0)
    for _ in range(60):  # clusters rise before they fall, so look on
        if found.envelope_of(output, np.array([found.origin_s + end]))[0] < level:
            return found.origin_s + max(end, 1e-300)
        end *= 2
    return None


def record_fall(motion: Motion, constant: float, times: Array, record: Array, level: float) -> float | None:
    """The last time abs(x - constant) crosses ``level`` within the record, s; None if it ends above.

    ``motion`` is that of the one output, ``record`` (k,) its samples at ascending ``times`` (k,).
    """
    over = np.flatnonzero(np.abs(record - constant) > level)
    if not over.size:
        return float(times[0])
    if over[-1] == len(times) - 1:
        return None
    last = int(over[-1])
    return _bisect(
        lambda t: abs(float(motion(np.array([t]))[0, 0]) - constant) - level, times[last], times[last + 1]
    )


def peak_of(motion: Motion, times: Array, record: Array, order: int) -> tuple[float, float]:
    """Signed value and time of the largest size of one output's ``order``-th derivative.

    ``record`` (k,) are its samples at ascending ``times`` (k,), close enough to see every swing. Between
    samples the root of the next derivative is found, so the peak is not cut off by the sampling.
    """
    size = np.abs(record)
    inner = np.flatnonzero((size[1:-1] >= size[:-2]) & (size[1:-1] >= size[2:])) + 1
    # 20 samples per swing cut a peak by at most 1.3 %, so a lower sample can't belong to the largest
    near = inner[size[inner] > 0.95 * size.max(initial=0.0)]
    # ranked by the parabola through three samples; of equal peaks the first is meant
    before, after = size[near - 1], size[near + 1]
    bend = np.minimum(before - 2 * size[near] + after, -np.finfo(float).tiny)
    height = size[near] - (after - before) ** 2 / (8 * bend)
    near = near[np.lexsort((near, -np.round(height / max(height.max(initial=0.0), 1e-300), 3)))][:4]
    best = int(np.argmax(size))
    value, when = float(record[best]), float(times[best])
    for index in near:
        root = _root(motion, float(times[index - 1]), float(times[index + 1]), order + 1)
        if root is None:
            continue
        there = float(motion(np.array([root]), order)[0, 0])
        if abs(there) > abs(value) * (1 + 1e-9):
            value, when = there, root
    return value, when


def _root(motion: Motion, low: float, high: float, order: int) -> float | None:
    """A root of one output's derivative between two times, by ever finer grids; None if it has none there."""
    for _ in range(_REFINEMENTS):
        grid = np.linspace(low, high, 33)
        signs = np.sign(motion(grid, order)[:, 0])
        change = np.flatnonzero(signs[:-1] * signs[1:] <= 0)
        if not change.size:
            return None
        first = int(change[len(change) // 2])
        low, high = float(grid[first]), float(grid[first + 1])
    return (low + high) / 2


def _bisect(function: Callable[[float], float], low: float, high: float) -> float:
    """Where ``function`` changes its sign between ``low`` and ``high`` (at ``low`` it has its old sign)."""
    before = function(low) > 0
    for _ in range(_BISECTIONS):
        middle = (low + high) / 2
        if middle in (low, high):
            break
        if (function(middle) > 0) == before:
            low = middle
        else:
            high = middle
    return float((low + high) / 2)
