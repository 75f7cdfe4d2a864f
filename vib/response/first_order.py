"""The first-order model that rings: x' = A x + B f with the freedoms as outputs.

Symmetric systems are written in the coordinates of their undamped modes (all of them for a small system,
the lowest with static corrections for a large one, see `reduced`). There rigid-body motion is exactly
free, proportional damping uncouples exactly and the matrix is well scaled. Unsymmetric stiffness and
massless freedoms with dashpots go the direct way.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.linalg

from vib.errors import MatrixError, ModelError
from vib.response.transition import EPS, Array
from vib.system import DampingLaw, Matrix, System


@dataclass(frozen=True, eq=False)
class FirstOrder:
    """x' = A x + load f and q = shape x + direct f, for forces f (n,) on the freedoms q (n,).

    ``matrix`` A (s, s); ``shape`` (n, s); ``load`` (s, n); ``direct`` (n, n), the flexibility of massless
    freedoms, or None; ``from_displacement`` and ``from_velocity`` (s, n) make x of q and q'.
    ``squares`` (m,) are the undamped frequencies squared, (rad/s)^2, negative where the stiffness is; the
    first ``rigid`` of them are exactly 0; empty if the model is not in modal coordinates.
    ``complete`` is False for a model with fewer states than the system.
    """

    system: System
    matrix: Array
    shape: Array
    load: Array
    direct: Array | None
    from_displacement: Array
    from_velocity: Array
    squares: Array
    rigid: int
    complete: bool = True

    def static(self, force: Array, name: str) -> Array:
        """The displacement (n,) at rest under a constant force (n,) on the freedoms.

        Raises
        ------
        ModelError
            The force would move the system away: nothing holds it in that direction.
        """
        if not self.squares.size:
            return _direct_static(self.system, force, name)
        m = self.squares.size
        modal = self.load[m:] @ force
        scale = np.abs(self.load[m : m + self.rigid]) @ np.abs(force)
        if np.any(np.abs(modal[: self.rigid]) > 1e-9 * scale):
            raise ModelError(_nothing_holds(name))
        modal[: self.rigid] = 0.0
        found: Array = self.shape[:, self.rigid : m] @ (modal[self.rigid :] / self.squares[self.rigid :])
        return found if self.direct is None else found + self.direct @ force


def full_model(system: System) -> FirstOrder:
    """The complete first-order model of a system of moderate size (dense arithmetic).

    Raises
    ------
    MatrixError
        The mass matrix is indefinite, or massless freedoms are not held by any stiffness.
    """
    mass, stiffness, damping = dense(system.mass), dense(system.stiffness), damping_matrix(system)
    massive, dashed, static = _mass_spaces(mass, damping)
    if system.unsymmetric or dashed.shape[1]:
        return _direct_model(system, mass, stiffness, damping, (massive, dashed, static))
    condensed, flexibility = _condense(stiffness, massive, static)
    return modal_model(system, condensed, flexibility)


def modal_model(
    system: System, basis: Array, direct: Array | None = None, *, complete: bool = True
) -> FirstOrder:
    """The model in the undamped modes of the system held to the columns of ``basis`` (n, m)."""
    squares, shapes, rigid = undamped(system, basis)
    m = len(squares)
    damping = _modal_damping(system, shapes, np.sqrt(np.maximum(squares, 0.0)))
    zero = np.zeros((m, m))
    dual = (system.mass @ shapes).T
    nothing = np.zeros_like(dual)
    return FirstOrder(
        system=system,
        matrix=np.block([[zero, np.eye(m)], [-np.diag(squares), -damping]]),
        shape=np.hstack([shapes, np.zeros_like(shapes)]),
        load=np.vstack([nothing, shapes.T]),
        direct=direct,
        from_displacement=np.vstack([dual, nothing]),
        from_velocity=np.vstack([nothing, dual]),
        squares=squares,
        rigid=rigid,
        complete=complete,
    )


def undamped(system: System, basis: Array) -> tuple[Array, Array, int]:
    """Undamped frequencies squared (m,), shapes (n, m) of unit modal mass, and how many are rigid-body modes.

    A mode is rigid where its stiffness phi' K phi is lost in the rounding of its own terms |phi|' |K| |phi|:
    no matrix of this precision can tell it from zero.
    """
    mass, stiffness = basis.T @ (system.mass @ basis), basis.T @ (system.stiffness @ basis)
    _, coordinates = scipy.linalg.eigh(_symmetric(stiffness), _symmetric(mass))
    shapes = basis @ coordinates
    shapes /= np.sqrt(np.einsum("ij,ij->j", shapes, system.mass @ shapes))
    squares = np.einsum("ij,ij->j", shapes, system.stiffness @ shapes)
    rounding = np.einsum("ij,ij->j", np.abs(shapes), abs(system.stiffness) @ np.abs(shapes))
    zero = np.abs(squares) <= 8 * EPS * max(16, len(squares)) * rounding
    order = np.lexsort((squares, ~zero))
    return np.where(zero, 0.0, squares)[order], np.ascontiguousarray(shapes[:, order]), int(zero.sum())


def damping_matrix(system: System) -> Array:
    """Damping plus gyroscopic matrix, dense; the damping law is not in it."""
    total = np.zeros((system.size, system.size))
    for part in (system.damping, system.gyroscopic):
        total = total if part is None else total + dense(part)
    return total


def dense(matrix: Matrix) -> Array:
    """A float64 array of a dense or sparse matrix."""
    return np.asarray(matrix.toarray() if hasattr(matrix, "toarray") else matrix, dtype=np.float64)


def law_ratios(system: System, shapes: Array, frequencies: Array) -> Array:
    """Damping ratio (m,) that the system's damping law gives each undamped mode; 0 for rigid-body modes."""
    law = system.damping_law
    ratios = np.full(len(frequencies), law.ratio)
    hertz = frequencies / (2 * np.pi)
    for low, high, ratio in law.bands:
        ratios[(hertz >= low) & (hertz <= high)] += ratio
    if law.material and system.anatomy is not None:
        energy = np.maximum(np.einsum("ij,ij->j", shapes, system.stiffness @ shapes), np.finfo(float).tiny)
        for part in system.anatomy.parts:
            if part.damping_ratio and part.stiffness is not None:
                own = np.einsum("ij,ij->j", shapes, part.stiffness @ shapes)
                ratios += part.damping_ratio * own / energy
    ratios[frequencies == 0] = 0.0
    return ratios


