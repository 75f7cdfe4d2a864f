"""The types that entries of a study file have: quantities with units, names, directions.

A quantity reads its bare numbers in the unit that the study's [units] table declares; that table is
handed to the validators as pydantic's validation context.
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

from vib.units import KINDS, parse

COMPONENTS = ("x", "y", "z", "rx", "ry", "rz")


@dataclass(frozen=True)
class Quantity:
    """Annotates a float: text with a unit of this kind, or a bare number in the declared unit."""

    kind: str
    least: float = -math.inf
    may_equal_least: bool = True

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> CoreSchema:
        return core_schema.with_info_plain_validator_function(self._read)

    def __get_pydantic_json_schema__(
        self, schema: CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        kind = KINDS[self.kind]
        shown: JsonSchemaValue = {"type": ["string", "number"], "x-quantity": self.kind}
        if kind.si:
            shown["description"] = (
                f"{kind.words}: text with a unit, or a number in the unit of [units] {self.kind}"
            )
        return shown

    def _read(self, value: object, info: ValidationInfo) -> float:
        return self.check(read_quantity(value, self.kind, info))

    def check(self, result: float) -> float:
        """The value itself, if it lies where it may."""
        if result < self.least or (result == self.least and not self.may_equal_least):
            wanted = "at least" if self.may_equal_least else "greater than"
            raise ValueError(f"must be {wanted} {self.least:g}")
        return result


def read_quantity(value: object, kind: str, info: ValidationInfo) -> float:
    """An SI float, bare numbers read in the unit that the study's [units] declares."""
    units: Mapping[str, str] = (info.context or {}).get("units", {})
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


def _number(value: object) -> object:
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise ValueError(f"expected a plain number, got {_kind_of(value)}")
    if not math.isfinite(value):
        raise ValueError("expected a finite number")
    return value


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
    return names.get(type(value), f"a {type(value).__name__}")


def _axis(value: object) -> object:
    """A unit vector from ``"x"``, ``"-y"``, ... or from three numbers."""
    if isinstance(value, str):
        name = value.removeprefix("-")
        if name not in ("x", "y", "z"):
            raise ValueError(f'expected "x", "-x", "y", "-y", "z", "-z" or three numbers, got "{value}"')
        sign = -1.0 if value.startswith("-") else 1.0
        return tuple(sign * (name == axis) for axis in "xyz")
    if not isinstance(value, list) or len(value) != 3:
        raise ValueError('expected "x", "-x", ... or three numbers')
    for entry in value:
        _number(entry)
    length = math.hypot(*value)
    if not 0 < length < math.inf:
        raise ValueError("a direction must not be zero" if length == 0 else "a direction must be finite")
    return tuple(entry / length for entry in value)


def _along(value: object) -> object:
    """A component such as ``"x"`` or ``"-rz"``, or a direction as three numbers."""
    if isinstance(value, str):
        if value.removeprefix("-") not in COMPONENTS:
            raise ValueError(
                f'expected one of {", ".join(COMPONENTS)} (with "-" for the other way), got "{value}"'
            )
        return value
    return _axis(value)


Name = Annotated[str, BeforeValidator(_text, json_schema_input_type=str), AfterValidator(_printable)]
Names = Annotated[tuple[Name, ...], BeforeValidator(_one_or_more, json_schema_input_type=str | list[str])]
Number = Annotated[float, BeforeValidator(_number, json_schema_input_type=float)]
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
