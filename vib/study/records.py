"""Records beside a study: CSV of time and one quantity, units in the header, numbers as they are."""

from __future__ import annotations

import csv
import re
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from vib.errors import Fault, UnitError, VibError
from vib.units import KINDS, factor

_LARGEST_FILE = 2 * 10**9
_HEADING = re.compile(r"\s*(?P<name>[^\[\]]*?)\s*\[(?P<unit>[^\[\]]+)\]\s*")
FORCES = ("force", "moment")
MOTIONS = ("acceleration", "velocity", "length", "angular_acceleration", "angular_velocity", "angle")


@dataclass(frozen=True, eq=False)
class Record:
    """Times (k,), s, ascending, and SI values (k,) of one ``kind``, a key of `vib.units.KINDS`."""

    times_s: Any
    values: Any
    kind: str


def load_record(name: str, folder: Path, kinds: tuple[str, ...]) -> Record:
    """Read a record of one of some kinds.

    The first line that is no comment (``#``) is the header, such as ``time [s], acceleration [m/s^2]``;
    commas or semicolons separate.

    Raises
    ------
    VibError
        No such file, a header without units, a unit of another kind, a row that is not two numbers, or times
        that do not ascend; with the row.
    """
    path = folder / name
    if not path.is_file():
        raise VibError(f'there is no file "{name}" beside the study')
    if path.stat().st_size > _LARGEST_FILE:
        raise VibError(f'"{name}" is larger than 2 GB')
    try:
        with open(path, newline="", encoding="utf-8-sig") as file:
            return _read(file, name, kinds)
    except (OSError, UnicodeDecodeError, csv.Error) as error:
        raise VibError(f'"{name}" cannot be read: {error}') from None


def _read(file: Any, name: str, kinds: tuple[str, ...]) -> Record:
    import numpy as np

    header, separator = None, ","
    lines = ((number, line) for number, line in enumerate(file, 1) if _counts(line))
    for _, line in lines:
        separator = ";" if ";" in line else ","
        header = line.rstrip("\r\n").split(separator)
        break
    if header is None:
        raise VibError(f'"{name}" is empty')
    scale_time, scale, kind = _units(header, name, kinds)
    rows = []
    for number, line in lines:
        try:
            first, second = (float(cell) for cell in line.split(separator))
        except ValueError:
            raise VibError(
                f'"{name}", line {number}: expected two numbers, got {line.strip()[:60]!r}'
            ) from None
        rows.append((first, second))
    table = np.array(rows, dtype=float).reshape(-1, 2)
    if len(table) < 2:
        raise VibError(f'"{name}" has {len(table)} rows; a record needs at least two')
    bad = np.flatnonzero(~np.isfinite(table).all(axis=1))
    if bad.size:
        raise VibError(f'"{name}", row {bad[0] + 1}: every number must be finite')
    back = np.flatnonzero(np.diff(table[:, 0]) <= 0)
    if back.size:
        raise VibError(f'"{name}", row {back[0] + 2}: times must ascend')
    return Record(table[:, 0] * scale_time, table[:, 1] * scale, kind)


def _counts(line: str) -> bool:
    return bool(line.strip()) and not line.lstrip().startswith("#")


def _units(header: list[str], name: str, kinds: tuple[str, ...]) -> tuple[float, float, str]:
    example = f"time [s], {KINDS[kinds[0]].words.split(' ', 1)[1]} [{KINDS[kinds[0]].si}]"
    found = [_HEADING.fullmatch(cell) for cell in header]
    if len(found) != 2 or found[0] is None or found[1] is None:
        raise VibError(
            f'"{name}": the first line must name two columns with their units, such as "{example}"'
        )
    try:
        scale_time = factor(found[0]["unit"].strip(), "time")
    except UnitError as error:
        raise VibError(f'"{name}", first column: {error}') from None
    unit = found[1]["unit"].strip()
    for kind in kinds:
        try:
            return scale_time, factor(unit, kind), kind
        except UnitError:
            continue
    wanted = " or ".join(KINDS[kind].words for kind in kinds)
    raise VibError(f'"{name}", second column: "{unit}" is not a unit of {wanted}')


def load_records(study: Any, folder: Path) -> tuple[dict[str, Record], list[Fault]]:
    """Every record that the loads and the motion of the ground name, by its entry; and the faults found."""
    from vib.study.machine import is_rotation

    wanted: list[tuple[str, str, tuple[str, ...]]] = []
    for number, load in enumerate(study.loads):
        if load.file is not None:
            wanted.append((f"loads[{number}]", load.file, (FORCES[is_rotation(load.along)],)))
    if study.base_motion is not None and study.base_motion.file is not None:
        turns = is_rotation(study.base_motion.along)
        wanted.append(("base_motion", study.base_motion.file, MOTIONS[3:] if turns else MOTIONS[:3]))
    found: dict[str, Record] = {}
    faults = []
    for entry, name, kinds in wanted:
        try:
            found[entry] = load_record(name, folder, kinds)
        except VibError as error:
            faults.append(Fault(f"{entry}.file", str(error)))
    return found, faults
