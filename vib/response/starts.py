"""What sets the system ringing: impulse, half-sine pulse, pull and release, or an initial state."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, NoReturn

import numpy as np
from numpy.typing import ArrayLike

from vib.errors import ModelError, ShapeError, UnitError
from vib.response.exponential import Array
from vib.response.first_order import RingModel
from vib.system import COMPONENTS, System
from vib.units import KINDS, parse, text

Along = str | Sequence[float] | None
Quantity = str | float
_ARRAYS = ("displacement", "velocity")


@dataclass(frozen=True, eq=False)
class Request:
    """The arguments that say how the ringing starts, as they came (see `vib.response.ring.ring`)."""

    impulse: Quantity | None = None
    pulse: tuple[Quantity, Quantity] | None = None
    pull: Quantity | None = None
    displacement: Quantity | ArrayLike | None = None
    velocity: Quantity | ArrayLike | None = None
    at: str | None = None
    along: Along = None


@dataclass(frozen=True, eq=False)
class Start:
    """A checked start: SI numbers, and what it is in words.

    ``kind`` is "impulse", "pulse", "pull", "displacement", "velocity" or "state"; ``value`` its size (N s,
    N, N, m, m/s, or about an axis N m s, ...); ``direction`` (n,) at the place, None for a state;
    ``displacement`` and ``velocity`` (n,) are the given state.
    """

    kind: str
    words: str
    value: float = 0.0
    duration_s: float = 0.0
    direction: Array | None = None
    at: str | None = None
    along: Along = None
    displacement: Array | None = None
    velocity: Array | None = None

    def state(self, model: RingModel) -> tuple[Array, tuple[str, ...]]:
        """The state x just after the start (s,), and remarks. A pulse starts from rest.

        Raises
        ------
        ModelError
            The start is impossible: an impulse where there is no mass, a pull that nothing holds.
        """
        nothing = np.zeros(model.system.size)
        if self.kind == "impulse":
            return self._struck(model), ()
        if self.kind == "pulse":
            return np.zeros(len(model.matrix)), ()
        moved, speed = nothing, nothing
        if self.kind == "pull":
            moved = model.static(self.value * self._along_it, self.kind)
        elif self.kind == "displacement":
            unit = model.static(self._along_it, self.kind)
            moved = unit * (self.value / float(self._along_it @ unit))
        elif self.kind == "velocity":
            speed = self._moving_alone(model.system)
        else:
            moved = nothing if self.displacement is None else self.displacement
            speed = nothing if self.velocity is None else self.velocity
        remarks: tuple[str, ...] = ()
        if model.jump(moved) > 1e-9:
            remarks = (
                "Freedoms without mass follow the others at once: they leave the position given at the start "
                "in the first instant.",
            )
        lost = speed - model.shape @ (model.matrix @ (model.from_velocity @ speed))
        if self.kind in ("velocity", "state") and np.abs(lost).max(initial=0.0) > 1e-9 * np.abs(speed).max():
            remarks += ("Freedoms without mass take the velocity the others give them, not the one given.",)
        return model.from_displacement @ moved + model.from_velocity @ speed, remarks

    @property
    def _along_it(self) -> Array:
        assert self.direction is not None
        return self.direction

    def _struck(self, model: RingModel) -> Array:
        force = self.value * self._along_it
        if model.direct is not None and np.abs(model.direct @ self._along_it).max() > 0:
            raise ModelError(
                f"impulse: {self.at} has no mass{_in_words(self.along)}, an impulse would throw it "
                "infinitely far; strike a place with mass, or use a pulse or a pull"
            )
        struck: Array = model.load @ force
        return struck

    def _moving_alone(self, system: System) -> Array:
        """Velocities (n,) with this place moving and the rest at rest."""
        direction = self._along_it
        speed = direction * (self.value / float(direction @ direction))
        place = system.anatomy.places.get(self.at or "") if system.anatomy else None
        if place is not None:
            moves = np.asarray(place.motion @ speed).ravel()
            wanted = self.value * _weights(self.along)
            if np.abs(moves - wanted).max() > 1e-9 * abs(self.value):
                raise ModelError(
                    f"velocity: {self.at} can't move{_in_words(self.along)} with everything else at rest; "
                    "start it with an impulse, or give the velocity of every freedom as an array"
                )
        return speed


def read_start(system: System, request: Request) -> Start:
    """Check the arguments against each other and turn texts into SI numbers.

    Raises
    ------
    ModelError
        Nothing, or more than one thing, sets the system moving; a place is missing, unknown or held.
    UnitError
        A text that is not the quantity wanted; the message names the argument.
    ShapeError
        An initial state that has not one number per freedom.
    """
    given = [
        name
        for name in ("impulse", "pulse", "pull", "displacement", "velocity")
        if getattr(request, name) is not None
    ]
    if not given:
        raise ModelError(
            "ring: nothing sets the system moving; give one of impulse, pulse, pull, displacement or velocity"
        )
    states = [name for name in given if name in _ARRAYS and not _is_scalar(getattr(request, name))]
    if states and len(states) == len(given):
        return _given_state(system, request)
    if len(given) > 1:
        raise ModelError(
            f"ring: {' and '.join(given)} contradict each other; give one of them (only a displacement and a "
            "velocity given as arrays, one number per freedom, go together)"
        )
    kind = given[0]
    if request.at is None:
        places = list(system.anatomy.places) if system.anatomy else [str(one) for one in system.freedoms]
        raise ModelError(f"{kind}: say where, at = one of {', '.join(places[:12])}")
    direction = system.direction(request.at, request.along)
    turning = isinstance(request.along, str) and request.along.strip().lstrip("+-").startswith("r")
    where = f"at {request.at}{_in_words(request.along)}"
    if kind == "pulse":
        return _read_pulse(request, direction, turning, where)
    unit = {
        "impulse": ("impulse", "angular_impulse"),
        "pull": ("force", "moment"),
        "displacement": ("length", "angle"),
        "velocity": ("velocity", "angular_velocity"),
    }[kind][turning]
    value = quantity(getattr(request, kind), unit, kind)
    if value == 0:
        raise ModelError(f"{kind}: it is 0, so nothing moves; give it a size")
    words = {
        "impulse": "impulse of {} {}",
        "pull": "pulled with {} {} and let go",
        "displacement": "pulled by {} {} and let go",
        "velocity": "started with {} {}, the rest at rest",
    }[kind].format(text(value, unit), where)
    return Start(kind, words, value, direction=direction, at=request.at, along=request.along)


def quantity(value: object, kind: str, name: str) -> float:
    """An SI float from text with a unit or a bare SI number; errors name the argument."""
    try:
        if isinstance(value, np.number | np.ndarray) and np.ndim(value) == 0:
            value = float(np.asarray(value))
        return parse(value, kind, unit=KINDS[kind].si)
    except UnitError as error:
        raise UnitError(f"{name}: {error}") from None


def _read_pulse(request: Request, direction: Array, turning: bool, where: str) -> Start:
    pulse: Any = request.pulse
    if isinstance(pulse, str) or not isinstance(pulse, Sequence) or len(pulse) != 2:
        raise ModelError('pulse: give its peak and its duration, such as ("500 N", "11 ms")')
    unit = "moment" if turning else "force"
    value, duration = quantity(pulse[0], unit, "pulse"), quantity(pulse[1], "time", "pulse")
    if value == 0 or duration <= 0:
        raise ModelError("pulse: its peak must not be 0 and its duration must be longer than 0")
    words = f"half-sine pulse of {text(value, unit)} peak and {text(duration, 'time')} {where}"
    return Start("pulse", words, value, duration, direction, request.at, request.along)


def _given_state(system: System, request: Request) -> Start:
    if request.at is not None or request.along is not None:
        raise ModelError(
            "ring: at and along go with one number or text; an array holds one number per freedom already"
        )
    found: dict[str, Array | None] = {"displacement": None, "velocity": None}
    for name in _ARRAYS:
        value = getattr(request, name)
        if value is None:
            continue
        try:
            array = np.asarray(value, dtype=np.float64)
        except (TypeError, ValueError):
            _not_numbers(name)
        if array.shape != (system.size,):
            raise ShapeError(name, expected=(system.size,), got=array.shape, hint="One number per freedom.")
        if not np.all(np.isfinite(array)):
            _not_numbers(name)
        found[name] = array
    if not any(array is not None and array.any() for array in found.values()):
        raise ModelError("ring: displacement and velocity are all 0, so nothing moves")
    words = " and ".join(f"initial {name}" for name, array in found.items() if array is not None)
    return Start("state", words, displacement=found["displacement"], velocity=found["velocity"])


def _not_numbers(name: str) -> NoReturn:
    raise ModelError(f"{name}: every entry must be a finite number, in SI units")


def _is_scalar(value: object) -> bool:
    return isinstance(value, str) or np.ndim(value) == 0  # type: ignore[arg-type]


def _weights(along: Along) -> Array:
    """The six components of a direction that `System.direction` has accepted."""
    weights = np.zeros(6)
    if isinstance(along, str):
        name = along.strip().lstrip("+-")
        weights[COMPONENTS.index(name)] = -1.0 if along.strip().startswith("-") else 1.0
    elif along is not None:
        vector = np.asarray(along, dtype=np.float64)
        weights[:3] = vector / np.linalg.norm(vector)
    return weights


def _in_words(along: Along) -> str:
    if along is None:
        return ""
    return f" along {along}" if isinstance(along, str) else f" along ({', '.join(f'{c:g}' for c in along)})"
