"""Signals cut at the steps of a uniform grid: whole steps, and the bits between a step and a corner."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from vib.response.instep import Shape
from vib.response.signals import Signal

Array = NDArray[np.float64]
Indices = NDArray[np.intp]
# A corner moved by this share of a step changes a linear signal by as little, and the response by less.
_ON_GRID = 1e-9


@dataclass(frozen=True, eq=False)
class Bits:
    """Parts of steps, all of one shape: from ``begin`` to ``end`` (k,), s since the beginning of ``step``."""

    column: int
    shape: Shape
    step: Indices
    begin: Array
    end: Array
    amplitude: Array


@dataclass(frozen=True, eq=False)
class Blow:
    """An impulse ``end - begin`` = 0 long: ``size`` at ``offset`` (0, h] since the beginning of ``step``."""

    column: int
    step: int
    offset: float
    size: float


@dataclass(frozen=True, eq=False)
class Cutter:
    """Cuts the signals, one per column of the input matrix, at the steps k h of a grid."""

    signals: Sequence[tuple[int, Signal]]
    step_s: float

    def channels(self) -> list[tuple[int, Shape]]:
        """(column, shape) of every channel, in the order of `cut`."""
        one: Array = np.array([self.step_s])
        found: list[tuple[int, Shape]] = []
        for column, signal in self.signals:
            found += [(column, shape) for shape, _ in signal.expand(np.zeros(1), one)]
        return found

    def cut(self, first: int, last: int) -> tuple[Array, list[Bits]]:
        """Amplitudes (last - first, channels) of the whole steps, and the bits of the other steps."""
        begins: Array = self.step_s * np.arange(first, last, dtype=np.float64)
        lengths = np.full(begins.size, self.step_s)
        columns: list[Array] = []
        bits: list[Bits] = []
        for column, signal in self.signals:
            steps, edges = self._cornered(signal, first, last)
            for _, amplitude in signal.expand(begins, lengths):
                whole = amplitude.copy()
                whole[steps - first] = 0.0
                columns.append(whole)
            if edges is not None:
                at, begin, end = edges
                start = at * self.step_s + begin
                for shape, amplitude in signal.expand(start, end - begin):
                    acting = amplitude != 0
                    if acting.any():
                        kept = (at[acting], begin[acting], end[acting], amplitude[acting])
                        bits.append(Bits(column, shape, *kept))
        table = np.stack(columns, axis=1) if columns else np.zeros((last - first, 0))
        return table, bits

    def blows(self) -> list[Blow]:
        """All impulses; one on a step belongs to the end of the step before (step -1 for time 0)."""
        found = []
        for column, signal in self.signals:
            for time, size in signal.blows:
                place = time / self.step_s
                step = round(place) - 1 if _on_grid(place) else int(np.floor(place))
                offset = self.step_s if _on_grid(place) else time - step * self.step_s
                found.append(Blow(column, step, offset, size))
        return found

    def _cornered(
        self, signal: Signal, first: int, last: int
    ) -> tuple[Indices, tuple[Indices, Array, Array] | None]:
        """The steps with a corner inside, and the pieces they are cut into: step, begin, end."""
        corners = signal.corners
        near = np.searchsorted(corners, [first * self.step_s, last * self.step_s], side="right")
        places = corners[near[0] : near[1]] / self.step_s
        inside = places[(places > first) & (places < last) & ~_on_grid(places)]
        if not inside.size:
            return np.zeros(0, np.intp), None
        steps = np.unique(np.floor(inside).astype(np.intp))
        cuts = np.unique(np.concatenate([inside, steps, steps + 1.0]))
        middles = (cuts[:-1] + cuts[1:]) / 2
        at = np.floor(middles).astype(np.intp)
        kept = np.isin(at, steps)
        at = at[kept]
        begin, end = cuts[:-1][kept] - at, cuts[1:][kept] - at
        return steps, (at, begin * self.step_s, end * self.step_s)


def _on_grid(places: NDArray[np.float64] | float) -> NDArray[np.bool_]:
    """Whether a time, counted in steps, is a step but for rounding (of a time or of a million of them)."""
    gap = np.abs(places - np.round(places))
    return np.asarray(gap <= _ON_GRID)
