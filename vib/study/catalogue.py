"""Designations of published standards, such as "IPE 200" or "SHS 100x100x6", and their profiles.

The tables in ``data`` are read only when a designation asks for them; each file says what it holds and where
its figures come from. Area, second moments, torsion constant and shear areas are computed from the
dimensions (``vib.study.profiles``), not taken from the printed figures, which serve as a check in the tests.
"""

from __future__ import annotations

import difflib
import math
import re
from collections.abc import Callable, Mapping
from dataclasses import replace
from functools import cache
from pathlib import Path
from typing import NamedTuple

from vib.errors import ModelError
from vib.study.profiles import (
    Profile,
    angle,
    circular_hollow,
    i_section,
    rectangular_hollow,
    tapered_channel,
)

_DATA = Path(__file__).parent / "data"
_MM, _INCH, _PERCENT = 1e-3, 0.0254, 0.01

_HOLLOW = re.compile(r"(SHS|RHS|CHS)([\d.]+)X([\d.]+)(?:X([\d.]+))?(?:HOT(?:FINISHED)?|(COLD)(?:FORMED)?)?")
_ANGLE = re.compile(r"L([\d.]+)X([\d.]+)(?:X([\d.]+))?")
_CAPITALS = "ABCDEFGHIJKLMNOPQRSTUVWXYZ"
_WIDE = re.compile(r"HE(\d+)([ABM])")


class Entry(NamedTuple):
    """One row of a table.

    ``dimensions`` in metres by the names of the file's header, the slope of a flange as a ratio;
    ``printed`` holds the printed figures as text, in powers of ``printed_unit`` (m).
    """

    designation: str
    dimensions: Mapping[str, float]
    printed: Mapping[str, str]
    printed_unit: float


class _Table(NamedTuple):
    file: str
    dimensions: tuple[str, ...]
    unit: float
    printed_unit: float


_TABLES = {
    "I": _Table("i_sections.csv", ("h", "b", "tw", "tf", "r"), _MM, 1e-2),
    "channel": _Table("channels.csv", ("h", "b", "tw", "tf", "r1", "r2", "slope"), _MM, 1e-2),
    "angle": _Table("angles.csv", ("a", "b", "t", "r1"), _MM, 1e-2),
    "W": _Table("w_sections.csv", ("d", "bf", "tw", "tf", "k"), _INCH, _INCH),
    "hollow": _Table("hollow_sections.csv", (), _MM, 1e-2),
}


def families() -> tuple[str, ...]:
    """The names of the tables, for ``entries``."""
    return tuple(_TABLES)


@cache
def entries(family: str) -> Mapping[str, Entry]:
    """The rows of one table, by plain designation: capitals without spaces."""
    table = _TABLES[family]
    text = (_DATA / table.file).read_text(encoding="utf-8")
    head, *rows = (line.split(",") for line in text.splitlines() if not line.startswith("#"))
    sizes = len(table.dimensions) + 1
    found = {}
    for row in rows:
        dimensions = {
            name: float(cell) * (_PERCENT if name == "slope" else table.unit)
            for name, cell in zip(head[1:sizes], row[1:sizes], strict=True)
        }
        printed = dict(zip(head[sizes:], row[sizes:], strict=True))
        found[_plain(row[0])] = Entry(row[0], dimensions, printed, table.printed_unit)
    return found


def designations() -> tuple[str, ...]:
    """Every designation in the tables; hollow sections of other sizes are found as well."""
    return tuple(entry.designation for family in _TABLES for entry in entries(family).values())


def find_profile(designation: str) -> Profile:
    """The profile of a designation; case, spaces, hyphens, and x or × do not matter.

    ``IPE 200``, ``HEA 160`` (or ``HE 160 A``), ``UPN 120``, ``UPE 200`` (EN 10365); ``L 80x80x8`` or
    ``L 80x8`` (EN 10056-1), the first leg upright; ``W8x31`` (ASTM A6); ``SHS 100x100x6`` or ``SHS 100x6``,
    ``RHS 120x80x5``, the first number being the upright side, ``CHS 114.3x5``: hot finished as EN 10210-2
    unless the word ``cold`` follows, for cold formed as EN 10219-2.

    Raises
    ------
    ModelError
        No such designation, with the nearest ones; or a hollow section that cannot be.
    """
    plain = _plain(designation)
    hollow = _HOLLOW.fullmatch(plain)
    if hollow:
        return _hollow(designation, hollow)
    legs = _ANGLE.fullmatch(plain)
    if legs:
        return _angle(designation, legs)
    family = _FAMILIES.get(_letters(plain))
    entry = entries(family).get(plain) if family else None
    if family and entry:
        return replace(_BUILDERS[family](entry.dimensions), name=entry.designation)
    raise _unknown(designation, plain)


def _plain(designation: str) -> str:
    """The designation in capitals without spaces, HE 200 A as HEA200: the keys of ``entries``."""
    text = re.sub(r"[\s_-]+", "", designation.upper()).replace("×", "X").replace("*", "X")
    text = text.replace(",", ".")
    wide = _WIDE.fullmatch(text)
    return f"HE{wide[2]}{wide[1]}" if wide else text


def _letters(plain: str) -> str:
    return plain[: len(plain) - len(plain.lstrip(_CAPITALS))]


def _unknown(designation: str, plain: str) -> ModelError:
    """The error for what is not in the tables: the nearest sizes of its kind, else the nearest words."""
    known = {key: entry.designation for family in _TABLES for key, entry in entries(family).items()}
    alike = [key for key in known if _letters(key) == _letters(plain)]
    near = sorted(alike, key=lambda key: _distance(key, plain))[:3]
    near = near or difflib.get_close_matches(plain, known, n=3, cutoff=0.6)
    hint = (
        f"did you mean {' or '.join(known[key] for key in near)}?"
        if near
        else "known are IPE, HEA, HEB, HEM, UPN, UPE, L, W, SHS, RHS and CHS with a size, such as IPE 200."
    )
    return ModelError(
        f"{designation!r} is not in the catalogue; {hint} A section can also be given by its dimensions"
    )


