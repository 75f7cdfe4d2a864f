"""What a mesh adds to the system of a structure."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import scipy.sparse as sparse

from vib.structure.mesh.accuracy import CellErrors
from vib.structure.mesh.operators import CellOperator
from vib.structure.mesh.skin import outer_faces
from vib.structure.mesh.weaving import Woven
from vib.system import Array, Matrix, MeshView, Part

if TYPE_CHECKING:
    from vib.structure.assembly import Assembly


def enlarged(matrix: Matrix, size: int) -> Matrix:
    """A matrix of the first freedoms as one of all."""
    more = np.full(size - matrix.shape[0], matrix.indptr[-1])
    return sparse.csr_array(
        (matrix.data, matrix.indices, np.concatenate([matrix.indptr, more])), shape=(size, size)
    )


def summed(cells: Matrix, frame: Matrix) -> Matrix:
    """The share of the cells (n, n) with that of the frame (f, f)."""
    return cells if not frame.nnz else sparse.csr_array(cells + enlarged(frame, cells.shape[0]))


def parts(assembly: Assembly, woven: Woven, frame: tuple[Part, ...]) -> tuple[Part, ...]:
    """The parts of the frame on all freedoms, and those of the mesh."""
    found = []
    for part in frame:
        stiffness, mass = (
            None if matrix is None else enlarged(matrix, woven.size) for matrix in (part.stiffness, part.mass)
        )
        found.append(Part(part.name, part.kind, stiffness, mass, part.damping_ratio))
    names = assembly.names[len(frame) :]
    alone = len(names) == 1 and not found
    for name, (region, ratio) in zip(names, woven.model.ratios.items(), strict=True):
        groups = woven.model.groups_of(region)
        # a single region is all there is, and its matrices are those of the whole
        stiffness, mass = (
            (woven.stiffness, woven.mass)
            if alone
            else (CellOperator(woven, groups, "stiffness"), CellOperator(woven, groups, "mass"))
        )
        found.append(Part(name, "cells", stiffness, mass, ratio))
    return tuple(found)


def carried(woven: Woven, frame: Array, cells: Array) -> Array:
    """Forces (n, ...) on all freedoms, from those on the freedoms of the frame and on rows of the mesh."""
    found: Array = woven.transform.T @ cells
    found[: len(frame)] += frame
    return found


def view(woven: Woven) -> MeshView:
    """The mesh to look at."""
    model = woven.model
    return MeshView(
        nodes_m=model.nodes_m,
        motion=woven.translations,
        cells=tuple(
            (group.family.kind, part, group.connectivity)
            for group, part in zip(model.groups, model.part, strict=True)
        ),
        faces=tuple(outer_faces(model.nodes_m, model.groups, model.part)),
        used=np.flatnonzero(np.diff(woven.pattern.first)),
    )


def discretisation(assembly: Assembly, woven: Woven, everything: tuple[Part, ...]) -> CellErrors:
    """How far the frequencies are off because of the size of the cells and pieces."""
    return CellErrors(assembly.layout, assembly.counts, woven, everything)
