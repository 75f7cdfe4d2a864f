"""Entries of a study and their values in words."""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import TYPE_CHECKING

from vib.show.numbers import significant
from vib.units import UnitSystem, shown, shown_unit

if TYPE_CHECKING:
    from vib.study import Study

_ROW = re.compile(r"(\w+)\[(\d+)\]\.(.+)")
_POINT = re.compile(r"points\.(.+)\[([012])\]")


def entry_words(study: Study, path: str) -> str:
    """An entry as its owner and what it is: "springs[0].stiffness.x" is "anchor bolts: stiffness x"."""
    if point := _POINT.fullmatch(path):
        return f"point {point[1]}: {'xyz'[int(point[2])]}"
    if row := _ROW.fullmatch(path):
        owner = getattr(study, row[1])[int(row[2])]
        return f"{getattr(owner, 'name', row[1])}: {_plain(row[3])}"
    owner_name, _, rest = path.partition(".")
    if owner_name in ("materials", "sections"):
        owner_name, _, rest = rest.rpartition(".")
    return f"{owner_name}: {_plain(rest)}"


def factor_words(study: Study, factor: str) -> str:
    """A factor of the sampling: a group by its name, else an entry."""
    return factor if factor.startswith("group ") else entry_words(study, factor)


def quantity_texts(kind: str, values: Sequence[float], units: UnitSystem) -> tuple[str, ...]:
    """Values of one kind as texts, and their unit at the end; ratios in per cent."""
    if kind == "ratio":
        return *(significant(100 * value, 4) for value in values), "%"
    return *(significant(shown(value, kind, units), 4) for value in values), shown_unit(kind, units)


def _plain(entry: str) -> str:
    return entry.replace(".", " ").replace("_", " ")