def _modal_damping(system: System, shapes: Array, frequencies: Array) -> Array:
    """Phi' (C + G) Phi plus the law, with what is only rounding set to zero."""
    m = len(frequencies)
    total = np.diag(2 * law_ratios(system, shapes, frequencies) * frequencies)
    for matrix in (system.damping, system.gyroscopic):
        if matrix is None:
            continue
        modal = shapes.T @ (matrix @ shapes)
        # each entry is a sum of terms of this size, so it can't be known better; shapes carry the error of
        # their own computation, hence the factor
        size = np.abs(shapes).T @ (abs(matrix) @ np.abs(shapes))
        total += np.where(np.abs(modal) > 64 * EPS * max(16, m) * size, modal, 0.0)
    return total


def _symmetric(matrix: Array) -> Array:
    return (matrix + matrix.T) / 2


def _mass_spaces(mass: Array, damping: Array) -> tuple[Array, Array, Array]:
    """Bases of what has mass, of what has only dashpots, and of what has neither."""
    diagonal = np.diag(mass).copy()
    scale = 1 / np.sqrt(np.where(diagonal > 0, diagonal, 1.0))
    values, vectors = np.linalg.eigh(mass * np.outer(scale, scale))
    if values[0] < -16 * EPS * len(values):
        raise MatrixError(
            "mass: it is indefinite (a motion has negative mass); check the signs of its entries"
        )
    heavy = values > 16 * EPS * len(values)
    massive, massless = scale[:, None] * vectors[:, heavy], scale[:, None] * vectors[:, ~heavy]
    if not massless.shape[1]:
        return massive, massless, massless
    massless = np.linalg.qr(massless)[0]
    _, lengths, right = np.linalg.svd(massless.T @ damping @ massless)
    dashed = lengths > 16 * EPS * len(values) * max(np.abs(damping).max(), np.finfo(float).tiny)
    static = massless @ right[~dashed].T
    size = np.abs(damping).max()
    if (
        static.shape[1]
        and max(np.abs(damping @ static).max(), np.abs(static.T @ damping).max()) > 1e-10 * size
    ):
        raise MatrixError(
            "damping: massless freedoms are coupled by it without being damped themselves; give them a mass"
        )
    return massive, massless @ right[dashed].T, static


