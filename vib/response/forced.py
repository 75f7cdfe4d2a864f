"""The first-order model that loads and a moving ground act on, complete or reduced, and its records."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from vib.errors import ModelError
from vib.response.assemble import (
    COUNTS,
    FULL_SIZE,
    QUANTITIES,
    TRUNCATION,
    is_uncoupled,
)
from vib.response.exponential import Array
from vib.response.first_order import RingModel, full_model
from vib.response.frequency import Channels, ground_axis, ground_motion
from vib.response.groups import Parts, take_apart
from vib.response.loads import GroundMotion, Load
from vib.response.record import Driven
from vib.response.reduced import LowestModes, corrections, reduced_model
from vib.response.signals import Signal
from vib.system import System

__all__ = ["QUANTITIES", "Forced", "forced_model"]


@dataclass(frozen=True, eq=False)
class _Task:
    """Loads and outputs as arrays: ``forces`` (n, j), a signal each; ``ride`` (p,) on the ground, or None."""

    forces: Array
    signals: tuple[tuple[int, Signal], ...]
    watched: Array
    ride: Array | None
    ground: GroundMotion | None


@dataclass(frozen=True, eq=False)
class Forced:
    """A model with its loads: x' = A x + load u, four sets of outputs (see `records`)."""

    driven: Driven
    matrix: Array
    words: str
    coarser: Driven | None
    outputs: int
    ground_states: int

    @property
    def parts(self) -> Parts:
        """The parts of A."""
        return self.driven.parts

    @property
    def method(self) -> str:
        """How they move in time."""
        return self.parts.method

    @property
    def stable(self) -> bool:
        """False if any part of the system grows (the ground's own motion is none of it)."""
        return not any(
            float(part.eigenvalues.real.max()) > part.rounding
            for index, part in enumerate(self.parts.parts)
            if not self.is_ground(index)
        )

    def is_ground(self, index: int) -> bool:
        """Whether a part is the motion of the ground."""
        if not self.ground_states:
            return False
        return not self.parts.parts[index].left[:, : -self.ground_states].any()

    def records(self, step_s: float, count: int) -> list[Array]:
        """Displacement, velocity, acceleration, and displacement against the ground: (count, p) each."""
        return _split(self.driven.record(step_s, count), self.outputs)

    def contributions(self, step_s: float, moments: Sequence[int]) -> Array:
        """What each part adds to the (relative) displacement of each output at its own moment, (p, parts)."""
        found = self.driven.contributions(step_s, moments)
        first = 3 * self.outputs if self.ground_states else 0
        return np.array([found[index, first + index] for index in range(self.outputs)])

    def truncations(self, step_s: float, count: int, records: Sequence[Array]) -> dict[str, float]:
        """Largest difference to the model of half as many modes, relative to the largest response."""
        if self.coarser is None:
            return dict.fromkeys(QUANTITIES, 0.0)
        other = _split(self.coarser.record(step_s, count), self.outputs)
        found = {}
        for name, fine, coarse in zip(QUANTITIES, records, other, strict=False):
            top = float(np.abs(fine).max(initial=0.0))
            found[name] = float(np.abs(fine - coarse).max(initial=0.0)) / top if top else 0.0
        return found

    def _weights(self) -> tuple[Array, Array, Array]:
        """Angular rate, decay, and how much each single part can add to the displacements, (g,) each."""
        rates, decays, sizes = [], [], []
        for index, part in enumerate(self.parts.parts):
            value = complex(part.eigenvalues[0])
            if self.is_ground(index) or not part.single or abs(value) <= part.rounding:
                continue
            rows = np.abs(self.driven.rows[: self.outputs] @ part.right[:, 0])
            pushed = float(np.abs(part.left[0] @ self.driven.load).max(initial=0.0))
            rates.append(abs(value))
            decays.append(-value.real)
            sizes.append(float(rows.max(initial=0.0)) * pushed / abs(value))
        return np.array(rates), np.array(decays), np.array(sizes)

    def rates(self, share: float) -> list[float]:
        """Angular rates of the parts that matter, fastest first, rad/s."""
        rates, _, sizes = self._weights()
        return sorted(rates[sizes >= share * sizes.max(initial=0.0)].tolist(), reverse=True)

    def slowest_decay(self, share: float) -> float | None:
        """The slowest decay of the parts that matter, 1/s; None if one does not decay."""
        _, decays, sizes = self._weights()
        chosen = decays[sizes >= share * sizes.max(initial=0.0)]
        return float(chosen.min()) if chosen.size and chosen.min() > 0 else None


