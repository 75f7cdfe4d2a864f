"""Analytic sensitivity of natural frequencies to quantities.

R. L. Fox, M. P. Kapoor, AIAA Journal 6 (1968) 2426-2429: for a shape of unit modal mass the square of the
angular frequency changes by shape' (dK - w^2 dM) shape. The derivatives of the matrices are central
differences of the rebuilt study, which for constants of springs, masses, moduli and densities are exact.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from scipy.optimize import linear_sum_assignment

from vib.modes import assurance
from vib.scatter.batch import Array
from vib.scatter.family import lowest_undamped

if TYPE_CHECKING:
    from vib.scatter.family import Family

STEP = 1e-3  # of the width that a quantity scatters over
ALIKE = 1e-6  # relative distance of two frequencies below which neither has a derivative of its own


def sensitivities(family: Family) -> Array:
    """Derivative (m, d) of each undamped natural frequency by each quantity, Hz per SI unit.

    NaN for rigid-body modes, for frequencies that occur twice, whose derivatives depend on what else varies,
    and for everything where gyroscopic moments act, which the formula leaves out.
    """
    modes, system = family.modes, family.modes.system
    found = np.full((modes.count, len(family.paths)), np.nan)
    if system.gyroscopic is not None or system.unsymmetric:
        return found
    undamped = lowest_undamped(system, modes.count)
    squares, shapes = undamped.values, undamped.shapes
    alone = squares > 0
    near = np.abs(np.diff(squares)) <= 2 * ALIKE * squares[1:]
    alone[1:] &= ~near
    alone[:-1] &= ~near
    rows, columns = linear_sum_assignment(-assurance(modes.shapes, shapes))
    for quantity, (low, high) in enumerate(family.bounds):
        step = np.zeros(len(family.paths))
        step[quantity] = STEP * (high - low)
        above, below = (family.builder.system(family.nominal + sign * step) for sign in (1, -1))
        stiffness, mass = above.stiffness - below.stiffness, above.mass - below.mass
        change = np.einsum("ij,ij->j", shapes, stiffness @ shapes - mass @ shapes * squares)
        with np.errstate(divide="ignore", invalid="ignore"):
            slopes = change / (2 * step[quantity]) / (4 * np.pi * np.sqrt(squares))
        found[rows, quantity] = np.where(alone, slopes, np.nan)[columns]
    return found
