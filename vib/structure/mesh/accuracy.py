"""The error of the frequencies of a mesh, estimated from its modes or by a finer mesh."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from vib.errors import AccuracyError
from vib.structure.division import expected_error
from vib.structure.mesh.finer import count_of, divided, only_shells
from vib.structure.mesh.plate_errors import plate_energies
from vib.structure.mesh.solid_errors import solid_errors
from vib.structure.mesh.weaving import Woven
from vib.system import Array, Comparison, Part

if TYPE_CHECKING:
    from vib.structure.layout import Layout

MOST_COMPARED = 400_000  # freedoms of the better mesh
# Cells half as large leave a quarter of the error of smooth plates (order h^2, tests/structure/cells): the
# difference is three quarters of it. At clamped and re-entrant corners of thick plates the order falls to
# 1.4 (M. L. Williams, J. Appl. Mech. 19 (1952) 526-528) and the difference to five eighths, which are taken.
QUARTERED = 8 / 5


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
        """Shells divided in four, as far as memory and time allow; None for meshes that hold other cells.

        The errors of shells are not of one sign, as these are no pure displacement elements, so that their
        stresses overstate them severalfold.
        """
        model = self.woven.model
        if not only_shells(model) or count_of(model) > MOST_COMPARED:
            return None
        from vib.structure.assembly import assemble
        from vib.structure.build import to_system

        system = to_system(assemble(replace(self.layout, mesh=divided(model)), self.counts))
        return Comparison(system, QUARTERED, "by comparison with every cell divided in four")

    def errors(self, shapes: NDArray[Any], angular: Array) -> tuple[Array, str, tuple[str, ...]]:
        """See `vib.system.Discretisation`; what a gain in softness does is told in `solid_errors`."""
        groups = self.woven.model.groups
        words = " and ".join(
            told
            for dimension, told in (
                (3, "by what richer cells would add"),
                (2, "by the stresses of the modes"),
            )
            if any(group.family.dimension == dimension for group in groups)
        )
        found = np.zeros(len(angular))
        elastic = np.flatnonzero(angular > 0)
        if not len(elastic):
            return found, words, ()
        elastic = elastic[np.argsort(angular[elastic], kind="stable")]
        size = angular[elastic]
        real = np.ascontiguousarray(np.real(shapes[:, elastic]))
        real *= size / np.sqrt(np.maximum(self._energy(real), np.finfo(float).tiny))
        try:
            gain = self._gains(self.woven.transform @ real, size)
        except AccuracyError as problem:
            found[elastic] = size
            return (
                found,
                words,
                (f"The error of the frequencies is not known, and stands as 100 %: {problem}",),
            )
        found[elastic] = size * (1 - 1 / np.sqrt(1 + gain / size**2))
        return found, words, ()

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

    def _gains(self, moved: Array, angular: Array) -> Array:
        """By how much modes (m,) on all rows of the mesh would be softer with exact cells, (rad/s)^2."""
        model, pattern = self.woven.model, self.woven.pattern
        solids = tuple(group for group in model.groups if group.family.dimension == 3)
        shells = tuple(group for group in model.groups if group.family.dimension == 2)
        found = np.zeros(len(angular))
        if solids:
            found += solid_errors(model.nodes_m, solids, pattern, self._held(), moved, angular)
        if shells:
            found += plate_energies(model.nodes_m, shells, pattern, moved)[0]
        return found

    def _held(self) -> NDArray[np.bool_]:
        """(k, 3): translations of nodes that can't move by themselves; also what follows points or bodies."""
        first, own = self.woven.pattern.first, self.woven.own
        held = np.zeros((len(first) - 1, 3), dtype=bool)
        used = np.flatnonzero(np.diff(first))
        held[used] = ~own[3 * first[used][:, None] + np.arange(3)]
        return held

    def _energy(self, shapes: Array) -> Array:
        """Twice the strain energy of the whole in each mode (m,)."""
        found = np.einsum("ij,ij->j", shapes, self.woven.stiffness @ shapes)
        for part in self.parts:
            if part.kind != "cells" and part.stiffness is not None:
                found += np.einsum("ij,ij->j", shapes, part.stiffness @ shapes)
        return np.asarray(found)
