"""A mesh file through meshio, whose habits stop here: it prints, leaves the program, and checks little."""

from __future__ import annotations

import contextlib
import io
import warnings
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import lru_cache
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from vib.errors import ModelError
from vib.structure.mesh.ending import files_end
from vib.structure.mesh.regions import cell_sets, region_names
from vib.system import Array

Numbers = NDArray[np.intp]
_LINES = {"line": 2, "line3": 3}
_LARGEST = 20 * 2**30


@dataclass(frozen=True, eq=False)
class Block:
    """Cells of one kind, in the order of the file.

    ``connectivity`` (e, k) node numbers from 0; ``numbers`` (e,) what the cells are called: their place among
    all cells of the file, from 1; ``region`` (e,) an index into `RawMesh.regions`.
    """

    kind: str
    connectivity: Numbers
    numbers: Numbers
    region: Numbers


@dataclass(frozen=True, eq=False)
class RawMesh:
    """What a file holds: nodes (k, 3) in the units of the file, blocks of cells, names of regions.

    ``point_sets``: numbers from 0 of the nodes in each point set and each cell set that is no region by
    itself; ``file`` its name.
    """

    file: str
    nodes: Array
    blocks: tuple[Block, ...]
    regions: tuple[str, ...]
    point_sets: Mapping[str, Numbers] = field(default_factory=dict)


def read_mesh(path: Path, tag: str | None = None, wanted: frozenset[str] = frozenset()) -> RawMesh:
    """Read a mesh file.

    Parameters
    ----------
    path
        Any kind that meshio reads.
    tag
        Which integer cell data tells the regions; None where that is plain.
    wanted
        Names of the regions that the study uses.

    Raises
    ------
    ModelError
        The file can't be read, or does not hold a mesh: no cells, coordinates that are not finite, node
        numbers that do not exist.
    """
    try:
        told = path.stat()
    except OSError as error:
        raise ModelError(f"mesh.file: {path.name} cannot be read: {error.strerror or error}") from None
    if not told.st_size:
        raise ModelError(f"mesh.file: {path.name} is empty")
    if told.st_size > _LARGEST:
        raise ModelError(f"mesh.file: {path.name} is larger than 20 GiB")
    return _read_once(path, tag, wanted, told.st_mtime_ns, told.st_size)


@lru_cache(maxsize=1)
def _read_once(path: Path, tag: str | None, wanted: frozenset[str], _changed: int, _size: int) -> RawMesh:
    """A command looks at its mesh more than once; a file that has changed since is read again."""
    found = _through_meshio(path)
    nodes = _coordinates(found, path.name)
    kinds = [(str(block.type), block.data) for block in found.cells]
    if not sum(len(data) for kind, data in kinds if kind != "vertex"):
        raise ModelError(
            f"mesh.file: {path.name} holds no cells but points, or none of a kind that can be read"
        )
    _check_kinds(kinds, path.name)
    sizes = [len(data) for _, data in kinds]
    names, regions = region_names(found, sizes, tag, wanted, path.name)
    blocks, start = [], 1
    for (kind, data), region in zip(kinds, regions, strict=True):
        connectivity = np.asarray(data)
        numbers = start + np.arange(len(connectivity))
        start += len(connectivity)
        if len(connectivity):
            blocks.append(Block(kind, _checked(kind, connectivity, numbers, len(nodes)), numbers, region))
    sets = {
        name: np.unique(np.concatenate([np.ravel(kinds[i][1][cells]) for i, cells in enumerate(chosen)]))
        for name, chosen in cell_sets(found, sizes, path.name).items()
    }
    sets |= {str(name): _point_set(name, chosen, len(nodes)) for name, chosen in found.point_sets.items()}
    return RawMesh(path.name, nodes, tuple(blocks), names, sets)


