"""Which outputs of a ringing are recorded: the struck place, bodies and named points, or every freedom."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from vib.errors import ModelError
from vib.response.exponential import Array
from vib.response.starts import Along, Start
from vib.system import System

if TYPE_CHECKING:
    from vib.modes import Modes

MOST_BY_DEFAULT = 12  # outputs chosen unasked


@dataclass(frozen=True, eq=False)
class Output:
    """One recorded output: its name, its direction b (n,) with y = b q, and whether it is an angle (rad)."""

    name: str
    direction: Array
    rotational: bool


def choose_outputs(
    system: System,
    start: Start,
    watch: Sequence[tuple[str, Along]] | None,
    modes: Modes | None = None,
) -> tuple[tuple[Output, ...], tuple[str, ...]]:
    """The outputs asked for, or a choice, and a remark on what the choice leaves out.

    By default every freedom of bare matrices. For a structure: the struck place along the blow, then x, y, z
    of the struck place and of each body, then of the points those that move most by ``modes``; at most
    `MOST_BY_DEFAULT` of them.

    Raises
    ------
    ModelError
        A place to be watched is unknown or held, or is named twice.
    """
    if watch is not None:
        return _asked(system, watch), ()
    if system.anatomy is None:
        identity = np.eye(system.size)
        return tuple(
            Output(str(named), identity[i], named.component.startswith("r"))
            for i, named in enumerate(system.freedoms)
        ), ()
    places = system.anatomy.places
    bodies = [part.name for part in system.anatomy.parts if part.kind == "body" and part.name in places]
    first = [start.at] if start.at in places else []
    first += [name for name in bodies if name not in first]
    found = [] if start.at is None else [_output(system, start.at, start.along)]
    found += _translations(system, [name for name in first if name is not None])
    points = _translations(system, [name for name in places if name not in first])
    sizes = [_size(modes, start, output) for output in points]
    found += [points[i] for i in sorted(range(len(points)), key=lambda i: -sizes[i])]
    found = list({output.name: output for output in found}.values())
    left_out = found[MOST_BY_DEFAULT:]
    remarks: tuple[str, ...] = ()
    if left_out:
        remarks = (
            f"{MOST_BY_DEFAULT} outputs are recorded, {len(left_out)} more that could move are not: name the "
            "ones you want with watch.",
        )
    return tuple(found[:MOST_BY_DEFAULT]), remarks


def _translations(system: System, places: Sequence[str]) -> list[Output]:
    found = []
    for name in places:
        for along in ("x", "y", "z"):
            try:
                found.append(_output(system, name, along))
            except ModelError:  # held there: nothing to see
                continue
    return found


def _size(modes: Modes | None, start: Start, output: Output) -> float:
    """About how far an output moves after a blow: the sum of what each mode may add."""
    if modes is None or start.direction is None:
        return 0.0
    elastic = modes.frequencies_hz > 0
    shapes = modes.shapes[:, elastic]
    sizes = np.abs(output.direction @ shapes) * np.abs(start.direction @ shapes)
    return float((sizes / modes.frequencies_hz[elastic]).sum())


def _asked(system: System, watch: Sequence[tuple[str, Along]]) -> tuple[Output, ...]:
    pairs: list[tuple[str, Along]] = [
        (one, None) if isinstance(one, str) else (one[0], one[1]) for one in watch
    ]
    if not pairs:
        raise ModelError("watch: it is empty; name at least one (place, direction), or leave it out")
    found = tuple(_output(system, at, along) for at, along in pairs)
    names = [output.name for output in found]
    for name in names:
        if names.count(name) > 1:
            raise ModelError(f"watch: {name} is there more than once")
    return found


def _output(system: System, at: str, along: Along) -> Output:
    direction = system.direction(at, along)
    if along is None:
        name, turning = at, False
        index = int(np.argmax(np.abs(direction)))
        if system.anatomy is None:
            name, turning = str(system.freedoms[index]), system.freedoms[index].component.startswith("r")
    elif isinstance(along, str):
        name, turning = f"{at} {along.strip()}", along.strip().lstrip("+-").startswith("r")
    else:
        name, turning = f"{at} along ({', '.join(f'{c:g}' for c in along)})", False
    return Output(name, direction, turning)
