"""The regions of a mesh: which name each cell goes by, out of the several ways that files have to say it."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from vib.errors import ModelError

Numbers = NDArray[np.intp]
EVERYTHING = "all"  # the region of a mesh that names none
REST = "no name"  # cells without a name beside cells that have one
_PHYSICAL, _GEOMETRICAL = "gmsh:physical", "gmsh:geometrical"  # what meshio calls two of the tags it reads


def region_names(
    found: Any, sizes: list[int], tag: str | None, wanted: frozenset[str], file: str
) -> tuple[tuple[str, ...], list[Numbers]]:
    """The names of the regions, and for each block of cells an index of a name per cell.

    Cell sets come first, then physical names, then integer cell data, whose values as text are the names.
    Where sets overlap, those that the study ``wanted`` win.

    Raises
    ------
    ModelError
        A cell is in two wanted sets, or the tag that is named does not exist, or none is where it must be.
    """
    tags = {str(name): blocks for name, blocks in found.cell_data.items() if all(_whole(b) for b in blocks)}
    dimensions = [block.dim for block in found.cells]
    if tag is not None:
        if tag not in tags:
            known = ", ".join(tags) or "none"
            raise ModelError(f'mesh.tag: {file} has no integer cell data "{tag}" (it has: {known})')
        return _from_tags(tags[tag], dimensions, _physical_names(found) if tag == _PHYSICAL else {})
    sets = cell_sets(found, sizes, file)
    if sets:
        return _from_sets(sets, sizes, wanted, file)
    for name, names in ((_PHYSICAL, _physical_names(found)), (_GEOMETRICAL, {})):
        if name in tags and any(np.any(data) for data in tags[name]):
            return _from_tags(tags[name], dimensions, names)
    others = [name for name in tags if name not in (_PHYSICAL, _GEOMETRICAL)]
    if len(others) > 1:
        raise ModelError(
            f"mesh.tag is missing: {file} has several integer cell data ({', '.join(others)}); name the one "
            "that tells the regions"
        )
    if others:
        return _from_tags(tags[others[0]], dimensions, {})
    return (EVERYTHING,), [np.zeros(size, dtype=np.intp) for size in sizes]


def cell_sets(found: Any, sizes: list[int], file: str) -> dict[str, list[Numbers]]:
    """The cell sets of a file that have cells: numbers within each block, from 0.

    Raises
    ------
    ModelError
        A set names cells that do not exist.
    """
    sets = {}
    for name, chosen in found.cell_sets.items():
        if str(name).startswith("gmsh:"):  # boundaries of boundaries, which meshio adds
            continue
        blocks = [_cells(part) for part in chosen]
        if any(
            len(cells) and (cells.min() < 0 or cells.max() >= size)
            for cells, size in zip(blocks, sizes, strict=True)
        ):
            raise ModelError(f'mesh.file: the cell set "{name}" of {file} names cells that do not exist')
        if any(len(cells) for cells in blocks):
            sets[str(name)] = blocks
    return sets


def _cells(chosen: Any) -> Numbers:
    if chosen is None:
        return np.zeros(0, dtype=np.intp)
    cells = np.asarray(chosen)
    return np.flatnonzero(cells) if cells.dtype.kind == "b" else cells.astype(np.intp)


def _whole(data: Any) -> bool:
    """One whole number per cell."""
    numbers = np.asarray(data)
    flat = numbers.ndim == 1 or (numbers.ndim == 2 and numbers.shape[1] == 1)
    return flat and numbers.dtype.kind in "iu"


def _physical_names(found: Any) -> dict[tuple[int, int], str]:
    """Name of each (dimension, tag)."""
    names = {}
    for name, value in found.field_data.items():
        pair = np.asarray(value).ravel()
        if len(pair) == 2:
            names[(int(pair[1]), int(pair[0]))] = str(name)
    return names


def _from_tags(
    blocks: list[Any], dimensions: list[int], names: dict[tuple[int, int], str]
) -> tuple[tuple[str, ...], list[Numbers]]:
    known: dict[str, int] = {}
    found = []
    for data, dimension in zip(blocks, dimensions, strict=True):
        values, place = np.unique(np.asarray(data).ravel(), return_inverse=True)
        called = [names.get((dimension, int(value)), str(int(value))) for value in values.tolist()]
        indices = [known.setdefault(name, len(known)) for name in called]
        found.append(np.array(indices, dtype=np.intp)[place.ravel()])
    return tuple(known), found


def _from_sets(
    sets: dict[str, list[Numbers]], sizes: list[int], wanted: frozenset[str], file: str
) -> tuple[tuple[str, ...], list[Numbers]]:
    names = sorted(sets, key=lambda name: name in wanted)  # the wanted ones last, over the others
    found = [np.full(size, -1, dtype=np.intp) for size in sizes]
    first = np.concatenate([[0], np.cumsum(sizes)])
    for index, name in enumerate(names):
        for block, cells in enumerate(sets[name]):
            taken = found[block][cells]
            both = np.array([number >= 0 and names[number] in wanted for number in range(len(names))])
            clash = (taken >= 0) & both[taken] if name in wanted else np.zeros(len(cells), dtype=bool)
            if clash.any():
                cell = int(np.argmax(clash))
                raise ModelError(
                    f"mesh.regions: cell {first[block] + cells[cell] + 1} of {file} is in two of them, "
                    f'"{names[taken[cell]]}" and "{name}"; a cell can be of one region only'
                )
            found[block][cells] = index
    if any((indices < 0).any() for indices in found):
        names.append(REST)
        found = [np.where(indices < 0, len(names) - 1, indices) for indices in found]
    return tuple(names), found
