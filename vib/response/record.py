"""Long evenly spaced records of a first-order model under any signals, exactly and at the speed of BLAS-3.

    x' = A x + load u(t),   y = rows x + sum over d of feed_d u^(d)(t)

By the semigroup law exp(A (i m + j) h) = exp(A i m h) exp(A j h) the record is a product of two short tables:
the states at the beginning of blocks of m steps, and what a state (and an input) does within one block. No
step is approximated: in each one the input's effect is an integral in closed form (`vib.response.instep`).
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from vib.errors import AccuracyError, ModelError
from vib.response.blocks import Group, groups_of
from vib.response.exponential import Array, Numbers
from vib.response.groups import Parts
from vib.response.pieces import Bits, Blow, Cutter
from vib.response.signals import Signal

_SHORTEST, _LONGEST = 32, 256  # steps in a block
_TABLE = 3_000_000  # numbers in a table of one block
_CHUNK = 4_000_000  # numbers of a record at a time

Sink = Callable[[int, Array], None]


@dataclass(frozen=True, eq=False)
class Driven:
    """A first-order model taken apart, its start and its inputs.

    ``rows`` (q, s); ``load`` (s, j); ``feed`` (q, j) per derivative of the input, lowest first; ``signals``
    are (column of ``load``, signal); several signals may share a column.
    """

    parts: Parts
    rows: Array
    load: Array
    feed: tuple[Array, ...]
    signals: Sequence[tuple[int, Signal]]
    start: Array

    def record(self, step_s: float, count: int, sink: Sink | None = None) -> Array:
        """The outputs at 0, h, ..., (count - 1) h: (count, q); handed piece by piece to ``sink`` if given.

        Then the result is empty. A blow at time t shows from t on, but not itself
        where an output feels the input directly.

        Raises
        ------
        AccuracyError
            The motion grows past the largest number.
        ModelError
            The step is not positive.
        """
        found = np.empty((0 if sink else count, len(self.rows)))
        for first, values in self._chunks(step_s, count):
            if sink is None:
                found[first : first + len(values)] = values
            else:
                sink(first, values)
        return found

    def _chunks(self, step_s: float, count: int) -> Iterator[tuple[int, Array]]:
        if not (np.isfinite(step_s) and step_s > 0 and count >= 1):
            raise ModelError(f"record: a positive step and at least one time are needed, got {step_s:g} s")
        refine = max([signal.refinement(step_s) for _, signal in self.signals], default=1)
        plan = _Plan(self, step_s, count, refine)
        with np.errstate(over="ignore", invalid="ignore", under="ignore"):
            for first, values in plan.chunks():
                times: Array = step_s * np.arange(first, first + len(values), dtype=np.float64)
                for order, matrix in enumerate(self.feed):
                    for column, signal in self.signals:
                        if matrix[:, column].any():
                            values += np.outer(signal.value(times, order), matrix[:, column])
                if not np.isfinite(values).all():
                    late = float(times[~np.isfinite(values).all(axis=1)][0])
                    raise AccuracyError(
                        f"the response grows past the largest number at {late:.4g} s: the system is "
                        "unstable; ask for a shorter duration"
                    )
                yield first, values

    def contributions(self, step_s: float, moments: Sequence[int]) -> Array:
        """What each part of the model adds to each output at chosen steps: (moments, q, parts).

        The direct share of the input, ``feed``, is not among them.
        """
        refine = max([signal.refinement(step_s) for _, signal in self.signals], default=1)
        plan = _Plan(self, step_s, max(moments, default=0) + 1, refine)
        found = np.zeros((len(moments), len(self.rows), len(self.parts.parts)))
        with np.errstate(over="ignore", invalid="ignore", under="ignore"):
            for place, states in plan.states([moment * refine for moment in moments]):
                for group, state in zip(plan.groups, states, strict=True):
                    for index, addition in group.by_part(state):
                        found[place, :, index] = addition
        return found


class _Plan:
    """The tables of one record, and the walk over its blocks."""

    def __init__(self, driven: Driven, step_s: float, count: int, refine: int) -> None:
        self.driven, self.count, self.refine = driven, count, refine
        self.step_s = step_s / refine
        self.groups: list[Group] = groups_of(driven.parts, driven.rows, driven.load)
        self.cutter = Cutter(driven.signals, self.step_s)
        self.channels = self.cutter.channels()
        self.blows = self.cutter.blows()
        outputs, steps = max(1, len(driven.rows)), (count - 1) * refine + 1
        self.length = _block_length(self.groups, outputs, len(self.channels), steps, refine)
        self.blocks = -(-steps // self.length)
        self.kept = np.arange(0, self.length, refine)
        for group in self.groups:
            group.prepare(self.step_s, self.length, self.kept, self.channels)

    def chunks(self) -> Iterator[tuple[int, Array]]:
        """(first row, rows) of the record, without what the input adds directly."""
        outputs, length = len(self.driven.rows), self.length
        width = length * (outputs + len(self.channels)) + 2 * sum(group.size for group in self.groups)
        at_once = max(1, _CHUNK // max(1, width))
        states = [group.encode(self.driven.start) for group in self.groups]
        states = self._struck(states)
        for block in range(0, self.blocks, at_once):
            last = min(block + at_once, self.blocks)
            acting = self._acting(block, last)
            values = np.zeros((last - block, self.kept.size * outputs))
            for index, group in enumerate(self.groups):
                begun = self._begun(group, states[index], block, last, acting)
                states[index] = begun[-1]
                values += group.rows_of(begun[:-1], acting.table)
                for where, local in acting.local(group):
                    values[where] += local
            first = block * self.kept.size
            rows = values.reshape(-1, outputs)[: self.count - first]
            yield first, rows

    def _begun(self, group: Group, state: Numbers, block: int, last: int, acting: _Acting) -> Numbers:
        """The states at the beginning of each block, and at the end of the last one."""
        if not acting.any:
            if group.diagonal and not self.driven.signals:  # never any input: straight from the start
                return group.powers(self.driven.start, np.arange(block, last + 1))
            return group.scan(state, np.zeros((last - block, group.size), np.complex128))
        return group.scan(state, acting.pushes(group))

    def _acting(self, block: int, last: int) -> _Acting:
        first, end = block * self.length, last * self.length
        table, bits = self.cutter.cut(first, end)
        blows = [blow for blow in self.blows if first <= blow.step < end]
        return _Acting(self, first, table.reshape(last - block, -1), bits, blows)

    def _struck(self, states: list[Numbers]) -> list[Numbers]:
        """The states after the blows at time 0."""
        found = list(states)
        for blow in self.blows:
            if blow.step == -1:
                for index, group in enumerate(self.groups):
                    found[index] = found[index] + blow.size * group.inputs[:, blow.column]
        return found

    def states(self, moments: Sequence[int]) -> Iterator[tuple[int, list[Numbers]]]:
        """The states of all groups at chosen inner steps."""
        states = self._struck([group.encode(self.driven.start) for group in self.groups])
        wanted = sorted(range(len(moments)), key=lambda place: moments[place])
        block, acting = 0, self._acting(0, 1)
        for place in wanted:
            target, inner = divmod(moments[place], self.length)
            while block < target:
                states = [
                    self._begun(group, state, block, block + 1, acting)[-1]
                    for group, state in zip(self.groups, states, strict=True)
                ]
                block += 1
                acting = self._acting(block, block + 1)
            yield (
                place,
                [
                    acting.within(group, state, inner)
                    for group, state in zip(self.groups, states, strict=True)
                ],
            )


class _Acting:
    """What acts in some blocks: amplitudes of whole steps (blocks, length channels), bits and blows."""

    def __init__(self, plan: _Plan, first: int, table: Array, bits: list[Bits], blows: list[Blow]) -> None:
        self.plan, self.first, self.table, self.bits, self.blows = plan, first, table, bits, blows
        self.any = bool(table.any()) or bool(bits) or bool(blows)
        self._sparse: dict[int, tuple[NDArray[np.intp], Numbers]] = {}

    def pushes(self, group: Group) -> Numbers:
        """What all that acts in a block adds to the state at its end, (blocks, size)."""
        found = group.push_of(self.table)
        where, sparse = self.sparse(group)
        if where.size:
            ended, _ = group.walk(sparse, rows=False)
            found[where] += ended
        return found

    def local(self, group: Group) -> Iterator[tuple[NDArray[np.intp], Array]]:
        """What bits and blows add to the outputs of their blocks."""
        where, sparse = self.sparse(group)
        if where.size:
            yield where, group.walk(sparse, rows=True)[1]

    def sparse(self, group: Group) -> tuple[NDArray[np.intp], Numbers]:
        """The blocks with bits or blows, and what those add to the state at the end of each step."""
        if id(group) in self._sparse:
            return self._sparse[id(group)]
        steps: list[NDArray[np.intp]] = [bit.step for bit in self.bits]
        steps += [np.array([blow.step]) for blow in self.blows]
        if not steps:
            return np.zeros(0, np.intp), np.zeros((0, 0, 0))
        length = self.plan.length
        every = np.concatenate(steps) - self.first
        where = np.unique(every // length)
        added = np.zeros((where.size, length, group.size), np.complex128)
        for bit in self.bits:
            at = bit.step - self.first
            np.add.at(added, (np.searchsorted(where, at // length), at % length), group.bit(bit))
        for blow in self.blows:
            block, inner = divmod(blow.step - self.first, length)
            added[np.searchsorted(where, block), inner] += group.blow(blow)
        self._sparse[id(group)] = (where, added)
        return where, added

    def within(self, group: Group, state: Numbers, inner: int) -> Numbers:
        """The state ``inner`` steps after the beginning of the (only) block."""
        gains = group.gains
        amplitudes = self.table.reshape(self.plan.length, len(self.plan.channels))
        where, sparse = self.sparse(group)
        for step in range(inner):
            state = group.advance(state) + gains @ amplitudes[step]
            if where.size:
                state = state + sparse[0, step]
        return state


def _block_length(groups: Sequence[Group], outputs: int, channels: int, steps: int, refine: int) -> int:
    """Steps per block: a multiple of ``refine``, such that the two tables cost about the same."""
    size = 2 * sum(group.size for group in groups)
    wanted = size / max(1, channels) if channels else np.sqrt(steps)
    length = float(np.clip(wanted, _SHORTEST, _LONGEST))
    length = min(length, max(1.0, _TABLE / (outputs * size)))
    if channels:
        length = min(length, max(1.0, np.sqrt(_TABLE / (outputs * channels)) * np.sqrt(refine)))
    length = min(length, steps)
    return int(max(1, length // refine) * refine)
