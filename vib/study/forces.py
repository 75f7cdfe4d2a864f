"""Forces of stated amplitude: by order, of shafts out of line, blades, gears, belts, and the mains.

Each table says which multiples of the running speed and which fixed frequencies it brings; how large the
forces are at a speed is worked out in `vib.drive`.
"""

from __future__ import annotations

import math
from abc import abstractmethod
from typing import Annotated, Any, Literal

from pydantic import Field, ValidationInfo, WithJsonSchema, field_validator, model_validator

from vib.study.geometry import Table
from vib.study.quantities import Along, Name, Number, Quantity, positive, read_quantity

# a quantity whose kind depends on the direction (a force or a moment): read where both are known
Size = Annotated[Any, WithJsonSchema({"type": ["string", "number"]})]
Growth = Literal["constant", "linear", "square"]
_Multiples = Annotated[tuple[Number, ...], Field(min_length=1)]


class Acting(Table):
    """What every table here has in common."""

    at: Name | None = Field(None, description="point or body where it acts; default: that of the excitation")

    def multiples(self) -> tuple[float, ...]:
        """The multiples of the running speed that it brings."""
        return ()

    def fixed(self) -> tuple[float, ...]:
        """The fixed frequencies that it brings, Hz."""
        return ()


class Push(Acting):
    """A force, or along a rotation a moment, of stated amplitude."""

    along: Along | None = Field(None, description="component or direction; default: that of the excitation")
    turning: bool = Field(False, description="the force turns with the shaft, across its axis")
    amplitude: Size = Field(None, description="the greatest force (a moment for a turn)")
    phase: Annotated[float, Quantity("angle")] = Field(
        0.0, description="by which it leads the mark on the shaft, in its own cycles"
    )
    growth: Growth = Field("constant", description="how the amplitude grows with the running speed")
    at_speed: Annotated[float, positive("speed")] | None = Field(
        None, description="running speed that a growing amplitude is stated for; default: the fastest"
    )

    @model_validator(mode="after")
    def _turns(self) -> Push:
        if self.turning and self.along is not None:
            raise ValueError("a turning force acts across the axis of the shaft; leave along out")
        if self.at_speed is not None and self.growth == "constant":
            raise ValueError('at_speed goes with growth = "linear" or "square"')
        return self

    @property
    def rows(self) -> tuple[tuple[float, float, float], ...]:
        """(multiple or fixed frequency, amplitude, phase) of each line."""
        lines = self.multiples() or self.fixed()
        return tuple((line, float(self.amplitude), self.phase) for line in lines)


def above_zero(word: str, values: tuple[float, ...]) -> None:
    """Raise ValueError where one of the values is not greater than zero."""
    if min(values) <= 0:
        raise ValueError(f"{word}: must be greater than zero")


class Forces(Push):
    """A force of stated amplitude at orders of the running speed, half ones too, or at a fixed frequency."""

    order: Number | None = Field(None, description="multiple of the running speed, whole or not")
    frequency: Annotated[float, positive("frequency")] | None = Field(None, description="fixed frequency")
    table: tuple[tuple[Any, ...], ...] = Field(
        (), description="instead: rows [order, amplitude] or [order, amplitude, phase]"
    )

    @field_validator("table")
    @classmethod
    def _rows(cls, table: tuple[tuple[Any, ...], ...], info: ValidationInfo) -> Any:
        found = []
        for row in table:
            if len(row) not in (2, 3):
                raise ValueError("expected rows [order, amplitude] or [order, amplitude, phase]")
            order = read_quantity(row[0], "ratio", info)
            found.append((order, row[1], read_quantity(row[2], "angle", info) if len(row) == 3 else 0.0))
        return tuple(found)

    @model_validator(mode="after")
    def _one(self) -> Forces:
        given = [name for name in ("order", "frequency", "table") if getattr(self, name) not in (None, ())]
        if len(given) != 1:
            raise ValueError(
                f"needs exactly one of order, frequency, table; has {', '.join(given) or 'none'}"
            )
        if self.table and self.amplitude is not None:
            raise ValueError("a table has amplitudes of its own; leave amplitude out")
        if not self.table and self.amplitude is None:
            raise ValueError("amplitude is missing")
        if self.frequency is not None and (self.turning or self.growth != "constant"):
            raise ValueError("turning and growth go with orders of the running speed, not with a frequency")
        if self.frequency is None:
            above_zero("order", self.multiples())
        return self

    def multiples(self) -> tuple[float, ...]:
        """The order, or those of the table."""
        return tuple(row[0] for row in self.table) or (() if self.order is None else (self.order,))

    def fixed(self) -> tuple[float, ...]:
        """The frequency."""
        return () if self.frequency is None else (self.frequency,)

    @property
    def rows(self) -> tuple[tuple[float, float, float], ...]:
        """Those of the table, or the one that is stated."""
        return tuple((row[0], row[1], self.phase + row[2]) for row in self.table) or super().rows


