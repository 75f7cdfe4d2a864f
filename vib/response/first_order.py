"""The first-order model that rings: x' = A x + load f with the freedoms as outputs.

Symmetric systems are written in the coordinates of their undamped modes (all of them for a small system,
the lowest with static corrections for a large one, see `reduced`). There rigid-body motion is exactly
free, proportional damping uncouples exactly and the matrix is well scaled. Unsymmetric stiffness and
massless freedoms with dashpots go the direct way.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from vib.errors import MatrixError, ModelError
from vib.massless import dense, first_order, root_scale, split_mass
from vib.response.every_mode import every_mode
from vib.response.exponential import EPS, Array
from vib.solve.damping import ModalDamping, modal_damping
from vib.solve.undamped import Undamped
from vib.system import DampingLaw, System


@dataclass(frozen=True, eq=False)
class RingModel:
    """x' = A x + load f and q = shape x + direct f, for forces f (n,) on the freedoms q (n,).

    ``matrix`` A (s, s); ``shape`` (n, s); ``load`` (s, n); ``direct`` (n, n), the flexibility of massless
    freedoms, or None; ``from_displacement`` and ``from_velocity`` (s, n) make x of q and q'.
    ``squares`` (m,) are the undamped frequencies squared, (rad/s)^2, negative where the stiffness is; the
    first ``rigid`` of them are exactly 0; empty if the model is not in modal coordinates.
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
        size = np.abs(self.load[m : m + self.rigid]) @ np.abs(force)
        if np.any(np.abs(modal[: self.rigid]) > 1e-9 * size):
            raise ModelError(_nothing_holds(name))
        found: Array = self.shape[:, self.rigid : m] @ (modal[self.rigid :] / self.squares[self.rigid :])
        return found if self.direct is None else found + self.direct @ force

    def jump(self, displacement: Array) -> float:
        """How far, relative to it, a displacement (n,) differs from the one the model can start from.

        Massless freedoms without dashpots follow the others at once; a start that holds them elsewhere
        is left in the first instant.
        """
        size = float(np.abs(displacement).max(initial=0.0))
        rest = displacement - self.shape @ (self.from_displacement @ displacement)
        return float(np.abs(rest).max(initial=0.0)) / size if size else 0.0


def full_model(system: System) -> RingModel:
    """The complete first-order model of a system of moderate size (dense arithmetic).

    Raises
    ------
    MatrixError
        Motions without mass that nothing determines; a damping law where it has no meaning.
    """
    light = split_mass(system.mass).massless
    damped = any(
        np.any(matrix @ light) or np.any(light.T @ matrix)
        for matrix in (system.damping, system.gyroscopic)
        if matrix is not None and light.shape[1]
    )
    if system.unsymmetric or damped:
        return _direct_model(system, light)
    return modal_model(system, every_mode(system), flexibility(system, light))


def modal_model(system: System, undamped: Undamped, direct: Array | None = None) -> RingModel:
    """The model in the coordinates of undamped shapes (n, m) of unit modal mass."""
    seen = modal_damping(system, undamped)
    squares, shapes = seen.undamped.values, seen.undamped.shapes
    m = len(squares)
    damping = _modal_damping(system, seen)
    zero = np.zeros((m, m))
    dual = np.asarray((system.mass @ shapes).T)
    nothing = np.zeros_like(dual)
    return RingModel(
        system=system,
        matrix=np.block([[zero, np.eye(m)], [-np.diag(squares), -damping]]),
        shape=np.hstack([shapes, np.zeros_like(shapes)]),
        load=np.vstack([nothing, shapes.T]),
        direct=direct,
        from_displacement=np.vstack([dual, nothing]),
        from_velocity=np.vstack([nothing, dual]),
        squares=squares,
        rigid=undamped.rigid,
    )


def _modal_damping(system: System, damping: ModalDamping) -> Array:
    """Phi' (C + G) Phi plus the law (m, m), with what is only rounding set to zero."""
    if damping.proportional and system.gyroscopic is None:
        return np.diag(damping.total)
    shapes = damping.undamped.shapes
    total = np.diag(2 * damping.law * damping.undamped.angular)
    for matrix in (system.damping, system.gyroscopic):
        if matrix is None:
            continue
        modal = shapes.T @ (matrix @ shapes)
        # each entry is a sum of terms of this size, so it can't be known better; the shapes carry the
        # error of their own computation too, hence the factor
        size = np.abs(shapes).T @ (abs(matrix) @ np.abs(shapes))
        total = total + np.where(np.abs(modal) > 64 * EPS * max(16, len(total)) * size, modal, 0.0)
    return total


def flexibility(system: System, light: Array) -> Array | None:
    """How massless motions without dashpots give way by themselves to a force, (n, n)."""
    if not light.shape[1]:
        return None
    inner = light.T @ dense(system.stiffness) @ light
    scale = root_scale(np.diag(inner))
    inverse = scale[:, None] * np.linalg.pinv(scale[:, None] * inner * scale, hermitian=True) * scale
    found: Array = light @ inverse @ light.T
    return found


def _direct_model(system: System, light: Array) -> RingModel:
    """States: the motions with mass, their velocities, and the lagging motions without mass."""
    if system.damping_law != DampingLaw():
        raise MatrixError(
            "damping: a ratio per mode needs symmetric stiffness and no dashpots at massless freedoms; "
            "give the damping as a matrix"
        )
    size = system.size
    damping = np.zeros((size, size))
    for matrix in (system.damping, system.gyroscopic):
        damping = damping if matrix is None else damping + dense(matrix)
    form = first_order(system.mass, damping, system.stiffness, [str(named) for named in system.freedoms])
    kinds = np.array(form.order)
    heavy = split_mass(system.mass).massive
    mass = dense(system.mass)
    project = np.linalg.solve(heavy.T @ mass @ heavy, heavy.T @ mass)
    from_displacement = np.zeros((len(kinds), size))
    from_velocity = np.zeros((len(kinds), size))
    from_displacement[kinds == 0] = project
    from_velocity[kinds == 1] = project
    if np.any(kinds == 2):
        # the force of the dashpots on massless motions, light' C q, holds the lagging coordinates alone
        grip = light.T @ damping
        rest = grip - grip @ form.shape[:, kinds == 0] @ project
        from_displacement[kinds == 2] = np.linalg.pinv(grip @ form.shape[:, kinds == 2]) @ rest
    return RingModel(
        system=system,
        matrix=form.rate,
        shape=form.shape,
        load=form.input,
        direct=form.give if form.give.any() else None,
        from_displacement=from_displacement,
        from_velocity=from_velocity,
        squares=np.zeros(0),
        rigid=0,
    )


def _direct_static(system: System, force: Array, name: str) -> Array:
    stiffness = dense(system.stiffness)
    scale = root_scale(np.diag(stiffness))
    scaled = scale[:, None] * stiffness * scale
    if np.linalg.cond(scaled) > 1e12:
        raise ModelError(_nothing_holds(name))
    return np.asarray(scale * np.linalg.solve(scaled, scale * force))


def _nothing_holds(name: str) -> str:
    return (
        f"{name}: nothing holds the system against this pull, it would move away before it could be let go; "
        "hold it with a support or a spring, or start it with an impulse or a velocity"
    )