def _condense(stiffness: Array, kept: Array, static: Array) -> tuple[Array, Array | None]:
    """Kept motions with the massless freedoms following statically, and their own flexibility (n, n)."""
    if not static.shape[1]:
        return kept, None
    inverse = _massless_flexibility(stiffness, static)
    return kept - static @ (inverse @ (static.T @ (stiffness @ kept))), static @ inverse @ static.T


def _massless_flexibility(stiffness: Array, static: Array) -> Array:
    own = static.T @ stiffness @ static
    if np.linalg.cond(own) > 1e13:
        raise MatrixError(
            "stiffness: a freedom without mass is not held by any stiffness; give it a mass, or remove it"
        )
    return np.asarray(np.linalg.inv(own))


def _direct_model(
    system: System, mass: Array, stiffness: Array, damping: Array, spaces: tuple[Array, Array, Array]
) -> FirstOrder:
    """States: coordinates of the massive motions, their velocities, and the dashed massless motions."""
    if system.damping_law != DampingLaw():
        raise MatrixError(
            "damping: a ratio per mode needs symmetric stiffness and no dashpots at massless freedoms; "
            "give the damping as a matrix"
        )
    massive, dashed, static = spaces
    kept = np.hstack([massive, dashed])
    right, direct = _condense(stiffness, kept, static)
    left, _ = _condense(stiffness.T, kept, static)
    h, d = massive.shape[1], dashed.shape[1]
    k, c = left.T @ stiffness @ right, left.T @ damping @ right
    inverse_mass = np.linalg.inv(massive.T @ mass @ massive)
    inverse_dashpot = np.linalg.inv(c[h:, h:]) if d else np.zeros((0, 0))
    zero = np.zeros
    slow = -inverse_dashpot @ np.hstack([k[h:, :h], c[h:, :h], k[h:, h:]])  # z' of (y, y', z)
    slow_load = inverse_dashpot @ left.T[h:]
    fast = -inverse_mass @ (np.hstack([k[:h, :h], c[:h, :h], k[:h, h:]]) + c[:h, h:] @ slow)
    fast_load = inverse_mass @ (left.T[:h] - c[:h, h:] @ slow_load)
    coordinates = np.linalg.inv(np.hstack([massive, dashed, static]))
    n = system.size
    return FirstOrder(
        system=system,
        matrix=np.vstack([np.hstack([zero((h, h)), np.eye(h), zero((h, d))]), fast, slow]),
        shape=np.hstack([right[:, :h], zero((n, h)), right[:, h:]]),
        load=np.vstack([zero((h, n)), fast_load, slow_load]),
        direct=direct,
        from_displacement=np.vstack([coordinates[:h], zero((h, n)), coordinates[h : h + d]]),
        from_velocity=np.vstack([zero((h, n)), coordinates[:h], zero((d, n))]),
        squares=np.zeros(0),
        rigid=0,
    )


def _direct_static(system: System, force: Array, name: str) -> Array:
    stiffness = dense(system.stiffness)
    if np.linalg.cond(stiffness) > 1e14:
        raise ModelError(_nothing_holds(name))
    return np.asarray(np.linalg.solve(stiffness, force))


def _nothing_holds(name: str) -> str:
    return (
        f"{name}: nothing holds the system against this pull, it would move away before it could be let go; "
        "hold it with a support or a spring, or start it with an impulse or a velocity"
    )
