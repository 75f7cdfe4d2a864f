"""Natural frequencies, damping ratios and mode shapes of a system: the noun `Modes` and how it is found."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

if TYPE_CHECKING:
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
    stable
        False if any eigenvalue found grows.
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
    stable: bool
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
            (n,) displacement of every freedom per unit motion, or (6,) a rigid motion of the ground
            where the system has anatomy.
        """
        raise NotImplementedError

    def assurance(self, other: Modes | ArrayLike) -> Array:
        """Modal assurance criterion (m, m2) between the shapes of two sets, 0 to 1."""
        raise NotImplementedError


def find_modes(system: System, *, count: int | None = None, up_to: str | float | None = None) -> Modes:
    """The modes of a system: lowest ``count`` ones, those up to a frequency, or all finite ones."""
    raise NotImplementedError
