"""The tables of a study about the machine: bodies, springs, damping, impact, matrices."""

from __future__ import annotations

from itertools import pairwise
from typing import Annotated, Any

from pydantic import BeforeValidator, Field, ValidationInfo, WithJsonSchema, field_validator, model_validator

from vib.study.geometry import Table
from vib.study.quantities import Along, Axis, Name, Names, Number, Quantity, Vector, positive, read_quantity

_Inertia = Annotated[float, Quantity("inertia")]


class Spin(Table):
    """A body that spins: about which axis, and how fast or with which shaft."""

    axis: Axis = Field(description="axis of rotation, the direction of the thumb of the right hand")
    speed: Annotated[float, positive("speed")] | None = Field(None, description="running speed")
    shaft: Name | None = Field(None, description="the excitation whose running speed it follows")
    ratio: Number = Field(1.0, description="its speed over that of the shaft; negative turns the other way")
    inertia: Annotated[float, positive("inertia")] | None = Field(
        None, description="polar moment of what spins; default: that of the whole body about the axis"
    )

    @model_validator(mode="after")
    def _whole(self) -> Spin:
        if (self.speed is None) == (self.shaft is None):
            raise ValueError("needs either speed, or shaft: the name of an excitation")
        if self.ratio == 0 or (self.shaft is None and self.ratio != 1):
            raise ValueError("ratio goes with shaft and is not zero")
        return self


class Body(Table):
    """A rigid machine part, carried by points that move with it."""

    name: Name = Field("", description='default: numbered, such as "body 1"')
    mass: Annotated[float, positive("mass")]
    centre: Vector | None = Field(
        None, description="centre of mass; default: the point, where one alone carries it"
    )
    inertia: tuple[_Inertia, _Inertia, _Inertia] = Field(
        (0.0, 0.0, 0.0),
        description="Ixx, Iyy, Izz about the centre of mass, along the global axes; default: a point mass",
    )
    products: tuple[_Inertia, _Inertia, _Inertia] = Field(
        (0.0, 0.0, 0.0), description="products of inertia Ixy, Iyz, Izx, each the integral of + x y dm"
    )
    carried_by: Names
    spin: Spin | None = Field(None, description="it spins and so resists tilting across (gyroscopic)")

    @model_validator(mode="after")
    def _possible(self) -> Body:
        if self.centre is None and len(self.carried_by) > 1:
            raise ValueError("centre is needed where several points carry a body")
        ixx, iyy, izz = self.inertia
        ixy, iyz, izx = self.products
        slack = -1e-9 * max(ixx, iyy, izz, 0.0)
        minors = (ixx * iyy - ixy**2, iyy * izz - iyz**2, izz * ixx - izx**2)
        whole = ixx * (iyy * izz - iyz**2) - ixy * (ixy * izz + iyz * izx) - izx * (ixy * iyz + iyy * izx)
        scale = max(ixx, iyy, izz, 0.0)
        if self.spin is not None and self.spin.inertia is None and not max(ixx, iyy, izz):
            raise ValueError("spin needs the polar moment: give inertia of the body, or spin.inertia")
        if min(ixx, iyy, izz) < 0 or min(minors) < slack * scale or whole < slack * scale**2:
            raise ValueError("inertia and products are not those of a body: a principal moment is negative")
        if self.spin is not None and self.spin.inertia is not None and scale:
            x, y, z = self.spin.axis
            polar = ixx * x * x + iyy * y * y + izz * z * z - 2 * (ixy * x * y + iyz * y * z + izx * z * x)
            if self.spin.inertia > polar * (1 + 1e-9):
                raise ValueError(
                    f"spin.inertia {self.spin.inertia:g} kg m^2 is more than the {polar:.6g} kg m^2 of the "
                    "whole body about that axis, which includes what spins: raise one or lower the other"
                )
        return self


class SixStiffnesses(Table):
    """Stiffness along and about the spring's axes; what is not given is zero."""

    x: Annotated[float, Quantity("stiffness", 0.0)] = 0.0
    y: Annotated[float, Quantity("stiffness", 0.0)] = 0.0
    z: Annotated[float, Quantity("stiffness", 0.0)] = 0.0
    rx: Annotated[float, Quantity("rotational_stiffness", 0.0)] = 0.0
    ry: Annotated[float, Quantity("rotational_stiffness", 0.0)] = 0.0
    rz: Annotated[float, Quantity("rotational_stiffness", 0.0)] = 0.0


class SixDashpots(Table):
    """Dashpot constants along and about the spring's axes; what is not given is zero."""

    x: Annotated[float, Quantity("damping", 0.0)] = 0.0
    y: Annotated[float, Quantity("damping", 0.0)] = 0.0
    z: Annotated[float, Quantity("damping", 0.0)] = 0.0
    rx: Annotated[float, Quantity("rotational_damping", 0.0)] = 0.0
    ry: Annotated[float, Quantity("rotational_damping", 0.0)] = 0.0
    rz: Annotated[float, Quantity("rotational_damping", 0.0)] = 0.0


