"""Shapes as a file for any viewer: VTU, an open standard, written by meshio."""

from __future__ import annotations

import contextlib
import io
import tempfile
from itertools import pairwise
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

if TYPE_CHECKING:
    from vib.modes import Modes
    from vib.system import Anatomy


def vtu_bytes(modes: Modes) -> bytes:
    """Nodes, cells and members with the displacement of each mode at each node, compressed binary.

    Point data ``mode 1, 12.34 Hz`` (k, 3), m at unit modal mass; of a complex shape also the part that comes
    a quarter of a cycle later. Cell data ``part`` counts the parts from 1, in the order of the energy shares
    of modes.json.
    """
    import meshio

    anatomy = modes.system.anatomy
    assert anatomy is not None
    places, motion, cells, parts = _everything(anatomy)
    data: dict[str, Any] = {}
    moved = np.asarray(motion @ modes.shapes).reshape(len(places), 3, -1)
    for index in range(modes.count):
        name = f"mode {index + 1}, {modes.frequencies_hz[index]:.6g} Hz"
        data[name] = np.ascontiguousarray(moved[:, :, index].real)
        if np.iscomplexobj(moved):
            data[f"{name}, a quarter cycle later"] = np.ascontiguousarray(moved[:, :, index].imag)
    mesh = meshio.Mesh(places, cells, point_data=data, cell_data={"part": parts})
    with tempfile.TemporaryDirectory() as folder, contextlib.redirect_stdout(io.StringIO()):
        target = Path(folder) / "shapes.vtu"
        mesh.write(target)
        return target.read_bytes()


def _everything(anatomy: Anatomy) -> tuple[Any, Any, list[tuple[str, Any]], list[Any]]:
    """Nodes, how they move, cells, and the number of the part of each; lines of the frame last."""
    import scipy.sparse as sparse

    number = {part.name: i + 1 for i, part in enumerate(anatomy.parts)}
    wireframe, mesh = anatomy.wireframe, anatomy.mesh
    cells: list[tuple[str, Any]] = []
    parts = []
    places, motion, before = wireframe.nodes_m, wireframe.motion, 0
    if mesh is not None:
        before = len(mesh.nodes_m)
        frame = max((max(nodes) + 1 for _, nodes in wireframe.lines), default=0)
        places = np.concatenate([mesh.nodes_m, wireframe.nodes_m[:frame]])
        motion = sparse.vstack([mesh.motion, wireframe.motion[: 3 * frame]], format="csr")
        for kind, part, connectivity in mesh.cells:
            cells.append((kind, connectivity))
            parts.append(np.full(len(connectivity), number.get(part, 0)))
    lines = [
        (before + a, before + b, number.get(part, 0))
        for part, nodes in wireframe.lines
        for a, b in pairwise(nodes)
    ]
    if lines:
        listed = np.array(lines)
        cells.append(("line", listed[:, :2]))
        parts.append(listed[:, 2])
    return places, motion, cells, parts
