"""The response to forces and to a motion of the ground over time: the noun `Response`."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from vib.errors import ModelError, in_own_words
from vib.response.exponential import Array
from vib.response.forced import QUANTITIES, Forced, forced_model
from vib.response.frequency import Channels, channels, ground_axis, ground_motion
from vib.response.loads import GroundMotion, Load, check_loads
from vib.response.receptance import receptance
from vib.response.signals import Harmonic, Sweep, ends_of
from vib.response.simulate import check_memory
from vib.response.stability import judged
from vib.system import System

if TYPE_CHECKING:
    from vib.modes import Modes

Along = str | Sequence[float] | None
SAMPLES_PER_PERIOD = 40
MOST_STEPS = 400_000
_REST = math.log(100.0)  # until a motion has fallen to 1 %
_UNDAMPED_PERIODS = 20
_SHARE = 0.01
_LEAST_SHARE = 1e-3


@dataclass(frozen=True)
class Extreme:
    """The largest size of one output in the record: its signed value and when."""

    output: str
    quantity: str
    value: float
    time_s: float


@dataclass(frozen=True, eq=False)
class Steady:
    """What remains of the response to harmonic loads of one frequency when all else has died away.

    ``amplitude`` (p,) complex, m (rad): the displacement is Im(amplitude exp(2 pi i f t)).
    """

    frequency_hz: float
    amplitude: np.ndarray[Any, np.dtype[np.complex128]]
    error: Array


@dataclass(frozen=True, eq=False)
class Share:
    """What one mode adds to each output's displacement at its largest, (p,), as a share of it."""

    eigenvalue: complex
    frequency_hz: float
    damping_ratio: float | None
    shares: Array
    clustered: bool


@dataclass(frozen=True, kw_only=True, eq=False)
class Response:
    """The response of p outputs at k times; SI units, rotations in rad.

    Attributes
    ----------
    system
        The system that responded (for a structure perhaps a finer division than the one given).
    loads
        What acted, in words.
    time_s
        (k,) evenly spaced from 0.
    displacement_m, velocity_m_s, acceleration_m_s2
        (k, p); absolute, also where the ground moves.
    relative_m
        (k, p) displacement against the moving ground; None where the ground rests.
    freedoms, rotational
        (p,) names of the outputs, and whether each is an angle.
    extremes
        The largest displacement, velocity and acceleration of each output in the record.
    steady
        The steady part, one entry per frequency of the harmonic loads that go on.
    shares
        What each mode adds to the largest displacements, slowest first.
    model, method, truncations
        The first-order model used, how it moves in time, and the relative error by modes left out: the
        difference to a model of half as many modes, 0 for a complete one.
    stable
        False if any part grows.
    step_note, duration_note
        How the step and the length were chosen.
    remarks
        What the reader should know, in words.
    """

    system: System
    loads: tuple[str, ...]
    time_s: Array
    displacement_m: Array
    velocity_m_s: Array
    acceleration_m_s2: Array
    relative_m: Array | None
    freedoms: tuple[str, ...]
    rotational: tuple[bool, ...]
    extremes: tuple[Extreme, ...]
    steady: tuple[Steady, ...]
    shares: tuple[Share, ...]
    model: str
    method: str
    truncations: Mapping[str, float]
    stable: bool
    step_note: str
    duration_note: str
    remarks: tuple[str, ...]