def _pairs(value: object) -> object:
    if isinstance(value, list) and len(value) == 2 and all(isinstance(name, str) for name in value):
        return [value]
    if not isinstance(value, list) or not value:
        raise ValueError('expected two names such as ["B", "ground"], or a list of such pairs')
    for pair in value:
        if not isinstance(pair, list) or len(pair) != 2:
            raise ValueError('expected two names such as ["B", "ground"], or a list of such pairs')
    return value


class Spring(Table):
    """Springs and dashpots between points, or between points and the ground.

    Between two points that lie apart, the spring sits midway and rigid arms reach the points, so that a
    turn of the whole as one body strains nothing.
    """

    name: Name = Field("", description='default: numbered, such as "spring 1"')
    between: Annotated[
        tuple[tuple[Name, Name], ...],
        BeforeValidator(_pairs, json_schema_input_type=list[str] | list[list[str]]),
    ] = Field(description='two points, or a point and "ground"; or a list of such pairs')
    stiffness: SixStiffnesses = SixStiffnesses()
    dashpot: SixDashpots = SixDashpots()
    x_axis: Axis | None = Field(
        None, description="direction of the spring's x axis; default: the global axes"
    )
    y_axis: Axis | None = Field(None, description="direction near the spring's y axis; needs x_axis")
    tension: Annotated[float, Quantity("force")] = Field(
        0.0, description="steady pull between two points, as of a belt: holds them across with pull / length"
    )

    @model_validator(mode="after")
    def _whole(self) -> Spring:
        if not any([*_values(self.stiffness), *_values(self.dashpot)]):
            raise ValueError("has neither stiffness nor dashpot: give one, or leave the spring out")
        if self.y_axis is not None:
            if self.x_axis is None:
                raise ValueError("y_axis needs x_axis")
            if abs(sum(a * b for a, b in zip(self.x_axis, self.y_axis, strict=True))) > 0.999:
                raise ValueError("x_axis and y_axis are parallel")
        return self


def _values(table: Table) -> list[float]:
    return [value for _, value in table]


_Row = tuple[Annotated[float, Quantity("frequency", 0.0)], Annotated[float, Quantity("ratio", 0.0)]]


class Damping(Table):
    """Damping of the whole study. What is given adds up, dashpots and material ratios included."""

    ratio: Annotated[float, Quantity("ratio", 0.0)] = Field(
        0.0, description="share of critical, for every mode"
    )
    ranges: tuple[
        tuple[
            Annotated[float, Quantity("frequency", 0.0)],
            Annotated[float, Quantity("frequency", 0.0)],
            Annotated[float, Quantity("ratio", 0.0)],
        ],
        ...,
    ] = Field((), description="rows [from, to, ratio]: a ratio for the modes of a frequency range")
    rayleigh: tuple[_Row, _Row] | None = Field(
        None, description="two rows [frequency, ratio] that the curve goes through"
    )

    @field_validator("ratio")
    @classmethod
    def _below_critical(cls, ratio: float) -> float:
        if ratio >= 1:
            raise ValueError(
                f'{ratio:g} is critical damping or more; a ratio of 2 % is written 0.02 or "2 %"'
            )
        return ratio

    @field_validator("ranges")
    @classmethod
    def _in_order(
        cls, ranges: tuple[tuple[float, float, float], ...]
    ) -> tuple[tuple[float, float, float], ...]:
        ordered = sorted(ranges)
        for low, high, ratio in ordered:
            if low >= high:
                raise ValueError(f"a range must go upwards, not from {low:g} Hz to {high:g} Hz")
            cls._below_critical(ratio)
        for (_, end, _), (start, _, _) in pairwise(ordered):
            if start < end:
                raise ValueError(f"ranges overlap between {start:g} Hz and {end:g} Hz")
        return tuple(ordered)

    @field_validator("rayleigh")
    @classmethod
    def _passive(cls, rows: tuple[tuple[float, float], tuple[float, float]] | None) -> Any:
        if rows is not None:
            (f1, _), (f2, _) = rows
            if f1 == f2 or min(f1, f2) == 0:
                raise ValueError("needs two different frequencies above zero")
            alpha, beta = rayleigh_constants(rows)
            if alpha < 0 or beta < 0:
                raise ValueError(
                    "no such curve: it would feed energy into some modes; bring the two ratios closer"
                )
        return rows


