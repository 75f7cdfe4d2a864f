"""Geometric stiffness: what a steady pull or push along members and belts adds to the stiffness across them.

A pull P along a bar does the work P/2 times the integral of the squared slope when the bar bows (S. P.
Timoshenko, J. M. Gere, Theory of Elastic Stability, 2nd ed., 1961, section 2.8). The bar takes its own
shape functions, shear deformation included (J. S. Przemieniecki, Theory of Matrix Structural Analysis, 1968,
chapter 15, for bars without shear), so a finer division approaches the true value from above.
"""

from __future__ import annotations

import numpy as np

from vib.structure.beam import Bars, add_pair, add_planes, symmetric
from vib.system import Array


def geometric_stiffness(bars: Bars, pull: Array) -> Array:
    """Stiffness (e, 12, 12) in the principal axes that a pull (e,) N along each bar adds; a push is negative.

    Torsion: fibres off the axis run along helices and are pulled straight, P times the polar radius of
    gyration squared (H. Wagner, 1936; Timoshenko and Gere, section 5.3).
    """
    found = np.zeros((len(pull), 12, 12))
    about_z = _across(pull, bars.shear_ratio_z(), bars.length)
    about_y = _across(pull, bars.shear_ratio_y(), bars.length)
    add_planes(found, about_z, about_y)
    add_pair(found, 3, twisting(bars, pull) / bars.length, 1.0, -1.0)
    return found


def twisting(bars: Bars, pull: Array) -> Array:
    """What the pull adds to the torsional stiffness G J of each bar (e,), N m^2."""
    return np.asarray(pull * (bars.second_moment_y + bars.second_moment_z) / bars.area)


def belt_stiffness(span_m: Array, pull: Array) -> Array:
    """(q, 12, 12) for pulls (q,) along spans (q, 3) between two places: pull / length across the span."""
    length = np.linalg.norm(span_m, axis=1)
    safe = np.where(length > 0, length, 1.0)
    along = span_m / safe[:, None]
    across = (pull / safe)[:, None, None] * (np.eye(3) - along[:, :, None] * along[:, None, :])
    found = np.zeros((len(pull), 12, 12))
    for rows, columns, sign in ((0, 0, 1), (6, 6, 1), (0, 6, -1), (6, 0, -1)):
        found[:, rows : rows + 3, columns : columns + 3] = sign * across
    return found


def _across(pull: Array, shear: Array, length: Array) -> Array:
    """In one plane: the integral of slope times slope of the shape functions, times the pull."""
    p = shear
    size = pull / (length * (1.0 + p) ** 2)
    entries = {
        (0, 0): size * (6 / 5 + 2 * p + p**2),
        (0, 1): size * length / 10,
        (0, 2): -size * (6 / 5 + 2 * p + p**2),
        (0, 3): size * length / 10,
        (1, 1): size * length**2 * (2 / 15 + p / 6 + p**2 / 12),
        (1, 3): -size * length**2 * (1 / 30 + p / 6 + p**2 / 12),
    }
    return symmetric(entries, len(length))
