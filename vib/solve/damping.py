"""Damping in the undamped modes: the stated ratios, and whether the matrices leave the shapes as they are."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import scipy.linalg
import scipy.sparse as sparse
from numpy.typing import NDArray

from vib.checks import entries
from vib.massless import acts_on, root_scale, split_mass
from vib.solve.undamped import EPS, Array, Matrix, Undamped
from vib.system import DampingLaw, System

# Off-diagonal modal damping below this part of the diagonal changes an eigenvalue by its square.
COUPLED = 1e-9


@dataclass(frozen=True, eq=False)
class ModalDamping:
    """Damping seen by the undamped modes.

    ``undamped`` has its shapes turned within equal frequencies so that damping couples them least;
    ``rates`` (m,) are x' C x of the damping matrix for unit modal mass, 1/s, exactly 0 where they are
    round-off; ``law`` (m,) the ratios stated by the damping law; ``proportional`` whether the shapes stay
    as they are; ``rayleigh`` is (a, b) where the matrix is a M + b K, else None; ``law_limit`` is a ratio
    that the law exceeds in no mode, computed or not.
    """

    undamped: Undamped
    rates: Array
    law: Array
    proportional: bool
    rayleigh: tuple[float, float] | None
    law_limit: float

    @property
    def total(self) -> Array:
        """Damping rate of each mode (m,) with both kinds together, 1/s."""
        return np.asarray(self.rates + 2 * self.law * self.undamped.angular)


def law_ratios(system: System, undamped: Undamped) -> Array:
    """Ratio of each undamped mode (m,) by the system's damping law; 0 for rigid-body and unstable modes."""
    frequencies = np.where(undamped.values > 0, undamped.angular / (2 * np.pi), 0.0)
    return system.damping_law.ratios(system, frequencies, undamped.shapes)


def modal_damping(system: System, undamped: Undamped) -> ModalDamping:
    """How the damping matrix and the damping law of a system act on its undamped modes.

    The matrix is proportional where it is a M + b K entry by entry, or where every mode found is also an
    eigenvector of it in the inner product of the mass (T. K. Caughey, M. E. J. O'Kelly, J. Appl. Mech. 32
    (1965) 583-588); shapes of equal frequency are first turned among themselves.
    """
    law = law_ratios(system, undamped)
    matrix = system.damping
    if matrix is None or not abs(matrix).max():
        return ModalDamping(undamped, np.zeros(len(law)), law, True, (0.0, 0.0), _law_limit(system))
    parts = rayleigh_parts(system.mass, matrix, system.stiffness)
    if parts is not None:
        rates = parts[0] + parts[1] * undamped.values
        return ModalDamping(undamped, rates, law, True, parts, _law_limit(system))
    turned = _turned(undamped, matrix)
    shapes = turned.shapes
    acted = matrix @ shapes
    rates = np.einsum("ij,ij->j", shapes, acted)
    terms = np.einsum("ij,ij->j", np.abs(shapes), abs(matrix) @ np.abs(shapes))
    rates = np.where(np.abs(rates) <= 256 * EPS * terms, 0.0, rates)
    if turned.complete:
        # A dashpot on a motion without mass brings a first-order lag, which no undamped shape has.
        lags = shapes.shape[1] < shapes.shape[0] and acts_on(matrix, split_mass(system.mass).massless)
        coupled = lags or _couples(shapes.T @ acted, np.abs(shapes).T @ (abs(matrix) @ np.abs(shapes)))
    else:
        coupled = _leaves(system, matrix, turned, acted, rates)
    return ModalDamping(turned, rates, law_ratios(system, turned), not coupled, None, _law_limit(system))


def _law_limit(system: System) -> float:
    law = system.damping_law
    limit = law.ratio + sum(ratio for _, _, ratio in law.bands)
    if law.material and system.anatomy is not None:
        limit += max((part.damping_ratio or 0.0 for part in system.anatomy.parts), default=0.0)
    return limit


def feeding_reach(law: DampingLaw) -> float:
    """Angular frequency up to which a damping law feeds energy into modes, infinite where it does in all."""
    if law.ratio < 0:
        return float("inf")
    return 2 * np.pi * max((high for _, high, ratio in law.bands if ratio < 0), default=0.0)