def rayleigh_constants(rows: tuple[tuple[float, float], tuple[float, float]]) -> tuple[float, float]:
    """Alpha (1/s) and beta (s) of C = alpha M + beta K through two (frequency Hz, ratio) points.

    Rayleigh damping: ratio = alpha / (2 w) + beta w / 2 (Clough & Penzien, Dynamics of Structures).
    """
    tau = 6.283185307179586
    (w1, z1), (w2, z2) = ((tau * frequency, ratio) for frequency, ratio in rows)
    span = w2**2 - w1**2
    return 2 * w1 * w2 * (z1 * w2 - z2 * w1) / span, 2 * (z2 * w2 - z1 * w1) / span


# a quantity whose kind depends on the direction (a force or a moment, ...): read where both are known
_Size = Annotated[Any, WithJsonSchema({"type": ["string", "number"]})]


class Pulse(Table):
    """A half-sine pulse."""

    peak: _Size = Field(description="the greatest force (a moment for a turn)")
    duration: Annotated[float, positive("time")]


_STARTS = {
    "impulse": ("impulse", "angular_impulse"),
    "pull": ("force", "moment"),
    "displacement": ("length", "angle"),
    "velocity": ("velocity", "angular_velocity"),
}


class Impact(Table):
    """What sets the ring-down off: exactly one of impulse, pulse, pull, displacement, velocity."""

    at: Name
    along: Along | None = None
    impulse: _Size | None = Field(None, description="a blow so short that nothing moves meanwhile")
    pulse: Pulse | None = Field(None, description="a half-sine pulse {peak, duration}")
    pull: _Size | None = Field(None, description="a steady force, let go at once")
    displacement: _Size | None = Field(
        None, description="pulled steadily until the place has moved so far, then let go"
    )
    velocity: _Size | None = Field(None, description="the place starts with this velocity, all else at rest")
    duration: Annotated[float, positive("time")] | None = Field(
        None, description="default: until it has died away"
    )
    watch: Names | None = Field(
        None, description="points and bodies to show; default: the place that is struck"
    )

    @field_validator(*_STARTS, mode="before")
    @classmethod
    def _size(cls, value: object, info: ValidationInfo) -> float | None:
        kinds = _STARTS[info.field_name or ""]
        size = read_quantity(value, kinds[is_rotation(info.data.get("along"))], info)
        if size == 0:
            raise ValueError("must not be zero")
        return size

    @field_validator("pulse", mode="after")
    @classmethod
    def _peak(cls, pulse: Pulse, info: ValidationInfo) -> Pulse:
        kind = ("force", "moment")[is_rotation(info.data.get("along"))]
        peak = read_quantity(pulse.peak, kind, info)
        if peak == 0:
            raise ValueError("peak must not be zero")
        return pulse.model_copy(update={"peak": peak})

    @model_validator(mode="after")
    def _one(self) -> Impact:
        given = [name for name in (*_STARTS, "pulse") if getattr(self, name) is not None]
        if len(given) != 1:
            raise ValueError(
                f"needs exactly one of impulse, pulse, pull, displacement, velocity; "
                f"has {', '.join(given) or 'none'}"
            )
        return self


def is_rotation(along: object) -> bool:
    """Whether a component is a rotation: "rx", "-ry", ..."""
    return isinstance(along, str) and along.lstrip("-").startswith("r")


def _matrix(value: object) -> object:
    """A file name, rows, or a table {file | rows, unit}, as that table."""
    if isinstance(value, str):
        return {"file": value}
    if isinstance(value, list):
        return {"rows": value}
    return value


class MatrixEntry(Table):
    """One matrix: a file (.mtx Matrix Market, .npz) beside the study, or rows, and their unit."""

    file: Name | None = None
    rows: tuple[tuple[Number, ...], ...] | None = None
    unit: Name | None = Field(None, description="default: the unit that [units] declares for it")

    @model_validator(mode="after")
    def _one(self) -> MatrixEntry:
        if (self.file is None) == (self.rows is None):
            raise ValueError("needs either file or rows")
        return self


_Entry = Annotated[
    MatrixEntry,
    BeforeValidator(_matrix, json_schema_input_type=str | list[list[float]] | MatrixEntry),
]


class Matrices(Table):
    """Second-order matrices instead of a structure."""

    mass: _Entry
    stiffness: _Entry
    damping: _Entry | None = None
    gyroscopic: _Entry | None = None
    circulatory: _Entry | None = Field(None, description="skew-symmetric part of the stiffness (N/m)")
    speed: Annotated[float, positive("speed")] | None = Field(
        None, description="the speed that gyroscopic and circulatory are given for; both grow with it"
    )
    freedoms: tuple[Name, ...] = Field((), description="a name per row; default: numbered from 1")
    unsymmetric: bool = Field(
        False, description="declares that the stiffness may be unsymmetric (circulatory forces)"
    )

    @model_validator(mode="after")
    def _turning(self) -> Matrices:
        if self.speed is not None and self.gyroscopic is None and self.circulatory is None:
            raise ValueError("speed goes with gyroscopic or circulatory; there is neither")
        return self
