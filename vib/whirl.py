"""Forward and backward whirl: which way round a spinning body's axis goes in a mode."""

from __future__ import annotations

from typing import Literal

import numpy as np
from numpy.typing import NDArray

from vib.system import Spinning, System

Whirl = Literal["forward", "backward", "flat", "unknown"]
SIDEWAYS = 1e-6  # of the motion: less across the axis is round-off of a motion along or about it
ROUND = 0.05  # of a circular orbit's share; below, the orbit is as good as a line


def whirl_of(
    system: System, bodies: tuple[Spinning, ...], value: complex, shape: NDArray[np.complex128]
) -> Whirl:
    """The sense in which bodies orbit and nod across their axes in a mode, against that of their spin.

    For q(t) = Re(q exp(s t)) with Im s > 0 an orbit q1, q2 across the axis turns with the sense of the axis
    where Im(conj(q1) q2) is negative. Displacements and turns count with the kinetic energy that they carry;
    ``"flat"``: the orbit is a line; ``"unknown"``: no spinning body is known, or it does not move.
    """
    if system.anatomy is None or not bodies:
        return "unknown"
    if value.imag <= 0:
        return "flat"
    sense = size = along = 0.0
    for body in bodies:
        place = system.anatomy.places.get(body.name)
        if place is None:
            continue
        moved = np.asarray(place.motion @ shape)
        first, second = across(np.array(body.axis))
        for part, weight in ((moved[:3], body.mass_kg), (moved[3:], body.polar_kg_m2)):
            a, b = complex(first @ part), complex(second @ part)
            sense -= 2 * weight * (a.conjugate() * b).imag
            size += weight * (abs(a) ** 2 + abs(b) ** 2)
            along += weight * abs(complex(np.array(body.axis) @ part)) ** 2
    if size + along == 0:
        return "unknown"
    if size <= SIDEWAYS * (size + along):
        return "flat"
    return "forward" if sense > ROUND * size else "backward" if sense < -ROUND * size else "flat"


def across(axis: NDArray[np.float64]) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Two unit vectors that make a right-handed system with the axis."""
    first = np.cross(axis, np.eye(3)[int(np.argmin(np.abs(axis)))])
    first = first / np.linalg.norm(first)
    return first, np.cross(axis, first)
