"""Tolerances: how far a quantity of the study may lie from the value that is written down.

Any number of a study may be text such as ``"2 kN/mm +- 20 %"`` or a table (`Spread`). Every other part of the
package sees the value alone; what is said about its scatter stands in `Study.tolerances`.

Without a distribution the value lies evenly between its limits: the rule of JCGM 100:2008 (GUM), 4.3.7, where
limits are all that is known. Limits of normal and lognormal quantities hold 95 % of the values (4.3.4).
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Any, Literal

from pydantic import BaseModel, ConfigDict, Field, ValidationError

from vib.study.lines import Path
from vib.units import parse

Distribution = Literal["uniform", "triangular", "normal", "lognormal"]
# half width of the interval that holds 95 % of a normal quantity, in standard deviations
COVERAGE_95 = 1.959963984540054
_SIGNS = re.compile(r"\s*(?:\+/?-|±)\s*")
_STARTS_WITH_NUMBER = re.compile(r"\s*[+-]?(?:\d|\.\d)")
_PER_CENT = re.compile(r"(.*?)\s*(?:%|percent)\s*", re.DOTALL)


@dataclass(frozen=True)
class Tolerance:
    """The scatter of one quantity.

    ``path`` is its entry, such as ``springs[0].stiffness.x``; ``kind`` a key of `vib.units.KINDS`;
    ``nominal``, ``low`` and ``high`` are SI. A uniform or triangular quantity lies between ``low`` and
    ``high``, of a normal or lognormal one 95 % do. Quantities of one ``group`` are drawn together:
    ``correlation`` 1 gives all of them the same draw.
    """

    path: str
    kind: str
    nominal: float
    low: float
    high: float
    distribution: Distribution = "uniform"
    group: str | None = None
    correlation: float = 1.0

    @property
    def bounded(self) -> bool:
        """Whether no value lies outside the limits."""
        return self.distribution in ("uniform", "triangular")


class Spread(BaseModel):
    """A quantity with its tolerance: value and tolerance, or from and to."""

    model_config = ConfigDict(extra="forbid", frozen=True)

    value: str | float | None = Field(
        None, description="what every other command uses; default: the middle of from and to"
    )
    tolerance: str | float | None = Field(
        None, description='either way: "20 %" of the value, or text with a unit such as "0.3 kN/mm"'
    )
    standard_deviation: str | float | None = Field(
        None, description="instead of tolerance, for normal and lognormal"
    )
    from_: str | float | None = Field(None, alias="from", description="instead of tolerance: the lower limit")
    to: str | float | None = Field(None, description="the upper limit")
    distribution: Distribution = Field(
        "uniform",
        description="limits of uniform and triangular hold every value, of normal and lognormal 95 % of them",
    )
    group: str | None = Field(
        None, description="quantities of one group are drawn together, all high or all low"
    )
    correlation: float | None = Field(
        None, gt=0, le=1, description="between the quantities of the group; default: 1, one draw for all"
    )


_KEYS = {field.alias or name for name, field in Spread.model_fields.items()}


class MarkedText(str):
    """Text that may state a tolerance, with its path in the file."""

    path: Path = ()


class MarkedTable(dict[str, Any]):
    """A table that may state a tolerance, with its path in the file."""

    path: Path = ()


class Exactly(float):
    """A value that is put in the place of an entry: SI, whatever units are declared."""

    path: Path = ()


def mark(raw: Any, path: Path = ()) -> Any:
    """A copy of what a file holds, in which all that may be a tolerance knows where it stands."""
    if isinstance(raw, dict):
        table = {key: mark(value, (*path, key)) for key, value in raw.items()}
        if table.keys() <= _KEYS and ("value" in table or "from" in table or "to" in table):
            marked = MarkedTable(table)
            marked.path = path
            return marked
        return table
    if isinstance(raw, list):
        return [mark(value, (*path, number)) for number, value in enumerate(raw)]
    if isinstance(raw, str) and _STARTS_WITH_NUMBER.match(raw) and _SIGNS.search(raw):
        text = MarkedText(raw)
        text.path = path
        return text
    return raw


def read_tolerance(value: MarkedText | MarkedTable, kind: str, units: Mapping[str, str]) -> Tolerance:
    """What a text or a table says about a quantity of this kind.

    Raises
    ------
    ValueError
        It can't be read, contradicts itself, or is empty.
    """
    spread = _of_text(value) if isinstance(value, MarkedText) else _of_table(value)
    unit = units.get(kind)
    for given in (spread.value, spread.from_, spread.to, spread.tolerance, spread.standard_deviation):
        if isinstance(given, str) and len(_SIGNS.split(given)) > 1:
            raise ValueError(
                f'"{given}" states a tolerance inside a table that states one; write one of them'
            )
    low, nominal, high = (
        _between(spread, kind, unit) if spread.tolerance is None else _around(spread, kind, unit)
    )
    if spread.correlation is not None and spread.group is None:
        raise ValueError("correlation goes with group")
    if spread.distribution == "lognormal" and low <= 0:
        raise ValueError("a lognormal quantity lies above zero, and so must its limits")
    correlation = 1.0 if spread.correlation is None else spread.correlation
    return Tolerance(
        entry(value.path), kind, nominal, low, high, spread.distribution, spread.group, correlation
    )


def check_tolerances(found: Mapping[str, Tolerance]) -> Iterator[tuple[Path, str]]:
    """What is wrong with the tolerances of a study as a whole, as (path in the file, message)."""
    correlations: dict[str, float] = {}
    for name, tolerance in found.items():
        steps = name.replace("[", ".").replace("]", "").split(".")
        path: Path = tuple(int(step) if step.isdigit() else step for step in steps)
        if steps[0] == "matrices" and steps[1] != "speed":
            yield path[:2], "entries of a matrix take no tolerance: what they are made of is not known here"
        if tolerance.group is not None:
            agreed = correlations.setdefault(tolerance.group, tolerance.correlation)
            if agreed != tolerance.correlation:
                yield path, f'the group "{tolerance.group}" has the correlation {agreed:g} elsewhere'


def entry(path: Path) -> str:
    """A path as text, such as ``springs[0].stiffness.x``."""
    return "".join(f"[{step}]" if isinstance(step, int) else f".{step}" for step in path).lstrip(".")


def _of_text(text: str) -> Spread:
    parts = _SIGNS.split(text)
    if len(parts) != 2 or not parts[1]:
        raise ValueError(f'expected a value and one tolerance such as "2 kN/mm +- 20 %", got "{text}"')
    value, tolerance = parts
    if value.strip()[-1:].isdigit() and not tolerance.strip()[-1:].isdigit() and not _relative(tolerance):
        raise ValueError(f'"{value.strip()}" has no unit and its tolerance has: write the unit with both')
    return Spread(value=value, tolerance=tolerance)


def _of_table(table: Mapping[str, Any]) -> Spread:
    try:
        spread = Spread.model_validate(dict(table))
    except ValidationError as error:
        first = error.errors(include_url=False)[0]
        raise ValueError(f"{'.'.join(str(step) for step in first['loc'][:1])}: {first['msg']}") from None
    ways = [spread.tolerance is not None, spread.standard_deviation is not None, spread.from_ is not None]
    if sum(ways) != 1 or (spread.from_ is None) != (spread.to is None):
        raise ValueError(
            "a tolerance is a table {value, tolerance}, {value, standard_deviation} or {from, to}"
        )
    if spread.value is None and spread.from_ is None:
        raise ValueError("a tolerance needs its value")
    if spread.standard_deviation is not None and spread.distribution not in ("normal", "lognormal"):
        raise ValueError(
            'standard_deviation goes with distribution = "normal" or "lognormal"; '
            "limits of a uniform one are its tolerance"
        )
    return spread


def _relative(text: object) -> bool:
    return isinstance(text, str) and _PER_CENT.fullmatch(text) is not None


def _around(spread: Spread, kind: str, unit: str | None) -> tuple[float, float, float]:
    """Low, nominal and high of a value with a tolerance either way."""
    nominal = parse(spread.value, kind, unit=unit)
    half = _size(spread.tolerance, spread, nominal, kind, unit)
    if spread.distribution != "lognormal":
        return nominal - half, nominal, nominal + half
    # as far up as down in ratio: 95 % between value / (1 + t) and value (1 + t)
    if nominal <= 0:
        raise ValueError("a lognormal quantity lies above zero")
    return nominal / (1 + half / nominal), nominal, nominal + half


def _between(spread: Spread, kind: str, unit: str | None) -> tuple[float, float, float]:
    """Low, nominal and high of limits, or of a standard deviation."""
    if spread.standard_deviation is not None:
        return _deviating(spread, kind, unit)
    low, high = parse(spread.from_, kind, unit=unit), parse(spread.to, kind, unit=unit)
    if low >= high:
        raise ValueError("from must be less than to")
    geometric = spread.distribution == "lognormal" and low > 0
    middle = (low * high) ** 0.5 if geometric else (low + high) / 2
    if spread.value is None:
        return low, middle, high
    nominal = parse(spread.value, kind, unit=unit)
    if not low <= nominal <= high:
        raise ValueError("value must lie between from and to")
    if not spread.distribution.startswith(("uniform", "triangular")) and abs(nominal - middle) > 1e-6 * high:
        what = "geometric mean" if geometric else "middle"
        raise ValueError(
            f"a {spread.distribution} quantity has its value at the {what} of from and to: leave value out"
        )
    return low, nominal, high


def _deviating(spread: Spread, kind: str, unit: str | None) -> tuple[float, float, float]:
    import math

    nominal = parse(spread.value, kind, unit=unit)
    deviation = _size(spread.standard_deviation, spread, nominal, kind, unit)
    if spread.distribution == "normal":
        return nominal - COVERAGE_95 * deviation, nominal, nominal + COVERAGE_95 * deviation
    if nominal <= 0:
        raise ValueError("a lognormal quantity lies above zero")
    # of the logarithm; the value is the median, the deviation a share of the mean
    log_deviation = math.sqrt(math.log1p((deviation / nominal) ** 2))
    factor = math.exp(COVERAGE_95 * log_deviation)
    return nominal / factor, nominal, nominal * factor


def _size(given: object, spread: Spread, nominal: float, kind: str, unit: str | None) -> float:
    """A tolerance in SI, from a share of the value or a quantity of its own."""
    if isinstance(given, str) and (match := _PER_CENT.fullmatch(given)):
        share = parse(match[1], "ratio") / 100
        if kind == "ratio" and _relative(spread.value) and 100 * share <= 100 * abs(nominal):
            points, part = f"{nominal:g} +- {share:g}", f"{nominal:g} +- {given.strip()}"
            raise ValueError(
                f'"+- {given.strip()}" can mean percentage points or a share of the value: write it as '
                f"a plain number: {points} for points, {part} for a share"
            )
        if nominal == 0 and share > 0:
            raise ValueError(f"{given.strip()} of zero is nothing: give the tolerance with a unit")
        size = share * abs(nominal)
    else:
        size = parse(given, kind, unit=unit)
    if size <= 0:
        raise ValueError("a tolerance must be greater than zero; without one write the value alone")
    return size
