"""The error of the frequencies of a mesh, estimated from the stresses of the modes."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from vib.errors import AccuracyError
from vib.structure.cells.recovery import energy_errors
from vib.structure.division import expected_error
from vib.structure.mesh.finer import count_of, divided, only_first_tetrahedra, only_shells, raised
from vib.structure.mesh.operators import CellOperator
from vib.structure.mesh.plate_errors import plate_energies
from vib.structure.mesh.weaving import Woven
from vib.structure.sparsity import Group
from vib.system import Array, Comparison, Part

if TYPE_CHECKING:
    from vib.structure.layout import Layout

MOST_COMPARED = 400_000  # freedoms of the better mesh
# Cells half as large leave a quarter of the error of plates (order h^2, tests/structure/cells), so that the
# difference is three quarters of it.
QUARTERED = 4 / 3


@dataclass(frozen=True, eq=False)
class CellErrors:
    """Errors of the frequencies of a structure with cells; see `vib.system.Discretisation`."""

    layout: Layout
    counts: NDArray[np.intp]
    woven: Woven
    parts: tuple[Part, ...]

    @property
    def accuracy(self) -> float:
        """What the study asks."""
        return self.layout.study.accuracy

    def finer(self) -> Comparison | None:
        """Better cells, as far as memory and time allow; None where stresses have to do.

        The errors of shells are not of one sign, as these are no pure displacement elements, so that their
        stresses overstate them severalfold: they are divided in four. The stresses of first-order tetrahedra
        are too poor to be smoothed: they are compared with those of second order. Other solids need neither.
        """
        model = self.woven.model
        shells = only_shells(model)
        if not (shells or only_first_tetrahedra(model)) or count_of(model) > MOST_COMPARED:
            return None
        from vib.structure.assembly import assemble
        from vib.structure.build import to_system

        better = divided(model) if shells else raised(model)
        system = to_system(assemble(replace(self.layout, mesh=better), self.counts))
        if shells:
            return Comparison(system, QUARTERED, "by comparison with every cell divided in four")
        return Comparison(system, 1.0, "by comparison with cells of second order in their place")

    def errors(self, shapes: NDArray[Any], angular: Array) -> tuple[Array, tuple[str, ...]]:
        """Error of each angular frequency (m,), rad/s, and remarks.

        The energy of the error of the stresses is the error of the squared frequency (G. Strang, G. J. Fix,
        An Analysis of the Finite Element Method, 1973, section 6.3: it is of the order of the squared error
        in energy); the frequency is off by half of that share.
        """
        elastic = angular > 0
        found = np.zeros(len(angular))
        if not elastic.any():
            return found, ()
        real = np.ascontiguousarray(np.real(shapes[:, elastic]))
        share, remarks = self._share(real)
        found[elastic] = angular[elastic] * np.where(np.isfinite(share), share / 2, 1.0)
        return found, remarks

    def member_errors(self, shapes: NDArray[Any], angular: Array) -> Array:
        """Error (m,), rad/s, that the pieces of members add, by their length and share of the energy."""
        found = np.zeros(len(angular))
        members = [part for part in self.parts if part.kind == "members" and part.stiffness is not None]
        stretches = self.layout.stretches
        if not members:
            return found
        real = np.real(shapes)
        piece = stretches.bars.length / self.counts
        for mode in np.flatnonzero(angular > 0):
            shape = real[:, mode]
            held = sum(
                float(shape @ (part.stiffness @ shape)) for part in members if part.stiffness is not None
            )
            whole = max(float(shape @ (self.woven.stiffness @ shape)) + held, np.finfo(float).tiny)
            error = expected_error(stretches, piece, float(angular[mode]) / (2 * np.pi)).max()
            found[mode] = angular[mode] * min(1.0, error) * held / whole
        return found

    def _share(self, shapes: Array) -> tuple[Array, tuple[str, ...]]:
        """Share of the error in the energy of each mode (m,); infinite where it can't be told."""
        moved = self.woven.transform @ shapes
        model, pattern = self.woven.model, self.woven.pattern
        solids = tuple(group for group in model.groups if group.family.dimension == 3)
        shells = tuple(group for group in model.groups if group.family.dimension == 2)
        whole = self._energy(shapes)
        error = np.zeros(shapes.shape[1])
        try:
            if solids:
                held = whole if len(self.parts) == 1 else self._held(solids, moved)
                error += energy_errors(model.nodes_m, solids, pattern, moved) * held
        except AccuracyError as problem:
            return np.full(shapes.shape[1], np.inf), (
                f"The error of the frequencies is not known, and stands as 100 %: {problem}",
            )
        if shells:
            error += plate_energies(model.nodes_m, shells, pattern, moved)[0]
        return error / np.maximum(whole, np.finfo(float).tiny), ()

    def _energy(self, shapes: Array) -> Array:
        """Twice the strain energy of the whole in each mode (m,)."""
        found = np.einsum("ij,ij->j", shapes, self.woven.stiffness @ shapes)
        for part in self.parts:
            if part.kind != "cells" and part.stiffness is not None:
                found += np.einsum("ij,ij->j", shapes, part.stiffness @ shapes)
        return np.asarray(found)

    def _held(self, groups: tuple[Group, ...], moved: Array) -> Array:
        """Twice the strain energy (m,) that some cells hold."""
        pushed = CellOperator(self.woven, groups, "stiffness").on_rows(moved)
        return np.asarray(np.einsum("ij,ij->j", moved, pushed))
