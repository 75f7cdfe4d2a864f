"""How many pieces each stretch of a member is cut into."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from vib.structure.layout import Layout
from vib.structure.members import Stretches
from vib.system import Array

FIRST_COUNT = 4  # even, so that half as many pieces make the coarser structure to compare with
_FEWEST = 4
_MOST = 1_000_000
# the error bar of a frequency comes from comparing with half the pieces, which overstates the error of these
_MARGIN = 4.0


def first_counts(layout: Layout) -> NDArray[np.intp]:
    """(s,) pieces of each stretch where no frequency is named."""
    return np.full(len(layout.stretches.labels), FIRST_COUNT, dtype=np.intp)


def expected_error(stretches: Stretches, piece_m: Array, frequency_hz: float) -> Array:
    """(s,) relative error of a frequency whose wave runs along pieces of length ``piece_m`` (s,).

    With k the wave number of each kind of wave and h the length of a piece, consistent-mass elements are too
    high by (k h)^4 / 1440 in bending (cubic shape functions), by (k h)^2 / 24 in axial, torsion and shear
    waves (linear ones), and by (k h)^4 / 1440 in torsion with `beam.twist_between` (quadratic ones).
    Source: M. Ainsworth, SIAM J. Numer. Anal. 42 (2004) 553-575, dispersion of order p:
    (k h)^(2 p) / (2 (2 p + 1)) (p! / (2 p)!)^2; for the beam the same expansion; from memory, confirmed by
    the tests.
    """
    bars = stretches.bars
    omega = 2 * np.pi * frequency_hz
    line = bars.density * bars.area
    least = np.minimum(bars.second_moment_y, bars.second_moment_z)
    bending = line * omega**2 / (bars.youngs_modulus * least) * piece_m**4 / 1440
    shear = line * omega**2 / (bars.shear_modulus * np.minimum(bars.shear_area_y, bars.shear_area_z))
    axial = bars.density * omega**2 / bars.youngs_modulus
    polar = bars.density * (bars.second_moment_y + bars.second_moment_z)
    torsion = polar * omega**2 / (bars.shear_modulus * bars.torsion_constant)
    turning = np.where(bars.twists_softly(), (torsion * piece_m**2) ** 2 / 1440, torsion * piece_m**2 / 24)
    return np.maximum(bending + shear * piece_m**2 / 24, np.maximum(axial * piece_m**2 / 24, turning))


def counts_for(layout: Layout, frequency_hz: float) -> NDArray[np.intp]:
    """(s,) even numbers of pieces so that modes up to this frequency should meet the study's accuracy."""
    stretches = layout.stretches
    wanted = layout.study.accuracy / _MARGIN
    half = np.full(len(stretches.labels), _FEWEST // 2, dtype=np.intp)
    for _ in range(60):
        error = expected_error(stretches, stretches.bars.length / (2 * half), frequency_hz)
        short = error > wanted
        if not short.any() or half.max() > _MOST:
            break
        # the error falls at least with the square of the count, and at most with its fourth power
        growth = np.maximum(1.0 + 1.0 / half, np.minimum((error / wanted) ** 0.25, 1e3))
        half = np.where(short, np.ceil(half * growth - 1e-9), half).astype(np.intp)
    return 2 * half