def _through_meshio(path: Path) -> Any:
    import meshio

    said = io.StringIO()
    try:
        with (
            contextlib.redirect_stdout(said),
            contextlib.redirect_stderr(said),
            warnings.catch_warnings(),
            files_end(),
        ):
            warnings.simplefilter("ignore")
            return meshio.read(path)
    except MemoryError:
        raise
    except (Exception, SystemExit) as error:  # meshio exits, and its readers raise whatever happens to them
        known = sorted(meshio.extension_to_filetypes)
        if path.suffix.lower() not in known:
            raise ModelError(
                f'mesh.file: "{path.name}" is of no known kind of mesh file '
                f"(known endings: {', '.join(known)})"
            ) from None
        reason = "" if isinstance(error, SystemExit) else str(error) or type(error).__name__
        reason = " ".join((reason or said.getvalue()).replace(str(path), path.name).split())[:200]
        raise ModelError(
            f'mesh.file: "{path.name}" cannot be read as a mesh of the kind {path.suffix}; it may be cut '
            f"short, hold no cells or be of another kind ({reason})"
        ) from None


def _coordinates(found: Any, file: str) -> Array:
    try:
        nodes = np.array(found.points, dtype=np.float64)
    except (TypeError, ValueError):
        nodes = np.zeros((0, 0))
    if nodes.ndim != 2 or nodes.shape[1] not in (2, 3) or not len(nodes):
        raise ModelError(f"mesh.file: {file} holds no nodes with two or three coordinates")
    if nodes.shape[1] == 2:
        nodes = np.column_stack([nodes, np.zeros(len(nodes))])
    bad = np.flatnonzero(~np.isfinite(nodes).all(axis=1))
    if len(bad):
        raise ModelError(
            f"mesh.file: {file}: coordinates that are no finite numbers at {listed('node', bad + 1)}"
        )
    return nodes


def _check_kinds(kinds: list[tuple[str, Any]], file: str) -> None:
    from vib.structure.cells import FAMILIES

    known = {**_LINES, **{kind: family.nodes for kind, family in FAMILIES.items()}, "vertex": 1}
    faults = []
    for kind in dict.fromkeys(kind for kind, _ in kinds):
        count = sum(len(data) for name, data in kinds if name == kind)
        if kind not in known and count:
            faults.append(f"{count} cells of the kind {kind}")
    if faults:
        raise ModelError(
            f"mesh.file: {file} holds {' and '.join(faults)}, which can't be computed; known kinds: "
            f"{', '.join(known)}"
        )
    for kind, data in kinds:
        shape = np.shape(data)
        if len(data) and (len(shape) != 2 or shape[1] != known[kind]):
            raise ModelError(f"mesh.file: {file}: cells of the kind {kind} need {known[kind]} nodes each")


def _checked(kind: str, connectivity: NDArray[Any], numbers: Numbers, count: int) -> Numbers:
    if connectivity.dtype.kind not in "iu":
        raise ModelError(f"mesh.file: the node numbers of {kind} cells are not whole numbers")
    wrong = ((connectivity < 0) | (connectivity >= count)).any(axis=1)
    if wrong.any():
        cell = int(np.argmax(wrong))
        raise ModelError(
            f"mesh.file: {listed('cell', numbers[wrong])} ({kind}) name nodes that do not exist: there are "
            f"{count}, cell {numbers[cell]} names {', '.join(str(int(n) + 1) for n in connectivity[cell])}"
        )
    twice = np.sort(connectivity, axis=1)
    twice_named = (twice[:, 1:] == twice[:, :-1]).any(axis=1)
    if twice_named.any():
        raise ModelError(f"mesh.file: {listed('cell', numbers[twice_named])} ({kind}) name a node twice")
    return connectivity.astype(np.intp)


def _point_set(name: str, chosen: Any, count: int) -> Numbers:
    try:
        numbers = np.unique(np.asarray(chosen, dtype=np.intp))
    except (TypeError, ValueError):
        numbers = np.array([-1])
    if len(numbers) and (numbers[0] < 0 or numbers[-1] >= count):
        raise ModelError(f'mesh.file: the point set "{name}" names nodes that do not exist')
    return numbers


def listed(what: str, numbers: NDArray[Any], most: int = 8) -> str:
    """ "cells 3, 7, 8 and 12 more"."""
    shown = ", ".join(str(int(number)) for number in numbers[:most])
    more = f" and {len(numbers) - most} more" if len(numbers) > most else ""
    return f"{what}{'s' if len(numbers) > 1 else ''} {shown}{more}"
