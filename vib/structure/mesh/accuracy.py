"""The error of the frequencies of a mesh, estimated from the stresses of the modes."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from vib.errors import AccuracyError
from vib.structure.cells.recovery import energy_errors
from vib.structure.mesh.weaving import Woven
from vib.system import Array, Part

if TYPE_CHECKING:
    from vib.structure.layout import Layout


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
        share, unknown = self._share(real)
        found[elastic] = angular[elastic] * np.where(np.isfinite(share), share / 2, 1.0)
        return found, (*self._remarks(found, angular, elastic), *unknown)

    def _share(self, shapes: Array) -> tuple[Array, tuple[str, ...]]:
        """Share of the error in the energy of each mode (m,)."""
        moved = self.woven.transform @ shapes
        model = self.woven.model
        groups = model.groups
        try:
            share = energy_errors(model.nodes_m, groups, self.woven.pattern, moved)
        except AccuracyError as error:
            return np.full(shapes.shape[1], np.inf), (
                f"The error of the frequencies is not known, and stands as 100 %: {error}",
            )
        return share, ()

    def _remarks(self, errors: Array, angular: Array, elastic: NDArray[np.bool_]) -> tuple[str, ...]:
        relative = errors[elastic] / angular[elastic]
        worst = float(relative.max())
        told = f"by the stresses of the modes, their frequencies are within {100 * worst:.2g} %"
        if worst <= self.accuracy:
            return (f"The mesh is used as it is ({self.woven.size} freedoms); {told}.",)
        beyond = int((relative > self.accuracy).sum())
        return (
            f"The mesh is too coarse for {beyond} of {len(relative)} modes to be within "
            f"{100 * self.accuracy:.2g} %: their error bars reach {100 * worst:.2g} %. A mesh is not refined by "
            "itself; use smaller cells, or cells of second order.",
        )
