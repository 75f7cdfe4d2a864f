"""Which outputs of a ringing are recorded: the struck place, bodies and named points, or every freedom."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from vib.errors import ModelError
from vib.response.exponential import Array
from vib.response.starts import Along, Start
from vib.system import System

MOST_BY_DEFAULT = 24  # outputs chosen unasked


@dataclass(frozen=True, eq=False)
class Output:
    """One recorded output: its name, its direction b (n,) with y = b q, and whether it is an angle (rad)."""

    name: str
    direction: Array
    rotational: bool


def choose_outputs(
    system: System, start: Start, watch: Sequence[tuple[str, Along]] | None
) -> tuple[tuple[Output, ...], tuple[str, ...]]:
    """The outputs asked for, or a choice, and a remark on what the choice leaves out.

    By default every freedom of bare matrices. For a structure: the struck place along the blow, then x, y, z
    of the struck place, of each body and of each point that can move, at most `MOST_BY_DEFAULT` of them.

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
    bodies = [part.name for part in system.anatomy.parts if part.kind == "body"]
    places = [name for name in bodies if name in system.anatomy.places]
    places += [name for name in system.anatomy.places if name not in places]
    if start.at in places:
        places.remove(start.at)
        places.insert(0, start.at)
    found: list[Output] = []
    if start.at is not None and start.along not in ("x", "y", "z"):
        found.append(_output(system, start.at, start.along))
    for name in places:
        for along in ("x", "y", "z"):
            try:
                found.append(_output(system, name, along))
            except ModelError:  # held there: nothing to see
                continue
    if start.at is not None and start.along in ("x", "y", "z"):
        found.sort(key=lambda output: output.name != f"{start.at} {start.along}")
    left_out = found[MOST_BY_DEFAULT:]
    remarks: tuple[str, ...] = ()
    if left_out:
        remarks = (
            f"{MOST_BY_DEFAULT} outputs are recorded; {left_out[0].name} and {len(left_out) - 1} after it "
            "are not: name the ones you want with watch.",
        )
    return tuple(found[:MOST_BY_DEFAULT]), remarks


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