class Misalignment(Push):
    """What shafts out of line do: a force or a moment of the same amplitude at each order."""

    amplitude: Size = Field(description="the greatest force (a moment for a turn)")
    orders: _Multiples = Field(
        (1.0, 2.0), description="multiples of the running speed; default: common practice, no source"
    )

    @model_validator(mode="after")
    def _positive(self) -> Misalignment:
        above_zero("orders", self.orders)
        return self

    def multiples(self) -> tuple[float, ...]:
        """The orders."""
        return self.orders


class _Meshing(Push):
    """Something that passes so many times a turn, and its harmonics, of the same amplitude each."""

    amplitude: Size = Field(description="the greatest force (a moment for a turn)")
    harmonics: Annotated[tuple[Annotated[int, Field(ge=1)], ...], Field(min_length=1)] = Field(
        (1,), description="multiples of the passing frequency"
    )

    @abstractmethod
    def passes(self) -> float:
        """How often it passes in a turn of the shaft."""

    def multiples(self) -> tuple[float, ...]:
        """The harmonics, as multiples of the running speed."""
        return tuple(self.passes() * harmonic for harmonic in self.harmonics)


class Blades(_Meshing):
    """Blades, vanes or lobes that pass an edge, once each in a turn."""

    count: Annotated[int, Field(ge=1, le=1000)] = Field(description="how many blades")
    growth: Growth = Field("square", description="how the amplitude grows with the running speed")

    def passes(self) -> float:
        """Once for each blade."""
        return float(self.count)


class Gear(_Meshing):
    """A gear whose teeth mesh; of a pair, the count of the wheel on this shaft."""

    teeth: Annotated[int, Field(ge=2, le=10_000)] = Field(description="how many teeth on this shaft")

    def passes(self) -> float:
        """Once for each tooth."""
        return float(self.teeth)


class Belt(_Meshing):
    """A belt with a joint or a fault, once round its length without slip."""

    pulley: Annotated[float, positive("length")] = Field(
        description="effective diameter of the pulley on this shaft"
    )
    length: Annotated[float, positive("length")] = Field(description="length of the belt")
    harmonics: Annotated[tuple[Annotated[int, Field(ge=1)], ...], Field(min_length=1)] = Field(
        (1, 2), description="multiples of the belt frequency; default: common practice, no source"
    )

    @model_validator(mode="after")
    def _fits(self) -> Belt:
        if self.length <= math.pi * self.pulley:
            raise ValueError("the belt must be longer than once round its pulley")
        return self

    def passes(self) -> float:
        """Circumference of the pulley over the length of the belt."""
        return math.pi * self.pulley / self.length


class Mains(Push):
    """Magnetic pull or torque of an electric machine: multiples of the line frequency."""

    amplitude: Size = Field(description="the greatest force (a moment for a turn)")
    frequency: Annotated[float, positive("frequency")] = Field(description="the line frequency")
    harmonics: Annotated[tuple[Annotated[int, Field(ge=1)], ...], Field(min_length=1)] = Field(
        (2,), description="multiples of the line frequency, of the same amplitude each"
    )

    @model_validator(mode="after")
    def _steady(self) -> Mains:
        if self.turning or self.growth != "constant":
            raise ValueError("turning and growth go with orders of the running speed, not with a frequency")
        return self

    def fixed(self) -> tuple[float, ...]:
        """The multiples, Hz."""
        return tuple(self.frequency * harmonic for harmonic in self.harmonics)
