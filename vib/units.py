"""Quantities at the edges: text or number in, SI float out; SI float in, display text out.

There is one pint registry, of the units in ``units.txt``, and only this module touches it. Frequency, angular
frequency and speed are
three things that pint counts as one (an angle is 1 to it); they are told apart here and nowhere else:
60 rpm = 1 Hz = 2 pi rad/s. Inside the package a frequency or a speed is in cycles per second.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING, Literal

from vib.errors import UnitError

if TYPE_CHECKING:
    import pint

UnitSystem = Literal["si", "us"]
_DEFINITIONS = Path(__file__).with_name("units.txt")


@dataclass(frozen=True)
class Kind:
    """A kind of quantity: its words, its SI unit inside, and the units it is shown in."""

    words: str
    si: str
    shown_si: str
    shown_us: str


KINDS = {
    "length": Kind("a length", "m", "mm", "in"),
    "area": Kind("an area", "m^2", "mm^2", "in^2"),
    "second_moment": Kind("a second moment of area", "m^4", "cm^4", "in^4"),
    "mass": Kind("a mass", "kg", "kg", "lb"),
    "inertia": Kind("a mass moment of inertia", "kg m^2", "kg m^2", "lb in^2"),
    "density": Kind("a mass density", "kg/m^3", "kg/m^3", "lb/in^3"),
    "stress": Kind("a stress or modulus", "Pa", "GPa", "ksi"),
    "stiffness": Kind("a stiffness", "N/m", "N/mm", "lbf/in"),
    "rotational_stiffness": Kind("a rotational stiffness", "N m/rad", "N m/rad", "lbf in/rad"),
    "damping": Kind("a dashpot constant", "N s/m", "N s/m", "lbf s/in"),
    "rotational_damping": Kind("a rotational dashpot constant", "N m s/rad", "N m s/rad", "lbf in s/rad"),
    "frequency": Kind("a frequency", "Hz", "Hz", "Hz"),
    "speed": Kind("a running speed", "Hz", "rpm", "rpm"),
    "time": Kind("a time", "s", "s", "s"),
    "angle": Kind("an angle", "rad", "deg", "deg"),
    "force": Kind("a force", "N", "N", "lbf"),
    "moment": Kind("a moment", "N m", "N m", "lbf in"),
    "impulse": Kind("an impulse", "N s", "N s", "lbf s"),
    "angular_impulse": Kind("an angular impulse", "N m s", "N m s", "lbf in s"),
    "velocity": Kind("a velocity", "m/s", "mm/s", "in/s"),
    "angular_velocity": Kind("an angular velocity", "rad/s", "rad/s", "rad/s"),
    "acceleration": Kind("an acceleration", "m/s^2", "m/s^2", "in/s^2"),
    "angular_acceleration": Kind("an angular acceleration", "rad/s^2", "rad/s^2", "rad/s^2"),
    "unbalance": Kind("an unbalance", "kg m", "g mm", "oz in"),
    "power": Kind("a power", "W", "kW", "hp"),
    "ratio": Kind("a ratio", "", "", ""),
}
# no quantity of a machine comes near; beyond it products of two would overflow on the way
LARGEST = 1e60
_CYCLIC = ("frequency", "speed")
_NUMBER = re.compile(r"\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)\s*(.*?)\s*", re.DOTALL)
_UNIT_TEXT = re.compile(r"[A-Za-zµμΩ°%_/*^·().\s\-²³⁴0-9]{1,60}")
_LONG_DIGITS = re.compile(r"\d{3,}")
# offered where a unit was misspelt only by its spaces or its capitals
_USUAL_UNITS = (
    "m", "mm", "cm", "in", "ft", "kg", "g", "t", "lb", "slug", "N", "kN", "MN", "lbf", "kip", "Pa", "kPa",
    "MPa", "GPa", "psi", "ksi", "N/m", "N/mm", "kN/m", "kN/mm", "lbf/in", "kip/in", "N s", "N s/m",
    "N s/mm", "lbf s/in", "lbf s", "N m", "kN m", "N m s", "N m/rad", "lbf in", "lbf ft", "kg/m^3",
    "lb/in^3", "lb/ft^3", "Hz", "rpm", "rad/s", "s", "ms", "deg", "rad", "mm/s", "m/s", "in/s", "m/s^2",
    "g mm", "kg mm", "mm^2", "cm^2", "in^2", "mm^4", "cm^4", "in^4",
)  # fmt: skip


@cache
def _registry() -> pint.UnitRegistry[float]:
    import pint

    registry: pint.UnitRegistry[float] = pint.UnitRegistry(None)
    registry.load_definitions(_DEFINITIONS.read_text(encoding="utf-8").splitlines())
    return registry


def parse(value: object, kind: str, *, unit: str | None = None) -> float:
    """An SI float from text with a unit, or from a bare number whose unit is declared.

    Parameters
    ----------
    value
        Text such as ``"210 GPa"``, or a number.
    kind
        A key of `KINDS`, such as ``"stress"``.
    unit
        The unit of a bare number; None if none was declared (then a bare number is an error,
        except for a ratio).

    Returns
    -------
    float
        In the SI unit of the kind; cycles per second for a frequency or a speed.

    Raises
    ------
    UnitError
        No number, no unit, an unknown unit, a unit of another dimension, an offset unit, NaN, infinity.
    """
    wanted = KINDS[kind]
    if isinstance(value, bool) or not isinstance(value, str | int | float):
        raise UnitError(f"expected {wanted.words} such as {_example(kind)}, got {_brief(value)}")
    if isinstance(value, str):
        match = _NUMBER.fullmatch(value)
        if match is None:
            raise UnitError(f"expected {wanted.words} such as {_example(kind)}, got {_brief(value)}")
        number, text = float(match[1]), match[2]
    else:
        number, text = _as_float(value), ""
    if not math.isfinite(number):
        raise UnitError(f"expected a finite number, got {_brief(value)}")
    if not text:
        text = unit or ""
    if kind == "ratio":
        result = number * _ratio_factor(text)
    elif not text:
        raise UnitError(
            f"{_brief(value)} has no unit, and [units] names none for {kind}: write {_example(kind)}, "
            f'or add {kind} = "{wanted.shown_si}" to [units]'
        )
    else:
        result = number * factor(text, kind)
    if not abs(result) < LARGEST:
        raise UnitError(f"{_brief(value)} is larger than anything that {wanted.words} can be; check its unit")
    return result


@cache
def factor(unit: str, kind: str) -> float:
    """SI units of the kind per one `unit`; for a frequency or a speed, cycles per second per one `unit`.

    Raises
    ------
    UnitError
        The unit is unknown, of another dimension, or an offset unit such as degC.
    """
    import pint

    registry = _registry()
    parsed = _parse_unit(unit)
    wanted = KINDS[kind]
    try:
        if kind in _CYCLIC:
            _, root = registry.get_root_units(parsed)
            if root == registry.Unit("radian/second"):
                return float(registry.convert(1.0, parsed, root)) / (2 * math.pi)
            return float(registry.convert(1.0, parsed, "1/s"))
        return float(registry.convert(1.0, parsed, _si(kind)))
    except pint.OffsetUnitCalculusError:
        raise UnitError(f"'{unit}' is an offset temperature unit, where {wanted.words} is wanted") from None
    except pint.DimensionalityError:
        raise UnitError(
            f"'{unit}' is not a unit of {wanted.words.split(' ', 1)[1]}{_suggestion(unit)}: "
            f"it has the dimension {parsed.dimensionality}, wanted is {wanted.words} such as {_example(kind)}"
            f"{_force_or_mass_note(parsed, kind)}"
        ) from None


def shown_unit(kind: str, system: UnitSystem = "si") -> str:
    """The unit in which a kind is shown, as text (``""`` for a ratio)."""
    return KINDS[kind].shown_us if system == "us" else KINDS[kind].shown_si


def shown(value: float, kind: str, system: UnitSystem = "si") -> float:
    """An SI value of the kind as a number in the unit of `shown_unit`."""
    unit = shown_unit(kind, system)
    return value / factor(unit, kind) if unit else value


def text(value: float, kind: str, system: UnitSystem = "si", *, digits: int = 4) -> str:
    """An SI value of the kind as display text with its unit, such as ``"12.5 mm"``."""
    return f"{shown(value, kind, system):.{digits}g} {shown_unit(kind, system)}".rstrip()


def _si(kind: str) -> str:
    return KINDS[kind].si


def _as_float(value: int | float) -> float:
    try:
        return float(value)
    except OverflowError:
        raise UnitError(f"{_brief(value)} is too large to be a number") from None


def _ratio_factor(unit: str) -> float:
    if unit in ("", "1"):
        return 1.0
    if unit in ("%", "percent"):
        return 0.01
    raise UnitError(f"expected a plain number or a percentage such as '2 %', got the unit '{unit}'")


@cache
def _parse_unit(unit: str) -> pint.Unit:
    import pint

    # pint would evaluate an exponent of any size, so the text is held to what a unit can look like
    if not _UNIT_TEXT.fullmatch(unit) or _LONG_DIGITS.search(unit):
        raise UnitError(f"{_brief(unit)} is not a unit")
    try:
        # r/min is how nameplates write it; r alone is no unit
        parsed = _registry().parse_units("rpm" if unit == "r/min" else unit.replace("·", "*"))
        if not all(_registry()._units[name].is_multiplicative for name in parsed._units):
            raise UnitError(f"'{unit}' is an offset temperature unit; no entry here takes one")
        return parsed
    except pint.UndefinedUnitError as error:
        names = error.unit_names
        name = names if isinstance(names, str) else ", ".join(names)
        raise UnitError(f"unknown unit '{name}'{_suggestion(unit)}") from None
    except UnitError:
        raise
    except Exception:  # pint raises a dozen kinds on garbage, from its tokenizer to ZeroDivisionError
        raise UnitError(f"{_brief(unit)} is not a unit") from None


def _suggestion(unit: str) -> str:
    folded = re.sub(r"[\s*·]", "", unit).lower()
    near = [usual for usual in _USUAL_UNITS if usual.replace(" ", "").lower() == folded and usual != unit]
    return f" (did you mean '{near[0]}'?)" if near else ""


def _force_or_mass_note(parsed: pint.Unit, kind: str) -> str:
    """Mass and force differ by the dimension of an acceleration: say so where they were mixed up."""
    registry = _registry()
    wanted, acceleration = registry.Unit(_si(kind)), registry.Unit("m/s^2")
    if (parsed * acceleration).dimensionality == wanted.dimensionality:
        return ". A mass is not a force: write a unit of force, 'lbf' (not 'lb') or 'N' (not 'kg')"
    if (wanted * acceleration).dimensionality == parsed.dimensionality:
        return ". A force is not a mass: write a unit of mass, 'lb' (not 'lbf') or 'kg' (not 'N' or 'kgf')"
    return ""


def _example(kind: str) -> str:
    examples = {"stress": "210 GPa", "speed": "1480 rpm", "ratio": "0.02", "density": "7850 kg/m^3"}
    return f'"{examples.get(kind, "12 " + KINDS[kind].shown_si)}"'


def _brief(value: object) -> str:
    described = repr(value)
    return described if len(described) <= 60 else described[:57] + "..."
