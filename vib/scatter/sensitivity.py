"""Analytic sensitivity of natural frequencies to quantities.

An eigenvalue s of a symmetric damped system with shape v changes with a quantity by

    ds = -v' (s^2 dM + s dC + dK) v / (v' (2 s M + C) v),    v' the plain transpose,

(S. Adhikari, AIAA Journal 37 (1999) 1452-1458, from memory), which without damping is the formula of R. L.
Fox and M. P. Kapoor, AIAA Journal 6 (1968) 2426-2429. The natural frequency is abs(s) / (2 pi). The
derivatives of the matrices are central differences of the rebuilt study, which for constants of springs and
dashpots, masses, moduli and densities are exact.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from vib.scatter.batch import Array

if TYPE_CHECKING:
    from vib.scatter.family import Family

STEP = 1e-3  # of the width that a quantity scatters over
ALIKE = 1e-6  # relative distance of two eigenvalues below which neither has a derivative of its own


def sensitivities(family: Family) -> Array:
    """Derivative (m, d) of each natural frequency by each quantity, Hz per SI unit.

    NaN for rigid-body modes, for frequencies that occur twice, whose derivatives depend on what else varies,
    and for everything where gyroscopic or circulatory forces act. What a stated damping ratio does to the
    frequencies of complex modes is held fixed.
    """
    modes, system = family.modes, family.modes.system
    found = np.full((modes.count, len(family.paths)), np.nan)
    if system.gyroscopic is not None or system.unsymmetric:
        return found
    values, shapes = modes.eigenvalues, modes.shapes
    alone = np.abs(values) > 0
    apart = np.abs(values[:, None] - values) + np.diag(np.full(modes.count, np.inf))
    alone &= apart.min(axis=1, initial=np.inf) > ALIKE * np.abs(values)
    mass, stiffness = _quadratic(shapes, system.mass), _quadratic(shapes, system.stiffness)
    with np.errstate(divide="ignore", invalid="ignore"):
        # v' C v from the equation of motion itself, whatever the damping was stated as
        damping = -(values**2 * mass + stiffness) / values
        slope = 2 * values * mass + damping
    for quantity, (low, high) in enumerate(family.bounds):
        step = np.zeros(len(family.paths))
        step[quantity] = STEP * (high - low)
        above, below = (family.builder.system(family.nominal + sign * step) for sign in (1, -1))
        change = values**2 * _quadratic(shapes, above.mass - below.mass)
        change = change + _quadratic(shapes, above.stiffness - below.stiffness)
        if above.damping is not None and below.damping is not None:
            change = change + values * _quadratic(shapes, above.damping - below.damping)
        with np.errstate(divide="ignore", invalid="ignore"):
            rates = -change / slope / (2 * step[quantity])
            hertz = (values.conj() * rates).real / np.abs(values) / (2 * np.pi)
        found[:, quantity] = np.where(alone, hertz, np.nan)
    return found


def _quadratic(shapes: Any, matrix: Any) -> Any:
    """v' A v (m,) of shapes (n, m), without conjugation."""
    return np.einsum("ij,ij->j", shapes, matrix @ shapes)
