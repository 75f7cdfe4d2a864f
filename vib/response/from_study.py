"""The loads, the motion of the ground and the outputs that a study asks for."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from vib.errors import ModelError
from vib.response.exponential import Array
from vib.response.loads import GroundMotion, GroundQuantity, Load, harmonic_ground, recorded_ground
from vib.response.signals import Constant, Harmonic, Impulse, Points, Signal, Sweep, half_sine
from vib.study import Study
from vib.study.machine import is_rotation
from vib.system import COMPONENTS
from vib.units import text

Along = str | Sequence[float] | None
_RECORDED: dict[str, GroundQuantity] = {
    "acceleration": "acceleration",
    "angular_acceleration": "acceleration",
    "velocity": "velocity",
    "angular_velocity": "velocity",
    "length": "displacement",
    "angle": "displacement",
}


def loads_of(study: Study) -> tuple[Load, ...]:
    """The loads of [[loads]]."""
    return tuple(_load(study, number) for number in range(len(study.loads)))


def ground_of(study: Study) -> GroundMotion | None:
    """The motion of the ground of [base_motion], None where it rests."""
    table = study.base_motion
    if table is None:
        return None
    if table.file is not None:
        record = study.records["base_motion"]
        found = recorded_ground(record.times_s, record.values, table.along, quantity=_RECORDED[record.kind])
        words = f"{_RECORDED[record.kind]} recorded in {table.file}"
        return GroundMotion(**{**found.__dict__, "words": words})
    kind = ("acceleration", "angular_acceleration")[is_rotation(table.along)]
    words = _words(table, kind)
    if table.harmonic is not None:
        wave = table.harmonic
        found = harmonic_ground(float(wave.amplitude), wave.frequency, table.along, phase_rad=wave.phase)
        return GroundMotion(**{**found.__dict__, "words": f"acceleration, {words}"})
    signal = _common(table, 0.0)
    remark = "The ground begins at rest; what it is moved on by its acceleration is not taken back."
    return GroundMotion(signal, table.along, name="ground", words=f"acceleration, {words}", remarks=(remark,))


def watched(study: Study) -> list[tuple[str, Along]] | None:
    """The outputs of [response] watch; None for the default."""
    names = study.response.watch
    if names is None:
        if study.base_motion is not None and not study.loads and study.matrices is None:
            return [(body.name, study.base_motion.along.lstrip("-")) for body in study.bodies] or None
        return None
    return [watch_place(study, name) for name in names]


def watch_place(study: Study, name: str) -> tuple[str, Along]:
    """ "motor y" watches along y, "motor" along the first load or the moving ground."""
    known = {*study.points, *(body.name for body in study.bodies)}
    if study.matrices is not None:
        return name, None
    place, _, component = name.rpartition(" ")
    if name not in known and place in known and component.lstrip("+-") in COMPONENTS:
        return place, component
    if study.loads and study.loads[0].along is not None:
        return name, study.loads[0].along
    if study.base_motion is not None:
        return name, study.base_motion.along.lstrip("-")
    raise ModelError(f'watch: say along which component, such as "{name} x"')


def lines_of(study: Study) -> Array | None:
    """The lines (k,) of [response] frequencies, Hz; None where none are asked for."""
    table = study.response
    if table.frequencies is None:
        return None
    return spaced(table.frequencies, table.lines, table.spacing)


def spaced(band: tuple[float, float], count: int, spacing: str) -> Array:
    """Evenly or logarithmically spaced lines, Hz, from and to included."""
    space = np.geomspace if spacing == "logarithmic" else np.linspace
    return np.asarray(space(band[0], band[1], count), dtype=np.float64)


def _load(study: Study, number: int) -> Load:
    table = study.loads[number]
    kind = ("force", "moment")[is_rotation(table.along)]
    end = float("inf") if table.end is None else table.end
    signal: Signal
    if table.constant is not None:
        signal, words = Constant(table.constant, table.start, end), f"constant {text(table.constant, kind)}"
    elif table.impulse is not None:
        blow = ("impulse", "angular_impulse")[is_rotation(table.along)]
        signal, words = Impulse(table.impulse, table.start), f"impulse of {text(table.impulse, blow)}"
    elif table.file is not None:
        record = study.records[f"loads[{number}]"]
        signal = Points(record.times_s + table.start, record.values)
        words = f"{kind} recorded in {table.file}, linear between its values"
    else:
        signal, words = _common(table, table.start, end), _words(table, kind)
    if table.start:
        words += f" from {text(table.start, 'time')} on"
    where = table.along if isinstance(table.along, str) or table.along is None else list(table.along)
    place = f" at {table.at}" + ("" if where is None else f" along {where}")
    return Load(signal, table.at, table.along, table.name, words + place)


def _common(table: Any, start: float, end: float = float("inf")) -> Signal:
    if table.harmonic is not None:
        wave = table.harmonic
        return Harmonic(float(wave.amplitude), wave.frequency, wave.phase, start, end)
    if table.half_sine is not None:
        return half_sine(float(table.half_sine.peak), table.half_sine.duration, start)
    sweep = table.sweep
    low, high = sweep.frequencies
    return Sweep(float(sweep.amplitude), low, high, sweep.duration, sweep.kind == "exponential", start)


def _words(table: Any, kind: str) -> str:
    if table.harmonic is not None:
        wave = table.harmonic
        return f"harmonic, {text(float(wave.amplitude), kind)} at {text(wave.frequency, 'frequency')}"
    if table.half_sine is not None:
        pulse = table.half_sine
        return f"half-sine pulse of {text(float(pulse.peak), kind)} lasting {text(pulse.duration, 'time')}"
    sweep = table.sweep
    low, high = (text(one, "frequency") for one in sweep.frequencies)
    return (
        f"{sweep.kind} sweep from {low} to {high} in {text(sweep.duration, 'time')}, "
        f"{text(float(sweep.amplitude), kind)}"
    )
