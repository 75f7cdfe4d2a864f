"""The table of a study about what shakes the machine: speeds, orders, frequencies, and their forces."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Annotated, Any

from pydantic import BeforeValidator, Field, PrivateAttr, ValidationInfo, model_validator

from vib.errors import ModelError
from vib.study.forces import Belt, Blades, Forces, Gear, Mains, Misalignment, Push
from vib.study.geometry import Table
from vib.study.machine import is_rotation
from vib.study.motions import Crank, Shaking, Strokes, Unbalance
from vib.study.quantities import Along, Axis, Name, Number, Quantity, positive, read_quantity

Range = tuple[float, float]
Force = Unbalance | Push | Crank | Strokes
_HIGHEST_ORDER = 1e6  # far above any count of teeth, bars or blades
FORCES = (
    "unbalance",
    "forces",
    "misalignment",
    "belt",
    "blades",
    "gear",
    "crank",
    "strokes",
    "mains",
)
UPRIGHT = FORCES[1:]  # those that act along a stated direction


def _speed(value: object, info: ValidationInfo) -> object:
    """One speed, or [from, to]; cycles per second."""
    if isinstance(value, list):
        if len(value) != 2:
            raise ValueError(
                "expected one speed or a range [from, to]; for a list of speeds use speeds = [...]"
            )
        low, high = (read_quantity(entry, "speed", info) for entry in value)
        if not 0 <= low < high:
            raise ValueError("a range of speeds must go upwards from zero or more")
        return low, high
    speed = read_quantity(value, "speed", info)
    if speed <= 0:
        raise ValueError("a speed must be greater than zero")
    return speed, speed


def _several(value: object) -> object:
    """One table stands for a list of one."""
    return [value] if isinstance(value, dict) else value


class Excitation(Table):
    """What shakes the machine: orders of a running speed, fixed frequencies, and the forces behind them.

    Without a force an order or a frequency is only screened against. Each kind of force is a table, or a list
    of tables.
    """

    name: Name = Field("", description='default: numbered, such as "excitation 1"')
    speed: Annotated[Range, BeforeValidator(_speed, json_schema_input_type=str | list[str])] | None = Field(
        None, description="running speed, or a range [from, to]"
    )
    speeds: tuple[Annotated[float, positive("speed")], ...] = Field(
        (), description="a list of running speeds"
    )
    shaft: Name | None = Field(
        None, description="instead of a speed: another excitation, whose speed it follows (belt, gear)"
    )
    ratio: Number = Field(1.0, description="its speed over that of `shaft`")
    axis: Axis | None = Field(
        None,
        description="of the shaft, the direction of the thumb of the right hand; default: that of the body "
        "that spins with it",
    )
    orders: tuple[Number, ...] = Field(
        (1.0,),
        min_length=1,
        description="multiples of the running speed, whole or not; those of its forces are added, and stand "
        "alone where none are given",
    )
    frequencies: tuple[Annotated[float, positive("frequency")], ...] = Field(
        (), description="fixed frequencies; those of its forces are added"
    )
    at: Name | None = Field(None, description="point or body where it acts")
    along: Along | None = Field(
        None, description="component or direction in which it acts; default: all three"
    )
    band: Annotated[float, Quantity("ratio", 0.0)] | None = Field(
        None, description="half width of the band to keep clear of, as a share of the excitation frequency"
    )
    unbalance: Annotated[
        tuple[Unbalance, ...], BeforeValidator(_several, json_schema_input_type=Unbalance | list[Unbalance])
    ] = Field((), description="pull of a mass off the axis")
    forces: Annotated[
        tuple[Forces, ...], BeforeValidator(_several, json_schema_input_type=Forces | list[Forces])
    ] = Field((), description="forces of stated amplitude, by order or frequency")
    misalignment: Annotated[
        tuple[Misalignment, ...],
        BeforeValidator(_several, json_schema_input_type=Misalignment | list[Misalignment]),
    ] = Field((), description="of shafts out of line")
    belt: Annotated[tuple[Belt, ...], BeforeValidator(_several, json_schema_input_type=Belt | list[Belt])] = (
        Field((), description="a fault that goes round with a belt")
    )
    blades: Annotated[
        tuple[Blades, ...], BeforeValidator(_several, json_schema_input_type=Blades | list[Blades])
    ] = Field((), description="blades or vanes that pass an edge")
    gear: Annotated[tuple[Gear, ...], BeforeValidator(_several, json_schema_input_type=Gear | list[Gear])] = (
        Field((), description="meshing teeth")
    )
    crank: Annotated[
        tuple[Crank, ...], BeforeValidator(_several, json_schema_input_type=Crank | list[Crank])
    ] = Field((), description="pistons on a crank")
    strokes: Annotated[
        tuple[Strokes, ...], BeforeValidator(_several, json_schema_input_type=Strokes | list[Strokes])
    ] = Field((), description="blows of a press")
    mains: Annotated[
        tuple[Mains, ...], BeforeValidator(_several, json_schema_input_type=Mains | list[Mains])
    ] = Field((), description="magnetic forces at multiples of the line frequency")
    ground: Annotated[
        tuple[Shaking, ...], BeforeValidator(_several, json_schema_input_type=Shaking | list[Shaking])
    ] = Field((), description="a steady motion of the ground")

    _follows: tuple[Range, ...] | None = PrivateAttr(None)

    @model_validator(mode="after")
    def _whole(self, info: ValidationInfo) -> Excitation:
        self._check_speed()
        for name in FORCES:
            rows = getattr(self, name)
            words = [name if len(rows) == 1 else f"{name}[{number}]" for number in range(len(rows))]
            placed = [self._placed(row, word, info) for row, word in zip(rows, words, strict=True)]
            object.__setattr__(self, name, tuple(placed))
        self._gather()
        if self.orders and min(self.orders) <= 0:
            raise ValueError("orders must be greater than zero")
        if max(self.orders) > _HIGHEST_ORDER:
            raise ValueError(
                f"orders: {max(self.orders):g} is larger than any order; write e.g. orders = [1, 2]"
            )
        if self.along is not None and self.at is None:
            raise ValueError("along needs at: the point or body where it acts")
        if self.band is not None and self.band >= 1:
            raise ValueError('band must be less than 1; a band of 20 % is written 0.2 or "20 %"')
        return self

    def _check_speed(self) -> None:
        given = [name for name in ("speed", "speeds", "shaft") if getattr(self, name)]
        if len(given) > 1:
            raise ValueError(f"takes {' or '.join(given)}, not both")
        fixed = self.frequencies or any(row.fixed() for _, row in self.acting())
        if not given and not fixed:
            raise ValueError("needs a speed, speeds, shaft or frequencies")
        turning = next((name for name, row in self.acting() if row.multiples()), None)
        if not given and turning:
            raise ValueError(f"{turning} goes with the running speed: give speed, speeds or shaft")
        if self.shaft is None and self.ratio != 1:
            raise ValueError("ratio goes with shaft: the excitation whose speed it follows")
        if self.ratio <= 0:
            raise ValueError("ratio must be greater than zero; which way a shaft turns is said by its axis")

    def _placed(self, row: Any, word: str, info: ValidationInfo) -> Any:
        """A force with its place, its direction and the amplitude that they give a meaning to."""
        at = row.at or self.at
        if at is None and not getattr(row, "places", None):
            raise ValueError(f"{word}: needs at, the point or body where it acts")
        turns = isinstance(row, Unbalance) or getattr(row, "turning", False)
        along = row.along if turns or row.along is not None else self.along
        kind = ("force", "moment")[is_rotation(along)]

        def sized(value: Any, name: str) -> float:
            try:
                size = read_quantity(value, kind, info)
            except ValueError as error:
                raise ValueError(f"{word}: {name}: {error}") from None
            if size == 0:
                raise ValueError(f"{word}: {name} must not be zero")
            return size

        changed: dict[str, Any] = {"at": at, "along": along}
        if isinstance(row, Unbalance | Crank) and is_rotation(along):
            raise ValueError(f"{word}: it pulls along an axis or a direction, not about one")
        for name in ("amplitude", "peak"):
            if getattr(row, name, None) is not None:
                changed[name] = sized(getattr(row, name), name)
        if isinstance(row, Forces) and row.table:
            changed["table"] = tuple(
                (o, sized(amplitude, "table"), phase) for o, amplitude, phase in row.table
            )
        return row.model_copy(update=changed)

    def _gather(self) -> None:
        """Screen against what the forces bring as well."""
        multiples = [one for _, row in self.acting() for one in row.multiples()]
        fixed = [one for _, row in self.acting() for one in row.fixed()]
        own = list(self.orders) if "orders" in self.model_fields_set or not multiples else []
        object.__setattr__(self, "orders", tuple(dict.fromkeys([*own, *sorted(multiples)])))
        object.__setattr__(self, "frequencies", tuple(dict.fromkeys([*self.frequencies, *fixed])))

    def acting(self) -> Iterator[tuple[str, Force | Shaking]]:
        """What it does to the machine, each with the word for it."""
        for name in (*FORCES, "ground"):
            for row in getattr(self, name):
                yield name, row

    @property
    def turns(self) -> bool:
        """Whether it has a running speed."""
        return self.speed is not None or bool(self.speeds) or self.shaft is not None

    @property
    def speed_ranges(self) -> tuple[Range, ...]:
        """Running speeds as (from, to) in cycles per second; one speed is a range of no width."""
        if self.shaft is not None:
            if self._follows is None:
                raise ModelError(
                    f'{self.name}: it follows the speed of "{self.shaft}", which is not known here'
                )
            return self._follows
        return (self.speed,) if self.speed is not None else tuple((speed, speed) for speed in self.speeds)


def leader(excitation: Excitation, others: Sequence[Excitation]) -> tuple[Excitation, float]:
    """The excitation whose speed this one follows in the end, and its own speed over that speed.

    Raises
    ------
    ModelError
        The excitations follow one another in a circle, or an unknown one.
    """
    by_name = {row.name: row for row in others}
    ratio, seen = 1.0, {excitation.name}
    while excitation.shaft is not None:
        ratio *= excitation.ratio
        if excitation.shaft not in by_name:
            raise ModelError(f'no excitation is named "{excitation.shaft}"')
        excitation = by_name[excitation.shaft]
        if excitation.name in seen:
            raise ModelError(f'"{excitation.name}" follows its own speed; one needs a speed of its own')
        seen.add(excitation.name)
    return excitation, ratio


def follow(excitations: Sequence[Excitation]) -> None:
    """Tell those that follow another's speed what it is; `vib.study.names` reports what can't be followed."""
    for excitation in excitations:
        if excitation.shaft is None:
            continue
        try:
            first, ratio = leader(excitation, excitations)
        except ModelError:
            continue
        if first.turns:
            excitation._follows = tuple((ratio * low, ratio * high) for low, high in first.speed_ranges)
