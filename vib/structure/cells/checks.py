"""Cells that can't be computed: flat, or turned inside out."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from vib.errors import ModelError
from vib.structure.cells.family import Array, Family

_CHUNK = 2000
_NAMED = 10


def check_cells(family: Family, coordinates: Array, numbers: NDArray[np.intp] | None = None) -> None:
    """Stop if any cell is flat, turned inside out, folded, or has a node without a finite position.

    Parameters
    ----------
    family
        The kind of the cells.
    coordinates
        (e, k, 3), m.
    numbers
        (e,) what the cells are called in messages; counted from 1 if not given.

    Raises
    ------
    ModelError
        Names the cells by number.
    """
    nowhere = np.asarray(~np.isfinite(coordinates).all(axis=(1, 2)), dtype=np.bool_)
    flat = np.zeros(len(coordinates), dtype=bool)
    folded = np.zeros(len(coordinates), dtype=bool)
    for start in range(0, len(coordinates), _CHUNK):
        chunk = slice(start, start + _CHUNK)
        known = np.where(nowhere[chunk, None, None], 0.0, coordinates[chunk])
        flat[chunk], folded[chunk] = family.faults(known)
    called = np.arange(1, len(coordinates) + 1) if numbers is None else numbers
    messages = []
    if nowhere.any():
        messages.append(f"{_named(called[nowhere], family.kind)} at a position that is not a finite number")
    flat &= ~nowhere
    if flat.any():
        size = "area" if family.dimension == 2 else "volume"
        messages.append(f"{_named(called[flat], family.kind)} flat, without {size}")
    if folded.any():
        messages.append(f"{_named(called[folded], family.kind)} turned inside out or folded")
    if messages:
        raise ModelError(f"{'; '.join(messages)}. Mend the mesh there; node order and positions decide.")


def _named(numbers: NDArray[np.intp], kind: str) -> str:
    shown = ", ".join(str(number) for number in numbers[:_NAMED])
    more = f" and {len(numbers) - _NAMED} more" if len(numbers) > _NAMED else ""
    cells, verb = ("cell", "is") if len(numbers) == 1 else ("cells", "are")
    return f"{kind} {cells} {shown}{more} {verb}"