def forced_model(
    system: System, loads: Sequence[Load], ground: GroundMotion | None, watched: Channels
) -> Forced:
    """The model for these loads and outputs: complete where that is small, else reduced.

    Raises
    ------
    ModelError
        An unknown place; a moving ground under bare matrices.
    """
    forces = [system.direction(load.at, load.along) for load in loads]
    signals = [(number, load.signal) for number, load in enumerate(loads)]
    ride = None
    if ground is not None:
        carried, rigid = ground_motion(system, watched, [ground_axis(ground.along)])
        forces.append(-carried[:, 0])
        signals.append((len(loads), ground.acceleration))
        ride = rigid[:, 0]
    task = _Task(np.stack(forces, axis=1), tuple(signals), watched.directions, ride, ground)
    if system.unsymmetric or system.size <= FULL_SIZE or is_uncoupled(system):
        model = full_model(system)
        words = f"complete first-order model, {len(model.matrix)} states"
        return _forced(model, task, words, None)
    return _reduced(system, task)


def _reduced(system: System, task: _Task) -> Forced:
    lowest = LowestModes(system)
    fixed = corrections(system, lowest(COUNTS[0]), np.hstack([task.forces, task.watched]))
    earlier: Driven | None = None
    counts = [count for count in COUNTS if count <= 0.6 * system.size]
    for place, count in enumerate(counts):
        model = reduced_model(system, lowest(count), fixed)
        words = f"reduced first-order model, {len(model.matrix)} states: {count} modes and static corrections"
        found = _forced(model, task, words, earlier)
        if earlier is not None and (place == len(counts) - 1 or _settled(found)):
            break
        earlier = found.driven
    return found


def _settled(found: Forced) -> bool:
    """Whether half as many modes give the same record over the first periods."""
    rates = found.rates(0.01)
    step = 2 * np.pi / rates[0] / 20 if rates else 1e-3
    count = int(min(4000, 2 * np.pi / rates[-1] / step * 2 + 2)) if rates else 2
    return found.truncations(step, count, found.records(step, count))["displacement"] <= TRUNCATION


def _forced(model: RingModel, task: _Task, words: str, coarser: Driven | None) -> Forced:
    matrix, rows, load = model.matrix, task.watched.T @ model.shape, model.load @ task.forces
    outputs, states = rows.shape
    _check_blows(model, task)
    direct = None if model.direct is None else task.watched.T @ model.direct @ task.forces
    start = np.zeros(states)
    relative = rows
    ground_states = 0
    if task.ground is not None and task.ride is not None:
        # the ground is two more states, its place and its speed, so that its motion is exact as well
        ground_states = 2
        inner = np.array([[0.0, 1.0], [0.0, 0.0]])
        matrix = np.block([[matrix, np.zeros((states, 2))], [np.zeros((2, states)), inner]])
        shaken = np.zeros((2, load.shape[1]))
        shaken[1, -1] = 1.0
        load = np.vstack([load, shaken])
        relative = np.hstack([rows, np.zeros((outputs, 2))])
        rows = np.hstack([rows, task.ride[:, None], np.zeros((outputs, 1))])
        start = np.concatenate([start, [task.ground.displacement_m, task.ground.velocity_m_s]])
    every, feed = _derivatives(matrix, rows, load, direct)
    if ground_states:
        every = np.vstack([every, relative])
        feed[0] = np.vstack([feed[0], np.zeros((outputs, load.shape[1])) if direct is None else direct])
        feed[1:] = [np.vstack([one, np.zeros((outputs, load.shape[1]))]) for one in feed[1:]]
    driven = Driven(take_apart(matrix), every, load, tuple(feed), task.signals, start)
    return Forced(driven, matrix, words, coarser, outputs, ground_states)


def _check_blows(model: RingModel, task: _Task) -> None:
    if model.direct is None:
        return
    for column, signal in task.signals:
        if signal.blows and np.abs(model.direct @ task.forces[:, column]).max() > 0:
            raise ModelError(
                "impulse: it acts where there is no mass and would throw it infinitely far; strike a place "
                "with mass, or use a pulse"
            )


def _derivatives(matrix: Array, rows: Array, load: Array, direct: Array | None) -> tuple[Array, list[Array]]:
    """Rows (3 p, s) of displacement, velocity, acceleration, and what the input and its derivatives add."""
    p, j = len(rows), load.shape[1]
    sets, feed = [rows], [np.zeros((3 * p, j)) for _ in range(3)]
    if direct is not None:
        for order in range(3):
            feed[order][order * p : (order + 1) * p] += direct
    for order in (1, 2):
        through = sets[-1] @ load
        size = np.abs(sets[-1]) @ np.abs(load)
        through = np.where(np.abs(through) > 1e-14 * size, through, 0.0)
        for later in range(order, 3):
            feed[later - order][later * p : (later + 1) * p] += through
        sets.append(sets[-1] @ matrix)
    return np.vstack(sets), feed


def _split(record: Array, outputs: int) -> list[Array]:
    return [record[:, first : first + outputs] for first in range(0, record.shape[1], outputs)]
