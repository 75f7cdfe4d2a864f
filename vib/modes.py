"""Natural frequencies, damping ratios and mode shapes of a system: the noun `Modes` and how it is found."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, cast

import numpy as np
from numpy.typing import ArrayLike, NDArray

from vib.convergence import Converged, converged_modes
from vib.descriptions import damping_note, describe, name_rigid
from vib.errors import ModelError, ShapeError, in_own_words
from vib.shares import kinetic_shares, participation, strain_shares
from vib.system import System

Array = NDArray[np.float64]
Numbers = NDArray[Any]  # float64 where the damping is proportional, complex128 where it is not


@dataclass(frozen=True, kw_only=True, eq=False)
class Modes:
    """The modes of a system, slowest first, rigid-body modes before all others.

    Attributes
    ----------
    system
        The system that the shapes refer to; a finer division than the one asked where accuracy needed it.
    eigenvalues
        (m,) complex, 1/s; one of each conjugate pair (imaginary part >= 0), real ones alone, 0 for rigid.
    frequencies_hz, damped_frequencies_hz
        (m,) natural ``abs(eigenvalue) / (2 pi)`` and damped ``eigenvalue.imag / (2 pi)``.
    undamped_frequencies_hz
        (m,) without the damping: the frequency of the undamped mode, or for non-proportional damping the
        Rayleigh quotient of the shape.
    damping_ratios
        (m,) ``-real / abs`` of the eigenvalue: 1 overdamped, negative growing, NaN for rigid-body modes.
    shapes
        (n, m) displacements per freedom, unit modal mass, biggest component positive; real where the
        damping is proportional, else complex with that component real.
    errors_hz
        (m,) numerical error bar of each frequency.
    condition
        (m,) condition number of each eigenvalue: 1 for undamped ones, large near a defective one.
    backward_errors
        (m,) least relative change of the matrices for which each pair would be exact.
    stable
        False if any eigenvalue grows, as far as it is known.
    stability_known
        False where forces can feed energy in and only the modes listed were looked at.
    rigid_body_count
        How many modes are at 0 Hz; they come first.
    complete_below_hz
        No mode below this frequency is missing (inertia count, or all were computed); None if not known.
    proportional
        True if the undamped shapes stay the shapes of the damped system.
    participation, effective_mass
        (m, 6) participation factor and effective mass along x, y, z (kg) and about the axes through the
        origin (kg m^2); None for a system without anatomy.
    strain_energy, kinetic_energy
        Share of each part, by its name, in each mode (m,); None for a system without anatomy.
    descriptions
        (m,) the mode in plain words.
    rigid_descriptions
        What turns or moves freely, one sentence for each rigid-body mode.
    damping_note
        The damping that was used, in words.
    remarks
        What the reader should know, in words: assumptions, refinement, what could not be checked.
    """

    system: System
    eigenvalues: NDArray[np.complex128]
    frequencies_hz: Array
    damped_frequencies_hz: Array
    undamped_frequencies_hz: Array
    damping_ratios: Array
    shapes: Numbers
    errors_hz: Array
    condition: Array
    backward_errors: Array
    stable: bool
    stability_known: bool
    rigid_body_count: int
    complete_below_hz: float | None
    proportional: bool
    participation: Array | None
    effective_mass: Array | None
    strain_energy: Mapping[str, Array] | None
    kinetic_energy: Mapping[str, Array] | None
    descriptions: tuple[str, ...]
    rigid_descriptions: tuple[str, ...]
    damping_note: str
    remarks: tuple[str, ...]

    @property
    def count(self) -> int:
        """How many modes there are."""
        return len(self.frequencies_hz)

    def effective_mass_along(self, vector: ArrayLike) -> Array:
        """Effective modal mass (m,) for a rigid motion of the ground along ``vector``.

        Parameters
        ----------
        vector
            Where the system has anatomy: (6,) the rigid motion of the ground, about the origin. Otherwise
            (n,): the displacement of every freedom per unit of that motion.

        Raises
        ------
        ShapeError
            Not of that length.
        """
        motion = np.asarray(vector, dtype=np.float64)
        anatomy = self.system.anatomy
        length = 6 if anatomy is not None else self.system.size
        if motion.shape != (length,):
            raise ShapeError("vector", expected=(length,), got=motion.shape)
        carried = anatomy.carried @ motion if anatomy is not None else self.system.mass @ motion
        return participation(self.shapes, carried[:, None])[:, 0] ** 2

    def assurance(self, other: Modes | ArrayLike) -> Array:
        """Modal assurance criterion (m, m2) between the shapes of two sets, 0 to 1.

        Parameters
        ----------
        other
            Modes with the same freedoms, or shapes (n, m2).

        Raises
        ------
        ShapeError
            The other shapes have another number of freedoms.

        References
        ----------
        R. J. Allemang, D. L. Brown, Proc. 1st International Modal Analysis Conference (1982) 110-116.
        """
        shapes = other.shapes if isinstance(other, Modes) else np.asarray(other)
        return assurance(self.shapes, shapes)


def assurance(shapes: ArrayLike, others: ArrayLike) -> Array:
    """Modal assurance criterion |a*b|^2 / (a*a b*b), (m, m2), of shapes (n, m) and (n, m2); 0 to 1.

    Raises
    ------
    ShapeError
        The shapes have different numbers of freedoms.

    References
    ----------
    R. J. Allemang, D. L. Brown, Proc. 1st International Modal Analysis Conference (1982) 110-116.
    """
    first, second = (_unit_columns(np.atleast_2d(np.asarray(given).T).T) for given in (shapes, others))
    if first.shape[0] != second.shape[0]:
        raise ShapeError("shapes", expected=(first.shape[0], second.shape[1]), got=second.shape)
    return np.asarray(np.abs(first.conj().T @ second) ** 2)


def _unit_columns(shapes: Numbers) -> Numbers:
    length = np.linalg.norm(shapes, axis=0)
    return np.asarray(shapes / np.where(length > 0, length, 1.0))


@in_own_words
def find_modes(system: System, *, count: int | None = None, up_to: str | float | None = None) -> Modes:
    """Natural frequencies, damping ratios and mode shapes of a system.

    Parameters
    ----------
    system
        Bare matrices, or a structure; a structure is cut more finely until its accuracy is met, and the
        modes then refer to that finer system.
    count
        How many modes, slowest first, rigid-body modes included; all finite ones if neither limit is given.
    up_to
        Only modes up to this natural frequency: text with a unit, or a number in Hz.

    Returns
    -------
    Modes
        See the class; frequencies in Hz, eigenvalues in 1/s, shapes of unit modal mass.

    Raises
    ------
    ModelError
        A limit that is not positive.
    UnitError
        ``up_to`` is not a frequency.
    MatrixError
        A motion has neither mass, damping nor stiffness.
    AccuracyError
        A solver did not finish, or its result can't be trusted.

    References
    ----------
    The methods are named in `vib.solve.dense`, `vib.solve.shift_invert`, `vib.solve.quadratic` and
    `vib.solve.arnoldi`, the error of the division in `vib.convergence`.

    Examples
    --------
    >>> import vib
    >>> find_modes(vib.System(mass=[[2.0]], damping=[[0.8]], stiffness=[[8.0]])).damping_ratios.round(12)
    array([0.1])
    """
    limit_hz = _limit(up_to)
    limit = None if limit_hz is None else 2 * np.pi * limit_hz
    found = converged_modes(system, _number(count), limit)
    damped, used = found.solution.damped, found.system
    rigid_descriptions: tuple[str, ...] = ()
    shapes = damped.shapes
    if damped.rigid:
        still = shapes[:, : damped.rigid].real
        rigid_descriptions, turn = name_rigid(used, still)
        shapes = np.hstack([_aligned(used, still @ turn), shapes[:, damped.rigid :]])
    shapes = _positive(shapes)
    strain = strain_shares(used, shapes)
    size = np.abs(damped.values)
    ratios = -damped.values.real / np.where(size > 0, size, np.nan) + 0.0
    elastic = describe(used, shapes[:, damped.rigid :], _after(strain, damped.rigid))
    factors = participation(shapes, used.anatomy.carried) if used.anatomy else None
    return Modes(
        system=used,
        eigenvalues=damped.values,
        frequencies_hz=size / (2 * np.pi),
        damped_frequencies_hz=damped.values.imag / (2 * np.pi),
        undamped_frequencies_hz=damped.undamped / (2 * np.pi),
        damping_ratios=ratios,
        shapes=shapes,
        errors_hz=(damped.errors + found.errors) / (2 * np.pi),
        condition=damped.condition,
        backward_errors=found.solution.backward,
        stable=damped.growing is None and not bool((damped.values.real > damped.movement).any()),
        stability_known=not found.solution.watch,
        rigid_body_count=damped.rigid,
        complete_below_hz=_complete(damped.certified, limit, limit_hz),
        proportional=damped.proportional,
        participation=factors,
        effective_mass=None if factors is None else factors**2,
        strain_energy=strain,
        kinetic_energy=kinetic_shares(used, shapes),
        descriptions=rigid_descriptions + elastic,
        rigid_descriptions=rigid_descriptions,
        damping_note=damping_note(used, found.solution.damping, proportional=damped.proportional),
        remarks=_remarks(used, found),
    )


def _number(count: object) -> int | None:
    """How many modes were asked for."""
    if count is None:
        return None
    number = _real(count)
    if number is None or not np.isfinite(number) or number < 1 or int(number) != number:
        raise ModelError(f"count: a whole number of modes from 1 is needed, got {count!r}.")
    return int(number)


def _limit(up_to: object) -> float | None:
    """The highest frequency asked for, Hz."""
    if up_to is None:
        return None
    if isinstance(up_to, str):
        from vib.units import parse

        value: float | None = parse(up_to, "frequency")
    else:
        value = _real(up_to)
    if value is None or not np.isfinite(value) or value <= 0:
        raise ModelError(
            f'up_to: a positive frequency is needed, a number in Hz or text such as "200 Hz", got {up_to!r}.'
        )
    return value


def _real(value: object) -> float | None:
    """One real number, or None for anything else."""
    plain = isinstance(value, (int, float, np.integer, np.floating)) and not isinstance(value, bool)
    return float(cast("float", value)) if plain else None


def _complete(certified: float | None, limit: float | None, limit_hz: float | None) -> float | None:
    """Hz; the limit itself, unrounded, where the modes are complete up to it."""
    if certified is None:
        return None
    if limit is not None and limit_hz is not None and certified >= limit:
        return max(certified / (2 * np.pi), limit_hz)
    return certified / (2 * np.pi)


def _after(shares: Mapping[str, Array] | None, rigid: int) -> Mapping[str, Array] | None:
    return None if shares is None else {name: share[rigid:] for name, share in shares.items()}


def _aligned(system: System, motions: Array) -> Array:
    """The named rigid-body motions, orthogonal in the mass in the order of their names."""
    modal = motions.T @ (system.mass @ motions)
    scale = np.sqrt(np.where(np.diag(modal) > 0, np.diag(modal), 1.0))
    scaled = modal / np.outer(scale, scale)
    if np.linalg.eigvalsh(scaled)[0] < 1e-12:  # one of them moves no mass: only its direction can be given
        return np.asarray(motions / np.abs(motions).max(axis=0))
    return np.asarray(np.linalg.solve(np.linalg.cholesky(scaled), (motions / scale).T).T)


def _positive(shapes: Numbers) -> Numbers:
    """Real shapes with their largest component positive; complex ones have it so already."""
    if np.iscomplexobj(shapes) or not shapes.size:
        return shapes
    peak = shapes[np.argmax(np.abs(shapes), axis=0), np.arange(shapes.shape[1])]
    return shapes * np.where(peak < 0, -1.0, 1.0)


def _remarks(system: System, found: Converged) -> tuple[str, ...]:
    remarks = [*(system.anatomy.remarks if system.anatomy else ()), *found.remarks, *found.solution.remarks]
    damped = found.solution.damped
    if damped.certified is None:
        remarks.append(
            "It was not checked whether a mode is missing: that cannot be counted for this damping."
        )
    elif found.solution.counted and damped.proportional:
        remarks.append("The number of modes was confirmed by an inertia count (Sylvester).")
    elif found.solution.counted:
        remarks.append("The number of modes was confirmed by the argument principle.")
    if damped.growing is not None:
        speed = abs(damped.growing) / (2 * np.pi)
        which = f"A motion of {speed:.4g} Hz" if np.isfinite(speed) else "A motion of unknown frequency"
        remarks.append(f"{which}, beyond the modes asked for, grows: ask for more modes to see it.")
    elif found.solution.watch:
        remarks.append(
            "Forces that can feed energy in: whether motions beyond the modes listed grow was not proved."
        )
    if ((damped.values.real > damped.movement) & (damped.values.imag == 0)).any():
        remarks.append(
            "A motion grows without swinging: the stiffness is not positive there, because the structure is "
            "buckled or a spring has the wrong sign."
        )
    return tuple(remarks)
