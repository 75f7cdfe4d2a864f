"""Forces that follow from how a machine moves: unbalance, pistons, strokes of a press, a shaken ground.

As in `vib.study.forces`, a table says which lines it brings; `vib.drive` works out the forces.
"""

from __future__ import annotations

import math
import re
from typing import Annotated, Literal

from pydantic import BeforeValidator, Field, ValidationInfo, field_validator, model_validator

from vib.study.forces import Acting, Size, above_zero
from vib.study.geometry import Table
from vib.study.quantities import Along, Name, Names, Number, Quantity, positive, read_quantity

_GRADE = re.compile(r"\s*G\s*(\d+(?:\.\d*)?)\s*")
_MOST_STROKE_ORDERS = 400
_FAINT_PISTON = 1e-3  # of the first order: orders of a piston that are fainter are left out
_MOST_PISTON_ORDER = 12


def _grade(value: object, info: ValidationInfo) -> float:
    """A balance quality grade as a velocity: "G 6.3" is 6.3 mm/s (ISO 21940-11)."""
    if isinstance(value, str) and (match := _GRADE.fullmatch(value)):
        speed = 1e-3 * float(match[1])
    else:
        speed = read_quantity(value, "velocity", info)
    if speed <= 0:
        raise ValueError("must be greater than zero")
    return speed


class Unbalance(Acting):
    """Unbalance of a rotor: a mass off the axis, which pulls outwards with the square of the speed."""

    amount: Annotated[float, positive("unbalance")] | None = Field(
        None, description="mass times distance from the axis, as measured"
    )
    grade: Annotated[float, BeforeValidator(_grade, json_schema_input_type=str)] | None = Field(
        None, description='instead: balance grade of ISO 21940-11, such as "G 6.3" or "6.3 mm/s"'
    )
    mass: Annotated[float, positive("mass")] | None = Field(
        None, description="of the rotor, goes with grade; default: that of the spinning body where it acts"
    )
    at_speed: Annotated[float, positive("speed")] | None = Field(
        None, description="service speed that the grade is stated for; default: the fastest"
    )
    planes: tuple[Name, Name] | None = Field(
        None,
        description="two places that share it by the levers of the mass centre (`at`) between them",
    )
    along: Along | None = Field(
        None, description="only this component of the turning force; default: both across the axis"
    )
    phase: Annotated[float, Quantity("angle")] = Field(
        0.0, description="angle on the shaft, in the sense in which it turns"
    )

    @model_validator(mode="after")
    def _one(self) -> Unbalance:
        if (self.amount is None) == (self.grade is None):
            raise ValueError("needs either grade (with the mass of the rotor) or amount")
        if self.grade is None and (self.mass is not None or self.at_speed is not None):
            raise ValueError("mass and at_speed go with grade; amount says all by itself")
        if self.planes is not None and self.planes[0] == self.planes[1]:
            raise ValueError("planes: two different places are needed")
        return self

    def multiples(self) -> tuple[float, ...]:
        """Once a turn."""
        return (1.0,)


def piston_orders(ratio: float) -> dict[int, float]:
    """Acceleration of a piston over radius x speed^2 along its bore, by order of the crank: cosine terms.

    With ratio = crank radius / rod length, from x = cos t + sqrt(1 - (ratio sin t)^2) / ratio; the first
    terms are 1 and ratio + ratio^3 / 4 + ... (J. P. Den Hartog, Mechanical Vibrations, 1956, section 4.6,
    from memory). Orders below 1e-3 of the first are left out.
    """
    steps = 512  # a smooth periodic function: the sum converges faster than any power
    angles = [2 * math.pi * (step + 0.5) / steps for step in range(steps)]
    bent = [math.sqrt(1 - (ratio * math.sin(angle)) ** 2) / ratio for angle in angles]
    found = {1: 1.0}
    for order in range(2, _MOST_PISTON_ORDER + 1, 2):
        share = 2 / steps * sum(b * math.cos(order * a) for a, b in zip(angles, bent, strict=True))
        if order**2 * abs(share) >= _FAINT_PISTON:
            found[order] = order**2 * share
    return found


