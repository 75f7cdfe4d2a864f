"""The motion of chosen outputs at any time, part by part: after a start, and during a half-sine pulse.

    x' = A x + load f(t),   y = rows x + direct f(t),   f(t) = sin(rate t) until the pulse ends, then 0

Both phases are exact: no time stepping.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from vib.errors import AccuracyError
from vib.response.exponential import Array, Numbers
from vib.response.groups import Complex, Part, Parts
from vib.response.transition import Propagator

_CHUNK = 4_000_000  # complex numbers at a time, to bound the working memory


@dataclass(frozen=True, eq=False)
class HalfSine:
    """A force sin(pi t / duration) from 0 to ``duration_s``.

    Its peak value is in ``load`` (s,), its effect on x', and ``direct`` (p,), its direct effect on y.
    """

    duration_s: float
    load: Array
    direct: Array

    @property
    def rate(self) -> float:
        """Angular frequency, rad/s."""
        return float(np.pi / self.duration_s)

    def value(self, times: Array, order: int) -> Array:
        """The ``order``-th time derivative of the sine, (k,); continued beyond the end."""
        found: Array = self.rate**order * np.sin(self.rate * times + order * np.pi / 2)
        return found


@dataclass(frozen=True, eq=False)
class Motion:
    """p outputs, ``rows`` (p, s) on the state, from the state ``start`` (s,) at time 0 or through a pulse."""

    parts: Parts
    rows: Array
    start: Array
    pulse: HalfSine | None = None

    @property
    def origin_s(self) -> float:
        """From here on the motion is free."""
        return self.pulse.duration_s if self.pulse else 0.0

    def __call__(self, times: Array, order: int = 0) -> Array:
        """The outputs' ``order``-th time derivative (k, p) at times >= 0 (k,).

        Raises
        ------
        AccuracyError
            The motion grows past the largest number.
        """
        found = np.empty((times.size, len(self.rows)))
        step = max(1, _CHUNK // max(1, self.rows.shape[1]))
        with np.errstate(over="ignore", invalid="ignore", under="ignore"):
            for first in range(0, times.size, step):
                piece = slice(first, first + step)
                found[piece] = self._piece(times[piece], order)
        if not np.all(np.isfinite(found)):
            late = float(times[~np.isfinite(found).all(axis=1)].min())
            raise AccuracyError(
                f"the response grows past the largest number at {late:.4g} s: the system is unstable; "
                "ask for a shorter duration"
            )
        return found

    def select(self, output: int) -> Motion:
        """The motion of one output alone."""
        pulse = self.pulse
        if pulse is not None:
            pulse = HalfSine(pulse.duration_s, pulse.load, pulse.direct[output : output + 1])
        chosen = Motion(self.parts, self.rows[output : output + 1], self.start, pulse)
        for shared in ("singles", "clusters", "released"):  # the same for all outputs
            chosen.__dict__[shared] = getattr(self, shared)
        return chosen

    @cached_property
    def singles(self) -> Part | None:
        """All parts that move by exp(lambda t) in one, its eigenvalues side by side."""
        chosen = [part for part in self.parts.parts if part.single]
        if not chosen:
            return None
        values = np.concatenate([part.eigenvalues for part in chosen])
        right = np.hstack([part.factor * part.right for part in chosen])
        return Part(values, np.zeros((0, 0)), right, np.vstack([part.left for part in chosen]), 1.0)

    @cached_property
    def clusters(self) -> tuple[Part, ...]:
        """The parts that need the matrix exponential."""
        return tuple(part for part in self.parts.parts if not part.single)

    @cached_property
    def released(self) -> tuple[Numbers, tuple[Numbers, ...]]:
        """Coordinates of the singles and of each cluster when the motion becomes free."""
        end = np.array([self.origin_s])
        singles = np.zeros(0) if self.singles is None else self._forced_singles(self.singles, end)[0]
        clusters = tuple(self._forced_cluster(part, end)[0] for part in self.clusters)
        return singles, clusters

    def by_part(self, time: float) -> Array:
        """What each part of the model adds to each output at one time, (p, parts)."""
        at = np.array([time])
        if time < self.origin_s:
            moved = np.zeros(0) if self.singles is None else self._forced_singles(self.singles, at)[0]
            clusters = [self._forced_cluster(part, at)[0] for part in self.clusters]
        else:
            late = at - self.origin_s
            moved, starts = self.released
            if self.singles is not None:
                moved = moved * np.exp(self.singles.eigenvalues * late)
            clusters = [part.free(start, late)[0] for part, start in zip(self.clusters, starts, strict=True)]
        found = np.zeros((len(self.rows), len(self.parts.parts)))
        single, cluster = iter(moved), iter(clusters)
        for index, part in enumerate(self.parts.parts):
            if part.single:
                found[:, index] = (part.factor * (self.rows @ part.right[:, 0]) * next(single)).real
            else:
                found[:, index] = part.factor * (self.rows @ part.right @ next(cluster)).real
        return found

    def _piece(self, times: Array, order: int) -> Array:
        found = np.zeros((times.size, len(self.rows)))
        during = times < self.origin_s
        if during.any():
            found[during] = self._during(times[during], order)
        if not during.all():
            found[~during] = self._after(times[~during] - self.origin_s, order)
        return found

    def _after(self, times: Array, order: int) -> Array:
        singles, clusters = self.released
        found = np.zeros((times.size, len(self.rows)))
        if self.singles is not None:
            values = self.singles.eigenvalues
            weights = (self.rows @ self.singles.right) * (singles * values**order)
            found += (np.exp(np.outer(times, values)) @ weights.T).real
        for part, start in zip(self.clusters, clusters, strict=True):
            derived = np.linalg.matrix_power(part.block, order) @ start
            moved = part.free(derived, times) @ (self.rows @ part.right).T
            found += part.factor * moved.real
        return found

    def _during(self, times: Array, order: int) -> Array:
        assert self.pulse is not None
        found = np.outer(self.pulse.value(times, order), self.pulse.direct)
        if self.singles is not None:
            part, load = self.singles, self.singles.left @ self.pulse.load
            moved = self._forced_singles(part, times)
            for derivative in range(order):  # z' = lambda z + load f
                moved = moved * part.eigenvalues + np.outer(self.pulse.value(times, derivative), load)
            found += (moved @ (self.rows @ part.right).T).real
        for part in self.clusters:
            load = part.left @ self.pulse.load
            moved = self._forced_cluster(part, times)
            for derivative in range(order):
                moved = moved @ part.block.T + np.outer(self.pulse.value(times, derivative), load)
            found += part.factor * (moved @ (self.rows @ part.right).T).real
        return found

    def _forced_singles(self, part: Part, times: Array) -> Numbers:
        moved: Numbers = np.exp(np.outer(times, part.eigenvalues)) * (part.left @ self.start)
        if self.pulse is None:
            return moved
        load = part.left @ self.pulse.load
        return moved + load * _sine_integral(part.eigenvalues, self.pulse.rate, times)

    def _forced_cluster(self, part: Part, times: Array) -> Numbers:
        start = part.left @ self.start
        if self.pulse is None:
            return part.free(start, times)
        # the sine is the answer of a free generator, so the pulse is free motion of a larger matrix
        size, rate = len(start), self.pulse.rate
        dtype = np.result_type(part.block, start)
        augmented = np.zeros((size + 2, size + 2), dtype)
        augmented[:size, :size] = part.block
        augmented[:size, size] = part.left @ self.pulse.load
        augmented[size, size + 1], augmented[size + 1, size] = rate, -rate
        whole = np.concatenate([start, [0.0, 1.0]]).astype(dtype)
        return Propagator(augmented).apply(whole, times)[:, :size]


def _sine_integral(values: Complex, rate: float, times: Array) -> Complex:
    """Integral of exp(lambda (t - s)) sin(rate s) over s from 0 to t: (k, g), also at resonance."""
    late = times[:, None]

    def convolved(frequency: complex) -> Complex:
        """Integral of exp(lambda (t - s)) exp(frequency s)."""
        difference = frequency - values
        size = np.abs(difference * late)
        apart = np.where(difference == 0, 1.0, difference)
        direct = (np.exp(frequency * late) - np.exp(values * late)) / apart
        small = np.where(size < 1, difference * late, 1.0)
        ratio = np.where(small == 0, 1.0, np.expm1(small) / np.where(small == 0, 1.0, small))
        near = np.exp(values * late) * late * ratio
        found: Complex = np.where(size < 1, near, direct)
        return found

    found: Complex = (convolved(1j * rate) - convolved(-1j * rate)) / 2j
    return found
