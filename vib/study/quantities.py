"""The types that entries of a study file have: quantities with units, names, directions.

A quantity reads its bare numbers in the unit that the study's [units] table declares; that table is
handed to the validators as pydantic's validation context. A tolerance is noted there too, by the path of its
entry, and the value goes on alone.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Annotated, Any

from pydantic import (
    AfterValidator,
    BeforeValidator,
    GetCoreSchemaHandler,
    GetJsonSchemaHandler,
    ValidationInfo,
)
from pydantic.json_schema import JsonSchemaValue
from pydantic_core import CoreSchema, core_schema

from vib.study.tolerances import Exactly, MarkedTable, MarkedText, Spread, Tolerance, entry, read_tolerance
from vib.units import KINDS, parse, text

COMPONENTS = ("x", "y", "z", "rx", "ry", "rz")


@dataclass(frozen=True)
class Quantity:
    """Annotates a float: text with a unit of this kind, or a bare number in the declared unit."""

    kind: str
    least: float = -math.inf
    may_equal_least: bool = True

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.with_info_plain_validator_function(
            self._read, json_schema_input_schema=_written(handler, core_schema.str_schema())
        )

    def __get_pydantic_json_schema__(
        self, schema: CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        kind = KINDS[self.kind]
        shown = {**handler(schema), "x-quantity": self.kind}
        if kind.si:
            shown["description"] = (
                f"{kind.words}: text with a unit, or a number in the unit of [units] {self.kind}"
            )
        return shown

    def _read(self, value: object, info: ValidationInfo) -> float:
        result = self.check(read_quantity(value, self.kind, info))
        if isinstance(value, MarkedText | MarkedTable) and info.context:
            self._check_limits(info.context["tolerances"][entry(value.path)])
        return result

    def _check_limits(self, tolerance: Tolerance) -> None:
        for limit in (tolerance.low, tolerance.high) if tolerance.bounded else ():
            try:
                self.check(limit)
            except ValueError as error:
                raise ValueError(f"its tolerance reaches {text(limit, self.kind)}: {error}") from None

    def check(self, result: float) -> float:
        """The value itself, if it lies where it may."""
        if result < self.least or (result == self.least and not self.may_equal_least):
            wanted = "at least" if self.may_equal_least else "greater than"
            raise ValueError(f"must be {wanted} {self.least:g}")
        return result


@dataclass(frozen=True)
class PlainNumber:
    """Annotates a float: a plain number without a unit."""

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.with_info_plain_validator_function(
            _number, json_schema_input_schema=_written(handler)
        )


def _written(handler: GetCoreSchemaHandler, *more: CoreSchema) -> CoreSchema:
    """What a file may hold for a quantity: a number, text, or a table with a tolerance."""
    return core_schema.union_schema([*more, core_schema.float_schema(), handler.generate_schema(Spread)])


def read_quantity(value: object, kind: str, info: ValidationInfo) -> float:
    """An SI float, bare numbers read in the unit that the study's [units] declares.

    What is said of its tolerance, and the kind of a value that stands in for an entry, go into the context.
    """
    context: dict[str, Any] = info.context or {}
    units: Mapping[str, str] = context.get("units", {})
    if isinstance(value, Exactly):
        context.setdefault("kinds", {})[entry(value.path)] = kind
        return float(value)
    if isinstance(value, MarkedText | MarkedTable):
        tolerance = read_tolerance(value, kind, units)
        context.setdefault("tolerances", {})[tolerance.path] = tolerance
        return tolerance.nominal
    return parse(value, kind, unit=units.get(kind))


def positive(kind: str) -> Quantity:
    """A quantity that must be greater than zero."""
    return Quantity(kind, 0.0, may_equal_least=False)


def _printable(text: str) -> str:
    if not text.strip():
        raise ValueError("must not be empty")
    if len(text) > 120:
        raise ValueError(f"must have at most 120 characters, has {len(text)}")
    if not text.isprintable():
        raise ValueError("must hold printable characters only (no line breaks or control characters)")
    return text


def _text(value: object) -> object:
    if not isinstance(value, str):
        raise ValueError(f"expected text in quotes, got {_kind_of(value)}")
    return value


def _number(value: object, info: ValidationInfo) -> float:
    if isinstance(value, MarkedText | MarkedTable | Exactly):
        return read_quantity(value, "ratio", info)
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise ValueError(f"expected a plain number, got {_kind_of(value)}")
    if not math.isfinite(value):
        raise ValueError("expected a finite number")
    return float(value)


def _one_or_more(value: object) -> object:
    if isinstance(value, str):
        return [value]
    if not isinstance(value, list) or not value:
        raise ValueError(f"expected a name or a list of names, got {_kind_of(value)}")
    return value


def _kind_of(value: object) -> str:
    names = {
        bool: "true/false",
        str: "text",
        int: "a number",
        float: "a number",
        list: "a list",
        dict: "a table",
    }
    if value == []:
        return "an empty list"
    found = [words for known, words in names.items() if isinstance(value, known)]
    return found[0] if found else f"a {type(value).__name__}"


def _axis(value: object, info: ValidationInfo) -> object:
    """A unit vector from ``"x"``, ``"-y"``, ... or from three numbers."""
    if isinstance(value, str):
        name = value.removeprefix("-")
        if name not in ("x", "y", "z"):
            raise ValueError(f'expected "x", "-x", "y", "-y", "z", "-z" or three numbers, got "{value}"')
        sign = -1.0 if value.startswith("-") else 1.0
        return tuple(sign * (name == axis) for axis in "xyz")
    if not isinstance(value, list) or len(value) != 3:
        raise ValueError('expected "x", "-x", ... or three numbers')
    numbers = [_number(number, info) for number in value]
    length = math.hypot(*numbers)
    if not 0 < length < math.inf:
        raise ValueError("a direction must not be zero" if length == 0 else "a direction must be finite")
    return tuple(number / length for number in numbers)


def _along(value: object, info: ValidationInfo) -> object:
    """A component such as ``"x"`` or ``"-rz"``, or a direction as three numbers."""
    if isinstance(value, str):
        if value.removeprefix("-") not in COMPONENTS:
            raise ValueError(
                f'expected one of {", ".join(COMPONENTS)} (with "-" for the other way), got "{value}"'
            )
        return value
    return _axis(value, info)


Name = Annotated[str, BeforeValidator(_text, json_schema_input_type=str), AfterValidator(_printable)]
Names = Annotated[tuple[Name, ...], BeforeValidator(_one_or_more, json_schema_input_type=str | list[str])]
Number = Annotated[float, PlainNumber()]
Axis = Annotated[tuple[float, float, float], BeforeValidator(_axis, json_schema_input_type=str | list[float])]
Along = Annotated[
    str | tuple[float, float, float], BeforeValidator(_along, json_schema_input_type=str | list[float])
]
Length = Annotated[float, Quantity("length")]
Vector = Annotated[tuple[Length, Length, Length], BeforeValidator(lambda value: _three(value))]


def _three(value: object) -> object:
    if not isinstance(value, list) or len(value) != 3:
        raise ValueError(f"expected three lengths [x, y, z], got {_kind_of(value)}")
    return value
