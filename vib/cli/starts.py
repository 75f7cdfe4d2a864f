"""What sets the ring-down off: [impact] of the study, and the options that stand in for its entries."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from vib.errors import ModelError, UnitError, VibError
from vib.system import COMPONENTS

if TYPE_CHECKING:
    from vib.study import Study

Along = str | Sequence[float] | None

_KINDS = {
    "impulse": ("impulse", "angular_impulse"),
    "pull": ("force", "moment"),
    "displacement": ("length", "angle"),
    "velocity": ("velocity", "angular_velocity"),
}


@dataclass(frozen=True)
class StartOptions:
    """The options as typed; None where not given."""

    impulse: str | None = None
    pulse: tuple[str, str] | None = None
    pull: str | None = None
    displacement: str | None = None
    velocity: str | None = None
    at: str | None = None
    along: str | None = None
    duration: str | None = None
    watch: list[str] = field(default_factory=list)

    def given(self) -> list[str]:
        """The names of the starts among them."""
        return [name for name in (*_KINDS, "pulse") if getattr(self, name) is not None]


def start_arguments(study: Study, options: StartOptions) -> dict[str, Any]:
    """The keyword arguments of `vib.response.ring.ring`, SI.

    Raises
    ------
    VibError
        Neither the study nor the options say what strikes and where, or an option can't be read.
    """
    given = options.given()
    if len(given) > 1:
        raise ModelError(f"give one of {', '.join('--' + name for name in given)}, not {len(given)} of them")
    impact = study.impact
    if impact is None and not given:
        raise ModelError(
            "nothing sets it ringing: add [impact] to the study, or say for example "
            '--impulse "12 N s" --at PLACE --along x'
        )
    at = options.at if options.at is not None else (impact.at if impact else None)
    if at is None:
        raise ModelError(f"--{given[0]} needs --at: the point, body or freedom that is struck")
    along: Along = impact.along if impact else None
    if options.along is not None:
        along = direction(options.along)
    if along is None and study.matrices is None:
        where = "impact.along is missing" if impact and not given else "--along is missing"
        raise ModelError(f"{where}: the direction that {at} is struck in, one of {', '.join(COMPONENTS)}")
    arguments: dict[str, Any] = {"at": at, "along": along}
    arguments |= _start(study, options, given, along)
    if options.duration is not None:
        arguments["duration"] = read_option(study, "duration", options.duration, "time")
    elif impact is not None and impact.duration is not None:
        arguments["duration"] = impact.duration
    watch = [_place(study, text, along) for text in options.watch]
    if not watch and impact is not None and impact.watch:
        watch = [(name, along) for name in impact.watch]
    if not watch and study.matrices is None:
        watch = [(at, along)]
    if watch:
        arguments["watch"] = watch
    return arguments


def _start(study: Study, options: StartOptions, given: list[str], along: Along) -> dict[str, Any]:
    turning = isinstance(along, str) and along.lstrip("+-").startswith("r")
    if not given:
        assert study.impact is not None
        impact = study.impact
        if impact.pulse is not None:
            return {"pulse": (impact.pulse.peak, impact.pulse.duration)}
        return {name: getattr(impact, name) for name in _KINDS if getattr(impact, name) is not None}
    name = given[0]
    if name == "pulse":
        assert options.pulse is not None
        peak, lasts = options.pulse
        kind = ("force", "moment")[turning]
        return {
            "pulse": (read_option(study, "pulse", peak, kind), read_option(study, "pulse", lasts, "time"))
        }
    return {name: read_option(study, name, getattr(options, name), _KINDS[name][turning])}


def read_option(study: Study, option: str, text: str, kind: str) -> float:
    """An SI float from the text of an option; a bare number means what [units] of the study declares."""
    from vib.units import parse

    try:
        return parse(text, kind, unit=study.units.declared().get(kind))
    except UnitError as error:
        raise UnitError(f"--{option}: {error}") from None


def direction(text: str) -> Along:
    """A component by its name, or three numbers."""
    name = text.strip()
    if name.lstrip("+-") in COMPONENTS:
        return name
    try:
        numbers = [float(part) for part in name.strip("[]()").replace(",", " ").split()]
    except ValueError:
        numbers = []
    if len(numbers) != 3 or not 0 < math.hypot(*numbers) < math.inf:
        raise VibError(
            f'--along: expected one of {", ".join(COMPONENTS)} (with "-" for the other way) or three numbers '
            f'(not all zero) such as "1, 1, 0", got "{text}"'
        )
    return numbers


def _place(study: Study, text: str, along: Along) -> tuple[str, Along]:
    """ "motor" watches along the struck direction, "motor y" along y."""
    known = {*study.points, *(body.name for body in study.bodies)}
    if study.matrices is not None or text in known:
        return text, along
    name, _, component = text.rpartition(" ")
    if name in known and component.lstrip("+-") in COMPONENTS:
        return name, component
    return text, along
