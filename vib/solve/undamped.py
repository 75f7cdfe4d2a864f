"""What every undamped solver returns, and the physical test for a rigid-body mode."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Matrix = Any
EPS = float(np.finfo(float).eps)

# A mode whose elastic energy is below this many units of round-off of the terms that cancel in it stores
# none. Entries assembled from a few dozen rounded contributions are wrong by some tens of units; 256 leaves
# a margin.
CANCELLATION = 256.0


@dataclass(frozen=True, eq=False)
class Undamped:
    """Solutions of stiffness x = value mass x, ascending, rigid-body modes first.

    ``values`` (m,) are squares of angular frequencies, exactly 0 for rigid-body modes; ``shapes`` (n, m)
    have unit modal mass; ``errors`` (m,) bound the error of each angular frequency, rad/s, which for
    rigid-body modes is what round-off may hide; ``rigid`` counts the rigid-body modes; ``complete`` tells
    that these are all finite ones; ``certified`` is an angular frequency below which none is missing, None
    if that was not shown; ``seconds`` is the time spent in factorisations and solves, where it was measured.
    """

    values: Array
    shapes: Array
    errors: Array
    rigid: int
    complete: bool
    certified: float | None = None
    seconds: float = 0.0

    @property
    def angular(self) -> Array:
        """Angular frequencies sqrt(abs(value)) (m,), rad/s."""
        return np.sqrt(np.abs(self.values))

    def first(self, count: int) -> Undamped:
        """The lowest ``count`` modes only."""
        if count >= len(self.values):
            return self
        reach = max(0.0, float(self.angular[count] - self.errors[count]))
        known = self.complete or self.certified is not None
        limit = reach if self.certified is None else min(self.certified, reach)
        return Undamped(
            values=self.values[:count],
            shapes=self.shapes[:, :count],
            errors=self.errors[:count],
            rigid=min(self.rigid, count),
            complete=False,
            certified=limit if known else None,
        )


def elastic_ratio(stiffness: Matrix, shapes: Array) -> tuple[Array, Array]:
    """Elastic energy x' K x (m,) of each shape and the magnitude of the terms that cancel, |x|' |K| |x|."""
    energy = np.einsum("ij,ij->j", shapes, stiffness @ shapes)
    terms = np.einsum("ij,ij->j", np.abs(shapes), abs(stiffness) @ np.abs(shapes))
    return energy, terms


def stores_nothing(energy: Array, terms: Array) -> NDArray[np.bool_]:
    """Whether each shape is a rigid-body motion: no elastic energy beyond cancellation round-off.

    The test is dimensionless and does not change when freedoms are scaled or units change.
    """
    return np.asarray(np.abs(energy) <= CANCELLATION * EPS * terms)


def with_hidden(
    errors: Array, rigid: NDArray[np.bool_], energy: Array, terms: Array, angular: Array
) -> Array:
    """Error of each angular frequency (m,) with what was set aside as no energy, for unit modal mass.

    Where soft and stiff parts are many decades apart, the entries of the matrices themselves no longer hold
    the soft ones. A rigid-body mode is then only known to the energy found and its round-off, and taking
    them as nothing shifts the squares of the others by as much (H. Weyl, Math. Ann. 71 (1912) 441-479).
    """
    if not rigid.any():
        return errors
    square = float((np.abs(energy) + 4 * EPS * terms)[rigid].max())  # these modes mix freely: one for all
    safe = np.where(angular > 0, angular, np.inf)
    return np.where(rigid, np.sqrt(square), errors + square / (2 * safe))


def round_off(stiffness_terms: Array, mass_terms: Array, angular: Array) -> Array:
    """Error of each angular frequency (m,) if every entry of both matrices is off by a few round-off units.

    First-order perturbation with shapes of unit modal mass: d(w^2) = x'(dK - w^2 dM)x.
    """
    safe = np.where(angular > 0, angular, 1.0)
    change = 4 * EPS * (stiffness_terms + angular**2 * mass_terms) / (2 * safe)
    return np.where(angular > 0, np.minimum(change, np.sqrt(4 * EPS * stiffness_terms)), 0.0)