@in_own_words
def respond(
    system: System,
    *,
    loads: Sequence[Load] = (),
    ground: GroundMotion | None = None,
    watch: Sequence[tuple[str, Along] | str] | None = None,
    duration_s: float | None = None,
    step_s: float | None = None,
    modes: Modes | None = None,
) -> Response:
    """The response to loads and to a motion of the ground, from rest, without time-stepping error.

    Parameters
    ----------
    system
        Any system; large ones through a reduced model whose error is stated.
    loads
        Forces at places, see `vib.response.loads.Load`.
    ground
        A motion of the ground (a structure only). The system begins at rest against the ground.
    watch
        Outputs as (place, component); default: every freedom of bare matrices, the loaded places of a
        structure.
    duration_s, step_s
        Length of the record and step; chosen if left out.
    modes
        Modes found before for this system: their division of the structure is used.

    Raises
    ------
    ModelError
        Nothing acts, an unknown place, a blow where there is no mass, a step or duration that isn't positive.
    AccuracyError
        A growing motion leaves the range of numbers.

    Examples
    --------
    >>> import vib
    >>> from vib.response.signals import Constant
    >>> system = vib.System(mass=[[2.0]], damping=[[0.8]], stiffness=[[8.0]])
    >>> found = respond(system, loads=[Load(Constant(8.0), "1")], duration_s=200.0, step_s=0.5)
    >>> found.displacement_m[-1].round(9).tolist()
    [1.0]
    """
    check_loads(loads, ground)
    used, notes = _divided(system, modes)
    watched = channels(used, _watch(used, loads, watch))
    forced = forced_model(used, loads, ground, watched)
    step, step_note = _step(forced, loads, ground, step_s)
    length, duration_note = _duration(forced, loads, ground, duration_s)
    count = round(length / step) + 1
    if count > MOST_STEPS and step_s is None:
        raise ModelError(
            f"respond: {length:.4g} s at steps of {step:.3g} s are {count} times; give a shorter duration or "
            "a longer step, or stream the record with vib.response.simulate.simulate_to"
        )
    check_memory(count, 4 * len(watched.names))
    records = forced.records(step, count)
    time: Array = step * np.arange(count, dtype=np.float64)
    stable = forced.stable
    doubt: tuple[str, ...] = ()
    if stable and forced.coarser is not None:
        stable, doubt = judged(used)
    steady, steady_remarks = _steady(used, loads, ground, watched, stable)
    return Response(
        system=used,
        loads=tuple(f"{load.name}: {load.words}" for load in loads)
        + ((f"{ground.name} along {ground.along}: {ground.words}",) if ground else ()),
        time_s=time,
        displacement_m=records[0],
        velocity_m_s=records[1],
        acceleration_m_s2=records[2],
        relative_m=records[3] if ground is not None else None,
        freedoms=watched.names,
        rotational=watched.rotational,
        extremes=_extremes(time, records, watched.names),
        steady=steady,
        shares=_shares(forced, step, records[0] if ground is None else records[3]),
        model=forced.words,
        method=forced.method,
        truncations=forced.truncations(step, count, records),
        stable=stable,
        step_note=step_note,
        duration_note=duration_note,
        remarks=(
            *_state(stable),
            *doubt,
            *(ground.remarks if ground else ()),
            *steady_remarks,
            *notes,
        ),
    )


def _divided(system: System, modes: Modes | None) -> tuple[System, tuple[str, ...]]:
    if system.anatomy is None or system.anatomy.division is None:
        return system, ()
    found = modes if modes is not None else system.modes(count=min(12, system.size))
    elastic = found.frequencies_hz > 0
    worst = float((found.errors_hz[elastic] / found.frequencies_hz[elastic]).max(initial=0.0))
    return found.system, (
        f"Numerical error of the first {found.count} natural frequencies: at most {worst:.1e}, relative; "
        "higher modes are less accurate.",
    )


def _watch(
    system: System, loads: Sequence[Load], watch: Sequence[tuple[str, Along] | str] | None
) -> Sequence[tuple[str, Along] | str] | None:
    if watch is not None or system.anatomy is None:
        return watch
    places = dict.fromkeys((load.at, _key(load.along)) for load in loads)
    if not places:
        raise ModelError("respond: say what to watch, as places and components such as ('motor', 'x')")
    return [(at, along) for at, along in places]


def _key(along: Along) -> Along:
    return along if along is None or isinstance(along, str) else tuple(along)


def _state(stable: bool) -> tuple[str, ...]:
    if not stable:
        return ("The system is UNSTABLE: the motion grows by itself; the record shows only its beginning.",)
    return ()


def _step(
    forced: Forced, loads: Sequence[Load], ground: GroundMotion | None, asked: float | None
) -> tuple[float, str]:
    if asked is not None:
        if not (math.isfinite(asked) and asked > 0):
            raise ModelError(f"step: it must be longer than 0, got {asked:g} s")
        return asked, "the step asked for"
    periods = [2 * math.pi / rate for rate in forced.rates(_SHARE)[:1]]
    signals = [load.signal for load in loads] + ([ground.acceleration] if ground else [])
    grids = []
    for signal in signals:
        if isinstance(signal, Harmonic):
            periods.append(1 / signal.frequency_hz)
        elif isinstance(signal, Sweep):
            periods.append(1 / max(signal.from_hz, signal.to_hz))
        elif signal.corners.size > 2:
            grids.append(_record_step(signal.corners))
    wanted = min(periods, default=math.inf) / SAMPLES_PER_PERIOD
    words = f"{SAMPLES_PER_PERIOD} to the shortest period that matters"
    if grids:
        step = min(grids) / max(1, math.ceil(min(grids) / wanted))
        return step, f"{words}, and a whole part of the step of the record"
    if not math.isfinite(wanted):
        raise ModelError("step: nothing here swings, so a step can't be chosen; give one")
    return wanted, words