def rayleigh_parts(mass: Matrix, damping: Matrix, stiffness: Matrix) -> tuple[float, float] | None:
    """(a, b) where damping = a mass + b stiffness in every entry to round-off, else None."""
    if _filled(damping) < min(_filled(mass), _filled(stiffness)) / 2:
        return None  # has too few entries for that
    scale = root_scale(np.asarray(stiffness.diagonal()))
    scale = np.where(np.asarray(stiffness.diagonal()) != 0, scale, root_scale(np.asarray(mass.diagonal())))
    pattern = abs(mass) + abs(stiffness) + abs(damping)
    rows, columns, _ = entries(pattern)
    weight = scale[rows] * scale[columns]
    known = np.column_stack([_at(mass, rows, columns) * weight, _at(stiffness, rows, columns) * weight])
    sizes = np.abs(known).max(axis=0)
    if not sizes.all():
        return None
    found, _, rank, _ = scipy.linalg.lstsq(known / sizes, _at(damping, rows, columns) * weight)
    if rank < 2:
        return None
    mass_part, stiffness_part = (found / sizes).tolist()
    rest = abs(damping - mass_part * mass - stiffness_part * stiffness)
    allowed = 1e-11 * (abs(damping) + abs(mass_part) * abs(mass) + abs(stiffness_part) * abs(stiffness))
    return (float(mass_part), float(stiffness_part)) if (rest - allowed).max() <= 0 else None


def _filled(matrix: Matrix) -> int:
    return int(matrix.count_nonzero() if sparse.issparse(matrix) else np.count_nonzero(matrix))


def _turned(undamped: Undamped, damping: Matrix) -> Undamped:
    """Shapes of equal frequency turned so that the damping does not couple them."""
    angular, errors, shapes = undamped.angular, undamped.errors, undamped.shapes.copy()
    values = undamped.values.copy()
    signed = np.copysign(angular, values)  # what grows at the rate at which another swings is not equal to it
    start = 0
    for stop in range(1, len(angular) + 1):
        if stop < len(angular):
            slack = 4 * (errors[stop] + errors[stop - 1]) + 1e-12 * angular[stop]
            if abs(signed[stop] - signed[stop - 1]) <= slack and stop != undamped.rigid:
                continue
        if stop - start > 1:
            block = shapes[:, start:stop]
            inner = block.T @ (damping @ block)
            _, turn = scipy.linalg.eigh((inner + inner.T) / 2)
            shapes[:, start:stop] = block @ turn
            values[start:stop] = np.einsum("i,ij->j", values[start:stop], turn**2)
        start = stop
    return replace(undamped, values=values, shapes=shapes)


def _couples(modal: Array, terms: Array) -> bool:
    """Whether a full modal damping matrix has more than round-off beside its diagonal."""
    diagonal = np.sqrt(np.abs(np.diag(modal)))
    allowed = COUPLED * np.outer(diagonal, diagonal) + 256 * EPS * terms
    beside = np.abs(modal) > allowed
    np.fill_diagonal(beside, val=False)
    return bool(beside.any())


def _leaves(system: System, matrix: Matrix, undamped: Undamped, acted: Array, rates: Array) -> bool:
    """Whether damping turns any of the shapes found into something else (for an incomplete set)."""
    shapes = undamped.shapes
    rest = np.abs(acted - (system.mass @ shapes) * rates)
    terms = abs(matrix) @ np.abs(shapes) + abs(system.mass) @ np.abs(shapes) * np.abs(rates)
    weight = root_scale(np.asarray(system.stiffness.diagonal()))[:, None]
    rest, terms = rest * weight, terms * weight
    felt = terms > 1e-9 * terms.max(axis=0)
    return bool((rest[felt] > 1e-8 * terms[felt]).any())


def _at(matrix: Matrix, rows: NDArray[np.int64], columns: NDArray[np.int64]) -> Array:
    return np.asarray(matrix[rows, columns], dtype=np.float64).ravel()
