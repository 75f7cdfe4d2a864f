"""A basis that holds the modes of every sample: nominal modes, and what modes of some samples add to them.

What is added are the principal components, in the norm of the stiffness, of modes computed in full at some
samples (proper orthogonal decomposition: L. Sirovich, Q. Appl. Math. 45 (1987) 561-571; from memory). A mode
of which the part e of the energy lies outside of the basis is too high by e / 2 of its frequency, which says
how many components are needed.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.linalg
import scipy.sparse as sparse
import scipy.sparse.linalg as sparse_linalg
from numpy.typing import NDArray

from vib.errors import AccuracyError
from vib.solve.factor import Factor, factorise
from vib.solve.undamped import Undamped
from vib.system import Array, Matrix

RANDOM_VECTORS = 48  # their mean square is within a factor of two of a norm squared, but for one in a million
MOST_VECTORS = 160


@dataclass(frozen=True, eq=False)
class Metric:
    """The norm x' (K + shift M) x of the nominal structure; ``shift`` is zero where nothing moves freely."""

    matrix: Matrix
    shift: float
    factor: Factor

    @classmethod
    def of(cls, stiffness: Matrix, mass: Matrix, nominal: Undamped) -> Metric:
        """The norm of a structure (n, n) with these modes.

        Raises
        ------
        AccuracyError
            The stiffness is not positive.
        """
        elastic = nominal.values[nominal.rigid :]
        if (elastic <= 0).any():
            raise AccuracyError("The nominal stiffness is not positive.")
        shift = float(elastic[0]) if nominal.rigid and len(elastic) else 0.0
        matrix = sparse.csr_array(stiffness + shift * mass if shift else stiffness)
        return cls(matrix, shift, factorise(matrix))

    def scaled(self, shapes: NDArray[Any]) -> NDArray[Any]:
        """Shapes (n, k) with unit energy each."""
        energy = np.einsum("ij,ij->j", shapes.conj(), self.matrix @ shapes).real
        return np.asarray(shapes / np.sqrt(np.where(energy > 0, energy, 1.0)))

    def random_vectors(self, count: int) -> Array:
        """Vectors (n, count) whose covariance is the inverse of the matrix, divided by ``count``."""
        drawn = np.random.default_rng(17).standard_normal((self.matrix.shape[0], count)) / np.sqrt(count)
        lower_upper = self.factor.lower_upper
        if self.factor.negatives != 0:
            raise AccuracyError("The nominal stiffness is not positive.")
        # scaled matrix = P' L D L' P, so that P' inv(L') inv(sqrt(D)) g has the inverse as covariance
        upper = sparse.csr_array(lower_upper.U)
        pivots = upper.diagonal()
        solved = sparse_linalg.spsolve_triangular(upper, np.sqrt(pivots)[:, None] * drawn, lower=False)
        return np.asarray(self.factor.scale[:, None] * solved[lower_upper.perm_c])


def principal(metric: Metric, mass: Matrix, nominal: Array, shapes: Array, energy: float) -> Array:
    """Nominal modes and the components that ``shapes`` (n, k) add, (n, r), orthonormal in the mass (n, n).

    As many that no shape, of unit energy or less, lacks more than ``energy``.
    """
    beside = shapes - nominal @ (nominal.T @ (mass @ shapes))
    beside -= nominal @ (nominal.T @ (mass @ beside))
    inner = beside.T @ (metric.matrix @ beside)
    values, turn = np.linalg.eigh((inner + inner.T) / 2)
    values, turn = np.maximum(values[::-1], 0.0), turn[:, ::-1]
    left = np.diag(inner) - np.cumsum(values[:, None] * turn.T**2, axis=0)
    enough = np.flatnonzero(np.append(np.diag(inner)[None], left, axis=0).max(axis=1) <= energy)
    safe = int((values > 1e-14).sum())
    kept = min(int(enough[0]) if len(enough) else safe, safe, MOST_VECTORS)
    if not kept:
        return nominal
    components = beside @ (turn[:, :kept] / np.sqrt(values[:kept]))
    components -= nominal @ (nominal.T @ (mass @ components))
    moved = components.T @ (mass @ components)
    # motions of next to no mass that only carry forces can't be scaled to unit modal mass
    floor = 1e-14 * float(np.diag(moved).max())
    weights, vectors = scipy.linalg.eigh((moved + moved.T) / 2)
    good = weights > floor
    return np.hstack([nominal, components @ (vectors[:, good] / np.sqrt(weights[good]))])
