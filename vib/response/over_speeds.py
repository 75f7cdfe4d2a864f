"""Steady vibration over a range of speeds: how a `RunUp` is made."""

from __future__ import annotations

import time
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike

from vib.drive import Drive, drive
from vib.errors import ModelError, in_own_words
from vib.progress import tell
from vib.response.at_speeds import AtSpeeds, at_speeds
from vib.response.exponential import Array
from vib.response.frequency import Channel, Channels, channels, ground_axis, ground_motion
from vib.response.residue_sum import Complex
from vib.response.run_up import Line, Resonance, RunUp, Transmitted, summed
from vib.response.speed_range import (
    ROUNDS,
    UNDAMPED,
    Meeting,
    default_range,
    finer,
    first_speeds,
    meetings,
    tidy,
)
from vib.response.steady import Steady, steady
from vib.response.transmitted import Feet, feet
from vib.response.unsteady import unsteady
from vib.response.watching import places_to_watch
from vib.study import Study
from vib.study.excitations import Excitation
from vib.system import COMPONENTS, System

if TYPE_CHECKING:
    from vib.modes import Modes

_MOST_POINTS = 4000
_CHUNK = 4_000_000  # complex numbers at a time
_TOLD = 128  # points after which the progress is told


@in_own_words
def run_up(
    given: Study | System,
    *,
    excitations: Sequence[Excitation] | None = None,
    shaft: str | None = None,
    speeds_hz: ArrayLike | None = None,
    held_hz: Mapping[str, float] | None = None,
    watch: Sequence[Channel] | None = None,
    modes: Modes | None = None,
) -> RunUp:
    """The steady vibration of a machine over its range of speeds, under everything that shakes it.

    At each speed each line of each excitation is answered by the whole damped model at that speed: isolators,
    dashpots, material damping, gyroscopic and circulatory terms. Lines of the same frequency add as vectors,
    others by their mean squares.

    Parameters
    ----------
    given
        A study, or a system with ``excitations``.
    excitations
        Instead of those of the study.
    shaft
        The excitation whose speed varies; default: the first with a range of speeds.
    speeds_hz
        (k,) exactly these speeds of it, rev/s; default: its stated range (around single speeds from a tenth
        to 1.2 times), with points about every resonance and at every peak.
    held_hz
        Speeds, rev/s, of machines that don't follow it, by name; default: their fastest.
    watch
        Outputs as (place, component) or names; default: what [response] watches and [severity] judges, else
        the bodies and the places where forces act.
    modes
        Modes up to the highest line found before for this system: their division of the structure is used.

    Returns
    -------
    RunUp

    Raises
    ------
    ModelError
        Nothing drives, unknown places or shafts, speeds that are none.
    AccuracyError
        The error of a reduced model could not be stated, or a solver did not finish.

    References
    ----------
    Frequency response: see `vib.response.frequency`. Unbalance: ISO 21940-11. Rotors in axes that do not
    turn: G. Genta, Dynamics of Rotating Systems (2005), chapter 4.
    """
    study = given if isinstance(given, Study) else None
    acting = excitations if excitations is not None else (study.excitations if study else ())
    system = given.system() if isinstance(given, Study) else given
    planned = drive(system, acting, shaft=shaft, held_hz=held_hz)
    exact = None if speeds_hz is None else _speeds(speeds_hz, planned)
    low, high = _range(planned, exact)
    used, known, errors = _divided(system, _highest(planned, low, high), modes)
    if used is not system:
        planned = drive(used, acting, shaft=shaft, held_hz=held_hz)
    ratios, tied = _ratios(used, planned)
    family = at_speeds(used, ratios, planned.train.held)
    watched = channels(used, watch if watch is not None else places_to_watch(used, study, planned))
    standing = feet(used, study, planned) if study is not None and used.anatomy is not None else None
    task = _task(planned, family, watched, standing, (low, high))
    unstable, doubts = unsteady(family, low, high)
    met: list[Meeting] = []
    if exact is None:
        rates = sorted({planned.rate(line) for line in planned.lines} - {0.0})
        met = meetings(family, rates, low, high, known)
        found = task.refined(first_speeds(low, high, met, planned.train.ranges), low, high)
    else:
        found = task.at(exact)
    remarks = (*planned.remarks, *tied, *(standing.remarks if standing else ()))
    return _result(task, found, met, unstable, errors, (*doubts, *remarks))


@dataclass(frozen=True, eq=False)
class _Found:
    """Phasors at speeds (k,): displacements (k, lines, p), their bound, and forces (k, lines, q)."""

    speed_hz: Array
    displacement: Complex
    error: Array
    forces: Complex

    def joined(self, other: _Found) -> _Found:
        """Both, by speed."""
        order = np.argsort(np.concatenate([self.speed_hz, other.speed_hz]), kind="stable")
        pairs = [(getattr(self, name), getattr(other, name)) for name in self.__dataclass_fields__]
        return _Found(*(np.concatenate(pair)[order] for pair in pairs))


