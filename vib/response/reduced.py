"""A ring model of few states for a large system, and how much its cutting short matters.

The lowest undamped modes span the slow motion; static corrections for the loads, the outputs, the dashpots,
the first motion after a blow and a given initial state stand for all modes above (the mode acceleration idea;
R. R. Craig, "Structural Dynamics", mode-displacement and mode-acceleration methods, chapter from memory).
What is left out is estimated by the difference to a basis of half as many modes.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import scipy.linalg
import scipy.sparse as sparse

from vib.modes import find_modes
from vib.response.every_mode import every_mode
from vib.response.exponential import Array
from vib.response.first_order import RingModel, modal_model
from vib.solve.factor import SingularFactorError, factorise
from vib.solve.lanczos import lowest_modes
from vib.solve.search import LARGE
from vib.solve.static import static_solver
from vib.solve.undamped import Undamped, elastic_ratio, stores_nothing
from vib.system import Matrix, System

MOST_DASHPOT_COLUMNS = 60  # beyond these the damping is taken as spread out, where modes alone serve well
ALL_AT_ONCE = 800  # freedoms up to which all modes cost less than the lowest ones several times
_DEPENDENT = 1e-10  # directions left with less than this share of their mass add nothing


class LowestModes:
    """The lowest undamped modes of symmetric matrices, as many as are asked for."""

    def __init__(self, system: System) -> None:
        self.system = system

    def __call__(self, count: int) -> Undamped:
        """The lowest ``count`` modes.

        Raises
        ------
        AccuracyError
            The solver did not finish.
        """
        system = self.system
        if system.size <= ALL_AT_ONCE or not sparse.issparse(system.stiffness) or 4 * count > system.size:
            return every_mode(system).first(count)
        if system.size >= LARGE:
            return lowest_modes(system.mass, system.stiffness, count=count)
        modes = find_modes(System(mass=system.mass, stiffness=system.stiffness), count=count)
        squares = (2 * np.pi * modes.frequencies_hz) ** 2
        return Undamped(
            # a growing mode of negative stiffness is real and stands alone
            values=np.where(modes.eigenvalues.real > 0, -squares, squares),
            shapes=np.asarray(modes.shapes.real),
            errors=2 * np.pi * modes.errors_hz,
            rigid=modes.rigid_body_count,
            complete=False,
        )


def corrections(system: System, modes: Undamped, vectors: Array) -> Array:
    """Static answers (n, c) to forces ``vectors`` (n, c), and to the forces of localised dashpots.

    For a free system the answer to the force and a small inertia: with the rigid-body modes beside it, that
    spans the same.
    """
    forces = [vectors]
    for matrix in (system.damping, system.gyroscopic):
        if matrix is not None:
            forces.append(_acting(matrix))
    together = np.hstack(forces)
    if not together.shape[1]:
        return together
    stiffness = system.stiffness
    if modes.rigid:
        elastic = modes.values[modes.rigid :]
        stiffness = stiffness + (float(elastic[0]) if elastic.size else 1.0) * system.mass
    return solved(stiffness, together)


def first_motion(system: System, force: Array) -> Array:
    """The acceleration (n, 1) a force starts with, M^-1 force; no column where the mass is singular."""
    try:
        if system.size >= LARGE and sparse.issparse(system.mass):
            return _by_mass(system.mass, force)[:, None]
        return factorise(system.mass).solve(force)[:, None]
    except SingularFactorError:
        return np.zeros((system.size, 0))


def _by_mass(mass: Matrix, force: Array) -> Array:
    """The acceleration of a large mass by conjugate gradients.

    Scaled to a diagonal of ones, consistent masses have condition numbers of some tens (A. J. Wathen, IMA J.
    Numer. Anal. 7 (1987) 449-457), so that a few dozen steps do.

    Raises
    ------
    SingularFactorError
        A freedom has no mass, or the steps do not converge.
    """
    from scipy.sparse.linalg import cg

    diagonal = np.asarray(mass.diagonal())
    if (diagonal <= 0).any():
        raise SingularFactorError("A freedom has no mass.")
    found, failed = cg(mass, force, rtol=1e-12, maxiter=1000, M=sparse.diags_array(1 / diagonal))
    if failed:
        raise SingularFactorError("The mass matrix is singular to working precision.")
    return np.asarray(found)


def solved(matrix: Matrix, right: Array) -> Array:
    """Solutions by the factorisation that suits the size.

    Raises
    ------
    SingularFactorError
        No inverse to working precision.
    """
    if matrix.shape[0] < LARGE or not sparse.issparse(matrix):
        return factorise(matrix).solve(right)
    solve = static_solver(matrix)
    if solve is None:
        raise SingularFactorError("A matrix is singular to working precision and could not be factored.")
    return solve(right)


def reduced_model(system: System, modes: Undamped, extra: Array) -> RingModel:
    """The model of the lowest ``modes`` and the directions ``extra`` (n, c)."""
    shapes = modes.shapes
    rest = extra
    for _ in range(2):  # twice is enough to make it orthogonal to rounding
        rest = rest - shapes @ (shapes.T @ (system.mass @ rest))
    rest = _orthonormal(system.mass, rest, system.mass @ extra, extra)
    # the modes are eigenvectors, so nothing couples them to what is orthogonal to them
    values, turn = scipy.linalg.eigh(_symmetric(rest.T @ (system.stiffness @ rest)))
    added = rest @ turn
    still = stores_nothing(*elastic_ratio(system.stiffness, added)) if added.shape[1] else np.zeros(0, bool)
    squares = np.concatenate([modes.values, np.where(still, 0.0, values)])
    order = np.lexsort((squares, squares != 0))
    whole = replace(
        modes,
        values=squares[order],
        shapes=np.hstack([shapes, added])[:, order],
        errors=np.concatenate([modes.errors, np.zeros(len(values))])[order],
        rigid=int((squares == 0).sum()),
        complete=True,  # of the reduced problem, which is what its damping is judged by
    )
    return modal_model(system, whole)


def _acting(matrix: Matrix) -> Array:
    """The different columns of a localised damping matrix, (n, c); none where it is spread out."""
    columns = np.flatnonzero(np.asarray(abs(matrix).sum(axis=0)).ravel())
    if len(columns) > MOST_DASHPOT_COLUMNS:
        return np.zeros((matrix.shape[0], 0))
    chosen = matrix[:, columns]
    return np.asarray(chosen.toarray() if sparse.issparse(chosen) else chosen, dtype=np.float64)


def _orthonormal(mass: Matrix, rest: Array, mass_extra: Array, extra: Array) -> Array:
    """Columns (n, r) of unit mass, orthogonal in it, spanning ``rest``, without what is only rounding."""
    size = np.einsum("ij,ij->j", extra, mass_extra)
    scale = np.where(size > 0, 1 / np.sqrt(np.where(size > 0, size, 1.0)), 0.0)
    scaled = rest * scale
    gram = _symmetric(scaled.T @ (mass @ scaled))
    values, vectors = scipy.linalg.eigh(gram)
    kept = values > _DEPENDENT * max(1.0, float(values.max(initial=0.0)))
    basis = scaled @ (vectors[:, kept] / np.sqrt(values[kept]))
    again = _symmetric(basis.T @ (mass @ basis))
    lower = np.linalg.cholesky(again) if again.size else again
    found: Array = scipy.linalg.solve_triangular(lower, basis.T, lower=True).T if again.size else basis
    return found


def _symmetric(matrix: Array) -> Array:
    return (matrix + matrix.T) / 2