def _distance(key: str, plain: str) -> float:
    """How far apart the sizes of two designations are, as far as both have them; the first count most."""
    ours, theirs = (re.findall(r"\d+(?:\.\d+)?", text) for text in (key, plain))
    gaps = [abs(float(a) - float(b)) / float(a) for a, b in zip(ours, theirs, strict=False)]
    return sum(gap * 0.1**place for place, gap in enumerate(gaps))


def _i_section(d: Mapping[str, float]) -> Profile:
    return i_section(d["h"], d["b"], d["tw"], d["tf"], d["r"])


def _w_section(d: Mapping[str, float]) -> Profile:
    return i_section(d["d"], d["bf"], d["tw"], d["tf"], d["k"] - d["tf"])


def _channel(d: Mapping[str, float]) -> Profile:
    # DIN 1026-1 measures the thickness of the flange at half the width, above 300 mm at half its outstand.
    at = d["b"] / 2 if d["h"] <= 0.3 else (d["b"] - d["tw"]) / 2
    return tapered_channel(d["h"], d["b"], d["tw"], d["tf"], d["slope"], d["r1"], d["r2"], at)


_BUILDERS: dict[str, Callable[[Mapping[str, float]], Profile]] = {
    "I": _i_section,
    "channel": _channel,
    "W": _w_section,
}
_FAMILIES = {
    "IPE": "I", "HEA": "I", "HEB": "I", "HEM": "I", "UPN": "channel", "UPE": "channel", "W": "W"
}  # fmt: skip


def _numbers(designation: str, found: re.Match[str], groups: tuple[int, ...]) -> list[float]:
    try:
        return [float(found[group]) for group in groups]
    except ValueError:
        raise ModelError(f"{designation!r}: a size in it is not a number") from None


def _angle(designation: str, found: re.Match[str]) -> Profile:
    first, *others = _numbers(designation, found, (1, 2, 3) if found[3] else (1, 2))
    second, thickness = others if len(others) == 2 else (first, others[0])
    key = f"L{max(first, second):g}X{min(first, second):g}X{thickness:g}"
    entry = entries("angle").get(key)
    if entry is None:
        raise _unknown(designation, key)
    size = entry.dimensions
    upright, lying = (size["a"], size["b"]) if first >= second else (size["b"], size["a"])
    # EN 10056-1 rounds the toes to half the root radius.
    profile = angle(upright, lying, size["t"], size["r1"], size["r1"] / 2)
    return replace(profile, name=f"L {first:g}x{second:g}x{thickness:g}")


def _hollow(designation: str, found: re.Match[str]) -> Profile:
    kind, cold = found[1], found[5] is not None
    sizes = _numbers(designation, found, (2, 3, 4) if found[4] else (2, 3))
    if kind == "SHS" and len(sizes) == 2:
        sizes.insert(0, sizes[0])
    wanted = 2 if kind == "CHS" else 3
    if len(sizes) != wanted:
        example = "CHS 114.3x5" if kind == "CHS" else "RHS 120x80x5"
        raise ModelError(f"{designation!r}: {kind} takes {wanted} sizes in mm, such as {example}")
    if kind == "SHS" and sizes[0] != sizes[1]:
        raise ModelError(f"{designation!r}: a square section has equal sides; write RHS for this one")
    least, thickness = min(sizes[:-1]), sizes[-1]
    if not 0.0 < thickness < least / 4:
        raise ModelError(
            f"{designation!r}: a wall of {thickness:g} mm must be above zero and less than a quarter of "
            f"{least:g} mm; or give the section by its dimensions"
        )
    name = f"{kind} {'x'.join(f'{size:g}' for size in sizes)}{' cold' if cold else ''}"
    return _hollow_profile(name, kind, cold, [size * _MM for size in sizes])


def _hollow_profile(name: str, kind: str, cold: bool, sizes: list[float]) -> Profile:
    thickness = sizes[-1]
    remarks = [f"{name}: corner radii by the rule of {'EN 10219-2' if cold else 'EN 10210-2'}"]
    if kind == "CHS":
        profile, remarks = circular_hollow(sizes[0], thickness), []
    else:
        outer, inner = _cold_radii(thickness) if cold else (1.5 * thickness, thickness)
        profile = rectangular_hollow(sizes[1], sizes[0], thickness, outer, inner)
    if not _listed(kind, cold, sizes):
        remarks.append(
            f"{name}: not among the sizes listed here (the list is not complete); make sure it is made"
        )
    return replace(profile, name=name, remarks=tuple(remarks))


def _listed(kind: str, cold: bool, sizes: list[float]) -> bool:
    """Whether a size is in the table, lying sections and cold formed tubes included."""
    in_order = sorted(sizes[:-1], reverse=True) + sizes[-1:]
    plain = kind + "X".join(f"{size / _MM:g}" for size in in_order)
    return plain + ("COLD" if cold and kind != "CHS" else "") in entries("hollow")


def _cold_radii(thickness: float) -> tuple[float, float]:
    """Outer and inner corner radius in m of EN 10219-2 (from memory), by thickness."""
    if thickness <= 6 * _MM or math.isclose(thickness, 6 * _MM):
        return 2.0 * thickness, 1.0 * thickness
    if thickness <= 10 * _MM or math.isclose(thickness, 10 * _MM):
        return 2.5 * thickness, 1.5 * thickness
    return 3.0 * thickness, 2.0 * thickness