class Crank(Acting):
    """Pistons on a crank: inertia forces of what goes to and fro, along the bore.

    What turns with the crank is an unbalance, and the torque of the gas a table of forces by (half) orders.
    """

    along: Along | None = Field(
        None, description="of the bore, from crank to piston; default: that of the excitation"
    )
    mass: Annotated[float, positive("mass")] = Field(
        description="that goes to and fro with one piston, its share of the rod included"
    )
    radius: Annotated[float, positive("length")] = Field(description="of the crank: half the stroke")
    rod: Annotated[float, positive("length")] = Field(description="length of the connecting rod")
    throws: tuple[Annotated[float, Quantity("angle")], ...] = Field(
        (0.0,), min_length=1, description="turn of the shaft at which each piston is outermost, one each"
    )
    places: Names | None = Field(
        None, description="where each piston's force acts, one for each throw; default: all at `at`"
    )

    @model_validator(mode="after")
    def _fits(self) -> Crank:
        if self.rod <= self.radius:
            raise ValueError("rod: must be longer than the crank radius, or the crank could not turn")
        if self.places is not None and len(self.places) != len(self.throws):
            raise ValueError(f"places: {len(self.throws)} are needed, one for each of throws")
        return self

    def multiples(self) -> tuple[float, ...]:
        """First, second, fourth, ... order."""
        return tuple(float(order) for order in piston_orders(self.radius / self.rod))


class Strokes(Acting):
    """Blows of a press, one in each turn of the shaft (strokes per minute), each half a sine long."""

    along: Along | None = Field(None, description="component or direction; default: that of the excitation")
    peak: Size = Field(description="the greatest force (a moment for a turn)")
    duration: Annotated[float, positive("time")] | None = Field(
        None, description="of a blow, whatever the speed"
    )
    share: Annotated[float, Quantity("ratio", 0.0, may_equal_least=False)] | None = Field(
        None, description="instead: of the time of a stroke that the blow takes, at every speed"
    )
    angle: Annotated[float, Quantity("angle")] = Field(
        0.0, description="turn of the shaft at the middle of the blow"
    )
    harmonics: int = Field(30, ge=1, le=_MOST_STROKE_ORDERS, description="how many orders are computed")

    @model_validator(mode="after")
    def _one(self) -> Strokes:
        if (self.duration is None) == (self.share is None):
            raise ValueError("needs either duration or share")
        if self.share is not None and self.share >= 1:
            raise ValueError("share: must be less than 1")
        return self

    def multiples(self) -> tuple[float, ...]:
        """1, 2, 3, ..."""
        return tuple(float(order) for order in range(1, self.harmonics + 1))


_MOTIONS = {
    "displacement": ("length", "angle"),
    "velocity": ("velocity", "angular_velocity"),
    "acceleration": ("acceleration", "angular_acceleration"),
}


class Shaking(Table):
    """A steady motion of the ground along one axis, at an order of the running speed or at a frequency."""

    along: Literal["x", "y", "z", "rx", "ry", "rz", "-x", "-y", "-z", "-rx", "-ry", "-rz"]
    order: Number | None = Field(None, description="multiple of the running speed")
    frequency: Annotated[float, positive("frequency")] | None = Field(None, description="fixed frequency")
    displacement: Size | None = Field(None, description="amplitude, the same at every speed")
    velocity: Size | None = Field(None, description="amplitude, instead")
    acceleration: Size | None = Field(None, description="amplitude, instead")
    phase: Annotated[float, Quantity("angle")] = 0.0

    @field_validator(*_MOTIONS, mode="before")
    @classmethod
    def _size(cls, value: object, info: ValidationInfo) -> float | None:
        turns = str(info.data.get("along", "")).lstrip("-").startswith("r")
        size = read_quantity(value, _MOTIONS[info.field_name or ""][turns], info)
        if size == 0:
            raise ValueError("must not be zero")
        return size

    @model_validator(mode="after")
    def _one(self) -> Shaking:
        if (self.order is None) == (self.frequency is None):
            raise ValueError("needs either order or frequency")
        if self.order is not None:
            above_zero("order", (self.order,))
        given = [name for name in _MOTIONS if getattr(self, name) is not None]
        if len(given) != 1:
            raise ValueError(
                f"needs exactly one of displacement, velocity, acceleration; has {', '.join(given) or 'none'}"
            )
        return self

    def multiples(self) -> tuple[float, ...]:
        """The order."""
        return () if self.order is None else (self.order,)

    def fixed(self) -> tuple[float, ...]:
        """The frequency."""
        return () if self.frequency is None else (self.frequency,)
