"""One group of parts of a first-order model, and its tables for a block of steps (see `record`)."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
import scipy.linalg
from numpy.typing import NDArray

from vib.response.exponential import Array, Numbers
from vib.response.groups import Part, Parts
from vib.response.instep import Shape, block_effects, effects
from vib.response.pieces import Bits, Blow
from vib.response.transition import Propagator


class Group:
    """All parts that move by exp(lambda t) together, or one cluster; the state is complex, (size,)."""

    def __init__(self, parts: Sequence[tuple[int, Part]], rows: Array, load: Array) -> None:
        self.diagonal = all(part.single for _, part in parts)
        self.indices = [index for index, _ in parts]
        self.left = np.vstack([part.left for _, part in parts])
        self.outputs = np.hstack([part.factor * (rows @ part.right) for _, part in parts])
        self.values = np.concatenate([part.eigenvalues for _, part in parts])
        self.block = parts[0][1].block
        self.inputs = self.left @ load
        self.size = len(self.left)

    def encode(self, start: Array) -> Numbers:
        """The coordinates of a state x."""
        return np.asarray(self.left @ start).astype(np.complex128)

    def prepare(
        self, step_s: float, length: int, kept: NDArray[np.intp], channels: Sequence[tuple[int, Shape]]
    ) -> None:
        """The tables of a block of ``length`` steps whose outputs are wanted at the steps ``kept``."""
        self.step_s, self.length, self.kept = step_s, length, kept
        ahead = step_s * np.arange(length + 1)
        if self.diagonal:
            self._ahead: Numbers = np.exp(np.outer(ahead, self.values))
        else:
            self._ahead = Propagator(self.block)(ahead)
        self.gains = self._gains(channels)
        seen = self._seen(self.outputs)  # (length + 1, q, size)
        free = seen[kept].reshape(-1, self.size)
        self._free = np.hstack([free.real, -free.imag])
        self._forced = self._toeplitz(seen)
        moved = np.stack([self._move(length - 1 - step, self.gains) for step in range(length)], axis=1)
        self._push = moved.reshape(self.size, -1)

    def _gains(self, channels: Sequence[tuple[int, Shape]]) -> Numbers:
        """What one whole step of each channel adds to the state, (size, channels)."""
        found = np.zeros((self.size, len(channels)), np.complex128)
        for number, (column, shape) in enumerate(channels):
            if self.diagonal:
                effect = effects(self.values, np.array([self.step_s]), shape)[0]
                found[:, number] = effect * self.inputs[:, column]
            else:
                gain, one = self.inputs[:, column], np.array([self.step_s])
                found[:, number] = block_effects(self.block, gain, one, shape)[0]
        return found

    def _seen(self, outputs: Numbers) -> Numbers:
        if self.diagonal:
            return np.asarray(outputs[None, :, :] * self._ahead[:, None, :])
        return np.asarray(outputs @ self._ahead)

    def _move(self, steps: int, states: Numbers) -> Numbers:
        if self.diagonal:
            return np.asarray(self._ahead[steps][:, None] * states)
        return np.asarray(self._ahead[steps] @ states)

    def _toeplitz(self, seen: Numbers) -> Array:
        """What the amplitudes of a block add to its outputs, (length channels, kept q)."""
        channels, q = self.gains.shape[1], len(self.outputs)
        answers = (seen @ self.gains).real  # (length + 1, q, channels)
        behind = self.kept[:, None] - 1 - np.arange(self.length)[None, :]
        table = np.where((behind >= 0)[:, :, None, None], answers[np.maximum(behind, 0)], 0.0)
        return table.transpose(1, 3, 0, 2).reshape(self.length * channels, self.kept.size * q)

    def rows_of(self, begun: Numbers, table: Array) -> Array:
        """Outputs (blocks, kept q) from the states at the beginning of blocks and the amplitudes in them."""
        found = np.hstack([begun.real, begun.imag]) @ self._free.T
        if table.shape[1] and table.any():
            found += table @ self._forced
        return np.asarray(found)

    def push_of(self, table: Array) -> Numbers:
        """What the amplitudes add to the states at the ends of blocks, (blocks, size)."""
        found = np.empty((len(table), self.size), np.complex128)
        found.real = table @ self._push.real.T
        found.imag = table @ self._push.imag.T
        return found

    def scan(self, state: Numbers, pushes: Numbers) -> Numbers:
        """States at the beginning of each block and at the end of the last, (blocks + 1, size)."""
        found = np.empty((len(pushes) + 1, self.size), np.complex128)
        found[0] = state
        whole = self._ahead[self.length]
        for number, push in enumerate(pushes):
            state = (whole * state if self.diagonal else whole @ state) + push
            found[number + 1] = state
        return found

    def powers(self, start: Array, blocks: NDArray[np.intp]) -> Numbers:
        """States at the beginning of blocks in free motion, by one exponential each."""
        ahead = self.length * self.step_s * blocks
        return np.asarray(np.exp(np.outer(ahead, self.values)) * self.encode(start))

    def advance(self, state: Numbers) -> Numbers:
        """The state one step on, without input."""
        return np.asarray(self._ahead[1] * state if self.diagonal else self._ahead[1] @ state)

    def walk(self, added: Numbers, *, rows: bool) -> tuple[Numbers, Array]:
        """From rest with additions (blocks, length, size) at the step ends: end states, outputs."""
        state = np.zeros((len(added), self.size), np.complex128)
        kept = dict(zip(self.kept.tolist(), range(self.kept.size), strict=True))
        found = np.zeros((len(added), self.kept.size, len(self.outputs) if rows else 0))
        one = self._ahead[1]
        for step in range(self.length):
            if rows and step in kept:
                found[:, kept[step]] = (state @ self.outputs.T).real
            state = (state * one if self.diagonal else state @ one.T) + added[:, step]
        return state, found.reshape(len(added), -1)

    def bit(self, bit: Bits) -> Numbers:
        """What each part of a step adds to the state at the end of its step, (k, size)."""
        lengths, rest = bit.end - bit.begin, self.step_s - bit.end
        gain = self.inputs[:, bit.column]
        if self.diagonal:
            moved = np.exp(np.outer(rest, self.values)) * effects(self.values, lengths, bit.shape)
            return np.asarray(bit.amplitude[:, None] * moved * gain)
        acted = block_effects(self.block, gain, lengths, bit.shape)
        found = np.zeros((len(rest), self.size), np.complex128)
        for number, (late, size) in enumerate(zip(rest, bit.amplitude, strict=True)):
            found[number] = size * (scipy.linalg.expm(self.block * late) @ acted[number])
        return found

    def blow(self, blow: Blow) -> Numbers:
        """What an impulse adds to the state at the end of its step, (size,)."""
        struck = blow.size * self.inputs[:, blow.column]
        rest = self.step_s - blow.offset
        if self.diagonal:
            return np.asarray(np.exp(self.values * rest) * struck)
        return np.asarray(scipy.linalg.expm(self.block * rest) @ struck)

    def by_part(self, state: Numbers) -> Iterator[tuple[int, Array]]:
        """(number of the part, what it adds to the outputs (q,))."""
        if not self.diagonal:
            yield self.indices[0], (self.outputs @ state).real
            return
        for place, index in enumerate(self.indices):
            yield index, (self.outputs[:, place] * state[place]).real


def groups_of(parts: Parts, rows: Array, load: Array) -> list[Group]:
    """The singles together, and each cluster alone."""
    singles = [(index, part) for index, part in enumerate(parts.parts) if part.single]
    found = [Group(singles, rows, load)] if singles else []
    clusters = [(index, part) for index, part in enumerate(parts.parts) if not part.single]
    return found + [Group([cluster], rows, load) for cluster in clusters]