@dataclass(frozen=True, eq=False)
class _Task:
    """What is asked, and what answers it. ``ride`` (p, 6) is how outputs follow the ground."""

    drive: Drive
    family: AtSpeeds
    watched: Channels
    standing: Feet | None
    solver: Steady
    ride: Array | None

    def at(self, speeds: Array) -> _Found:
        """All lines at these speeds."""
        k, p = len(speeds), len(self.watched.names)
        q = 0 if self.standing is None else len(self.standing.names)
        lines = self.drive.lines
        displacement = np.zeros((k, len(lines), p), np.complex128)
        forces = np.zeros((k, len(lines), q), np.complex128)
        error = np.zeros((k, len(lines), p))
        rows = p + 4 * q
        columns = len(self.drive.inputs) + (0 if self.ride is None else 6)
        step = max(1, min(_TOLD, _CHUNK // max(1, rows * columns)))
        groups, began = self.drive.groups(), time.perf_counter()
        for count, group in enumerate(groups):
            for first in range(0, k, step):
                _tell(count + first / k, len(groups), k, began)
                piece = slice(first, first + step)
                omega = 2 * np.pi * self.drive.frequency_hz(lines[group[0]], speeds[piece])
                values, bound = self._answer(speeds[piece], omega)
                for number in group:
                    moved, error[piece, number], forces[piece, number] = self._line(
                        number, speeds[piece], omega, values, bound
                    )
                    displacement[piece, number] = moved
        return _Found(speeds, displacement, error, forces)

    def _answer(self, speeds: Array, omega: Array) -> tuple[Complex, Array]:
        if self.family.varies or np.ptp(omega) > 0:
            return self.solver(speeds, omega)
        values, bound = self.solver(speeds[:1], omega[:1])  # the same at every speed
        return np.repeat(values, len(speeds), axis=0), np.repeat(bound, len(speeds), axis=0)

    def _line(
        self, number: int, speeds: Array, omega: Array, values: Complex, bound: Array
    ) -> tuple[Complex, Array, Complex]:
        line, p = self.drive.lines[number], len(self.watched.names)
        pushed = self.drive.forces(line, speeds)
        shaken = self.drive.ground_m(line, speeds)
        acting = pushed if self.ride is None else np.hstack([pushed, omega[:, None] ** 2 * shaken])
        with np.errstate(invalid="ignore", over="ignore"):
            moved = np.einsum("koi,ki->ko", values, acting)
            error = np.einsum("koi,ki->ko", bound[:, :p], np.abs(acting))
            forces = np.zeros((len(speeds), 0), np.complex128)
            if self.standing is not None:
                forces = self.standing.forces(speeds, omega, moved[:, p:], pushed, shaken)
        if self.ride is not None:
            moved[:, :p] += shaken @ self.ride.T
        return moved[:, :p], error, forces

    def refined(self, speeds: Array, low: float, high: float) -> _Found:
        """These speeds, and more until every peak is met."""
        found = self.at(speeds)
        for _ in range(ROUNDS):
            added = tidy(finer(found.speed_hz, self._curves(found)), low, high)
            added = added[~np.isin(added, found.speed_hz)]
            if not added.size or len(found.speed_hz) + added.size > _MOST_POINTS:
                break
            found = found.joined(self.at(added))
        return found

    def _curves(self, found: _Found) -> Array:
        """Sizes whose peaks count: each output and force, by frequency and in all."""
        groups = self.drive.groups()
        sizes = [np.abs(summed(part, groups)) for part in (found.displacement, found.forces)]
        both = np.concatenate(sizes, axis=2)
        rates = np.stack(
            [self.drive.frequency_hz(self.drive.lines[g[0]], found.speed_hz) for g in groups], axis=1
        )
        whole = np.sqrt(((rates[:, :, None] * both) ** 2).sum(axis=1))
        return np.concatenate([both.reshape(len(both), -1), whole], axis=1)


def _tell(done: float, groups: int, points: int, began: float) -> None:
    share = done / groups
    left = (time.perf_counter() - began) * (1 / share - 1) if share else None
    tell(f"run-up at {points} speeds", share, left)


def _task(
    planned: Drive,
    family: AtSpeeds,
    watched: Channels,
    standing: Feet | None,
    span: tuple[float, float],
) -> _Task:
    outputs = [watched.directions] + ([standing.outputs()] if standing is not None else [])
    inputs, ride = [planned.directions], None
    if planned.shakes_ground:
        carried, ride = ground_motion(family.system, watched, [ground_axis(axis) for axis in COMPONENTS])
        inputs.append(carried)
    highest = 2 * np.pi * _highest(planned, *span)
    solver = steady(family, span[1], highest, np.hstack(outputs), np.hstack(inputs))
    return _Task(planned, family, watched, standing, solver, ride)


def _result(
    task: _Task,
    found: _Found,
    met: Sequence[Meeting],
    unstable: Sequence[tuple[float, float]],
    errors: tuple[str, ...],
    remarks: tuple[str, ...],
) -> RunUp:
    planned, speeds = task.drive, found.speed_hz
    stable = np.ones(len(speeds), dtype=bool)
    for low, high in unstable:
        stable &= ~((speeds >= low) & (speeds <= high))
    still = stable[:, None, None]
    groups = planned.groups()
    first = {planned.rate(planned.lines[group[0]]): group[0] for group in groups}
    undamped = sorted({row.mode for row in met if row.damping_ratio < UNDAMPED})
    transmitted = None
    if task.standing is not None:
        feet_, forces = task.standing, np.where(still, found.forces, np.nan)
        transmitted = Transmitted(feet_.names, feet_.owners, feet_.components, feet_.kinds, forces)
    return RunUp(
        system=task.family.system,
        shaft=planned.train.reference,
        speed_hz=speeds,
        service_hz=planned.train.ranges,
        lines=tuple(
            Line(line.excitation, line.source, line.order, planned.frequency_hz(line, speeds))
            for line in planned.lines
        ),
        groups=groups,
        outputs=task.watched.names,
        places=task.watched.places,
        rotational=task.watched.rotational,
        displacement_m=np.where(still, found.displacement, np.nan),
        error_m=found.error,
        transmitted=transmitted,
        resonances=tuple(
            Resonance(row.speed_hz, first[row.rate], row.mode, row.frequency_hz, row.damping_ratio)
            for row in met
        ),
        stable_at=stable,
        method=task.solver.method,
        errors=(*errors, *_left_out(task, found)),
        remarks=(*_unstable(unstable, planned), *_undamped(undamped), *remarks),
    )


def _left_out(task: _Task, found: _Found) -> tuple[str, ...]:
    if task.solver.complete:
        return ("No mode is left out: the answers are those of the whole model to rounding.",)
    top = np.abs(found.displacement).max(axis=0)
    worst = found.error.max(axis=0) / np.where(top > 0, top, np.inf)
    return (
        f"Modes left out: the error of a line at an output is at most {worst.max(initial=0.0):.1e} of its "
        "largest value (a bound).",
    )


def _unstable(unstable: Sequence[tuple[float, float]], planned: Drive) -> tuple[str, ...]:
    if not unstable:
        return ()
    if not planned.train.reference:
        return ("The system is UNSTABLE: no steady vibration exists.",)
    listed = ", ".join(f"{60 * low:.6g} to {60 * high:.6g} rpm" for low, high in unstable)
    return (f"The system is UNSTABLE at {listed}: there no steady vibration exists, and no level is given.",)


def _undamped(modes: Sequence[int]) -> tuple[str, ...]:
    if not modes:
        return ()
    listed = ", ".join(str(mode) for mode in modes)
    return (
        f"Undamped modes ({listed}): at their resonances a level has no limit, and the figures next to them "
        "only show that; state damping.",
    )


def _speeds(given: ArrayLike, planned: Drive) -> Array:
    speeds = np.unique(np.atleast_1d(np.asarray(given, dtype=np.float64)))
    if speeds.ndim != 1 or not speeds.size or not np.isfinite(speeds).all() or speeds.min() <= 0:
        raise ModelError("speeds_hz: give speeds above zero, in revolutions per second")
    if not planned.train.reference:
        raise ModelError("speeds_hz: no excitation has a running speed that could be set")
    return speeds


def _range(planned: Drive, exact: Array | None) -> tuple[float, float]:
    if exact is not None:
        return float(exact[0]), float(exact[-1])
    if not planned.train.reference:
        return 0.0, 0.0
    return default_range(planned.train.ranges)


def _highest(planned: Drive, low: float, high: float) -> float:
    ends = np.array([low, high])
    return max(float(planned.frequency_hz(line, ends).max()) for line in planned.lines)


def _ratios(system: System, planned: Drive) -> tuple[Mapping[str, float], tuple[str, ...]]:
    """Which shafts follow the reference shaft; that of bare matrices does."""
    train = planned.train
    alone = [row.shaft for row in system.rotations if row.shaft not in (*train.ratios, *train.held)]
    if system.anatomy is not None or not alone or not train.reference:
        return train.ratios, ()
    remark = f"Gyroscopic and circulatory terms of the matrices follow the speed of {train.reference}."
    return {**train.ratios, **dict.fromkeys(alone, 1.0)}, (remark,)


def _divided(
    system: System, highest_hz: float, modes: Modes | None
) -> tuple[System, Modes | None, tuple[str, ...]]:
    """A structure in the division whose modes up to the highest line are accurate, and these modes."""
    if system.anatomy is None or (system.anatomy.division is None and system.anatomy.discretisation is None):
        return system, modes, ()
    found = modes if modes is not None else system.modes(up_to=1.02 * highest_hz)
    elastic = found.frequencies_hz > 0
    if not elastic.any():
        return found.system, found, ()
    worst = float((found.errors_hz[elastic] / found.frequencies_hz[elastic]).max())
    return (
        found.system,
        found,
        (
            f"Numerical error of the natural frequencies up to {highest_hz:.4g} Hz: at most {worst:.1e}, "
            "relative; next to a resonance a level is off by that over the damping ratio.",
        ),
    )
