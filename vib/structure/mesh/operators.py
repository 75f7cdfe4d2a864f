"""Stiffness or mass of one region as something that multiplies, computed cell by cell when asked.

Energy shares of the regions are asked for once per answer; their matrices would need as much memory as the
matrices of the whole.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csr_array

from vib.structure.mesh.weaving import Woven
from vib.structure.sparsity import Group

_CHUNK_VALUES = 1_000_000


@dataclass(frozen=True, eq=False)
class CellOperator:
    """The stiffness or mass (n, n) of some groups of cells, for ``operator @ shapes``."""

    woven: Woven
    groups: tuple[Group, ...]
    kind: Literal["stiffness", "mass"]

    @property
    def shape(self) -> tuple[int, int]:
        """(n, n)."""
        return self.woven.size, self.woven.size

    def __matmul__(self, shapes: NDArray[Any]) -> NDArray[Any]:
        """The product with (n,) or (n, m)."""
        transform = self.woven.transform
        moved = transform @ shapes.reshape(len(shapes), -1)
        found = self.on_rows(moved)
        return np.asarray((transform.T @ found).reshape(shapes.shape))

    def on_rows(self, moved: NDArray[Any]) -> NDArray[Any]:
        """The product with motions (rows, m) of all rows of the mesh."""
        total = np.zeros_like(moved)
        for rows, matrices in self._chunks():
            forces = (matrices @ moved[rows]).reshape(rows.size, -1)
            used, place = np.unique(rows, return_inverse=True)
            summing = csr_array(
                (np.ones(rows.size), (place.ravel(), np.arange(rows.size))), shape=(len(used), rows.size)
            )
            total[used] += summing @ forces
        return total

    def matrix(self) -> csr_array:
        """The matrix itself (n, n), for who needs it and has the memory."""
        size = self.woven.transform.shape[0]
        total = csr_array((size, size))
        for rows, matrices in self._chunks():
            across = np.broadcast_to(rows[:, :, None], matrices.shape).ravel()
            along = np.broadcast_to(rows[:, None, :], matrices.shape).ravel()
            total = total + csr_array((matrices.ravel(), (across, along)), shape=(size, size))
        found = self.woven.transform.T @ total @ self.woven.transform
        return csr_array((found + found.T) / 2)

    def _chunks(self) -> Iterator[tuple[NDArray[np.intp], NDArray[np.float64]]]:
        """Rows (e, k) of a chunk of cells, and its matrices (e, k, k)."""
        pattern, nodes_m = self.woven.pattern, self.woven.model.nodes_m
        for group in self.groups:
            family = group.family
            compute = family.stiffness if self.kind == "stiffness" else family.mass
            step = max(1, _CHUNK_VALUES // (family.nodes * family.freedoms) ** 2)
            for start in range(0, len(group.connectivity), step):
                chunk = slice(start, start + step)
                matrices = compute(nodes_m[group.connectivity[chunk]], group.properties.of(chunk))
                yield pattern.freedoms(group, chunk), matrices