def _record_step(times: Array) -> float:
    """The step of evenly spaced times, not touched by the rounding of each; else the smallest gap."""
    even = float((times[-1] - times[0]) / (times.size - 1))
    off = np.abs(times - (times[0] + even * np.arange(times.size)))
    return even if off.max() < 1e-6 * even else float(np.diff(times).min())


def _duration(
    forced: Forced, loads: Sequence[Load], ground: GroundMotion | None, asked: float | None
) -> tuple[float, str]:
    if asked is not None:
        if not (math.isfinite(asked) and asked > 0):
            raise ModelError(f"duration: it must be longer than 0, got {asked:g} s")
        return asked, "the duration asked for"
    end = ends_of([load.signal for load in loads] + ([ground.acceleration] if ground else []))
    decay = forced.slowest_decay(_SHARE)
    rates = forced.rates(_SHARE)
    slowest = 2 * math.pi / rates[-1] if rates else 1.0
    if decay is None or _REST / decay > _UNDAMPED_PERIODS * slowest:
        return end + _UNDAMPED_PERIODS * slowest, (
            f"{_UNDAMPED_PERIODS} periods of the slowest part that matters after the last change of the loads"
        )
    return end + _REST / decay, "until the free motion has fallen to 1 % after the last change of the loads"


def _extremes(time: Array, records: Sequence[Array], names: Sequence[str]) -> tuple[Extreme, ...]:
    found = []
    for quantity, record in zip(QUANTITIES, records[:3], strict=True):
        for column, name in enumerate(names):
            place = int(np.argmax(np.abs(record[:, column])))
            found.append(Extreme(name, quantity, float(record[place, column]), float(time[place])))
    return tuple(found)


def _shares(forced: Forced, step: float, record: Array) -> tuple[Share, ...]:
    moments = [int(np.argmax(np.abs(record[:, column]))) for column in range(record.shape[1])]
    tops = np.array([record[moment, column] for column, moment in enumerate(moments)])
    added = forced.contributions(step, moments)  # (p, parts), each at its own moment
    shares = added / np.where(tops != 0, tops, np.inf)[:, None]
    found = []
    for index, part in enumerate(forced.parts.parts):
        if np.abs(shares[:, index]).max(initial=0.0) < _LEAST_SHARE or forced.is_ground(index):
            continue
        value = complex(part.eigenvalues.mean())
        rigid = abs(value) <= part.rounding
        found.append(
            Share(
                0j if rigid else value,
                0.0 if rigid else abs(value) / (2 * math.pi),
                None if rigid else -value.real / abs(value),
                shares[:, index],
                not part.single,
            )
        )
    return tuple(found)


def _steady(
    system: System, loads: Sequence[Load], ground: GroundMotion | None, watched: Channels, stable: bool
) -> tuple[tuple[Steady, ...], tuple[str, ...]]:
    going = [load for load in loads if isinstance(load.signal, Harmonic) and math.isinf(load.signal.end_s)]
    shaking = ground is not None and isinstance(ground.acceleration, Harmonic)
    if not going and not shaking:
        return (), ()
    if not stable:
        return (), ("There is no steady part: the system is unstable.",)
    waves: dict[float, list[tuple[Array, complex]]] = {}
    ride: dict[float, Array] = {}
    for load in going:
        signal = load.signal
        assert isinstance(signal, Harmonic)
        turned = signal.amplitude * np.exp(1j * (signal.phase_rad - signal.omega * signal.start_s))
        waves.setdefault(signal.frequency_hz, []).append((system.direction(load.at, load.along), turned))
    if shaking and ground is not None and isinstance(ground.acceleration, Harmonic):
        signal = ground.acceleration
        carried, rigid = ground_motion(system, watched, [ground_axis(ground.along)])
        turned = signal.amplitude * np.exp(1j * signal.phase_rad)
        waves.setdefault(signal.frequency_hz, []).append((-carried[:, 0], turned))
        ride[signal.frequency_hz] = -rigid[:, 0] * turned / signal.omega**2
    found = []
    for frequency, acting in sorted(waves.items()):
        forces = np.stack([direction for direction, _ in acting], axis=1)
        answer = receptance(system, np.array([2 * np.pi * frequency]), watched.directions, forces)
        if not np.isfinite(answer.values).all():
            continue
        sizes = np.array([turned for _, turned in acting])
        amplitude = answer.values[0] @ sizes + ride.get(frequency, 0.0)
        found.append(Steady(frequency, amplitude, answer.error[0] @ np.abs(sizes)))
    missing = len(waves) - len(found)
    remark = "A load is exactly at the natural frequency of an undamped mode: that part never becomes steady."
    return tuple(found), (remark,) if missing else ()
