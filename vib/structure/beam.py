"""The two-node beam in space: axial, torsion and bending with shear and rotary inertia.

Bending uses the shape functions that are exact for static end loads, shear deformation included; the mass
is the consistent one of the same functions, rotary inertia included.

Source: J. S. Przemieniecki, Theory of Matrix Structural Analysis (1968), chapters 5 (stiffness) and 11
(mass); the matrices are checked in the tests against integration of the shape functions.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from vib.structure.rigid import turned
from vib.system import Array


@dataclass(frozen=True, eq=False)
class Bars:
    """Straight uniform bars; every field an array with one entry per bar, SI units.

    ``second_moment_y`` and ``second_moment_z`` about the principal axes y, z through the centroid;
    ``shear_area_y`` for a force along y, infinite for no shear flexibility.
    """

    length: Array
    area: Array
    second_moment_y: Array
    second_moment_z: Array
    torsion_constant: Array
    shear_area_y: Array
    shear_area_z: Array
    youngs_modulus: Array
    shear_modulus: Array
    density: Array

    def twists_softly(self) -> NDArray[np.bool_]:
        """(e,) open sections: torsion waves run at less than half the speed that a round bar has.

        Their torsion is a long way softer than their bending, so that linear pieces would have to be far
        shorter for torsion than for anything else; they get `twist_between`.
        """
        polar = self.second_moment_y + self.second_moment_z
        found: NDArray[np.bool_] = (self.torsion_constant < polar / 4) & (self.density > 0)
        return found

    def shear_ratio_z(self) -> Array:
        """12 E Iz / (G Asy L^2): shear against bending flexibility in the x-y plane."""
        return _shear_ratio(
            self.youngs_modulus * self.second_moment_z, self.shear_modulus * self.shear_area_y, self.length
        )

    def shear_ratio_y(self) -> Array:
        """12 E Iy / (G Asz L^2): shear against bending flexibility in the x-z plane."""
        return _shear_ratio(
            self.youngs_modulus * self.second_moment_y, self.shear_modulus * self.shear_area_z, self.length
        )


def _shear_ratio(bending: Array, shear: Array, length: Array) -> Array:
    return 12.0 * bending / (shear * length**2)


# where the two bending planes sit among the twelve components; a turn about y tilts z down, hence the signs
_PLANE_XY = np.array([1, 5, 7, 11])
_PLANE_XZ = np.array([2, 4, 8, 10])
_SIGNS_XZ = np.array([1.0, -1.0, 1.0, -1.0])


def local_stiffness(bars: Bars) -> Array:
    """Stiffness in the principal axes of each bar, (e, 12, 12): x, y, z, rx, ry, rz of start, then of end."""
    length = bars.length
    found = np.zeros((len(length), 12, 12))
    add_pair(found, 0, bars.youngs_modulus * bars.area / length, 1.0, -1.0)
    add_pair(found, 3, bars.shear_modulus * bars.torsion_constant / length, 1.0, -1.0)
    about_z = _bending_stiffness(bars.youngs_modulus * bars.second_moment_z, bars.shear_ratio_z(), length)
    about_y = _bending_stiffness(bars.youngs_modulus * bars.second_moment_y, bars.shear_ratio_y(), length)
    add_planes(found, about_z, about_y)
    return found


def local_mass(bars: Bars) -> Array:
    """Consistent mass in the principal axes of each bar, (e, 12, 12), ordered as the stiffness."""
    length, density = bars.length, bars.density
    line = density * bars.area
    found = np.zeros((len(length), 12, 12))
    add_pair(found, 0, line * length / 6.0, 2.0, 1.0)
    polar = density * (bars.second_moment_y + bars.second_moment_z)
    add_pair(found, 3, polar * length / 6.0, 2.0, 1.0)
    about_z = _bending_mass(line, density * bars.second_moment_z, bars.shear_ratio_z(), length)
    about_y = _bending_mass(line, density * bars.second_moment_y, bars.shear_ratio_y(), length)
    add_planes(found, about_z, about_y)
    return found


def twist_between(bars: Bars) -> tuple[Array, Array, Array]:
    """A turn about x that rises and falls between the nodes, 4 s (1 - s): one more freedom of a bar.

    Its stiffness (N m), its own inertia (kg m^2) and its inertia against the turn of either node, each
    (e,). Linear torsion and this make a quadratic; the two share no stiffness (a hierarchical function:
    O. C. Zienkiewicz, R. L. Taylor, The Finite Element Method, chapter on shape functions).
    """
    twisting = bars.shear_modulus * bars.torsion_constant / bars.length
    polar = bars.density * (bars.second_moment_y + bars.second_moment_z) * bars.length
    return 16 / 3 * twisting, 8 / 15 * polar, polar / 3


def to_global(local: Array, axes: Array) -> Array:
    """(e, 12, 12) from bar axes (e, 3, 3; rows x, y, z) to global components."""
    turn = np.zeros_like(local)
    turn[:, :6, :6] = turn[:, 6:, 6:] = turned(axes)
    found = np.swapaxes(turn, 1, 2) @ local @ turn
    return 0.5 * (found + np.swapaxes(found, 1, 2))


def add_pair(found: Array, component: int, size: Array, same: float, other: float) -> None:
    """Add a two-by-two block between one component of the start and the same of the end."""
    for first, second, factor in ((0, 0, same), (6, 6, same), (0, 6, other), (6, 0, other)):
        found[:, component + first, component + second] = size * factor


def add_planes(found: Array, about_z: Array, about_y: Array) -> None:
    """Add blocks (e, 4, 4) of the two planes of bending: bending about z, and about y."""
    found[:, _PLANE_XY[:, None], _PLANE_XY] = about_z
    found[:, _PLANE_XZ[:, None], _PLANE_XZ] = about_y * np.outer(_SIGNS_XZ, _SIGNS_XZ)


def symmetric(entries: dict[tuple[int, int], Array], count: int) -> Array:
    """(count, 4, 4) from the entries that the symmetry of the bar does not give."""
    found = np.zeros((count, 4, 4))
    for (i, j), value in entries.items():
        found[:, i, j] = found[:, j, i] = value
    found[:, 2, 2], found[:, 3, 3] = found[:, 0, 0], found[:, 1, 1]
    found[:, 2, 3] = found[:, 3, 2] = -found[:, 0, 1]
    found[:, 1, 2] = found[:, 2, 1] = -found[:, 0, 3]
    return found


def _bending_stiffness(bending: Array, shear: Array, length: Array) -> Array:
    size = bending / (length**3 * (1.0 + shear))
    entries = {
        (0, 0): 12.0 * size,
        (0, 1): 6.0 * size * length,
        (0, 2): -12.0 * size,
        (0, 3): 6.0 * size * length,
        (1, 1): (4.0 + shear) * size * length**2,
        (1, 3): (2.0 - shear) * size * length**2,
    }
    return symmetric(entries, len(length))


def _bending_mass(line: Array, rotary: Array, shear: Array, length: Array) -> Array:
    """``line`` kg/m moves sideways, ``rotary`` kg m turns with the cross section."""
    p = shear
    m = line * length / (1.0 + p) ** 2
    r = rotary / (length * (1.0 + p) ** 2)
    entries = {
        (0, 0): m * (13 / 35 + 7 * p / 10 + p**2 / 3) + r * 6 / 5,
        (0, 1): (m * (11 / 210 + 11 * p / 120 + p**2 / 24) + r * (1 / 10 - p / 2)) * length,
        (0, 2): m * (9 / 70 + 3 * p / 10 + p**2 / 6) - r * 6 / 5,
        (0, 3): (-m * (13 / 420 + 3 * p / 40 + p**2 / 24) + r * (1 / 10 - p / 2)) * length,
        (1, 1): (m * (1 / 105 + p / 60 + p**2 / 120) + r * (2 / 15 + p / 6 + p**2 / 3)) * length**2,
        (1, 3): (-m * (1 / 140 + p / 60 + p**2 / 120) + r * (-1 / 30 - p / 6 + p**2 / 6)) * length**2,
    }
    return symmetric(entries, len(length))
