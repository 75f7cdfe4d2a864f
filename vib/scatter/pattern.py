"""The matrices of a system as one vector, whose entries stand at the same place for every sample."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np
import scipy.sparse as sparse
from numpy.typing import NDArray

from vib.errors import AccuracyError
from vib.system import Anatomy, DampingLaw, Matrix, System

Array = NDArray[np.float64]
Indices = NDArray[np.intp]
# which entries of the vector change, and by how much
Change = tuple[Indices, Array]

ROUND_OFF = 1e-12  # of the largest entry of a row and column
MATRICES = ("stiffness", "mass", "damping", "gyroscopic")


@dataclass(frozen=True, eq=False)
class Pattern:
    """Where the entries of some matrices and of the damping law stand in one vector.

    ``kinds`` names the matrices: `MATRICES`, then "part 0" and so on, the stiffness of each part, where the
    damping law weighs them. ``keys`` is sorted; the key of a matrix entry is kind size^2 + row size + column,
    and the figures of the law follow behind.
    """

    size: int
    kinds: tuple[str, ...]
    keys: NDArray[np.int64]

    @classmethod
    def of(cls, systems: list[System]) -> Pattern:
        """All entries that any of these systems has."""
        kinds = tuple(_matrices(systems[0]))
        keys = np.unique(np.concatenate([_entries(system)[0] for system in systems]))
        return cls(systems[0].size, kinds, keys)

    def vector(self, system: System) -> Array:
        """The entries of a system.

        Raises
        ------
        AccuracyError
            It has an entry that none of the systems had that the pattern was made of.
        """
        keys, values = _entries(system)
        places = np.minimum(np.searchsorted(self.keys, keys), len(self.keys) - 1)
        known = self.keys[places] == keys
        if not known.all():
            # entries that cancel may be left as round-off
            size = replace(self, keys=keys).scale(values)
            if (np.abs(values[~known]) > ROUND_OFF * size[~known]).any():
                raise AccuracyError("A sample couples freedoms that were not coupled before.")
        found = np.zeros(len(self.keys))
        found[places[known]] = values[known]
        return found

    def matrix(self, kind: str, where: Indices, values: Array) -> Matrix | None:
        """The entries at ``where`` that belong to one matrix (n, n); None where there are none."""
        if kind not in self.kinds:
            return None
        keys = self.keys[where] - self.kinds.index(kind) * self.size**2
        own = (keys >= 0) & (keys < self.size**2)
        if not own.any():
            return None
        rows, columns = np.divmod(keys[own], self.size)
        return sparse.coo_array((values[own], (rows, columns)), shape=(self.size, self.size)).tocsr()

    def law(self, where: Indices, values: Array) -> Array:
        """The figures of the damping law (l,), those that are not at ``where`` zero."""
        first = int(np.searchsorted(self.keys, len(self.kinds) * self.size**2))
        found = np.zeros(len(self.keys) - first)
        own = where >= first
        found[where[own] - first] = values[own]
        return found

    def scale(self, vector: Array) -> Array:
        """The size of each entry: the geometric mean of the largest of its row and of its column."""
        kinds, places = np.divmod(self.keys, self.size**2)
        inside = kinds < len(self.kinds)
        rows, columns = np.divmod(places[inside], self.size)
        largest = np.zeros((len(self.kinds), self.size))
        np.maximum.at(largest, (kinds[inside], rows), np.abs(vector[inside]))
        found = np.abs(vector)
        found[inside] = np.sqrt(largest[kinds[inside], rows] * largest[kinds[inside], columns])
        return found


def _matrices(system: System) -> dict[str, Any]:
    found = {kind: getattr(system, kind) for kind in MATRICES}
    if system.damping_law.material and system.anatomy is not None:
        for number, part in enumerate(system.anatomy.parts):
            if part.damping_ratio is not None:
                own: Any = part.stiffness
                found[f"part {number}"] = own.matrix() if hasattr(own, "matrix") else own  # cells of a mesh
    return found


def _entries(system: System) -> tuple[NDArray[np.int64], Array]:
    keys, values = [], []
    matrices = _matrices(system)
    for number, matrix in enumerate(matrices.values()):
        if matrix is None:
            continue
        found = sparse.csr_array(matrix).tocoo()
        rows, columns = (part.astype(np.int64) for part in found.coords)
        keys.append(number * system.size**2 + rows * system.size + columns)
        values.append(found.data)
    figures = law_figures(system)
    keys.append(len(matrices) * system.size**2 + np.arange(len(figures)))
    values.append(figures)
    joined = np.concatenate(keys)
    order = np.argsort(joined, kind="stable")
    return joined[order], np.concatenate(values)[order]


def law_figures(system: System) -> Array:
    """Ratio, three figures of each band, then the ratio of each part that has one."""
    law = system.damping_law
    rows = [law.ratio, *(figure for band in law.bands for figure in band)]
    if law.material and system.anatomy is not None:
        rows += [part.damping_ratio for part in system.anatomy.parts if part.damping_ratio is not None]
    return np.array(rows, dtype=float)


def stated_law(nominal: System, pattern: Pattern, vector: Array) -> tuple[DampingLaw, Anatomy | None]:
    """The damping law of a vector, and the anatomy whose parts have their ratio and stiffness."""
    everywhere = np.arange(len(vector))
    figures = pattern.law(everywhere, vector)
    law, anatomy = nominal.damping_law, nominal.anatomy
    bands = 1 + 3 * len(law.bands)
    rows = tuple((float(a), float(b), float(c)) for a, b, c in figures[1:bands].reshape(-1, 3))
    if anatomy is not None and law.material:
        ratios = iter(figures[bands:].tolist())
        parts = []
        for number, part in enumerate(anatomy.parts):
            if part.damping_ratio is not None:
                stiffness = pattern.matrix(f"part {number}", everywhere, vector)
                part = replace(part, damping_ratio=next(ratios), stiffness=stiffness)
            parts.append(part)
        anatomy = replace(anatomy, parts=tuple(parts))
    return DampingLaw(float(figures[0]), rows, law.material), anatomy
