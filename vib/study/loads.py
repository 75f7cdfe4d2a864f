"""The tables of a study about forced vibration: loads, motion of the ground, and what to record."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import BeforeValidator, Field, ValidationInfo, WithJsonSchema, field_validator, model_validator

from vib.study.geometry import Table
from vib.study.machine import Pulse, is_rotation
from vib.study.quantities import Along, Name, Names, Quantity, positive, read_quantity

# a quantity whose kind depends on the direction (a force or a moment, ...): read where both are known
_Size = Annotated[Any, WithJsonSchema({"type": ["string", "number"]})]
_LEAST_LINES, _MOST_LINES = 2, 100_000


class Wave(Table):
    """A harmonic load, amplitude times sin(2 pi frequency t + phase)."""

    amplitude: _Size
    frequency: Annotated[float, positive("frequency")]
    phase: Annotated[float, Quantity("angle")] = 0.0


def _band(value: object) -> object:
    if not isinstance(value, list) or len(value) != 2:
        raise ValueError('expected two frequencies such as ["5 Hz", "50 Hz"]')
    return value


_Frequencies = Annotated[
    tuple[Annotated[float, positive("frequency")], Annotated[float, positive("frequency")]],
    BeforeValidator(_band, json_schema_input_type=list[str]),
]


class SweptSine(Table):
    """A sine whose frequency runs from the first to the second of ``frequencies``."""

    amplitude: _Size
    frequencies: _Frequencies = Field(description="from and to, upwards or downwards")
    duration: Annotated[float, positive("time")]
    kind: Literal["linear", "exponential"] = Field(
        "linear", description="so many Hz, or so many octaves, per second"
    )


class _Course(Table):
    """What loads and a motion of the ground have in common: one course over time."""

    harmonic: Wave | None = Field(None, description="a sine {amplitude, frequency, phase}")
    half_sine: Pulse | None = Field(None, description="a half-sine pulse {peak, duration}")
    sweep: SweptSine | None = Field(None, description="{amplitude, frequencies, duration, kind}")
    file: Name | None = Field(
        None, description="a CSV file beside the study: time and one column, units in the header"
    )

    def given(self, *names: str) -> list[str]:
        """Which courses are there."""
        every = ("harmonic", "half_sine", "sweep", "file", *names)
        return [name for name in every if getattr(self, name) is not None]

    def one(self, *names: str) -> None:
        """There must be one of them."""
        given = self.given(*names)
        if len(given) != 1:
            listed = ", ".join((*names, "harmonic", "half_sine", "sweep", "file"))
            raise ValueError(f"needs exactly one of {listed}; has {', '.join(given) or 'none'}")


_FORCE, _BLOW = ("force", "moment"), ("impulse", "angular_impulse")
_SHAKE = ("acceleration", "angular_acceleration")
_SIZES = {"harmonic": "amplitude", "half_sine": "peak", "sweep": "amplitude"}


class AppliedLoad(_Course):
    """A force (along a rotation a moment) at a place over time."""

    name: Name = Field("", description='default: numbered, such as "load 1"')
    at: Name = Field(description="point or body where it acts")
    along: Along | None = Field(None, description="component or direction in which it acts")
    constant: float | None = Field(None, description="a steady force from start to end")
    impulse: float | None = Field(None, description="a blow so short that nothing moves meanwhile")
    start: Annotated[float, Quantity("time", 0.0)] = Field(0.0, description="when it begins")
    end: Annotated[float, positive("time")] | None = Field(
        None, description="when a constant or harmonic load ends; default: never"
    )

    @field_validator("constant", "impulse", mode="before")
    @classmethod
    def _size(cls, value: object, info: ValidationInfo) -> float | None:
        kinds = _BLOW if info.field_name == "impulse" else _FORCE
        size = read_quantity(value, kinds[is_rotation(info.data.get("along"))], info)
        if size == 0:
            raise ValueError("must not be zero")
        return size

    @model_validator(mode="after")
    def _whole(self, info: ValidationInfo) -> AppliedLoad:
        self.one("constant", "impulse")
        if self.end is not None:
            if self.constant is None and self.harmonic is None:
                raise ValueError("end goes with constant and harmonic only; the others end by themselves")
            if self.end <= self.start:
                raise ValueError("end must be later than start")
        for name, key in _SIZES.items():
            sized = _resize(getattr(self, name), key, _FORCE, self.along, info)
            object.__setattr__(self, name, sized)
        return self


def _resize(course: Any, key: str, kinds: tuple[str, str], along: object, info: ValidationInfo) -> Any:
    if course is None:
        return None
    size = read_quantity(getattr(course, key), kinds[is_rotation(along)], info)
    if size == 0:
        raise ValueError(f"{key} must not be zero")
    return course.model_copy(update={key: size})


class BaseMotion(_Course):
    """A motion of the ground along one axis: a record, or an acceleration over time.

    In a file the unit says what was recorded: an acceleration, a velocity or a displacement.
    """

    along: Literal["x", "y", "z", "rx", "ry", "rz", "-x", "-y", "-z", "-rx", "-ry", "-rz"]

    @model_validator(mode="after")
    def _whole(self, info: ValidationInfo) -> BaseMotion:
        self.one()
        for name, key in _SIZES.items():
            sized = _resize(getattr(self, name), key, _SHAKE, self.along, info)
            object.__setattr__(self, name, sized)
        return self


class Respond(Table):
    """What `vib respond` records: over time, and over frequency."""

    watch: Names | None = Field(
        None,
        description='points and bodies, alone or with a component ("motor y"); default: where loads act',
    )
    duration: Annotated[float, positive("time")] | None = Field(
        None, description="default: until it has died away"
    )
    step: Annotated[float, positive("time")] | None = Field(
        None, description="default: 40 to the shortest period that matters"
    )
    frequencies: _Frequencies | None = Field(
        None, description="from and to of the frequency response; default: none is computed"
    )
    lines: int = Field(
        1000, ge=_LEAST_LINES, le=_MOST_LINES, description="how many lines the frequency response has"
    )
    spacing: Literal["linear", "logarithmic"] = Field("linear", description="how the lines are spaced")

    @field_validator("frequencies")
    @classmethod
    def _upwards(cls, band: tuple[float, float] | None) -> tuple[float, float] | None:
        if band is not None and band[0] >= band[1]:
            raise ValueError("must go upwards")
        return band
